"""A site folder, opened: its site file, its logbook, its loops. Nothing heavy is loaded before it is asked for."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import datetime, timedelta
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING

from fertui.logbook.entries import Entry
from fertui.workbench.clock import now

if TYPE_CHECKING:
    from fertui.logbook.store import Logbook
    from fertui.site.model import Loop, Site


LOGBOOK = "logbook.sqlite3"
RECENT = timedelta(days=92)
"""Views look back three months, however little of it an estimate needs."""
NEWS_LASTS = timedelta(days=14)
"""Older entries are no news to anyone, however long he was away."""


class SiteFolder:
    """One site folder."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder

    @cached_property
    def site(self) -> Site:
        """The site as its file says now."""
        from fertui.site.files import read_site

        return read_site(self.folder)

    def site_stamp(self) -> int:
        """A number that changes when the site file does; 0 while there is none."""
        from fertui.site.files import NAME

        try:
            return (self.folder / NAME).stat().st_mtime_ns
        except OSError:
            return 0

    def read_site_again(self) -> Site:
        """Take up what the site file says now; raises ``SiteError`` where it cannot be read and keeps the old one."""
        from fertui.site.files import read_site

        site = read_site(self.folder)
        self.__dict__["site"] = site  # where cached_property keeps it
        return site

    @cached_property
    def book(self) -> Logbook:
        """The logbook, opened once."""
        from fertui.logbook.store import Logbook

        return Logbook.open(self.folder / LOGBOOK)

    @property
    def loops(self) -> tuple[str, ...]:
        """Names of the loops in the order of the file."""
        return tuple(loop.name for loop in self.site.loops)

    def loop(self, name: str | None = None) -> Loop:
        """A loop by name, the first when none is named."""
        from fertui.refusals import Refusal

        try:
            return self.site.loop(name)
        except KeyError as unknown:
            raise Refusal(str(unknown.args[0])) from None

    def entries(self, at: datetime | None = None, known: datetime | None = None) -> tuple[Entry, ...]:
        """Effective entries of all loops that still matter at ``at``, as they were known at ``known``.

        Of what has left every solution long ago only what stays in force, or counts for a year, is read: a book of
        many years answers like a new one.
        """
        from fertui.estimate.reach import since_needed

        at = at or now()
        analyses = self.book.entries(kinds=("analysis",), since=since_needed(at), at=at, known=known)
        since = min(since_needed(at, analyses), at - RECENT)
        recent = self.book.entries(since=since, at=at, known=known)
        return (*self._in_force(recent, since, known), *recent)

    def _in_force(self, recent: Sequence[Entry], before: datetime, known: datetime | None = None) -> tuple[Entry, ...]:
        """What was logged before the recent entries and still counts; readings where a loop has none since."""
        from fertui.workbench.in_force import LAST_STANDS, in_force

        read = {entry.loop for entry in recent if entry.kind == "reading"}
        last = LAST_STANDS if read >= set(self.loops) else (*LAST_STANDS, "reading")
        return in_force(self.book, last, {tank.name for tank in self.site.stock_tanks}, before, known)

    def time(self, written: str) -> datetime:
        """A time as people write it, on the clock of the site."""
        from fertui.logbook.times import read_moment

        return read_moment(written, self.site.timezone, now())[0]

    def history(
        self, kind: str | None = None, loop: str | None = None, at: datetime | None = None
    ) -> tuple[Entry, ...]:
        """Every entry verbatim, struck ones too."""
        from fertui.logbook.kinds import kind_named

        kinds = None if kind is None else (kind_named(kind).name,)
        return self.book.history(loop=None if loop is None else self.loop(loop).name, kinds=kinds, at=at)

    def news(self, by: str = "", after: int = 0) -> tuple[Entry, ...]:
        """What others wrote after the last entry of ``by``, and after a number, newest first; at most 14 days back."""
        oldest, found = now() - NEWS_LASTS, []
        for number in range(self.last_number(), after, -1):
            entry = self.book.entry(number)
            if entry.entered < oldest or (by and entry.by.lower() == by.lower()):
                break
            found.append(entry)
        return tuple(found)

    def last_number(self) -> int:
        """Number of the last entry: what another session wrote shows here."""
        return self.book.last_number()
