"""Runs of the full model, counted: the ensemble for what is shown, stacked mean members for responses and checks."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from datetime import datetime, timedelta
from typing import TYPE_CHECKING, NamedTuple, Protocol

import numpy as np

from fertui.chemistry.conductivity import conductivity
from fertui.chemistry.ions import CHARGE, INDEX, IONS, Array
from fertui.estimate.assimilation import Estimate
from fertui.estimate.points import Estimated, IonState, PointState
from fertui.planning.goal import SHARED
from fertui.site.model import Loop, Site

if TYPE_CHECKING:
    from fertui.estimate.forecast import Scenario

MOST_RUNS = 12
"""A plan takes no more runs of the model than this; most take fewer."""
JUST_AFTER = timedelta(minutes=1)
"""A dose is given just after a full day from now, so that the day's composition is the one before it."""


class Addition(NamedTuple):
    """What goes into the dosed tank on one day [mmol], shape (10,) or (members, 10)."""

    day: float
    mmol: Array


class Exchange(NamedTuple):
    """Litres let go and refilled on one day, a number or (members,), with what the refill carries (10,) [mmol/L]."""

    day: float
    litres: float | Array
    refill: Array


class Feed(NamedTuple):
    """The feed from one day on: ions (10,) or (members, 10) [mmol/L]."""

    day: float
    ions: Array


class Doing(NamedTuple):
    """What a plan does: additions to the tank, renewals, feeds."""

    additions: tuple[Addition, ...] = ()
    renewals: tuple[Exchange, ...] = ()
    feeds: tuple[Feed, ...] = ()

    def alone(self) -> Doing:
        """What the first of plans side by side does, without the member axis."""
        return Doing(
            tuple(Addition(each.day, each.mmol[0]) for each in self.additions),
            tuple(Exchange(each.day, float(np.ravel(each.litres)[0]), each.refill) for each in self.renewals),
            tuple(Feed(each.day, each.ions[0]) for each in self.feeds),
        )


class Course(NamedTuple):
    """Compositions by point, (days + 1, members, 10) [mmol/L], and litres by point (days + 1, members); day 0 is
    now."""

    ions: Mapping[str, Array]
    volumes_l: Mapping[str, Array]


class Runs(Protocol):
    """The model as planning uses it."""

    @property
    def count(self) -> int:
        """Runs so far."""
        ...

    def settled(self, doing: Doing, members: int) -> Course:
        """One run of so many copies of the mean loop, without noise; arrays in ``doing`` lead with the members."""
        ...

    def shown(self, doing: Doing) -> Mapping[str, PointState]:
        """One run of the whole ensemble: the points at the horizon with their ranges."""
        ...


class Situation(NamedTuple):
    """A loop now: its points, mean compositions [mmol/L] and litres; ``managed`` is the point it is steered by."""

    site: Site
    loop: Loop
    at: datetime
    managed: str
    points: Mapping[str, PointState]
    volumes_l: Mapping[str, float]
    crop_water_l_per_m2_d: float = 0.0
    analysis_days_old: float | None = None
    """Age of the last analysis of the managed point; None where there is none."""
    usual_acid_mmol_d: Array = np.zeros(len(IONS))
    """What acid dosed by habit brings a day [mmol], shape (10,); every run of the model counts it as going on."""

    def composition(self, point: str) -> Array:
        """Mean composition of a point, shape (10,)."""
        ions = self.points[point].ions
        return np.array([ions[ion].mmol_l.value if ion in ions else 0.0 for ion in IONS])

    def ph(self, point: str) -> float:
        """pH of a point, 5.8 where it is not known."""
        state = self.points.get(point)
        return 5.8 if state is None or state.ph is None else state.ph.value


@dataclass(slots=True)
class ModelRuns:
    """``Runs`` of an estimate over a horizon of whole days; ``usual_mmol_d`` (10,) goes in half-way through each.

    ``progress`` hears before every run which part of the most that a plan takes has begun.
    """

    estimate: Estimate
    days: int
    usual_mmol_d: Array = field(default_factory=lambda: np.zeros(len(IONS)))
    progress: Callable[[float], None] | None = None
    count: int = field(default=0)

    def _counted(self) -> None:
        self.count += 1
        if self.progress is not None:
            self.progress(min(self.count / MOST_RUNS, 1.0))

    def settled(self, doing: Doing, members: int) -> Course:
        """See ``Runs.settled``."""
        from fertui.estimate.forecast import copies, trajectories

        self._counted()
        course = trajectories(copies(self.estimate, members), self.days, self._scenario(doing), settled=True)
        return Course(course.ions, course.volumes_l)

    def shown(self, doing: Doing) -> Mapping[str, PointState]:
        """See ``Runs.shown``."""
        from fertui.estimate.forecast import forecast

        self._counted()
        return forecast(self.estimate, self.days, self._scenario(doing)).days[-1].points

    def _scenario(self, doing: Doing) -> Scenario:
        from fertui.estimate.forecast import Dose, FeedRecipe, Renewal, Scenario

        usual = [Addition(day + 0.5, self.usual_mmol_d) for day in range(self.days) if self.usual_mmol_d.any()]
        return Scenario(
            doses=tuple(Dose(self._at(each.day), adds_mmol=each.mmol) for each in (*doing.additions, *usual)),
            renewals=tuple(Renewal(self._at(each.day), each.litres, _by_ion(each.refill)) for each in doing.renewals),
            recipes=tuple(FeedRecipe(self._at(each.day), _by_ion(each.ions)) for each in doing.feeds),
        )

    def _at(self, day: float) -> datetime:
        return self.estimate.at + timedelta(days=day) + JUST_AFTER


@dataclass(slots=True)
class StillRuns:
    """``Runs`` of a tank right after mixing: no uptake, no exchange, no time. It is arithmetic and counts no model
    run."""

    situation: Situation
    tank: str
    count: int = field(default=0)

    def settled(self, doing: Doing, members: int) -> Course:
        """The tank as it stands, before anything is done."""
        now = np.broadcast_to(self.situation.composition(self.tank), (1, members, len(IONS)))
        return Course({self.tank: now}, {self.tank: np.full((1, members), self.situation.volumes_l[self.tank])})

    def shown(self, doing: Doing) -> Mapping[str, PointState]:
        """The points with the tank as it is after the doses; a range moves along with its value."""
        after = mixed(self.situation.composition(self.tank), doing, 0, self.situation.volumes_l[self.tank])
        moved = shifted(self.situation.points[self.tank], after)
        alike = [name for name, state in self.situation.points.items() if state is self.situation.points[self.tank]]
        return {**self.situation.points, **dict.fromkeys((self.tank, *alike), moved)}


def mixed(composition: Array, doing: Doing, day: float, volume_l: float | Array) -> Array:
    """Tank (..., 10) [mmol/L] just after what is done to it on a day: renewal first, then the salts."""
    volume = np.asarray(volume_l, dtype=float)[..., None]
    for each in (renewal for renewal in doing.renewals if renewal.day == day):
        part = np.minimum(np.asarray(each.litres, dtype=float)[..., None] / volume, 1.0)
        composition = composition + part * (each.refill - composition)
    return composition + sum((each.mmol / volume for each in doing.additions if each.day == day), np.zeros(len(IONS)))


def shifted(state: PointState, composition: Array) -> PointState:
    """A point moved to another composition (10,): ranges keep their width, EC follows the ions as the meter reads
    them."""
    before = np.array([state.ions[ion].mmol_l.value if ion in state.ions else 0.0 for ion in IONS])
    ec = np.maximum(conductivity(np.maximum(np.stack([before, composition]), 0.0)), 1e-6)
    factor = state.ec.value / ec[0] if ec[0] > 0.05 else 1.0
    part = share_pct(composition)
    ions = dict(state.ions)
    for ion, value in zip(IONS, composition, strict=True):
        known = state.ions.get(ion)
        moved = _moved(known.mmol_l, value) if known else Estimated(float(value), float(value), float(value))
        share = None if known is None or known.share_pct is None else _moved(known.share_pct, part[ion])
        ions[ion] = IonState(moved, share)
    return PointState(_moved(state.ec, float(factor * ec[1])), state.ph, ions)


def share_pct(composition: Array) -> dict[str, float]:
    """Shares of K, Ca and Mg [%] of a composition (10,); zero where there is none of them."""
    equivalents = {ion: CHARGE[INDEX[ion]] * composition[INDEX[ion]] for ion in SHARED}
    total = sum(equivalents.values())
    return {ion: float(100.0 * each / total) if total > 0 else 0.0 for ion, each in equivalents.items()}


def _moved(known: Estimated, value: float) -> Estimated:
    low, high = value + known.low - known.value, value + known.high - known.value
    return Estimated(float(value), float(max(low, min(value, 0.0))), float(high), known.band)


def _by_ion(ions: Array) -> dict[str, Array | float]:
    return {ion: ions[..., i] for i, ion in enumerate(IONS)}
