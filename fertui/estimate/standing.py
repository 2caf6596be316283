"""Where one loop stands at a time: the members, what was learned, and everything that is shown or asked of it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from datetime import datetime
from functools import cached_property
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from fertui.chemistry.ions import IONS, Array
from fertui.estimate.beginning import Beginning
from fertui.estimate.display import (
    Acidity,
    Course,
    Panel,
    allowed,
    managed,
    micronutrients_at,
    same_solution,
    shown_members,
)
from fertui.estimate.drives import Drives
from fertui.estimate.ensemble import Ensemble
from fertui.estimate.points import Estimated, IonState, PointState
from fertui.estimate.ranges import Spread, estimated
from fertui.estimate.record import Record
from fertui.estimate.setting import Setting
from fertui.estimate.waters import lately
from fertui.loop.account import Booking
from fertui.site.model import Loop, Site

if TYPE_CHECKING:
    from fertui.estimate.assimilation import Assimilation


class Surprise(NamedTuple):
    """An observation that was used but far from what was expected; of a reading: set aside as a meter fault."""

    entry: int | None
    at: datetime
    point: str
    ions: tuple[str, ...]
    text: str


class HeldBack(NamedTuple):
    """An analysis that failed its own charge or EC check: not used, to be asked about."""

    entry: int | None
    at: datetime
    point: str
    why: str


class TrailDay(NamedTuple):
    """What was known at one time."""

    at: datetime
    points: Mapping[str, PointState]


class PointAt(NamedTuple):
    """One point at one time."""

    at: datetime
    state: PointState


@dataclass(frozen=True)
class Estimate:
    """Where one loop is at a time, with everything a forecast, a plan, an account or a notice needs.

    ``times`` [d from ``record.zero``] of the trail, with ``ensembles`` at each; ``lines`` and ``held_mmol`` (spans + 1,
    10) are the account: ensemble means of what moved, and of what the solution held at every time of ``drives.grid``.
    """

    site: Site
    loop: Loop
    at: datetime
    seed: int
    record: Record
    setting: Setting
    drives: Drives
    ensemble: Ensemble
    spread: Spread
    begin: Beginning
    analyses: int
    surprises: tuple[Surprise, ...]
    held_back: tuple[HeldBack, ...]
    times: tuple[float, ...] = field(repr=False)
    path: Mapping[str, Array] = field(repr=False)
    path_ec: Array = field(repr=False)
    lines: tuple[Booking, ...] = field(repr=False)
    held_mmol: Array = field(repr=False)
    run: Assimilation | None = field(default=None, repr=False, compare=False)

    @property
    def members(self) -> int:
        """Number of members."""
        return self.ensemble.members

    @property
    def since(self) -> datetime:
        """From when the estimate runs."""
        return self.record.moment(self.begin.time)

    @property
    def managed(self) -> str:
        """The point the loop is managed by."""
        return managed(self.loop)

    @property
    def assumed(self) -> tuple[str, ...]:
        """What the record did not say and what was taken instead."""
        shared = shared_store(self.site, self.loop)
        return (*self.record.assumed, *self.setting.assumed, *shared, *self.drives.assumed, *begun_from(self))

    @property
    def unanalysed_water(self) -> str | None:
        """Name of the water that tops up the loop, where nobody has said what it holds; None where it is known."""
        unknown = self.loop.layout != "known-feed" and np.isnan(self.record.make_up_as_said(self.record.end)).any()
        return (self.record.sources.at(self.record.end) or self.loop.water or "make-up") if unknown else None

    @property
    def last_analysis(self) -> Mapping[str, datetime]:
        """Time of the last analysis that was used, by point."""
        used = [each for each in self.record.observations if each.is_analysis and not each.doubtful]
        held = {each.at for each in self.held_back}
        return {each.point: each.at for each in used if each.at not in held}

    @property
    def ec_factor(self) -> Estimated:
        """EC the meters of this loop show over EC of the ions."""
        return estimated(np.exp(self.ensemble.ec))

    @property
    def multipliers(self) -> Mapping[str, Estimated]:
        """Uptake of every ion over the preset's: trades off against water and volume, no plant physiology."""
        return {ion: estimated(self.ensemble.multiplier[:, place]) for place, ion in enumerate(IONS[:-1])}

    @property
    def crop_water(self) -> Estimated:
        """Crop water of the last seven days [L/m2/d]."""
        mean = float(lately(self.record, self.setting, 7).crop.mean()) / self.loop.area_m2
        return estimated(mean * np.exp(self.ensemble.drain * 0.5))

    @property
    def volumes_l(self) -> Mapping[str, float]:
        """Litres held now, by vessel."""
        store, root = self.ensemble.state.water_l.mean(axis=0)
        if self.setting.circuit.mixed:
            return {"tank": float(root)}
        names = {"shared-tank": "tank", "drain-blend": "drain_store"}
        found = {"root_zone": float(root)}
        return {names[self.loop.layout]: float(store), **found} if self.loop.layout in names else found

    def points(self) -> Mapping[str, PointState]:
        """Every point of the layout as it is now."""
        return self._now

    @cached_property
    def _now(self) -> Mapping[str, PointState]:
        found = {}
        for point in self.path:
            bands, end = allowed(self.site, self.loop, point), self.times[-1]
            state = self.course(point, 1)[0].state
            where = same_solution(self.setting, point)
            micronutrients = micronutrients_at(self.record.observations, where, end, bands)
            found[point] = state._replace(
                ions={**state.ions, **{name: IonState(each) for name, each in micronutrients.items()}}
            )
        return found

    def course(self, point: str, last: int | None = None) -> tuple[PointAt, ...]:
        """One point once a local day, the ``last`` so many (all: None), and now; without micronutrients."""
        which = slice(0 if last is None else max(len(self.times) - last, 0), None)
        where, bands = same_solution(self.setting, point), allowed(self.site, self.loop, point)
        acidity, panel = Acidity(self.record.observations, where), Panel(self._quantiles(where, which), bands)
        return tuple(
            PointAt(self.record.moment(time), panel.state(place, acidity.at(time, bands.get("pH"))))
            for place, time in enumerate(self.times[which])
        )

    def _quantiles(self, point: str, which: slice) -> Course:
        return Course(shown_members(self.path[point][which], self.spread), self.path_ec[which])

    @cached_property
    def trail(self) -> tuple[TrailDay, ...]:
        """Every point once a local day since the estimate began, and now."""
        by_point = {point: self.course(point) for point in self.path}
        moments = [self.record.moment(time) for time in self.times]
        return tuple(
            TrailDay(at, {point: course[place].state for point, course in by_point.items()})
            for place, at in enumerate(moments)
        )


def thin(estimate: Estimate, members: int) -> Estimate:
    """The same estimate with fewer members, evenly chosen; one member stands in the middle."""
    if members >= estimate.members:
        return estimate
    if members == 1:
        return copies(estimate, 1)
    chosen = np.linspace(0, estimate.members - 1, members).round().astype(int)
    return replace(estimate, ensemble=estimate.ensemble.chosen(chosen))


def copies(estimate: Estimate, members: int) -> Estimate:
    """The middle of the ensemble so many times: what a planner perturbs."""
    return replace(estimate, ensemble=estimate.ensemble.middle(estimate.setting).chosen(np.zeros(members, dtype=int)))


def begun_from(estimate: Estimate) -> tuple[str, ...]:
    """What was taken for the start where no analysis stands behind it."""
    if estimate.begin.analysis is not None:
        return ()
    start = "its source water" if estimate.loop.layout == "shared-tank" else "its feed"
    return (f"no analysis to begin with: the loop begins as {start}",)


def shared_store(site: Site, loop: Loop) -> tuple[str, ...]:
    """That a drain store which several loops name is followed for each of them by itself."""
    others = [each.name for each in site.loops if each.name != loop.name and each.drain_store == loop.drain_store]
    if not loop.drain_store or not others:
        return ()
    return (f"{loop.drain_store} is shared with {', '.join(others)}: every loop is followed by itself",)
