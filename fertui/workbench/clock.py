"""The moment a reader asks."""

from __future__ import annotations

from datetime import UTC, datetime


def now() -> datetime:
    """End of the running minute, in UTC: answers within a minute are the same, nothing just logged is hidden."""
    return datetime.now(UTC).replace(second=59, microsecond=999999)
