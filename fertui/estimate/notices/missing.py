"""What this grower usually writes down and did not, by the loop's own habit: nobody is nagged for the rest."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import date

from fertui.estimate.notices.look import Look
from fertui.estimate.notices.notice import NOTE, WATCH, Notice
from fertui.logbook.entries import Entry

HABIT_DAYS, HABIT = 7, 4
"""Logged on so many of the last seven days before: a habit (common practice, no source)."""
AMOUNTS = {
    "irrigation": ("water", "irrigation"), "drain": ("water", "drain"), "make-up water": ("water", "make_up"),
    "crop water": ("water", "crop"), "stock used": ("stock", "litres"),
}  # fmt: skip
METERS = {"irrigation": "irrigation_meter", "drain": "drain_meter", "make-up water": "make_up_meter"}
"""A meter position serves as well as an amount."""

QUIET_HOURS = 30.0
"""A round a day and a few hours' grace; after that the last reading is called old (common practice, no source)."""
SILENT_HOURS = 48.0


def readings(look: Look) -> Iterator[Notice]:
    """No reading yet, or none since a time; a loop that is known by analyses alone is left in peace."""
    given = [each for each in look.of("reading") if each.values]
    if not given:
        if look.loop.layout != "known-feed":
            yield Notice("log_missing", NOTE, "No reading of EC and pH is logged yet.", "r")
        return
    hours = 24.0 * look.age_days(given[-1].at)
    if hours <= QUIET_HOURS or not _is_habit(look, [look.local(each.at).date() for each in given], given[-1]):
        return
    when = f"{look.local(given[-1].at):%a %-d %b %H:%M}"
    fades = " What is shown rests on the model alone since." if hours > SILENT_HOURS else ""
    yield Notice("log_missing", WATCH if hours > SILENT_HOURS else NOTE,
                 f"No reading since {when}, {_ago(hours)} ago.{fades}", "r")  # fmt: skip


def _ago(hours: float) -> str:
    """Hours as people say them.

    >>> _ago(30.0), _ago(200.0)
    ('30 h', '8 days')
    """
    return f"{hours:.0f} h" if hours < 72.0 else f"{hours / 24.0:.0f} days"


def amounts(look: Look) -> Iterator[Notice]:
    """Yesterday's water and stock, where they are usually logged."""
    yesterday = next(look.days_back(1))
    missing = [words for words, where in AMOUNTS.items() if _is_missing(look, words, *where, yesterday)]
    if missing:
        named = missing[0] if len(missing) == 1 else f"{', '.join(missing[:-1])} and {missing[-1]}"
        are = "are" if len(missing) > 1 else "is"
        text = f"{named[0].upper()}{named[1:]} of yesterday ({yesterday:%a %-d %b}) {are} not logged."
        yield Notice("log_missing", NOTE, text, "w")


def _is_missing(look: Look, words: str, kind: str, name: str, yesterday: date) -> bool:
    names = (name, METERS.get(words, name))
    given = [
        each for each in look.of(kind, days=HABIT_DAYS + 3.0) if any(each.number_of(one) is not None for one in names)
    ]
    days = {look.local(each.at).date() for each in given}
    read_today = any(not each.whole_day and look.local(each.at).date() == look.today for each in given)
    before = list(look.days_back(HABIT_DAYS + 1))[1:]
    return yesterday not in days and not read_today and sum(day in days for day in before) >= HABIT


def _is_habit(look: Look, days: list[date], last: Entry) -> bool:
    """Whether readings came on most days of the week before the last one, or the last is the first few."""
    end = look.local(last.at).date().toordinal()
    week = {day for day in days if end - HABIT_DAYS < day.toordinal() <= end}
    return len(week) >= min(HABIT, len(set(days)))
