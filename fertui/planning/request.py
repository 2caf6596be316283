"""What was asked for, checked, with all that answering it takes: loop, goals, salts, model, solver."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from datetime import timedelta
from math import erf, sqrt
from typing import NamedTuple
from zoneinfo import ZoneInfo

import numpy as np

from fertui.catalogue.cautions import Caution, cautions_of, loop_cautions
from fertui.chemistry.conductivity import conductivity
from fertui.chemistry.ions import INDEX, IONS, Array
from fertui.estimate.notices.notice import chance_out
from fertui.estimate.points import Estimated, PointState
from fertui.logbook.entries import Entry
from fertui.planning.acid import unanalysed_words
from fertui.planning.goal import SHARED, Goal, goal_of
from fertui.planning.programme import Solver
from fertui.planning.runs import Runs, Situation
from fertui.planning.shelf import Material, PlanningError, shelf
from fertui.planning.values import Outlook, Plan
from fertui.site.model import Supply

LONGEST_DAYS = 60
STRENGTH = (0.5, 1.5)
"""How far an aim may be made weaker or stronger to stand at the EC the loop is run at."""
CERTAIN = 0.8
UNSURE = 0.35
"""Chance of being out of a band at the horizon from which "in order" is not said flatly: that of the watch list."""
FRESH_DAYS = 3.0
"""Age of an analysis [d] up to which another sample says nothing new (common practice, no source)."""
NAMES = {"tank": "tank", "root_zone": "root zone"}
FILLING = 0.3
"""Part of the aim's EC below which a vessel is being filled, and its aim not scaled down to what is in it."""
STEPS_BY_DEFAULT = 4
MOST_STEPS = 4
LEAST_EC_STEP, MOST_EC_STEP = 0.05, 1.0
"""A smaller step no hand meter sees; a larger one is a shock to roots (common practice, no source)."""


class Wishes(NamedTuple):
    """What the grower asked for: horizon [d], target by name, supplies to use only, to leave out, steps, number of
    salts, most that EC may change in one step of the solution that is dosed [mS/cm]."""

    days: int = 14
    target: str | None = None
    supplies: tuple[str, ...] | None = None
    without: tuple[str, ...] = ()
    steps: int | None = None
    salts: int | None = None
    ec_step: float | None = None

    def checked(self) -> Wishes:
        """Itself; raises ``PlanningError`` for a number no plan can have."""
        if not 0 <= self.days <= LONGEST_DAYS:
            raise PlanningError(f"a plan looks 0 to {LONGEST_DAYS} days ahead, not {self.days}.")
        if self.steps is not None and not 1 <= self.steps <= MOST_STEPS:
            raise PlanningError(f"a plan has 1 to {MOST_STEPS} steps, not {self.steps}.")
        if self.salts is not None and self.salts < 1:
            raise PlanningError(f"a plan needs at least 1 salt, not {self.salts}.")
        if self.ec_step is not None and not LEAST_EC_STEP <= self.ec_step <= MOST_EC_STEP:
            raise PlanningError(
                f"EC may change by {LEAST_EC_STEP:g} to {MOST_EC_STEP:g} mS/cm in a step, not {self.ec_step:g}."
            )
        return self


class Request(NamedTuple):
    """One question to planning and the means to answer it."""

    situation: Situation
    goals: Mapping[str, Goal]
    wishes: Wishes
    materials: tuple[Material, ...]
    runs: Runs
    solver: Solver
    entries: Sequence[Entry]
    before: Mapping[str, PointState]
    guessed: bool = False
    """Whether the loop was read but never analysed: any dose would be a guess. A tank not even read is just filled."""
    year_so_far_kg_n: float = 0.0
    """What the loop has discharged this calendar year [kg N]."""

    @property
    def managed(self) -> Goal:
        """Goal of the point the loop is steered by."""
        return self.goals[self.situation.managed]

    def counted(self, found: Plan) -> Plan:
        """A plan with what it cost, and with a word where nobody knows the water it counts with."""
        water = self.unknown_water
        return found._replace(
            notices=tuple(dict.fromkeys((*water, *found.notices))),
            model_runs=self.runs.count, solver_calls=self.solver.calls,
        )  # fmt: skip

    @property
    def unknown_water(self) -> tuple[str, ...]:
        """What is said of a make-up water that was never analysed; nothing where it is known or none is counted."""
        if self.situation.loop.layout == "known-feed":
            return ()
        return unanalysed_words(self.situation.site, self.situation.loop)

    def empty(self, without: Outlook) -> Plan:
        """A plan that does nothing, with what then comes."""
        situation = self.situation
        return Plan(
            feasible=True, reason=None, loop=situation.loop.name, layout=situation.loop.layout, at=situation.at,
            horizon_days=self.wishes.days, point=situation.managed, recipe=None, steps=(), acid=(), acid_sheet=None,
            renewal=None, before=Outlook(self.before), after=without, after_without=without, binding=(),
            rule_of_thumb=(), cautions=(),
        )  # fmt: skip

    def in_order(self, without: Outlook) -> bool:
        """Whether the managed point is in its bands now and at the horizon without any plan."""
        point = self.situation.managed
        filling = self.before[point].ec.value < FILLING * _ec_of_aim(self.managed)
        return not filling and not any(
            out_of_band(points[point], self.managed) for points in (self.before, without.points)
        )

    def why_in_order(self, without: Outlook) -> str:
        """That nothing need be done; where the ranges are wide, that the middle of the forecast alone says so."""
        state, goal = without.points[self.situation.managed], self.managed
        unsure = []
        for ion, low, high in zip(SHARED, goal.share_low, goal.share_high, strict=True):
            share = state.ions[ion].share_pct if ion in state.ions else None
            if share is not None and chance_out(share, (100 * low, 100 * high)) >= UNSURE:
                unsure.append(f"{ion} share {share.low:.0f}-{share.high:.0f} % of {100 * low:.0f}-{100 * high:.0f} %")
        if not unsure:
            return "the shares stay in their bands and no limit is passed up to the horizon"
        return (
            "the middle of the forecast stays in its bands, but that is not sure: by the horizon "
            f"{', '.join(unsure)}. No dose makes a range narrower: take the next sample early, then plan again"
        )

    def strengthened(self, end: Array) -> Request:
        """The same with its aim at the strength the loop is run at, ``end`` (10,) being the managed point at the
        horizon without a plan.

        A shared tank that nobody feeds grows weak by then: its aim is no weaker than the EC it is set to. An aim named
        for this plan stands as it is, and so does that of a vessel that is only being filled.
        """
        made, sodium = _ec_of_aim(self.managed), 0.1 * float(end[INDEX["Na"]])
        held = float(conductivity(np.maximum(end, 0.0))) - sodium
        shared = self.situation.loop.layout == "shared-tank"
        filled = self.before[self.situation.managed].ec.value if shared else held
        if self.managed.named or made <= 0.0 or filled < FILLING * made:
            return self
        wanted = max(held, self._set_ec(made + sodium) - sodium) if shared else held
        factor = float(np.clip(wanted / made, *STRENGTH))
        point = self.situation.managed
        return self._replace(goals={**self.goals, point: self.goals[point].scaled(factor)})

    def _set_ec(self, aimed: float) -> float:
        """EC a shared tank is run at [mS/cm]: its set point; in a root zone the foot of its band; else ``aimed``."""
        if self.situation.managed != "tank":
            return self.managed.ec_least or aimed
        logged = [
            number
            for each in self.entries
            if each.kind == "setpoint" and each.loop == self.situation.loop.name and each.at <= self.situation.at
            if (number := each.number_of("EC")) is not None
        ]
        return (logged[-1] if logged else self.situation.loop.feed_ec) or aimed


def _ec_of_aim(goal: Goal) -> float:
    """Nutrient EC [mS/cm] of an aim: EC less 0.1 a mmol/L of Na."""
    wanted = np.nan_to_num(goal.aim, nan=0.0)
    return float(conductivity(wanted)) - 0.1 * float(wanted[INDEX["Na"]])


def goals_of(situation: Situation, wishes: Wishes, points: Sequence[str]) -> dict[str, Goal]:
    """The goal at each point, the dosed one first; raises ``SiteError`` for an unknown target."""
    goals = {point: goal_of(situation.site, situation.loop, point, wishes.target) for point in points}
    if wishes.ec_step is not None:
        dosed = goals[points[0]]
        sources = {**dosed.sources, "EC step": "asked for"}
        goals[points[0]] = dosed._replace(ec_step=wishes.ec_step, sources=sources)
    return goals


def materials_of(situation: Situation, wishes: Wishes) -> tuple[Material, ...]:
    """The salts of the shelf that may be weighed; raises ``PlanningError`` where none is left."""
    found = shelf(situation.site.supplies, wishes.supplies, wishes.without)
    salts = tuple(each for each in found if each.use == "nutrient")
    if not salts:
        raise PlanningError(
            "there is no salt on the shelf to plan with; add [[supplies]] or name some with --supplies."
        )
    return salts


def staffed_days(situation: Situation, days: int, steps: int) -> tuple[int, ...]:
    """Days from now on which people are there, at most ``steps`` of them: now, the next one, the rest spread out.

    The last step leaves a quarter of the horizon to act.
    """
    here = situation.at.astimezone(ZoneInfo(situation.site.timezone))
    on = [d for d in range(max(days, 1)) if f"{here + timedelta(days=d):%a}" in situation.site.staffed_days]
    early = [day for day in on if day <= 0.75 * days] or on[:1] or [0]
    if len(early) <= steps:
        return tuple(early)
    if steps == 1:
        return (early[0],)
    places = np.linspace(1, len(early) - 1, steps - 1).round().astype(int)
    return tuple(early[place] for place in dict.fromkeys([0, *places.tolist()]))


def vague(request: Request) -> str | None:
    """Why a sample comes before any plan; None where the ranges serve, or a sample would not narrow them.

    A share known worse than its band makes any dose a guess, unless another share is out of its band for certain, or
    the point was analysed within the last days: then the range is that of sampling itself.
    """
    point, days_old = request.before.get(request.situation.managed), request.situation.analysis_days_old
    fresh = days_old is not None and days_old <= FRESH_DAYS
    if point is None or request.wishes.days == 0 or request.managed.named or fresh:
        return None
    if request.guessed:
        also = ", nor its water" if request.unknown_water else ""
        name = NAMES[request.situation.managed]
        return f"take a sample first: the {name} was never analysed{also}; any dose would be a guess"
    wide = None
    for ion, low, high in zip(SHARED, request.managed.share_low, request.managed.share_high, strict=True):
        state = point.ions[ion].share_pct if ion in point.ions else None
        if state is None or not 0.0 < high - low < 1.0:
            continue
        if _out_for_certain(state, 100 * low, 100 * high):
            return None
        if wide is None and state.high - state.low > 100 * (high - low):
            wide = (
                f"take a sample first: the {ion} share is known to {state.low:.0f}-{state.high:.0f} %, a range wider "
                f"than its band of {100 * low:.0f}-{100 * high:.0f} %; any dose would be a guess"
            )
    return wide


def _out_for_certain(state: Estimated, low: float, high: float) -> bool:
    """Whether a value lies out of its band with a probability of 0.8 or more, its 80 % range taken as that of a
    normal."""
    spread = max((state.high - state.low) / 2.56, 1e-9)
    inside = erf((high - state.value) / spread / sqrt(2.0)) - erf((low - state.value) / spread / sqrt(2.0))
    return 1.0 - 0.5 * inside >= CERTAIN


def cautions_for(used: Sequence[Supply]) -> tuple[Caution, ...]:
    """Cautions of what is weighed or poured, then those of every loop that is dosed; none twice."""
    return tuple(dict.fromkeys((*cautions_of(used), *loop_cautions()))) if used else ()


def out_of_band(state: PointState, goal: Goal) -> bool:
    """Whether a share of a point is out of its band, or an ion over its limit."""
    composition = np.array([state.ions[ion].mmol_l.value if ion in state.ions else 0.0 for ion in IONS])
    shares = [state.ions[ion].share_pct for ion in SHARED if ion in state.ions]
    out = any(
        each is not None and not low - 1e-9 <= each.value / 100 <= high + 1e-9
        for each, low, high in zip(shares, goal.share_low, goal.share_high, strict=False)
    )
    return out or bool((composition > goal.most + 1e-9).any())
