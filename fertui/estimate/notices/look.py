"""What the rules look at: an estimate, its forecast, and the entries of the site, asked in the words of the trade."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from datetime import date, datetime, timedelta
from functools import cached_property
from typing import TYPE_CHECKING, NamedTuple
from zoneinfo import ZoneInfo

from fertui.estimate.points import PointState
from fertui.logbook.entries import Entry
from fertui.site.model import Loop, Site

if TYPE_CHECKING:
    from fertui.estimate.assimilation import Estimate
    from fertui.estimate.forecast import Forecast


class Measured(NamedTuple):
    """One number as logged."""

    value: float
    at: datetime
    point: str
    entry: Entry


@dataclass(frozen=True)
class Look:
    """One loop at a time. Entries are effective ones of the whole site; doubtful ones are looked at by no rule."""

    estimate: Estimate
    entries: Sequence[Entry]
    ahead: Forecast | None

    @property
    def site(self) -> Site:
        """The site."""
        return self.estimate.site

    @property
    def loop(self) -> Loop:
        """The loop."""
        return self.estimate.loop

    @property
    def at(self) -> datetime:
        """The moment of the estimate."""
        return self.estimate.at

    @cached_property
    def zone(self) -> ZoneInfo:
        """The clock of the site."""
        return ZoneInfo(self.site.timezone)

    @cached_property
    def today(self) -> date:
        """The local date."""
        return self.local(self.at).date()

    @cached_property
    def points(self) -> dict[str, PointState]:
        """Every point as it is now."""
        return dict(self.estimate.points())

    @cached_property
    def past(self) -> tuple[Entry, ...]:
        """Certain entries of the whole site up to the moment, oldest first."""
        known = [each for each in self.entries if each.at <= self.at and not each.void and not each.doubtful]
        return tuple(sorted(known, key=lambda each: each.at))

    @cached_property
    def _own(self) -> dict[str, list[Entry]]:
        """This loop's entries by kind, oldest first."""
        found: dict[str, list[Entry]] = {}
        for each in self.past:
            if each.loop == self.loop.name:
                found.setdefault(each.kind, []).append(each)
        return found

    def of(self, *kinds: str, days: float | None = None) -> list[Entry]:
        """Entries of this loop of some kinds, of the last so many days, oldest first."""
        found = [each for kind in kinds for each in self._own.get(kind, ())]
        if days is not None:
            since = self.at - timedelta(days=days)
            found = [each for each in found if each.at >= since]
        return found if len(kinds) == 1 else sorted(found, key=lambda each: each.at)

    def measured(self, name: str, points: Sequence[str], days: float) -> list[Measured]:
        """Readings of a number at any of some points within the last days, oldest first."""
        found = ((each, each.number_of(name)) for each in self.of("reading", days=days) if self.point(each) in points)
        return [Measured(number, each.at, self.point(each), each) for each, number in found if number is not None]

    def last(self, name: str, points: Sequence[str], days: float) -> Measured | None:
        """The last of those readings."""
        found = self.measured(name, points, days)
        return found[-1] if found else None

    def point(self, entry: Entry) -> str:
        """The point an entry belongs to; one that names none in a shared tank means the tank."""
        return entry.point or ("tank" if self.loop.layout == "shared-tank" else "feed")

    @property
    def fed_from(self) -> str:
        """Where the solution that reaches the crop is measured."""
        return "tank" if self.loop.layout == "shared-tank" else "feed"

    @cached_property
    def set_ec(self) -> float | None:
        """EC set point in force [mS/cm], None where none was ever given."""
        logged = [number for each in self.of("setpoint") if (number := each.number_of("EC")) is not None]
        return logged[-1] if logged else self.loop.feed_ec

    def local(self, moment: datetime) -> datetime:
        """A moment on the clock of the site."""
        return moment.astimezone(self.zone)

    def day(self, moment: datetime) -> str:
        """A day in words."""
        return f"{self.local(moment):%a %-d %b}"

    def age_days(self, moment: datetime) -> float:
        """Days since a moment."""
        return (self.at - moment).total_seconds() / 86400.0

    def days_back(self, count: int) -> Iterator[date]:
        """The local dates before today, yesterday first."""
        return (self.today - timedelta(days=back) for back in range(1, count + 1))
