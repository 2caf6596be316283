"""How much of each salt in each step: the programs behind hand doses, and behind the salts of a renewal.

Variables are counted in units a person can measure out: scale steps of a salt, ten litres of renewal. Aims in order:
bands, litres renewed, distance to the aim, number of salts, kilograms or money.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import Array
from fertui.planning.checkpoints import FAR_COST, Checkpoint, Rows, hard_rows, misfit_rows, violation_rows
from fertui.planning.programme import Aim, Region, Solver, Whole, lexicographic

FIRST_TO_SECOND = 100.0
"""How much a unit of band violation outweighs a unit of misfit in the rounds that only look for where to be exact."""
GIVE_MISFIT = 0.01
"""Misfit given away to weigh one salt less: 1 % of one ion."""
SMALL_SHELF = 4
LITRES_ROUNDED = 1.0
"""One unit of renewal that rounding may add."""
TIE = 1e-3
"""Weight of kilograms or money once the salts are chosen."""
FINE = 100.0
"""From so many scale steps on a weight is rounded after solving: half a step is then at most 0.5 % of it."""
WEIGHING = 0.2
"""What one weighing more counts beside one salt more."""
LATER = 0.02
"""By how much a kilogram counts more with each later step: what can be done now is not put off."""


class Measures(NamedTuple):
    """The variables of a plan: steps by materials, then the renewal where there is one.

    ``most`` (variables,): the physical maximum in units; ``unit`` (variables,): kg or litres of one unit; ``cost``:
    money or kg of one unit. ``material`` (variables,): which material a variable weighs, -1 for the renewal.
    """

    unit: Array
    most: Array
    cost: Array
    material: tuple[int, ...]
    step: tuple[int, ...]
    supply: Array
    """Units of each material there are (materials,)."""
    salts_at_most: int | None = None

    @property
    def materials(self) -> int:
        """Number of materials."""
        return len(self.supply)

    @property
    def renews(self) -> bool:
        """Whether the last variable is litres renewed."""
        return -1 in self.material


class Programme(NamedTuple):
    """Region and costs over x (n), slacks of the bands, under, over and far over the aim, switches of weighings and of
    materials."""

    region: Region
    violation: Array
    litres: Array
    misfit: Array
    few: Array
    n: int
    switches: int
    """Where the switches of the weighings begin."""


def assemble(measures: Measures, checkpoints: Sequence[Checkpoint], x0: Array, whole: Whole | None) -> Programme:
    """The program about the plan ``x0`` that was last run; ``whole`` marks whole units and asks for switches."""
    n, m = len(x0), measures.materials
    hard = hard_rows(checkpoints, x0)
    out, out_high, out_cost = violation_rows(checkpoints, x0)
    aim, aim_value, aim_cost, near = misfit_rows(checkpoints, x0)
    v, a = len(out), len(aim)
    between = v + 3 * a
    matrix, low, high = _rows(measures, hard, (out, out_high), (aim, aim_value))
    switched = int(whole is not None)
    units = np.zeros(n, int) if whole is None else whole
    renewal = np.array([each < 0 for each in measures.material], dtype=float)
    spent = measures.cost * (1.0 + LATER * np.array(measures.step)) * (1.0 - renewal)
    spent = 0.5 * spent / max(float(spent @ np.minimum(measures.most, 1e6)), 1e-12)
    zero = np.zeros
    return Programme(
        Region(
            matrix, low, high, zero(len(matrix[0])),
            np.concatenate([measures.most, np.full(v + a, np.inf), near, np.full(a, np.inf), np.ones(n + m)]),
            np.concatenate([units, zero(between, int), np.full(n + m, switched)]),
        ),
        np.concatenate([zero(n), out_cost, zero(3 * a + n + m)]),
        np.concatenate([renewal / np.maximum(measures.most, 1.0), zero(between + n + m)]),
        np.concatenate([zero(n + v), aim_cost, aim_cost, FAR_COST * aim_cost, zero(n + m)]),
        np.concatenate([spent, zero(between), WEIGHING * (1.0 - renewal), np.ones(m)]),
        n,
        n + between,
    )  # fmt: skip


def _rows(
    measures: Measures, hard: Rows, out: tuple[Array, Array], aim: tuple[Array, Array]
) -> tuple[Array, Array, Array]:
    """All rows over all variables: limits, bands, aim, switches, supplies, number of salts."""
    n, m, v, a = len(measures.unit), measures.materials, len(out[0]), len(aim[0])
    starts = {"slack": n, "under": n + v, "over": n + v + a, "far": n + v + 2 * a}
    starts |= {"weighing": n + v + 3 * a, "salt": 2 * n + v + 3 * a}

    def wide(block: Array, **parts: Array) -> Array:
        row = np.zeros((len(block), 2 * n + v + 3 * a + m))
        row[:, :n] = block
        for place, part in parts.items():
            row[:, starts[place] : starts[place] + part.shape[1]] = part
        return row

    of = np.array([[each == j for each in measures.material] for j in range(m)], dtype=float).reshape(m, n)
    most = np.maximum(measures.most, 1.0)
    count = measures.salts_at_most if measures.salts_at_most is not None else m
    free = np.full(n, -np.inf)
    blocks = [
        (wide(hard.matrix), np.full(len(hard.high), -np.inf), hard.high),
        (wide(out[0], slack=-np.eye(v)), np.full(v, -np.inf), out[1]),
        (wide(aim[0], under=np.eye(a), over=-np.eye(a), far=-np.eye(a)), aim[1], aim[1]),
        (wide(np.eye(n), weighing=-np.diag(most)), free, np.zeros(n)),
        (wide(np.zeros((n, n)), weighing=np.eye(n), salt=-of.T), free, 1.0 - of.sum(axis=0)),
        (wide(of), np.full(m, -np.inf), measures.supply),
        (wide(np.zeros((1, n)), salt=np.ones((1, m))), np.zeros(1), np.array([float(count)])),
    ]
    matrix, low, high = (np.concatenate(parts) for parts in zip(*blocks, strict=True))
    scale = np.maximum(np.abs(matrix).max(axis=1, initial=0.0), 1e-12)
    return matrix / scale[:, None], low / scale, high / scale


def look(measures: Measures, checkpoints: Sequence[Checkpoint], x0: Array, solver: Solver) -> Array | None:
    """One rough solution in one call, to find where the model should be linearised; None where the limits leave no
    room."""
    programme = assemble(measures, checkpoints, x0, None)
    cost = FIRST_TO_SECOND * (programme.violation + programme.litres) + programme.misfit + 1e-3 * programme.few
    found = solver.minimise(cost, programme.region)
    return None if found is None else found[: programme.n]


def coarse(measures: Measures, rough: Array) -> Whole:
    """Measures whose weights are few scale steps, so that rounding matters and they must be solved for as whole
    numbers."""
    of = np.array(measures.material)
    most = np.array([rough[of == j].max(initial=0.0) for j in range(measures.materials)])
    return np.array([int(j < 0 or most[j] < FINE) for j in of], dtype=int)


def settle(
    measures: Measures, checkpoints: Sequence[Checkpoint], x0: Array, solver: Solver, whole: Whole
) -> Array | None:
    """The weighable plan, aim by aim; None where the limits leave no room. Four calls, five with a renewal.

    ``whole`` (variables,): 1 where whole units are solved for; the rest is rounded, which moves it by less than 0.5 %.
    With more than ``SMALL_SHELF`` salts the set of salts is chosen on exact amounts: else a coarse scale would have
    salts taken in for the sake of rounding alone.
    """
    few_salts = measures.materials <= SMALL_SHELF
    programme = assemble(measures, checkpoints, x0, whole if few_salts else np.zeros(len(x0), int))
    aims = [Aim(programme.violation, 1e-6), Aim(programme.misfit, GIVE_MISFIT), Aim(programme.few)]
    if measures.renews:
        aims.insert(1, Aim(programme.litres, 1e-6))
    found = lexicographic(solver, programme.region, aims)
    if found is None:
        return None
    unused = programme.switches + np.flatnonzero(found[programme.switches :] < 0.5)
    final = assemble(measures, checkpoints, x0, whole).region.without(unused)
    litres = float(programme.litres @ found) + 1e-6 + LITRES_ROUNDED / max(float(measures.most[-1]), 1.0)
    final = final.with_row(programme.litres, litres) if measures.renews else final
    last = solver.minimise(FIRST_TO_SECOND * programme.violation + programme.misfit + TIE * programme.few, final)
    return np.round((found if last is None else last)[: programme.n])


def other(
    measures: Measures, checkpoints: Sequence[Checkpoint], x0: Array, solver: Solver, leave_out: int
) -> Array | None:
    """The next best plan, without one material: one call."""
    programme = assemble(measures, checkpoints, x0, np.zeros(len(x0), int))
    region = programme.region.without(
        np.array([i for i, each in enumerate(measures.material) if each == leave_out], dtype=int)
    )
    cost = FIRST_TO_SECOND * (programme.violation + programme.litres) + programme.misfit + 1e-2 * programme.few
    found = solver.minimise(cost, region)
    return None if found is None else np.round(found[: programme.n])
