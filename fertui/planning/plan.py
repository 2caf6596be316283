"""The plan of a loop: hand doses for a shared tank, the next recipe for a loop fed through stock tanks."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence

import numpy as np

from fertui.chemistry.ions import IONS
from fertui.estimate.assimilation import Estimate, assimilate
from fertui.logbook.entries import Entry
from fertui.planning.acid_steps import usual_acid
from fertui.planning.hand_plan import hand_plan
from fertui.planning.programme import Solver
from fertui.planning.recipe_plan import recipe_plan
from fertui.planning.renewal import year_kg_n
from fertui.planning.request import Request, Wishes, goals_of, materials_of
from fertui.planning.runs import Doing, ModelRuns, Runs, Situation, StillRuns
from fertui.planning.shelf import PlanningError
from fertui.planning.values import Outlook, Plan
from fertui.site.model import Composition, Water

NO_CROP_STANDS = (
    "no crop stands in this loop, so nothing is taken up and nothing is planned; log the next one first: crop "
    "event=planted"
)


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
    known_site, estimate = estimate.site, just_filled(estimate, entries)
    situation = situation_of(estimate, entries)._replace(site=known_site)
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
        runs, Solver(), entries, situation.points, not estimate.analyses and bool(estimate.record.observations),
        year_kg_n(estimate, entries),
    )  # fmt: skip
    if estimate.record.bare_since is not None:
        nothing = request.empty(Outlook(runs.shown(Doing())))
        return request.counted(nothing._replace(feasible=False, reason=NO_CROP_STANDS))
    if situation.loop.layout == "shared-tank":
        return hand_plan(request)
    return recipe_plan(request, estimate)


def just_filled(estimate: Estimate, entries: Sequence[Entry]) -> Estimate:
    """A tank that nothing was ever measured in, as filled with water without ions; any other estimate as it is.

    So a new site plans its first filling. The plan says that nobody knows the water.
    """
    name = estimate.unanalysed_water
    if name is None or estimate.loop.layout != "shared-tank" or estimate.record.observations:
        return estimate
    pure = Water(name, Composition(dict.fromkeys(IONS, 0.0), source="taken as none"))
    others = tuple(each for each in estimate.site.waters if each.name.lower() != name.lower())
    loop = estimate.loop._replace(water=name)
    site = estimate.site._replace(waters=(pure, *others))
    return assimilate(site, loop, entries, estimate.at, estimate.members, estimate.seed)


def situation_of(estimate: Estimate, entries: Sequence[Entry] = ()) -> Situation:
    """The loop of an estimate as planning sees it; acid by habit belongs to a tank dosed by hand."""
    last = estimate.last_analysis.get(estimate.managed)
    age = None if last is None else (estimate.at - last).total_seconds() / 86400.0
    return Situation(
        estimate.site, estimate.loop, estimate.at, estimate.managed, estimate.points(), estimate.volumes_l,
        estimate.crop_water.value, age,
        usual_acid(estimate, entries) if estimate.loop.layout == "shared-tank" else np.zeros(len(IONS)),
    )  # fmt: skip
