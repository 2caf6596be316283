"""The logbook as CSV, one file a kind, with numbers that read back the same and cells no program would run."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Iterable, Sequence
from datetime import UTC, datetime
from pathlib import Path

from fertui.logbook.entries import Entry, Value
from fertui.logbook.files import make_private_folder, write_whole
from fertui.logbook.kinds import KINDS, Kind, unit_of
from fertui.logbook.store import Logbook
from fertui.logbook.times import shown, zone

ABOUT = ("number", "at", "loop", "by", "entered", "point", "zone", "method", "instrument")
AFTER = ("note", "doubtful", "supersedes", "why", "flags")

_RUNNABLE = re.compile(r"'*[=+\-@\t\r|\uff1d\uff0b\uff0d\uff20]")


def export(book: Logbook, into: str | Path, timezone: str) -> tuple[Path, ...]:
    """Write the effective entries into a folder, one ``KIND.csv`` for each kind there is; returns the paths.

    Raises ``StoreError`` when the folder or a file cannot be written.
    """
    folder = Path(into)
    entries = book.entries()
    make_private_folder(folder)
    written = []
    for kind in KINDS.values():
        chosen = [entry for entry in entries if entry.kind == kind.name]
        if chosen:
            path = folder / f"{kind.name}.csv"
            write_whole(path, table(kind, chosen, timezone))
            written.append(path)
    return tuple(written)


def table(kind: Kind, entries: Sequence[Entry], timezone: str) -> str:
    """Entries of one kind as CSV text: local times with their offset, numbers in canonical units, comma and point."""
    names = _names(kind, entries)
    file = io.StringIO(newline="")
    writer = csv.writer(file, lineterminator="\r\n")
    writer.writerow([*ABOUT, *(head(kind, name) for name in names), *AFTER])
    for entry in entries:
        values = {value.name: value for value in entry.values}
        cells = [_cell(kind, values.get(name), timezone) for name in names]
        writer.writerow([*_about(entry, timezone), *cells, *_after(entry)])
    return file.getvalue()


def head(kind: Kind, name: str) -> str:
    """Column head of a value: its name with the canonical unit in brackets.

    >>> head(KINDS["batch"], "litres"), head(KINDS["batch"], "MKP"), head(KINDS["reading"], "pH")
    ('litres [L]', 'MKP [kg]', 'pH')
    """
    unit = unit_of(kind, name)
    return defused(f"{name} [{unit}]" if unit and unit != "s" else name)


def defused(text: str) -> str:
    """Text that no spreadsheet takes for a formula; ``undefused`` gives the text back.

    >>> defused("=1+1"), undefused(defused("=1+1")), defused("fine")
    ("'=1+1", '=1+1', 'fine')
    """
    return f"'{text}" if _RUNNABLE.match(text) else text


def undefused(text: str) -> str:
    """The text that ``defused`` was given."""
    return text[1:] if text.startswith("'") and _RUNNABLE.match(text) else text


def _names(kind: Kind, entries: Iterable[Entry]) -> tuple[str, ...]:
    used = dict.fromkeys(value.name for entry in entries for value in entry.values)
    return (*(name for name in kind.names if name in used), *(name for name in used if name not in kind.names))


def _cell(kind: Kind, value: Value | None, timezone: str) -> str:
    if value is None:
        return ""
    if value.number is None:
        return defused(value.text)
    if unit_of(kind, value.name) == "s":
        return shown(datetime.fromtimestamp(value.number, UTC), timezone)
    return f"<{value.number!r}" if value.below else repr(value.number)


def _about(entry: Entry, timezone: str) -> list[str]:
    at = f"{entry.at.astimezone(zone(timezone)):%Y-%m-%d}" if entry.whole_day else shown(entry.at, timezone)
    words = (entry.point, entry.zone, entry.method, entry.instrument)
    return [str(entry.number), at, entry.loop, defused(entry.by), shown(entry.entered, timezone), *map(defused, words)]


def _after(entry: Entry) -> list[str]:
    supersedes = str(entry.supersedes) if entry.supersedes else ""
    return [defused(entry.note), defused(entry.doubtful), supersedes, defused(entry.why), defused(entry.flags)]
