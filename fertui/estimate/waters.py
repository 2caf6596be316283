"""How much water ran and was taken in every stretch of a record: as logged, else balanced, else as usual."""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from fertui.chemistry.ions import Array
from fertui.estimate.record import Record
from fertui.estimate.setting import Setting
from fertui.estimate.spreads import spread

Flags = npt.NDArray[np.bool_]

LOGGED = 0.5
"""An amount counts for a stretch when it was logged for at least this part of it."""
USUAL_DAYS = 7.0
MOST_TAKEN = 0.97
"""The crop takes at least 3 % of the irrigation, so that an error of the drain cannot take all of it."""

DRAINED, BALANCED, ASSUMED = 0, 1, 2
"""Where crop water comes from: irrigation less drain; logged or balanced; nothing logged."""


class Waters(NamedTuple):
    """Rates [L/d] of the whole loop in every stretch (n,) of a grid. ``make_up`` is nan where it is automatic:
    not logged, or without levels to say whether it filled the tank; the tank then stands at its level.

    ``drain`` goes with ``irrigation``; ``origin`` (n,): DRAINED, BALANCED or ASSUMED; ``reference``: season mean of
    crop water up to each stretch.
    """

    irrigation: Array
    drain: Array
    crop: Array
    make_up: Array
    condensate: Array
    origin: Array
    reference: Array


def waters(record: Record, setting: Setting, grid: Array) -> Waters:
    """Water of every stretch between neighbouring times of ``grid`` [d]."""
    days = np.maximum(np.diff(grid), 1e-9)
    rate = {name: flow.over(grid) / days for name, flow in record.water.items()}
    logged = {name: flow.covered(grid) >= LOGGED for name, flow in record.water.items()}
    drain_part = _drain_part(record, setting, grid)
    drain = np.where(logged["drain"], rate["drain"], rate["irrigation"] * drain_part)
    balance, balanced = _balance(record, grid, rate, logged)
    known = np.where(balanced, balance, np.nan)
    known = np.where(logged["irrigation"], np.maximum(rate["irrigation"] - drain, 0.0), known)
    known = np.where(logged["crop"], rate["crop"], known)
    origin = np.where(balanced | logged["crop"], BALANCED, ASSUMED)
    origin = np.where(logged["irrigation"] & ~logged["crop"], DRAINED, origin)
    stands = _stands(record, grid)
    origin = np.where(stands, origin, BALANCED)
    crop = _filled(known, days, setting.crop_water_l_per_m2_d * setting.loop.area_m2) * stands
    irrigation = np.where(logged["irrigation"], rate["irrigation"], crop / (1.0 - drain_part))
    steered = logged["make_up"] & (len(record.levels) > 1)
    make_up = np.where(steered, rate["make_up"], np.nan)
    floor = 0.1 * setting.loop.area_m2
    reference = np.maximum(np.cumsum(crop * days) / np.cumsum(days), floor)
    return Waters(irrigation, np.minimum(drain, irrigation), crop, make_up, rate["condensate"], origin, reference)


def _stands(record: Record, grid: Array) -> Flags:
    """Whether a crop stands in every stretch: without one no water is taken, and with it no ion."""
    return np.array([record.has_crop(time) for time in (grid[:-1] + grid[1:]) / 2.0])


def lately(record: Record, setting: Setting, days: int = 14) -> Waters:
    """Water of each of the last so many days up to the end of the record, also of those before an estimate began."""
    first = record.first if record.first is not None else record.end
    count = int(np.clip(np.floor(record.end - first), 1, days))
    return waters(record, setting, record.end - np.arange(count, -1, -1.0))


def _drain_part(record: Record, setting: Setting, grid: Array) -> Array:
    """Drain as a fraction of irrigation in every stretch: the last one read, else what the site says."""
    found = [record.drain_pct.at(time) for time in grid[1:]]
    usual = setting.loop.drain_fraction
    return np.clip([usual if pct is None else pct / 100.0 for pct in found], 0.0, 0.9)


def _balance(
    record: Record, grid: Array, rate: Mapping[str, Array], logged: Mapping[str, Flags]
) -> tuple[Array, Flags]:
    """Crop water from make-up + condensate - bleed - change of level, and where make-up was logged."""
    days = np.maximum(np.diff(grid), 1e-9)
    bleeds = [(event.at, float(np.max(event.litres))) for event in record.events if event.cause == "bleed"]
    bled = spread([(at - 0.5, at + 0.5, litres) for at, litres in bleeds]).over(grid) / days
    risen = np.zeros(len(days))
    if len(record.levels) > 1:
        times, litres = np.array(record.levels).T
        risen = np.diff(np.interp(grid, times, litres))
    taken = rate["make_up"] + rate["condensate"] - bled - risen / days
    return np.maximum(taken, 0.0), logged["make_up"]


def _filled(known: Array, days: Array, usual: float) -> Array:
    """Gaps take the mean of the last known week before them, else of all that is known, else what is usual."""
    gaps = np.isnan(known)
    if not gaps.any():
        return known
    filled = known.copy()
    overall = float(np.average(known[~gaps], weights=days[~gaps])) if not gaps.all() else usual
    ends = np.cumsum(days)
    for place in np.flatnonzero(gaps):
        week = ~gaps[:place] & (ends[:place] > ends[place] - days[place] - USUAL_DAYS)
        filled[place] = np.average(known[:place][week], weights=days[:place][week]) if week.any() else overall
    return filled
