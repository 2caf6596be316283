"""The blank round sheet, with the last value beside each line, and the shift handover."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from datetime import datetime

from fertui.logbook.entries import Entry
from fertui.paper.page import Page, amount, clock, columns, folded, heading, section
from fertui.site.model import Loop, Site

BLANK = "__________"


def round_sheet(site: Site, loop: Loop, entries: Sequence[Entry], at: datetime) -> Page:
    """What the morning round of a loop writes down, in its order, with what stood there last."""
    rows: list[tuple[str, str, str, str]] = [("what", "now", "unit", "last")]
    for point in _points(loop):
        for name, unit in (("EC", "mS/cm"), ("pH", ""), ("temperature", "C")):
            rows.append(
                (f"{point.replace('_', ' ')} {name}", BLANK, unit, _last(entries, "reading", name, point=point))
            )
    for name in ("make_up", *(() if loop.layout == "shared-tank" else ("irrigation", "drain"))):
        rows.append((name.replace("_", "-"), BLANK, "L", _last(entries, "water", name)))
    for tank in loop.stock_tanks:
        rows.append((f"stock {tank}, used", BLANK, "L", _last(entries, "stock", "litres", tank=tank)))
    rows.append(("acid used", BLANK, "L", _last(entries, "acid", "litres")))
    rows.append(("light sum", BLANK, "J/cm2", _last(entries, "reading", "light_sum")))
    title = heading(f"{site.name}: {loop.name}, round of ____________", f"last values as of {clock(at, site.timezone)}")
    foot = ["", "crop, drippers, pump, smell, sludge: " + "_" * 40, f"initials ____   {BLANK}"]
    text = "\n".join([*title, *columns(rows), *foot])
    return Page(text, {"loop": loop.name, "lines": [list(row) for row in rows[1:]]}, tuple(rows))


def _points(loop: Loop) -> tuple[str, ...]:
    if loop.layout == "shared-tank":
        return ("tank",) if loop.medium == "none" else ("tank", "root_zone")
    return ("feed", "drain")


def _last(entries: Sequence[Entry], kind: str, name: str, point: str = "", tank: str = "") -> str:
    for entry in reversed(entries):
        if entry.kind == kind and entry.number_of(name) is not None:
            if (point and entry.point != point) or (tank and entry.text_of("tank") != tank):
                continue
            return amount(entry.number_of(name))
    return ""


def handover(
    site: Site,
    at: datetime,
    entries: Sequence[Entry],
    watch: Mapping[str, Iterable[str]],
    open_steps: Iterable[str],
    awaited: Iterable[str],
) -> Page:
    """One page between shifts: readings with their age, what to look at, what is half done, who read it."""
    lines = heading(f"{site.name}: shift handover", clock(at, site.timezone))
    rows: list[tuple[str, str, str, str]] = [("loop", "point", "EC mS/cm", "age")]
    for loop in site.loops:
        for point in _points(loop):
            found = [e for e in entries if e.loop == loop.name and e.kind == "reading" and e.point == point]
            if found:
                hours = (at - found[-1].at).total_seconds() / 3600
                rows.append((loop.name, point.replace("_", " "), amount(found[-1].number_of("EC")), f"{hours:.0f} h"))
    lines += section("Last readings", columns(rows))
    for name, texts in watch.items():
        lines += section(f"To look at: {name}", [line for text in texts for line in folded(text, "- ")])
    lines += section("Planned, not done", [line for text in open_steps for line in folded(text, "- ")])
    lines += section("Awaited", [line for text in awaited for line in folded(text, "- ")])
    recent = [e for e in entries if e.kind in ("note", "bleed", "dose", "acid", "recipe", "batch", "crop")][-8:]
    lines += section(
        "Lately", [f"- {clock(e.at, site.timezone)} {e.loop} {e.kind}: {_said(e)} ({e.by})" for e in recent]
    )
    lines += ["Do not: " + "_" * 60, "On call: " + "_" * 30, ""]
    lines += ["handed over by ____ at ______     read back and taken over by ____ at ______"]
    data = {
        "at": at,
        "watch": {name: list(texts) for name, texts in watch.items()},
        "readings": [list(r) for r in rows[1:]],
    }
    return Page("\n".join(lines), data)


def _said(entry: Entry) -> str:
    return " ".join(f"{value.name} {value.written}" for value in entry.values[:4])[:50]
