"""Hand doses for a shared tank: what to weigh on which day, with the full model behind every limit.

The model is run with every measure moved a little, side by side on the member axis; its answer is taken as a straight
line, a plan is solved for, and the model is run again about that plan until what it says and what was solved for
agree.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import INDEX, IONS, Array
from fertui.planning.checkpoints import (
    NUTRIENTS_THAT_STAY,
    Checkpoint,
    before_of,
    ec_factor,
    ec_of,
    exceeded,
    violation,
)
from fertui.planning.dosing import Measures, coarse, look, other, settle
from fertui.planning.goal import NH4_STOP_PH, SHARED, Goal
from fertui.planning.programme import Solver
from fertui.planning.renewal import excess_of
from fertui.planning.runs import Addition, Course, Doing, Exchange, Runs, Situation, mixed
from fertui.planning.shelf import Material
from fertui.planning.weighing import scales_of

REACHED_PCT = 1.0
"""By how many points of share a plan may miss its bands and still be called one that reaches them: the last digit."""
DAILY_WEIGHT = 0.3
"""Weight of the days on the way beside that of the horizon."""
RENEWED_WEIGHTS = (1.0, 0.5)
"""Weight of the bands and of the aim in a tank just renewed: it is mixed anew, so it is mixed right at once."""
LIGHTER, TAKEN_BACK = 3, (0.85, 0.6, 0.0)
"""A plan that passes a limit when the model runs it is made lighter by single scale steps, then by parts, down to
nothing."""
LITRES = 10.0
"""Renewal is counted in tens of litres."""
UNLIMITED_EC = 6.0
"""Ceiling taken for the physical maximum of a salt where a point has no EC limit [mS/cm]."""
EC_PER_MEQ = 0.06
"""Least EC that a meq/L of salt makes, for the physical maximum alone (sulfates; from memory)."""
LEAST_ROOM = 0.2
"""Room up to the EC ceiling that the physical maximum always counts with [mS/cm]."""


class Task(NamedTuple):
    """What a dosing plan has to do with: the loop, its goals by point, materials, days of the steps, the refill."""

    situation: Situation
    goals: Mapping[str, Goal]
    tank: str
    materials: tuple[Material, ...]
    days: tuple[int, ...]
    horizon: int
    refill: Array
    fixed_mmol: Array
    """What goes in at each step whatever is weighed (acid), shape (steps, 10)."""
    salts_at_most: int | None = None

    @property
    def managed(self) -> Goal:
        """Goal of the point the loop is steered by."""
        return self.goals[self.situation.managed]


class Dosed(NamedTuple):
    """A weighable plan: units of each measure, what the model makes of it, and what it leaves undone.

    ``missed_pct``: points of share outside the bands at the horizon. ``broken``: limits the model finds passed (none
    in a plan that is given out). ``end`` (10,): the managed point at the horizon.
    """

    units: Array
    measures: Measures
    checkpoints: tuple[Checkpoint, ...]
    missed_pct: float
    broken: tuple[tuple[str, float, float], ...]
    end: Array
    variants: Mapping[str, Array]
    runner_up: Array | None


def usable(task: Task) -> tuple[Material, ...]:
    """Materials that may be weighed in: not those that bring an ion already over its limit, nor NH4 into acid roots."""
    now = {point: task.situation.composition(point) for point in task.goals}
    over = {
        ion
        for point, goal in task.goals.items()
        for ion in ("NH4", "Na", "Cl")
        if now[point][INDEX[ion]] > goal.most[INDEX[ion]] + 1e-9
    }
    if task.situation.ph(task.situation.managed) < NH4_STOP_PH:
        over.add("NH4")
    return tuple(each for each in task.materials if not any(each.brings(ion) for ion in over))


def measures_of(task: Task, with_renewal: bool, lowest_ec: float) -> Measures:
    """Measures in units a person can measure out, each with its physical maximum: what lifts the lowest EC to the
    ceiling."""
    volume = task.situation.volumes_l[task.tank]
    goal = task.goals[task.tank]
    ceiling = goal.ec_most if np.isfinite(goal.ec_most) else UNLIMITED_EC
    room = ceiling if with_renewal else max(ceiling - lowest_ec, LEAST_ROOM)
    step = np.array([max(scales_of(task.situation.site)[0].step_kg, 1e-6) for _ in task.materials])
    meq_per_kg = np.array([0.5 * np.abs(each.ions_mmol_per_kg * _charges()).sum() for each in task.materials])
    most_kg = room / EC_PER_MEQ * volume / np.maximum(meq_per_kg, 1e-9)
    stock = np.array([np.inf if each.supply.amount_kg is None else each.supply.amount_kg for each in task.materials])
    units = np.floor(np.minimum(most_kg, stock) / step + 1e-9)
    steps, count = len(task.days), len(task.materials)
    cost = np.array([each.cost_per_kg for each in task.materials]) * step
    renewal = [1] if with_renewal else []
    return Measures(
        np.concatenate([np.tile(step, steps), [LITRES for _ in renewal]]),
        np.concatenate([np.tile(units, steps), [np.floor(volume / LITRES) for _ in renewal]]),
        np.concatenate([np.tile(cost, steps), [0.0 for _ in renewal]]),
        (*(j for _ in range(steps) for j in range(count)), *(-1 for _ in renewal)),
        (*(s for s in range(steps) for _ in range(count)), *(0 for _ in renewal)),
        np.floor(np.minimum(stock, 1e9) / step + 1e-9),
        task.salts_at_most,
    )


def doing_of(task: Task, measures: Measures, units: Array, late: Array | float = 0.0) -> Doing:
    """What plans (members, measures) do, side by side; ``late`` (members,) days are added to every step."""
    plans = np.atleast_2d(units)
    late = np.broadcast_to(np.asarray(late, dtype=float), (len(plans),))
    content = np.array([each.ions_mmol_per_kg for each in task.materials]).reshape(-1, len(IONS))
    additions, renewals = [], []
    salts = measures.materials * len(task.days)
    for s, day in enumerate(task.days):
        own = slice(s * measures.materials, (s + 1) * measures.materials)
        mmol = (plans[:, own] * measures.unit[own]) @ content + task.fixed_mmol[s]
        for delay in np.unique(late):
            additions.append(Addition(float(day + delay), np.where((late == delay)[:, None], mmol, 0.0)))
    if measures.renews:
        litres = plans[:, salts] * measures.unit[salts]
        renewals = [
            Exchange(float(task.days[0] + delay), np.where(late == delay, litres, 0.0), task.refill)
            for delay in np.unique(late)
        ]
    return Doing(tuple(additions), tuple(renewals))


def _charges() -> Array:
    from fertui.chemistry.ions import CHARGE

    return CHARGE


def dose(task: Task, runs: Runs, solver: Solver, without: Course) -> Dosed:
    """The plan for a task, empty where no salt may be weighed; see the module for how.

    ``without``: one settled member without the plan, which limits already passed are counted against. Where a first
    look shows that salts cannot do it, the plan is made anew with a renewal among its measures. At most six solver
    calls.
    """
    task = task._replace(materials=usable(task))
    lowest = float(ec_of(_probe(task), without.ions[task.tank][:, 0]).min())
    measures = measures_of(task, False, lowest)
    x0 = np.zeros(len(measures.unit))
    checkpoints = _about(task, measures, x0, runs, without)
    rough = look(measures, checkpoints, x0, solver)
    rough = x0 if rough is None else np.floor(rough + 1e-6)
    if _left_undone(checkpoints[-1], rough - x0):
        measures = measures_of(task, True, lowest)
        x0 = np.append(rough, 0.0)
        checkpoints = _about(task, measures, x0, runs, without)
    elif rough.any():
        x0, checkpoints = rough, _about(task, measures, rough, runs, without)
    units = settle(measures, checkpoints, x0, solver, coarse(measures, x0))
    units = x0 if units is None else units
    main = None if measures.renews else _replaceable(task, measures, units)
    second = None if main is None else other(measures, checkpoints, x0, solver, main)
    return _verified(task, measures, units, second, runs, without)


def _left_undone(end: Checkpoint, move: Array) -> bool:
    """Whether a plan leaves the shares out of their bands, or Ca, Mg and SO4 all in excess, by the straight line.

    An ion over its limit is no reason: none of it is added, and the renewal that lowers it is advice beside the plan.
    """
    composition = end.now + end.slope @ move
    gathered = set(NUTRIENTS_THAT_STAY) <= set(excess_of(composition, end.goal))
    return violation(end, composition) > REACHED_PCT or gathered


def _probe(task: Task) -> Checkpoint:
    """The tank now, to read its EC by."""
    now = task.situation.composition(task.tank)
    return _checkpoint(task, "tank", task.tank, 0, now, now[None], np.ones(0))


def _about(task: Task, measures: Measures, x0: Array, runs: Runs, without: Course) -> tuple[Checkpoint, ...]:
    """Checkpoints about a plan: it and every measure moved a little, in one run."""
    move = np.maximum(np.floor(0.05 * measures.most), 1.0)
    plans = np.vstack([x0, x0 + np.diag(move)])
    doing = doing_of(task, measures, plans)
    return _checkpoints(task, doing, runs.settled(doing, len(plans)), without, move)


def _checkpoints(task: Task, doing: Doing, course: Course, without: Course, move: Array) -> tuple[Checkpoint, ...]:
    """Tank before and after each step, then every day to the horizon."""
    found: list[Checkpoint] = []
    for day in task.days:
        before = course.ions[task.tank][day]
        base = without.ions[task.tank][day, 0]
        found.append(_checkpoint(task, f"tank before the dose of day {day}", task.tank, day, base, before, move))
        after = mixed(before, doing, float(day), course.volumes_l[task.tank][day])
        last = task.horizon == 0
        made_anew = bool(doing.renewals) and day == task.days[0]
        weight, aim_weight = (float(last), float(last)) if last or not made_anew else RENEWED_WEIGHTS
        point = _checkpoint(task, f"tank after the dose of day {day}", task.tank, day, base, after, move)
        step = -1 if last else len(found) - 1
        found.append(point._replace(before=step, weight=weight, aim_weight=aim_weight))
    return (*found, *_daily(task, course, without, move, len(found)))


def _daily(task: Task, course: Course, without: Course, move: Array, first: int) -> list[Checkpoint]:
    """Tank and managed point on every day; a root zone of its own is counted against the day before, from now on.

    ``first``: how many checkpoints stand before these.
    """
    managed, found = task.situation.managed, list[Checkpoint]()
    rooted = managed != task.tank
    for day in range(0 if rooted and task.horizon else 1, task.horizon + 1):
        for name in (task.tank, managed) if rooted and day else (managed,):
            steered, last = name == managed, day == task.horizon
            weight = (1.0 if last else DAILY_WEIGHT / task.horizon) if steered and day else 0.0
            point = _checkpoint(
                task, f"{name} on day {day}", name, day, without.ions[name][day, 0], course.ions[name][day], move
            )
            yesterday = first + len(found) - 2 if rooted and steered and day else -1
            found.append(point._replace(weight=weight, aim_weight=float(steered and last), before=yesterday))
    return found


def _checkpoint(task: Task, name: str, point: str, day: float, base: Array, members: Array, move: Array) -> Checkpoint:
    slope = ((members[1:] - members[0]) / move[: len(members) - 1, None]).T
    goal = task.goals[point]
    if "before" in name:
        goal = goal._replace(ec_most=np.inf, most=np.full(len(IONS), np.inf))
    ph, factor = task.situation.ph(point), ec_factor(task.situation, point)
    return Checkpoint(name, point, day, goal, base, members[0], slope, ph, ec_factor=factor)


def _replaceable(task: Task, measures: Measures, units: Array) -> int | None:
    """The material that weighs most among those for whose cation another salt stands unused; None where there is
    none."""
    of = np.array(measures.material)
    kg = [float((units * measures.unit)[of == j].sum()) for j in range(measures.materials)]
    unused = [each for each, weight in zip(task.materials, kg, strict=True) if weight <= 0.0]
    heaviest_first = sorted(range(len(kg)), key=lambda j: -kg[j])
    for j in heaviest_first:
        cations = [ion for ion in SHARED if task.materials[j].brings(ion)]
        if kg[j] > 0.0 and any(other.brings(ion) for other in unused for ion in cations):
            return j
    return None


def _verified(task: Task, measures: Measures, units: Array, second: Array | None, runs: Runs, without: Course) -> Dosed:
    """The plan as the model finds it, made lighter while any limit is passed; with its variants in the same run."""
    plan = units
    for attempt in range(LIGHTER + len(TAKEN_BACK) + 1):
        cases = {
            "plan": plan, "half of each weight": 0.5 * plan, "a day late": plan, "10 % more": 1.1 * plan,
            "10 % less": 0.9 * plan, "runner-up": plan if second is None else second,
        }  # fmt: skip
        late = np.array([float(each == "a day late" and task.horizon > 0) for each in cases])
        doing = doing_of(task, measures, np.array(list(cases.values())), late)
        points = _checkpoints(task, doing, runs.settled(doing, len(cases)), without, np.ones(len(cases) - 1))
        broken = tuple((each.day, one) for each in points for one in _broken(each, points))
        if not broken or attempt == LIGHTER + len(TAKEN_BACK):
            break
        if attempt < LIGHTER:
            plan = _lighter(task, measures, plan, {day for day, _ in broken})
        else:
            plan = np.floor(units * TAKEN_BACK[attempt - LIGHTER] + 1e-6)
    end = points[-1]
    members = np.vstack([end.now, end.now + end.slope.T])
    variants = {case: member for case, member in zip(cases, members, strict=True) if case != "plan"}
    passed = tuple(one for _, one in broken)
    return Dosed(plan, measures, points, violation(end, end.now), passed, end.now, variants, second)


def _lighter(task: Task, measures: Measures, units: Array, days: set[float]) -> Array:
    """A plan with one scale step less of the heaviest weighing at, or last before, each day on which a limit is
    passed."""
    plan = units.copy()
    for day in days:
        steps = [s for s, at in enumerate(task.days) if at <= day] or [0]
        weighed = np.where(
            np.isin(measures.step, steps) & (np.array(measures.material) >= 0), plan * measures.unit, 0.0
        )
        latest = max((s for s in steps if weighed[np.array(measures.step) == s].any()), default=steps[-1])
        heaviest = int(np.argmax(np.where(np.array(measures.step) == latest, weighed, 0.0)))
        plan[heaviest] = max(plan[heaviest] - 1.0, 0.0)
    return plan


def _broken(each: Checkpoint, points: Sequence[Checkpoint]) -> list[tuple[str, float, float]]:
    passed = exceeded(each, each.now, before_of(each, points))
    return [(f"{what}, {each.name}", value, limit) for what, value, limit in passed]
