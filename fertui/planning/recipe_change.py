"""The next recipe of a loop fed through stock tanks: the feed that brings the root zone back within the horizon.

The salts of the stock are the variables, so that every recipe thought of can be mixed. EC at the dripper stays where
it is: what one ion gains the others give.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from fertui.chemistry.ions import CHARGE, INDEX, IONS, Array
from fertui.planning.checkpoints import (
    Checkpoint,
    ec_factor,
    ec_of,
    exceeded,
    hard_rows,
    misfit_rows,
    violation,
    violation_rows,
)
from fertui.planning.goal import NH4_PART_OF_N, NH4_STOP_PH, Goal
from fertui.planning.programme import Aim, Region, Solver, lexicographic
from fertui.planning.runs import Course, Doing, Feed, Runs, Situation
from fertui.planning.shelf import Material

EC_HELD = 0.03
"""How far the recipe's EC may move from where it is [mS/cm]: the last digit of a meter, nearly."""
MOVE = 0.5
"""How far each ion of the feed is moved to see what the model answers [mmol/L]."""
STAY = 0.1
"""Weight of a change of the feed beside distance to the aim in the root zone: no ion moves for nothing."""
DAILY_WEIGHT = 0.3
MOVED = tuple(i for i, ion in enumerate(IONS) if ion != "HCO3")
"""Ions of the feed that a recipe moves; its alkalinity belongs to the water and the acid."""


@dataclass(frozen=True, slots=True)
class RecipeTask:
    """The loop, the goals by point, the stock's salts, the running recipe and what the water brings of it (10,)."""

    situation: Situation
    goals: Mapping[str, Goal]
    materials: tuple[Material, ...]
    running: Array
    own: Array
    horizon: int
    days: tuple[int, ...] = (0,)

    @property
    def managed(self) -> Goal:
        """Goal of the point the loop is steered by."""
        return self.goals[self.situation.managed]


@dataclass(frozen=True, slots=True)
class Recipe:
    """Recipes by stage (stages, 10) [mmol/L], and what the model makes of them."""

    stages: Array
    checkpoints: tuple[Checkpoint, ...]
    missed_pct: float
    broken: tuple[tuple[str, float, float], ...]
    end: Array
    variants: Mapping[str, Array]


def usable_in_stock(task: RecipeTask) -> tuple[Material, ...]:
    """Salts a stock may carry: no NH4 into acid roots, nothing that brings more of an ion over its limit in the root
    zone."""
    point = task.situation.managed
    now, goal = task.situation.composition(point), task.goals[point]
    over = {ion for ion in ("Na", "Cl", "NH4") if now[INDEX[ion]] > goal.most[INDEX[ion]] + 1e-9}
    if task.situation.ph(point) < NH4_STOP_PH:
        over.add("NH4")
    return tuple(
        each for each in task.materials if each.use == "nutrient" and not any(each.brings(ion) for ion in over)
    )


def change(task: RecipeTask, runs: Runs, solver: Solver, without: Course) -> Recipe | None:
    """The recipe for a task, None where no mix of these salts keeps the limits.

    Two looks, each about a run of the model; then the exact program: bands, then distance to the aim with as little
    change of the feed as that takes. Four solver calls, four model runs at most.
    """
    task = replace(task, materials=usable_in_stock(task))
    stages = np.tile(task.running, (len(task.days), 1))
    checkpoints = _about(task, stages, runs, without)
    found = _solved(task, checkpoints, stages, solver, exact=False)
    if found is None:
        return None
    checkpoints = _about(task, found, runs, without)
    best = _solved(task, checkpoints, found, solver, exact=True)
    return _verified(task, found if best is None else best, runs, without)


def feeds(task: RecipeTask, stages: Array) -> Doing:
    """Recipes (members, stages, 10) as what the model is to do."""
    return Doing(feeds=tuple(Feed(float(day), stages[:, s]) for s, day in enumerate(task.days)))


def _about(task: RecipeTask, stages: Array, runs: Runs, without: Course) -> tuple[Checkpoint, ...]:
    """Checkpoints with slopes in the ions of every stage, about recipes (stages, 10)."""
    moved = [stages]
    for s in range(len(stages)):
        for i in MOVED:
            other = stages.copy()
            other[s, i] += MOVE
            moved.append(other)
    course = runs.settled(feeds(task, np.array(moved)), len(moved))
    return _checkpoints(task, course, without, stages)


def _checkpoints(task: RecipeTask, course: Course, without: Course, stages: Array) -> tuple[Checkpoint, ...]:
    point = task.situation.managed
    found: list[Checkpoint] = []
    for s, recipe in enumerate(stages):
        found.append(_feed_checkpoint(task, s, recipe))
    for day in range(1, task.horizon + 1):
        members = course.ions[point][day]
        slope = ((members[1:] - members[0]) / MOVE).T
        last = day == task.horizon
        found.append(
            Checkpoint(
                f"{point} on day {day}",
                point,
                day,
                task.goals[point],
                without.ions[point][day, 0],
                members[0],
                slope,
                task.situation.ph(point),
                weight=1.0 if last else DAILY_WEIGHT / task.horizon,
                aim_weight=float(last),
                ec_factor=ec_factor(task.situation, point),
            )  # fmt: skip
        )
    return tuple(found)


def _feed_checkpoint(task: RecipeTask, stage: int, recipe: Array) -> Checkpoint:
    """The feed of one stage: its limits, and that it should not change without need."""
    slope = np.zeros((len(IONS), len(task.days) * len(MOVED)))
    for column, i in enumerate(MOVED):
        slope[i, stage * len(MOVED) + column] = 1.0
    most = np.where(np.isin(IONS, ("Na", "Cl")), np.inf, task.goals["feed"].most)
    goal = replace(task.goals["feed"], aim=task.running, ec_most=np.inf, most=most)
    return Checkpoint(
        f"feed of stage {stage + 1}", "feed", task.days[stage], goal, task.running, recipe, slope,
        task.situation.ph("feed"), aim_weight=STAY,
    )  # fmt: skip


def _solved(
    task: RecipeTask, checkpoints: Sequence[Checkpoint], stages: Array, solver: Solver, exact: bool
) -> Array | None:
    """Recipes (stages, 10) that solve the program about ``stages``; None where there is none."""
    content = np.array([each.ions_mmol_per_kg / 1000.0 for each in task.materials]).reshape(-1, len(IONS))[:, MOVED].T
    count, m, number = len(task.days), len(MOVED), len(task.materials)
    salts = np.kron(np.eye(count), content)
    own = np.tile(np.maximum(task.own, 0.0)[list(MOVED)], count)
    x0 = stages[:, MOVED].ravel()
    hard = hard_rows(checkpoints, x0)
    out, out_high, out_cost = violation_rows(checkpoints, x0)
    aim, value, aim_cost = misfit_rows(checkpoints, x0)
    ec, ec_low, ec_high = _held(task, checkpoints, stages)
    step, step_high = _step(task)
    v, a, s = len(out), len(aim), len(step)
    n = count * number

    def block(rows: Array, **parts: Array) -> Array:
        wide = np.zeros((len(rows), n + v + 2 * a + s))
        wide[:, :n] = rows @ salts
        for place, part in parts.items():
            start = {"slack": n, "under": n + v, "over": n + v + a, "moved": n + v + 2 * a}[place]
            wide[:, start : start + part.shape[1]] = part
        return wide

    parts = [
        (block(hard.matrix), np.full(len(hard.high), -np.inf), hard.high - hard.matrix @ own),
        (block(out, slack=-np.eye(v)), np.full(v, -np.inf), out_high - out @ own),
        (block(aim, under=np.eye(a), over=-np.eye(a)), value - aim @ own, value - aim @ own),
        (block(ec), ec_low - ec @ own, ec_high - ec @ own),
        (block(step, moved=-np.eye(s)), np.full(s, -np.inf), step_high - step @ own),
        (
            np.hstack([np.zeros((count, n + v + 2 * a)), _per_stage(count, s)]),
            np.zeros(count),
            np.full(count, _room(task)),
        ),
        *_ammonium(task, block, own),
    ]
    matrix, low, high = (np.concatenate(each) for each in zip(*parts, strict=True))
    size = n + v + 2 * a + s
    region = Region(matrix, low, high, np.zeros(size), np.full(size, np.inf), np.zeros(size, int))
    bands = np.concatenate([np.zeros(n), out_cost, np.zeros(2 * a + s)])
    distance = np.concatenate([np.zeros(n + v), aim_cost, aim_cost, np.zeros(s)])
    aims = [Aim(bands, 1e-6), Aim(distance)] if exact else [Aim(100.0 * bands + distance)]
    found = lexicographic(solver, region, aims)
    if found is None:
        return None
    recipes = stages.copy()
    recipes[:, MOVED] = (own + salts @ found[:n]).reshape(count, m)
    return recipes


def _held(task: RecipeTask, checkpoints: Sequence[Checkpoint], stages: Array) -> tuple[Array, Array, Array]:
    """EC of each stage's recipe kept at that of the running one."""
    rows, low, high = [], [], []
    for s, recipe in enumerate(stages):
        feed = checkpoints[s]
        wanted = float(ec_of(feed, task.running))
        moved = recipe + 0.02 * np.vstack([np.zeros(len(IONS)), np.eye(len(IONS))])
        ec = ec_of(feed, moved)
        row = ((ec[1:] - ec[0]) / 0.02) @ feed.slope
        at = float(ec[0]) - float(row @ stages[:, MOVED].ravel())
        rows.append(row)
        low.append(wanted - EC_HELD - at)
        high.append(wanted + EC_HELD - at)
    return np.array(rows), np.array(low), np.array(high)


def _step(task: RecipeTask) -> tuple[Array, Array]:
    """Rows ``+-z (r_i - r_before) - moved <= 0`` of the cations of every stage: strength moved from one to another."""
    count, m = len(task.days), len(MOVED)
    cations = [column for column, i in enumerate(MOVED) if CHARGE[i] > 0]
    rows, high = [], []
    for s in range(count):
        for column in cations:
            z = CHARGE[MOVED[column]]
            row = np.zeros(count * m)
            row[s * m + column] = z
            before = z * task.running[MOVED[column]] if s == 0 else 0.0
            if s > 0:
                row[(s - 1) * m + column] = -z
            rows += [row, -row]
            high += [before, -before]
    return np.array(rows), np.array(high)


def _per_stage(count: int, moved: int) -> Array:
    return np.repeat(np.eye(count), moved // count, axis=1)


def _room(task: RecipeTask) -> float:
    """Equivalents [meq/L] that may change sides in one step: what one cation gains the others lose, 0.1 mS/cm a
    meq/L."""
    return 2.0 * task.goals["feed"].ec_step / 0.1


def _ammonium(task: RecipeTask, block: Callable[[Array], Array], own: Array) -> list[tuple[Array, Array, Array]]:
    """NH4 at most its part of the nitrogen of every stage: (1 - p) NH4 - p NO3 <= 0."""
    count, m = len(task.days), len(MOVED)
    rows = np.zeros((count, count * m))
    for s in range(count):
        rows[s, s * m + MOVED.index(INDEX["NH4"])] = 1.0 - NH4_PART_OF_N
        rows[s, s * m + MOVED.index(INDEX["NO3"])] = -NH4_PART_OF_N
    return [(block(rows), np.full(count, -np.inf), -rows @ own)]


def _verified(task: RecipeTask, stages: Array, runs: Runs, without: Course) -> Recipe:
    """The recipe as the model finds it, and carried out by half, late and with 10 % more or less of the change."""
    stages = np.round(stages, 2)
    part = stages - task.running
    cases = {
        "plan": stages, "half of the change": task.running + 0.5 * part, "10 % more": task.running + 1.1 * part,
        "10 % less": task.running + 0.9 * part, "unchanged": np.tile(task.running, (len(stages), 1)),
    }  # fmt: skip
    course = runs.settled(feeds(task, np.array(list(cases.values()))), len(cases))
    checkpoints = _checkpoints(task, course, without, stages)
    end = course.ions[task.situation.managed][task.horizon]
    broken = tuple(one for each in checkpoints for one in _broken(each))
    variants = {case: member for case, member in zip(cases, end, strict=True) if case not in ("plan", "unchanged")}
    return Recipe(stages, checkpoints, violation(checkpoints[-1], end[0]), broken, end[0], variants)


def _broken(each: Checkpoint) -> list[tuple[str, float, float]]:
    return [(f"{what}, {each.name}", value, limit) for what, value, limit in exceeded(each, each.now)]
