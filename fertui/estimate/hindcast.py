"""The record: what was forecast right after each analysis, beside what the next one found.

``logged``: feed analyses, recipe, water and doses as logged up to the next analysis; ``planned``: only what was logged
or planned when the forecast was issued, which is what users saw.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from datetime import datetime, timedelta
from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import INDEX, IONS, Array
from fertui.estimate import compositions
from fertui.estimate.assimilation import MEMBERS, SEED, Assimilation, Estimate, assimilate
from fertui.estimate.baseline import last_uptake
from fertui.estimate.beginning import shows_a_vessel
from fertui.estimate.display import SHARED, feed_drive, managed, shown_members, solutions
from fertui.estimate.forecast import trajectories
from fertui.estimate.noise import normals
from fertui.estimate.observations import Observation
from fertui.estimate.quantiles import median, quantiles
from fertui.estimate.ranges import Spread, shares
from fertui.estimate.record import ANEW, WHOLE_DAYS, Record, read
from fertui.estimate.scores import HindcastRow, Summary, crps, summary
from fertui.estimate.source_waters import is_of_water
from fertui.estimate.walk import CLOSE, Way
from fertui.logbook.entries import Entry
from fertui.site.model import Loop, Site

INPUTS = ("logged", "planned")
MEMBERS_OF_RECORD = 2 * MEMBERS


class Hindcast(NamedTuple):
    """Rows of every forecast and the record in numbers."""

    inputs: str
    rows: tuple[HindcastRow, ...]
    summary: Summary


def hindcast(
    site: Site,
    loop: Loop,
    entries: Iterable[Entry],
    at: datetime,
    inputs: str = "logged",
    members: int | None = None,
    seed: int = SEED,
    progress: Callable[[float], None] | None = None,
) -> Hindcast:
    """The record of a loop's forecasts from one analysis of its solution to the next, up to ``at``.

    ``members``: by default twice those of an estimate, so that chance moves an error of shares by 0.05 points only;
    forecasts as they were issued had the members they had.

    ``progress`` hears what part is done. Raises ``ValueError`` for ``inputs`` other than "logged" or "planned".
    """
    if inputs not in INPUTS:
        raise ValueError(f"inputs {inputs!r} is not one of {', '.join(INPUTS)}")
    count = members or (MEMBERS_OF_RECORD if inputs == "logged" else MEMBERS)
    past = (entry for entry in entries if entry.at <= at)
    kept = [entry for entry in past if entry.loop == loop.name or is_of_water(entry)]
    rows: list[HindcastRow] = []
    epochs = _epochs(kept)
    for turn, end in enumerate(epochs):
        run = Assimilation(read(site, loop, kept, end, whole=True), count, seed)
        run.run(progress=_part_of(progress, turn / len(epochs), 0.5 / len(epochs)))
        ahead = _Logged(run) if inputs == "logged" else _Planned(site, loop, kept, count, seed)
        pairs, done = _pairs(run), _part_of(progress, (turn + 0.5) / len(epochs), 0.5 / len(epochs))
        for place, pair in enumerate(pairs):
            done(place / len(pairs))
            rows += _rows(run, pair, ahead.members(pair))
    return Hindcast(inputs, tuple(rows), summary(rows))


def _part_of(progress: Callable[[float], None] | None, begin: float, width: float) -> Callable[[float], None]:
    """The progress of one part of the work as that of the whole."""
    return lambda part: None if progress is None else progress(begin + width * part)


def _epochs(entries: Sequence[Entry]) -> list[datetime]:
    """The last analysis before every new start of crop, medium or solution, and the last of all."""
    analyses = sorted(entry.at for entry in entries if entry.kind == "analysis" and entry.point != "source")
    starts = [entry.at for entry in entries if entry.kind == "crop" and entry.text_of("event") in ANEW]
    ends = [max((when for when in analyses if when < start), default=None) for start in starts]
    last = analyses[-1:] if analyses else []
    oldest = last[0] - timedelta(days=WHOLE_DAYS) if last else None
    return sorted({when for when in [*ends, *last] if when is not None and oldest is not None and when > oldest})


class _Pair(NamedTuple):
    """A target analysis, the one of the same point before it, and whether that or the one before was no good."""

    target: Observation
    origin: Observation
    before: Observation | None
    judged: bool

    @property
    def cold_start(self) -> bool:
        """Whether the origin is the first analysis of its point."""
        return self.before is None


def _pairs(run: Assimilation) -> list[_Pair]:
    """Every analysis of a vessel with the one before it at the same point, in order of time."""
    found = []
    begun = [
        each
        for each in run.record.observations
        if shows_a_vessel(run.setting, each) and each.time >= run.begin.time - 1e-6
    ]
    for point in dict.fromkeys(each.point for each in begun):
        series = [each for each in begun if each.point == point]
        for place, (origin, target) in enumerate(zip(series, series[1:], strict=False)):
            before = series[place - 1] if place else None
            clean = before is not None and not any(each.doubtful for each in (target, origin, before))
            found.append(_Pair(target, origin, before, clean))
    return sorted(found, key=lambda pair: pair.target.time)


class _Logged:
    """Members led on from right after an analysis under what was logged, without learning from anything later."""

    def __init__(self, run: Assimilation) -> None:
        self.run = run
        self.way = Way(run.setting, run.drives, run.record.events, run.nights, run.seed)

    def members(self, pair: _Pair) -> tuple[Array, Spread]:
        """What members say at the target (M, 10), widened by the scale that was known, and that scale."""
        run = self.run
        behind = [each[1:] for each in run.after if each[0].time <= pair.origin.time + CLOSE]
        ensemble, spread, first = behind[-1] if behind else (run.first, Spread(), 0)  # the first was held back
        for _, ahead in self.way.led(ensemble, first, pair.target.time):
            ensemble = ahead
        said = solutions(run.setting, ensemble, feed_drive(run.drives, 0, ensemble))
        return shown_members(said[_shown_at(run.record, pair.target.point, said)], spread), spread


class _Planned:
    """Forecasts as they were issued: nothing later than the origin but plans that were entered."""

    def __init__(self, site: Site, loop: Loop, entries: Sequence[Entry], members: int, seed: int) -> None:
        self.site, self.loop, self.entries, self.count, self.seed = site, loop, entries, members, seed

    def members(self, pair: _Pair) -> tuple[Array, Spread]:
        """As ``_Logged.members``."""
        estimate = assimilate(self.site, self.loop, self.entries, pair.origin.at, self.count, self.seed)
        horizon = pair.target.time - pair.origin.time
        days = max(int(np.ceil(horizon)), 1)
        ran = trajectories(estimate, days)
        point = _shown_at(estimate.record, pair.target.point, ran.ions)
        shown = shown_members(ran.ions[point], estimate.spread)
        part = horizon - (days - 1)
        return shown[days - 1] + part * (shown[days] - shown[days - 1]), estimate.spread


def _shown_at(record: Record, point: str, said: Mapping[str, Array]) -> str:
    return point if point in said else managed(record.loop)


def _rows(run: Assimilation, pair: _Pair, ahead: tuple[Array, Spread]) -> list[HindcastRow]:
    """One row per ion that both analyses measured."""
    members, _ = ahead
    sampled = _with_sampling_error(run, pair.target, members)
    measured, before = compositions.array(pair.target.ions), compositions.array(pair.origin.ions)
    both = [ion for ion in IONS if ion in pair.target.ions and ion in pair.origin.ions and ion != "HCO3"]
    triples = quantiles(sampled)
    found, now, then = shares(sampled), shares(measured), shares(before)
    plain = shares(last_uptake(run, pair.before, pair.origin, pair.target)) if pair.judged and pair.before else then
    share_triples = quantiles(found)
    rows = []
    for ion in both:
        place = INDEX[ion]
        middle, low, high = (float(value) for value in triples[:, place])
        row = HindcastRow(
            pair.target.at, pair.origin.at, pair.target.point, ion, float(measured[place]), middle, low, high,
            float(before[place]), None, None, None, None, None, pair.cold_start, bool(pair.target.doubtful),
            judged=pair.judged,
        )  # fmt: skip
        if ion in SHARED and all(each in both for each in SHARED):
            column = SHARED.index(ion)
            middle, low, high = (float(value) for value in share_triples[:, column])
            row = row._replace(measured_share_pct=float(now[column]), predicted_share_pct=middle, low_share_pct=low,
                high_share_pct=high, no_change_share_pct=float(then[column]),
                last_uptake_share_pct=float(plain[column]), crps_share=crps(found[:, column], float(now[column])),
            )  # fmt: skip
        rows.append(row)
    return rows


def _with_sampling_error(run: Assimilation, target: Observation, members: Array) -> Array:
    """What an analysis of every member would show: its own error on top."""
    columns = target.columns()
    noise = target.covariance(median(members[:, columns]))
    drawn = normals(
        run.seed, run.record.loop.name, f"sample {target.at.isoformat()} {target.point}", len(members), len(columns)
    )
    sampled = members.copy()
    sampled[:, columns] = members[:, columns] * np.exp(drawn @ np.linalg.cholesky(noise).T)
    return sampled


__all__ = ["INPUTS", "Estimate", "Hindcast", "HindcastRow", "Summary", "hindcast"]
