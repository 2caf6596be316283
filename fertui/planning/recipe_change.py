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
    FAR_COST,
    Checkpoint,
    ec_factor,
    ec_of,
    exceeded,
    hard_rows,
    misfit_rows,
    violation,
    violation_rows,
)
from fertui.planning.goal import LIMITED, NH4_PART_OF_N, NH4_STOP_PH, Goal
from fertui.planning.programme import Aim, Region, Solver, lexicographic
from fertui.planning.runs import Course, Doing, Feed, Runs, Situation
from fertui.planning.shelf import Material
from fertui.planning.values import Binding

EC_HELD = 0.03
"""How far the recipe's EC may move from where it is [mS/cm]: the last digit of a meter, nearly."""
MOVE = 0.5
"""How far each ion of the feed is moved to see what the model answers [mmol/L]."""
RULE, MOST_CHANGE, LEAST_CHANGE = 0.25, 0.5, 0.25
"""A quarter of an ion is the outer end of the published rule (15-25 % where the analysis is 50 % off): beyond it an
ion goes only for the sake of the bands, and never by more than a half, or 0.25 mmol/L where there is little of it, in
one step."""
BEYOND = 5.0
"""Weight of a change beyond the rule beside distance to the aim."""
STAY = 0.1
"""Weight of a change of the feed beside distance to the aim in the root zone: no ion moves for nothing."""
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
                weight=float(last),
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
    aim, value, aim_cost, near = misfit_rows(checkpoints, x0)
    ec, ec_low, ec_high = _held(task, checkpoints, stages)
    most, most_high = _most_changed(task)
    step, step_high = _step(task)
    v, a, s, b = len(out), len(aim), len(step), len(most)
    n = count * number
    size = n + v + 3 * a + s + b

    def block(rows: Array, **parts: Array) -> Array:
        wide = np.zeros((len(rows), size))
        wide[:, :n] = rows @ salts
        for place, part in parts.items():
            start = {
                "slack": n,
                "under": n + v,
                "over": n + v + a,
                "far": n + v + 2 * a,
                "moved": size - b - s,
                "beyond": size - b,
            }[place]
            wide[:, start : start + part.shape[1]] = part
        return wide

    parts = [
        (block(hard.matrix), np.full(len(hard.high), -np.inf), hard.high - hard.matrix @ own),
        (block(out, slack=-np.eye(v)), np.full(v, -np.inf), out_high - out @ own),
        (block(aim, under=np.eye(a), over=-np.eye(a), far=-np.eye(a)), value - aim @ own, value - aim @ own),
        (block(ec), ec_low - ec @ own, ec_high - ec @ own),
        (block(most, beyond=-np.eye(b)), np.full(b, -np.inf), most_high - most @ own),
        (block(step, moved=-np.eye(s)), np.full(s, -np.inf), step_high - step @ own),
        (block(np.zeros((count, count * m)), moved=_per_stage(count, s)), np.zeros(count), np.full(count, _room(task))),
        *_ammonium(task, block, own),
    ]
    matrix, low, high = (np.concatenate(each) for each in zip(*parts, strict=True))
    further = np.tile(_further(task), 2)
    region = Region(
        matrix,
        low,
        high,
        np.zeros(size),
        np.concatenate([np.full(n + v + a, np.inf), near, np.full(a + s, np.inf), further]),
        np.zeros(size, int),
    )
    bands = np.concatenate([np.zeros(n), out_cost, np.zeros(size - n - v)])
    beyond = BEYOND / np.maximum(np.tile(task.running[list(MOVED)], 2 * count), 1.0)
    distance = np.concatenate([np.zeros(n + v), aim_cost, aim_cost, FAR_COST * aim_cost, np.zeros(s), beyond])
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


def _most_changed(task: RecipeTask) -> tuple[Array, Array]:
    """Rows ``+-(r - running) - beyond <= rule``: how far each ion of a stage goes beyond the published step."""
    count, m = len(task.days), len(MOVED)
    running = task.running[list(MOVED)]
    room = np.concatenate([np.maximum(RULE * running, LEAST_CHANGE) * (s + 1) for s in range(count)])
    here = np.tile(running, count)
    eye = np.eye(count * m)
    return np.vstack([eye, -eye]), np.concatenate([here + room, np.minimum(room - here, 0.0)])


def step_limits(task: RecipeTask, recipe: Array) -> tuple[Binding, ...]:
    """The limits of a single step that a recipe comes up against."""
    moved = np.abs(recipe - task.running)
    found = []
    for i in MOVED:
        most = max(MOST_CHANGE * float(task.running[i]), LEAST_CHANGE)
        if moved[i] > 0.97 * most and most > LEAST_CHANGE and IONS[i] not in LIMITED:
            what = f"change of {IONS[i]} in one step"
            found.append(Binding(what, most, "mmol/L", float(moved[i]), "half of what runs"))
    strength = float((CHARGE * moved)[CHARGE > 0].sum())
    if strength > 0.97 * _room(task):
        found.append(Binding("strength moved in one step", _room(task), "meq/L", strength, "common practice"))
    return tuple(found)


def _further(task: RecipeTask) -> Array:
    """How far beyond the rule each ion of each stage may go at most (stages x ions,) [mmol/L]; NH4, Na, Cl as they
    must."""
    running = task.running[list(MOVED)]
    step = np.maximum(MOST_CHANGE * running, LEAST_CHANGE) - np.maximum(RULE * running, LEAST_CHANGE)
    step[[IONS[i] in LIMITED for i in MOVED]] = np.inf
    return np.concatenate([step * (s + 1) for s in range(len(task.days))])


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
