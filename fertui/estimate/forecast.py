"""The coming days: members run ahead under routine, plan or what-if, and when they leave their bands.

Members are copies; nothing here changes an estimate. Noise enters day by day; the scale the loop has shown widens whole
trajectories; charges are closed in what is shown; shares are computed last.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime, timedelta

import numpy as np

from fertui.chemistry.ions import Array
from fertui.estimate.assimilation import Estimate, copies, thin
from fertui.estimate.correction import ElectroMeter
from fertui.estimate.display import Panel, allowed, ph_at, shown_members, solutions
from fertui.estimate.ensemble import Ensemble
from fertui.estimate.passage import Days, LeavesBand, banded, leaves_band, out_since, passages, quantities
from fertui.estimate.points import PointState
from fertui.estimate.routine import Routine, routine
from fertui.estimate.scenario import ROUTINE, Dose, FeedRecipe, Renewal, Scenario
from fertui.estimate.walk import CLOSE, Way, nights_of
from fertui.loop import ROOT, STORE

__all__ = [
    "ROUTINE", "Days", "Dose", "FeedRecipe", "Forecast", "ForecastDay", "LeavesBand", "Renewal", "Scenario",
    "Trajectories", "copies", "forecast", "thin", "trajectories",
]  # fmt: skip


@dataclass(frozen=True, slots=True)
class ForecastDay:
    """What is expected at one time to come."""

    at: datetime
    points: Mapping[str, PointState]


@dataclass(frozen=True, slots=True)
class Trajectories:
    """Members at now and every coming day at this hour: compositions (days + 1, M, 10) [mmol/L], litres, log EC factor.

    The first of the axis is now. ``ions`` by point; ``volumes_l`` (days + 1, M) by vessel.
    """

    at: tuple[datetime, ...]
    ions: Mapping[str, Array]
    volumes_l: Mapping[str, Array]
    log_ec: Array
    assumed: tuple[str, ...]
    inputs: str


@dataclass(frozen=True, slots=True)
class Forecast:
    """The coming days (the first is one day from now), when what leaves its band, and which inputs were assumed.

    ``inputs``: "plan" where one was entered, "what-if" for a scenario, else "routine".
    """

    at: datetime
    days: tuple[ForecastDay, ...]
    leaves_band: tuple[LeavesBand, ...]
    assumed: tuple[str, ...]
    inputs: str
    scenario: Scenario = field(default=ROUTINE, repr=False)


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
        ions={point: np.stack([each[point] for each in said]) for point in said[0]},
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
    """Members now and at every whole day from now."""
    now = float(coming.grid[0])
    nights = nights_of(estimate.record, now, now + days)
    way = Way(estimate.setting, coming, coming.events, nights, estimate.seed)
    wanted = [now + day for day in range(1, days + 1)]
    course = way.led(estimate.ensemble, 0, now + days, noisy=not settled)
    found = [ensemble for end, ensemble in course if any(abs(end - day) < CLOSE for day in wanted)]
    return [estimate.ensemble, *found]


def forecast(estimate: Estimate, days: int, scenario: Scenario = ROUTINE) -> Forecast:
    """What is expected over the coming days, with 80 % ranges, and when shares, ions and EC leave their bands."""
    ran = trajectories(estimate, days, scenario)
    coming: list[dict[str, PointState]] = [{} for _ in range(days)]
    leaving: list[LeavesBand] = []
    for point, raw in ran.ions.items():
        bands = allowed(estimate.site, estimate.loop, point)
        members = shown_members(raw, estimate.spread)
        panel = Panel(members, ran.log_ec, bands)
        for day in range(1, days + 1):
            time = estimate.record.end + day
            ph = ph_at(estimate.record.observations, point, time, bands.get("pH"))
            coming[day - 1][point] = panel.state(day, ph)
        leaving += _leaving(estimate, point, members, ran.log_ec)
    ahead = tuple(ForecastDay(at, points) for at, points in zip(ran.at[1:], coming, strict=True))
    return Forecast(estimate.at, ahead, tuple(leaving), ran.assumed, ran.inputs, scenario)


def _leaving(estimate: Estimate, point: str, members: Array, log_ec: Array) -> list[LeavesBand]:
    """First passages of everything that has a band at a point."""
    meter = ElectroMeter()
    ec = np.exp(np.stack([meter(each) for each in members]) + log_ec)
    found = quantities(members, ec)
    past = _past(estimate, point)
    days = np.arange(len(members), dtype=float)
    rows = []
    for what, band in banded(allowed(estimate.site, estimate.loop, point), found):
        passed = passages(days, found[what], band)
        since = out_since(past[0], past[1][what], band) if what in past[1] else None
        rows.append(leaves_band(point, what, estimate.at, passed, since))
    return rows


def _past(estimate: Estimate, point: str) -> tuple[tuple[datetime, ...], dict[str, Array]]:
    """Medians of the trail of a point, for "out since"."""
    members = estimate.path[point]
    times = tuple(estimate.record.moment(time) for time in estimate.times)
    middle = np.median(members, axis=1)[:, None]
    meter = ElectroMeter()
    ec = np.exp(np.stack([meter(each) for each in middle]) + np.median(estimate.path_ec, axis=1)[:, None])
    return times, {what: values[:, 0] for what, values in quantities(middle, ec).items()}
