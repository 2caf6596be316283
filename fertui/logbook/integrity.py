"""Is the logbook whole? Rows for `check`, and what can still be read of a damaged file.

The hash chain shows damage and lost pages. It does not stop a forger, who can compute it anew.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import closing, suppress
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import NamedTuple

from fertui.logbook import schema
from fertui.logbook.codec import check_storable, moment_text
from fertui.logbook.entries import Entry, Value
from fertui.logbook.errors import LogbookError, StoreError
from fertui.logbook.files import check_regular, quoted
from fertui.logbook.rows import entry_of_row, select_entry, select_values, value_of_row
from fertui.logbook.store import FIRST_HASH, Logbook, link_of

DAMAGED = "damaged in the file"
"""Mark of an entry that was lost, or that is not what its link in the chain says."""

MOST_IN_A_ROW_LOST = 2000
"""So many numbers in a row without a readable entry are taken as the end of the book."""


class Row(NamedTuple):
    """One thing looked at: what, what was found, whether it is all right, and what to do where it is not."""

    what: str
    found: str
    passed: bool
    remark: str = ""


def check_book(path: str | Path) -> tuple[Row, ...]:
    """Rows on the file, SQLite's own check, the chain, the clock and the rights; never raises for damage."""
    path = Path(path)
    rows: list[Row] = []
    try:
        with Logbook.open(path) as book:
            for look in (_rights, _database, _chain, _clock, _flags):
                rows.extend(look(book))
    except StoreError as trouble:
        rows.append(Row("logbook file", str(trouble), False, "fertui backup saves what can still be read"))
    return tuple(rows)


def readable(path: str | Path) -> Iterator[Entry]:
    """Entries that can still be read of a damaged or cut-off file, by number; a lost one is a note in its place.

    Raises ``StoreError`` when not one can be read.
    """
    nothing = True
    with closing(_rescuing(Path(path))) as connection:
        lost, before = 0, datetime.fromtimestamp(0, UTC)
        for number in range(1, _last_number(connection) + MOST_IN_A_ROW_LOST + 1):
            entry = _one(connection, number)
            if entry is None:
                lost += 1
                if lost > MOST_IN_A_ROW_LOST:
                    break
                continue
            nothing = False
            yield from (_lost(gone, before) for gone in range(number - lost, number))
            lost, before = 0, entry.entered
            yield entry
    if nothing:
        raise StoreError(f"no entry of {path} can be read any more. Restore a backup with `fertui restore`.")


def _rights(book: Logbook) -> Iterator[Row]:
    path = book.path
    mode = path.stat().st_mode & 0o777
    others = mode & 0o007
    remark = f"others may use it: chmod o-rwx {path.name}" if others else ""
    yield Row("rights of the logbook file", f"{mode:o}", not others, remark)


def _database(book: Logbook) -> Iterator[Row]:
    found = book.sqlite_check()
    yield Row("SQLite's own check", found, found == "ok", "" if found == "ok" else "keep a copy, then restore a backup")


def _chain(book: Logbook) -> Iterator[Row]:
    chain, count = FIRST_HASH, 0
    for entry, link in book.linked():
        chain, count = link_of(chain, entry), count + 1
        if entry.number != count or chain != link:
            remark = "its page is damaged, or somebody wrote to the file past this program; compare with a backup"
            yield Row("chain of entries", f"breaks at entry {entry.number}", False, remark)
            return
    yield Row("chain of entries", f"{count} entries, unbroken", True, "shows damage; does not stop a forger")


def _clock(book: Logbook) -> Iterator[Row]:
    number = book.last_number()
    last = book.entry(number).entered if number else None
    ahead = last is not None and last > datetime.now(UTC) + timedelta(minutes=2)
    remark = "the clock of this machine is behind, or was ahead when that was entered" if ahead else ""
    yield Row("clock against the last entry", moment_text(last)[:16] if last else "no entries yet", not ahead, remark)


def _flags(book: Logbook) -> Iterator[Row]:
    open_ones = [entry for entry in book.entries() if entry.flags]
    listed = ", ".join(f"{entry.number} ({entry.flags})" for entry in open_ones[-5:])
    remark = f"last ones: {listed}; supersede those that are wrong" if open_ones else ""
    yield Row("entries with open questions", f"{len(open_ones)}", True, remark)


def _rescuing(path: Path) -> sqlite3.Connection:
    check_regular(path)
    try:
        connection = sqlite3.connect(f"file:{quoted(path)}?mode=ro", uri=True, isolation_level=None)
        # With writable_schema on, SQLite opens a file that is shorter than its header says (its recovery mode).
        connection.execute("PRAGMA writable_schema = ON")
        schema.version_of(connection, path)
    except sqlite3.Error as error:
        raise StoreError(f"nothing can be read of {path}: {error}. Restore a backup.") from error
    return connection


def _last_number(connection: sqlite3.Connection) -> int:
    with suppress(sqlite3.Error):
        return int(connection.execute("SELECT max(number) FROM entries").fetchone()[0] or 0)
    return 0


def _one(connection: sqlite3.Connection, number: int) -> Entry | None:
    """The entry of that number, marked doubtful where it does not match its link; None where it cannot be read."""
    try:
        row = connection.execute(select_entry("e.number = ?"), (number,)).fetchone()
        if row is None or row[0] != number:
            return None
        value_rows = connection.execute(select_values("v.entry = ?"), (number,)).fetchall()
        entry = entry_of_row(row, tuple(value_of_row(value) for value in value_rows))
        check_storable(entry)
        links = dict(
            connection.execute("SELECT number, hash FROM entries WHERE number IN (?, ?)", (number - 1, number))
        )
    except (sqlite3.Error, LogbookError, ValueError, TypeError):
        return None
    before = FIRST_HASH if number == 1 else links.get(number - 1)
    if before is not None and link_of(before, entry) != links.get(number):
        return entry._replace(doubtful=f"{entry.doubtful} {DAMAGED}".strip())
    return entry


def _lost(number: int, when: datetime) -> Entry:
    note = f"entry {number} was lost: its place in the file could not be read"
    return Entry("note", "", when, when, "fertui", (Value("text", note),), number=number, doubtful=DAMAGED)
