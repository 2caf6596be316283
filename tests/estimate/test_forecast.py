"""The coming days: routine, plan, what-if, first passage, the best day for a sample."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np
import pytest

from fertui.chemistry.ions import INDEX
from fertui.estimate.assimilation import Estimate, assimilate, copies
from fertui.estimate.forecast import Dose, FeedRecipe, Forecast, Renewal, Scenario, forecast, trajectories
from fertui.estimate.passage import leaves_band, out_since, passages
from fertui.estimate.sampling import next_sample
from fertui.logbook.entries import Entry
from fertui.site.model import Sourced
from tests.estimate.logs import DRAIN, FEED, SALAD, SITE, SLAB, TANK, daily_water, entry, fed, moment, scaled

K = INDEX["K"]
BANDS = {"root_zone": {"K share": Sourced(18.0, 28.0, "invented")}}


def _entries(*others: Entry) -> list[Entry]:
    analyses = [entry("analysis", 0.5 + 7.0 * turn, point="drain", **DRAIN) for turn in range(4)]
    return [*daily_water(24), *fed(22.0), *analyses, *others]


@cache
def _slab() -> Estimate:
    return assimilate(SITE, SLAB._replace(bands=BANDS), _entries(), moment(23.5), members=150)


@cache
def _tank() -> Estimate:
    log = [entry("analysis", 0.5, "tank", "tank", **SALAD), entry("analysis", 7.5, "tank", "tank", **SALAD)]
    return assimilate(SITE, TANK, log, moment(8.0), members=150)


def _share(ahead: Forecast, day: int, ion: str = "K") -> float:
    share = ahead.days[day].points["root_zone"].ions[ion].share_pct
    assert share is not None
    return share.value


def test_as_many_days_as_asked_each_a_day_apart() -> None:
    ahead = forecast(_slab(), 5)
    assert [(each.at - ahead.at).days for each in ahead.days] == [1, 2, 3, 4, 5]
    assert set(ahead.days[0].points) == {"feed", "root_zone", "drain"}


def test_a_forecast_changes_nothing_and_comes_out_the_same_again() -> None:
    estimate = _slab()
    before = estimate.ensemble.state.ions_mmol.copy()
    assert forecast(estimate, 7) == forecast(estimate, 7)
    assert np.array_equal(before, estimate.ensemble.state.ions_mmol)


def test_less_than_a_day_is_refused() -> None:
    with pytest.raises(ValueError, match="at least one day"):
        forecast(_slab(), 0)


def test_a_feed_richer_in_potassium_raises_its_share() -> None:
    richer = Scenario(recipe=scaled(FEED, K=13.0, NO3=18.5))
    assert _share(forecast(_slab(), 10, richer), 9) > _share(forecast(_slab(), 10), 9) + 3.0


def test_what_was_assumed_is_said_and_a_plan_takes_its_place() -> None:
    plain = forecast(_slab(), 7)
    assert plain.inputs == "routine"
    assert any("feed" in words for words in plain.assumed)
    plan = entry("plan", 23.4, crop=2000.0, **FEED)
    planned = forecast(assimilate(SITE, SLAB, _entries(plan), moment(23.5), members=150), 7)
    assert planned.inputs == "plan"
    assert planned.assumed == ()


def test_a_drain_store_that_loops_share_is_said_to_be_followed_apart() -> None:
    one, other = (SLAB._replace(name=name, layout="drain-blend", drain_store="the pit") for name in ("one", "other"))
    estimate = assimilate(SITE._replace(loops=(one, other)), one, _entries(), moment(23.5), members=20)
    words = "the pit is shared with other: every loop is followed by itself"
    assert words in estimate.assumed
    assert words in forecast(estimate, 1).assumed
    assert not any("is shared with" in each for each in _slab().assumed)


def test_a_planned_feed_narrows_the_range() -> None:
    plan = entry("plan", 23.4, crop=3000.0, irrigation=4500.0, **FEED)
    planned = forecast(assimilate(SITE, SLAB, _entries(plan), moment(23.5), members=150), 14)
    width = [each.days[-1].points["root_zone"].ions["K"].share_pct for each in (planned, forecast(_slab(), 14))]
    assert width[0] is not None
    assert width[1] is not None
    assert width[0].high - width[0].low < width[1].high - width[1].low


def test_a_plan_ends_when_it_says() -> None:
    until = moment(26.5).timestamp()
    plan = entry("plan", 23.4, until=until, **scaled(FEED, K=13.0, NO3=18.5))
    short = forecast(assimilate(SITE, SLAB, _entries(plan), moment(23.5), members=150), 14)
    long = forecast(_slab(), 14, Scenario(recipe=scaled(FEED, K=13.0, NO3=18.5)))
    assert _share(short, 13) < _share(long, 13) - 1.0


def test_more_crop_water_gathers_the_salt_of_the_make_up_water() -> None:
    thirsty, calm = (forecast(_tank(), 7, Scenario(crop_water_l_per_m2_d=water)) for water in (5.0, 2.0))
    sodium = [each.days[-1].points["tank"].ions["Na"].mmol_l.value for each in (thirsty, calm)]
    assert sodium[0] > sodium[1]


def test_a_stronger_feed_raises_ec() -> None:
    strong, weak = (forecast(_slab(), 7, Scenario(feed_ec=ec)) for ec in (3.4, 1.8))
    assert strong.days[-1].points["root_zone"].ec.value > weak.days[-1].points["root_zone"].ec.value + 0.5


def test_a_dose_arrives_whole_in_the_tank_and_only_once() -> None:
    estimate = copies(_tank(), 1)
    dose = Dose(moment(8.9), "potassium nitrate", 1.0)
    with_it, without = (
        trajectories(estimate, 2, scenario, settled=True) for scenario in (Scenario(doses=(dose,)), Scenario())
    )
    added = with_it.ions["tank"][1, 0, K] - without.ions["tank"][1, 0, K]
    assert added == pytest.approx(9891.0 / 2000.0, rel=0.02)  # 1 kg KNO3, 101.10 g/mol, in 2000 L


def test_the_planner_may_ask_for_another_amount_in_every_member() -> None:
    kg = np.array([0.0, 1.0, 2.0])
    ran = trajectories(
        copies(_tank(), 3), 1, Scenario(doses=(Dose(moment(8.5), "potassium nitrate", kg),)), settled=True
    )
    risen = ran.ions["tank"][1, :, K] - ran.ions["tank"][1, 0, K]
    assert risen[2] == pytest.approx(2.0 * risen[1], rel=0.02)


def test_a_renewal_takes_out_and_fills_up() -> None:
    ran = trajectories(
        copies(_tank(), 1), 1, Scenario(renewals=(Renewal(moment(8.1), 1000.0, {"Na": 4.0}),)), settled=True
    )
    before, after = ran.ions["tank"][:, 0]
    assert after[K] < 0.6 * before[K]
    assert after[INDEX["Na"]] == pytest.approx(0.5 * before[INDEX["Na"]] + 2.0, rel=0.1)


def test_of_one_moment_the_renewal_comes_before_what_is_weighed_in() -> None:
    at = moment(8.9)
    renewal, dose = Renewal(at, 1800.0, {}), Dose(at, "potassium nitrate", 1.0)
    both, alone = (
        trajectories(copies(_tank(), 1), 1, Scenario(doses=doses, renewals=(renewal,)), settled=True)
        for doses in ((dose,), ())
    )
    # 9.891 mol K in 2000 L, none of which leaves with the 1800 L let go
    assert (both.ions["tank"] - alone.ions["tank"])[1, 0, K] == pytest.approx(4.95, abs=0.15)


def test_recipes_follow_one_another() -> None:
    steps = (FeedRecipe(moment(24.0), scaled(FEED, K=13.0, NO3=18.5)), FeedRecipe(moment(28.0), FEED))
    stepped = forecast(_slab(), 14, Scenario(recipes=steps))
    constant = forecast(_slab(), 14, Scenario(recipe=scaled(FEED, K=13.0, NO3=18.5)))
    assert _share(stepped, 3) > _share(forecast(_slab(), 14), 3) + 2.0
    assert _share(stepped, 13) < _share(constant, 13) - 1.0


def test_an_evenly_run_tank_drifts_while_nothing_is_dosed() -> None:
    ahead = forecast(_tank(), 10)
    potassium = [each.points["tank"].ions["K"].mmol_l.value for each in ahead.days]
    assert potassium == sorted(potassium, reverse=True)


def test_first_passage_is_linear_between_days_and_zero_when_out_already() -> None:
    values = np.array([[24.0, 30.0, 20.0], [26.0, 29.0, 20.0], [30.0, 29.0, 20.0]])
    assert passages(np.array([0.0, 1.0, 2.0]), values, (18.0, 28.0)).tolist() == [1.5, 0.0, np.inf]


def test_not_within_the_horizon_is_an_answer() -> None:
    passed = np.array([np.inf] * 8 + [3.0, 5.0])
    row = leaves_band("root_zone", "K share", moment(0.0), passed, None)
    assert (row.days.value, row.days.high, row.at) == (None, None, None)
    assert row.days.low is not None
    assert row.probability == pytest.approx(0.2)


def test_out_since_the_last_time_it_was_inside() -> None:
    times = tuple(moment(day) for day in range(4))
    assert out_since(times, np.array([20.0, 30.0, 29.0, 30.0]), (18.0, 28.0)) == times[1]
    assert out_since(times, np.array([20.0, 30.0, 29.0, 27.0]), (18.0, 28.0)) is None


def test_everything_with_a_band_gets_a_row_and_days_lie_in_order() -> None:
    rows = forecast(_slab(), 14).leaves_band
    assert {"K share", "EC", "Na"} <= {row.what for row in rows if row.point == "root_zone"}
    for row in rows:
        given = [day if day is not None else np.inf for day in (row.days.low, row.days.value, row.days.high)]
        assert given == sorted(given)
        assert 0.0 <= row.probability <= 1.0
        assert (row.since is not None) <= (row.days.value == 0.0)


def test_the_next_sample_is_on_a_staffed_day_and_its_result_counts_the_laboratory() -> None:
    weekdays = ("Mon", "Tue", "Wed", "Thu", "Fri")
    estimate = replace(_slab(), site=SITE._replace(staffed_days=weekdays, lab_turnaround_d=3))
    advice = next_sample(estimate, forecast(estimate, 14))
    assert advice.take_at.strftime("%a") in weekdays
    assert advice.result_at.strftime("%a") in weekdays
    assert (advice.result_at - advice.take_at).days >= 3
    assert advice.take_at >= estimate.at


def test_an_analysis_now_would_narrow_the_range() -> None:
    stale = assimilate(SITE, SLAB, [*_entries(), *daily_water(40)[24:]], moment(38.0), members=150)
    narrows = next_sample(stale, forecast(stale, 3)).narrows_pct
    assert narrows["root_zone", "K"] > 20.0


def _lettuce(*more: Entry) -> Estimate:
    """A lettuce tank at noon of a day, followed for a week."""
    seen = entry("analysis", 6.2, "tank", "tank", **SALAD)
    water = [entry("water", float(day), "tank", whole_day=True, make_up=400.0) for day in range(7)]
    return assimilate(SITE, TANK, (*water, seen, *more), moment(7.5), members=30)


def _potassium(*more: Entry) -> float:
    """K in the tank a day ahead [mmol/L]."""
    return forecast(_lettuce(*more), 1).days[0].points["tank"].ions["K"].mmol_l.value


def _accepted(when: float, **amount: float) -> Entry:
    return entry("plan", when, "tank", entered=6.5, number=9, salt="potassium nitrate", **(amount or {"kg": 2.022}))


K_OF_THE_DOSE = 10.0
"""2.022 kg potassium nitrate of 101.10 g/mol in 2000 L [mmol/L] (molar mass: the standard atomic weights)."""


@pytest.mark.parametrize("when", [7.4, 8.2], ids=["its hour has passed", "it lies ahead"])
def test_an_accepted_step_is_expected_once_and_named(when: float) -> None:
    added = _potassium(_accepted(when)) - _potassium()
    assert added == pytest.approx(K_OF_THE_DOSE, rel=0.15)  # the crop takes from what is more
    (named,) = (each for each in forecast(_lettuce(_accepted(when)), 1).assumed if "accepted" in each)
    assert named.startswith("accepted and not marked done, expected all the same: 2.022 kg potassium nitrate")


def test_a_step_done_before_its_time_is_not_expected_again() -> None:
    done = entry("dose", 7.45, "tank", number=10, salt="potassium nitrate", kg=2.022, plan=9.0)
    both = forecast(_lettuce(_accepted(8.2), done), 1)
    alone = forecast(_lettuce(done), 1)
    assert both.days[0].points["tank"] == alone.days[0].points["tank"]
    assert not any("accepted" in each for each in both.assumed)


def test_of_a_step_partly_done_the_rest_is_expected() -> None:
    half = entry("dose", 7.45, "tank", number=10, salt="potassium nitrate", kg=1.011, plan=9.0)
    ahead = forecast(_lettuce(_accepted(8.2), half), 1)
    added = ahead.days[0].points["tank"].ions["K"].mmol_l.value - _potassium(half)
    assert added == pytest.approx(K_OF_THE_DOSE / 2, rel=0.15)
    assert any("1.011 kg potassium nitrate" in each for each in ahead.assumed)


def test_a_step_of_a_day_gone_by_is_not_expected_and_that_is_said() -> None:
    ahead = forecast(_lettuce(_accepted(6.6)), 1)
    assert ahead.days[0].points["tank"].ions["K"].mmol_l.value == pytest.approx(_potassium())
    assert any(each.startswith("accepted for a day gone by and never marked done") for each in ahead.assumed)


def test_a_tank_without_logged_stock_is_said_to_be_fed_nothing() -> None:
    words = "nothing feeds the loop in these sums"
    assert any(each.startswith(words) for each in forecast(_lettuce(), 1).assumed)
    fed_by_recipe = _lettuce(entry("setpoint", 6.3, "tank", EC=2.4), entry("recipe", 6.3, "tank", **SALAD))
    assert not any(each.startswith(words) for each in forecast(fed_by_recipe, 1).assumed)
    assert not any(each.startswith(words) for each in forecast(_slab(), 1).assumed)  # its feed is known
