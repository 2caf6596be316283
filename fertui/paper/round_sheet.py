"""The blank round sheet: what a loop's round writes down, in its order, with what stood there last and when."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from datetime import datetime, timedelta

from fertui.chemistry.names import IONS
from fertui.logbook.entries import Entry
from fertui.paper.page import Page, amount, clock, columns, day, folded, heading, page, section
from fertui.site.model import Loop, Site
from fertui.site.points import point_name

BLANK = "_" * 12
METERED = {"make_up": "make_up_meter", "irrigation": "irrigation_meter", "drain": "drain_meter"}
HABIT = timedelta(days=30)
"""What was logged within this time belongs to the round (common practice, no source)."""

Row = tuple[str, str, str, str, str]


def round_sheet(site: Site, loop: Loop, entries: Sequence[Entry], at: datetime, planned: Iterable[str] = ()) -> Page:
    """The sheet of one loop from its effective entries; ``planned``: steps to be done, in words."""
    last = _Last([each for each in entries if each.loop in (loop.name, "")], at, site.timezone)
    head: Row = ("what", "now", "unit", "last", "of")
    rows = [*_readings(loop, last), *_water(loop, last), *_stock(loop, last), *_day(loop, last)]
    lines = heading(f"Round: {loop.name}", site.name, f"last values as of {clock(at, site.timezone)}")
    lines += [f"date {BLANK}   time {BLANK}   initials ______", ""]
    lines += ["1 crop, drippers, gutters, pump, smell, sludge", "  " + "_" * 74, "", "2 read and write down"]
    lines += [*("  " + line for line in columns([head, *rows], (3,))), ""]
    lines += section("3 planned, to be done or marked not done", [x for each in planned for x in folded(each, "[ ] ")])
    lines += ["remarks  " + "_" * 67]
    data = {"loop": loop.name, "at": at, "lines": [list(row) for row in rows]}
    return page(lines, data, (head, *rows))


def points_of(loop: Loop) -> tuple[str, ...]:
    """Where the round of a loop reads EC and pH."""
    if loop.layout == "shared-tank":
        return ("tank",) if loop.medium == "none" else ("tank", "root_zone")
    return ("feed", "drain")


class _Last:
    """The last value of everything, as it is looked up line by line."""

    def __init__(self, entries: Sequence[Entry], at: datetime, timezone: str) -> None:
        self.entries = [each for each in reversed(entries) if each.at <= at and not each.doubtful]
        self.at, self.timezone = at, timezone

    def row(self, what: str, unit: str, kind: str, name: str, point: str = "", tank: str = "") -> Row:
        """One line of the sheet with what stood there last."""
        found = self.find(kind, name, point, tank)
        if found is None:
            return what, BLANK, unit, "", ""
        return what, BLANK, unit, amount(found.number_of(name)), day(found.at, self.timezone)

    def find(self, kind: str, name: str, point: str = "", tank: str = "") -> Entry | None:
        """The last entry that carries a number."""
        for entry in self.entries:
            here = (not point or entry.point == point) and (not tank or entry.text_of("tank") == tank)
            if entry.kind == kind and here and entry.number_of(name) is not None:
                return entry
        return None

    def usual(self, kind: str, name: str, point: str = "") -> bool:
        """Whether something was logged lately."""
        found = self.find(kind, name, point)
        return found is not None and self.at - found.at <= HABIT


def _readings(loop: Loop, last: _Last) -> Iterator[Row]:
    for point in points_of(loop):
        words = point_name(point)
        yield last.row(f"{words} EC", "mS/cm", "reading", "EC", point)
        yield last.row(f"{words} pH", "pH", "reading", "pH", point)
        yield last.row(f"{words} temperature", "C", "reading", "temperature", point)
        for ion in IONS:
            if last.usual("reading", ion, point):
                yield last.row(f"{words} {ion}, hand meter", "mmol/L", "reading", ion, point)


def _water(loop: Loop, last: _Last) -> Iterator[Row]:
    names = ("make_up",) if loop.layout == "shared-tank" else ("make_up", "irrigation", "drain")
    for name in names:
        words = name.replace("_", "-")
        if last.usual("water", METERED[name]):
            yield last.row(f"{words} meter", "L", "water", METERED[name])
        else:
            yield last.row(f"{words} water" if name == "make_up" else words, "L", "water", name)


def _stock(loop: Loop, last: _Last) -> Iterator[Row]:
    for tank in loop.stock_tanks:
        yield last.row(f"{tank} stock used", "L", "stock", "litres", tank=tank)
    yield last.row("acid used", "L", "acid", "litres")
    vessel = "tank" if loop.layout == "shared-tank" else loop.drain_store or "drain_store"
    if loop.layout != "known-feed":
        yield last.row(f"{vessel.replace('_', ' ')} holds", "L", "level", "litres", tank=vessel)


def _day(loop: Loop, last: _Last) -> Iterator[Row]:
    if loop.layout != "shared-tank":
        yield last.row("drain of irrigation", "%", "reading", "drain_pct")
    yield last.row("light sum of yesterday", "J/cm2", "reading", "light_sum")
