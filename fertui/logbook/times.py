"""Times as people write them: local without a zone, UTC inside, a whole day where no time of day is given."""

from __future__ import annotations

import re
from datetime import UTC, date, datetime, time, timedelta
from functools import lru_cache
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

from fertui.logbook.errors import LogbookError

EARLIEST = datetime(1970, 1, 1, tzinfo=UTC)
AHEAD = timedelta(minutes=2)
"""How far clocks of two sessions may differ before a time lies in the future (common practice, no source)."""

_CLOCK = re.compile(r"(\d{1,2})[:.h](\d{2})(?::(\d{2}))?")
_DAY_FIRST = re.compile(r"(\d{1,2})\.(\d{1,2})\.(\d{4})", re.ASCII)
_DAY_WORDS = {"today": 0, "yesterday": 1}


@lru_cache(maxsize=8)
def zone(name: str) -> ZoneInfo:
    """The time zone of that name; raises ``LogbookError`` when this machine does not know it."""
    try:
        return ZoneInfo(name)
    except (ZoneInfoNotFoundError, ValueError, OSError) as error:
        raise LogbookError(f"this machine knows no time zone {name!r}; see timezone in site.toml.") from error


def read_moment(text: str, timezone: str, now: datetime) -> tuple[datetime, bool]:
    """UTC time of a text, and whether it names a whole day (then its local midnight).

    Takes ``07:30`` (today), ``yesterday 16:05``, ``2024-12-01``, ``2024-12-01 07:30``, ``1.12.2024 7:30`` (points mean
    day first; common practice, no source) and ISO 8601 with a zone; without one the time is in ``timezone``.
    Raises ``LogbookError`` for anything else, and for local times that a change of clocks skips or gives twice.

    >>> now = datetime(2024, 12, 1, 9, 0, tzinfo=UTC)
    >>> read_moment("07:30", "Europe/Amsterdam", now)
    (datetime.datetime(2024, 12, 1, 6, 30, tzinfo=datetime.timezone.utc), False)
    >>> read_moment("2024-11-30", "Europe/Amsterdam", now)
    (datetime.datetime(2024, 11, 29, 23, 0, tzinfo=datetime.timezone.utc), True)
    """
    written = text.strip()
    here = zone(timezone)
    today = now.astimezone(here).date()
    first, _, rest = written.partition(" ")
    try:
        if written.lower() == "now":
            return now.astimezone(UTC), False
        day = _day(first, today)
        if day is not None and not rest:
            return midnight(day, here), True
        if day is not None and _CLOCK.fullmatch(rest.strip()):
            return local(datetime.combine(day, _clock(rest)), here), False
        if _CLOCK.fullmatch(written):
            return local(datetime.combine(today, _clock(written)), here), False
        return local(datetime.fromisoformat(written), here), False
    except (ValueError, OverflowError) as error:
        if isinstance(error, LogbookError):
            raise
        raise LogbookError(
            f"{text!r} is not a time; write 07:30 (today), yesterday 16:05, 2024-12-01 or 1.12.2024 7:30."
        ) from error


def local(moment: datetime, here: ZoneInfo) -> datetime:
    """UTC time of a local time, or of one that carries its zone.

    Raises ``LogbookError`` when clocks were put forward over it (it never was) or back over it (it was twice).
    """
    if moment.tzinfo is not None:
        return moment.astimezone(UTC)
    earlier, later = (moment.replace(tzinfo=here, fold=fold) for fold in (0, 1))
    if earlier.utcoffset() == later.utcoffset():
        return earlier.astimezone(UTC)
    if earlier.astimezone(UTC).astimezone(here).replace(tzinfo=None) != moment:
        raise LogbookError(f"{moment:%Y-%m-%d %H:%M} never was in {here.key}: clocks were put forward over it.")
    raise LogbookError(
        f"{moment:%Y-%m-%d %H:%M} was twice in {here.key}, clocks were put back; "
        f"write {earlier.isoformat(timespec='minutes')} or {later.isoformat(timespec='minutes')}."
    )


def midnight(day: date, here: ZoneInfo) -> datetime:
    """UTC time at which a local day begins (the first moment there is, where clocks go forward then)."""
    return datetime.combine(day, time(), here).astimezone(UTC)


def noon(day: date, here: ZoneInfo) -> datetime:
    """UTC time of local noon."""
    return datetime.combine(day, time(12), here).astimezone(UTC)


def shown(moment: datetime, timezone: str) -> str:
    """Local time with its offset, as export and JSON write it; reads back to the same moment.

    >>> shown(datetime(2024, 12, 1, 6, 30, tzinfo=UTC), "Europe/Amsterdam")
    '2024-12-01T07:30:00+01:00'
    """
    return moment.astimezone(zone(timezone)).isoformat()


def _day(word: str, today: date) -> date | None:
    """The day that a word names, None where it names none; raises ``ValueError`` for a day that cannot be."""
    if word.lower() in _DAY_WORDS:
        return today - timedelta(days=_DAY_WORDS[word.lower()])
    if points := _DAY_FIRST.fullmatch(word):
        return date(int(points[3]), int(points[2]), int(points[1]))
    return date.fromisoformat(word) if re.fullmatch(r"\d{4}-\d{2}-\d{2}", word, re.ASCII) else None


def _clock(text: str) -> time:
    found = _CLOCK.fullmatch(text.strip())
    if not found:
        raise ValueError(text)
    hours, minutes, seconds = found.groups()
    return time(int(hours), int(minutes), int(seconds or 0))
