"""The form of every kind of entry, for a loop as its site describes it."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import TYPE_CHECKING

from fertui.chemistry.names import IONS, MICRONUTRIENTS
from fertui.tui.figures import point_name
from fertui.tui.forms.spec import EVERY, Asked, Group, Part, Spec

if TYPE_CHECKING:
    from fertui.site.model import Loop, Site

OTHER_KINDS = {
    "stock": "stock solution used", "acid": "acid or lye used", "bleed": "solution discharged, with the reason",
    "level": "litres in a tank", "crop": "planted, new medium, stage, tank emptied or refilled",
    "calibration": "an instrument held against a standard", "sample": "a sample sent or awaited",
    "note": "words to remember", "setpoint": "EC and pH set points from now on",
    "recipe": "the feed composition the stocks carry from now on", "disinfection": "disinfection of water or lines",
}  # fmt: skip
"""Kinds without a key of their own, as the list of entries names them."""

NOTE = Asked("note", "note", words=True, entry=EVERY)
TIME = Asked("at", "when", entry=EVERY, words=True)
METHODS = ("pore", "extract_1_1.5", "paste", "pour_through")


def form_for(kind: str, site: Site, loop: Loop, unit: str) -> Spec:
    """The form of a kind for a loop; ``unit`` is what a bare number for an ion is taken in."""
    return FORMS[kind](site, loop, unit)


def points_of(loop: Loop) -> tuple[str, ...]:
    """Points of a loop that can be sampled, the first the usual one."""
    from fertui.logbook.parse import POINTS_BY_LAYOUT

    return POINTS_BY_LAYOUT[loop.layout]


def tanks_of(site: Site, loop: Loop) -> tuple[str, ...]:
    """Stock tanks of a loop, of the site where the loop names none."""
    return loop.stock_tanks or tuple(tank.name for tank in site.stock_tanks)


def containers_of(site: Site, loop: Loop) -> tuple[str, ...]:
    """What can hold litres in a loop: its tank or drain store, then its stock tanks."""
    own = ("tank",) if loop.layout == "shared-tank" else ("drain_store",) if loop.layout == "drain-blend" else ()
    return (*own, *tanks_of(site, loop))


def acids_of(site: Site) -> tuple[str, ...]:
    """Supplies with a strength: acids and lyes."""
    return tuple(supply.name for supply in site.supplies if supply.strength_pct is not None)


def salts_of(site: Site) -> tuple[str, ...]:
    """Supplies that are weighed."""
    return tuple(supply.name for supply in site.supplies if supply.strength_pct is None)


def meters(point: str, entry: int, layout: str, temperature: bool = True) -> Group:
    """EC, pH and temperature at a point."""
    fields = [Asked("EC", "EC", "mS/cm", entry), Asked("pH", "pH", "", entry)]
    if temperature:
        fields.append(Asked("temperature", "temperature", "C", entry))
    return Group(point_name(point, layout), tuple(fields))


def stock_label(tank: str) -> str:
    """A stock tank in the room of a label; a long name stands alone.

    >>> stock_label("calcium"), stock_label("sulfate and phosphate")
    ('stock calcium', 'sulfate and phosphate')
    """
    return f"stock {tank}" if len(tank) <= 15 else tank


def reading(site: Site, loop: Loop, unit: str) -> Spec:
    """The morning round: the seven numbers of the mixing room first, then the house."""
    where = "tank" if loop.layout == "shared-tank" else "feed"
    parts = [Part("reading", {"point": where}), Part("water", {"source": loop.water} if loop.water else {})]
    used = [Asked("make_up", "fresh water", "L", 1)]
    for tank in tanks_of(site, loop):
        used.append(Asked("litres", stock_label(tank), "L", len(parts)))
        parts.append(Part("stock", {"tank": tank}))
    for acid in acids_of(site)[:1]:
        used.append(Asked("litres", acid, "L", len(parts)))
        parts.append(Part("acid", {"acid": acid}))
    groups = [meters(where, 0, loop.layout), Group("used since the last round", tuple(used))]
    house = [Asked("light_sum", "light of the day", "J/cm2", 0)]
    if loop.layout != "shared-tank":
        came_back = meters("drain", len(parts), loop.layout, temperature=False)
        groups.append(Group("drain", (*came_back.fields, Asked("drain_pct", "drain", "%", len(parts)))))
        parts.append(Part("reading", {"point": "drain"}))
    groups.append(Group("house", (*house, NOTE, TIME)))
    return Spec("Reading", tuple(parts), tuple(groups), help=ROUND_HELP)


ROUND_HELP = (
    "The morning round in its order. Type a number and press Enter; the last value stands beside each field. "
    "Empty means not measured. + saves from any field, * takes the last value again, Tab goes to the next group. "
    "Both . and , are decimal marks; a unit may follow the number. Litres without a time cover the time since the "
    "last entry."
)


def ions(unit: str, entry: int = 0) -> tuple[Asked, ...]:
    """One field an ion, named by the species that its unit means: mg/L of nitrogen for nitrate and ammonium."""
    return tuple(_ion(ion, unit, entry) for ion in IONS)


def _ion(ion: str, unit: str, entry: int) -> Asked:
    if unit != "mg/L":
        return Asked(
            ion,
            "HCO3 (alkal.)" if ion == "HCO3" else "P (H2PO4)" if ion == "H2PO4" else ion,
            "meq/L" if ion == "HCO3" else unit,
            entry,
        )
    from fertui.quantities import shown_in

    written, species = shown_in(ion, unit)
    return Asked(species or ion, species or ion, written, entry)


def micronutrients(entry: int = 0) -> tuple[Asked, ...]:
    """One field a micronutrient."""
    return tuple(Asked(name, name, "umol/L", entry) for name in MICRONUTRIENTS)


def analysis(site: Site, loop: Loop, unit: str) -> Spec:
    """A laboratory's report."""
    about = (
        Asked("point", "point", choices=points_of(loop), default=points_of(loop)[1], required=True),
        Asked("at", "sampled", words=True),
    )
    rest = (
        Asked("EC", "EC", "mS/cm"), Asked("pH", "pH"), Asked("lab", "lab", words=True), Asked("sample", "number",
        words=True),
        Asked("method", "method", choices=("", *METHODS)), Asked("doubtful", "doubtful", words=True), NOTE,
    )  # fmt: skip
    groups = (
        Group("sample", about),
        Group("ions", ions(unit)),
        Group("micronutrients", micronutrients()),
        Group("report", rest),
    )
    return Spec("Analysis", (Part("analysis"),), groups, columns=2, help=ANALYSIS_HELP, unit=unit)


ANALYSIS_HELP = (
    "The laboratory's report. Give when the sample was taken, not when the report came: the estimate uses it at "
    "its own time. "
    "The unit beside a field is what a bare number is taken in; u changes it for the whole form before anything "
    "is typed, "
    "and a number may carry its own (120 mg/L). In mg/L nitrogen, phosphorus and sulphur are meant as elements, "
    "as the field says. "
    "<0.1 means below what the laboratory can see. Charge balance and EC check show below and are looked at "
    "before saving."
)


def water(site: Site, loop: Loop, unit: str) -> Spec:
    """Litres and meter positions."""
    sources = tuple(each.name for each in site.waters)
    fields = (
        Asked("make_up", "make-up", "L"), Asked("irrigation", "irrigation", "L"), Asked("drain", "drain", "L"),
        Asked("condensate", "condensate", "L"), Asked("crop", "taken by the crop", "L"),
        Asked("source", "source", choices=sources, default=loop.water or (sources[0] if sources else "")),
    )  # fmt: skip
    positions = (
        Asked("make_up_meter", "make-up meter", "L"), Asked("irrigation_meter", "irrigation meter", "L"),
        Asked("drain_meter", "drain meter", "L"), Asked("meter", "meter was", choices=("", "replaced", "rolled over")),
    )  # fmt: skip
    return Spec(
        "Water", (Part("water"),), (Group("litres of the whole loop", fields), Group("or meter positions",
        positions), Group("", (TIME, NOTE))),
        help=(
            "Litres since the last entry, of the whole loop, never per m2; or what the meters show. "
            "A date without a time means that whole day."
        ),
    )  # fmt: skip


def dose(site: Site, loop: Loop, unit: str) -> Spec:
    """A salt weighed in by hand, done."""
    fields = (
        Asked("salt", "salt", choices=salts_of(site), required=True), Asked("kg", "weighed", "kg", required=True),
        Asked("tank", "into", choices=containers_of(site, loop), default=containers_of(site, loop)[0]),
    )  # fmt: skip
    return Spec(
        "Dose done",
        (Part("dose"),),
        (Group("dose", fields), Group("", (TIME, NOTE))),
        help=(
            "What was weighed in by hand. "
            "A planned dose is better marked done in the plan (6): it keeps plan and dose together."
        ),
    )


def batch(site: Site, loop: Loop, unit: str) -> Spec:
    """A stock tank mixed."""
    about = (
        Asked("tank", "tank", choices=tanks_of(site, loop), default=(tanks_of(site, loop) or ("",))[0], required=True),
        Asked("litres", "mixed to", "L", required=True), Asked("left", "old solution left", "L"), Asked("recipe",
        "recipe", words=True),
    )  # fmt: skip
    salts = tuple(Asked(name, name, "kg") for name in salts_of(site))
    return Spec(
        "Batch mixed",
        (Part("batch"),),
        (Group("tank", about), Group("salts", salts), Group("", (TIME, NOTE))),
        help="A stock tank mixed: litres in all, what was left of the old solution, and every salt as weighed.",
    )


def stock(site: Site, loop: Loop, unit: str) -> Spec:
    """Stock solution used."""
    tanks = tanks_of(site, loop)
    fields = tuple(Asked("litres", tank, "L", number) for number, tank in enumerate(tanks))
    return Spec(
        "Stock used",
        tuple(Part("stock", {"tank": tank}) for tank in tanks),
        (Group("litres used", fields), Group("", (TIME, NOTE))),
        help="Litres of stock used since the last entry. Unequal draw is a fault of the doser and is looked for.",
    )


def acid(site: Site, loop: Loop, unit: str) -> Spec:
    """Acid or lye used."""
    acids = acids_of(site)
    fields = (
        Asked("acid", "acid or lye", choices=acids, default=acids[0] if acids else "", required=True),
        Asked("strength", "strength on label", "%"), Asked("litres", "used", "L", required=True),
        Asked("tank", "into", choices=containers_of(site, loop), default=containers_of(site, loop)[0]),
        Asked("pH_before", "pH before", ""), Asked("pH_after", "pH after mixing", ""),
        Asked("cautions", "cautions", choices=("not acknowledged", "acknowledged"), default="not acknowledged"),
    )  # fmt: skip
    return Spec(
        "Acid or lye used",
        (Part("acid"),),
        (Group("acid", fields), Group("", (TIME, NOTE))),
        help=(
            "What was used. Logging always works; it is marked if the cautions were not acknowledged. "
            "Safety data sheet, site procedure, local code and licensed practice come first."
        ),
    )


def bleed(site: Site, loop: Loop, unit: str) -> Spec:
    """Solution discharged."""
    usual = {"shared-tank": "tank", "drain-blend": "drain_store", "known-feed": "drain"}[loop.layout]
    fields = (
        Asked("litres", "discharged", "L", required=True),
        Asked("from", "from", choices=("tank", "drain", "drain_store"), default=usual),
        Asked("reason", "reason", words=True, required=True), Asked("route", "where it went", words=True),
    )  # fmt: skip
    return Spec(
        "Bleed",
        (Part("bleed"),),
        (Group("discharged", fields), Group("", (TIME, NOTE))),
        help=(
            "Solution let go, with the reason: renewal, sodium, filter back-flush, leak, disinfection. "
            "The report counts its nitrogen and phosphorus."
        ),
    )


def level(site: Site, loop: Loop, unit: str) -> Spec:
    """Litres in tanks."""
    tanks = containers_of(site, loop)
    fields = tuple(Asked("litres", tank.replace("_", " "), "L", number) for number, tank in enumerate(tanks))
    return Spec(
        "Levels",
        tuple(Part("level", {"tank": tank}) for tank in tanks),
        (Group("litres in", fields), Group("", (TIME, NOTE))),
        help="What each tank holds now.",
    )


def crop(site: Site, loop: Loop, unit: str) -> Spec:
    """A new start or a stage."""
    fields = (
        Asked("event", "what happened", choices=("", "planted", "replanted", "new medium", "emptied", "refilled",
        "removed")),
        Asked("stage", "stage reached", words=True), Asked("crop", "crop, if new", words=True), Asked("medium",
        "medium, if new", words=True),
    )  # fmt: skip
    return Spec(
        "Crop",
        (Part("crop"),),
        (Group("crop", fields), Group("", (TIME, NOTE))),
        help="A new start (the estimate begins anew) or a stage reached.",
    )


def calibration(site: Site, loop: Loop, unit: str) -> Spec:
    """An instrument against a standard."""
    names = tuple(each.name for each in site.instruments)
    which = (
        Asked("instrument", "instrument", choices=names, default=names[0])
        if names
        else Asked("instrument", "instrument", words=True)
    )
    fields = (
        which, Asked("quantity", "quantity", choices=("EC", "pH", "NO3", "K", "Ca", "Na", "kg"), default="EC",
        required=True),
        Asked("standard", "standard", required=True), Asked("reading", "it showed", required=True),
        Asked("temperature", "temperature", "C"),
        Asked("result", "result", choices=("", "good", "adjusted", "off", "replaced")),
    )  # fmt: skip
    return Spec(
        "Calibration",
        (Part("calibration"),),
        (Group("calibration", fields), Group("", (TIME, NOTE))),
        help="What the standard is, what the instrument showed, what was done. EC in mS/cm.",
    )


def sample(site: Site, loop: Loop, unit: str) -> Spec:
    """A sample on its way."""
    fields = (
        Asked("point", "point", choices=points_of(loop), default=points_of(loop)[1]),
        Asked("status", "status", choices=("sent", "awaited", "arrived", "lost"), default="sent", required=True),
        Asked("lab", "lab", words=True), Asked("sample", "number", words=True), Asked("expected", "report expected",
        words=True),
        Asked("method", "method", choices=("", *METHODS)),
    )  # fmt: skip
    return Spec(
        "Sample",
        (Part("sample"),),
        (Group("sample", fields), Group("", (TIME, NOTE))),
        help="A sample sent or awaited: Today reminds of it until its analysis is logged.",
    )


def note(site: Site, loop: Loop, unit: str) -> Spec:
    """Words."""
    return Spec(
        "Note",
        (Part("note"),),
        (Group("note", (Asked("text", "text", words=True, required=True), TIME)),),
        help="Whatever is worth remembering: the next shift reads it.",
    )


def setpoint(site: Site, loop: Loop, unit: str) -> Spec:
    """Set points."""
    fields = (
        Asked("EC", "EC", "mS/cm"), Asked("pH", "pH"), Asked("drain_share", "drain share", ""), Asked("premix_ec",
        "pre-mix EC", "mS/cm"),
    )  # fmt: skip
    light = (
        Asked("EC_dull", "EC, dull day", "mS/cm"), Asked("light_dull", "dull up to", "J/cm2"),
        Asked("EC_bright", "EC, bright day", "mS/cm"), Asked("light_bright", "bright from", "J/cm2"),
    )  # fmt: skip
    return Spec(
        "Set points",
        (Part("setpoint"),),
        (Group("from now on", fields), Group("by light", light), Group("", (TIME, NOTE))),
        help="Set points from now on.",
    )


def recipe(site: Site, loop: Loop, unit: str) -> Spec:
    """A feed composition."""
    about = (Asked("name", "name", words=True), TIME)
    rest = (Asked("EC", "EC", "mS/cm"), Asked("pH", "pH"), NOTE)
    groups = (
        Group("recipe", about),
        Group("ions", ions(unit)),
        Group("micronutrients", micronutrients()),
        Group("feed", rest),
    )
    return Spec(
        "Recipe",
        (Part("recipe"),),
        groups,
        columns=2,
        help="The feed composition that the stocks carry from now on.",
        unit=unit,
    )


def disinfection(site: Site, loop: Loop, unit: str) -> Spec:
    """Disinfection."""
    fields = (
        Asked("treatment", "treatment", words=True, required=True), Asked("litres", "treated", "L"),
        Asked("dose", "dose", words=True), Asked("tank", "tank", choices=("", *containers_of(site, loop))),
    )  # fmt: skip
    return Spec(
        "Disinfection",
        (Part("disinfection"),),
        (Group("disinfection", fields), Group("", (TIME, NOTE))),
        help="UV, heat, ozone, peroxide, chlorine, slow filter. Never bring acid and hypochlorite together.",
    )


FORMS: Mapping[str, Callable[[Site, Loop, str], Spec]] = {
    each.__name__: each
    for each in (reading, analysis, water, dose, batch, stock, acid, bleed, level, crop, calibration, sample, note,
    setpoint, recipe, disinfection)
}  # fmt: skip
"""Forms by kind. A plan comes from the Plan view and a changed site from the Site view, not from a form."""
