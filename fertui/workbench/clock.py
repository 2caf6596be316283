"""The moment a reader asks."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

LATEST = timedelta(seconds=10)
"""So long before the moment asked an event must lie to be in the state: the shortest stretch that is followed."""


def now() -> datetime:
    """End of a minute, in UTC: answers within a minute are the same, and what was just logged is in all of them."""
    return (datetime.now(UTC) + LATEST).replace(second=59, microsecond=999999)
