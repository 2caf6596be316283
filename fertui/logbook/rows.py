"""Entries as rows of the two tables, and the conditions that pick them. Every value goes in as a parameter."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from datetime import datetime
from typing import Any

from fertui.logbook.codec import VALUE_FIELDS, moment, moment_text
from fertui.logbook.entries import Entry, Value

COLUMNS = (
    "number", "kind", "loop", "at", "entered", "by", "point", "zone", "method", "instrument", "note", "doubtful",
    "supersedes", "why", "void", "whole_day", "flags",
)  # fmt: skip
_SELECT = "SELECT " + ", ".join(f"e.{column}" for column in COLUMNS)
_SELECT_VALUES = "SELECT v.entry, " + ", ".join(f"v.{name}" for name in VALUE_FIELDS)
INSERT_ENTRY = f"INSERT INTO entries ({', '.join(COLUMNS)}, hash) VALUES ({', '.join('?' * (len(COLUMNS) + 1))})"
_VALUE_COLUMNS = ("entry", "position", *VALUE_FIELDS)
INSERT_VALUE = f"INSERT INTO entry_values ({', '.join(_VALUE_COLUMNS)}) VALUES ({', '.join('?' * len(_VALUE_COLUMNS))})"


def select_entry(where: str) -> str:
    """Query for the columns that ``entry_of_row`` takes."""
    return f"{_SELECT} FROM entries e WHERE {where}"


def select_values(where: str) -> str:
    """Query for the values of an entry in their order: entry, then the fields of ``Value``."""
    return f"{_SELECT_VALUES} FROM entry_values v WHERE {where} ORDER BY v.entry, v.position"


def value_of_row(row: Sequence[Any]) -> Value:
    """The value of one row of ``select_values``."""
    _, name, text, number, unit, species, below = row
    return Value(name, text, number, unit, species, bool(below))


def entry_of_row(row: Sequence[Any], values: tuple[Value, ...]) -> Entry:
    """The entry of one row of ``entries``."""
    (
        number, kind, loop, at, entered, by, point, zone, method, instrument, note, doubtful, supersedes, why, void,
        whole_day, flags,
    ) = row  # fmt: skip
    return Entry(
        kind, loop, moment(at), moment(entered), by, values, number, point, zone, method, instrument, note, doubtful,
        supersedes, why, bool(void), bool(whole_day), flags,
    )  # fmt: skip


def conditions(
    loop: str | None, kinds: Iterable[str] | None, since: datetime | None, at: datetime | None
) -> tuple[tuple[str, ...], list[object]]:
    """Conditions on ``entries e`` and what they are given: of a loop and the site, of kinds, of a time.

    A plan made by ``at`` for days after it is not a later event: it was known then.
    """
    where: list[str] = []
    given: list[object] = []
    if loop is not None:
        where.append("e.loop IN (?, '')")
        given.append(loop)
    if kinds is not None:
        wanted = tuple(kinds)
        where.append(f"e.kind IN ({', '.join('?' * len(wanted))})")
        given.extend(wanted)
    if since is not None:
        where.append("e.at >= ?")
        given.append(moment_text(since))
    if at is not None:
        where.append("(e.at <= ? OR (e.kind = 'plan' AND e.entered <= ?))")
        given.extend((moment_text(at), moment_text(at)))
    return tuple(where), given
