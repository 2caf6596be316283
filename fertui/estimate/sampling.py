"""When the next sample is worth most, and what an analysis now would narrow: computed, by taking it in the model."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from datetime import datetime, timedelta
from typing import NamedTuple
from zoneinfo import ZoneInfo

import numpy as np

from fertui.chemistry.ions import IONS, Array
from fertui.estimate.assimilation import FEW_ANALYSES, Estimate
from fertui.estimate.correction import ElectroMeter, corrected
from fertui.estimate.display import SHARED, feed_drive, shown_members, solutions
from fertui.estimate.ensemble import Ensemble
from fertui.estimate.forecast import Forecast, forecast
from fertui.estimate.observations import Observation
from fertui.estimate.points import Estimated, PointState
from fertui.estimate.quantiles import HIGH, LOW, quantiles
from fertui.estimate.ranges import shares

USUAL_DAYS, OFTEN_DAYS = 14.0, 7.0
"""A sample every two weeks; every week where the loop is volatile, exchanges, or is little known (field practice)."""
WEEKDAYS = ("Mon", "Tue", "Wed", "Thu", "Fri", "Sat", "Sun")


class SampleAdvice(NamedTuple):
    """When to take the next sample and when its result can be there, counting the laboratory and closed days.

    ``narrows_pct``: by how many percent an analysis now would narrow the 80 % range at the end of the horizon, by
    (point, what); 50 means half as wide.
    """

    take_at: datetime
    result_at: datetime
    why: str
    narrows_pct: Mapping[tuple[str, str], float]


def next_sample(estimate: Estimate, ahead: Forecast) -> SampleAdvice:
    """The best day for the next sample of the managed point: early enough to act before a band is left."""
    due, why = due_in(estimate)
    leaving = _first_leaving(estimate, ahead)
    turnaround = estimate.site.lab_turnaround_d
    if leaving is not None and leaving[0] - turnaround < due:
        due, why = leaving[0] - turnaround, f"{leaving[1]} may leave its band in {max(leaving[0], 0.0):.0f} days"
    wanted = (estimate.at + timedelta(days=max(due, 0.0))).replace(minute=0, second=0, microsecond=0)
    take = _staffed(estimate, max(wanted, estimate.at), earlier=due >= 1.0)
    result = _staffed(estimate, take + timedelta(days=turnaround), earlier=False)
    return SampleAdvice(take, result, why, narrowed(estimate, ahead))


def due_in(estimate: Estimate) -> tuple[float, str]:
    """Days until a sample is due by habit (negative: overdue), and the reason."""
    last = estimate.last_analysis.get(estimate.managed) or estimate.last_analysis.get("drain")
    if last is None:
        return 0.0, "nothing has been analysed yet"
    often, why = USUAL_DAYS, "two weeks after the last one"
    if estimate.spread.volatile:
        often, why = OFTEN_DAYS, "this loop moves fast: every week"
    elif estimate.analyses < FEW_ANALYSES:
        often, why = OFTEN_DAYS, "too few analyses to know this loop: every week"
    elif estimate.setting.exchanges:
        often, why = OFTEN_DAYS, "the medium exchanges: every week"
    return often - (estimate.at - last).total_seconds() / 86400.0, why


def _first_leaving(estimate: Estimate, ahead: Forecast) -> tuple[float, str] | None:
    """The earliest likely day that something at the managed point leaves its band, unless it is out already."""
    rows = [
        row for row in ahead.leaves_band if row.point == estimate.managed and row.days.low and row.days.value != 0.0
    ]
    first = min(rows, key=lambda row: row.days.low or np.inf, default=None)
    return None if first is None or first.days.low is None else (first.days.low, first.what)


def _staffed(estimate: Estimate, moment: datetime, earlier: bool) -> datetime:
    """The nearest staffed day at that hour: the one before where there is time, else the one after."""
    zone = ZoneInfo(estimate.site.timezone)
    staffed = set(estimate.site.staffed_days) or set(WEEKDAYS)
    for step in range(7):
        day = moment + timedelta(days=-step if earlier else step)
        if WEEKDAYS[day.astimezone(zone).weekday()] in staffed and day >= estimate.at - timedelta(minutes=1):
            return day
    return moment if not earlier else _staffed(estimate, moment, earlier=False)


def narrowed(estimate: Estimate, ahead: Forecast) -> dict[tuple[str, str], float]:
    """By how many percent ranges at the end of the horizon get narrower if the managed point were analysed now."""
    after = forecast(replace(estimate, ensemble=_analysed(estimate)), len(ahead.days), ahead.scenario)
    now, then = ahead.days[-1].points[estimate.managed], after.days[-1].points[estimate.managed]
    found = {}
    for what, (wide, narrow) in _compared(now, then).items():
        if wide.high > wide.low:
            found[estimate.managed, what] = 100.0 * (1.0 - (narrow.high - narrow.low) / (wide.high - wide.low))
    return found


def narrows_now(estimate: Estimate) -> dict[str, float]:
    """By how many percent the 80 % range of each share gets narrower at once if the managed point were analysed now.

    Much cheaper than ``narrowed``: no day ahead is run.
    """
    wide, narrow = (_share_widths(estimate, each) for each in (estimate.ensemble, _analysed(estimate)))
    return {
        f"{ion} share": 100.0 * (1.0 - after / before) for ion, before, after in zip(SHARED, wide, narrow, strict=True)
    }


def _share_widths(estimate: Estimate, ensemble: Ensemble) -> Array:
    """Widths (3,) of the 80 % ranges of the shares at the managed point, as they would be shown."""
    drive = feed_drive(estimate.drives, len(estimate.drives.grid) - 2, ensemble)
    members = shown_members(solutions(estimate.setting, ensemble, drive)[estimate.managed], estimate.spread)
    low, high = quantiles(shares(members), (LOW, HIGH))
    return np.maximum(high - low, 1e-9)


def _analysed(estimate: Estimate) -> Ensemble:
    """Members after an analysis that finds just what is expected."""
    expected = estimate.points()[estimate.managed]
    ions = {ion: expected.ions[ion].mmol_l.value for ion in IONS if ion != "HCO3"}
    end = estimate.record.end
    seen = Observation(end, estimate.at, "analysis", estimate.managed, None, ions, frozenset(), None, None, None)
    return corrected(estimate.ensemble, estimate.setting, seen, None, ElectroMeter(), estimate.seed)[0]


def _compared(now: PointState, then: PointState) -> dict[str, tuple[Estimated, Estimated]]:
    pairs = {ion: (now.ions[ion].mmol_l, then.ions[ion].mmol_l) for ion in IONS if ion != "HCO3"}
    for ion in SHARED:
        before, after = now.ions[ion].share_pct, then.ions[ion].share_pct
        if before is not None and after is not None:
            pairs[f"{ion} share"] = (before, after)
    return pairs
