"""Litres and days left in the stock tanks, as a grower would count them."""

from __future__ import annotations

from datetime import timedelta

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fertui.estimate.notices import stock_days_left, stock_left
from fertui.logbook.entries import Entry
from tests.estimate.standing import GUTTERS, NOW, SITE, SLABS, said


def used(litres: float, days: range, tank: str = "calcium") -> list[Entry]:
    return [
        said("stock", (NOW - timedelta(days=back)).date().isoformat(), tank=tank, litres=f"{litres:.2f}")
        for back in days
    ]


def batch(at: str, litres: str = "1000") -> Entry:
    return said("batch", at, tank="calcium", litres=litres)


def test_litres_left_are_the_batch_less_what_was_used_since() -> None:
    # Mixed at midnight ten days ago, 25 L a day for ten days: 750 L; eight hours of today at the same rate: 8.3 L.
    log = [batch("2026-06-21 00:00"), *used(25.0, range(1, 11))]
    left = stock_left(SITE, SLABS, log, NOW)["calcium"]
    assert left.litres == pytest.approx(1000 - 250 - 25 * 8 / 24, abs=0.1)
    assert left.litres_a_day == pytest.approx(25.0)
    assert stock_days_left(SITE, SLABS, log, NOW)["calcium"] == pytest.approx(left.litres / 25.0)


def test_use_of_the_day_of_mixing_counts_from_the_hour_of_mixing() -> None:
    noon = stock_left(SITE, SLABS, [batch("2026-06-30 12:00"), *used(24.0, range(1, 8))], NOW)["calcium"]
    assert noon.litres == pytest.approx(1000 - 12 - 8, abs=0.1)


def test_a_level_read_later_wins_over_the_batch() -> None:
    log = [
        batch("2026-06-21 00:00"),
        *used(25.0, range(1, 11)),
        said("level", "2026-07-01 07:59", tank="calcium", litres="640"),
    ]
    assert stock_left(SITE, SLABS, log, NOW)["calcium"].litres == pytest.approx(640, abs=0.1)


def test_nothing_is_said_of_a_tank_whose_filling_or_use_was_never_logged() -> None:
    assert stock_left(SITE, SLABS, used(25.0, range(1, 8)), NOW) == {}
    assert stock_days_left(SITE, SLABS, [batch("2026-06-30 12:00")], NOW) == {}


def test_loops_that_share_a_tank_draw_it_down_together() -> None:
    other = [each._replace(loop=GUTTERS.name) for each in used(5.0, range(1, 11))]
    log = [batch("2026-06-21 00:00"), *used(25.0, range(1, 11)), *other]
    assert stock_left(SITE, SLABS, log, NOW)["calcium"].litres_a_day == pytest.approx(30.0)


def test_days_not_yet_logged_draw_on_and_long_silence_does_not() -> None:
    log = [batch("2026-06-21 00:00"), *used(25.0, range(4, 11))]
    assert stock_left(SITE, SLABS, log, NOW)["calcium"].litres == pytest.approx(1000 - 25 * (7 + 3 + 8 / 24), abs=0.5)
    silent = [batch("2026-06-11 00:00"), *used(25.0, range(10, 20))]
    assert stock_left(SITE, SLABS, silent, NOW)["calcium"].litres == pytest.approx(750, abs=0.5)


@given(st.floats(0.1, 400), st.integers(1, 20))
def test_litres_are_never_negative_and_more_use_never_leaves_more(litres: float, days: int) -> None:
    def left(each: float) -> float:
        return stock_left(SITE, SLABS, [batch("2026-06-10 00:00"), *used(each, range(1, days + 1))], NOW)[
            "calcium"
        ].litres

    assert 0.0 <= left(2 * litres) <= left(litres) <= 1000.0
