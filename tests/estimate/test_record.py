"""What entries become: amounts over their time, meters, stocks by batch, points and methods, water balances."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fertui.chemistry.ions import INDEX
from fertui.estimate.drives import carried, drives, stock_proportions
from fertui.estimate.record import Record, read
from fertui.estimate.setting import setting
from fertui.estimate.spreads import spread
from fertui.estimate.walk import grid_of
from fertui.estimate.waters import ASSUMED, BALANCED, DRAINED, waters
from fertui.logbook.entries import Entry
from fertui.site.model import Loop, StockTank
from tests.estimate.logs import DRAIN, FEED, SITE, SLAB, TANK, daily_water, entry, fed, moment

GRID = np.arange(0.0, 8.0)


def _record(entries: list[Entry], loop: Loop = SLAB, day: float = 7.0) -> Record:
    return read(SITE, loop, entries, moment(day))


def _days(record: Record, *days: float) -> np.ndarray:
    """Times of the record for days after ``ZERO``."""
    return np.array([record.time(moment(day)) for day in days])


def test_an_amount_without_a_time_of_day_covers_its_local_day() -> None:
    record = _record([entry("water", 2.0, whole_day=True, irrigation=400.0)])
    litres = record.water["irrigation"].over(_days(record, *GRID))
    assert litres.tolist() == [0.0, 0.0, 400.0, 0.0, 0.0, 0.0, 0.0]


def test_an_amount_with_a_time_covers_the_time_since_the_one_before() -> None:
    record = _record([entry("water", 1.0, make_up=50.0), entry("water", 3.0, make_up=100.0)])
    assert record.water["make_up"].over(_days(record, 0.0, 1.0, 2.0, 3.0)).tolist() == pytest.approx([50.0, 50.0, 50.0])


def test_a_meter_counts_between_its_positions_and_not_over_its_replacement() -> None:
    positions = [(0.0, 1000.0, {}), (2.0, 1400.0, {}), (4.0, 20.0, {"meter": "replaced"}), (6.0, 220.0, {})]
    record = _record([entry("water", day, make_up_meter=at, **more) for day, at, more in positions])
    assert record.water["make_up"].over(np.array([0.0, 2.0, 4.0, 6.0])).tolist() == pytest.approx([400.0, 0.0, 200.0])


@given(st.lists(st.tuples(st.floats(0, 5), st.floats(0.01, 3), st.floats(0, 1e4)), min_size=1, max_size=8))
@settings(max_examples=50, deadline=None)
def test_a_spread_loses_no_litre_however_the_time_is_cut(rows: list[tuple[float, float, float]]) -> None:
    flow = spread([(begin, begin + length, amount) for begin, length, amount in rows])
    cuts = np.linspace(0.0, 8.0, 23)
    assert flow.over(cuts).sum() == pytest.approx(sum(row[2] for row in rows), rel=1e-9, abs=1e-9)


def test_crop_water_is_irrigation_less_drain() -> None:
    record = _record(daily_water(7, crop_l=3000.0, drain_l=1500.0))
    found = waters(record, setting(SLAB), GRID)
    assert found.crop.tolist() == pytest.approx([3000.0] * 7)
    assert set(found.origin) == {DRAINED}


def test_crop_water_balances_make_up_condensate_bleed_and_levels() -> None:
    log = [entry("water", float(day), "tank", whole_day=True, make_up=500.0, condensate=20.0) for day in range(7)]
    levels = [
        entry("level", 0.0, "tank", tank="tank", litres=2000.0),
        entry("level", 7.0, "tank", tank="tank", litres=1930.0),
    ]
    bleed = entry("bleed", 3.5, "tank", litres=210.0, reason="sodium", **{"from": "tank"})
    found = waters(_record([*log, *levels, bleed], TANK), setting(TANK), GRID)
    assert found.crop.sum() == pytest.approx(7 * 520.0 + 70.0 - 210.0)
    assert set(found.origin) == {BALANCED}


def test_days_without_a_log_take_the_week_before() -> None:
    record = _record(daily_water(4, crop_l=2000.0))
    found = waters(record, setting(SLAB), GRID)
    assert found.crop[-1] == pytest.approx(2000.0)
    assert found.origin[-1] == ASSUMED


def test_known_feed_is_linear_between_analyses() -> None:
    stronger = {ion: 2.0 * value for ion, value in FEED.items()}
    record = _record([entry("analysis", 1.0, point="feed", **FEED), entry("analysis", 5.0, point="feed", **stronger)])
    feeds = drives(record, setting(SLAB), _days(record, 0.0, 1.0, 3.0, 5.0, 7.0)).feeds[:, INDEX["K"]]
    assert feeds.tolist() == pytest.approx([9.5, 9.5, 14.25, 19.0, 19.0])


def test_a_recipe_holds_from_its_time_on() -> None:
    record = _record([entry("analysis", 1.0, point="feed", **FEED), entry("recipe", 4.0, K=12.0, Ca=5.0, NO3=16.0)])
    feeds = drives(record, setting(SLAB), _days(record, 2.0, 3.9, 4.1, 7.0)).feeds[:, INDEX["K"]]
    assert feeds.tolist() == pytest.approx([9.5, 9.5, 12.0, 12.0], abs=1e-3)


def test_stock_counts_by_what_its_batch_held() -> None:
    loop = TANK._replace(stock_tanks=("potash",))
    site = SITE._replace(loops=(loop,), stock_tanks=(StockTank("potash", 100.0),))
    batch = entry("batch", 1.0, "tank", tank="potash", litres=100.0, **{"potassium nitrate": 10.0})
    used = [entry("stock", day, "tank", tank="potash", litres=2.0) for day in (0.5, 2.0, 3.0)]
    record = read(site, loop, [batch, *used], moment(4.0))
    potassium = record.stock.over(np.array([0.0, 2.0, 3.0]))[:, INDEX["K"]]
    per_litre = 10.0 * 9891.0 / 100.0  # KNO3 101.10 g/mol
    assert potassium.tolist() == pytest.approx([2.0 * per_litre, 2.0 * per_litre], rel=1e-3)
    assert any("potash" in words for words in record.assumed)


def test_a_recipe_is_the_whole_feed_and_a_batch_the_stocks_part_of_it() -> None:
    loop = SLAB._replace(layout="drain-blend", stock_tanks=("potash",), water="rain")
    site = SITE._replace(loops=(loop,), stock_tanks=(StockTank("potash", 100.0),))
    recipe = read(site, loop, [entry("recipe", 0.0, K=8.0, Na=0.5, NO3=8.5)], moment(1.0))
    assert carried(recipe, 1.0)[INDEX["Na"]] == pytest.approx(0.4)
    batch = entry("batch", 0.0, tank="potash", litres=100.0, **{"potassium nitrate": 10.0})
    mixed = read(site, loop, [batch], moment(1.0))
    assert stock_proportions(mixed, 1.0)[INDEX["Na"]] == pytest.approx(0.1)
    assert carried(mixed, 1.0)[INDEX["K"]] == pytest.approx(9.89, rel=1e-3)


def test_an_extract_counts_only_with_the_factor_of_the_site() -> None:
    extract = entry("analysis", 1.0, point="root_zone", **DRAIN)._replace(method="extract_1_1.5")
    assert not _record([extract]).observations
    known = _record([extract], SLAB._replace(extract_factors={"extract_1_1.5": 3.0}))
    assert known.observations[0].ions["K"] == 24.0


def test_other_loops_later_entries_and_plans_made_later_are_left_out() -> None:
    strange = [entry("analysis", 1.0, "tank", "tank", **DRAIN), entry("analysis", 9.0, point="drain", **DRAIN)]
    plans = [entry("plan", 9.0, entered=3.0, crop=2000.0), entry("plan", 9.0, entered=8.0, crop=1000.0)]
    record = _record([*fed(1.0), *strange, *plans])
    assert [each.point for each in record.observations] == ["feed"]
    assert [each.number_of("crop") for each, _ in record.plans] == [2000.0]


def test_midnights_follow_the_clock_of_the_site_through_a_change_of_clocks() -> None:
    site = SITE._replace(timezone="Europe/Amsterdam")
    record = read(site, SLAB, [entry("water", 26.0, irrigation=1.0)], moment(30.0))
    nights = np.array(record.midnights(0.0, record.end))
    assert sorted(set(np.round(np.diff(nights) * 24.0))) == [23.0, 24.0]  # 29 March 2026, EU rule


def test_a_grid_keeps_every_time_apart() -> None:
    assert grid_of(0.0, 2.0, [1.0, 1.00001], [0.5]).tolist() == [0.0, 0.5, 1.0, 2.0]
