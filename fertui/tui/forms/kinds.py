"""The form of every kind of entry, for a loop as its site describes it."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import TYPE_CHECKING

from fertui.site.points import point_name
from fertui.tui.forms.choices import (
    METHODS,
    NOTE,
    TIME,
    acids_of,
    containers_of,
    points_of,
    salts_of,
    tanks_of,
    usual_point,
)
from fertui.tui.forms.compositions import analysis, recipe
from fertui.tui.forms.spec import Asked, Group, Part, Spec

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


def form_for(kind: str, site: Site, loop: Loop, unit: str) -> Spec:
    """The form of a kind for a loop; ``unit`` is what a bare number for an ion is taken in."""
    return FORMS[kind](site, loop, unit)


def meters(point: str, entry: int, layout: str, temperature: bool = True) -> Group:
    """EC, pH and temperature at a point."""
    fields = [Asked("EC", "EC", "mS/cm", entry), Asked("pH", "pH", "", entry)]
    if temperature:
        fields.append(Asked("temperature", "temperature", "C", entry))
    return Group(point_name(point, layout), tuple(fields))


def reading(site: Site, loop: Loop, unit: str) -> Spec:
    """The morning round: the seven numbers of the mixing room first, then the house."""
    where = "tank" if loop.layout == "shared-tank" else "feed"
    parts = [Part("reading", {"point": where}), Part("water", {"source": loop.water} if loop.water else {})]
    used = [Asked("make_up", "make-up water", "L", 1)]
    for tank in tanks_of(site, loop):
        used.append(Asked("litres", f"stock {tank}", "L", len(parts)))
        parts.append(Part("stock", {"tank": tank}))
    for acid in acids_of(site)[:1]:
        used.append(Asked("litres", acid, "L", len(parts)))
        parts.append(Part("acid", {"acid": acid}))
    groups = [meters(where, 0, loop.layout), Group("used since the last round", tuple(used))]
    house = [Asked("light_sum", "light of the day", "J/cm2", 0)]
    if loop.layout != "shared-tank":
        came_back = meters("drain", len(parts), loop.layout, temperature=False)
        groups.append(Group("drain", (*came_back.fields, Asked("drain_pct", "drain of irrigation", "%", len(parts)))))
        parts.append(Part("reading", {"point": "drain"}))
    groups.append(Group("house", (*house, NOTE, TIME)))
    return Spec("Reading", tuple(parts), tuple(groups), help=ROUND_HELP)


ROUND_HELP = (
    "The morning round in its order. Type a number and press Enter; the last value stands beside each field. "
    "Empty means not measured. After the last field Enter saves and opens the round of the next loop; + saves from any "
    "field and ends here. * takes the last value again, Tab goes to the next group. "
    "Both . and , are decimal marks; a unit may follow the number. Litres without a time cover the time since the "
    "last entry."
)


def water(site: Site, loop: Loop, unit: str) -> Spec:
    """Litres and meter positions."""
    sources = tuple(each.name for each in site.waters)
    fields = (
        Asked("make_up", "make-up water", "L"), Asked("irrigation", "irrigation", "L"), Asked("drain", "drain", "L"),
        Asked("condensate", "condensate", "L"), Asked("crop", "taken by the crop", "L"),
        Asked("source", "source water", choices=sources, default=loop.water or (sources[0] if sources else "")),
    )  # fmt: skip
    positions = (
        Asked("make_up_meter", "make-up water meter", "L"), Asked("irrigation_meter", "irrigation meter", "L"),
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
        Asked("point", "point", choices=points_of(loop), default=usual_point(loop)),
        Asked("status", "status", choices=("sent", "awaited", "arrived", "lost"), default="sent", required=True),
        Asked("lab", "lab", words=True), Asked("sample", "number", words=True), Asked("expected", "report expected",
        words=True),
        Asked("method", "method", choices=METHODS),
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
