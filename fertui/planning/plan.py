"""The plan of a loop: hand doses for a shared tank, the next recipe for a loop fed through stock tanks."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence

import numpy as np

from fertui.chemistry.ions import IONS
from fertui.estimate.assimilation import Estimate
from fertui.logbook.entries import Entry
from fertui.planning.acid_steps import usual_acid
from fertui.planning.hand_plan import hand_plan
from fertui.planning.programme import Solver
from fertui.planning.recipe_plan import recipe_plan
from fertui.planning.renewal import year_kg_n
from fertui.planning.request import Request, Wishes, goals_of, materials_of
from fertui.planning.runs import ModelRuns, Runs, Situation, StillRuns
from fertui.planning.shelf import PlanningError
from fertui.planning.values import Plan


def plan(
    estimate: Estimate,
    *,
    days: int = 14,
    target: str | None = None,
    supplies: Iterable[str] | None = None,
    without: Iterable[str] = (),
    steps: int | None = None,
    salts: int | None = None,
    ec_step: float | None = None,
    entries: Sequence[Entry] = (),
    progress: Callable[[float], None] | None = None,
) -> Plan:
    """What brings the ions of a loop back within ``days``; what cannot be done is a plan with its reason.

    ``days`` 0: one step into the dosed tank, as it stands right after mixing: no uptake, exchange or EC step.
    ``target``: a target of the site or of the catalogue instead of the loop's own. ``supplies``: use these alone;
    ``without``: leave these out; ``steps`` 1-4 weighing days; ``salts``: at most so many;
    ``ec_step``: most that EC may change in one step of the tank or the feed [mS/cm]. ``entries``: effective entries,
    for what the year has discharged; ``progress`` hears what part of the work is done.

    Raises ``PlanningError``, ``SiteError`` or ``CatalogueError`` for what
    cannot be asked.
    """
    only = None if supplies is None else tuple(supplies)
    wishes = Wishes(days, target, only, tuple(without), steps, salts, ec_step).checked()
    situation = situation_of(estimate, entries)
    runs: Runs = (
        StillRuns(situation, "tank") if days == 0 else ModelRuns(estimate, days, situation.usual_acid_mmol_d, progress)
    )
    if situation.loop.layout != "shared-tank" and days == 0:
        raise PlanningError(
            f"loop {situation.loop.name} is fed through stock tanks: there is no tank to dose by hand; "
            "ask for 1 day or more."
        )
    points = ("tank", situation.managed) if situation.loop.layout == "shared-tank" else ("feed", situation.managed)
    request = Request(
        situation, goals_of(situation, wishes, tuple(dict.fromkeys(points))), wishes, materials_of(situation, wishes),
        runs, Solver(), entries, situation.points, year_kg_n(estimate, entries),
    )  # fmt: skip
    if situation.loop.layout == "shared-tank":
        return hand_plan(request)
    return recipe_plan(request, estimate)


def situation_of(estimate: Estimate, entries: Sequence[Entry] = ()) -> Situation:
    """The loop of an estimate as planning sees it; acid by habit belongs to a tank dosed by hand."""
    last = estimate.last_analysis.get(estimate.managed)
    age = None if last is None else (estimate.at - last).total_seconds() / 86400.0
    return Situation(
        estimate.site, estimate.loop, estimate.at, estimate.managed, estimate.points(), estimate.volumes_l,
        estimate.crop_water.value, age,
        usual_acid(estimate, entries) if estimate.loop.layout == "shared-tank" else np.zeros(len(IONS)),
    )  # fmt: skip
