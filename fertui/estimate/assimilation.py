"""Where the loop is: the members run through the record, every observation taken in at its own time.

Nothing is remembered between two calls: a late result or a corrected entry simply stands in the record at its own time,
and because random numbers are keyed by day the days before it come out as they were.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace
from datetime import datetime
from functools import cached_property

import numpy as np

from fertui.chemistry.ions import IONS, Array
from fertui.estimate.beginning import Beginning, beginning, first_members, shows_a_vessel
from fertui.estimate.checks import failed
from fertui.estimate.correction import TRACE, ElectroMeter, Innovation, corrected
from fertui.estimate.display import (
    Course,
    Panel,
    allowed,
    feed_drive,
    managed,
    micronutrients_at,
    ph_at,
    same_solution,
    shown_members,
    solutions,
    stacked,
)
from fertui.estimate.drives import Drives, drives
from fertui.estimate.ensemble import Ensemble
from fertui.estimate.noise import normals
from fertui.estimate.observations import Observation, pooled
from fertui.estimate.points import Estimated, IonState, PointState
from fertui.estimate.ranges import Spread, estimated
from fertui.estimate.record import Record, read
from fertui.estimate.setting import Setting, setting
from fertui.estimate.walk import events_between, grid_of, night, nights_of, spans_of, stretch
from fertui.estimate.waters import lately
from fertui.logbook.entries import Entry
from fertui.loop import corrected as booked_as_unexplained
from fertui.loop.account import Booking, booking
from fertui.site.model import Loop, Site

SEED = 20191216
MEMBERS = 300
SURPRISE = 3.0
"""An ion of an analysis so many predicted standard deviations off is flagged (and still used)."""
FEW_ANALYSES = 3
STAGE_SD = 0.15
"""A change of stage widens what is known of uptake by this much (log)."""


@dataclass(frozen=True, slots=True)
class Surprise:
    """An observation that was used but far from what was expected; of a reading: set aside as a meter fault."""

    entry: int | None
    at: datetime
    point: str
    ions: tuple[str, ...]
    text: str


@dataclass(frozen=True, slots=True)
class HeldBack:
    """An analysis that failed its own charge or EC check: not used, to be asked about."""

    entry: int | None
    at: datetime
    point: str
    why: str


@dataclass(frozen=True, slots=True)
class TrailDay:
    """What was known at one time."""

    at: datetime
    points: Mapping[str, PointState]


@dataclass(frozen=True, slots=True)
class PointAt:
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
        words = (*self.record.assumed, *self.setting.assumed, *self.drives.assumed)
        if self.begin.analysis is not None:
            return words
        start = "its source water" if self.loop.layout == "shared-tank" else "its feed"
        return (*words, f"no analysis to begin with: the loop begins as {start}")

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
            micronutrients = micronutrients_at(self.record.observations, point, end, bands)
            found[point] = replace(
                state, ions={**state.ions, **{name: IonState(each) for name, each in micronutrients.items()}}
            )
        return found

    def course(self, point: str, last: int | None = None) -> tuple[PointAt, ...]:
        """One point once a local day, the ``last`` so many (all: None), and now; without micronutrients."""
        which = slice(0 if last is None else max(len(self.times) - last, 0), None)
        bands, seen = allowed(self.site, self.loop, point), self.record.observations
        panel = Panel(self._quantiles(same_solution(self.setting, point), which), bands)
        return tuple(
            PointAt(self.record.moment(time), panel.state(place, ph_at(seen, point, time, bands.get("pH"))))
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


def assimilate(
    site: Site, loop: Loop, entries: Iterable[Entry], at: datetime, members: int = MEMBERS, seed: int = SEED
) -> Estimate:
    """Where a loop is at a time, from its effective entries (those after ``at`` are left out).

    The same entries give the same answer, whatever was computed before. Raises ``CatalogueError`` for a crop or medium
    the catalogue does not know.
    """
    return Assimilation(read(site, loop, entries, at), members, seed).run()


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


class Assimilation:
    """One run through a record. ``after`` holds the members right after each analysis of a vessel, for the hindcast."""

    def __init__(self, record: Record, members: int, seed: int) -> None:
        self.record, self.members, self.seed = record, members, seed
        self.setting = setting(record.loop, _stage(record, record.end))
        self.held_back: list[HeldBack] = []
        self.usable = self._usable()
        self.begin = beginning(record, self.setting, self.usable)
        self.observed = [each for each in self.usable if self._taken_in(each)]
        moments = [each.time for each in self.observed]
        self.nights = nights_of(record, self.begin.time, record.end, moments)
        events, falling = [event.at for event in record.events], [time for time, _ in self.nights]
        self.grid = grid_of(self.begin.time, record.end, falling, moments, events, self._changes())
        self.night_of = spans_of(self.grid, self.nights)
        self.drives = drives(record, self.setting, self.grid)
        self.ensemble = first_members(record, self.setting, self.begin, members, seed)
        self.spread = Spread()
        self.meters: dict[str, ElectroMeter] = {}
        self.analyses = int(self.begin.analysis is not None)
        self.surprises: list[Surprise] = []
        self.lines: list[Booking] = []
        self.held = [self._in_solution()]
        self.marks: list[tuple[float, dict[str, Array], Array]] = []
        self.after: list[tuple[Observation, Ensemble, Spread, int]] = []

    def run(self) -> Estimate:
        """Through all stretches to the end of the record."""
        if self.begin.analysis is not None:
            self.after.append((self.begin.analysis, self.ensemble, self.spread, 0))
        for span in range(len(self.grid) - 1):
            self._arrive(span)
            self._mark(span)
            self._go(span)
        self._arrive(len(self.grid) - 1)
        self._mark(len(self.grid) - 1, last=True)
        return self._estimate()

    def _usable(self) -> tuple[Observation, ...]:
        """Observations that may be used; analyses that fail their own checks are held back."""
        kept = []
        for each in pooled(self.record.observations):
            why = failed(each) if each.is_analysis else ""
            if why:
                self.held_back.append(HeldBack(each.entry, each.at, each.point, why))
            else:
                kept.append(each)
        return tuple(kept)

    def _taken_in(self, seen: Observation) -> bool:
        """Whether the members learn from it: not before the start, nor twice from the analysis they start from."""
        return seen is not self.begin.analysis and seen.time >= self.begin.time

    def _changes(self) -> list[float]:
        """Times at which set points, recipes or stages change."""
        record = self.record
        return [*record.recipes.times, *record.setpoints.times, *record.stages.times]

    def _at(self, span: int) -> float:
        return float(self.grid[span])

    def _arrive(self, span: int) -> None:
        """At the beginning of a stretch: the noise of the night, then what was observed."""
        now = self._at(span)
        if span in self.night_of:
            self.ensemble, line = night(self.setting, self.ensemble, self.seed, self.night_of[span], now)
            self.lines.append(line)
        if any(abs(now - change) < 1e-4 for change in self.record.stages.times) and span:
            self._stage_changed(now)
        for seen in self.observed:
            if abs(seen.time - now) < 1e-4:
                self._observe(seen, span)
        if span:
            self.held.append(self._in_solution())

    def _observe(self, seen: Observation, span: int) -> None:
        before = self.ensemble
        meter = self.meters.setdefault(seen.point, ElectroMeter())
        drive = feed_drive(self.drives, max(span - 1, 0), before)
        self.ensemble, found = corrected(before, self.setting, seen, drive, meter, self.seed)
        if found is None:
            return
        now = self._at(span)
        self.lines.append(booking(now, now, booked_as_unexplained(before.state, self.ensemble.state)))
        self._flag(seen, found)
        if shows_a_vessel(self.setting, seen):
            self._learn(seen, found, before)
            self.after.append((seen, self.ensemble, self.spread, span))

    def _learn(self, seen: Observation, found: Innovation, before: Ensemble) -> None:
        """What a full analysis says about the width of the ranges."""
        self.analyses += 1
        columns = list(found.columns)
        where = solutions(self.setting, before, feed_drive(self.drives, 0, before))
        name = seen.point if seen.point in where else managed(self.record.loop)
        logs = np.log(np.maximum(where[name][:, columns], TRACE))
        off = np.log(seen.values()) - np.quantile(logs, 0.5, axis=0)
        self.spread = self.spread.learned(found.columns, logs - logs.mean(axis=0), seen.covariance(), off)

    def _flag(self, seen: Observation, found: Innovation) -> None:
        if not self.analyses:
            return
        odd = found.surprising(SURPRISE if seen.is_analysis else SURPRISE + 1.0)
        if odd:
            words = [self._words(ion, found) for ion in odd]
            self.surprises.append(Surprise(seen.entry, seen.at, seen.point, odd, "; ".join(words)))
        elif not seen.is_analysis and found.meter_is_off(SURPRISE + 1.0):
            text = f"EC {100.0 * np.expm1(found.ec_off or 0.0):+.0f} % from what the ions make: reading not used"
            self.surprises.append(Surprise(seen.entry, seen.at, seen.point, ("EC",), text))

    def _words(self, ion: str, found: Innovation) -> str:
        place = [IONS[column] for column in found.columns].index(ion)
        expected, ratio = np.exp(found.expected[place]), np.exp(found.difference[place])
        return f"{ion} {expected * ratio:.2g} found, {expected:.2g} mmol/L expected"

    def _stage_changed(self, now: float) -> None:
        """A new stage: the crop's preset of that stage, and less known about it."""
        stage = _stage(self.record, now)
        self.setting = setting(self.record.loop, stage)
        draw = normals(
            self.seed, self.record.loop.name, f"stage {stage} {self.record.local_day(now)}", self.members, 10
        )
        self.ensemble = replace(self.ensemble, slow=self.ensemble.slow + STAGE_SD * draw)

    def _go(self, span: int) -> None:
        events = events_between(self.record.events, self._at(span), self._at(span + 1))
        step = stretch(self.setting, self.drives, span, self.ensemble, events)
        self.ensemble = step.ensemble
        self.lines.extend(step.lines)

    def _mark(self, span: int, last: bool = False) -> None:
        """Keep what the members say, once a day and at the end."""
        now = self._at(span)
        if last or not self.marks or span in self.night_of:
            drive = feed_drive(self.drives, max(span - 1, 0), self.ensemble)
            self.marks.append((now, solutions(self.setting, self.ensemble, drive), self.ensemble.ec))

    def _in_solution(self) -> Array:
        return self.ensemble.state.ions_mmol.sum(axis=1).mean(axis=0)

    def _estimate(self) -> Estimate:
        record = self.record
        path = stacked(self.setting, [mark[1] for mark in self.marks])
        return Estimate(
            site=record.site, loop=record.loop, at=record.at, seed=self.seed, record=record, setting=self.setting,
            drives=self.drives, ensemble=self.ensemble, spread=self.spread, begin=self.begin, analyses=self.analyses,
            surprises=tuple(self.surprises), held_back=tuple(self.held_back),
            times=tuple(mark[0] for mark in self.marks), path=path, path_ec=np.stack([mark[2] for mark in self.marks]),
            lines=tuple(self.lines), held_mmol=np.array(self.held),
        )  # fmt: skip


def _stage(record: Record, time: float) -> str:
    """Stage of the crop at a time: as logged, else as the site file says."""
    logged = record.stages.at(time)
    stage = logged.get("stage", "") if isinstance(logged, dict) else ""
    return str(stage or record.loop.stage)
