"""The next recipe of a loop fed through stock tanks: the feed that brings the root zone back within the horizon.

The salts of the stock are the variables, so that every recipe thought of can be mixed. EC at the dripper stays where
it is: what one ion gains the others give.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import INDEX, IONS, Array
from fertui.planning.checkpoints import (
    Checkpoint,
    before_of,
    ec_factor,
    exceeded,
    violation,
)
from fertui.planning.goal import NH4_STOP_PH, SHARED
from fertui.planning.programme import Solver
from fertui.planning.recipe_programme import solved
from fertui.planning.recipe_task import MOVED, RecipeTask
from fertui.planning.runs import Course, Doing, Feed, Runs
from fertui.planning.shelf import Material
from fertui.planning.stock import StockSheet

MOVE = 0.5
"""How far each ion of the feed is moved to see what the model answers [mmol/L]."""
STAY = 0.1
"""Weight of a change of the feed beside distance to the aim in the root zone: no ion moves for nothing."""


class Recipe(NamedTuple):
    """Recipes by stage (stages, 10) [mmol/L], and what the model makes of them."""

    stages: Array
    checkpoints: tuple[Checkpoint, ...]
    missed_pct: float
    broken: tuple[tuple[str, float, float], ...]
    end: Array
    variants: Mapping[str, Array]
    runner_up: RunnerUpRecipe | None
    sheet: StockSheet


class RunnerUpRecipe(NamedTuple):
    """The next best recipes (stages, 10) [mmol/L], without one salt, and the managed point at the horizon (10,)."""

    without: str
    stages: Array
    end: Array


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


def change(
    task: RecipeTask, runs: Runs, solver: Solver, without: Course, sheet_of: Callable[[Array], StockSheet]
) -> Recipe | None:
    """The recipe for a task, None where no mix of these salts keeps the limits.

    Two looks, each about a run of the model, then the next best without one of the salts weighed for it (``sheet_of``
    a recipe (10,)). Three solver calls beside those of the sheet, and three model runs.
    """
    task = task._replace(materials=usable_in_stock(task))
    stages = np.tile(task.running, (len(task.days), 1))
    checkpoints = _about(task, stages, runs, without)
    found = solved(task, checkpoints, stages, solver)
    if found is None:
        return None
    checkpoints = _about(task, found, runs, without)
    again = solved(task, checkpoints, found, solver)
    stages = np.round(found if again is None else again, 2)
    sheet = sheet_of(stages[0])
    left_out = _replaceable(task.materials, sheet)
    other = None
    if left_out is not None:
        fewer = tuple(each for each in task.materials if each is not left_out)
        other = solved(task._replace(materials=fewer), checkpoints, found, solver)
    second = None if other is None or left_out is None else (left_out.name, other)
    return _verified(task, stages, second, runs, without, sheet)


def _replaceable(materials: Sequence[Material], sheet: StockSheet) -> Material | None:
    """The salt weighed most among those for whose K, Ca or Mg another salt stands, unused if there is such a one."""

    def stands_in(each: Material, others: Sequence[Material]) -> bool:
        return any(other is not each and other.brings(ion) for other in others for ion in SHARED if each.brings(ion))

    kg = {each.name: sum(line.kg for tank in sheet.tanks for line in tank.salts if line.salt == each.name)
          for each in materials}  # fmt: skip
    heaviest_first = sorted((each for each in materials if kg[each.name] > 0.0), key=lambda each: -kg[each.name])
    unused = [each for each in materials if each not in heaviest_first]
    for others in (unused, materials):
        found = next((each for each in heaviest_first if stands_in(each, others)), None)
        if found is not None:
            return found
    return None


def feeds(task: RecipeTask, stages: Array, late: Array | None = None) -> Doing:
    """Recipes (members, stages, 10) as what the model is to do; members marked ``late`` follow a day behind."""
    if late is None or not late.any():
        return Doing(feeds=tuple(Feed(float(day), stages[:, s]) for s, day in enumerate(task.days)))
    found = []
    for s, day in enumerate(task.days):
        before = stages[:, s - 1] if s > 0 else np.broadcast_to(task.running, stages[:, s].shape)
        found.append(Feed(float(day), np.where(late[:, None], before, stages[:, s])))
        found.append(Feed(float(day + 1), stages[:, s]))
    return Doing(feeds=tuple(found))


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
    for day in range(task.horizon + 1):
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
                before=len(found) - 1 if day > 0 else -1,
            )  # fmt: skip
        )
    return tuple(found)


def _feed_checkpoint(task: RecipeTask, stage: int, recipe: Array) -> Checkpoint:
    """The feed of one stage: its limits, and that it should not change without need."""
    slope = np.zeros((len(IONS), len(task.days) * len(MOVED)))
    for column, i in enumerate(MOVED):
        slope[i, stage * len(MOVED) + column] = 1.0
    most = np.where(np.isin(IONS, ("Na", "Cl")), np.inf, task.goals["feed"].most)
    goal = task.goals["feed"]._replace(aim=task.running, ec_most=np.inf, most=most)
    return Checkpoint(
        f"feed of stage {stage + 1}", "feed", task.days[stage], goal, task.running, recipe, slope,
        task.situation.ph("feed"), aim_weight=STAY,
    )  # fmt: skip


def _verified(
    task: RecipeTask, stages: Array, second: tuple[str, Array] | None, runs: Runs, without: Course, sheet: StockSheet
) -> Recipe:
    """The recipe as the model finds it, carried out otherwise, and the next best, in one run."""
    part = stages - task.running
    cases = {
        "plan": stages, "half of the change": task.running + 0.5 * part, "a day late": stages,
        "10 % more": task.running + 1.1 * part, "10 % less": task.running + 0.9 * part,
        "unchanged": np.tile(task.running, (len(stages), 1)),
        "runner-up": stages if second is None else np.round(second[1], 2),
    }  # fmt: skip
    late = np.array([case == "a day late" for case in cases])
    course = runs.settled(feeds(task, np.array(list(cases.values())), late), len(cases))
    checkpoints = _checkpoints(task, course, without, stages)
    end = dict(zip(cases, course.ions[task.situation.managed][task.horizon], strict=True))
    broken = tuple(one for each in checkpoints for one in _broken(each, checkpoints))
    variants = {case: end[case] for case in cases if case not in ("plan", "unchanged", "runner-up")}
    if task.horizon < 2:
        del variants["a day late"]
    other = None if second is None else RunnerUpRecipe(second[0], cases["runner-up"], end["runner-up"])
    missed = violation(checkpoints[-1], end["plan"])
    return Recipe(stages, checkpoints, missed, broken, end["plan"], variants, other, sheet)


def _broken(each: Checkpoint, points: Sequence[Checkpoint]) -> list[tuple[str, float, float]]:
    passed = exceeded(each, each.now, before_of(each, points))
    return [(f"{what}, {each.name}", value, limit) for what, value, limit in passed]
