"""When members leave a band: first passage, its range over all members, its probability."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import datetime, timedelta
from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import INDEX, IONS, Array
from fertui.estimate.display import LEAST_SHARED_MEQ, SHARED
from fertui.estimate.points import Band
from fertui.estimate.quantiles import median, ranked
from fertui.estimate.ranges import shared_meq, shares


class Days(NamedTuple):
    """Days until a band is left: median and 80 % range of all members; None: not within the horizon, 0: out already."""

    value: float | None
    low: float | None
    high: float | None


class LeavesBand(NamedTuple):
    """When something leaves its band at a point. ``probability``: out at any time within the horizon.

    ``what``: "K share", "Ca share", "Mg share", "EC" or an ion; ``at``: median time; ``since``: out since.
    """

    point: str
    what: str
    at: datetime | None
    days: Days
    since: datetime | None
    probability: float


def quantities(members: Array, ec: Array) -> dict[str, Array]:
    """Everything a band can be set for, (times, M) each, from compositions (times, M, 10) and EC (times, M)."""
    by_share = shares(members)
    found = {f"{ion} share": by_share[..., place] for place, ion in enumerate(SHARED)}
    if median(shared_meq(members[0])) < LEAST_SHARED_MEQ:
        found = {}
    return {**found, "EC": ec, **{ion: members[..., INDEX[ion]] for ion in IONS}}


def passages(days: Array, values: Array, band: Band) -> Array:
    """First time (M,) [d] each member is outside a band, linear between the times given; inf where it never is.

    >>> passages(np.array([0.0, 1.0, 2.0]), np.array([[4.0], [5.0], [7.0]]), (None, 6.0))
    array([1.5])
    """
    low, high = band
    over = np.full(values.shape, -np.inf)
    if low is not None:
        over = np.maximum(over, low - values)
    if high is not None:
        over = np.maximum(over, values - high)
    out = over > 0
    first = np.argmax(out, axis=0)
    ever = out.any(axis=0)
    before = np.maximum(first - 1, 0)
    columns = np.arange(values.shape[1])
    inside, outside = -over[before, columns], over[first, columns]
    with np.errstate(invalid="ignore"):
        part = np.where(first > 0, inside / np.maximum(inside + outside, 1e-12), 0.0)
    return np.where(ever, days[before] + part * (days[first] - days[before]), np.inf)


def leaves_band(point: str, what: str, now: datetime, passed: Array, since: datetime | None) -> LeavesBand:
    """What first passages (M,) [d] say."""
    middle, low, high = (_finite(days) for days in ranked(passed))
    at = None if middle is None else now + timedelta(days=middle)
    probability = float(np.isfinite(passed).mean())
    return LeavesBand(point, what, at, Days(middle, low, high), since if middle == 0.0 else None, probability)


def _finite(days: float) -> float | None:
    return float(days) if np.isfinite(days) else None


def out_since(times: tuple[datetime, ...], values: Array, band: Band) -> datetime | None:
    """From when on a course (times,) has been outside its band without a break; None where it is inside now."""
    low, high = band
    out = np.zeros(len(values), dtype=bool)
    out |= values < (-np.inf if low is None else low)
    out |= values > (np.inf if high is None else high)
    if not out[-1]:
        return None
    inside = np.flatnonzero(~out)
    return times[int(inside[-1]) + 1 if len(inside) else 0]


def banded(bands: Mapping[str, Band], found: Mapping[str, Array]) -> list[tuple[str, Band]]:
    """What is both banded and known, in the order of ``found``."""
    return [(what, bands[what]) for what in found if what in bands and bands[what] != (None, None)]
