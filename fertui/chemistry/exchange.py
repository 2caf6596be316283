"""Cation exchange between a solution and the medium: five cations, one kind of site, equilibrium reached at once.

Gaines-Thomas on concentrations. With equivalent fractions E on the exchanger, concentrations c [mmol/L] in the water
and one unknown s for the whole exchanger, every cation obeys

    E_i = k_i c_i s      (monovalent: K, Na, NH4)
    E_i = k_i c_i s**2   (divalent: Ca, Mg)             sum of E = 1

Calcium is the reference, k = 1 by definition; the k of magnesium has no unit, those of K, Na and NH4 are in
(mmol/L)**-1/2. It acts on total concentrations, so the constants carry activity and ion pairing with them: constants
fitted on activities do not belong here. Gaines & Thomas 1953, J. Chem. Phys. 21:714; the convention is the one of the
databases of PHREEQC (Parkhurst & Appelo 2013, USGS Techniques and Methods 6-A43).
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import numpy.typing as npt

from fertui.chemistry.ions import CATION_CHARGE, CATIONS, Array

CONVENTION = "Gaines-Thomas on concentrations, calcium = 1, monovalents in (mmol/L)^-1/2"
"""Stands beside every constant of this module wherever one is stored."""

Cations = Mapping[str, float | Array] | npt.ArrayLike
"""Values of the five cations: an array with K, Ca, Mg, Na, NH4 on its last axis, or a mapping by name."""

PHREEQC_LOG_K = {"K": 0.7, "Ca": 0.8, "Mg": 0.6, "Na": 0.0, "NH4": 0.6}
"""log10 K of the half reactions z X- + cation = cation-X_z at 25 C, mol/L: phreeqc.dat, block EXCHANGE_SPECIES."""

PHREEQC_SELECTIVITY: Array = np.array(
    [
        10.0 ** (PHREEQC_LOG_K[ion] - PHREEQC_LOG_K["Ca"] * charge / 2.0) * 1000.0 ** (charge / 2.0 - 1.0)
        for ion, charge in zip(CATIONS, CATION_CHARGE, strict=True)
    ]
)
"""The constants of phreeqc.dat in the convention of this module: K 0.0631, Ca 1, Mg 0.631, Na 0.01259, NH4 0.0501."""

_CHARGE_COLUMN = CATION_CHARGE[:, None]
_ONES = np.ones(len(CATIONS))
_DIVALENT = CATION_CHARGE == 2.0
_EMPTY_SOLUTION = 1e-13
_STEP_TOLERANCE = 1e-7
_MOST_STEPS = 200


def intensity(solution_mmol_per_l: Cations, selectivity: npt.ArrayLike) -> Array:
    """The one unknown s (...) of an exchanger in equilibrium with a solution (..., 5) [mmol/L], from its quadratic.

    With A = sum k c of the divalents and B of the monovalents, s = 2 / (B + sqrt(B**2 + 4 A)). Arguments and errors as
    for ``loading``.

    >>> float(intensity({"Ca": 4.0}, PHREEQC_SELECTIVITY))
    0.5
    """
    solution, k = cations(solution_mmol_per_l), cations(selectivity)
    if not (solution.min(initial=0.0) >= 0.0 and solution.max(initial=0.0) < np.inf):
        raise ValueError("solution_mmol_per_l holds a negative or not finite concentration")
    weighted = k * solution
    divalent = weighted[..., 1] + weighted[..., 2]
    monovalent = weighted[..., 0] + weighted[..., 3] + weighted[..., 4]
    denominator = monovalent + np.sqrt(monovalent * monovalent + 4.0 * divalent)
    if not (denominator > 0.0).all():
        raise ValueError("a solution without cations does not say what the exchanger holds; give at least one above 0")
    return np.asarray(2.0 / denominator)


def loading(solution_mmol_per_l: Cations, selectivity: npt.ArrayLike) -> Array:
    """Equivalent fractions that an exchanger takes on in contact with plenty of a solution.

    Arguments: ``solution_mmol_per_l`` (..., 5) [mmol/L] or mapping; ``selectivity`` (..., 5) in the convention above.
    Returns fractions (..., 5) that sum to 1. Raises ``ValueError`` for a negative or not finite number and for a
    solution without any cation.

    >>> loading({"K": 6, "Ca": 5, "Mg": 2, "Na": 3}, PHREEQC_SELECTIVITY).round(4)
    array([0.1392, 0.6762, 0.1707, 0.0139, 0.    ])
    """
    s = intensity(solution_mmol_per_l, selectivity)[..., None]
    return cations(selectivity) * cations(solution_mmol_per_l) * np.where(_DIVALENT, s * s, s)


def batch(
    total_mmol: Cations,
    water_l: npt.ArrayLike,
    capacity_meq: npt.ArrayLike,
    selectivity: npt.ArrayLike,
    start: npt.ArrayLike | None = None,
) -> tuple[Array, Array]:
    """Share out given amounts of the five cations between water and exchanger until they are in equilibrium.

    Arguments: ``total_mmol`` (..., 5) [mmol] or mapping: in water and on the exchanger together; ``water_l`` (...) [L];
    ``capacity_meq`` (...) [meq]; ``selectivity`` (..., 5) in this module's convention; ``start`` (...): log s of a
    state nearby, such as the step before, which saves steps and changes nothing else. Leading axes broadcast.
    Returns ``(solution_mmol_per_l, exchanged_meq)``, both (..., 5): [mmol/L] and [meq].
    Raises ``ValueError`` for negative or not finite input, no water, and cations fewer than the sites.

    With as many cations as sites everything is on the exchanger; without capacity the cations stay in the water.
    For every member one equation, sum of z x(u) = capacity with u = log s, strictly rising in u, is solved by Newton
    steps inside a bracket that is exact. Both phases come from the same sigmoid, so each cation's mass closes to
    rounding (1e-15) whatever the accuracy of u.

    >>> solution, exchanged = batch([33.6, 4.5, 2.2, 16.8, 0.0], 0.6, 50.0, PHREEQC_SELECTIVITY)
    >>> solution.round(3)
    array([ 8.837,  0.171,  0.131, 13.56 ,  0.   ])
    >>> float(exchanged.sum().round(9))
    50.0
    """
    total, k = cations(total_mmol), cations(selectivity)
    water, capacity = np.asarray(water_l, dtype=float), np.asarray(capacity_meq, dtype=float)
    _refuse_impossible(total, water, capacity, k)
    if start is not None and not np.isfinite(start).all():
        raise ValueError("start holds a number that is not finite")
    shape = np.broadcast_shapes(total.shape[:-1], water.shape, capacity.shape, k.shape[:-1])
    solution, exchanged = _share_out(
        _rows(total, shape),
        _members(water, shape),
        _members(capacity, shape),
        _rows(k, shape),
        None if start is None else _members(np.asarray(start, dtype=float), shape),
    )
    return solution.T.reshape(*shape, 5), exchanged.T.reshape(*shape, 5)


def cations(values: Cations) -> Array:
    """Array with the five cations on the last axis, from such an array or from a mapping by name (absent: zero).

    Other ions of a mapping are left out: anions are not exchanged. Raises ``ValueError`` for another shape.

    >>> cations({"Ca": 5, "NO3": 10})
    array([0., 5., 0., 0., 0.])
    """
    if isinstance(values, Mapping):
        columns = np.broadcast_arrays(*(np.asarray(values.get(ion, 0.0), dtype=float) for ion in CATIONS))
        return np.stack(columns, axis=-1)
    array = np.asarray(values, dtype=float)
    if array.ndim == 0 or array.shape[-1] != len(CATIONS):
        raise ValueError(f"shape {array.shape}: the last axis carries the five cations {', '.join(CATIONS)}")
    return array


def _refuse_impossible(total: Array, water: Array, capacity: Array, k: Array) -> None:
    checks = (
        ("total_mmol", total, total.min(initial=0.0) >= 0.0, "0 or more"),
        ("water_l", water, water.min(initial=1.0) > 0.0, "more than 0"),
        ("capacity_meq", capacity, capacity.min(initial=0.0) >= 0.0, "0 or more"),
        ("selectivity", k, k.min(initial=1.0) > 0.0, "more than 0"),
    )
    for name, array, in_range, allowed in checks:
        if not (in_range and array.max(initial=0.0) < np.inf):
            raise ValueError(f"{name} holds a number that is not finite or not {allowed}")


def _rows(values: Array, shape: tuple[int, ...]) -> Array:
    """Cations first, members flat and contiguous: the layout in which sums over five cations are quick."""
    return np.ascontiguousarray(np.broadcast_to(values, (*shape, 5)).reshape(-1, 5).T)


def _members(values: Array, shape: tuple[int, ...]) -> Array:
    return np.broadcast_to(values, shape).reshape(-1)


def _share_out(total: Array, water: Array, capacity: Array, k: Array, start: Array | None) -> tuple[Array, Array]:
    """Equilibrium of flat members (5, members): the ordinary ones solved, those without a solution or sites set."""
    charge_total = total * _CHARGE_COLUMN
    supply = charge_total.sum(axis=0)
    free = supply - capacity
    ordinary = (capacity > 0.0) & (free > _EMPTY_SOLUTION * supply)
    if ordinary.all():
        return _solve(total, charge_total, water, capacity, free, k, start)
    short = free < -_EMPTY_SOLUTION * supply
    if short.any():
        member = int(np.argmax(short))
        raise ValueError(
            f"member {member}: {supply[member]:g} meq of cations cannot fill {capacity[member]:g} meq of sites; "
            "add cations or lower capacity_meq"
        )
    sites = capacity > 0.0
    solution = np.where(sites, 0.0, total / water)
    exchanged = np.where(sites, charge_total, 0.0)
    solution[:, ordinary], exchanged[:, ordinary] = _solve(
        total[:, ordinary],
        charge_total[:, ordinary],
        water[ordinary],
        capacity[ordinary],
        free[ordinary],
        k[:, ordinary],
        None if start is None else start[ordinary],
    )
    return solution, exchanged


def _solve(
    total: Array, charge_total: Array, water: Array, capacity: Array, free: Array, k: Array, start: Array | None
) -> tuple[Array, Array]:
    """Bracketed Newton for u = log s on log(charge on sites / charge in water) = log(capacity / free).

    At ``turning`` a cation alone would split as the whole must, so the answer lies between the outermost two. Far from
    it Newton can swing between two ends that hardly move; a step that leaves the bracket or is not half the one before
    is therefore replaced by bisection.
    """
    log_affinity = np.log(capacity / water * k / _CHARGE_COLUMN)
    goal = np.log(capacity / free)
    turning = (goal - log_affinity) / _CHARGE_COLUMN
    low, high = turning.min(axis=0), turning.max(axis=0)
    guess = (_ONES @ (charge_total * turning)) / (_ONES @ charge_total) if start is None else start
    u, moved = np.clip(guess, low, high), high - low
    for _ in range(_MOST_STEPS):
        held, in_water = _sigmoid(log_affinity, u)
        on_sites = charge_total * held
        charge_held, charge_free = _ONES @ on_sites, _ONES @ (charge_total * in_water)
        slope = CATION_CHARGE @ (on_sites * in_water)
        excess = np.log(charge_held / charge_free) - goal
        np.copyto(low, u, where=excess < 0.0)
        np.copyto(high, u, where=excess > 0.0)
        new = u - excess * charge_held * charge_free / (slope * (charge_held + charge_free))
        step = np.abs(new - u)
        unsettled = step > _STEP_TOLERANCE
        if not unsettled.any():
            u = new
            break
        wild = unsettled & ((new < low) | (new > high) | (step > 0.5 * moved))
        if wild.any():
            new[wild] = 0.5 * (low + high)[wild]
        u, moved = new, np.abs(new - u)
    held, in_water = _sigmoid(log_affinity, u)
    return total * in_water / water, charge_total * held


def _sigmoid(log_affinity: Array, u: Array) -> tuple[Array, Array]:
    """Shares of every cation on the exchanger and in the water; they sum to 1 to rounding."""
    ratio = np.exp(log_affinity + _CHARGE_COLUMN * u)
    in_water = 1.0 / (1.0 + ratio)
    return ratio * in_water, in_water
