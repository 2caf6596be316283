"""The logbook file: append-only SQLite that keeps every entry, safe against power cuts and other sessions."""

from __future__ import annotations

import os
import sqlite3
import threading
import time
from collections.abc import Iterable, Iterator, Sequence
from contextlib import closing, contextmanager
from datetime import UTC, datetime
from pathlib import Path
from types import TracebackType
from weakref import WeakSet

from fertui.logbook import schema
from fertui.logbook.codec import VALUE_FIELDS, check_storable, line_of, moment_text, settled
from fertui.logbook.connection import BUSY_SECONDS, DAMAGED, address_of, connect, spoken
from fertui.logbook.entries import Entry, Value
from fertui.logbook.errors import DamageError, LogbookError, StoreError
from fertui.logbook.files import check_regular, check_whole, create_private, publish, quoted
from fertui.logbook.rows import (
    COLUMNS,
    INSERT_ENTRY,
    INSERT_VALUE,
    conditions,
    entry_of_row,
    select_entry,
    select_values,
    value_of_row,
)

FILE_NAME = "logbook.sqlite3"
RETRY_SECONDS = 0.001
FIRST_HASH = "0" * 64

_CHUNK = 1000
_AT_ONCE = 500
_MOST_KEPT = 200_000


_OPENING = threading.Lock()
_OPEN: WeakSet[Logbook] = WeakSet()
"""Books this process has open. Their files are never looked into past SQLite: closing a file drops every lock that the
process holds on it, another session then takes the book for left, and what is written here afterwards is lost."""


class Logbook:
    """An open logbook. Use it as a context manager; it may be called from several threads."""

    def __init__(self, path: Path, connection: sqlite3.Connection, writable: bool) -> None:
        """Use ``open`` or ``create``."""
        self.path = path
        self.writable = writable
        self._connection = connection
        self._lock = threading.RLock()
        self._seen: dict[int, Entry] = {}
        self._file = _identity(path)

    @classmethod
    def create(cls, path: str | Path) -> Logbook:
        """Make a new, empty logbook, readable by owner and group only, and open it.

        Raises ``StoreError`` when the file is there already or cannot be made.
        """
        path = Path(path)
        log = path.with_name(path.name + "-wal")
        if log.exists():
            raise StoreError(f"{log} is the log of another logbook that is not here; move it away first.")
        making = path.with_name(f".{path.name}.{os.getpid()}")
        create_private(making)
        try:
            with spoken(making), cls(making, connect(making, f"file:{quoted(making)}?mode=rw"), True) as book:
                book._migrate()
                book._connection.execute("PRAGMA journal_mode = WAL")
            publish(making, path)
        finally:
            making.unlink(missing_ok=True)
        return cls.open(path)

    @classmethod
    def open(cls, path: str | Path) -> Logbook:
        """Open the logbook of a site; an older schema is brought up to date, a newer one refused untouched.

        A file or folder that cannot be written opens for reading only. Raises ``StoreError`` when there is no logbook,
        it is a link, empty, cut off, damaged, newer, or another program's.
        """
        path = Path(path)
        check_regular(path)
        writable = os.access(path, os.W_OK) and os.access(path.parent, os.W_OK)
        with _OPENING:
            if not any(book._file == _identity(path) for book in _OPEN):
                check_whole(path)
                schema.check_head(path)
            with spoken(path):
                book = cls(path, connect(path, address_of(path, writable)), writable)
            _OPEN.add(book)
        try:
            if book._version() < schema.VERSION and writable:
                book._migrate()
        except BaseException:
            book.close()
            raise
        return book

    def close(self) -> None:
        """Close the file; nothing depends on it being closed."""
        self._connection.close()
        _OPEN.discard(self)

    def __enter__(self) -> Logbook:
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, at: TracebackType | None) -> None:
        self.close()

    # reading

    def entries(
        self,
        loop: str | None = None,
        kinds: Iterable[str] | None = None,
        since: datetime | None = None,
        at: datetime | None = None,
        known: datetime | None = None,
    ) -> tuple[Entry, ...]:
        """Effective entries (superseded and struck ones left out), ordered by time of the event and number.

        ``loop``: of that loop and of the site as a whole. ``since`` .. ``at``: time of the event, both included;
        a plan made by ``at`` counts, whatever days it is for.
        ``known``: as the book stood then: entries and corrections made later are hidden.
        """
        where, given = conditions(loop, kinds, since, at)
        effective, known_given = _effective(known)
        return self._read((*where, *effective), [*given, *known_given], "e.at, e.number")

    def history(
        self,
        loop: str | None = None,
        kinds: Iterable[str] | None = None,
        since: datetime | None = None,
        at: datetime | None = None,
        known: datetime | None = None,
    ) -> tuple[Entry, ...]:
        """Every entry verbatim, superseded, struck and striking ones too, in the order of their numbers."""
        where, given = conditions(loop, kinds, since, at)
        if known is not None:
            where, given = (*where, "e.entered <= ?"), [*given, moment_text(known)]
        return self._read(where, given, "e.number")

    def entry(self, number: int) -> Entry:
        """The entry of that number as written, effective or not; raises ``LogbookError`` when there is none."""
        found = self._read(("e.number = ?",), [number], "e.number") if 0 < number < 2**63 else ()
        if not found:
            raise LogbookError(f"there is no entry {number}; the last one is {self.last_number()}.")
        return found[0]

    def last(
        self, kind: str, loop: str | None = None, before: datetime | None = None, point: str | None = None
    ) -> Entry | None:
        """The latest effective entry of a kind, of a point where one is given, before that time."""
        where, given = conditions(loop, (kind,), None, before)
        where += ("e.void = 0", "NOT EXISTS (SELECT 1 FROM entries c WHERE c.supersedes = e.number)")
        if point is not None:
            where, given = (*where, "e.point = ?"), [*given, point]
        found = self._read(where, given, "e.at DESC, e.number DESC LIMIT 1")
        return found[0] if found else None

    def last_of_each(
        self, kinds: Iterable[str], before: datetime, known: datetime | None = None, by: Iterable[str] = ()
    ) -> tuple[Entry, ...]:
        """The latest effective entry before a time of every kind, loop, point and instrument, ordered by time.

        ``by``: names of values that tell apart what an entry is about, such as the tank or the source water.
        """
        where, given = conditions(None, kinds, None, before)
        effective, known_given = _effective(known)
        named, told = tuple(by), "''"
        if named:
            among = ", ".join("?" * len(named))
            told = f"(SELECT v.text FROM entry_values v WHERE v.entry = e.number AND v.name IN ({among}))"
        latest = (
            f"SELECT e.number, max(e.at || printf('%012d', e.number)) FROM entries e "
            f"WHERE {' AND '.join((*where, *effective))} GROUP BY e.kind, e.loop, e.point, e.instrument, {told}"
        )
        found = f"e.number IN (SELECT number FROM ({latest}))"
        return self._read((found,), [*given, *known_given, *named], "e.at, e.number")

    def superseded_by(self, number: int) -> int | None:
        """Number of the entry that corrects or strikes this one, or None."""
        return self._one("SELECT number FROM entries WHERE supersedes = ?", number)

    def last_number(self) -> int:
        """Number of the last entry, 0 in an empty book; it changes with every write, so caches key on it."""
        return self._one("SELECT max(number) FROM entries") or 0

    def verbatim(self) -> Iterator[Entry]:
        """Every entry as written that is there at the start, one after the other, while the book may grow."""
        last = self.last_number()
        for first in range(1, last + 1, _CHUNK):
            numbers = ("e.number BETWEEN ? AND ?",), [first, min(first + _CHUNK - 1, last)]
            yield from self._read(*numbers, "e.number")

    def linked(self) -> Iterator[tuple[Entry, str]]:
        """Every entry as written with the link of the chain that the file holds for it."""
        for entry in self.verbatim():
            with self._lock, spoken(self.path):
                row = self._connection.execute("SELECT hash FROM entries WHERE number = ?", (entry.number,)).fetchone()
            yield entry, row[0]

    def sqlite_check(self) -> str:
        """What SQLite's integrity check says: ``ok``, or its first complaint."""
        with self._lock, spoken(self.path):
            return str(self._connection.execute("PRAGMA integrity_check(1)").fetchone()[0])

    def copy_into(self, path: Path) -> None:
        """Copy the file as it is at this moment into an empty one, while the book is in use."""
        with self._lock, spoken(path), closing(sqlite3.connect(f"file:{quoted(path)}?mode=rw", uri=True)) as copy:
            self._connection.backup(copy)

    # writing

    def append(self, entries: Entry | Sequence[Entry]) -> tuple[int, ...]:
        """Write one entry or several in one transaction, all or none, and return their numbers.

        Once this returns, they are on the disk. An entry that supersedes must say why and name one that is still
        effective. Raises ``LogbookError`` for an entry that cannot be kept, ``StoreError`` for trouble with the file.
        """
        batch = (entries,) if isinstance(entries, Entry) else tuple(entries)
        for entry in batch:
            check_storable(entry)
        with self._writing() as connection:
            last, chain = connection.execute(
                "SELECT number, hash FROM entries ORDER BY number DESC LIMIT 1"
            ).fetchone() or (0, FIRST_HASH)
            numbers = []
            for number, entry in enumerate(batch, start=last + 1):
                if entry.number not in (None, number):
                    raise LogbookError(f"entry {entry.number} cannot follow entry {number - 1}.")
                self._check_supersedes(entry, number)
                chain = self._insert(entry._replace(number=number), chain)
                numbers.append(number)
        return tuple(numbers)

    def void(self, number: int, why: str, by: str, now: datetime | None = None) -> int:
        """Strike an entry: a new entry says who, when and why; the old one stays. Returns the new number."""
        old = self.entry(number)
        striking = old._replace(entered=now or datetime.now(UTC), by=by, values=(), number=None, note="", doubtful="",
            supersedes=number, why=why, void=True,
        )  # fmt: skip
        return self.append(striking)[0]

    def _check_supersedes(self, entry: Entry, number: int) -> None:
        if entry.supersedes is None:
            return
        if not entry.why.strip():
            raise LogbookError(f'a correction of entry {entry.supersedes} needs its reason: why="...".')
        if entry.supersedes >= number:
            raise LogbookError(f"there is no entry {entry.supersedes} to correct; the last one is {number - 1}.")
        later = self.superseded_by(entry.supersedes)
        if later is not None:
            raise LogbookError(f"entry {entry.supersedes} was already corrected by entry {later}; correct that one.")
        if self._one("SELECT void FROM entries WHERE number = ?", entry.supersedes):
            raise LogbookError(
                f"entry {entry.supersedes} strikes another and cannot be corrected; record the event anew."
            )

    def _insert(self, entry: Entry, chain: str) -> str:
        link = link_of(chain, entry)
        row = [getattr(entry, column) for column in COLUMNS]
        row[3:5] = moment_text(entry.at), moment_text(entry.entered)
        self._connection.execute(INSERT_ENTRY, [*row, link])
        values = (
            [entry.number, position, *(getattr(value, name) for name in VALUE_FIELDS)]
            for position, value in enumerate(map(settled, entry.values))
        )
        self._connection.executemany(INSERT_VALUE, values)
        return link

    # the file

    @contextmanager
    def _writing(self) -> Iterator[sqlite3.Connection]:
        if not self.writable:
            raise StoreError(f"{self.path} cannot be written here (read-only file or folder); nothing was recorded.")
        if _identity(self.path) != self._file:
            words = "was moved, deleted or replaced while it was open; nothing was recorded"
            raise StoreError(f"{self.path} {words}. Leave and open the site again.")
        with self._lock, spoken(self.path):
            self._begin()
            try:
                yield self._connection
                self._connection.execute("COMMIT")
            except BaseException:
                if self._connection.in_transaction:
                    self._connection.execute("ROLLBACK")
                raise

    def _begin(self) -> None:
        """Take the write lock. SQLite's own wait grows to 0.1 s a try, which starves a session beside busy ones."""
        deadline = time.monotonic() + BUSY_SECONDS
        self._connection.execute("PRAGMA busy_timeout = 0")
        try:
            while True:
                try:
                    self._connection.execute("BEGIN IMMEDIATE")
                    return
                except sqlite3.OperationalError as error:
                    if not error.sqlite_errorname.startswith("SQLITE_BUSY") or time.monotonic() > deadline:
                        raise
                time.sleep(RETRY_SECONDS)
        finally:
            self._connection.execute(f"PRAGMA busy_timeout = {int(1000 * BUSY_SECONDS)}")

    def _migrate(self) -> None:
        with self._writing() as connection:
            schema.migrate(connection, self._version())

    def _version(self) -> int:
        with self._lock, spoken(self.path):
            return schema.version_of(self._connection, self.path)

    def _one(self, query: str, *given: object) -> int | None:
        with self._lock, spoken(self.path):
            row = self._connection.execute(query, given).fetchone()
        return None if row is None else row[0]

    def _read(self, where: Sequence[str], given: Sequence[object], order: str) -> tuple[Entry, ...]:
        """Entries by condition. An entry never changes, so those read before are not read again."""
        picked = f"SELECT e.number FROM entries e WHERE {' AND '.join(where) or '1'} ORDER BY {order}"
        with self._lock, spoken(self.path):
            numbers = [row[0] for row in self._connection.execute(picked, given)]
            missing = sorted(set(numbers) - self._seen.keys())
            if len(self._seen) + len(missing) > _MOST_KEPT:
                missing, self._seen = sorted(set(numbers)), {}
            for first in range(0, len(missing), _AT_ONCE):
                self._load(missing[first : first + _AT_ONCE])
            try:
                return tuple(self._seen[number] for number in numbers)
            except KeyError as lost:
                raise DamageError(f"{self.path}: {DAMAGED} (entry {lost} is not where its index says).") from lost

    def _load(self, numbers: Sequence[int]) -> None:
        among = f"IN ({', '.join('?' * len(numbers))})"
        values: dict[int, list[Value]] = {}
        for row in self._connection.execute(select_values(f"v.entry {among}"), numbers):
            values.setdefault(row[0], []).append(value_of_row(row))
        try:
            for row in self._connection.execute(select_entry(f"e.number {among}"), numbers):
                self._seen[row[0]] = entry_of_row(row, tuple(values.get(row[0], ())))
        except (ValueError, TypeError) as error:
            raise DamageError(f"{self.path}: {DAMAGED} ({error}).") from error


def _effective(known: datetime | None) -> tuple[tuple[str, ...], list[object]]:
    """Conditions on ``entries e`` that hold for what counted as the book stood at ``known`` (None: now)."""
    known_text = moment_text(known) if known is not None else "9"
    where = (
        "e.void = 0",
        "e.entered <= ?",
        "NOT EXISTS (SELECT 1 FROM entries c WHERE c.supersedes = e.number AND c.entered <= ?)",
    )
    return where, [known_text, known_text]


def link_of(chain: str, entry: Entry) -> str:
    """SHA-256 over the link before and the entry's line: a changed or lost entry breaks every link after it."""
    import hashlib

    return hashlib.sha256(f"{chain}\n{line_of(entry)}".encode()).hexdigest()


def _identity(path: Path) -> tuple[int, int] | None:
    """Which file stands under a name; None where there is none."""
    try:
        found = path.stat()
    except OSError:
        return None
    return found.st_dev, found.st_ino
