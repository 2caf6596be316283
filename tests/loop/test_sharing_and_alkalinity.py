"""Loops that share a vessel, and where pH is heading."""

from __future__ import annotations

import numpy as np
import pytest

from fertui.loop import (
    INERT,
    STORE,
    Circuit,
    Drive,
    Event,
    Medium,
    Plants,
    Sharer,
    Timeline,
    hold_ec,
    hold_ph,
    pooled,
    simulate,
    simulate_together,
    start,
    tendency,
)
from tests.loop.invented_sites import FEED, LINE, NITRIC, ROOT, UPTAKE, WELL


def sharer(store_l: float, crop_l_d: float, uptake_scale: float = 1.0, events: tuple[Event, ...] = ()) -> Sharer:
    circuit = Circuit("drain-blend", 100.0, 800.0, store_l=store_l, store_max_l=2 * store_l, drain_share=0.3)
    holds = (hold_ph(0.5, NITRIC), hold_ec(2.6, FEED, LINE))
    drive = Drive(irrigation_l_d=450.0, crop_l_d=crop_l_d, make_up=WELL, holds=holds)
    plants = Plants(uptake_scale * UPTAKE, ROOT, 300.0)
    return Sharer(circuit, INERT, plants, start(circuit, INERT, ROOT), Timeline(((0.0, drive),), events))


def test_twins_that_share_a_store_behave_like_one_alone() -> None:
    twin = sharer(200.0, 300.0)
    together = simulate_together({"a": twin, "b": twin}, [5.0])
    alone = simulate(twin.circuit, twin.medium, twin.plants, twin.state, twin.timeline, [5.0])
    for run in together.values():
        np.testing.assert_allclose(run.end.ions_mmol, alone.end.ions_mmol, rtol=1e-9)


def test_a_shared_store_is_one_solution_and_every_account_closes() -> None:
    bleed = Event(2.3, "bleed", litres=50.0, point="drain_store", reason="renewal", entry=4)
    loops = {"hungry": sharer(200.0, 320.0, 1.3), "modest": sharer(300.0, 250.0, 0.7, (bleed,))}
    runs = simulate_together(loops, [2.5, 7.0])
    ends = [run.end.concentration(STORE) for run in runs.values()]
    np.testing.assert_allclose(ends[0], ends[1], rtol=1e-12)
    for run in runs.values():
        assert run.account().gap().max() < 1e-9
        assert run.account(2.5, 7.0).gap().max() < 1e-9
    traded = sum(run.account().flows_mmol[8] for run in runs.values())
    np.testing.assert_allclose(traded, 0.0, atol=1e-9)
    assert runs["modest"].account().entries("K", "bleed") == (4,)


def test_a_known_feed_loop_shares_nothing() -> None:
    one = sharer(200.0, 300.0)
    other = one._replace(circuit=Circuit("known-feed", 100.0, 800.0))
    with pytest.raises(ValueError, match="shared-tank or drain-blend"):
        pooled([one, other])


def grown(feed: np.ndarray, members: int = 200, medium: Medium = INERT) -> tuple[str, list[str], float]:
    circuit = Circuit("known-feed", 1.0, 8.0)
    spread = np.exp(np.random.default_rng(2).normal(0.0, 0.03, (members, 10)))
    plants = Plants(UPTAKE * spread, ROOT, 3.0)
    drive = Drive(irrigation_l_d=4.5, crop_l_d=3.0, feed_from=feed)
    state = start(circuit, medium, ROOT, members=members)
    run = simulate(circuit, medium, plants, state, Timeline(((0.0, drive),)), [2.0])
    found = tendency(run.fluxes, 8.0, 2.0)
    change = (run.end.ions_mmol - state.ions_mmol)[..., 9].sum(axis=1).mean() / 16.0
    assert found.drift.value == pytest.approx(change, rel=1e-9)
    assert found.drift.low <= found.drift.value <= found.drift.high
    return found.direction, [driver.what for driver in found.drivers], found.drift.value


def test_nitrate_raises_and_ammonium_lowers_the_tendency() -> None:
    """Signs: uptake of nitrate raises pH, of ammonium lowers it (charge balance; common practice, no source)."""
    direction, drivers, drift = grown(FEED)
    assert direction == "up"
    assert drivers[0] == "uptake of nitrate"
    more_ammonium = FEED.copy()
    more_ammonium[4] += 3.0
    assert grown(more_ammonium)[2] < drift
