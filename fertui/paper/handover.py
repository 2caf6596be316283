"""The shift handover: one page both ways - who goes writes, who comes reads back, ticks and signs."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from datetime import datetime, timedelta
from typing import NamedTuple

from fertui.estimate.notices.notice import Notice
from fertui.estimate.signs import SIGNS
from fertui.logbook.entries import Entry
from fertui.paper.page import Page, age, amount, clock, columns, day, folded, heading, listed, page, section
from fertui.paper.round_sheet import points_of
from fertui.site.model import Loop, Site
from fertui.site.points import point_name

SHIFTS = timedelta(hours=36)
"""What was written down within this time is news to the next shift (common practice, no source)."""
ROUTINE = ("reading", "water", "stock", "level", "plan", "site")
"""Kinds of the daily round: their numbers stand above, or in the logbook."""


class LoopShift(NamedTuple):
    """What one loop hands over: what to look at, days left in its stock tanks, last analysis, samples on their way."""

    watch: Sequence[Notice] = ()
    stock_days_left: Mapping[str, float] = {}
    last_analysis: datetime | None = None
    awaited: Sequence[str] = ()


def handover(
    site: Site, at: datetime, entries: Sequence[Entry], loops: Mapping[str, LoopShift], open_steps: Iterable[str]
) -> Page:
    """One page between shifts from the effective entries of the site; ``open_steps``: planned, partly or not done."""
    steps = tuple(open_steps)
    lines = heading("Shift handover", site.name, f"as of {clock(at, site.timezone)}")
    rows = [("loop", "where", "EC [mS/cm]", "pH", "read", "stock lasts", "analysis"), *_rows(site, at, entries, loops)]
    lines += columns(rows, (2, 3)) + [""]
    for name, loop in loops.items():
        told = [line for each in loop.watch for line in folded(each.text, f"[ ] {SIGNS[each.severity]:2} ")]
        awaited = listed((f"awaited: {text}" for text in loop.awaited), "[ ] -  ")
        lines += section(f"TO LOOK AT, {name}   (!! act   ! watch   - note)", [*told, *awaited])
    lines += section("PLANNED, NOT OR ONLY PARTLY DONE", listed(steps, "[ ] "))
    lines += section("WRITTEN DOWN SINCE YESTERDAY", listed(_news(site, at, entries)))
    lines += [
        f"DO NOT      {'_' * 68}",
        f"STILL TO DO {'_' * 68}",
        f"ON CALL     {'_' * 30}   telephone {'_' * 25}",
        "",
    ]
    lines += ["handed over by ______ at ______   gone through together [ ]"]
    lines += ["read by        ______ at ______   read back and taken over [ ]   asked: " + "_" * 8]
    data = {
        "at": at,
        "readings": [list(row) for row in rows[1:]],
        "watch": {name: [each.text for each in loop.watch] for name, loop in loops.items()},
        "open_steps": list(steps),
    }
    return page(lines, data)


def _rows(
    site: Site, at: datetime, entries: Sequence[Entry], loops: Mapping[str, LoopShift]
) -> Iterator[tuple[str, ...]]:
    for loop in site.loops:
        if loop.name in loops:
            yield from _loop_rows(loop, at, entries, loops[loop.name])


def _loop_rows(loop: Loop, at: datetime, entries: Sequence[Entry], shift: LoopShift) -> Iterator[tuple[str, ...]]:
    """The points of a loop; what holds for the whole loop stands in its first line."""
    stock = min(shift.stock_days_left.values(), default=None)
    lasts = "" if stock is None else f"{amount(stock)} d"
    analysed = "never" if shift.last_analysis is None else f"{age(shift.last_analysis, at)} old"
    name, whole = loop.name, (lasts, analysed)
    for point in points_of(loop):
        found = [each for each in entries if (each.loop, each.kind, each.point) == (loop.name, "reading", point)]
        read = f"{age(found[-1].at, at)} ago" if found else "never"
        numbers = [amount(found[-1].number_of(what)) if found else "" for what in ("EC", "pH")]
        yield name, point_name(point), *numbers, read, *whole
        name, whole = "", ("", "")


def _news(site: Site, at: datetime, entries: Sequence[Entry]) -> Iterator[str]:
    """What was written down lately and is not of the round; entries of acid put together."""
    recent = [each for each in entries if at - SHIFTS <= each.entered <= at and each.kind not in ROUTINE]
    for each in recent:
        if each.kind != "acid":
            yield f"{day(each.at, site.timezone)} {each.loop} {each.kind}: {said(each)} ({each.by})"
    litres = [each.number_of("litres") or 0.0 for each in recent if each.kind == "acid"]
    if litres:
        yield f"acid, {len(litres)} {'entry' if len(litres) == 1 else 'entries'}: {amount(sum(litres))} L"
    for each in entries:
        if each.kind in ROUTINE and each.note and at - SHIFTS <= each.entered <= at:
            yield f"{day(each.at, site.timezone)} {each.loop} {each.kind}: {each.note} ({each.by})"


SPEAKING = ("salt", "acid", "kg", "litres", "text", "event")
"""Values that need no name in front of them."""


def said(entry: Entry) -> str:
    """An entry in one line: its values as written with their units, and its note."""
    from fertui.logbook.kinds import KINDS, unit_of

    kind = KINDS[entry.kind]
    parts = []
    for value in entry.values:
        unit = "" if value.number is None or value.unit else unit_of(kind, value.name)
        name = "" if value.name in SPEAKING or value.name == value.text else f"{value.label} "
        parts.append(f"{name}{value.written}{f' {unit}' if unit else ''}")
    return ", ".join([*parts, *([entry.note] if entry.note else [])])
