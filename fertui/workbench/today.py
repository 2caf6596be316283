"""Today: where a loop is, what to look at, how old what is known is."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime

from fertui.estimate.points import PointState
from fertui.workbench.glance import Seen


@dataclass(frozen=True, slots=True)
class Gauge:
    """One row of the managed point: its course of daily values, what the forecast says of it.

    ``what`` is ``K share``, ``Ca share``, ``Mg share``, or an ion with a limit (``Na``, ``NH4``, ``Cl``), ``EC``.
    ``course`` holds one value a day, oldest first, today last, then the days ahead from ``today_index`` + 1 on.
    """

    what: str
    unit: str
    course: tuple[float, ...]
    today_index: int
    leaves: str


@dataclass(frozen=True, slots=True)
class Watch:
    """Something to look at: ``severity`` is note, watch or act; ``key`` is the key to act with."""

    code: str
    severity: str
    text: str
    key: str = ""


@dataclass(frozen=True, slots=True)
class Today:
    """State of one loop at a time."""

    loop: str
    layout: str
    crop: str
    stage: str
    medium: str
    at: datetime
    managed_point: str
    points: Mapping[str, PointState]
    last_analysis: Seen | None
    last_reading: Seen | None
    readings: Mapping[str, Seen]
    set_ec: float | None
    set_ph: float | None
    drain_pct: float | None
    light_sum_j_per_cm2: float | None
    stock_days_left: Mapping[str, float]
    draw_differs_pct: float | None
    gauges: tuple[Gauge, ...]
    watch: tuple[Watch, ...]
    analyses_behind: int
    not_logged: tuple[str, ...] = ()
    awaited: tuple[str, ...] = ()
    half_done: tuple[str, ...] = ()
