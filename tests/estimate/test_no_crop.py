"""A loop whose crop was removed does not go on as if one stood there: nothing taken up, asked for or planned."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pytest

from fertui.estimate.assimilation import Estimate, assimilate
from fertui.estimate.forecast import forecast, trajectories
from fertui.estimate.notices import notices
from fertui.logbook.entries import Entry
from fertui.logbook.growing import NO_CROP
from fertui.loop import CAUSE
from fertui.planning import plan
from fertui.site.model import Loop, Supply
from fertui.workbench.glance import glance
from tests.estimate.logs import DRAIN, SALAD, SITE, SLAB, TANK, daily_water, entry, fed, moment

BLEND = Loop("blend", "drain-blend", 1000.0, "tomato", "stone-wool", drain_store_l=5000.0, water="rain", feed_ec=2.6)
HOUSE = SITE._replace(loops=(SLAB, TANK, BLEND), supplies=(Supply("potassium nitrate", "potassium nitrate"),))
LOGGED: dict[str, list[Entry]] = {
    "slab": [*fed(12.0), *daily_water(10), entry("analysis", 5.4, "slab", "root_zone", **DRAIN)],
    "tank": [entry("analysis", 5.4, "tank", "tank", **SALAD)],
    "blend": [entry("analysis", 5.4, "blend", "root_zone", **DRAIN)],
}
REMOVED, NOW = 6.0, 12.3


def standing(name: str, *crop: tuple[float, str], at: float = NOW) -> Estimate:
    entries = [*LOGGED[name], *(entry("crop", when, name, event=event) for when, event in crop)]
    return assimilate(HOUSE, HOUSE.loop(name), sorted(entries, key=lambda each: each.at), moment(at), members=20)


def taken(estimate: Estimate, begin: float) -> float:
    """What roots took from a time on [mmol], all ions together."""
    place = CAUSE["uptake"]
    return float(sum(np.abs(each.by_cause[place]).sum() for each in estimate.lines if each.begin >= begin - 1e-6))


@pytest.mark.parametrize("name", LOGGED)
def test_nothing_is_taken_up_once_the_crop_is_removed(name: str) -> None:
    gone = standing(name, (REMOVED, "removed"))
    assert 0.0 <= taken(gone, REMOVED) < 1e-6 * taken(standing(name), REMOVED)  # the rate law has a trace of water
    assert gone.record.bare_since == moment(REMOVED)


@pytest.mark.parametrize("name", LOGGED)
def test_the_days_ahead_of_a_loop_without_crop_take_nothing_and_say_so(name: str) -> None:
    gone = standing(name, (REMOVED, "removed"))
    assert "no crop stands: nothing is taken up" in forecast(gone, 5).assumed
    ahead = trajectories(gone, 5, settled=True)
    vessel = ahead.ions[gone.managed]
    assert vessel[-1] == pytest.approx(vessel[0], rel=1e-3, abs=1e-3)


def test_emptying_the_tank_afterwards_brings_no_crop_back_and_planting_does() -> None:
    assert standing("tank", (REMOVED, "removed"), (7.0, "emptied")).record.bare_since == moment(REMOVED)
    planted = standing("tank", (REMOVED, "removed"), (7.0, "planted"))
    assert planted.record.bare_since is None
    assert taken(planted, 7.0) > 0.0


def test_today_says_that_no_crop_stands_and_asks_for_nothing_a_crop_wants() -> None:
    gone = standing("tank", (REMOVED, "removed"), at=40.0)
    said = notices(gone, logged("tank", "removed"), forecast(gone, 5))
    assert [each.code for each in said] == ["no_crop"]
    assert "No crop since Sat 7 Mar" in said[0].text
    last = glance(TANK, logged("tank", "removed"), gone.at)
    assert (last.crop, last.stage) == (NO_CROP, "")


def logged(name: str, event: str) -> Sequence[Entry]:
    return [*LOGGED[name], entry("crop", REMOVED, name, event=event)]


@pytest.mark.parametrize("name", ["tank", "blend"])
def test_nothing_is_planned_for_a_loop_without_a_crop(name: str) -> None:
    answer = plan(standing(name, (REMOVED, "removed")), days=7)
    assert not answer.feasible
    assert "no crop stands in this loop" in (answer.reason or "")
    assert (answer.steps, answer.recipe) == ((), None)
