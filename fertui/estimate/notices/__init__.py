"""What to look at: one rule a question a careful colleague would ask, ranked, each with its reason and the key to act."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from fertui.estimate.notices import bands, feeding, missing, samples, trust, watering
from fertui.estimate.notices.look import Look
from fertui.estimate.notices.notice import SEVERITIES, Notice, Rule
from fertui.estimate.notices.stocks import StockLeft, stock_days_left, stock_left
from fertui.logbook.entries import Entry

if TYPE_CHECKING:
    from fertui.estimate.assimilation import Estimate
    from fertui.estimate.forecast import Forecast

__all__ = ["RULES", "Notice", "StockLeft", "notices", "stock_days_left", "stock_left"]

RULES: tuple[Rule, ...] = (
    watering.acidity,
    feeding.off_set_point,
    feeding.unequal_draw,
    feeding.unexplained,
    feeding.running_out,
    bands.shares,
    bands.limits,
    watering.drain_strength,
    trust.meters,
    missing.readings,
    missing.amounts,
    trust.held_back,
    trust.surprises,
    watering.zones,
    watering.root_temperature,
    watering.blossom_end_rot,
    watering.new_medium,
    samples.few,
    samples.age,
    samples.best_day,
    samples.volatile,
)
"""Asked in this order, which is also the order of notices of one severity."""


def notices(estimate: Estimate, entries: Sequence[Entry], ahead: Forecast | None = None) -> tuple[Notice, ...]:
    """What to look at in a loop, act first, from its estimate, the effective entries of the site and its forecast.

    Without a forecast nothing is said of the days ahead. The same data give the same list.
    """
    look = Look(estimate, entries, ahead)
    found = [notice for rule in RULES for notice in rule(look)]
    return tuple(sorted(found, key=lambda notice: SEVERITIES.index(notice.severity)))
