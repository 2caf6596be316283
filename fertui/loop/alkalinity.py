"""Which way alkalinity, and with it pH, drifts, and what drives it.

pH itself follows from alkalinity and the CO2 of air and roots; it is therefore given as a tendency, never as a number.
Every ion that moves into or out of the solution by a root or a site takes its charge along: alkalinity changes by
sum z (amount gained) over the other ions.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import CHARGE, INDEX, Array
from fertui.loop.fluxes import Fluxes

LOW, HIGH = 0.1, 0.9
"""Ends of the 80 % range over the members."""
STEADY_MEQ_L_D = 0.02
"""Drift below this counts as none (chosen here: 0.3 meq/L in a fortnight is what a test kit just shows)."""
_ALK, _NH4, _NO3 = INDEX["HCO3"], INDEX["NH4"], INDEX["NO3"]


class Drift(NamedTuple):
    """A rate of change of alkalinity [meq/L per day] with its 80 % range; positive raises pH."""

    what: str
    value: float
    low: float
    high: float


class Tendency(NamedTuple):
    """``direction`` of pH ("up", "down", "steady", "not told": the range spans both), the whole drift, its drivers."""

    direction: str
    drift: Drift
    drivers: tuple[Drift, ...]


def tendency(fluxes: Fluxes, litres: float | Array, days: float) -> Tendency:
    """Tendency of pH over a period from what moved in it: ``litres`` of solution in the loop
    [L], scalar or (M,), ``days`` [d].

    Drivers are sorted by size; those below a hundredth of ``STEADY_MEQ_L_D`` are left out.

    >>> from fertui.loop.fluxes import no_fluxes
    >>> moved = no_fluxes(1)
    >>> moved.by_cause[:, 5, [5, 9]] = [-40.0, 40.0]
    >>> tendency(moved, 100.0, 2.0).direction, tendency(moved, 100.0, 2.0).drivers[0].what
    ('up', 'uptake of nitrate')
    """
    per = 1.0 / (np.asarray(litres, dtype=float) * days)
    parts = {what: amount * per for what, amount in _parts(fluxes).items()}
    drivers = [_drift(what, rate) for what, rate in parts.items()]
    drivers = [each for each in drivers if abs(each.value) > 0.01 * STEADY_MEQ_L_D]
    whole = _drift("alkalinity", np.sum(list(parts.values()), axis=0))
    return Tendency(_direction(whole), whole, tuple(sorted(drivers, key=lambda each: -abs(each.value))))


def _parts(fluxes: Fluxes) -> Mapping[str, Array]:
    """Change of alkalinity [meq] (M,) by what made it; together they are all of it."""
    by_root = fluxes.cause("uptake") * CHARGE
    others = fluxes.cause("uptake")[:, _ALK] - by_root[:, _NO3] - by_root[:, _NH4]
    brought = {
        "make-up water": ("make_up",), "acid": ("acid",), "stock and doses": ("stock", "dose"),
        "feed less drain": ("feed", "drain"), "bleed": ("bleed",), "exchange with the medium": ("exchange",),
        "correction by an analysis": ("unexplained",),
    }  # fmt: skip
    return {
        "uptake of nitrate": by_root[:, _NO3],
        "uptake of ammonium": by_root[:, _NH4],
        "uptake of the other ions": others,
        **{
            what: np.sum([fluxes.cause(cause)[:, _ALK] for cause in causes], axis=0) for what, causes in brought.items()
        },
    }


def _drift(what: str, rate: Array) -> Drift:
    return Drift(what, float(np.mean(rate)), float(np.quantile(rate, LOW)), float(np.quantile(rate, HIGH)))


def _direction(drift: Drift) -> str:
    if drift.low > STEADY_MEQ_L_D:
        return "up"
    if drift.high < -STEADY_MEQ_L_D:
        return "down"
    if drift.low >= -STEADY_MEQ_L_D and drift.high <= STEADY_MEQ_L_D:
        return "steady"
    return "not told"
