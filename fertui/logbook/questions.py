"""Validation that knows the trade: what a careful colleague would ask about an entry before it is written."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from fertui.logbook.asking import amounts, analyses, instruments, meters, times, values
from fertui.logbook.asking.question import LOOK_BACK, Asker, Question, Setting
from fertui.logbook.entries import Entry
from fertui.logbook.store import Logbook
from fertui.site.model import Site

__all__ = ["LOOK_BACK", "Question", "flagged", "questions", "questions_of_row"]

ASKERS: tuple[Asker, ...] = (
    values.out_by_ten,
    values.other_unit,
    values.unusual,
    values.stage,
    times.twice,
    times.long_past,
    times.clock,
    meters.backwards,
    meters.jump,
    meters.against_amount,
    amounts.out_by_ten,
    amounts.per_area,
    amounts.drain_over_irrigation,
    amounts.over_full,
    amounts.left_over,
    amounts.shelf,
    amounts.acid,
    instruments.compensated,
    instruments.sample_temperature,
    instruments.instrument_off,
)
"""Asked in this order; a value is asked about once by those of ``values``."""
OF_ROWS: tuple[Asker, ...] = (
    values.out_by_ten,
    values.other_unit,
    values.unusual,
    values.stage,
    times.twice,
    meters.backwards,
    meters.jump,
    meters.against_amount,
    amounts.per_area,
    amounts.drain_over_irrigation,
    amounts.over_full,
    amounts.shelf,
    amounts.acid,
)
"""Those asked about the rows of a table."""


def questions(entry: Entry, book: Logbook, site: Site) -> tuple[Question, ...]:
    """What is odd about an entry not yet written, most telling first; nothing is changed."""
    setting = Setting(entry, book, site)
    asked = [question for asker in ASKERS for question in asker(setting)]
    return _once([*asked, *analyses.holds_together(entry)])


def questions_of_row(entry: Entry, before: Sequence[Entry], book: Logbook, site: Site) -> tuple[Question, ...]:
    """What is odd about a row of a table, held against the entries and rows before it.

    How long ago it was, its instrument and what only the person who was there can tell are not asked about.
    """
    setting = Setting(entry, book, site, before)
    asked = [question for asker in OF_ROWS for question in asker(setting)]
    return _once([*asked, *analyses.holds_together(entry)])


def flagged(entry: Entry, unanswered: Iterable[Question]) -> Entry:
    """The entry with the codes of the questions nobody answered."""
    return entry._replace(flags=" ".join(dict.fromkeys(question.code for question in unanswered)))


def _once(asked: Iterable[Question]) -> tuple[Question, ...]:
    """Each field once among the questions about its number; the first asker knows best."""
    about_numbers = ("out_by_ten", "other_unit", "unusual")
    seen: set[str] = set()
    kept = []
    for question in asked:
        if question.code in about_numbers and question.field in seen:
            continue
        seen |= {question.field} if question.code in about_numbers else set()
        kept.append(question)
    return tuple(kept)
