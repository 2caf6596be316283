"""The EC set point in force: as logged, by the light of the day, else the loop's own."""

from __future__ import annotations

import pytest

from fertui.estimate.assimilation import assimilate
from fertui.estimate.drives import Holding
from fertui.logbook.entries import Entry
from tests.estimate.logs import SALAD, SITE, TANK, entry, moment

BY_LIGHT = {"EC_dull": 2.2, "EC_bright": 1.6, "light_dull": 500.0, "light_bright": 1500.0}


def set_point(*log: Entry) -> float | None:
    tank = TANK._replace(feed_ec=1.9)
    start = entry("analysis", 0.0, "tank", "tank", **SALAD)
    estimate = assimilate(SITE, tank, [start, *log], moment(3.0), members=20)
    return Holding(estimate.record, estimate.setting).set_point(2.5)


@pytest.mark.parametrize(("light", "ec"), [(200.0, 2.2), (750.0, 2.05), (1000.0, 1.9), (2500.0, 1.6)])
def test_light_moves_the_set_point_between_its_dull_and_its_bright_end(light: float, ec: float) -> None:
    # by hand: straight between 2.2 at 500 J/cm2 and 1.6 at 1500, level beyond
    day = entry("reading", 2.2, "tank", "tank", whole_day=True, light_sum=light)
    assert set_point(entry("setpoint", 1.0, "tank", **BY_LIGHT), day) == pytest.approx(ec)


def test_without_light_or_without_a_logged_set_point_the_plain_one_holds() -> None:
    assert set_point(entry("setpoint", 1.0, "tank", EC=2.0, **BY_LIGHT)) == 2.0
    assert set_point() == 1.9
    assert set_point(entry("setpoint", 2.9, "tank", EC=2.4)) == 1.9
