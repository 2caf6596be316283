"""What must hold on any loop: the account closes, nothing becomes negative, charge is taken up in balance."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fertui.chemistry.conductivity import linearise
from fertui.chemistry.ions import CATION_CHARGE, CHARGE, Array
from fertui.loop import (
    CAUSES,
    Circuit,
    Drive,
    Event,
    Medium,
    Plants,
    State,
    Timeline,
    Trajectory,
    hold_ec,
    hold_ph,
    simulate,
    start,
)
from tests.loop.invented_sites import FEED, LINE, NITRIC, ROOT, TOP_UP, UPTAKE, WELL

MEMBERS = 3
REPORTS = (1.0, 2.5, 4.0, 6.0)


def spread(seed: int, *shape: int, sd: float = 0.4) -> Array:
    return np.exp(np.random.default_rng(seed).normal(0.0, sd, shape))


@st.composite
def circuits(draw: st.DrawFn) -> Circuit:
    layout = draw(st.sampled_from(["shared-tank", "mixed", "drain-blend", "known-feed"]))
    store = draw(st.floats(0.0, 20.0))
    blend = draw(st.sampled_from([{}, {"drain_share": 0.3}, {"drain_share": 1.0}, {"premix_ec": 1.0}]))
    return Circuit(
        "shared-tank" if layout == "mixed" else layout, area_m2=1.0, root_zone_l=draw(st.floats(0.5, 15.0)),
        store_l=store, store_max_l=store * draw(st.floats(1.0, 2.0)), mixed=layout == "mixed",
        **(blend if layout == "drain-blend" else {}),
    )  # fmt: skip


@st.composite
def drives(draw: st.DrawFn, seed: int = 7) -> Drive:
    holds = draw(
        st.sampled_from([(), (hold_ec(2.5, TOP_UP, LINE),), (hold_ph(0.5, NITRIC), hold_ec(2.5, TOP_UP, LINE))])
    )
    return Drive(
        irrigation_l_d=draw(st.sampled_from([0.0, 0.5, 4.0, 60.0])) * spread(seed, MEMBERS),
        crop_l_d=draw(st.sampled_from([0.0, 1.0, 3.0, 9.0])) * spread(seed + 1, MEMBERS),
        make_up=draw(st.sampled_from([WELL, 0.0 * WELL])), make_up_l_d=draw(st.sampled_from([None, 0.0, 2.0, 30.0])),
        stock_mmol_d=draw(st.sampled_from([0.0, 1.5])) * TOP_UP, holds=holds, ec=LINE,
        feed_from=FEED, feed_to=draw(st.sampled_from([None, 0.0 * FEED, 1.5 * FEED])),
        bleed_l_d=draw(st.sampled_from([0.0, 0.3, 50.0])), nitrification_per_d=draw(st.sampled_from([0.0, 0.5])),
        condensate_l_d=draw(st.sampled_from([0.0, 1.0])), excursion_c=draw(st.sampled_from([0.0, -4.0])),
    )  # fmt: skip


EVENTS = st.lists(
    st.builds(
        Event,
        at=st.floats(0.1, 6.0),
        cause=st.sampled_from(["dose", "stock", "make_up", "bleed"]),
        ions_mmol=st.sampled_from([TOP_UP, 20.0 * TOP_UP]),
        litres=st.sampled_from([0.0, 3.0, np.inf]),
        point=st.sampled_from(["tank", "drain_store", "drain", "root_zone"]),
        entry=st.integers(1, 9),
    ).map(lambda event: event if event.cause == "bleed" or event.litres < np.inf else event._replace(litres=1.0)),
    max_size=3,
)


def run(circuit: Circuit, drive: Drive, capacity: float, strength: float, events: list[Event]) -> Trajectory:
    medium = Medium(capacity * spread(3, MEMBERS))
    plants = Plants(UPTAKE * spread(4, MEMBERS, 10), ROOT, 3.0)
    state = start(circuit, medium, strength * ROOT * spread(5, MEMBERS, 10), members=MEMBERS)
    return simulate(circuit, medium, plants, state, Timeline(((0.0, drive),), tuple(events)), REPORTS)


def solution(state: State) -> Array:
    return state.ions_mmol.sum(axis=1)


@settings(max_examples=60, deadline=None)
@given(circuits(), drives(), st.sampled_from([0.0, 300.0]), st.sampled_from([0.02, 1.0]), EVENTS)
def test_account_closes_and_nothing_is_negative(
    circuit: Circuit, drive: Drive, capacity: float, strength: float, events: list[Event]
) -> None:
    trajectory = run(circuit, drive, capacity, strength, events)
    first, last = trajectory.states[0], trajectory.end
    flows = trajectory.fluxes.by_cause
    scale = np.maximum(np.abs(flows).max(axis=1), solution(first).clip(1e-3))
    gap = np.abs(solution(first) + flows.sum(axis=1) - solution(last)) / scale
    assert gap.max() < 1e-9
    assert trajectory.account().gap().max() < 1e-9
    for state in trajectory.states:
        assert np.isfinite(state.ions_mmol).all()
        assert state.ions_mmol[..., :-1].min() >= 0.0
        assert state.exchanged_meq.min() >= 0.0
        assert state.water_l.min() >= 0.0


@settings(max_examples=60, deadline=None)
@given(circuits(), drives(), st.sampled_from([0.0, 300.0]))
def test_charge_and_exchanger_balance(circuit: Circuit, drive: Drive, capacity: float) -> None:
    """Uptake and exchange move no net charge; what the medium releases is what it loses."""
    trajectory = run(circuit, drive, capacity, 1.0, [])
    for cause in ("uptake", "exchange"):
        moved = trajectory.fluxes.cause(cause)
        assert np.abs(moved @ CHARGE).max() <= 1e-9 * max(np.abs(moved).max(), 1.0)
    lost = (trajectory.states[0].exchanged_meq - trajectory.end.exchanged_meq) / CATION_CHARGE
    np.testing.assert_allclose(trajectory.fluxes.cause("exchange")[:, :5], lost, atol=1e-9)


@settings(max_examples=25, deadline=None)
@given(circuits(), drives(), EVENTS)
def test_periods_add_up(circuit: Circuit, drive: Drive, events: list[Event]) -> None:
    trajectory = run(circuit, drive, 200.0, 1.0, events)
    parts = [trajectory.account(a, b) for a, b in zip(trajectory.times, trajectory.times[1:], strict=False)]
    whole = trajectory.account()
    np.testing.assert_allclose(sum(part.flows_mmol for part in parts), whole.flows_mmol, atol=1e-9)
    assert max(part.gap().max() for part in parts) < 1e-9
    assert set(whole.row("K")) == {"start_mmol", *CAUSES, "end_mmol"}


@settings(max_examples=25, deadline=None)
@given(st.sampled_from([0.0, 300.0]), st.floats(0.2, 8.0), st.floats(0.001, 1.0))
def test_uptake_alone_takes_no_ion_below_its_minimum(capacity: float, crop: float, strength: float) -> None:
    """A beaker with roots and nothing else: no water comes, none leaves but what the crop drinks."""
    circuit = Circuit("shared-tank", 1.0, 5.0, mixed=True)
    plants = Plants(UPTAKE, ROOT, 3.0)
    state = start(circuit, Medium(), strength * ROOT + 1.01 * plants.kinetics.c_min)
    drive = Drive(crop_l_d=crop, make_up=0.0 * WELL)
    end = simulate(circuit, Medium(), plants, state, Timeline(((0.0, drive),)), [30.0]).end
    assert (end.concentration(1)[0] >= plants.kinetics.c_min * (1 - 1e-9))[:-1].all()


@pytest.mark.parametrize("members", [1, 5])
def test_members_do_not_see_each_other_beyond_the_step_length(members: int) -> None:
    """Copies of one member give the answer of that member alone, to rounding."""
    circuit, medium, plants = Circuit("known-feed", 1.0, 8.0), Medium(350.0), Plants(UPTAKE, ROOT, 3.0)
    drive = Drive(irrigation_l_d=4.5, crop_l_d=3.0, feed_from=FEED)
    state = start(circuit, medium, ROOT, members=members)
    end = simulate(circuit, medium, plants, state, Timeline(((0.0, drive),)), [5.0]).end
    alone = simulate(circuit, medium, plants, start(circuit, medium, ROOT), Timeline(((0.0, drive),)), [5.0]).end
    np.testing.assert_allclose(end.ions_mmol, np.repeat(alone.ions_mmol, members, axis=0), rtol=1e-12)


def test_line_is_near_the_set_points_used_here() -> None:
    np.testing.assert_allclose(LINE(FEED), linearise(FEED).ec, rtol=1e-12)


def test_a_store_without_water_leaves_the_charge_balance_its_digits() -> None:
    """Water runs through an empty store within seconds: its rates are a million times those of the root zone."""
    circuit = Circuit("shared-tank", area_m2=1.0, root_zone_l=1.0, store_max_l=0.0)
    drive = Drive(irrigation_l_d=0.5 * spread(7, MEMBERS), make_up=WELL, make_up_l_d=2.0, ec=LINE)
    taken = run(circuit, drive, 0.0, 1.0, []).fluxes.cause("uptake")
    assert np.abs(taken @ CHARGE).max() <= 1e-12 * max(np.abs(taken).max(), 1.0)
