"""The coming days: members run ahead under the routine, the plan entered, or a what-if, and when they leave their bands.

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
from fertui.estimate.passage import Days, LeavesBand, banded, leaves_band, out_since, passages, quantities
from fertui.estimate.points import PointState
from fertui.estimate.routine import Routine, routine
from fertui.estimate.scenario import ROUTINE, Dose, FeedRecipe, Renewal, Scenario
from fertui.estimate.walk import events_between, night, stretch
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

    ``at_zero`` of the axis is now. ``ions`` by point; ``volumes_l`` (days + 1, M) by vessel.
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


def trajectories(
    estimate: Estimate, days: int, scenario: Scenario = ROUTINE, settled: bool = False
) -> Trajectories:
    """Raw members of the coming days, as the planner needs them: neither widened nor projected.

    Random numbers are the same whatever the scenario, so differences between two runs are exact responses.
    ``settled``: no noise, every member under the same water and feed. Raises ``ValueError`` for less than one day.
    """
    if days < 1:
        raise ValueError(f"a forecast looks at least one day ahead; days is {days}")
    coming = routine(estimate, days, scenario, settled)
    marks = [(float(coming.grid[0]), estimate.ensemble)] + list(_run(estimate, coming, days, settled))
    points = [
        solutions(estimate.setting, ensemble, coming.drive(min(_span(coming, time), len(coming.drives) - 1), ensemble.drain, ensemble.stock))
        for time, ensemble in marks
    ]
    litres = np.stack([ensemble.state.water_l for _, ensemble in marks])
    return Trajectories(
        at=tuple(estimate.at + timedelta(days=day) for day in range(days + 1)),
        ions={point: np.stack([each[point] for each in points]) for point in points[0]},
        volumes_l={name: litres[:, :, ROOT if name == "root_zone" or estimate.setting.circuit.mixed else STORE] for name in estimate.volumes_l},
        log_ec=np.stack([ensemble.ec for _, ensemble in marks]),
        assumed=coming.assumed,
        inputs=coming.inputs,
    )  # fmt: skip


def _run(estimate: Estimate, coming: Routine, days: int, settled: bool):  # type: ignore[no-untyped-def]
    """Members at every whole day from now, one after the other."""
    ensemble, setting, record = estimate.ensemble, estimate.setting, estimate.record
    midnights = record.midnights(float(coming.grid[0]), float(coming.grid[-1]))
    wanted = [float(coming.grid[0]) + day for day in range(1, days + 1)]
    for span in range(len(coming.drives)):
        begin, end = float(coming.grid[span]), float(coming.grid[span + 1])
        if not settled and any(abs(begin - midnight) < 1e-4 for midnight in midnights):
            ensemble, _ = night(setting, ensemble, estimate.seed, record.local_day(begin), begin)
        ensemble = stretch(setting, coming, span, ensemble, events_between(coming.events, begin, end)).ensemble
        if any(abs(end - day) < 1e-4 for day in wanted):
            yield end, ensemble


def _span(coming: Routine, time: float) -> int:
    return max(int(np.searchsorted(coming.grid, time + 1e-4, side="right")) - 1, 0)


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
