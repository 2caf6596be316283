"""Litres of stock as logged: what each tank was drawn, what is left in it, how many days that lasts."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from datetime import datetime, time, timedelta
from typing import NamedTuple
from zoneinfo import ZoneInfo

import numpy as np

from fertui.chemistry.ions import Array
from fertui.estimate.spreads import Spread, spread
from fertui.logbook.entries import Entry
from fertui.site.model import Loop, Site

RATE_DAYS = 7.0
"""Use is the mean of so many days past (common practice, no source)."""
LEAST_LOGGED = 1.0
"""Days of logged use it takes to speak of a rate."""
LONGEST_GAP = 5.0
"""Days without an entry for which use is taken to have gone on as before; older silence says nothing."""
USUAL_SPAN = timedelta(days=1)


class StockLeft(NamedTuple):
    """One stock tank now: litres left, litres a day as used lately (None: not known)."""

    litres: float
    litres_a_day: float | None

    @property
    def days(self) -> float | None:
        """Days it lasts at that rate."""
        return self.litres / self.litres_a_day if self.litres_a_day else None


def stock_days_left(site: Site, loop: Loop, entries: Iterable[Entry], at: datetime) -> Mapping[str, float]:
    """Days left in each stock tank of a loop by logged use, without tanks whose filling or use was never logged."""
    left = stock_left(site, loop, entries, at)
    return {name: days for name, each in left.items() if (days := each.days) is not None}


def stock_left(site: Site, loop: Loop, entries: Iterable[Entry], at: datetime) -> Mapping[str, StockLeft]:
    """What is left in each stock tank of a loop: the last batch or level less what any loop used of it since.

    Where the last days are not logged, use is taken to have gone on at the rate of the days before.
    """
    known = [each for each in entries if each.at <= at and not each.void and not each.doubtful]
    zone = ZoneInfo(site.timezone)
    found = {
        name: _left([each for each in known if each.text_of("tank") == name], at, zone) for name in loop.stock_tanks
    }
    return {name: each for name, each in found.items() if each is not None}


def drawn(entries: Sequence[Entry], name: str, at: datetime, zone: ZoneInfo) -> Spread:
    """Litres drawn from a stock tank, spread over the time each entry covers; days from ``at``, so negative."""
    used = [each for each in entries if each.kind == "stock" and each.text_of("tank") == name]
    return amounts(used, "litres", at, zone)


def amounts(entries: Sequence[Entry], name: str, at: datetime, zone: ZoneInfo) -> Spread:
    """An amount of some entries spread over the time each covers, as the record reads them; days from ``at``."""
    given = sorted((each for each in entries if each.number_of(name) is not None), key=lambda each: each.at)
    rows = []
    before: datetime | None = None
    for each in given:
        start, end = _span(each, before, zone)
        rows.append((_days(start, at), _days(end, at), each.number_of(name) or 0.0))
        before = each.at
    return spread(rows)


def rate(flow: Spread, since: float, until: float) -> float | None:
    """Litres a day of the logged part of a time [d from now]; None where less than a day of it was logged."""
    window = np.array([since, until])
    logged = float(flow.covered(window)[0]) * (until - since)
    return float(flow.over(window)[0]) / logged if logged >= LEAST_LOGGED - 1e-6 else None


def _left(entries: Sequence[Entry], at: datetime, zone: ZoneInfo) -> StockLeft | None:
    filled = [each for each in entries if each.kind in ("batch", "level") and each.number_of("litres") is not None]
    if not filled:
        return None
    last = max(filled, key=lambda each: each.at)
    by_loop = {each.loop for each in entries}
    flows = [drawn([each for each in entries if each.loop == loop], last.text_of("tank"), at, zone) for loop in by_loop]
    since = min(_days(last.at, at), -1e-3)
    used = sum(_used(flow, since) for flow in flows)
    rates = [found for flow in flows if (found := rate(flow, -RATE_DAYS, 0.0)) is not None]
    litres = max((last.number_of("litres") or 0.0) - used, 0.0)
    return StockLeft(litres, sum(rates) if rates else None)


def _used(flow: Spread, since: float) -> float:
    """Litres since a time [d from now]: as logged, and at the last rate for the days not yet logged."""
    logged = float(flow.over(np.array([since, 0.0]))[0])
    lately = rate(flow, -RATE_DAYS, 0.0)
    if lately is None or not len(flow.end):
        return logged
    gap = -max(float(np.minimum(flow.end, 0.0).max()), since)
    return logged + lately * gap if gap <= LONGEST_GAP else logged


def day_grid(at: datetime, zone: ZoneInfo, days: int) -> Array:
    """The last so many local midnights (days + 1,) up to today's, in days from now."""
    today = at.astimezone(zone).date()
    nights = [datetime.combine(today - timedelta(days=back), time(), zone) for back in range(days, -1, -1)]
    return np.array([_days(night, at) for night in nights])


def _span(entry: Entry, before: datetime | None, zone: ZoneInfo) -> tuple[datetime, datetime]:
    if entry.whole_day:
        day = entry.at.astimezone(zone).date()
        return entry.at, datetime.combine(day + timedelta(days=1), time(), zone)
    return before or entry.at - USUAL_SPAN, entry.at


def _days(moment: datetime, at: datetime) -> float:
    return (moment - at).total_seconds() / 86400.0
