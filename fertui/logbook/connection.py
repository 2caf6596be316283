"""SQLite as the logbook uses it: how its file is opened, and what its trouble is called."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from fertui.logbook.errors import DamageError, StoreError
from fertui.logbook.files import quoted

BUSY_SECONDS = 5.0
"""So long one session waits for another."""


def connect(path: Path, address: str) -> sqlite3.Connection:
    """A connection that waits for other sessions, writes through to the disk and trusts nothing in the file."""
    connection = sqlite3.connect(address, uri=True, timeout=BUSY_SECONDS, isolation_level=None, check_same_thread=False)
    connection.execute("PRAGMA synchronous = FULL")
    connection.execute("PRAGMA foreign_keys = ON")
    connection.execute("PRAGMA trusted_schema = OFF")
    return connection


def address_of(path: Path, writable: bool) -> str:
    """The address under which SQLite opens a logbook."""
    # SQLite cannot open a WAL file in a folder it cannot write to; without a log beside it the file itself is whole.
    alone = not path.with_name(path.name + "-wal").exists()
    mode = "mode=rw" if writable else "mode=ro&immutable=1" if alone else "mode=ro"
    return f"file:{quoted(path)}?{mode}"


DAMAGED = "it is damaged. Keep a copy; `fertui backup` saves what can still be read"
_WORDS: dict[str, str] = {
    "SQLITE_BUSY": "another session has been writing to it for more than 5 s; nothing was recorded, try again",
    "SQLITE_FULL": "the disk is full; nothing was recorded. Make room and try again",
    "SQLITE_READONLY": "it cannot be written (read-only file, folder or disk); nothing was recorded",
    "SQLITE_CANTOPEN": "it cannot be opened; look at the rights of the file and its folder",
    "SQLITE_IOERR": "the disk failed while it was read or written; nothing was recorded. Look after the disk first",
    "SQLITE_PERM": "you have no right to use it",
}


@contextmanager
def spoken(path: Path) -> Iterator[None]:
    """Turn what SQLite reports into a sentence about the file."""
    try:
        yield
    except sqlite3.Error as error:
        name = getattr(error, "sqlite_errorname", "") or type(error).__name__
        damaged = name.startswith(("SQLITE_CORRUPT", "SQLITE_NOTADB")) or "decode" in str(error)
        if damaged:
            raise DamageError(f"{path}: {DAMAGED} ({error}).") from error
        words = next(
            (text for start, text in _WORDS.items() if name.startswith(start)), f"SQLite says: {error} ({name})"
        )
        raise StoreError(f"{path}: {words}.") from error
