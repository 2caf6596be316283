"""An entry as one line of JSON and back: what the hash chain, the backup and the dump of a damaged book share."""

from __future__ import annotations

import json
import re
from collections.abc import Mapping
from datetime import UTC, datetime
from typing import Any

from fertui.logbook.entries import Entry, Value
from fertui.logbook.errors import LogbookError
from fertui.logbook.kinds import KINDS

ENTRY_FIELDS = Entry._fields
VALUE_FIELDS = Value._fields
LONGEST_TEXT = 1_000_000
LARGEST_NUMBER = 1e15


def moment_text(moment: datetime) -> str:
    """A time as UTC text of fixed width, so that text order is time order.

    Raises ``LogbookError`` for a time without a zone.

    >>> moment_text(datetime(2024, 12, 1, 7, 42, tzinfo=UTC))
    '2024-12-01T07:42:00.000000Z'
    """
    if moment.tzinfo is None:
        raise LogbookError(f"the time {moment.isoformat()} has no zone; entries carry times with a zone.")
    return moment.astimezone(UTC).replace(tzinfo=None).isoformat(timespec="microseconds") + "Z"


def moment(text: str) -> datetime:
    """The aware UTC time of a text written by ``moment_text``; raises ``ValueError`` for one without a zone."""
    read = datetime.fromisoformat(text)
    if read.tzinfo is None:
        raise ValueError(f"the time {text!r} has no zone")
    return read if read.tzinfo is UTC else read.astimezone(UTC)


def line_of(entry: Entry) -> str:
    """One entry as one line of JSON, keys sorted, numbers round-trip.

    >>> line_of(Entry("note", "bay", datetime(2024, 1, 1, tzinfo=UTC), datetime(2024, 1, 1, tzinfo=UTC), "MK"))[:34]
    '{"at": "2024-01-01T00:00:00.000000'
    """
    plain: dict[str, Any] = {name: getattr(entry, name) for name in ENTRY_FIELDS}
    plain["at"], plain["entered"] = moment_text(entry.at), moment_text(entry.entered)
    plain["values"] = [[getattr(value, name) for name in VALUE_FIELDS] for value in map(settled, entry.values)]
    return json.dumps(plain, sort_keys=True, ensure_ascii=False, allow_nan=False)


def settled(value: Value) -> Value:
    """The value as the file gives it back: numbers as floats, no negative zero."""
    return value if value.number is None else value._replace(number=float(value.number) + 0.0)


def entry_of(plain: Mapping[str, Any]) -> Entry:
    """The entry of one decoded line; raises ``LogbookError`` when a key is missing, unknown or of another type."""
    unknown, missing = set(plain) - set(ENTRY_FIELDS), set(ENTRY_FIELDS) - set(plain)
    if unknown or missing:
        raise LogbookError(f"an entry has unknown keys {sorted(unknown)} and lacks {sorted(missing)}.")
    try:
        values = tuple(Value(**dict(zip(VALUE_FIELDS, value, strict=True))) for value in plain["values"])
        times = {name: moment(plain[name]) for name in ("at", "entered")}
    except (TypeError, ValueError, OverflowError) as error:
        raise LogbookError(f"entry {plain['number']}: {error}.") from error
    entry = Entry(**{**plain, **times, "values": values})
    check_storable(entry)
    if entry.kind not in KINDS:
        raise LogbookError(f"the kind {entry.kind!r} is not known; was it written by a newer fertui?")
    return entry


def check_storable(entry: Entry) -> None:
    """Raise ``LogbookError`` unless every part has the type, characters and finite numbers the book can keep."""
    for name, wanted in _TYPES.items():
        if not isinstance(getattr(entry, name), wanted):
            raise LogbookError(f"{name} of an entry cannot be {getattr(entry, name)!r}.")
    for count in (entry.number, entry.supersedes):
        if count is not None and (isinstance(count, bool) or not 0 < count <= LARGEST_NUMBER):
            raise LogbookError(f"an entry cannot have or supersede the number {count!r}.")
    for name in _TEXTS:
        check_text(name, getattr(entry, name), lines=name in ("note", "why", "doubtful"))
    for value in entry.values:
        _check_value(value)
    names = [value.name for value in entry.values]
    if len(set(names)) < len(names):
        raise LogbookError(f"{next(each for each in names if names.count(each) > 1)} is given twice in one entry.")


def check_text(name: str, text: str, lines: bool = False) -> None:
    """Raise ``LogbookError`` for control characters (a terminal would obey them), broken Unicode, excessive length."""
    if len(text) > LONGEST_TEXT:
        raise LogbookError(f"{name} is {len(text):,} characters long; at most {LONGEST_TEXT:,} are kept.")
    found = (_NOT_TEXT if lines else _NOT_ONE_LINE).search(text)
    if found:
        raise LogbookError(f"{name} contains the character {found.group()!a}, which is not text here; leave it out.")


_NOT_ONE_LINE = re.compile("[\x00-\x1f\x7f-\x9f\ud800-\udfff]")
_NOT_TEXT = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f\ud800-\udfff]")
_NUMBERED = (int, type(None))
_TEXTS = ("kind", "loop", "by", "point", "zone", "method", "instrument", "note", "doubtful", "why", "flags")
_TYPES: Mapping[str, Any] = {
    **dict.fromkeys(_TEXTS, str), "at": datetime, "entered": datetime, "values": tuple, "number": _NUMBERED,
    "supersedes": _NUMBERED, "void": bool, "whole_day": bool,
}  # fmt: skip


def _check_value(value: Value) -> None:
    for name in ("name", "text", "unit", "species"):
        if not isinstance(getattr(value, name), str):
            raise LogbookError(f"{name} of a value cannot be {getattr(value, name)!r}.")
        check_text(value.name, getattr(value, name), lines=name == "text")
    number = value.number
    if (
        not isinstance(value.below, bool)
        or isinstance(number, bool)
        or not isinstance(number, (int, float, type(None)))
    ):
        raise LogbookError(f"{value.name} cannot be {number!r}.")
    if number is not None and not abs(number) <= LARGEST_NUMBER:
        raise LogbookError(f"{value.name} = {value.text!r} is not a number that can be.")
