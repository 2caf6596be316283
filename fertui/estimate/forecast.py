"""The coming days: members run ahead under routine, plan or what-if, and when they leave their bands.

Members are copies; nothing here changes an estimate. Noise enters day by day; the scale the loop has shown widens whole
trajectories; charges are closed in what is shown; shares are computed last.
"""

from __future__ import annotations

from collections.abc import Mapping
from datetime import datetime, timedelta
from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import Array
from fertui.estimate.assimilation import Estimate, copies, thin
from fertui.estimate.display import Acidity, Course, Panel, allowed, courses, log_ec, same_solution, solutions, stacked
from fertui.estimate.ensemble import Ensemble
from fertui.estimate.passage import Days, LeavesBand, banded, leaves_band, out_since, passages, quantities
from fertui.estimate.points import Band, PointState
from fertui.estimate.quantiles import median, ranked
from fertui.estimate.routine import Routine, routine
from fertui.estimate.scenario import ROUTINE, Dose, FeedRecipe, Renewal, Scenario
from fertui.estimate.walk import CLOSE, Way, night
from fertui.loop import ROOT, STORE

__all__ = [
    "ROUTINE", "Days", "Dose", "FeedRecipe", "Forecast", "ForecastDay", "LeavesBand", "Renewal", "Scenario",
    "Trajectories", "copies", "forecast", "thin", "trajectories",
]  # fmt: skip


class ForecastDay(NamedTuple):
    """What is expected at one time to come."""

    at: datetime
    points: Mapping[str, PointState]


class Trajectories(NamedTuple):
    """Members at now and every coming day at this hour: compositions (days + 1, M, 10) [mmol/L], litres, log EC factor.

    The first of the axis is now. ``ions`` by point; ``volumes_l`` (days + 1, M) by vessel.
    """

    at: tuple[datetime, ...]
    ions: Mapping[str, Array]
    volumes_l: Mapping[str, Array]
    log_ec: Array
    assumed: tuple[str, ...]
    inputs: str


class Forecast(NamedTuple):
    """The coming days (the first is one day from now), when what leaves its band, and which inputs were assumed.

    ``inputs``: "plan" where one was entered, "what-if" for a scenario, else "routine".
    """

    at: datetime
    days: tuple[ForecastDay, ...]
    leaves_band: tuple[LeavesBand, ...]
    assumed: tuple[str, ...]
    inputs: str
    scenario: Scenario = ROUTINE
    analyses: int = 1
    """Analyses behind the estimate it starts from; none: the ranges are those of other growers' loops."""


def trajectories(estimate: Estimate, days: int, scenario: Scenario = ROUTINE, settled: bool = False) -> Trajectories:
    """Raw members of the coming days, as the planner needs them: neither widened nor projected.

    Random numbers are the same whatever the scenario, so differences between two runs are exact responses.
    ``settled``: no noise, every member under the same water and feed. Raises ``ValueError`` for less than one day.
    """
    if days < 1:
        raise ValueError(f"a forecast looks at least one day ahead; days is {days}")
    coming = routine(estimate, days, scenario, settled)
    course = _days_ahead(estimate, coming, days, settled)
    said = [_said(estimate, coming, day, ensemble) for day, ensemble in enumerate(course)]
    litres = np.stack([ensemble.state.water_l for ensemble in course])
    mixed = estimate.setting.circuit.mixed
    return Trajectories(
        at=tuple(estimate.at + timedelta(days=day) for day in range(days + 1)),
        ions=stacked(estimate.setting, said),
        volumes_l={name: litres[:, :, ROOT if name == "root_zone" or mixed else STORE] for name in estimate.volumes_l},
        log_ec=np.stack([ensemble.ec for ensemble in course]),
        assumed=coming.assumed,
        inputs=coming.inputs,
    )


def _said(estimate: Estimate, coming: Routine, day: int, ensemble: Ensemble) -> dict[str, Array]:
    """What members say of every point at a day."""
    time = float(coming.grid[0]) + day
    span = int(np.searchsorted(coming.grid, time + CLOSE, side="right")) - 1
    drive = coming.drive(min(max(span, 0), len(coming.drives) - 1), ensemble.drain, ensemble.stock)
    return solutions(estimate.setting, ensemble, drive)


def _days_ahead(estimate: Estimate, coming: Routine, days: int, settled: bool) -> list[Ensemble]:
    """Members now and at every whole day from now; the noise of a day falls at its beginning, at this hour."""
    now, record = float(coming.grid[0]), estimate.record
    nights = tuple((now + day, record.local_day(now + day + 1.0)) for day in range(days))
    way = Way(estimate.setting, coming, coming.events, nights, estimate.seed)
    begun = estimate.ensemble
    if not settled:
        begun, _ = night(estimate.setting, begun, estimate.seed, nights[0][1], now)
    course = way.led(begun, 0, now + days, noisy=not settled)
    marks = [now + day for day in range(1, days + 1)]
    found = [ensemble for end, ensemble in course if any(abs(end - mark) < CLOSE for mark in marks)]
    return [estimate.ensemble, *found]


def forecast(estimate: Estimate, days: int, scenario: Scenario = ROUTINE) -> Forecast:
    """What is expected over the coming days, with 80 % ranges, and when shares, ions and EC leave their bands."""
    ran = trajectories(estimate, days, scenario)
    coming: list[dict[str, PointState]] = [{} for _ in range(days)]
    leaving: list[LeavesBand] = []
    for point, course in courses(ran.ions, ran.log_ec, estimate.spread).items():
        bands = allowed(estimate.site, estimate.loop, point)
        acidity = Acidity(estimate.record.observations, same_solution(estimate.setting, point))
        panel = Panel(course, bands)
        for day in range(1, days + 1):
            coming[day - 1][point] = panel.state(day, acidity.at(estimate.record.end + day, bands.get("pH")))
        leaving += _leaving(estimate, point, course, bands)
    ahead = tuple(ForecastDay(at, points) for at, points in zip(ran.at[1:], coming, strict=True))
    return Forecast(estimate.at, ahead, tuple(leaving), ran.assumed, ran.inputs, scenario, estimate.analyses)


def _leaving(estimate: Estimate, point: str, course: Course, bands: Mapping[str, Band]) -> list[LeavesBand]:
    """First passages of everything that has a band at a point."""
    found = quantities(course.members, course.ec_members)
    days = np.arange(len(course.members), dtype=float)
    rows = []
    for what, band in banded(bands, found):
        passed = passages(days, found[what], band)
        since = _since(estimate, point, what, band) if ranked(passed)[0] == 0.0 else None
        rows.append(leaves_band(point, what, estimate.at, passed, since))
    return rows


def _since(estimate: Estimate, point: str, what: str, band: Band) -> datetime | None:
    """Since when the middle of the members has been out."""
    middle = median(estimate.path[point], axis=1)[:, None]
    ec = np.exp(log_ec(middle, middle[:, 0]) + median(estimate.path_ec, axis=1)[:, None])
    values = quantities(middle, ec).get(what)
    times = tuple(estimate.record.moment(time) for time in estimate.times)
    return None if values is None else out_since(times, values[:, 0], band)
