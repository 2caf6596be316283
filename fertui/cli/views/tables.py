"""How entries, imports, supplies, aims and checks read."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import groupby
from textwrap import wrap
from typing import TYPE_CHECKING, Any

from fertui.cli.views import as_json, words
from fertui.logbook.entries import Entry, Value
from fertui.paper.page import columns, folded
from fertui.site.points import point_name

if TYPE_CHECKING:
    from fertui.site.edit import Row
    from fertui.workbench.aims import Aim
    from fertui.workbench.checks import CheckRow
    from fertui.workbench.shelf import StockRow, SupplyRow


def entry_text(entry: Entry, timezone: str) -> str:
    """One entry in a line: number, time, loop, kind, place, values, who, and what became of it."""
    values = " ".join(_value(value) for value in entry.values)
    place = " ".join(part for part in (point_name(entry.point), entry.zone, entry.method) if part)
    parts = [str(entry.number or "new"), words.local(entry.at, timezone), entry.loop, entry.kind, place, values]
    parts.append(f"by {entry.by}")
    if entry.supersedes is not None:
        parts.append(f"{'strikes' if entry.void else 'corrects'} {entry.supersedes}: {entry.why}")
    if entry.doubtful:
        parts.append(f"doubtful: {entry.doubtful}")
    if entry.flags:
        parts.append(f"asked, not answered: {', '.join(entry.flags.split())}")
    if entry.note:
        parts.append(f'"{entry.note}"')
    return "  ".join(part for part in parts if part)


def _value(value: Value) -> str:
    """A value as written, with its name; a text of many lines by their number."""
    if "\n" in value.written:
        return f"{value.name} of {len(value.written.splitlines())} lines"
    species = f" as {value.species}" if value.species and value.species != value.name else ""
    return f"{value.name}={value.written}{species}"


def entries_text(entries: Sequence[Entry], timezone: str) -> str:
    """Every entry, struck ones marked with an x."""
    gone = {entry.supersedes for entry in entries}
    lines = [("x " if entry.number in gone else "  ") + entry_text(entry, timezone) for entry in entries]
    return "\n".join(lines) if lines else "The logbook is empty. Begin with 'fertui record SITE reading ...'."


def entries_document(entries: Sequence[Entry]) -> dict[str, Any]:
    """``logbook --json``."""
    return {"schema": "fertui.logbook/1", "entries": [as_json.plain(entry) for entry in entries]}


def supplies_text(supplies: Sequence[SupplyRow], tanks: Sequence[StockRow]) -> str:
    """The shelf and the stock tanks."""
    rows = [("supply", "formula", "label", "left kg", "price/kg")]
    for each in supplies:
        rows.append(
            (each.name, each.formula, each.label, words.number(each.amount_kg), words.number(each.price_per_kg, 2))
        )
    lines = columns(rows, (3, 4))
    stock = [("stock tank", "letter", "litres", "left", "days left")]
    stock += [
        (each.name, each.letter, f"{each.litres:g}", words.number(each.litres_left), words.number(each.days_left))
        for each in tanks
    ]
    return "\n".join([*lines, "", *columns(stock, (2, 3, 4))])


def aims_text(aims: Sequence[Aim], loop: str) -> str:
    """Bands and limits in force for a loop with where each comes from."""
    lines = columns([(point_name(each.point), f"{each.what} {each.kind}", each.words) for each in aims])
    return "\n".join([f"In force for {loop}:", *_with_sources(lines, [each.source for each in aims])])


def site_text(rows: Sequence[Row]) -> str:
    """Every value of the site file with where it comes from."""
    return "\n".join(_with_sources([f"{row.key} = {row.text}" for row in rows], [row.source for row in rows]))


def _with_sources(lines: Sequence[str], sources: Sequence[str]) -> list[str]:
    """Lines of the width of a page, in blocks that share a source, which stands under each."""
    shown: list[str] = []
    for source, pairs in groupby(zip(sources, lines, strict=True), key=lambda pair: pair[0]):
        shown += [""] if shown else []
        shown += [folded_line for _, text in pairs for folded_line in folded(text, "")]
        shown += folded(f"from {source}", "      ") if source else []
    return shown


def check_text(rows: Sequence[CheckRow]) -> str:
    """What was looked at, group by group; only what is not all right carries its remark."""
    lines: list[str] = []
    for group, members in groupby(rows, key=lambda row: row.group):
        lines += [*([""] if lines else []), group]
        for row in members:
            watched = group.startswith("watch")
            text = row.found if watched else f"{row.what}: {row.found}"
            remark = f" -> {row.remark}" if row.remark and not row.passed else ""
            lines += wrap(f"{text}{remark}", 80, initial_indent=f"  {row.sign:3}", subsequent_indent="     ")
    return "\n".join(lines)
