"""The kinds of entry and the fields of each: one table that input, forms, import, export and docs share."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import NamedTuple

from fertui.logbook.errors import LogbookError

WRITTEN_ABOUT_EVERY_ENTRY = ("at", "by", "point", "zone", "method", "instrument", "note", "doubtful")
"""Names every kind takes beside its own values: when, who, where, how, and words."""

METHODS = ("pore", "extract_1_1.5", "paste", "pour_through")
"""How a root-zone sample was taken; everything but ``pore`` needs the site's factor before it is compared."""


class Field(NamedTuple):
    """One value of a kind.

    ``what`` is one of the keys of ``UNITS``; the canonical number is in that unit. Outside ``low`` .. ``high`` a number
    is refused (it cannot be), outside ``usual_low`` .. ``usual_high`` it is asked about. All four are common practice,
    no source: they catch wrong units and slips of the hand, and say nothing about what is good for a crop.
    """

    name: str
    what: str
    about: str = ""
    required: bool = False
    words: tuple[str, ...] = ()
    low: float | None = None
    high: float | None = None
    usual_low: float | None = None
    usual_high: float | None = None

    @property
    def unit(self) -> str:
        """Canonical unit, '' for words."""
        return "meq/L" if self.name == "HCO3" else UNITS[self.what]

    @property
    def is_number(self) -> bool:
        """Whether the canonical form is a number."""
        return self.what not in WORDLIKE


class Kind(NamedTuple):
    """A kind of entry. ``salts``: further values named by supply or salt, in kg. ``sampled``: it belongs to a point.

    ``spans``: its amounts cover a time; without a time of day, the whole local day.
    """

    name: str
    about: str
    fields: tuple[Field, ...]
    salts: bool = False
    sampled: bool = False
    spans: bool = False

    def field(self, name: str) -> Field | None:
        """The field of exactly that name, or None."""
        return next((field for field in self.fields if field.name == name), None)

    @property
    def names(self) -> tuple[str, ...]:
        """Names of its fields in the order of the table."""
        return tuple(field.name for field in self.fields)


UNITS: Mapping[str, str] = {
    "ion": "mmol/L", "micronutrient": "umol/L", "EC": "mS/cm", "pH": "", "temperature": "C", "light": "J/cm2",
    "litres": "L", "litres a day": "L/d", "meter": "L", "kg": "kg", "percent": "%", "fraction": "", "number": "",
    "entry": "", "time": "s", "word": "", "name": "", "tank": "", "salt": "", "acid": "", "water": "", "text": "",
}  # fmt: skip
"""What a field can be, with its canonical unit. EC is at 25 C; ``time`` is kept as seconds since 1970 UTC."""

WORDLIKE = ("word", "name", "tank", "salt", "acid", "water", "text")


def _ions() -> tuple[Field, ...]:
    limits = {
        "K": (0, 100, 0, 30), "Ca": (0, 60, 0, 20), "Mg": (0, 60, 0, 12), "Na": (0, 500, 0, 25), "NH4": (0, 50, 0, 5),
        "NO3": (0, 200, 0, 40), "Cl": (0, 500, 0, 25), "SO4": (0, 100, 0, 25), "H2PO4": (0, 30, 0, 5),
        "HCO3": (-50, 50, -2, 12),
    }  # fmt: skip
    return tuple(Field(ion, "ion", "", False, (), *map(float, four)) for ion, four in limits.items())


def _micronutrients() -> tuple[Field, ...]:
    limits = {
        "Fe": (0, 2000, 0, 150), "Mn": (0, 1000, 0, 60), "Zn": (0, 1000, 0, 60), "B": (0, 5000, 0, 200),
        "Cu": (0, 500, 0, 15), "Mo": (0, 200, 0, 8), "Si": (0, 10000, 0, 2500),
    }  # fmt: skip
    return tuple(Field(name, "micronutrient", "", False, (), *map(float, four)) for name, four in limits.items())


EC = Field("EC", "EC", "electrical conductivity at 25 C", low=0, high=30, usual_low=0, usual_high=10)
PH = Field("pH", "pH", "acidity", low=0, high=14, usual_low=3.5, usual_high=8.8)
TEMPERATURE = Field("temperature", "temperature", "of the sample", low=-5, high=60, usual_low=4, usual_high=35)
LIGHT_SUM = Field("light_sum", "light", "global radiation of the day", low=0, high=4000, usual_high=3300)
IONS = _ions()
MICRONUTRIENTS = _micronutrients()
WATER_NAME = Field("source", "water", "the water by its name at this site")


def _litres(name: str, about: str, required: bool = False) -> Field:
    return Field(name, "litres", about, required, low=0, high=1e8)


def _a_day(name: str, about: str) -> Field:
    return Field(name, "litres a day", about, low=0, high=1e8)


def _meter(name: str, about: str) -> Field:
    return Field(name, "meter", about, low=0, high=1e12)


def _kg(required: bool) -> Field:
    return Field("kg", "kg", "weighed", required, low=0, high=20000)


def _tank(required: bool = False) -> Field:
    return Field("tank", "tank", "tank, drain store or stock tank by name", required)


def _word(name: str, about: str, words: Iterable[str], required: bool = False) -> Field:
    return Field(name, "word", about, required, tuple(words))


KILOGRAMS = _kg(False)
PLAN_NUMBER = Field("plan", "entry", "number of the plan entry this carries out", low=1, high=1e12)
FEED_STEP = (
    Field("EC_dull", "EC", "EC set point on a dull day", low=0, high=30, usual_high=10),
    Field("EC_bright", "EC", "EC set point on a bright day", low=0, high=30, usual_high=10),
    Field("light_dull", "light", "up to this light sum the day counts as dull", low=0, high=4000),
    Field("light_bright", "light", "from this light sum the day counts as bright", low=0, high=4000),
)

KINDS: Mapping[str, Kind] = {
    kind.name: kind
    for kind in (
        Kind(
            "reading",
            "what meters and hand instruments show",
            (
                EC,
                PH,
                TEMPERATURE,
                *IONS,
                *MICRONUTRIENTS,
                LIGHT_SUM,
                Field("drain_pct", "percent", "drain as a percentage of irrigation", low=0, high=100, usual_high=80),
                WATER_NAME,
            ),
            sampled=True,
        ),
        Kind(
            "analysis",
            "a laboratory's report",
            (
                EC,
                PH,
                TEMPERATURE,
                *IONS,
                *MICRONUTRIENTS,
                Field("lab", "name", "laboratory"),
                Field("sample", "name", "the laboratory's number of the sample"),
                WATER_NAME,
            ),
            sampled=True,
        ),
        Kind(
            "water",
            "litres of water, of the whole loop",
            (
                _litres("make_up", "make-up water added"),
                WATER_NAME,
                _litres("irrigation", "given to the crop"),
                _litres("drain", "come back from the crop"),
                _litres("condensate", "condensate added"),
                _litres("crop", "taken by the crop"),
                _meter("make_up_meter", "position of the make-up water meter"),
                _meter("irrigation_meter", "position of the irrigation water meter"),
                _meter("drain_meter", "position of the drain water meter"),
                _word("meter", "what happened to the meter", ("replaced", "rolled over")),
            ),
            spans=True,
        ),
        Kind("level", "what a tank holds", (_tank(), _litres("litres", "in the tank", True))),
        Kind(
            "dose",
            "salt weighed into a tank by hand, done",
            (Field("salt", "salt", "supply or salt", True), _kg(True), _tank(), PLAN_NUMBER),
        ),
        Kind("stock", "stock solution used", (_tank(True), _litres("litres", "used", True)), spans=True),
        Kind(
            "batch",
            "a stock tank mixed; salts by name with their kg",
            (
                _tank(True),
                _litres("litres", "mixed, in all", True),
                Field("recipe", "name", "the recipe it carries: name or entry number"),
                _litres("left", "old solution left in the tank when it was mixed"),
            ),
            salts=True,
        ),
        Kind(
            "recipe",
            "the feed composition that the stocks carry from now on",
            (Field("name", "name", "name of the recipe"), EC, PH, *IONS, *MICRONUTRIENTS, PLAN_NUMBER),
        ),
        Kind(
            "setpoint",
            "set points from now on",
            (
                EC,
                PH,
                *FEED_STEP,
                Field("drain_share", "fraction", "share of drain in the blend, 0 to 1", low=0, high=1),
                Field("premix_EC", "EC", "EC of drain and water before stock is added", low=0, high=30),
            ),
        ),
        Kind(
            "acid",
            "acid or lye used",
            (
                Field("acid", "acid", "supply or acid", True),
                Field("strength", "percent", "read off the label, by weight", low=0.1, high=100),
                _litres("litres", "used", True),
                _tank(),
                Field("pH_before", "pH", "before this split", low=0, high=14),
                Field("pH_after", "pH", "after mixing", low=0, high=14),
                _word("cautions", "whether the cautions were read", ("acknowledged", "not acknowledged")),
                PLAN_NUMBER,
            ),
            spans=True,
        ),
        Kind(
            "bleed",
            "solution discharged",
            (
                _litres("litres", "discharged", True),
                _word("from", "where it was taken", ("tank", "drain", "drain_store")),
                Field("reason", "name", "renewal, sodium, filter back-flush, leak, disinfection ...", True),
                Field("route", "name", "where it went"),
                PLAN_NUMBER,
            ),
            spans=True,
        ),
        Kind(
            "plan",
            "what is intended; never counted as done",
            (
                EC,
                PH,
                *IONS,
                *MICRONUTRIENTS,
                LIGHT_SUM,
                _a_day("make_up", "coming make-up water"),
                _a_day("irrigation", "coming irrigation"),
                _a_day("drain", "coming drain"),
                _a_day("crop", "coming crop water"),
                WATER_NAME,
                Field("salt", "salt", "supply or salt to dose"),
                _kg(False),
                Field("acid", "acid", "supply or acid to dose"),
                _litres("litres", "of the acid"),
                _litres("bleed", "to discharge"),
                _tank(),
                Field("recipe", "name", "recipe to change to: name or entry number"),
                Field("until", "time", "end of what is intended"),
            ),
        ),
        Kind(
            "crop",
            "a new start of the crop, its medium or its tank, or a stage reached",
            (
                _word(
                    "event", "what happened", ("planted", "replanted", "new medium", "emptied", "refilled", "removed")
                ),
                Field("stage", "name", "stage of the crop"),
                Field("crop", "name", "the crop, where it changes"),
                Field("medium", "name", "the medium, where it changes"),
                _tank(),
            ),
        ),
        Kind(
            "disinfection",
            "disinfection of water or lines",
            (
                Field("treatment", "name", "UV, heat, ozone, peroxide, chlorine, slow filter ...", True),
                _litres("litres", "treated"),
                Field("dose", "name", "dose as written on the device or label"),
                _tank(),
            ),
            spans=True,
        ),
        Kind(
            "calibration",
            "an instrument held against a standard (instrument=)",
            (
                Field("quantity", "name", "EC, pH, NO3 ...", True),
                Field("standard", "number", "what the standard is", True, low=-1e6, high=1e6),
                Field("reading", "number", "what the instrument showed", True, low=-1e6, high=1e6),
                TEMPERATURE,
                _word("result", "what was done", ("good", "adjusted", "off", "replaced")),
            ),
        ),
        Kind(
            "sample",
            "a sample on its way",
            (
                _word("status", "where it stands", ("sent", "awaited", "arrived", "lost"), True),
                Field("lab", "name", "laboratory"),
                Field("sample", "name", "number of the sample"),
                Field("expected", "time", "when the report should come"),
                WATER_NAME,
            ),
            sampled=True,
        ),
        Kind("site", "a changed site.toml, kept whole", (Field("text", "text", "the file as written", True),)),
        Kind("note", "words", (Field("text", "text", "what is to be remembered"),)),
    )
}
"""Every kind by name, in the order of the design's table."""


def unit_of(kind: Kind, name: str) -> str:
    """Canonical unit of a value of a kind by its name; kg for the salts of a batch.

    >>> unit_of(KINDS["plan"], "HCO3"), unit_of(KINDS["plan"], "drain"), unit_of(KINDS["batch"], "MKP")
    ('meq/L', 'L/d', 'kg')
    """
    field = kind.field(name)
    return "kg" if field is None else field.unit


def kind_named(name: str) -> Kind:
    """The kind of that name.

    Raises ``LogbookError`` with the nearest known kind.

    >>> kind_named("level").names
    ('tank', 'litres')
    """
    if name in KINDS:
        return KINDS[name]
    raise LogbookError(f"{name!r} is not a kind of entry{nearest(name, KINDS)}. Kinds: {', '.join(KINDS)}.")


def nearest(name: str, known: Iterable[str]) -> str:
    """Words that offer the nearest known name, '' when none is near.

    >>> nearest("redaing", ["reading", "water"])
    "; did you mean 'reading'"
    """
    import difflib

    by_lower = {each.lower(): each for each in known}
    found = difflib.get_close_matches(name.lower(), by_lower, n=1, cutoff=0.6)
    return f"; did you mean {by_lower[found[0]]!r}" if found else ""
