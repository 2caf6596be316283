"""What was logged long ago and still counts: of some kinds every entry, of others the last one of its subject."""

from __future__ import annotations

from collections.abc import Collection
from datetime import datetime
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from fertui.logbook.entries import Entry
    from fertui.logbook.store import Logbook

LASTING = ("recipe", "setpoint", "batch", "crop", "plan")
"""Kinds whose entries stay in force until the next one, however old they are."""
COUNTED_BY_YEAR = ("bleed",)
LAST_STANDS = ("analysis", "calibration", "level")
"""Kinds of which the last one stands, however old it is: of each point and water, meter, tank."""
SUBJECTS = ("source", "quantity", "tank")
"""Values that tell what such an entry is about."""


def in_force(
    book: Logbook, last_stands: Collection[str], stock_tanks: Collection[str], before: datetime, known: datetime | None
) -> tuple[Entry, ...]:
    """Effective entries before a time that still count at it, in the order of their time.

    ``last_stands``: kinds of which the last one of each subject counts. What was drawn from a stock tank counts since
    the tank was last filled.
    """
    lasting = book.entries(kinds=(*LASTING, *COUNTED_BY_YEAR), at=before, known=known)
    last = book.last_of_each(last_stands, before, known, SUBJECTS)
    old = [*lasting, *last, *_drawn(book, _filled([*lasting, *last], stock_tanks), before, known)]
    return tuple(sorted((each for each in old if each.at < before), key=lambda each: (each.at, each.number or 0)))


def _filled(entries: list[Entry], stock_tanks: Collection[str]) -> datetime | None:
    """Since when stock drawn counts: the earliest of the last fillings of all stock tanks."""
    fillings = [entry for entry in entries if entry.kind in ("batch", "level")]
    last = {entry.text_of("tank"): entry.at for entry in sorted(fillings, key=lambda entry: entry.at)}
    return min((at for name, at in last.items() if name in stock_tanks), default=None)


def _drawn(book: Logbook, since: datetime | None, before: datetime, known: datetime | None) -> tuple[Entry, ...]:
    return () if since is None else book.entries(kinds=("stock",), since=since, at=before, known=known)
