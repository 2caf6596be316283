"""The last stock of a crop: how much to mix so that the tanks run empty when the crop goes."""

from __future__ import annotations

import math
from typing import NamedTuple

from fertui.planning.shelf import PlanningError
from fertui.site.model import StockTank


class LastMix(NamedTuple):
    """One stock tank until the end: litres it will still give, litres in it, litres to mix, and that in words."""

    tank: str
    needed_l: float
    left_l: float
    mix_l: float
    full_batches: int
    words: str


def last_mix(
    tank: StockTank, *, days_left: float, feed_l_per_d: float, left_l: float, stop_days_before: float = 0.0
) -> LastMix:
    """What to mix of a stock until the crop's end.

    ``days_left`` [d], ``feed_l_per_d`` [L of feed a day, drain re-used included in it], ``left_l`` [L] still in the
    tank; ``stop_days_before`` [d]: days at the end on which plain water is given, so that the crop drinks the system
    down. needed = feed x (days - stop) / dilution. Raises ``PlanningError`` for a number that cannot be.

    >>> last_mix(StockTank("calcium", 1000.0), days_left=20, feed_l_per_d=4500, left_l=300, stop_days_before=4).mix_l
    420.0
    """
    if min(days_left, feed_l_per_d, left_l, stop_days_before) < 0 or left_l > tank.litres:
        raise PlanningError(
            f"{tank.name}: days, litres a day and litres left are not negative, and at most {tank.litres:g} L are left."
        )
    needed = feed_l_per_d * max(days_left - stop_days_before, 0.0) / tank.dilution
    mix = max(needed - left_l, 0.0)
    batches = math.floor(mix / tank.litres)
    words = (
        f"{feed_l_per_d:.0f} L of feed a day x {max(days_left - stop_days_before, 0.0):g} days / {tank.dilution:g} = "
        f"{needed:.0f} L of stock - {left_l:.0f} L left = {mix:.0f} L to mix"
    )
    if mix <= 0.0:
        words += f"; {left_l - needed:.0f} L will be over: mix nothing more"
    elif batches:
        words += f": {batches} full and one of {mix - batches * tank.litres:.0f} L"
    return LastMix(tank.name, needed, left_l, mix, batches, words)
