"""What the estimate must do with late, wrong, missing and surprising entries."""

from __future__ import annotations

import numpy as np
import pytest

from fertui.chemistry.ions import IONS
from fertui.estimate.assimilation import Estimate, assimilate, copies, thin
from fertui.estimate.checks import failed
from fertui.estimate.hindcast import hindcast
from fertui.estimate.observations import observations, pooled
from fertui.logbook.entries import Entry
from fertui.site.model import Composition, Water
from tests.estimate.logs import DRAIN, FEED, SALAD, SITE, SLAB, TANK, daily_water, entry, fed, moment, scaled

MEMBERS = 120
COLLAPSED = scaled(DRAIN, K=2.0, NO3=16.0)
"""K from 8 to 2 with nitrate going along: charge closes as it did before."""


def _estimate(entries: list[Entry], day: float, members: int = MEMBERS) -> Estimate:
    return assimilate(SITE, SLAB, entries, moment(day), members=members)


def _weekly(count: int, *others: Entry) -> list[Entry]:
    analyses = [entry("analysis", 0.5 + 7.0 * turn, point="drain", number=100 + turn, **DRAIN) for turn in range(count)]
    return [*daily_water(7 * count + 1), *fed(7.0 * count), *analyses, *others]


def _middle(estimate: Estimate, ion: str, point: str = "root_zone") -> float:
    return estimate.points()[point].ions[ion].mmol_l.value


def test_the_same_entries_give_the_same_answer_in_any_order() -> None:
    entries = _weekly(4)
    one, other = _estimate(entries, 24.0), _estimate(list(reversed(entries)), 24.0)
    assert one.points() == other.points()


def test_a_new_entry_does_not_reshuffle_the_days_before_it() -> None:
    entries = _weekly(4)
    before, after = _estimate(entries, 24.0), _estimate([*entries, entry("reading", 23.9, point="drain", EC=4.1)], 24.0)
    earlier = [(old, new) for old, new in zip(before.trail, after.trail, strict=True) if new.at < moment(23.0)]
    assert len(earlier) > 20
    for old, new in earlier:
        assert old.points == new.points


def test_right_after_an_analysis_the_estimate_is_near_it() -> None:
    estimate = _estimate(_weekly(4), 21.51)
    for ion in ("K", "Ca", "Mg", "NO3", "SO4"):
        assert _middle(estimate, ion) == pytest.approx(DRAIN[ion], rel=0.12), ion
    assert estimate.analyses == 4


def test_ranges_widen_with_the_age_of_the_analysis() -> None:
    entries = _weekly(4)
    fresh, old = (_estimate([*entries, *daily_water(40)[29:]], day).points()["root_zone"] for day in (22.0, 38.0))
    width = [each.ions["K"].mmol_l.high - each.ions["K"].mmol_l.low for each in (fresh, old)]
    assert width[1] > 1.5 * width[0]


def test_an_analysis_that_fails_its_charges_is_held_back_and_leaves_the_estimate_where_it_was() -> None:
    wrong = entry("analysis", 50.0, point="drain", number=7, **scaled(DRAIN, NO3=22.0 / 4.43))
    nine = _weekly(9)
    without, with_it = _estimate(nine, 64.0), _estimate([*nine, wrong], 64.0)
    assert [held.entry for held in with_it.held_back] == [7]
    assert "NO3-N" in with_it.held_back[0].why
    assert with_it.points() == without.points()


def test_the_record_stands_where_every_analysis_was_held_back() -> None:
    off = entry("analysis", 0.0, **scaled(DRAIN, NO3=22.0 / 4.43)).values
    entries = [each._replace(values=off) if (each.number or 0) >= 100 else each for each in _weekly(4)]
    assert len(_estimate(entries, 22.0).held_back) == 4
    rows = hindcast(SITE, SLAB, entries, moment(22.0), members=40).rows
    assert {row.issued for row in rows} == {moment(0.5), moment(7.5), moment(14.5)}


def test_a_dose_counts_from_its_own_moment_on() -> None:
    filled = entry("analysis", 1.0, "tank", point="tank", **SALAD)
    dose = entry("dose", 3.0, "tank", salt="potassium nitrate", kg=1.0)
    before, after = (assimilate(SITE, TANK, [filled, *done], moment(3.0)) for done in ((), (dose,)))
    held = [each.ensemble.state.ions_mmol.sum(axis=1).mean(axis=0)[0] for each in (before, after)]
    # 1 kg of KNO3 is 9891 mmol (101.10 g/mol, by hand).
    assert held[1] - held[0] == pytest.approx(9891.0, rel=0.01)


def test_a_doubtful_analysis_is_kept_and_never_used() -> None:
    shuffled = entry("analysis", 25.0, point="drain", doubtful="bottles look interchanged", **FEED)
    assert _estimate([*_weekly(4), shuffled], 27.0).points() == _estimate(_weekly(4), 27.0).points()


def test_a_true_collapse_is_followed_within_one_analysis_and_flagged() -> None:
    found = entry("analysis", 35.5, point="drain", number=9, **COLLAPSED)
    estimate = _estimate([*_weekly(5), *daily_water(40)[36:], found], 35.51)
    assert _middle(estimate, "K") == pytest.approx(2.0, rel=0.25)
    assert not estimate.held_back
    assert [each.entry for each in estimate.surprises if "K" in each.ions] == [9]


def test_one_odd_analysis_does_not_ruin_what_was_learned_about_uptake() -> None:
    calm = _estimate(_weekly(8), 50.0)
    odd = entry("analysis", 47.0, point="drain", **scaled(DRAIN, K=4.0, NO3=18.0))
    after = _estimate([*_weekly(8), odd], 50.0)
    ratio = after.multipliers["K"].value / calm.multipliers["K"].value
    assert 1.0 / 1.6 < ratio < 1.6


def test_a_late_result_stands_at_the_time_of_its_sample_and_doses_count_once() -> None:
    log = [
        entry("level", 0.3, "tank", tank="tank", litres=2000.0),
        entry("analysis", 0.5, "tank", "tank", **SALAD),
        entry("dose", 9.0, "tank", salt="potassium nitrate", kg=1.0),
        entry("dose", 10.0, "tank", salt="potassium nitrate", kg=1.0),
    ]
    late = entry("analysis", 7.5, "tank", "tank", entered=11.5, **scaled(SALAD, K=9.0, NO3=17.0))
    told = [each for each in (*log, late) if each.entered <= moment(11.0)]
    before = assimilate(SITE, TANK, told, moment(11.6), members=MEMBERS)
    after = assimilate(SITE, TANK, [*log, late], moment(11.6), members=MEMBERS)
    assert _at(after, 7.6, "K") == pytest.approx(9.0, rel=0.1)
    assert abs(_at(before, 7.6, "K") - 9.0) > abs(_at(after, 7.6, "K") - 9.0)
    added = 2.0 * 9891.0 / 2000.0  # mmol/L: 1 kg of KNO3 (101.10 g/mol) twice into 2000 L
    for estimate in (before, after):
        rise = _at(estimate, 10.6, "K") - _at(estimate, 8.6, "K")
        assert added - 4.0 < rise < added
    again = assimilate(SITE, TANK, told, moment(11.6), members=MEMBERS)
    assert again.points() == before.points()


def _at(estimate: Estimate, day: float, ion: str) -> float:
    """Middle of the tank at the trail's time nearest a day."""
    nearest = min(estimate.trail, key=lambda each: abs(each.at - moment(day)))
    return nearest.points["tank"].ions[ion].mmol_l.value


def test_the_miss_of_the_forecast_is_reported_for_a_late_result() -> None:
    rows = hindcast(SITE, SLAB, _weekly(5), moment(40.0), members=MEMBERS).rows
    row = next(each for each in rows if each.ion == "K" and each.at == moment(14.5))
    assert row.issued == moment(7.5)
    assert row.measured_mmol_l == 8.0
    assert row.predicted_mmol_l != row.measured_mmol_l


def test_a_superseded_value_re_runs_from_its_time() -> None:
    entries = _weekly(4)
    right = [each for each in entries if each.number == 102][0]
    wrong = right._replace(
        values=tuple(each._replace(number=8.0) if each.name == "Ca" else each for each in right.values)
    )
    with_slip = [wrong if each.number == 102 else each for each in entries]
    assert _middle(_estimate(with_slip, 15.0), "Ca") < _middle(_estimate(entries, 15.0), "Ca") - 0.7


def test_a_gross_reading_moves_nothing_and_is_flagged() -> None:
    slip = entry("reading", 23.0, point="drain", number=5, EC=26.0)
    estimate = _estimate([*_weekly(4), slip], 23.1)
    assert _middle(estimate, "K") == pytest.approx(_middle(_estimate(_weekly(4), 23.1), "K"), rel=0.02)
    assert 5 in [each.entry for each in estimate.surprises]


def test_a_meter_that_reads_high_ends_in_the_ec_factor_and_not_in_the_ions() -> None:
    readings = [entry("reading", day + 0.3, point="drain", EC=4.6) for day in range(2, 28)]
    estimate, without = _estimate([*_weekly(4), *readings], 28.0), _estimate(_weekly(4), 28.0)
    assert estimate.ec_factor.value > without.ec_factor.value + 0.03
    assert _middle(estimate, "K") == pytest.approx(_middle(without, "K"), rel=0.15)


def test_a_hand_meter_read_on_a_cold_sample_counts_less() -> None:
    cold, mild = (
        _estimate([*_weekly(3), entry("reading", 20.0, point="drain", NO3=30.0, temperature=each)], 20.1)
        for each in (10.0, 18.0)
    )
    none = _middle(_estimate(_weekly(3), 20.1), "NO3")
    assert none < _middle(cold, "NO3") < _middle(mild, "NO3")


def test_a_round_counts_once_however_often_the_meter_was_read() -> None:
    times = [20.30, 20.31, 20.32]
    entries = [entry("reading", when, point="drain", EC=4.0 + when - 20.31) for when in times]
    seen = observations(SLAB, entries, {id(each): when for each, when in zip(entries, times, strict=True)})
    assert [each.ec for each in pooled(seen)] == [pytest.approx(4.0)]


def test_pure_water_is_neither_held_back_nor_a_reason_to_fail() -> None:
    zeros = entry("analysis", 0.5, "tank", "tank", **dict.fromkeys(SALAD, 0.0))
    estimate = assimilate(SITE, TANK, [zeros], moment(0.6), members=MEMBERS)
    assert not estimate.held_back
    assert _at(estimate, 0.6, "K") < 0.1
    assert estimate.points()["tank"].ions["K"].share_pct is None


def test_a_loop_without_any_analysis_says_so_and_is_shown_wide() -> None:
    estimate = assimilate(SITE, TANK, [], moment(1.0))
    assert any("no analysis" in words for words in estimate.assumed)
    nitrate = estimate.points()["tank"].ions["NO3"].mmol_l
    assert nitrate.value < 0.1
    assert nitrate.high > 3.0


def test_new_medium_begins_with_itself_and_a_renewed_crop_starts_anew() -> None:
    planted = entry("crop", 20.0, event="planted")
    estimate = _estimate([*_weekly(5), planted], 30.0)
    assert estimate.since == moment(21.5)
    coir = SLAB._replace(medium="coir")
    assert assimilate(SITE, coir, [*_weekly(5), planted], moment(30.0), members=30).since == moment(20.0)


def test_a_change_of_stage_widens_what_is_known() -> None:
    staged = entry("crop", 22.0, stage="fruit-set")
    wide, plain = (_estimate([*_weekly(4), *more], 28.0, 300).multipliers["K"] for more in ([staged], []))
    assert wide.high / wide.low > 1.1 * plain.high / plain.low


def test_fewer_members_stand_for_the_same_loop() -> None:
    estimate = _estimate(_weekly(4), 24.0, 300)
    few, one = thin(estimate, 60), copies(estimate, 3)
    assert few.members == 60
    assert np.ptp(one.ensemble.state.ions_mmol, axis=0).max() == 0.0
    middle = np.median(estimate.ensemble.state.ions_mmol, axis=0)
    assert one.ensemble.state.ions_mmol[0] == pytest.approx(middle)


def test_an_analysis_of_a_few_ions_is_not_judged_by_its_charges() -> None:
    seen = observations(SLAB, [each := entry("analysis", 1.0, point="drain", K=8.0)], {id(each): 1.0})[0]
    assert failed(seen) == ""


def test_hard_water_of_a_tank_is_what_it_is_filled_with() -> None:
    hard = SITE._replace(waters=(Water("rain", Composition({"Ca": 2.0, "HCO3": 4.0})),))
    assert assimilate(hard, TANK, [], moment(1.0)).points()["tank"].ions["Ca"].mmol_l.value == pytest.approx(
        2.0, rel=0.1
    )
    assert set(IONS) <= set(assimilate(hard, TANK, [], moment(1.0)).points()["tank"].ions)
