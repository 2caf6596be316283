"""Tables into the logbook: read, shown, held against what is there, then written in one transaction or not at all."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from datetime import datetime, timedelta
from pathlib import Path
from typing import NamedTuple
from zoneinfo import ZoneInfo

from fertui.logbook.columns import Column, columns_of, learned
from fertui.logbook.dates import iso, order_of
from fertui.logbook.entries import Entry, Value
from fertui.logbook.errors import LogbookError
from fertui.logbook.exporting import undefused
from fertui.logbook.kinds import KINDS, Kind, kind_named, unit_of
from fertui.logbook.parse import entry_from_text
from fertui.logbook.questions import LOOK_BACK, Question, flagged, questions_of_row
from fertui.logbook.sheets import Sheet, read_sheet
from fertui.logbook.store import Logbook
from fertui.logbook.templates import Template
from fertui.logbook.times import zone
from fertui.refusals import Refusal
from fertui.site.model import POINTS, Site
from fertui.site.points import point_called

STATES: Mapping[str, str] = {
    "new": "new", "there": "already there as entry {}", "differs": "differs from entry {} and is left out",
}  # fmt: skip
"""What can become of a row, and how it is said."""

MOST_TROUBLES, MOST_LINES = 20, 8

MOST_LOOKED_BACK = 60
"""Entries before a row that it is held against: enough for the last values, and quick for the table of a logger."""

Signature = tuple[str, str, str, str, str, tuple[tuple[str, str], ...]]
"""What makes two entries of a kind the same event."""


class ImportRow(NamedTuple):
    """One row: its entry, and whether it is ``new``, ``there`` already, or ``differs`` from the book (not written).

    ``when``: its time on the clock of the site, and whether an hour was given. ``conversions`` says for each value what
    was written and what it became; ``questions`` what a careful reader asks.
    """

    line: int
    entry: Entry
    when: str
    state: str
    existing: int | None
    conversions: tuple[str, ...]
    questions: tuple[Question, ...]


class ImportResult(NamedTuple):
    """What an import did, or with ``dry_run`` would do. ``written``: numbers of the new entries, empty on a dry run.

    ``template``: how the table was read, to be saved under the name of its laboratory for the next one.
    """

    kind: str
    columns: tuple[Column, ...]
    rows: tuple[ImportRow, ...]
    written: tuple[int, ...]
    dry_run: bool
    template: Template

    def count(self, state: str) -> int:
        """Rows in that state."""
        return sum(row.state == state for row in self.rows)

    def words(self) -> tuple[str, ...]:
        """The result as lines of text."""
        lines = [f"column {column.says()}{self._assumed(column)}" for column in self.columns]
        for row in self.rows:
            state = STATES[row.state].format(row.existing)
            lines.append(f"line {row.line}: {state}, {row.when} {row.entry.point}".rstrip())
            lines += [f"  {conversion}" for conversion in row.conversions]
            lines += [f"  ? {question.text}" for question in row.questions]
        did = "would be added (dry run, nothing written)" if self.dry_run else "added"
        new, there, differs = (self.count(state) for state in STATES)
        last = f"{new} {self.kind} {'entry' if new == 1 else 'entries'} {did}, already there: {there}"
        left_out = f", differing from what is there and left out: {differs} (fertui supersede)" if differs else ""
        return (*lines, *self._odd(), f"{last}{left_out}.")

    def _odd(self) -> tuple[str, ...]:
        """The lines with open questions once more, and what to do about them."""
        odd = [row.line for row in self.rows if row.questions]
        if not odd:
            return ()
        todo = "mend the table first" if self.dry_run else "mend with 'fertui supersede' or 'fertui void'"
        return (f"look again at line {_listed(odd)} (see ? there); what is right may stay, else {todo}.",)

    def _assumed(self, column: Column) -> str:
        """The unit that the numbers of a column are taken in where its head names none."""
        field = KINDS[self.kind].field(column.field)
        silent = field is not None and field.is_number and field.unit and not column.unit
        return f", no unit given: taken as {field.unit}" if field is not None and silent else ""


def import_table(
    path: str | Path,
    kind: str,
    book: Logbook,
    site: Site,
    now: datetime,
    *,
    by: str = "",
    loop: str | None = None,
    template: Template | None = None,
    dry_run: bool = False,
) -> ImportResult:
    """Read a table of entries of one kind and append those that are new, all in one transaction.

    ``by``, ``loop``: for rows that do not say; without either, an entry is by "import". Rows already there (same time,
    place and values, corrected since or not) are not added again. Raises a ``Refusal`` that lists every trouble with
    its lines; nothing is written then.
    """
    wanted = kind_named(kind)
    source = _Source(wanted, template or Template(), site, now, by or "import", loop)
    sheet = read_sheet(path, source.template.delimiter, source.template.decimal)
    columns = columns_of(sheet, wanted, source.template)
    order = source.template.dates or order_of(_column_of(sheet, columns, "at"))
    rows = tuple(_judged(_entries(sheet, columns, source, order), book, site))
    new = [flagged(row.entry, row.questions) for row in rows if row.state == "new"]
    written = book.append(new) if new and not dry_run else ()
    return ImportResult(kind, columns, rows, written, dry_run, learned(source.template, sheet, columns, order))


class _Source(NamedTuple):
    """What holds for every row of one table."""

    kind: Kind
    template: Template
    site: Site
    now: datetime
    by: str
    loop: str | None


def _column_of(sheet: Sheet, columns: Sequence[Column], name: str) -> list[str]:
    place = next(place for place, column in enumerate(columns) if column.name == name)
    return [row[place] for row in sheet.rows]


def _entries(sheet: Sheet, columns: Sequence[Column], source: _Source, order: str) -> list[tuple[int, Entry]]:
    read: list[tuple[int, Entry]] = []
    troubles: dict[str, list[int]] = {}
    for line, row in zip(sheet.lines, sheet.rows, strict=True):
        texts = _texts(sheet, row, columns, source)
        if not any(texts.get(column.name) for column in columns if column.is_value):
            continue
        try:
            read.append((line, _entry({**texts, "at": _moment(texts, order)}, source)))
        except Refusal as refusal:
            troubles.setdefault(str(refusal), []).append(line)
    if troubles:
        raise _refused(troubles)
    if not read:
        lines = f"line {sheet.lines[0]}" if len(sheet.lines) == 1 else f"lines {sheet.lines[0]} to {sheet.lines[-1]}"
        raise LogbookError(
            f"{lines}: no row has a value of {source.kind.name}; nothing was imported. "
            "Has each as many cells as there are heads?"
        )
    return read


def _refused(troubles: Mapping[str, Sequence[int]]) -> LogbookError:
    """Every trouble once, with the lines that have it."""
    told = []
    for words, lines in list(troubles.items())[:MOST_TROUBLES]:
        told.append(f"line {_listed(lines)}: {words}")
    rest = len(troubles) - len(told)
    told += [f"... and {rest} more troubles"] if rest else []
    return LogbookError("\n".join(["nothing was imported:", *told]))


def _listed(lines: Sequence[int]) -> str:
    more = f" and {len(lines) - MOST_LINES} more" if len(lines) > MOST_LINES else ""
    return ", ".join(map(str, lines[:MOST_LINES])) + more


def _texts(sheet: Sheet, row: Sequence[str], columns: Sequence[Column], source: _Source) -> dict[str, str]:
    texts: dict[str, str] = {}
    for column, cell in zip(columns, row, strict=True):
        if not column.name or not cell or cell in (*source.template.blank, "-", "n/a"):
            continue
        field = source.kind.field(column.field)
        if column.is_value and (field is None or field.is_number):
            cell = f"{sheet.number(cell)} {column.unit}".strip()
        texts[column.name] = undefused(cell)
    return texts


def _moment(texts: Mapping[str, str], order: str) -> str:
    if not texts.get("at"):
        raise LogbookError("the row does not say when.")
    return f"{iso(texts['at'], order)} {texts.get('time', '')}".strip()


def _entry(texts: Mapping[str, str], source: _Source) -> Entry:
    own = {name: text for name, text in source.template.values.items() if name != "loop"}
    given = {"by": source.by, **own, **texts}
    loop = given.pop("loop", None) or source.loop or source.template.values.get("loop")
    given.pop("time", None)
    if "point" not in given and _names_a_point(given.get("sample", ""), source):
        given["point"] = given.pop("sample")
    if "point" in given:
        given |= _placed(given["point"], source)
    return entry_from_text(source.kind.name, given, source.site, loop, source.now)


def _names_a_point(sample: str, source: _Source) -> bool:
    """Whether a sample is called exactly like a point, as laboratories print what stood on the bottle."""
    return bool(sample) and (sample in source.template.points or _placed(sample, source)["point"] in POINTS)


def _placed(written: str, source: _Source) -> dict[str, str]:
    """The point as this program calls it; the name of a water means a sample of that source."""
    point = source.template.points.get(written, written)
    waters = {water.name.lower(): water.name for water in source.site.waters}
    if point.lower() in waters and point not in POINTS:
        return {"point": "source", "source": waters[point.lower()]}
    return {"point": point_called(point) or point}


def _judged(read: Sequence[tuple[int, Entry]], book: Logbook, site: Site) -> Iterator[ImportRow]:
    """Each row against the book: a signature in the book is used up by one row, so equal rows of one table stay two."""
    here, moments = zone(site.timezone), [entry.at for _, entry in read]
    kind, first, last = read[0][1].kind, min(moments), max(moments)
    day = timedelta(days=1)
    past = book.history(kinds=(kind,), since=first - day, at=last + day)
    there = _signatures(past, here)
    found = []
    for _, entry in read:
        numbers = there.get(_signature(entry, here))
        number = numbers.pop(0) if numbers else None
        found.append(("there", number) if number else _against(entry, past))
    new = [entry for (_, entry), (state, _) in zip(read, found, strict=True) if state == "new"]
    standing = book.entries(kinds=(kind,), since=first - LOOK_BACK, at=last)
    told = sorted((*standing, *new), key=lambda each: each.at)
    place = {id(each): position for position, each in enumerate(told)}
    for (line, entry), (state, other) in zip(read, found, strict=True):
        conversions = tuple(_conversion(KINDS[entry.kind], value) for value in entry.values)
        asked: tuple[Question, ...] = ()
        if state == "new":
            before = told[max(place[id(entry)] - MOST_LOOKED_BACK, 0) : place[id(entry)]]
            asked = questions_of_row(entry, before, book, site)
        yield ImportRow(line, entry, _when(entry, here), state, other, conversions, asked)


def _when(entry: Entry, here: ZoneInfo) -> str:
    """Time of an entry on the clock of the site; a day without an hour says what was made of it."""
    at = entry.at.astimezone(here)
    if entry.whole_day and KINDS[entry.kind].spans:
        return f"{at:%a %d %b %Y}, the whole day"
    return f"{at:%a %d %b %Y %H:%M}{' (no hour given)' if entry.whole_day else ''}"


def _signatures(past: Sequence[Entry], here: ZoneInfo) -> dict[Signature, list[int]]:
    """Numbers of the entries that carry each signature; an entry and its corrections count once for each."""
    root: dict[int, int] = {}
    carried: dict[Signature, dict[int, int]] = {}
    for entry in past:
        number = entry.number or 0
        root[number] = root.get(entry.supersedes or number, number)
        if not entry.void:
            carried.setdefault(_signature(entry, here), {})[root[number]] = number
    return {signature: sorted(numbers.values()) for signature, numbers in carried.items()}


def _signature(entry: Entry, here: ZoneInfo) -> Signature:
    values = sorted(
        (value.name, value.text if value.number is None else f"{value.number:.9g}") for value in entry.values
    )
    when = f"{entry.at.astimezone(here):%Y-%m-%d}" if entry.whole_day else entry.at.isoformat()
    return (entry.loop, when, entry.point, entry.zone, entry.method, tuple(values))


def _against(entry: Entry, past: Sequence[Entry]) -> tuple[str, int | None]:
    """An analysis of a sample that is in the book with other numbers is not a new one."""
    if entry.kind != "analysis":
        return "new", None
    replaced = {each.supersedes for each in past}
    names = {value.name for value in entry.values}
    for other in past:
        shared = any(value.number is not None and value.name in names for value in other.values)
        if _sample(other) == _sample(entry) and shared and not other.void and other.number not in replaced:
            return "differs", other.number
    return "new", None


def _sample(entry: Entry) -> tuple[object, ...]:
    words = (entry.text_of("source"), entry.text_of("sample"))
    return (entry.loop, entry.at, entry.point, entry.zone, entry.method, *words)


def _conversion(kind: Kind, value: Value) -> str:
    if value.number is None:
        return f"{value.name}: {value.text}"
    below = "below " if value.below else ""
    species = f" {value.species}" if value.species and not value.text.endswith(value.species) else ""
    return f"{value.name}: {value.text}{species} = {below}{value.number:.4g} {unit_of(kind, value.name)}".rstrip()
