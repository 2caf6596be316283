"""Tables of the logbook file, their guards, and how older files are brought up to date."""

from __future__ import annotations

import sqlite3
from datetime import UTC, datetime
from pathlib import Path

from fertui.logbook.codec import moment_text
from fertui.logbook.errors import StoreError

APPLICATION_ID = 0x66657274
"""Marks the file as a fertui logbook in its SQLite header ("fert")."""

VERSION_1 = """
CREATE TABLE entries (
  number     INTEGER PRIMARY KEY,
  kind       TEXT    NOT NULL,
  loop       TEXT    NOT NULL,
  at         TEXT    NOT NULL,  -- UTC, time of the event
  entered    TEXT    NOT NULL,  -- UTC, time of entry
  by         TEXT    NOT NULL,
  point      TEXT    NOT NULL,
  zone       TEXT    NOT NULL,
  method     TEXT    NOT NULL,
  instrument TEXT    NOT NULL,
  note       TEXT    NOT NULL,
  doubtful   TEXT    NOT NULL,
  supersedes INTEGER REFERENCES entries(number),
  why        TEXT    NOT NULL,
  void       INTEGER NOT NULL,
  whole_day  INTEGER NOT NULL,
  flags      TEXT    NOT NULL,
  hash       TEXT    NOT NULL   -- SHA-256 of the hash before and this entry's line
) STRICT;
CREATE UNIQUE INDEX entries_superseded ON entries(supersedes) WHERE supersedes IS NOT NULL;
CREATE INDEX entries_by_time ON entries(at, number);
CREATE INDEX entries_by_kind ON entries(kind, at, number);
CREATE TABLE entry_values (
  entry    INTEGER NOT NULL REFERENCES entries(number),
  position INTEGER NOT NULL,
  name     TEXT    NOT NULL,
  text     TEXT    NOT NULL,  -- as written
  number   REAL,              -- canonical; NULL for words
  unit     TEXT    NOT NULL,  -- as written; '' is the canonical unit
  species  TEXT    NOT NULL,  -- as written; '' is the canonical one
  below    INTEGER NOT NULL,  -- 1: below this limit of detection
  PRIMARY KEY (entry, position)
) STRICT, WITHOUT ROWID;
CREATE TABLE migrations (
  version INTEGER PRIMARY KEY,
  what    TEXT    NOT NULL,
  at      TEXT    NOT NULL
) STRICT;
CREATE TRIGGER entries_keep BEFORE UPDATE ON entries
  BEGIN SELECT RAISE(ABORT, 'the logbook is append-only'); END;
CREATE TRIGGER entries_stay BEFORE DELETE ON entries
  BEGIN SELECT RAISE(ABORT, 'the logbook is append-only'); END;
CREATE TRIGGER values_keep BEFORE UPDATE ON entry_values
  BEGIN SELECT RAISE(ABORT, 'the logbook is append-only'); END;
CREATE TRIGGER values_stay BEFORE DELETE ON entry_values
  BEGIN SELECT RAISE(ABORT, 'the logbook is append-only'); END;
CREATE TRIGGER migrations_keep BEFORE UPDATE ON migrations
  BEGIN SELECT RAISE(ABORT, 'the logbook is append-only'); END;
CREATE TRIGGER migrations_stay BEFORE DELETE ON migrations
  BEGIN SELECT RAISE(ABORT, 'the logbook is append-only'); END;
CREATE TRIGGER entries_follow BEFORE INSERT ON entries
  WHEN NEW.number IS NOT (SELECT coalesce(max(number), 0) + 1 FROM entries)
  BEGIN SELECT RAISE(ABORT, 'entries are numbered without gaps'); END;
CREATE TRIGGER values_follow BEFORE INSERT ON entry_values
  WHEN NEW.entry IS NOT (SELECT max(number) FROM entries)
  BEGIN SELECT RAISE(ABORT, 'values belong to the entry just made'); END;
"""

MIGRATIONS: tuple[tuple[str, str], ...] = (("first schema", VERSION_1),)
"""What each version brought and its statements; version n is the n-th row. Released rows are never changed."""

VERSION = len(MIGRATIONS)


def check_head(path: Path) -> None:
    """Raise ``StoreError`` for a file of another program or a newer fertui by its first 72 bytes, without opening it.

    SQLite file format, section 1.3: user version at byte 60, application id at 68.
    """
    with path.open("rb") as file:
        head = file.read(72)
    _check(int.from_bytes(head[60:64], "big"), int.from_bytes(head[68:72], "big"), path)


def version_of(connection: sqlite3.Connection, path: object) -> int:
    """Schema version of an open file, 0 for an empty one; raises ``StoreError`` as ``check_head`` does."""
    version = int(connection.execute("PRAGMA user_version").fetchone()[0])
    application = int(connection.execute("PRAGMA application_id").fetchone()[0])
    if version or application:
        _check(version, application, path)
    return version


def _check(version: int, application: int, path: object) -> None:
    if application != APPLICATION_ID:
        raise StoreError(f"{path} is a database of another program; it was left as it is.")
    if version > VERSION:
        raise StoreError(
            f"{path} was written by a newer fertui (schema {version}, this one knows up to {VERSION}); "
            "it was left as it is. Update fertui to open it."
        )


def migrate(connection: sqlite3.Connection, known: int) -> None:
    """Bring the open file from version ``known`` to ``VERSION``; call inside one transaction."""
    for version, (what, statements) in enumerate(MIGRATIONS[known:], start=known + 1):
        for statement in _statements(statements):
            connection.execute(statement)
        row = (version, what, moment_text(datetime.now(UTC)))
        connection.execute("INSERT INTO migrations (version, what, at) VALUES (?, ?, ?)", row)
    connection.execute(f"PRAGMA application_id = {APPLICATION_ID:d}")
    connection.execute(f"PRAGMA user_version = {VERSION:d}")


def _statements(script: str) -> list[str]:
    # executescript would commit the transaction, so the script is cut where SQLite itself says a statement is complete.
    statements, part = [], ""
    for line in script.splitlines(keepends=True):
        part += line
        if part.strip() and sqlite3.complete_statement(part):
            statements.append(part)
            part = ""
    return statements
