"""Cautions for what is on the shelf: by substance and strength, by pair, for the loop; each with its source."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from functools import cache
from itertools import combinations
from typing import Any, NamedTuple

from fertui.catalogue.acids import Acid
from fertui.catalogue.figures import Provenance, table
from fertui.catalogue.salts import Salt
from fertui.catalogue.supplies import Shelved, of_supply, substance

SEVERITIES = ("danger", "warning", "note")
"""Worst first, after the signal words of hazard labels."""


class Caution(NamedTuple):
    """One caution: a stable code, its severity, what it says, and where that comes from."""

    code: str
    severity: str
    text: str
    source: str


def first() -> Caution:
    """The caution that stands before all others.

    >>> first().code
    'sds-first'
    """
    return _caution(_data()["first"])


def cautions_of(supplies: Iterable[Shelved], pairs: bool = True) -> tuple[Caution, ...]:
    """What to say before anybody handles these supplies: the data sheet first, then worst first, none twice.

    Hazard statements name the strength that was entered. ``pairs``: also what must not meet on the shelf.
    Raises ``CatalogueError`` for a supply the catalogue refuses.
    """
    shelf = [(supply, of_supply(supply)) for supply in supplies]
    found = [each for supply, what in shelf for each in _of_one(supply.name, what, supply.strength_pct)]
    if pairs:
        found += incompatibilities([what.name for _, what in shelf])
    ranked = sorted(dict.fromkeys(found), key=lambda each: SEVERITIES.index(each.severity))
    return (first(), *ranked)


def cautions_for(kind: str, strength_pct: float | None = None) -> tuple[Caution, ...]:
    """What to say about one substance of the catalogue at a strength [mass %; None: as sold], the data sheet first.

    >>> [each.code for each in cautions_for("nitric acid", 60)][:2]
    ['sds-first', 'acid-protection']
    """
    what = substance(kind)
    return (first(), *dict.fromkeys(_of_one(_title(what, strength_pct), what, strength_pct)))


def incompatibilities(kinds: Iterable[str], where: str = "shelf") -> tuple[Caution, ...]:
    """What must not meet among these substances: ``where`` "shelf" (as sold) or "stock" (in one stock tank).

    >>> [each.code for each in incompatibilities(["magnesium sulfate", "calcium nitrate tetrahydrate"], "stock")]
    ['calcium-sulfate']
    """
    members = [families(kind) for kind in dict.fromkeys(kinds)]
    found = (
        _caution(pair)
        for pair in _data()["pairs"]
        if pair["where"] in (where, "anywhere")
        if any(_meet(pair["families"], one, other) for one, other in combinations(members, 2))
    )
    return tuple(found)


def loop_cautions() -> tuple[Caution, ...]:
    """What holds for every recirculating loop that is dosed."""
    return tuple(_caution(each) for each in _data()["loop"])


def families(kind: str) -> frozenset[str]:
    """What a substance is when it meets others: calcium, sulfate, phosphate, acid, alkali, oxidiser, chelate ...

    >>> sorted(families("potassium sulfate"))
    ['sulfate']
    """
    what = substance(kind)
    if isinstance(what, Acid):
        return _acid_families(what)
    by_ion = {"Ca": "calcium", "Mg": "magnesium", "SO4": "sulfate", "H2PO4": "phosphate", "NH4": "ammonium"}
    found = {family for ion, family in by_ion.items() if ion in what.gives}
    found |= {each for each in ("hypochlorite", "chlorite", "peroxide", "silicate") if each in what.cautions}
    if what.use == "alkali":
        found.add("alkali")
    if what.complex_charge is not None:
        found.add("chelate")
    elif {"Zn", "Mn", "Cu", "Fe"} & set(what.gives):
        found.add("free metal")
    if "NO3" in what.gives:
        found.add("oxidiser")
    if what.name == "ammonium nitrate":
        found.add("ammonium nitrate")
    if "Cl" in what.gives and what.use == "nutrient":
        found.add("chloride")
    return frozenset(found)


def _acid_families(what: Acid) -> frozenset[str]:
    precipitating = {"H2PO4", "SO4"} & set(what.gives)
    return frozenset({"acid", what.name} | ({"phosphoric or sulfuric acid"} if precipitating else set()))


def _meet(pair: list[str], one: frozenset[str], other: frozenset[str]) -> bool:
    left, right = pair
    return (left in one and right in other) or (right in one and left in other)


def _of_one(name: str, what: Salt | Acid, strength_pct: float | None) -> list[Caution]:
    """Cards, hazard statements and precursor notice of one substance."""
    pct = 100.0 if strength_pct is None else strength_pct
    cards = [
        _caution(card)
        for card in _data()["cautions"]
        if set(card["of"]) & set(what.cautions) and card.get("from_pct", 0) <= pct < card.get("below_pct", 101)
    ]
    labels = [_label(name, what, strength_pct, hazard, source) for hazard, source in _hazards(what, strength_pct)]
    notices = [
        Caution(f"precursor-{notice['of']}", "note", f"{name}: {notice['text']}", _source("precursor"))
        for notice in _data()["precursors"]
        if notice["of"] in what.cautions and pct > notice["above_pct"]
    ]
    return [*cards, *labels, *notices]


def _hazards(what: Salt | Acid, strength_pct: float | None) -> list[tuple[Mapping[str, Any], str]]:
    """The strength band of each hazard entry of a substance, with its source."""
    pct = 100.0 if strength_pct is None else strength_pct
    return [
        (band, entry["source"])
        for entry in _data()["hazards"]
        if entry["of"] in what.cautions
        for band in entry["bands"]
        if band["from_pct"] <= pct < band["below_pct"]
    ]


def _label(name: str, what: Salt | Acid, pct: float | None, hazard: Mapping[str, Any], source: str) -> Caution:
    wordings = _data()["statements"]
    said = "; ".join(f"{code} {wordings[code]}" for code in hazard["statements"])
    at = "" if pct is None or f"{pct:g} %" in name else f" {pct:g} %"
    text = f"{name}{at}: {said}. The label of the product counts."
    return Caution(f"label-{what.cautions[-1]}", hazard["signal"], text, _source(source))


def _title(what: Salt | Acid, strength_pct: float | None) -> str:
    return what.name if strength_pct is None else f"{what.name} {strength_pct:g} %"


def _caution(entry: Mapping[str, Any]) -> Caution:
    return Caution(entry["code"], entry["severity"], entry["text"], _source(entry["source"]))


def _source(key: str) -> str:
    return Provenance(**_data()["sources"][key]).shown


@cache
def _data() -> dict[str, Any]:
    return table("cautions")
