"""Instruments held against standards: how far off, which readings that puts in doubt, and the correction offered."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import UTC, datetime
from typing import NamedTuple

from fertui.logbook.entries import Entry
from fertui.logbook.store import Logbook

EC_FAIR_PCT = 5.0
"""EC meters against a standard: over 5 % off clean or replace (Owen 2022, e-GRO blog 179)."""

PH_GOOD = 0.05
"""pH meters against a check buffer (vendor practice, low trust)."""

_GOOD = ("good", "adjusted", "replaced")


class Doubted(NamedTuple):
    """A reading made between the last good check of its meter and the one that found it off.

    ``corrected`` is what the reading would be if the meter had been off by then as it was when found: an offer only.
    """

    entry: Entry
    quantity: str
    read: float
    corrected: float


def deviation(calibration: Entry) -> float:
    """How far the instrument was off: pH units for pH, per cent of the standard for everything else."""
    standard, reading = calibration.number_of("standard") or 0.0, calibration.number_of("reading") or 0.0
    if calibration.text_of("quantity") == "pH":
        return reading - standard
    return 100.0 * (reading - standard) / standard if standard else 0.0


def is_good(calibration: Entry) -> bool:
    """Whether the instrument may be trusted: its result says so, or where none is given, its deviation."""
    result = calibration.text_of("result")
    return result in _GOOD if result else _within(calibration)


def was_off(calibration: Entry) -> bool:
    """Whether the instrument was found wrong, adjusted since or not."""
    result = calibration.text_of("result")
    return result == "off" or (result != "good" and not _within(calibration))


def _within(calibration: Entry) -> bool:
    limit = PH_GOOD if calibration.text_of("quantity") == "pH" else EC_FAIR_PCT
    return abs(deviation(calibration)) <= limit


def standing(book: Logbook, instrument: str, at: datetime) -> tuple[Entry, ...]:
    """The last calibration of an instrument for each quantity, up to a time."""
    last = {
        entry.text_of("quantity"): entry
        for entry in book.entries(kinds=("calibration",), at=at)
        if entry.instrument == instrument
    }
    return tuple(last.values())


def doubted_by(calibration: Entry, entries: Sequence[Entry]) -> tuple[Doubted, ...]:
    """Readings a calibration puts in doubt, among ``entries``, oldest first. Nothing is rewritten.

    Those of its instrument since the last good check, up to this one where it was put right, on and on where it was
    not; none where it was found good. pH is corrected by the offset, everything else by the ratio.
    """
    if not was_off(calibration):
        return ()
    since = last_good(calibration, entries)
    until = calibration.at if is_good(calibration) else datetime.max.replace(tzinfo=UTC)
    quantity = calibration.text_of("quantity")
    mine = [
        each
        for each in entries
        if each.kind == "reading" and each.instrument == calibration.instrument and each.at <= until
        if since is None or each.at > since.at
    ]
    found = ((entry, entry.number_of(quantity)) for entry in mine)
    return tuple(
        Doubted(entry, quantity, read, _corrected(read, calibration)) for entry, read in found if read is not None
    )


def last_good(calibration: Entry, entries: Sequence[Entry]) -> Entry | None:
    """The last good check of the same instrument and quantity before a calibration, among ``entries``, oldest first."""
    about = (calibration.instrument, calibration.text_of("quantity"))
    good = [
        each
        for each in entries
        if each.kind == "calibration" and each.at < calibration.at and is_good(each)
        if (each.instrument, each.text_of("quantity")) == about
    ]
    return good[-1] if good else None


def _corrected(read: float, calibration: Entry) -> float:
    standard, reading = calibration.number_of("standard") or 0.0, calibration.number_of("reading") or 0.0
    if calibration.text_of("quantity") == "pH":
        return read - (reading - standard)
    return read * standard / reading if reading else read
