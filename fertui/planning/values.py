"""What planning answers with: the plan and its parts. Immutable; numbers are canonical, texts are ready to be shown."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import datetime
from typing import NamedTuple

from fertui.catalogue.cautions import Caution
from fertui.estimate.points import PointState
from fertui.planning.acid import AcidSheet
from fertui.planning.stock import StockSheet


class Step(NamedTuple):
    """One weighing of a plan: ``kg`` of a salt into ``target`` ("tank:NAME"); ``adds_mmol`` is what it brings
    [mmol]."""

    at: datetime
    salt: str
    formula: str
    kg: float
    target: str
    adds_mmol: Mapping[str, float]


class AcidStep(NamedTuple):
    """One split of acid [L] with its wait [min], the pH to retest for and the pH at which everything stops."""

    at: datetime
    acid: str
    strength_pct: float
    density_kg_per_l: float
    litres: float
    target: str
    wait_min: float
    retest_ph: float
    stop_ph: float


class RecipeStage(NamedTuple):
    """A recipe of the coming feed [mmol/L], from ``at`` until the next stage."""

    at: datetime
    ions_mmol_l: Mapping[str, float]
    ec: float


class RecipeChange(NamedTuple):
    """The next recipe, how far it departs from the running one [%], its stages and the stock tanks that carry it."""

    ions_mmol_l: Mapping[str, float]
    change_pct: Mapping[str, float]
    ec: float
    stages: tuple[RecipeStage, ...]
    sheet: StockSheet | None


class RenewalOption(NamedTuple):
    """One way to renew: litres let go, kg N and P lost with them, what the year comes to [kg/ha], whether it reaches
    the band."""

    name: str
    litres: float
    kg_n: float
    kg_p: float
    year_kg_n: float
    year_kg_n_per_ha: float
    budget_kg_n_per_ha: float | None
    reaches_band: bool
    text: str


class Renewal(NamedTuple):
    """The smallest bleed-and-refill that brings the point back, beside the other options; ``excess`` [mmol/L] over
    target."""

    litres: float
    refill: Mapping[str, float]
    kg_n: float
    kg_p: float
    year_kg_n: float
    excess: Mapping[str, float]
    options: tuple[RenewalOption, ...]
    at: datetime | None = None
    """When a plan renews: before anything it weighs in at that time; None where it is advice beside a plan."""


class Binding(NamedTuple):
    """A limit that decides: its value, how far the plan comes, and the room left, all in ``unit``."""

    limit: str
    value: float
    unit: str
    reached: float
    source: str = ""


class WhatIf(NamedTuple):
    """A plan carried out otherwise (half done, a day late, 10 % off): the managed point at the horizon."""

    case: str
    shares_pct: Mapping[str, float]
    ec: float
    text: str


class RunnerUp(NamedTuple):
    """The next best plan with another set of salts, and what it costs."""

    steps: tuple[Step, ...]
    difference: str


class Outlook(NamedTuple):
    """The points of the loop at one time."""

    points: Mapping[str, PointState]

    def shares_pct(self, point: str) -> Mapping[str, float]:
        """Share [%] of K, Ca and Mg at a point, as it is shown."""
        ions = self.points[point].ions
        return {ion: state.share_pct.value for ion, state in ions.items() if state.share_pct is not None}


class Plan(NamedTuple):
    """What to do, why, what comes of it.

    ``model_runs`` and ``solver_calls`` count what the plan cost. ``reasons`` say why this salt and not that one,
    ``arithmetic`` is every step of the sum for a pocket calculator. ``sample_first`` is True where the range is wider
    than the band.
    """

    feasible: bool
    reason: str | None
    loop: str
    layout: str
    at: datetime
    horizon_days: int
    point: str
    recipe: RecipeChange | None
    steps: tuple[Step, ...]
    acid: tuple[AcidStep, ...]
    acid_sheet: AcidSheet | None
    renewal: Renewal | None
    before: Outlook
    after: Outlook
    after_without: Outlook
    binding: tuple[Binding, ...]
    rule_of_thumb: tuple[str, ...]
    cautions: tuple[Caution, ...]
    reasons: tuple[str, ...] = ()
    arithmetic: tuple[str, ...] = ()
    runner_up: RunnerUp | None = None
    sensitivity: tuple[WhatIf, ...] = ()
    sample_first: bool = False
    notices: tuple[str, ...] = ()
    model_runs: int = 0
    solver_calls: int = 0
