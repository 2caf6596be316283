"""The plan for a loop fed through stock tanks, from the request to what is shown."""

from __future__ import annotations

from datetime import timedelta

import numpy as np

from fertui.catalogue.acids import acid as named_acid
from fertui.chemistry.conductivity import conductivity
from fertui.chemistry.ions import INDEX, IONS, Array, vector
from fertui.estimate.assimilation import Estimate
from fertui.estimate.drives import stock_proportions
from fertui.planning.acid import LEAVE_MEQ_PER_L, PH_START, PH_TARGET, demanded, first_acid, source_water
from fertui.planning.checkpoints import ec_of, violation
from fertui.planning.goal import LIMITED
from fertui.planning.hand_doses import REACHED_PCT
from fertui.planning.reasons import (
    MAJOR,
    binding,
    held_by,
    outside_words,
    over_limit_words,
    points_out,
    rule_of_thumb,
    share_words,
)
from fertui.planning.recipe_change import Recipe, change, feeds, usable_in_stock
from fertui.planning.recipe_programme import step_limits
from fertui.planning.recipe_task import RecipeTask
from fertui.planning.renewal import excess_of, renewal_of, smallest_fraction
from fertui.planning.request import Request, cautions_for, vague
from fertui.planning.runs import Doing, share_pct
from fertui.planning.stock import StockSheet, stock_sheet
from fertui.planning.values import Outlook, Plan, RecipeChange, RecipeStage, Renewal, RunnerUp, WhatIf
from fertui.site.model import Composition, Supply
from fertui.site.presets import target_of

LITRES = 10.0
GAINED_PCT = 0.3
"""Points of share a recipe must gain on doing nothing to be worth changing."""
TOLD_MMOL_L = 0.05
"""Difference of an ion between two recipes that is worth a word: the last digit a grower reads."""
SECOND_STAGE_AFTER = 7
"""Days after which a recipe may be changed again: practice waits 7-10 (Nutrient Solutions for Greenhouse Crops
2016)."""


def recipe_plan(request: Request, estimate: Estimate) -> Plan:
    """The next recipe; none and the reason where a sample comes first or no mix of the salts can do it."""
    empty = request.empty(Outlook(request.runs.shown(Doing())))
    why = vague(request)
    if why is not None:
        return request.counted(empty._replace(feasible=False, reason=why, sample_first=True))
    course = request.runs.settled(Doing(), 1)
    request = request.strengthened(course.ions[request.situation.managed][-1, 0])
    if not request.managed.named and request.in_order(empty.after_without):
        words = f"no change: {request.why_in_order(empty.after_without)}"
        return request.counted(empty._replace(notices=(words,)))
    task = _task(request, estimate)
    recipe = change(task, request.runs, request.solver, course, lambda feed: _sheet(request, feed))
    if recipe is None:
        reason = "no mix of these salts keeps EC, NH4 and solubility within their limits"
        return request.counted(empty._replace(feasible=False, reason=reason))
    return _shown(request, task, recipe, empty)


def running_recipe(estimate: Estimate, water: Array) -> Array:
    """The feed that runs now (10,) [mmol/L]: the last known feed, the recipe logged, or what the stocks and the water
    carry."""
    record = estimate.record
    if estimate.loop.layout == "known-feed" and record.feed:
        return np.asarray(record.feed[-1][1], dtype=float)
    carried = np.asarray(stock_proportions(record, record.end), dtype=float)
    batches_alone = record.recipes.at(record.end) is None and any(record.stock_held.values())
    return carried + water if batches_alone else carried


def _task(request: Request, estimate: Estimate) -> RecipeTask:
    own = _own(request)
    running = np.maximum(running_recipe(estimate, own), own)
    if estimate.loop.layout == "drain-blend":
        running = _at_set_point(running, own, estimate.loop.feed_ec)
    running[INDEX["HCO3"]] = own[INDEX["HCO3"]]
    stages = 2 if (request.wishes.steps or 1) > 1 and request.wishes.days > SECOND_STAGE_AFTER else 1
    days = (0, SECOND_STAGE_AFTER)[:stages]
    situation, materials = request.situation, request.materials
    return RecipeTask(situation, request.goals, materials, running, own, request.wishes.days, days)


def _at_set_point(running: Array, own: Array, ec: float | None) -> Array:
    """A recipe whose stock part is thinned or thickened until its EC is the set point, as the injector does.

    Bisection on the strength of the stock between none and twice.
    """
    if ec is None or float(conductivity(np.maximum(own, 0.0))) >= ec:
        return running
    weak, strong = 0.0, 2.0
    for _ in range(30):
        middle = 0.5 * (weak + strong)
        made = float(conductivity(np.maximum(own + middle * (running - own), 0.0)))
        weak, strong = (middle, strong) if made < ec else (weak, middle)
    return own + 0.5 * (weak + strong) * (running - own)


def _own(request: Request) -> Array:
    """What the feed has before any salt (10,) [mmol/L]: the make-up water and the acid that takes its alkalinity."""
    situation = request.situation
    water = source_water(situation.site, situation.loop) or Composition()
    own = vector(dict(water.ions))
    acid = _stock_acid(request)
    if acid is not None:
        found = named_acid(acid.kind)
        mmol = demanded(found, water, LEAVE_MEQ_PER_L, PH_TARGET, water.ph or PH_START).to_leave
        for ion, moles in found.gives.items():
            own[INDEX[ion]] += mmol * moles
    return own


def _shown(request: Request, task: RecipeTask, recipe: Recipe, empty: Plan) -> Plan:
    sheet = recipe.sheet
    first = recipe.stages[0]
    changed = _change_pct(task.running, first)
    after = Outlook(request.runs.shown(feeds(task, recipe.stages[None]).alone()))
    feasible, why, notice = _verdict(request, task, recipe, after)
    used = _used(request, sheet)
    found = empty._replace(
        feasible=feasible,
        reason=why,
        recipe=RecipeChange(
            _named(first), changed, float(conductivity(np.maximum(first, 0.0))),
            tuple(_stage(request, task, recipe, s) for s in range(len(recipe.stages))), sheet,
        ),
        renewal=_renewal(request, recipe),
        after=after,
        binding=(*binding(recipe.checkpoints), *step_limits(task, recipe.stages[0])),
        rule_of_thumb=rule_of_thumb(request.situation.composition(request.situation.managed), request.managed, changed),
        cautions=cautions_for(used),
        reasons=_reasons(task, recipe),
        arithmetic=(*_arithmetic(request, task, recipe), *sheet.arithmetic),
        runner_up=_runner_up(recipe),
        sensitivity=_sensitivity(recipe),
        notices=(*notice, *_acid_once(request), *over_limit_words(recipe.end, request.managed), *sheet.notices),
    )  # fmt: skip
    return request.counted(found)


def _acid_once(request: Request) -> tuple[str, ...]:
    """The tanks of a plan hold the acid that the acid sheet would pour into the make-up water."""
    acid = _stock_acid(request)
    if acid is None:
        return ()
    return (f"the {acid.name} in these tanks is all that the make-up water takes: leave out that of the acid sheet",)


def _named(composition: Array) -> dict[str, float]:
    return {ion: float(value) for ion, value in zip(IONS, composition, strict=True)}


def _change_pct(running: Array, recipe: Array) -> dict[str, float]:
    """Change of every ion that a recipe sets [% of the running one]; Na, Cl and HCO3 come with water, acid and lots."""
    return {
        ion: float(100.0 * (new / old - 1.0))
        for ion, old, new in zip(IONS, running, recipe, strict=True)
        if old > 0.05 and ion not in ("HCO3", "Na", "Cl")
    }


def _stage(request: Request, task: RecipeTask, recipe: Recipe, s: int) -> RecipeStage:
    ions = recipe.stages[s]
    return RecipeStage(
        request.situation.at + timedelta(days=task.days[s]), _named(ions), float(conductivity(np.maximum(ions, 0.0)))
    )


def _sheet(request: Request, ions: Array) -> StockSheet:
    """Stock tanks that carry a feed (10,) [mmol/L], micronutrients as the target has them."""
    site, loop = request.situation.site, request.situation.loop
    feed = target_of(site, loop, request.wishes.target).get("feed", Composition()).micronutrients
    acid = _stock_acid(request)
    return stock_sheet(
        site, loop, recipe=Composition(_named(ions), feed),
        water=source_water(site, loop) or Composition(), acid=acid, supplies=request.wishes.supplies,
        without=request.wishes.without, solver=request.solver,
    )  # fmt: skip


def _stock_acid(request: Request) -> Supply | None:
    """The acid fixed in the stock: where one is on the shelf and the make-up has more alkalinity than is to be left."""
    site, loop = request.situation.site, request.situation.loop
    alkalinity = (source_water(site, loop) or Composition()).ions.get("HCO3", 0.0)
    if alkalinity <= LEAVE_MEQ_PER_L:
        return None
    return first_acid(site)


def _used(request: Request, sheet: StockSheet) -> list[Supply]:
    names = {line.salt for tank in sheet.tanks for line in tank.salts}
    return [each for each in request.situation.site.supplies if each.name in names]


def _verdict(
    request: Request, task: RecipeTask, recipe: Recipe, after: Outlook
) -> tuple[bool, str | None, tuple[str, ...]]:
    """Whether the recipe serves, why not, and when it will have served.

    It serves where it reaches the bands, or moves towards them as fast as the steps of a recipe allow.
    """
    broken = [f"{what} would be {value:.2f}, limit {limit:.2f}" for what, value, limit in recipe.broken[:3]]
    if broken:
        return False, "; ".join(broken), ()
    if recipe.missed_pct <= REACHED_PCT:
        return True, None, ()
    end = recipe.checkpoints[-1]
    gained = violation(end, end.base) - recipe.missed_pct
    held = held_by((*binding(recipe.checkpoints), *step_limits(task, recipe.stages[0])))
    days = request.wishes.days
    outside = outside_words(recipe.end, after.shares_pct(request.situation.managed), request.managed)
    words = f"{outside} after {days} days; {held}"
    if gained < GAINED_PCT:
        return False, words, ()
    return (
        True,
        None,
        (f"the bands are not reached within {days} days: {words}; go on from there after the next analysis",),
    )


def _renewal(request: Request, recipe: Recipe) -> Renewal | None:
    """The least drain to let go for what no recipe takes out; None where nothing is in excess, or the water is no
    better."""
    end, situation = recipe.end, request.situation
    over = {ion for ion in excess_of(end, request.managed) if ion in LIMITED}
    if not over:
        return None
    water = source_water(situation.site, situation.loop) or Composition()
    refill = np.maximum(recipe.stages[0], vector(dict(water.ions)))
    fraction = smallest_fraction(end, refill, request.managed)
    if fraction is None:
        return None
    litres = LITRES * np.ceil(fraction * sum(situation.volumes_l.values()) / LITRES)
    return renewal_of(
        situation, situation.managed, float(litres), refill, request.managed, request.year_so_far_kg_n, end, None, True
    )


def _reasons(task: RecipeTask, recipe: Recipe) -> tuple[str, ...]:
    """What moves in the feed and what it is for."""
    lines = []
    for ion, old, new in zip(IONS, task.running, recipe.stages[0], strict=True):
        if ion != "HCO3" and abs(new - old) > 0.02 * max(old, 0.5):
            lines.append(f"{ion}: {old:.2f} -> {new:.2f} mmol/L in the feed ({new - old:+.2f})")
    if not lines:
        lines = ["the running recipe already does what can be done"]
    left_out = {each.name for each in task.materials} - {each.name for each in usable_in_stock(task)}
    return (
        *lines,
        *(f"not {name}: brings an ion already over its limit in the root zone" for name in sorted(left_out)),
    )


def _arithmetic(request: Request, task: RecipeTask, recipe: Recipe) -> tuple[str, ...]:
    """What the root zone is short of, per m2, and what the change of the feed brings over the horizon."""
    situation, days = request.situation, request.wishes.days
    litres = situation.volumes_l.get("root_zone", 0.0) / situation.loop.area_m2
    now, aim = situation.composition(situation.managed), request.managed.aim
    lines = []
    for ion in MAJOR:
        i = INDEX[ion]
        if request.managed.wants[i] and abs(aim[i] - now[i]) > 0.1:
            lines.append(
                f"{ion}: ({aim[i]:.2f} aim - {now[i]:.2f} now) x {litres:.1f} L/m2 = "
                f"{(aim[i] - now[i]) * litres:+.1f} mmol/m2; "
                f"feed {recipe.stages[0][i] - task.running[i]:+.2f} mmol/L for {days} days: "
                f"{now[i]:.2f} -> {recipe.end[i]:.2f} mmol/L by the model (uptake, drain and exchange counted)"
            )
    return tuple(lines)


def _sensitivity(recipe: Recipe) -> tuple[WhatIf, ...]:
    end = recipe.checkpoints[-1]
    found = []
    for case, composition in recipe.variants.items():
        missed = violation(end, composition)
        words = "in the bands" if missed <= REACHED_PCT else points_out(missed)
        found.append(WhatIf(case, share_pct(composition), float(ec_of(end, composition)), f"{case}: {words}"))
    return tuple(found)


def _runner_up(recipe: Recipe) -> RunnerUp | None:
    """The next best recipe in words: what its feed has of each ion instead, and what comes of it."""
    second = recipe.runner_up
    if second is None:
        return None
    moved = [
        f"{ion} {other:.2f} instead of {best:.2f}"
        for ion, best, other in zip(IONS, recipe.stages[0], second.stages[0], strict=True)
        if ion != "HCO3" and abs(other - best) >= TOLD_MMOL_L
    ]
    if not moved:
        return RunnerUp((), f"without {second.without}: the other salts make the same feed")
    shares = f"{share_words(second.end)} instead of {share_words(recipe.end)}"
    missed = violation(recipe.checkpoints[-1], second.end) - recipe.missed_pct
    further = f", {missed:.1f} % of K + Ca + Mg further from the bands" if missed > GAINED_PCT else ""
    return RunnerUp((), f"without {second.without}: {', '.join(moved)} mmol/L in the feed; {shares}{further}")
