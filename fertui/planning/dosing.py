"""How much of each salt in each step: the programs behind hand doses, and behind the salts of a renewal.

Variables are counted in units a person can measure out: scale steps of a salt, ten litres of renewal. Aims in order:
bands, litres renewed, distance to the aim, number of salts, kilograms or money.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fertui.chemistry.ions import Array
from fertui.planning.checkpoints import Checkpoint, Rows, hard_rows, misfit_rows, violation_rows
from fertui.planning.programme import Aim, Region, Solver, lexicographic

FIRST_TO_SECOND = 100.0
"""How much a unit of band violation outweighs a unit of misfit in the rounds that only look for where to be exact."""
GIVE_MISFIT = 0.01
"""Misfit given away to weigh one salt less: 1 % of one ion."""
LATER = 0.02
"""By how much a kilogram counts more with each later step: what can be done now is not put off."""


@dataclass(frozen=True, slots=True)
class Measures:
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


@dataclass(frozen=True, slots=True)
class Programme:
    """Region and costs over x, slacks of the bands, over and under the aim, and switches of the materials."""

    region: Region
    violation: Array
    litres: Array
    misfit: Array
    few: Array
    n: int


def assemble(
    measures: Measures, checkpoints: Sequence[Checkpoint], x0: Array, whole: bool, less_room: Array | None = None
) -> Programme:
    """The program about the plan ``x0`` that was last run; ``whole`` asks for weighable amounts and switches."""
    n, m = len(x0), measures.materials
    hard = hard_rows(checkpoints, x0)
    hard = hard if less_room is None else hard.tightened(less_room)
    out, out_high, out_cost = violation_rows(checkpoints, x0)
    aim, aim_value, aim_cost = misfit_rows(checkpoints, x0)
    v, a = len(out), len(aim)
    total = n + v + 2 * a + m
    matrix, low, high = _rows(measures, hard, (out, out_high), (aim, aim_value), total)
    most = np.concatenate([measures.most, np.full(v + 2 * a, np.inf), np.ones(m)])
    integral = (
        np.concatenate([np.ones(n), np.zeros(v + 2 * a), np.ones(m)]).astype(int) if whole else np.zeros(total, int)
    )
    renewal = np.array([each < 0 for each in measures.material], dtype=float)
    spent = measures.cost * (1.0 + LATER * np.array(measures.step)) * (1.0 - renewal)
    spent = 0.5 * spent / max(float(spent @ np.minimum(measures.most, 1e6)), 1e-12)
    return Programme(
        Region(matrix, low, high, np.zeros(total), most, integral),
        np.concatenate([np.zeros(n), out_cost, np.zeros(2 * a + m)]),
        np.concatenate([renewal / np.maximum(measures.most, 1.0), np.zeros(v + 2 * a + m)]),
        np.concatenate([np.zeros(n + v), aim_cost, aim_cost, np.zeros(m)]),
        np.concatenate([spent, np.zeros(v + 2 * a), np.ones(m)]),
        n,
    )


def _rows(
    measures: Measures, hard: Rows, out: tuple[Array, Array], aim: tuple[Array, Array], total: int
) -> tuple[Array, Array, Array]:
    """All rows over all variables: limits, bands, aim, supplies, switches, number of salts."""
    n, m, v, a = len(measures.unit), measures.materials, len(out[0]), len(aim[0])

    def wide(block: Array, **parts: Array) -> Array:
        row = np.zeros((len(block), total))
        row[:, :n] = block
        for place, part in parts.items():
            start = {"slack": n, "under": n + v, "over": n + v + a, "switch": n + v + 2 * a}[place]
            row[:, start : start + part.shape[1]] = part
        return row

    of = np.array([[each == j for each in measures.material] for j in range(m)], dtype=float).reshape(m, n)
    most = np.minimum(measures.supply, of @ np.where(np.isfinite(measures.most), measures.most, 1e9))
    count = measures.salts_at_most if measures.salts_at_most is not None else m
    blocks = [
        (wide(hard.matrix), np.full(len(hard.high), -np.inf), hard.high),
        (wide(out[0], slack=-np.eye(v)), np.full(v, -np.inf), out[1]),
        (wide(aim[0], under=np.eye(a), over=-np.eye(a)), aim[1], aim[1]),
        (wide(of, switch=-np.diag(most)), np.full(m, -np.inf), np.zeros(m)),
        (wide(np.zeros((1, n)), switch=np.ones((1, m))), np.zeros(1), np.array([float(count)])),
    ]
    matrix, low, high = (np.concatenate(parts) for parts in zip(*blocks, strict=True))
    scale = np.maximum(np.abs(matrix).max(axis=1, initial=0.0), 1e-12)
    return matrix / scale[:, None], low / scale, high / scale


def look(measures: Measures, checkpoints: Sequence[Checkpoint], x0: Array, solver: Solver) -> Array | None:
    """One rough solution in one call, to find where the model should be linearised; None where the limits leave no
    room."""
    programme = assemble(measures, checkpoints, x0, whole=False)
    cost = FIRST_TO_SECOND * (programme.violation + programme.litres) + programme.misfit + 1e-3 * programme.few
    found = solver.minimise(cost, programme.region)
    return None if found is None else found[: programme.n]


def settle(
    measures: Measures, checkpoints: Sequence[Checkpoint], x0: Array, solver: Solver, less_room: Array | None = None
) -> Array | None:
    """The weighable plan, aim by aim; None where the limits leave no room. Three calls, four with a renewal."""
    programme = assemble(measures, checkpoints, x0, whole=True, less_room=less_room)
    aims = [Aim(programme.violation, 1e-6), Aim(programme.misfit, GIVE_MISFIT), Aim(programme.few)]
    if measures.renews:
        aims.insert(1, Aim(programme.litres, 1e-6))
    found = lexicographic(solver, programme.region, aims)
    return None if found is None else np.round(found[: programme.n])


def other(
    measures: Measures, checkpoints: Sequence[Checkpoint], x0: Array, solver: Solver, leave_out: int
) -> Array | None:
    """The next best plan, without one material: one call."""
    programme = assemble(measures, checkpoints, x0, whole=True)
    region = programme.region.without(
        np.array([i for i, each in enumerate(measures.material) if each == leave_out], dtype=int)
    )
    cost = FIRST_TO_SECOND * (programme.violation + programme.litres) + programme.misfit + 1e-2 * programme.few
    found = solver.minimise(cost, region)
    return None if found is None else np.round(found[: programme.n])
