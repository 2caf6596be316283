"""The plan for a tank dosed by hand, from the request to what is shown."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import timedelta

import numpy as np

from fertui.catalogue.crops import crop
from fertui.chemistry.conductivity import conductivity
from fertui.chemistry.ions import INDEX, IONS, Array, vector
from fertui.estimate.display import LEAST_SHARED_MEQ
from fertui.estimate.ranges import shared_meq
from fertui.planning.acid import acid_on_shelf, source_water
from fertui.planning.acid_steps import TankAcid, acid_steps, heated_words, tank_acid
from fertui.planning.checkpoints import ec_of, too_weak, violation
from fertui.planning.goal import LIMITED, Goal
from fertui.planning.hand_doses import LITRES, REACHED_PCT, Dosed, Task, doing_of, dose, usable
from fertui.planning.reasons import (
    MAJOR,
    arithmetic,
    binding,
    held_by,
    outside_words,
    over_limit_words,
    overshot_words,
    points_out,
    rule_of_thumb,
    share_words,
    why_salts,
)
from fertui.planning.renewal import LEFT_N_MMOL, excess_of, renewal_of, smallest_fraction
from fertui.planning.request import (
    STEPS_BY_DEFAULT,
    Request,
    cautions_for,
    staffed_days,
    vague,
)
from fertui.planning.runs import Course, Doing, Situation, share_pct
from fertui.planning.values import (
    Outlook,
    Plan,
    Renewal,
    RunnerUp,
    Step,
    WhatIf,
)
from fertui.planning.weighing import scales_of
from fertui.planning.with_fresh_water import holding_words, spread_words
from fertui.site.model import Composition

FED_EC, STARVED = 0.5, 0.5
"""A tank of at least the first [mS/cm] whose EC falls below the second part of itself is one that nothing feeds."""
NOT_ANALYSED = (
    "take a sample first: the tank was never analysed, and as if just filled with its water no weighing holds it"
)
MISSED_PART = 0.10
"""An ion of a named target missed by more than this part makes the plan one that does not reach it."""


def hand_plan(request: Request) -> Plan:
    """Hand doses for a shared tank; no doses and the reason where a sample comes first or salts cannot do it."""
    empty = request.empty(Outlook(request.runs.shown(Doing())))
    why = vague(request)
    if why is not None:
        return request.counted(empty._replace(feasible=False, reason=why, sample_first=True))
    course = request.runs.settled(Doing(), 1)
    request = request.strengthened(course.ions[request.situation.managed][-1, 0])
    drained = _drained(request, course)
    if drained is not None:
        hold = holding_words(request, usable(_task(request, (0,), TankAcid((None,)))), course)
        return request.counted(empty._replace(feasible=False, reason=drained, notices=hold))
    days = _days(request)
    acid = tank_acid(request, days, course)
    if not request.managed.named and acid.first is None and request.in_order(empty.after_without):
        words = f"nothing to weigh: {request.why_in_order(empty.after_without)}"
        return request.counted(empty._replace(notices=(words, *acid.notices)))
    task = _task(request, days, acid)
    dosed = dose(task, request.runs, request.solver, course)
    held = dosed.units.any() and shared_meq(dosed.end) >= LEAST_SHARED_MEQ
    if request.situation.analysis_days_old is None and not held and request.wishes.days:
        return request.counted(empty._replace(feasible=False, reason=NOT_ANALYSED, sample_first=True))
    return _shown(request, task, dosed, empty, acid)


def _unseen(request: Request) -> tuple[str, ...]:
    """A word where nobody has analysed the tank yet."""
    if request.situation.analysis_days_old is not None:
        return ()
    return (
        "take a sample first: the tank was never analysed; planned as if it had just been filled with its source "
        "water. Log an analysis and plan again",
    )


def _drained(request: Request, course: Course) -> str | None:
    """Why a horizon is too long for hand doses: the crop empties the tank of salts meanwhile; None where it does
    not."""
    ec = np.maximum(conductivity(np.maximum(course.ions["tank"][:, 0], 0.0)), 0.0)
    if ec[0] < FED_EC or ec[-1] >= STARVED * ec[0]:
        return None
    days = max(int(np.argmax(ec < 0.75 * ec[0])), 1)
    litres = request.situation.crop_water_l_per_m2_d * request.situation.loop.area_m2
    return (
        f"{request.wishes.days} days is too long for this tank: the crop drinks {litres:.0f} L a day of its "
        f"{request.situation.volumes_l['tank']:.0f} L and EC would fall from {ec[0]:.1f} to {ec[-1]:.1f}, as nothing "
        f"feeds it; log the stock or recipe that tops it up, or plan {days} day{'s' if days > 1 else ''} ahead"
    )


def _days(request: Request) -> tuple[int, ...]:
    if request.wishes.days == 0:
        return (0,)
    return staffed_days(request.situation, request.wishes.days, request.wishes.steps or STEPS_BY_DEFAULT)


def _task(request: Request, days: tuple[int, ...], acid: TankAcid) -> Task:
    return Task(
        request.situation, request.goals, "tank", request.materials, days, request.wishes.days, refill_of(request),
        acid.mmol, request.wishes.salts,
    )  # fmt: skip


def refill_of(request: Request) -> Array:
    """What a renewal fills up with: the make-up water, pure where the site describes none."""
    water = source_water(request.situation.site, request.situation.loop) or Composition()
    return vector(dict(water.ions))


def _shown(request: Request, task: Task, dosed: Dosed, empty: Plan, acid: TankAcid) -> Plan:
    task = task._replace(materials=usable(task))
    steps = _steps(task, dosed)
    by_name = {each.name: each for each in task.materials}
    used = [by_name[name] for name in dict.fromkeys(step.salt for step in steps)]
    after = Outlook(request.runs.shown(doing_of(task, dosed.measures, dosed.units).alone()))
    feasible, why = _verdict(request, dosed, after)
    poured = [] if acid.first is None else [acid_on_shelf(request.situation.site)]
    found = empty._replace(
        feasible=feasible,
        reason=why,
        steps=steps,
        renewal=_renewal(request, dosed),
        after=after,
        binding=binding(dosed.checkpoints),
        rule_of_thumb=rule_of_thumb(request.situation.composition(request.situation.managed), request.managed),
        cautions=cautions_for([*(each.supply for each in used), *poured]),
        reasons=why_salts(used, request.materials, dosed.end, request.managed),
        arithmetic=(
            *_renewed_words(request, dosed, task.days),
            *arithmetic(steps, by_name, _before(request, dosed), request.situation.volumes_l[task.tank]),
            *acid.arithmetic,
        ),
        runner_up=_runner_up(task, dosed, steps),
        sensitivity=_sensitivity(dosed),
        notices=(
            *_unseen(request),
            *over_limit_words(dosed.end, request.managed),
            *overshot_words(dosed.checkpoints),
            *acid.notices,
            *heated_words(request.situation, request.entries),
            *spread_words(request, steps),
        ),
        acid=acid_steps(acid, request.situation, task.days, "tank:tank"),
        acid_sheet=acid.first,
    )
    return request.counted(found)


def _steps(task: Task, dosed: Dosed, units: Array | None = None) -> tuple[Step, ...]:
    """Every weighing of a plan, by day and material."""
    kg = (dosed.units if units is None else units) * dosed.measures.unit
    found = []
    for place, (j, s) in enumerate(zip(dosed.measures.material, dosed.measures.step, strict=True)):
        if j < 0 or kg[place] <= 0.0:
            continue
        each = task.materials[j]
        weight = round(float(kg[place]), 9)
        brought = {ion: float(mmol) for ion, mmol in zip(IONS, each.ions_mmol_per_kg * weight, strict=True) if mmol}
        at = task.situation.at + timedelta(days=task.days[s])
        found.append(Step(at, each.name, each.formula, weight, f"tank:{task.tank}", brought))
    return tuple(found)


def _before(request: Request, dosed: Dosed) -> dict[object, Array]:
    """Composition of the tank just before the doses of each day, renewal done; today's as the tables show it."""
    litres = _litres(dosed)
    part = litres / request.situation.volumes_l["tank"]
    found: dict[object, Array] = {}
    for each in dosed.checkpoints:
        if each.name.startswith("tank before"):
            first = each.day == dosed.checkpoints[0].day
            now = request.situation.composition("tank") if each.day == 0 else each.now
            renewed = now + part * (refill_of(request) - now) if first and litres else now
            found[request.situation.at + timedelta(days=each.day)] = renewed
    return found


def _renewed_words(request: Request, dosed: Dosed, days: tuple[int, ...]) -> tuple[str, ...]:
    """What a renewal on the first day leaves of each ion, as a sum; nothing without one."""
    litres, volume = _litres(dosed), request.situation.volumes_l["tank"]
    if litres <= 0.0 or days[0] != 0:
        return ()
    rows = zip(IONS, request.situation.composition("tank"), refill_of(request), strict=True)
    return (
        f"renewal: {litres:.0f} of {volume:.0f} L",
        *(
            f"  {ion}: ({now:.2f} now x {volume - litres:.0f} L + {water:.2f} in the water x {litres:.0f} L) / "
            f"{volume:.0f} L = {(now * (volume - litres) + water * litres) / volume:.2f} mmol/L before"
            for ion, now, water in rows
            if ion in MAJOR
        ),
    )


def _litres(dosed: Dosed) -> float:
    return float(dosed.units[-1] * dosed.measures.unit[-1]) if dosed.measures.renews else 0.0


def _verdict(request: Request, dosed: Dosed, after: Outlook) -> tuple[bool, str | None]:
    """Whether the plan reaches what was asked, and what has to be said about it: why not, or that salts alone do
    not."""
    parts = []
    end, goal = dosed.end, request.managed
    litres = _litres(dosed)
    if litres > 0.0:
        over = excess_of(request.situation.composition(request.situation.managed), goal)
        named = ", ".join(f"{ion} by {amount:.1f} mmol/L" for ion, amount in over.items())
        words = f"{named} over what is wanted, and salts only add" if named else "the limits leave them too little room"
        parts.append(f"salts alone cannot do it: {words}; renew {litres:.0f} L, with the weighings listed")
    weak = too_weak(dosed.checkpoints[-1], end)
    reached = not dosed.broken and dosed.missed_pct <= REACHED_PCT and weak is None
    for what, value, limit in dosed.broken[:3]:
        parts.append(f"{what} would be {value:.2f}, limit {limit:.2f}")
    if dosed.missed_pct > REACHED_PCT:
        held = held_by(binding(dosed.checkpoints))
        when = f"not within {request.wishes.days} days: " if request.wishes.days else ""
        shown = after.shares_pct(request.situation.managed)
        parts.append(f"{when}{outside_words(end, shown, goal)} at the end; {held}")
    if weak is not None:
        parts.append(f"EC {weak:.1f} mS/cm at the end, below its band from {goal.ec_least:.3g}; {_why_weak(dosed)}")
    missed = _missed_aims(request, end, goal)
    if missed:
        parts.append(f"with these salts {missed}")
    return reached and not missed, "; ".join(parts) or None


def _why_weak(dosed: Dosed) -> str:
    """What keeps EC below its band, and what would lift it."""
    held = [each.limit for each in binding(dosed.checkpoints) if each.limit.startswith("EC step")]
    return (f"held by {held[0]}; " if held else "") + "feed the tank meanwhile, or plan again after the last weighing"


def _missed_aims(request: Request, end: Array, goal: Goal) -> str:
    """Ions of a named target that are missed by more than ``MISSED_PART`` and more than rounding to the scale
    explains."""
    if not goal.named:
        return ""
    off = [
        f"{ion} is {end[INDEX[ion]]:.2f} where {goal.aim[INDEX[ion]]:.2f} was asked"
        for ion in MAJOR
        if goal.wants[INDEX[ion]]
        and abs(end[INDEX[ion]] - goal.aim[INDEX[ion]])
        > max(MISSED_PART * goal.aim[INDEX[ion]], _step_mmol(request, ion))
    ]
    return ", ".join(off)


def _step_mmol(request: Request, ion: str) -> float:
    """What one scale step of the strongest salt of an ion makes in the tank [mmol/L]."""
    strongest = max((float(each.ions_mmol_per_kg[INDEX[ion]]) for each in request.materials), default=0.0)
    return scales_of(request.situation.site)[0].step_kg * strongest / request.situation.volumes_l["tank"]


def _renewal(request: Request, dosed: Dosed) -> Renewal | None:
    """The renewal of the plan, or advice beside it where Na, Cl or NH4 is over its limit and the water is better."""
    situation, goal = request.situation, request.managed
    litres = _litres(dosed)
    reaches, at = dosed.missed_pct <= REACHED_PCT, situation.at if litres > 0.0 else None
    if litres <= 0.0:
        part = smallest_fraction(dosed.end, refill_of(request), goal)
        over = set(excess_of(dosed.end, goal)) & set(LIMITED)
        if not over or part is None:
            return None
        litres = LITRES * float(np.ceil(part * situation.volumes_l["tank"] / LITRES))
    nitrogen = situation.composition("tank")[INDEX["NO3"]] + situation.composition("tank")[INDEX["NH4"]]
    return renewal_of(
        situation, "tank", litres, refill_of(request), goal, request.year_so_far_kg_n,
        situation.composition(situation.managed), _days_to_drink(situation, float(nitrogen)), reaches,
    )._replace(at=at)  # fmt: skip


def _days_to_drink(situation: Situation, nitrogen: float) -> float | None:
    """Days in which the crop takes the nitrogen of the loop down, at the uptake of its preset."""
    uptake = crop(situation.loop.crop).uptake_at(situation.loop.stage if situation.loop.stage else "").ions
    per_litre = uptake.get("NO3", 0.0) + uptake.get("NH4", 0.0)
    per_day = per_litre * situation.crop_water_l_per_m2_d * situation.loop.area_m2
    held = max(nitrogen - LEFT_N_MMOL, 0.0) * sum(situation.volumes_l.values())
    return held / per_day if per_day > 0 else None


def _runner_up(task: Task, dosed: Dosed, steps: Sequence[Step]) -> RunnerUp | None:
    if dosed.runner_up is None:
        return None
    others = _steps(task, dosed, dosed.runner_up)
    if {each.salt for each in others} == {each.salt for each in steps}:
        return None
    end = dosed.variants["runner-up"]
    more = sum(each.kg for each in others) - sum(each.kg for each in steps)
    left_out = ", ".join(sorted({each.salt for each in steps} - {each.salt for each in others}))
    instead = ", ".join(sorted({each.salt for each in others} - {each.salt for each in steps})) or "nothing"
    words = (
        f"without {left_out}: {instead} instead, {more:+.2f} kg in all; "
        f"{share_words(end)} instead of {share_words(dosed.end)}"
    )
    return RunnerUp(others, words)


def _sensitivity(dosed: Dosed) -> tuple[WhatIf, ...]:
    end = dosed.checkpoints[-1]
    found = []
    for case, composition in dosed.variants.items():
        if case == "runner-up" or (case == "a day late" and end.day == 0):
            continue
        missed = violation(end, composition)
        weak = too_weak(end, composition)
        words = "in the bands" if missed <= REACHED_PCT else points_out(missed)
        if weak is not None:
            words = f"EC {weak:.1f}, below its band" + ("" if missed <= REACHED_PCT else f"; {words}")
        found.append(WhatIf(case, share_pct(composition), float(ec_of(end, composition)), f"{case}: {words}"))
    return tuple(found)
