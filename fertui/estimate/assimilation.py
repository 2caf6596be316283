"""Where the loop is: the members run through the record, every observation taken in at its own time.

Nothing is remembered between two calls: a late result or a corrected entry simply stands in the record at its own time,
and because random numbers are keyed by day the days before it come out as they were.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from datetime import datetime
from typing import Any

import numpy as np

from fertui.chemistry.ions import IONS, Array
from fertui.estimate.beginning import beginning, first_members, shows_a_vessel
from fertui.estimate.checks import failed
from fertui.estimate.correction import TRACE, ElectroMeter, Innovation, corrected
from fertui.estimate.display import feed_drive, managed, solutions, stacked
from fertui.estimate.drives import drives
from fertui.estimate.ensemble import Ensemble, compartment
from fertui.estimate.noise import normals
from fertui.estimate.observations import Observation, pooled
from fertui.estimate.quantiles import median
from fertui.estimate.ranges import Spread
from fertui.estimate.record import Record, read
from fertui.estimate.resuming import Stop, spans_alike
from fertui.estimate.setting import setting
from fertui.estimate.standing import Estimate, HeldBack, PointAt, Surprise, TrailDay, copies, thin
from fertui.estimate.walk import events_between, grid_of, night, nights_of, spans_of, stretch
from fertui.logbook.entries import Entry
from fertui.loop.account import Booking, unexplained
from fertui.site.model import Loop, Site

SEED = 20191216
MEMBERS = 300
SURPRISE = 3.0
"""An ion of an analysis so many predicted standard deviations off is flagged (and still used)."""
FEW_ANALYSES = 3
RECENT_STOPS, OLD_STOPS = 14, 7
"""A run can be gone on with from each of its last nights, and from every seventh before: older changes are rare."""
STAGE_SD = 0.15
"""A change of stage widens what is known of uptake by this much (log)."""


__all__ = [
    "MEMBERS", "SEED", "Assimilation", "Estimate", "HeldBack", "PointAt", "Surprise", "TrailDay", "assimilate",
    "copies", "thin",
]  # fmt: skip


def assimilate(
    site: Site,
    loop: Loop,
    entries: Iterable[Entry],
    at: datetime,
    members: int = MEMBERS,
    seed: int = SEED,
    before: Estimate | None = None,
    progress: Callable[[float], None] | None = None,
) -> Estimate:
    """Where a loop is at a time, from its effective entries (those after ``at`` are left out).

    ``before``: an earlier estimate of the same loop; only what has changed since is run again. The same entries give
    the same answer with it or without. ``progress`` hears what part of the
    stretches is done. Raises ``CatalogueError`` for a crop or medium the catalogue does not know.
    """
    return Assimilation(read(site, loop, entries, at), members, seed).run(before.run if before else None, progress)


class Assimilation:
    """One run through a record. ``after`` holds the members right after each analysis of a vessel, for the hindcast."""

    def __init__(self, record: Record, members: int, seed: int) -> None:
        self.record, self.members, self.seed = record, members, seed
        self.held_back: list[HeldBack] = []
        self.usable = self._usable()
        self.begin = beginning(record, setting(record.loop), self.usable)
        self.setting = setting(record.loop, _stage(record, self.begin.time))
        self.observed = [each for each in self.usable if self._taken_in(each)]
        moments = [each.time for each in self.observed]
        self.nights = nights_of(record, self.begin.time, record.end, moments)
        events, falling = [event.at for event in record.events], [time for time, _ in self.nights]
        self.grid = grid_of(self.begin.time, record.end, falling, moments, events, self._changes())
        self.night_of = spans_of(self.grid, self.nights)
        self.drives = drives(record, self.setting, self.grid)
        self.ensemble = self.first = first_members(record, self.setting, self.begin, members, seed)
        self.spread = Spread()
        self.meters: dict[str, ElectroMeter] = {}
        self.analyses = int(self.begin.analysis is not None)
        self.surprises: list[Surprise] = []
        self.lines: list[Booking] = []
        self.held = [self._in_solution()]
        self.marks: list[tuple[float, dict[str, Array], Array]] = []
        self.after: list[tuple[Observation, Ensemble, Spread, int]] = []
        self.stops: list[Stop] = []

    def run(self, before: Assimilation | None = None, progress: Callable[[float], None] | None = None) -> Estimate:
        """Through all stretches to the end of the record, or through those that differ from an earlier run."""
        if self.begin.analysis is not None:
            self.after.append((self.begin.analysis, self.ensemble, self.spread, 0))
        first = self._resumed(before) if before is not None else 0
        last = len(self.grid) - 1
        for span in range(first, last):
            if progress is not None:
                progress((span - first) / (last - first))
            if span in self.night_of:
                self.stops.append(self._stop(span))
            self._arrive(span)
            self._mark(span)
            self._go(span)
        self._arrive(len(self.grid) - 1)
        self._mark(len(self.grid) - 1, last=True)
        recent = len(self.stops) - RECENT_STOPS
        self.stops = [stop for place, stop in enumerate(self.stops) if place >= recent or place % OLD_STOPS == 0]
        return self._estimate()

    def _stop(self, span: int) -> Stop:
        """All that the rest of the run depends on, right before a stretch."""
        lines = {point: meter.line for point, meter in self.meters.items()}
        counts = tuple(len(each) for each in self._grown())
        return Stop(span, self.setting, self.ensemble, self.spread, self.analyses, lines, counts)

    def _grown(self) -> tuple[list[Any], ...]:
        """What grows while the run goes on."""
        return self.surprises, self.lines, self.held, self.marks, self.after

    def _resumed(self, before: Assimilation) -> int:
        """The stretch to go on from, all taken over that came out the same in an earlier run; 0: from the start."""
        same = spans_alike(before, self)
        stops = [stop for stop in before.stops if stop.span <= same]
        if not stops:
            return 0
        stop = stops[-1]
        self.setting, self.ensemble, self.spread, self.analyses = (
            stop.setting,
            stop.ensemble,
            stop.spread,
            stop.analyses,
        )
        self.meters = {point: ElectroMeter(line) for point, line in stop.meters.items()}
        for own, old, count in zip(self._grown(), before._grown(), stop.counts, strict=True):
            own[:] = old[:count]
        self.stops = stops[:-1]
        return stop.span

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
        """Times at which set points, recipes, stages or source waters change."""
        record = self.record
        waters = (time for water in record.waters.values() for time in water.times[1:])
        return [*record.recipes.times, *record.setpoints.times, *record.stages.times, *waters]

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
        blended = compartment(self.setting, seen.point) is None
        drive = feed_drive(self.drives, max(span - 1, 0), before) if blended else None
        self.ensemble, found = corrected(before, self.setting, seen, drive, meter, self.seed)
        if found is None:
            return
        now = self._at(span)
        self.lines.append(unexplained(now, before.state, self.ensemble.state))
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
        off = np.log(seen.values()) - median(logs)
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
        self.ensemble = self.ensemble._replace(slow=self.ensemble.slow + STAGE_SD * draw)

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
            site=record.site_now, loop=record.loop, at=record.at, seed=self.seed, record=record, setting=self.setting,
            drives=self.drives, ensemble=self.ensemble, spread=self.spread, begin=self.begin, analyses=self.analyses,
            surprises=tuple(self.surprises), held_back=tuple(self.held_back),
            times=tuple(mark[0] for mark in self.marks), path=path, path_ec=np.stack([mark[2] for mark in self.marks]),
            lines=tuple(self.lines), held_mmol=np.array(self.held), run=self,
        )  # fmt: skip


def _stage(record: Record, time: float) -> str:
    """Stage of the crop at a time: as logged, else as the site file says."""
    logged = record.stages.at(time) or {}
    return str(logged.get("stage") or record.loop.stage)
