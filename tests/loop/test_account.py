"""The account: entries behind a cell, discharge by reason, running totals against a budget."""

from __future__ import annotations

import numpy as np
import pytest

from fertui.chemistry.ions import ATOMIC_WEIGHT
from fertui.loop import (
    INERT,
    Circuit,
    Drive,
    Event,
    Plants,
    Timeline,
    Trajectory,
    discharged,
    running,
    simulate,
    start,
)
from tests.loop.invented_sites import FEED, ROOT, UPTAKE, WELL


def bled_loop() -> Trajectory:
    circuit = Circuit("shared-tank", area_m2=500.0, root_zone_l=1000.0, store_l=2000.0, store_max_l=2200.0)
    events = (
        Event(1.25, "dose", ions_mmol=100.0 * FEED, entry=11),
        Event(1.5, "bleed", litres=400.0, point="tank", reason="filter back-flush", entry=12),
        Event(2.5, "dose", ions_mmol=np.eye(10)[0] * 50.0, entry=13),
        Event(3.0, "make_up", ions_mmol=900.0 * WELL, litres=900.0, entry=14),
    )
    drive = Drive(irrigation_l_d=1500.0, crop_l_d=200.0, make_up=WELL, bleed_l_d=10.0)
    plants = Plants(UPTAKE, ROOT, 200.0)
    state = start(circuit, INERT, ROOT)
    return simulate(circuit, INERT, plants, state, Timeline(((0.0, drive),), events), [1.0, 2.0, 3.0, 4.0])


def test_entries_behind_a_cell() -> None:
    run = bled_loop()
    whole = run.account()
    assert whole.entries("K", "dose") == (11, 13)
    assert whole.entries("Ca", "dose") == (11,)
    assert whole.entries("NO3", "bleed") == (12,) or whole.entries("NO3", "bleed") == (12, 14)
    assert run.account(1.0, 2.0).entries("K", "dose") == (11,)
    assert whole.row("K")["dose"] == pytest.approx(100.0 * FEED[0] + 50.0)


def test_discharge_by_reason_sums_to_what_was_bled() -> None:
    run = bled_loop()
    rows = {row.reason: row for row in discharged(run.bookings, 500.0)}
    assert set(rows) == {"filter back-flush", "continuous", "overflow"}
    assert rows["filter back-flush"].litres == pytest.approx(400.0)
    assert rows["continuous"].litres == pytest.approx(40.0)
    assert rows["overflow"].litres == pytest.approx(2000.0 + 900.0 - 2200.0)
    bled = -run.account().flows_mmol[7]
    nitrogen = (bled[4] + bled[5]) * ATOMIC_WEIGHT["N"] * 1e-6
    assert sum(row.kg_n for row in rows.values()) == pytest.approx(nitrogen)
    assert rows["continuous"].kg_n_per_ha == pytest.approx(rows["continuous"].kg_n * 20.0)
    assert running(run.bookings, 500.0)[-1][1] == pytest.approx(nitrogen * 20.0)


def test_drain_of_a_known_feed_loop_is_discharge() -> None:
    circuit = Circuit("known-feed", 1.0, 8.0)
    drive = Drive(irrigation_l_d=5.0, crop_l_d=3.0, feed_from=FEED)
    run = simulate(
        circuit, INERT, Plants(UPTAKE, ROOT, 3.0), start(circuit, INERT, ROOT), Timeline(((0.0, drive),)), [2.0]
    )
    (row,) = discharged(run.bookings, 1.0)
    assert (row.reason, row.litres) == ("drain", pytest.approx(4.0))


def test_an_account_needs_a_time_that_was_reported() -> None:
    with pytest.raises(ValueError, match="put it in report_at"):
        bled_loop().account(0.5, 2.0)
