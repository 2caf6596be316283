"""EC that the litres of stock used do not explain: injector, stock mixed wrong, or meter. Day by day from the log."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import date

import numpy as np

from fertui.chemistry.conductivity import conductivity
from fertui.chemistry.ions import IONS, Array
from fertui.estimate.notices.look import Look
from fertui.estimate.notices.notice import WATCH, Notice
from fertui.estimate.notices.stocks import amounts, day_grid
from fertui.estimate.quantiles import median

UNEXPLAINED = 0.10
"""EC at the drip this far from what stock and blend make, against the loop's own past (common practice, no source)."""
UNEXPLAINED_ALONE = 0.15
"""The same where there is no past to compare with: the blend's composition is an estimate."""
TOPPED_UP = 0.25
"""Stock per m3 of make-up water changed by more: light and stage move it by less (common practice, no source)."""
RECENT_DAYS, PAST_DAYS = 3, 14
LEAST_PAST_DAYS = 4
WHOLE_DAY = 0.99
MOST_OF_IT = 0.9

_UNKNOWN = [np.nan] * len(IONS)


def unexplained(look: Look) -> Iterator[Notice]:
    """Stock used against EC x m3: of the feed where drain is blended, of the top-up where a tank is shared."""
    if look.loop.layout == "drain-blend":
        yield from _blended(look)
    elif look.loop.layout == "shared-tank":
        yield from _topped_up(look)


def _blended(look: Look) -> Iterator[Notice]:
    """Blend of drain and make-up plus stock, as logged, against EC read at the drip: lately, against the past."""
    measured, expected = _read_of_days(look), _made_of_days(look)
    ratios = (measured / expected)[~np.isnan(measured / expected)]
    if np.isnan(measured / expected)[-RECENT_DAYS:].all():
        return
    past = ratios[:-RECENT_DAYS]
    usual, allowed = 1.0, UNEXPLAINED_ALONE
    if len(past) >= LEAST_PAST_DAYS:
        usual, allowed = float(median(past)), UNEXPLAINED
    off = float(median(ratios[-RECENT_DAYS:])) / usual
    if abs(off - 1.0) > allowed:
        read = float(np.nanmean(measured[-RECENT_DAYS:]))
        text = f"EC at the drip reads {read:.1f} mS/cm; blend and stock used make {read / off:.1f}."
        yield Notice("ec_unexplained", WATCH, f"{text} Check injector, stock strength and EC meter.", "4")


def _made_of_days(look: Look) -> Array:
    """EC (days,) [mS/cm] that drain, make-up and stock of every past day make together; nan where the log has gaps."""
    grid = day_grid(look.at, look.zone, RECENT_DAYS + PAST_DAYS)
    water = look.of("water")
    irrigation, make_up = (amounts(water, name, look.at, look.zone) for name in ("irrigation", "make_up"))
    stock, by_record = look.estimate.record.stock, grid + look.estimate.record.end
    covered = np.minimum.reduce([irrigation.covered(grid), make_up.covered(grid), stock.covered(by_record)])
    litres = np.where(covered > WHOLE_DAY, irrigation.over(grid), np.nan)[:, None]
    fresh = np.clip(make_up.over(grid)[:, None] / litres, 0.0, 1.0)
    source = look.estimate.record.make_up_at(look.estimate.record.end)
    blend = (1.0 - fresh) * _drain_of_days(look) + fresh * source + stock.over(by_record) / litres
    made = np.asarray(conductivity(np.nan_to_num(blend)))
    return np.where(np.isnan(blend).any(axis=1), np.nan, made)


def _drain_of_days(look: Look) -> Array:
    """What the drain store held (days, 10) [mmol/L] on every past day, as estimated; nan before the estimate began."""
    by_day = {look.local(each.at).date(): each.state for each in look.estimate.course("drain_store", PAST_DAYS + 2)}
    return np.array(
        [
            [by_day[day].ions[ion].mmol_l.value for ion in IONS] if day in by_day else _UNKNOWN
            for day in _past_days(look)
        ]
    )


def _read_of_days(look: Look) -> Array:
    """Mean EC read at the drip on every past day (days,), oldest first; nan where none was."""
    by_day: dict[date, list[float]] = {}
    for each in look.measured("EC", ("feed",), RECENT_DAYS + PAST_DAYS + 1.0):
        by_day.setdefault(look.local(each.at).date(), []).append(each.value)
    return np.array([np.mean(by_day[day]) if day in by_day else np.nan for day in _past_days(look)])


def _past_days(look: Look) -> list[date]:
    return list(look.days_back(RECENT_DAYS + PAST_DAYS))[::-1]


def _topped_up(look: Look) -> Iterator[Notice]:
    """Stock per m3 of make-up that a shared tank needs to hold its EC, lately against before."""
    grid = day_grid(look.at, look.zone, RECENT_DAYS + PAST_DAYS)
    lately, usual = _strength(look, grid[[-1 - RECENT_DAYS, -1]]), _strength(look, grid[[0, -1 - RECENT_DAYS]])
    if lately is None or usual is None or usual <= 0 or abs(lately / usual - 1.0) <= TOPPED_UP:
        return
    change = 100.0 * (lately / usual - 1.0)
    more = "more" if change > 0 else "less"
    text = f"Holding EC takes {abs(change):.0f} % {more} stock per m3 of make-up water than in the two weeks before."
    yield Notice("ec_unexplained", WATCH, f"{text} Check stock strength, leaks and meters.", "4")


def _strength(look: Look, window: Array) -> float | None:
    """EC [mS/cm] stock added to each litre of make-up, less what the tank rose by; None where the log has gaps."""
    make_up = amounts(look.of("water"), "make_up", look.at, look.zone)
    stock, by_record = look.estimate.record.stock, window + look.estimate.record.end
    litres, rise = float(make_up.over(window)[0]), _rise(look, window)
    if min(make_up.covered(window)[0], stock.covered(by_record)[0]) < MOST_OF_IT or litres <= 0 or rise is None:
        return None
    added = float(conductivity(stock.over(by_record)[0] / litres))
    return added - rise * sum(look.estimate.volumes_l.values()) / litres


def _rise(look: Look, window: Array) -> float | None:
    """Change of EC in the tank over a time [mS/cm]: mean of the readings about its end less those about its start."""
    read = [(-look.age_days(each.at), each.value) for each in look.measured("EC", ("tank",), 2.0 - float(window[0]))]
    ends = [[value for when, value in read if abs(when - edge) <= 1.0] for edge in window]
    return float(np.mean(ends[1]) - np.mean(ends[0])) if all(ends) else None
