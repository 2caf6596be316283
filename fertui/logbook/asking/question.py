"""A question, and what is known when it is asked."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from datetime import timedelta
from functools import cached_property
from typing import NamedTuple

from fertui.logbook.entries import Entry, Value
from fertui.logbook.kinds import KINDS, Field
from fertui.logbook.store import Logbook
from fertui.site.model import Instrument, Loop, Site, StockTank, Supply

LOOK_BACK = timedelta(days=35)
"""How far back the last value of a kind is looked for (common practice, no source)."""


class Question(NamedTuple):
    """Something odd about an entry: asked where somebody can answer, kept as a flag of the entry otherwise.

    ``value``: the suspicious value as written; ``suggestion``: a text to put in its place, '' where there is none.
    """

    code: str
    text: str
    field: str = ""
    value: str = ""
    suggestion: str = ""


@dataclass(frozen=True)
class Setting:
    """An entry with the book and the site it belongs to."""

    entry: Entry
    book: Logbook
    site: Site
    before: Sequence[Entry] | None = None
    """Entries to look back on in place of the book's: those of a table are not in it yet."""

    @cached_property
    def loop(self) -> Loop | None:
        """The loop of the entry, None for site-wide kinds."""
        return next((loop for loop in self.site.loops if loop.name == self.entry.loop), None)

    @cached_property
    def past(self) -> tuple[Entry, ...]:
        """Effective entries of the same kind, loop, point and zone up to its time, itself left out, oldest first."""
        entry, since = self.entry, self.entry.at - LOOK_BACK
        if self.before is None:
            recent = self.book.entries(entry.loop or None, (entry.kind,), since, entry.at)
        else:
            recent = tuple(each for each in self.before if each.loop == entry.loop and each.at >= since)
        return tuple(
            each
            for each in recent
            if (each.point, each.zone) == (entry.point, entry.zone)
            if (each.number or 0) != entry.supersedes
        )

    def around(self, span: timedelta) -> tuple[Entry, ...]:
        """Entries of the same kind and loop within a time before and after; rows of a table only at the same time."""
        entry = self.entry
        if self.before is not None:
            return tuple(each for each in self.before if (each.loop, each.at) == (entry.loop, entry.at))
        return self.book.entries(entry.loop or None, (entry.kind,), entry.at - span, entry.at + span)

    @cached_property
    def numbers(self) -> tuple[tuple[Field, Value, float], ...]:
        """Fields, values and numbers of the entry, words left out."""
        kind = KINDS[self.entry.kind]
        found = ((kind.field(value.name), value) for value in self.entry.values)
        return tuple((field, value, value.number) for field, value in found if field and value.number is not None)

    def last(self, name: str, same: str = "") -> tuple[Entry, float] | None:
        """The last entry that carries a number of that name, and the number; ``same``: a word both must share."""
        for entry in reversed(self.past):
            number = entry.number_of(name)
            if number is not None and (not same or entry.text_of(same) == self.entry.text_of(same)):
                return entry, number
        return None

    @cached_property
    def instrument(self) -> Instrument | None:
        """The site's instrument that the entry names."""
        return next((each for each in self.site.instruments if each.name == self.entry.instrument), None)

    def supply(self, name: str) -> Supply | None:
        """The site's supply of that name."""
        return next((each for each in self.site.supplies if each.name == name), None)

    def stock_tank(self, name: str) -> StockTank | None:
        """The site's stock tank of that name."""
        return next((each for each in self.site.stock_tanks if each.name == name), None)


def named(entry: Entry) -> str:
    """How a question speaks of another entry; one that is not written yet is a row of the same table."""
    return "a row before" if entry.number is None else f"entry {entry.number}"


Asker = Callable[[Setting], Iterator[Question]]
"""Looks at one thing and asks where it is odd."""
