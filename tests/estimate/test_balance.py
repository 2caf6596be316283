"""The account of a period closes, whatever period is asked for."""

from __future__ import annotations

from functools import cache

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fertui.estimate.assimilation import Estimate, assimilate
from fertui.estimate.balance import Balance, BalanceRow, balance, crop_water_l, discharged
from fertui.estimate.forecast import forecast
from fertui.logbook.entries import Entry
from tests.estimate.logs import DRAIN, FEED, SALAD, SITE, SLAB, TANK, daily_water, entry, fed, moment

LAST_WEEK = entry("analysis", 6.0, "tank", "source", source="rain", Na=2.0)


@cache
def _slab(medium: str = "stone-wool") -> Estimate:
    analyses = [entry("analysis", 0.5 + 7.0 * turn, point="drain", **DRAIN) for turn in range(3)]
    log: list[Entry] = [*daily_water(20), *fed(20.0), *analyses]
    return assimilate(SITE, SLAB._replace(medium=medium), log, moment(19.3), members=60)


@cache
def _tank() -> Estimate:
    log = [
        entry("analysis", 0.5, "tank", "tank", **SALAD),
        entry("dose", 4.25, "tank", number=44, salt="potassium nitrate", kg=0.5),
        entry("bleed", 6.5, "tank", number=45, litres=400.0, reason="sodium", **{"from": "tank"}),
        entry("analysis", 7.5, "tank", "tank", **SALAD),
    ]
    return assimilate(SITE, TANK, log, moment(9.0), members=60)


def _gap(row: BalanceRow) -> float:
    start, *flows, end = row
    return abs(start + sum(flows) - end) / max(abs(start), abs(end), *map(abs, flows), 1e-9)


@given(st.floats(0.0, 19.0), st.floats(0.0, 19.0))
@settings(max_examples=40, deadline=None)
def test_start_and_flows_make_the_end_for_every_period(one: float, other: float) -> None:
    first, last = sorted((one, other))
    for estimate in (_slab(), _slab("coir")):
        if last <= 0.5:
            continue
        for row in balance(estimate, moment(first), moment(last)).ions.values():
            assert _gap(row) < 1e-9


def _soured(**read: float) -> Estimate:
    """A tank into which more acid was logged than its solution can have met."""
    log = [
        entry("analysis", 0.5, "tank", "tank", **SALAD),
        entry("acid", 4.25, "tank", acid="nitric acid", strength=60.0, litres=0.5),
        *([entry("reading", 4.5, "tank", "tank", **read)] if read else []),
    ]
    return assimilate(SITE, TANK, log, moment(5.0), members=60)


def test_no_free_acid_is_booked_beside_a_ph_that_rules_it_out() -> None:
    # pH 5 is 0.01 mmol/L of H+ (definition): alkalinity below zero would show as a pH of 4 or less
    unread, sour, read = (
        balance(_soured(**each), moment(4.0), moment(5.0)) for each in ({}, {"pH": 3.2}, {"EC": 2.4, "pH": 6.2})
    )
    assert unread.ions["HCO3"].end_mmol < -1000.0
    assert sour.ions["HCO3"].end_mmol < -1000.0
    row = read.ions["HCO3"]
    assert row.end_mmol == 0.0
    assert _gap(row) < 1e-9
    assert row.unexplained > 1000.0
    assert row.acid == pytest.approx(sour.ions["HCO3"].acid)
    for ion in ("K", "NO3", "Ca"):
        assert _gap(read.ions[ion]) < 1e-9


def test_hco3_is_shown_as_nothing_at_least() -> None:
    for estimate in (_soured(), _soured(pH=3.2)):
        shown = estimate.points()["tank"].ions["HCO3"].mmol_l
        assert shown.low == shown.value == 0.0
        assert shown.high >= 0.0
        ahead = forecast(estimate, 2).days[-1].points["tank"].ions["HCO3"].mmol_l
        assert 0.0 <= ahead.low <= ahead.value <= ahead.high


def test_two_halves_make_the_whole() -> None:
    whole, one, two = (balance(_tank(), moment(a), moment(b)) for a, b in ((1.0, 8.0), (1.0, 5.3), (5.3, 8.0)))
    for ion, row in whole.ions.items():
        assert one.ions[ion].end_mmol == pytest.approx(two.ions[ion].start_mmol, rel=1e-9, abs=1e-9)
        assert one.ions[ion].uptake + two.ions[ion].uptake == pytest.approx(row.uptake, rel=1e-9, abs=1e-9)


def test_a_dose_stands_in_its_cell_with_its_entry() -> None:
    account = balance(_tank(), moment(4.0), moment(5.0))
    assert account.ions["K"].dose == pytest.approx(0.5 * 9891.0, rel=1e-3)  # KNO3, 101.10 g/mol
    assert account.entries["K", "dose"] == (44,)
    assert balance(_tank(), moment(5.0), moment(6.0)).ions["K"].dose == 0.0


def test_signs_are_those_of_the_solution() -> None:
    slab, tank = balance(_slab(), moment(1.0), moment(19.0)), balance(_tank(), moment(1.0), moment(9.0))
    for row in slab.ions.values():
        assert row.make_up == row.stock == 0.0
    assert slab.ions["K"].feed > 0 > slab.ions["K"].uptake
    assert slab.ions["K"].drain < 0
    assert tank.ions["K"].feed == tank.ions["K"].drain == 0.0
    assert tank.ions["K"].bleed < 0
    assert tank.ions["Na"].make_up > 0


def test_what_an_analysis_corrected_is_unexplained() -> None:
    quiet, corrected = (
        balance(_slab(), moment(a), moment(b)).ions["K"].unexplained for a, b in ((8.1, 8.9), (7.1, 7.9))
    )
    assert abs(corrected) > 5.0 * abs(quiet)


def test_coir_gives_and_takes_and_stone_wool_does_not() -> None:
    coir, wool = (balance(_slab(medium), moment(1.0), moment(19.0)) for medium in ("coir", "stone-wool"))
    assert abs(coir.ions["K"].exchange) > 1.0
    assert wool.ions["K"].exchange == 0.0


def test_a_period_is_cut_to_the_estimate_and_refused_where_it_does_not_meet_it() -> None:
    account = balance(_slab(), moment(-30.0), moment(5.0))
    assert account.start == moment(0.5)
    assert (account.is_cut, account.asked) == (True, moment(-30.0))
    assert account.began.startswith("with the analysis of entry")
    with pytest.raises(ValueError, match="the estimate runs from"):
        balance(_slab(), moment(-30.0), moment(-20.0))
    with pytest.raises(ValueError, match="before it begins"):
        balance(_slab(), moment(9.0), moment(5.0))


def test_nitrogen_discharged_is_the_bleed_times_what_the_tank_held() -> None:
    lost = discharged(_tank(), moment(6.0), moment(7.0))
    assert [each.reason for each in lost] == ["sodium"]
    held = 20.25 * 400.0 * 14.007e-6  # kg: 20.25 mmol/L N of the lettuce feed, less what a week of crop took
    assert 0.3 * held < lost[0].kg_n < held
    assert crop_water_l(_slab(), moment(2.0), moment(4.0)) == pytest.approx(6000.0, rel=0.05)
    assert set(FEED) <= set(balance(_slab(), moment(2.0), moment(4.0)).ions)


def _topped_up(*analyses: Entry) -> Estimate:
    """A tank from its first analysis on, 200 L of rain a day, the rain analysed now and then."""
    water = [entry("water", float(day), "tank", whole_day=True, make_up=200.0) for day in range(12)]
    log = [entry("analysis", 0.5, "tank", "tank", **SALAD), *water, *analyses]
    return assimilate(SITE, TANK, log, moment(11.0), members=30)


def _sodium_per_chloride(account: Balance) -> float:
    """Of make-up water: chloride stays at the 0.1 mmol/L of the site file, whatever litres the members take up."""
    return account.ions["Na"].make_up / account.ions["Cl"].make_up


def test_a_source_water_brings_what_its_analysis_says_from_its_time_on() -> None:
    # By hand: Na and Cl are 0.1 mmol/L each as the site file says; from day 6 on Na is 2.0 as analysed, for all loops.
    found = _topped_up(entry("analysis", 6.0, "slab", "source", source="rain", Na=2.0))
    assert _sodium_per_chloride(balance(found, moment(2.0), moment(6.0))) == pytest.approx(1.0, rel=1e-6)
    assert _sodium_per_chloride(balance(found, moment(6.0), moment(10.0))) == pytest.approx(20.0, rel=1e-6)


def test_an_analysis_that_names_no_water_is_of_the_one_the_loop_is_topped_up_with() -> None:
    found = _topped_up(entry("analysis", 6.0, "tank", "source", Na=2.0))
    assert _sodium_per_chloride(balance(found, moment(6.0), moment(10.0))) == pytest.approx(20.0, rel=1e-6)


def test_a_doubtful_analysis_of_a_source_water_changes_nothing() -> None:
    doubted = entry("analysis", 6.0, "tank", "source", source="rain", doubtful="wrong bottle", Na=2.0)
    found = _topped_up(doubted)
    assert _sodium_per_chloride(balance(found, moment(6.0), moment(10.0))) == pytest.approx(1.0, rel=1e-6)


def test_the_days_ahead_are_topped_up_with_the_water_as_last_analysed() -> None:
    plain, analysed = (forecast(_topped_up(*given), 5) for given in ((), (LAST_WEEK,)))
    sodium = [each.days[-1].points["tank"].ions["Na"].mmol_l.value for each in (plain, analysed)]
    assert sodium[1] > sodium[0] + 0.5  # 400 L a day of 2.0 mmol/L into 2000 L, lettuce leaves most of it
