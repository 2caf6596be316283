"""Times that look wrong: entered twice, long past, or by a clock that jumped."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import timedelta

from fertui.logbook.asking.question import Question, Setting, named
from fertui.logbook.entries import Entry
from fertui.logbook.times import AHEAD, shown

SAME_EVENT = timedelta(minutes=10)
LONG_PAST = timedelta(days=31)
REPORT_DELAY = timedelta(days=92)
LONG_PAUSE = timedelta(days=400)
"""When a colleague would ask (common practice, no source); a laboratory's report may come later than a reading."""


def twice(setting: Setting) -> Iterator[Question]:
    """The same values for the same place within minutes, or for the same whole day; in a table at the same time."""
    entry = setting.entry
    for other in setting.around(SAME_EVENT):
        same_place = (other.point, other.zone, other.whole_day) == (entry.point, entry.zone, entry.whole_day)
        if same_place and (other.number or 0) != entry.supersedes and _values(entry) == _values(other):
            at = shown(other.at, setting.site.timezone)[:16].replace("T", " ")
            text = f"The same was entered for {at} by {other.by} as {named(other)}. Enter it again?"
            yield Question("duplicate", text, suggestion=named(other))
            return


def long_past(setting: Setting) -> Iterator[Question]:
    """An event of weeks ago: perhaps the month or year is wrong."""
    entry = setting.entry
    allowed = REPORT_DELAY if entry.kind == "analysis" else LONG_PAST
    if entry.supersedes is None and entry.entered - entry.at > allowed:
        days = (entry.entered - entry.at).days
        text = f"{shown(entry.at, setting.site.timezone)[:10]} is {days} days ago. Is the date right?"
        yield Question("long_past", text, "at", shown(entry.at, setting.site.timezone))


def clock(setting: Setting) -> Iterator[Question]:
    """A clock behind the last entry, or far ahead of it: small boxes lose their time in a power cut."""
    number = setting.book.last_number()
    if not number:
        return
    last, now = setting.book.entry(number).entered, setting.entry.entered
    if now < last - AHEAD or now > last + LONG_PAUSE:
        says, before = (shown(each, setting.site.timezone)[:16].replace("T", " ") for each in (now, last))
        text = f"The clock of this machine says {says}, but the last entry was made at {before}. Is the clock right?"
        yield Question("clock", text, "at", says)


def _values(entry: Entry) -> list[tuple[str, str]]:
    return sorted((value.name, value.text if value.number is None else f"{value.number:.9g}") for value in entry.values)
