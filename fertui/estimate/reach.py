"""How far back an estimate looks, and where among its analyses it begins."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from datetime import datetime, timedelta

from fertui.logbook.entries import Entry

HISTORY_DAYS, WHOLE_DAYS = 180, 730
"""An estimate begins at most so far back: what happened earlier has left the solution long ago. The record of past
forecasts goes two years back."""
LEAST_DAYS, KEPT_ANALYSES, SHIFT = 60, 6, 3
"""It begins at least 60 days back and at least six analyses back, and moves on by three analyses at a time."""


def start_among(times: Sequence[float], end: float, kept: int = KEPT_ANALYSES) -> float:
    """When an estimate up to ``end`` begins, from the times [d] of its analyses in order.

    >>> start_among([0.0, 10.0, 20.0, 30.0, 40.0, 50.0, 60.0, 70.0, 80.0, 90.0, 100.0], 101.0)
    30.0
    """
    if not times:
        return end - LEAST_DAYS
    place = max((len(times) - kept) // SHIFT * SHIFT, 0)
    early = [time for time in times if time <= end - LEAST_DAYS]
    return min(times[place], early[-1] if early else times[0])


def since_needed(at: datetime, analyses: Iterable[Entry] = ()) -> datetime:
    """The earliest time whose entries an estimate at ``at`` looks at, those that stay in force aside.

    ``analyses``: analysis entries of all loops of the last ``HISTORY_DAYS``; without any it is that far back.
    """
    oldest = at - timedelta(days=HISTORY_DAYS + 7)
    by_loop: dict[str, list[float]] = {}
    for entry in sorted(analyses, key=lambda each: each.at):
        if oldest <= entry.at <= at and entry.point not in ("source", "feed") and not entry.doubtful:
            by_loop.setdefault(entry.loop, []).append((entry.at - oldest).total_seconds() / 86400.0)
    end = HISTORY_DAYS + 7.0
    starts = [start_among(times, end, KEPT_ANALYSES + SHIFT) for times in by_loop.values()]
    return max(oldest + timedelta(days=min(starts) - 1.0), oldest) if starts else oldest
