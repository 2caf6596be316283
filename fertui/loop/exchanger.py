"""The exchanger inside a time step: how much slower a cation leaves with drain because sites hold it back.

At equilibrium a cation's amount in water and on sites together is (1 + h_i) times the amount in water, with
h_i = Q k_i s^z / (z V). A step takes that retardation at its middle; afterwards the exchanger is set into exact
equilibrium by ``fertui.chemistry.exchange.batch``.
"""

from __future__ import annotations

import numpy as np

from fertui.chemistry.exchange import batch
from fertui.chemistry.ions import CATION_CHARGE, Array
from fertui.loop.values import Medium

_TRACE = 1e-12


def intensity(mmol_l: Array, selectivity: Array) -> Array:
    """log s (M,) of an exchanger in equilibrium with cations (M, 5) [mmol/L]: the closed form of the quadratic."""
    weighted = selectivity * mmol_l
    divalent = weighted[:, 1] + weighted[:, 2]
    monovalent = weighted[:, 0] + weighted[:, 3] + weighted[:, 4]
    return np.log(2.0 / np.maximum(monovalent + np.sqrt(monovalent * monovalent + 4.0 * divalent), _TRACE))


def retained(log_s: Array, water_l: Array, capacity_meq: Array, selectivity: Array) -> Array:
    """Amount held per amount in water, h (M, 5) [-], at log s (M,), water (M,) [L] and capacity (M,) [meq]."""
    s_to_charge = np.exp(np.multiply.outer(CATION_CHARGE, log_s).T)
    return s_to_charge * (capacity_meq / water_l)[:, None] * (selectivity / CATION_CHARGE)


def nudged(log_s: Array, total_mmol: Array, water_l: Array, capacity_meq: Array, selectivity: Array) -> Array:
    """One Newton step of log s towards equilibrium for changed totals (M, 5) [mmol]: enough inside a step."""
    h = retained(log_s, water_l, capacity_meq, selectivity)
    charge = total_mmol * CATION_CHARGE
    in_water = 1.0 / (1.0 + h)
    on_sites = charge * h * in_water
    held = np.maximum(on_sites.sum(axis=1), _TRACE)
    free = np.maximum((charge * in_water).sum(axis=1), _TRACE)
    supply = np.maximum(charge.sum(axis=1) - capacity_meq, _TRACE)
    slope = (on_sites * in_water * CATION_CHARGE).sum(axis=1) * (1.0 / held + 1.0 / free)
    excess = np.log(held / free) - np.log(np.maximum(capacity_meq, _TRACE) / supply)
    return log_s - np.clip(excess / np.maximum(slope, _TRACE), -1.0, 1.0)


def equilibrated(medium: Medium, total_mmol: Array, water_l: Array, log_s: Array | None = None) -> tuple[Array, Array]:
    """Cations in water [mmol] and charge on sites [meq], both (M, 5), from the amounts of both together [mmol].

    ``log_s`` (M,): that of a state nearby, which saves time and changes nothing else.

    Sites that the counted cations cannot fill hold hydrogen: the capacity in force is never above their sum.
    """
    capacity = capacity_of(medium, total_mmol.shape[0])
    supply = total_mmol @ CATION_CHARGE
    water = np.maximum(water_l, _TRACE)
    concentration, held = batch(total_mmol, water, np.minimum(capacity, supply), medium.selectivity, log_s)
    return concentration * water[:, None], held


def capacity_of(medium: Medium, members: int) -> Array:
    """Exchange capacity [meq] of every member (M,)."""
    return np.broadcast_to(np.asarray(medium.capacity_meq, dtype=float), (members,))
