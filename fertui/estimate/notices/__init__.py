"""What to look at, ranked: a rule for each thing a careful colleague would ask, with its reason and the key to act."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from fertui.estimate.notices import bands, crop, explaining, feeding, missing, roots, samples, trust
from fertui.estimate.notices.look import Look
from fertui.estimate.notices.notice import SEVERITIES, Notice, Rule
from fertui.estimate.notices.stocks import StockLeft, stock_days_left, stock_left
from fertui.logbook.entries import Entry

if TYPE_CHECKING:
    from fertui.estimate.assimilation import Estimate
    from fertui.estimate.forecast import Forecast

__all__ = ["RULES", "Notice", "StockLeft", "notices", "stock_days_left", "stock_left"]

RULES: tuple[Rule, ...] = (
    samples.none,
    roots.acidity,
    feeding.off_set_point,
    feeding.unequal_draw,
    explaining.unexplained,
    feeding.running_out,
    bands.shares,
    bands.limits,
    roots.drain_strength,
    trust.meters,
    missing.readings,
    missing.amounts,
    trust.held_back,
    trust.surprises,
    roots.zones,
    roots.root_temperature,
    roots.blossom_end_rot,
    roots.new_medium,
    samples.water,
    samples.few,
    samples.age,
    samples.volatile,
)
"""Asked in this order, which is also the order of notices of one severity."""

BARE_RULES: tuple[Rule, ...] = (crop.gone, roots.acidity, trust.meters, trust.held_back)
"""Those of a loop without a crop: the solution can still hurt somebody, and what is measured can still be wrong."""


def notices(estimate: Estimate, entries: Sequence[Entry], ahead: Forecast | None = None) -> tuple[Notice, ...]:
    """What to look at in a loop, act first, from its estimate, the effective entries of the site and its forecast.

    Without a forecast nothing is said of the days ahead. The same data give the same list.
    """
    look = Look(estimate, entries, ahead)
    rules = RULES if estimate.record.bare_since is None else BARE_RULES
    found = [notice for rule in rules for notice in rule(look)]
    return tuple(sorted(found, key=lambda notice: SEVERITIES.index(notice.severity)))
