"""What a source water holds: by its last analysis in the logbook, ion by ion, else as the site file says."""

from __future__ import annotations

from collections.abc import Iterable
from datetime import datetime

from fertui.chemistry.names import IONS, MICRONUTRIENTS
from fertui.logbook.entries import Entry
from fertui.site.model import Composition, Loop, Site, Water


def water_analyses(site: Site, entries: Iterable[Entry]) -> dict[str, list[tuple[datetime, Composition]]]:
    """Every water of the site that was analysed, in lower case: what it holds from each analysis on, oldest first.

    Entries of all loops, as loops share waters. What an analysis does not name stays as it was known before. A doubtful
    one is left out; one that names no water is of the loop's own.
    """
    known = {water.name.lower(): water.composition for water in site.waters}
    found: dict[str, list[tuple[datetime, Composition]]] = {}
    for entry in sorted(entries, key=lambda each: each.at):
        if is_of_water(entry) and not entry.doubtful:
            name = water_of(site, entry).lower()
            known[name] = _renewed(known.get(name, Composition()), entry)
            found.setdefault(name, []).append((entry.at, known[name]))
    return found


def is_of_water(entry: Entry) -> bool:
    """Whether an entry is the analysis of a source water.

    >>> at = datetime(2026, 3, 1)
    >>> is_of_water(Entry("analysis", "bay", at, at, "MK", (), point="source"))
    True
    """
    return entry.kind == "analysis" and entry.point == "source"


def as_analysed(site: Site, entries: Iterable[Entry], at: datetime) -> Site:
    """The site with its waters as last analysed at a time; the source of each says by which entry."""
    known = water_analyses(site, (entry for entry in entries if entry.at <= at))
    if not known:
        return site
    waters = tuple(
        Water(water.name, known[water.name.lower()][-1][1]) if water.name.lower() in known else water
        for water in site.waters
    )
    return site._replace(waters=waters)


def make_up_of(site: Site, loop: Loop) -> str:
    """Name of the water a loop is topped up with: its own, else the first of the site."""
    return loop.water or (site.waters[0].name if site.waters else "")


def water_of(site: Site, entry: Entry) -> str:
    """Name of the water an analysis is of: the one it names, else what its loop is topped up with."""
    loop = next((loop for loop in site.loops if loop.name == entry.loop), site.loops[0])
    return entry.text_of("source") or make_up_of(site, loop)


def alkalinity_from(site: Site, loop: Loop, entries: Iterable[Entry], at: datetime) -> str:
    """Where the alkalinity of a loop's make-up water is known from at a time, '' where it is not.

    The last analysis that names it; a later one of other ions leaves it as it was.
    """
    name = make_up_of(site, loop).lower()
    named = (entry for entry in entries if entry.at <= at and _says(entry, "HCO3"))
    found = max(
        (entry for entry in named if water_of(site, entry).lower() == name), key=lambda each: each.at, default=None
    )
    if found is not None:
        return _called(found)
    written = next((water.composition for water in site.waters if water.name.lower() == name), Composition())
    if "HCO3" not in written.ions:
        return ""
    return f"site.toml ({written.source})" if written.source else "site.toml"


def _says(entry: Entry, ion: str) -> bool:
    return is_of_water(entry) and not entry.doubtful and entry.number_of(ion) is not None


def _called(entry: Entry) -> str:
    day = f"{entry.at:%-d %b %Y}"
    return f"analysis {entry.number} of {day}" if entry.number else f"analysis of {day}"


def _renewed(before: Composition, entry: Entry) -> Composition:
    numbers = {value.name: value.number for value in entry.values if value.number is not None}
    return Composition(
        {**before.ions, **{name: numbers[name] for name in IONS if name in numbers}},
        {**before.micronutrients, **{name: numbers[name] for name in MICRONUTRIENTS if name in numbers}},
        numbers.get("EC", before.ec),
        numbers.get("pH", before.ph),
        _called(entry),
    )
