"""With an earlier estimate at hand only what has changed is run again, and the answer is the same to the last bit."""

from __future__ import annotations

import numpy as np
import pytest

from fertui.estimate import assimilation
from fertui.estimate.assimilation import Estimate, assimilate
from fertui.logbook.entries import Entry
from tests.estimate.logs import DRAIN, FEED, SALAD, SITE, SLAB, TANK, daily_water, entry, fed, moment, scaled

MEMBERS = 40


def _log() -> list[Entry]:
    analyses = [entry("analysis", 0.5 + 7.0 * turn, point="drain", number=100 + turn, **DRAIN) for turn in range(5)]
    readings = [entry("reading", day + 0.3, point="drain", EC=4.0) for day in range(1, 30)]
    return [*daily_water(30), *fed(29.0), *analyses, *readings]


def _same(one: Estimate, other: Estimate) -> bool:
    states = [
        np.array_equal(getattr(one.ensemble.state, name), getattr(other.ensemble.state, name))
        for name in ("water_l", "ions_mmol", "exchanged_meq")
    ]
    return all(states) and one.trail == other.trail and np.array_equal(one.held_mmol, other.held_mmol)


LATE = entry("analysis", 20.5, point="drain", entered=29.9, **scaled(DRAIN, K=6.5, NO3=20.5))
CHANGES = {
    "nothing": (_log(), 29.9),
    "a day on": ([*_log(), *daily_water(32)[30:]], 31.4),
    "a reading": ([*_log(), entry("reading", 29.6, point="drain", EC=4.2)], 29.9),
    "a late analysis": ([*_log(), LATE], 29.9),
    "a feed that reaches back": (
        [*_log(), entry("analysis", 29.5, point="feed", **scaled(FEED, K=11.0))],
        29.9,
    ),
    "an old entry struck": ([each for each in _log() if each.number != 101], 29.9),
    "an earlier time": (_log(), 15.2),
    "a new crop": ([*_log(), entry("crop", 24.0, event="planted")], 29.9),
    "a stage": ([*_log(), entry("crop", 24.0, stage="fruit-set")], 29.9),
    "a bleed": ([*_log(), entry("bleed", 22.2, litres=500.0, reason="leak", **{"from": "drain"})], 29.9),
}


@pytest.mark.parametrize("change", CHANGES)
@pytest.mark.parametrize("medium", ["stone-wool", "coir"])
def test_an_earlier_estimate_changes_no_answer(change: str, medium: str) -> None:
    loop = SLAB._replace(medium=medium)
    before = assimilate(SITE, loop, _log(), moment(29.8), members=MEMBERS)
    entries, day = CHANGES[change]
    resumed = assimilate(SITE, loop, entries, moment(day), members=MEMBERS, before=before)
    assert _same(resumed, assimilate(SITE, loop, entries, moment(day), members=MEMBERS))


def test_an_analysis_of_the_source_water_is_run_again_from_its_time_on() -> None:
    log = [entry("analysis", 0.5, "tank", "tank", **SALAD)]
    before = assimilate(SITE, TANK, log, moment(12.0), members=MEMBERS)
    entries = [*log, entry("analysis", 6.0, "tank", "source", source="rain", Na=2.0)]
    resumed = assimilate(SITE, TANK, entries, moment(12.0), members=MEMBERS, before=before)
    assert _same(resumed, assimilate(SITE, TANK, entries, moment(12.0), members=MEMBERS))
    assert not _same(resumed, before)


@pytest.mark.parametrize(
    ("change", "most"), [("nothing", 2), ("a day on", 4), ("a reading", 3), ("a late analysis", 16)]
)
def test_only_what_has_changed_is_run_again(change: str, most: int, monkeypatch: pytest.MonkeyPatch) -> None:
    before = assimilate(SITE, SLAB, _log(), moment(29.8), members=MEMBERS)
    run: list[int] = []
    stretch = assimilation.stretch
    monkeypatch.setattr(assimilation, "stretch", lambda *every: run.append(1) or stretch(*every))
    entries, day = CHANGES[change]
    assimilate(SITE, SLAB, entries, moment(day), members=MEMBERS, before=before)
    assert len(run) <= most


def test_an_estimate_of_another_loop_lends_nothing() -> None:
    before = assimilate(SITE, SLAB, _log(), moment(29.8), members=MEMBERS)
    log = [entry("analysis", 0.5, "tank", "tank", **SALAD)]
    with_it = assimilate(SITE, TANK, log, moment(5.0), members=MEMBERS, before=before)
    assert _same(with_it, assimilate(SITE, TANK, log, moment(5.0), members=MEMBERS))


def test_a_chain_of_days_is_the_same_as_one_run() -> None:
    estimate: Estimate | None = None
    for day in (10.4, 11.4, 12.4, 20.6, 29.9):
        estimate = assimilate(SITE, SLAB, _log(), moment(day), members=MEMBERS, before=estimate)
    assert estimate is not None
    assert _same(estimate, assimilate(SITE, SLAB, _log(), moment(29.9), members=MEMBERS))
