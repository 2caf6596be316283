"""The linear program behind a recipe: salts of the stock as variables, limits and steps of a recipe as rows.

Every row about ions of the feed is written in the ions and carried over to the salts: r = own + content x salts.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import CHARGE, INDEX, IONS, Array
from fertui.planning.checkpoints import FAR_COST, Checkpoint, ec_of, hard_rows, misfit_rows, violation_rows
from fertui.planning.dosing import FIRST_TO_SECOND
from fertui.planning.goal import LIMITED, NH4_PART_OF_N
from fertui.planning.programme import Region, Solver
from fertui.planning.recipe_task import MOVED, RecipeTask
from fertui.planning.values import Binding

EC_HELD = 0.03
"""How far the recipe's EC may move from where it is [mS/cm]: the last digit of a meter, nearly."""
RULE, MOST_CHANGE, LEAST_CHANGE = 0.25, 0.5, 0.25
"""A quarter of an ion is the outer end of the published rule (15-25 % where the analysis is 50 % off): beyond it an ion
goes only for the sake of the bands, and never by more than a half, or 0.25 mmol/L where there is little of it, in one
step."""
BEYOND = 5.0
"""Weight of a change beyond the rule beside distance to the aim."""

Block = tuple[Array, Array, Array]
"""Rows over all variables, their low and high."""


class Places(NamedTuple):
    """Where the variables stand: salts, slacks of the bands, under, over and far over the aim, moved, beyond the rule.

    ``content`` (ions of all stages, salts); ``own`` (ions of all stages,) [mmol/L].
    """

    content: Array
    own: Array
    slacks: int
    aims: int
    moved: int
    beyond: int

    @property
    def salts(self) -> int:
        """Number of salts over all stages."""
        return self.content.shape[1]

    @property
    def size(self) -> int:
        """Number of variables."""
        return self.salts + self.slacks + 3 * self.aims + self.moved + self.beyond

    def rows(self, ions: Array, low: Array | None, high: Array, **parts: Array) -> Block:
        """Rows ``low <= ions r + parts <= high`` as rows over all variables; ``low`` None: open."""
        n, v, a = self.salts, self.slacks, self.aims
        starts = {"slack": n, "under": n + v, "over": n + v + a, "far": n + v + 2 * a, "moved": n + v + 3 * a}
        starts["beyond"] = starts["moved"] + self.moved
        wide = np.zeros((len(ions), self.size))
        wide[:, :n] = ions @ self.content
        for name, part in parts.items():
            wide[:, starts[name] : starts[name] + part.shape[1]] = part
        shift = ions @ self.own
        return wide, np.full(len(ions), -np.inf) if low is None else low - shift, high - shift


def solved(task: RecipeTask, checkpoints: Sequence[Checkpoint], stages: Array, solver: Solver) -> Array | None:
    """Recipes (stages, 10) [mmol/L] that solve the program about ``stages`` in one call; None where there are none."""
    x0 = stages[:, MOVED].ravel()
    bands, aim, step = violation_rows(checkpoints, x0), misfit_rows(checkpoints, x0), _step(task)
    count, ions = len(task.days), len(MOVED)
    content = np.array([each.ions_mmol_per_kg / 1000.0 for each in task.materials]).reshape(-1, len(IONS))[:, MOVED].T
    own = np.tile(np.maximum(task.own, 0.0)[list(MOVED)], count)
    places = Places(np.kron(np.eye(count), content), own, len(bands[0]), len(aim[0]), len(step[0]), 2 * count * ions)
    hard = hard_rows(checkpoints, x0)
    blocks = [
        places.rows(hard.matrix, None, hard.high),
        *_soft(places, bands[:2], aim[:2]),
        *_feed_rows(task, places, checkpoints, stages, step),
    ]
    found = solver.minimise(_cost(task, places, bands[2], aim[2]), _region(task, places, blocks, aim[3]))
    if found is None:
        return None
    recipes = stages.copy()
    recipes[:, MOVED] = (own + places.content @ found[: places.salts]).reshape(count, ions)
    return recipes


def _soft(places: Places, bands: tuple[Array, Array], aim: tuple[Array, Array]) -> list[Block]:
    """Bands with their slacks, and distance to the aim."""
    eye = np.eye(places.aims)
    return [
        places.rows(bands[0], None, bands[1], slack=-np.eye(places.slacks)),
        places.rows(aim[0], aim[1], aim[1], under=eye, over=-eye, far=-eye),
    ]


def _feed_rows(
    task: RecipeTask, places: Places, checkpoints: Sequence[Checkpoint], stages: Array, step: tuple[Array, Array]
) -> list[Block]:
    """What a recipe has to keep: its EC, its ammonium, and how far it may depart from the one before."""
    count = len(task.days)
    most, most_high = _most_changed(task)
    ec, ec_low, ec_high = _held(task, checkpoints, stages)
    ammonium = _ammonium(task)
    nothing = np.zeros((count, count * len(MOVED)))
    return [
        places.rows(ec, ec_low, ec_high),
        places.rows(most, None, most_high, beyond=-np.eye(places.beyond)),
        places.rows(step[0], None, step[1], moved=-np.eye(places.moved)),
        places.rows(nothing, None, np.full(count, _room(task)), moved=_per_stage(count, places.moved)),
        places.rows(ammonium, None, np.zeros(count)),
    ]


def _region(task: RecipeTask, places: Places, blocks: Sequence[Block], near: Array) -> Region:
    matrix, low, high = (np.concatenate(each) for each in zip(*blocks, strict=True))
    free = places.salts + places.slacks + places.aims
    most = np.concatenate(
        [np.full(free, np.inf), near, np.full(places.aims + places.moved, np.inf), np.tile(_further(task), 2)]
    )
    return Region(matrix, low, high, np.zeros(places.size), most, np.zeros(places.size, int))


def _cost(task: RecipeTask, places: Places, bands: Array, aim: Array) -> Array:
    """Bands far before distance and what goes beyond the rule."""
    beyond = BEYOND / np.maximum(np.tile(task.running[list(MOVED)], 2 * len(task.days)), 1.0)
    salts = np.zeros(places.salts)
    return np.concatenate([salts, FIRST_TO_SECOND * bands, aim, aim, FAR_COST * aim, np.zeros(places.moved), beyond])


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


def _ammonium(task: RecipeTask) -> Array:
    """NH4 at most its part of the nitrogen of every stage: (1 - p) NH4 - p NO3 <= 0."""
    count, m = len(task.days), len(MOVED)
    rows = np.zeros((count, count * m))
    for s in range(count):
        rows[s, s * m + MOVED.index(INDEX["NH4"])] = 1.0 - NH4_PART_OF_N
        rows[s, s * m + MOVED.index(INDEX["NO3"])] = -NH4_PART_OF_N
    return rows
