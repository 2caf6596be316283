"""Limits and signs of the rate law, the transfer between volumes, and events on a loop."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fertui.chemistry.ions import INDEX, IONS
from fertui.loop import (
    INERT,
    ROOT,
    STORE,
    Circuit,
    Drive,
    Event,
    Hold,
    Kinetics,
    Medium,
    Plants,
    Timeline,
    apply,
    simulate,
    start,
    temperature_notice,
    uptake,
)
from fertui.loop.transfer import alone, transfer
from tests.loop.invented_sites import FEED, NITRIC, UPTAKE, WELL
from tests.loop.invented_sites import ROOT as REFERENCE

PLANTS = Plants(UPTAKE, REFERENCE, 3.0)


def test_reference_composition_returns_the_uptake_concentration() -> None:
    taken = uptake(PLANTS, REFERENCE[None], 3.0)[0]
    np.testing.assert_allclose(taken[:-1], 3.0 * UPTAKE[:-1], rtol=1e-12)


@pytest.mark.parametrize("ion", IONS[:-1])
def test_carriers_are_half_full_at_cmin_plus_km(ion: str) -> None:
    """Michaelis-Menten with Cmin (Claassen & Barber 1976, from memory): half the maximum at Cmin + Km, none at Cmin."""
    plain = Kinetics()._replace(b=np.zeros(10), antagonism=0.0, salt_half=1e12)
    plants, column = replace(PLANTS, kinetics=plain), INDEX[ion]
    full, half, none = (REFERENCE.copy() for _ in range(3))
    full[column], half[column] = 1e6, plain.c_min[column] + plain.km[column]
    none[column] = plain.c_min[column]
    taken = uptake(plants, np.stack([full, half, none]), 3.0)[:, column]
    assert taken[1] / taken[0] == pytest.approx(0.5, rel=1e-6)
    assert taken[2] == 0.0


def test_water_acts_with_its_exponent_and_light_takes_its_share() -> None:
    dull, bright = uptake(PLANTS, REFERENCE[None], 1.5)[0], uptake(PLANTS, REFERENCE[None], 3.0)[0]
    assert dull[0] / bright[0] == pytest.approx(0.5**0.6)
    assert dull[INDEX["Na"]] / bright[INDEX["Na"]] == pytest.approx(0.5)
    by_light = replace(PLANTS, light_share=np.ones(10))
    assert uptake(by_light, REFERENCE[None], 1.5, light=2.0)[0, 0] == pytest.approx(2.0 * bright[0])


def test_cold_roots_take_up_less_but_for_calcium() -> None:
    """Q10 of 2 for K, 1 for Ca: barley influx (J. Exp. Bot., abstract)."""
    cold, usual = uptake(PLANTS, REFERENCE[None], 3.0, excursion_c=-10.0)[0], uptake(PLANTS, REFERENCE[None], 3.0)[0]
    assert cold[0] / usual[0] == pytest.approx(0.5)
    assert cold[1] == usual[1]


@pytest.mark.parametrize(("root_c", "word"), [(14.9, "below"), (15.0, ""), (26.0, ""), (26.1, "above")])
def test_root_temperature_notice(root_c: float, word: str) -> None:
    """15 and 26 C: common practice, no source."""
    assert (word in temperature_notice(root_c)) if word else temperature_notice(root_c) == ""


def test_a_reference_without_an_ion_that_is_taken_up_is_refused() -> None:
    with pytest.raises(ValueError, match="too low: K"):
        Plants(UPTAKE, REFERENCE * (np.arange(10) != 0), 3.0)


@settings(max_examples=40, deadline=None)
@given(st.lists(st.floats(0.0, 30.0), min_size=4, max_size=4), st.floats(0.01, 3.0))
def test_transfer_is_the_matrix_exponential(rates: list[float], days: float) -> None:
    """Outside judge: scipy.linalg.expm of the augmented matrix."""
    from scipy.linalg import expm

    r, q, extra_p, extra_w = rates
    matrix = np.array([[-(r + extra_p), q], [r, -(q + extra_w)]])
    x, s = np.array([3.0, 5.0]), np.array([2.0, 1.0])
    augmented = np.zeros((5, 5))
    augmented[:2, :2], augmented[:2, 4], augmented[2:4, :2] = matrix, s, np.eye(2)
    expected = expm(augmented * days) @ np.array([*x, 0.0, 0.0, 1.0])
    step = transfer(*(np.full((1, 1), rate) for rate in (r + extra_p, q, r, q + extra_w)), days)
    pairs = [tuple(np.full((1, 1), value) for value in pair) for pair in (x, s)]
    found = [float(value[0, 0]) for value in (*step.end(*pairs), *step.integral(*pairs))]
    np.testing.assert_allclose(found, expected[:4], rtol=1e-6, atol=1e-9)


def test_one_volume_is_two_volumes_without_a_store() -> None:
    w, x, s = np.full((2, 10), 0.7), np.full((2, 10), 5.0), np.full((2, 10), 1.5)
    nothing = np.zeros_like(w)
    single, double = alone(w, 0.8), transfer(nothing, nothing, nothing, w, 0.8)
    for one, two in ((single.end, double.end), (single.integral, double.integral)):
        np.testing.assert_allclose(one((nothing, x), (nothing, s))[1], two((nothing, x), (nothing, s))[1], rtol=1e-7)


def test_events_add_take_and_empty() -> None:
    circuit = Circuit("shared-tank", 1.0, 5.0, store_l=10.0)
    state = start(circuit, INERT, REFERENCE)
    dosed, moved = apply(circuit, INERT, state, Event(0.0, "dose", ions_mmol=FEED))
    np.testing.assert_allclose(dosed.ions_mmol[0, STORE], state.ions_mmol[0, STORE] + FEED)
    np.testing.assert_allclose(moved.cause("dose")[0], FEED)
    emptied, out = apply(circuit, INERT, dosed, Event(0.0, "bleed", litres=np.inf, point="tank"))
    assert emptied.water_l[0, STORE] == 0.0
    assert (emptied.ions_mmol[0, STORE] == 0.0).all()
    assert out.litres[0, 5] == 10.0
    with pytest.raises(ValueError, match="point"):
        apply(circuit, INERT, state, Event(0.0, "dose", point="gutter"))
    with pytest.raises(ValueError, match="cause"):
        apply(circuit, INERT, state, Event(0.0, "rain"))


def test_events_happen_at_their_own_hour() -> None:
    """A bleed at 06:00 takes the solution of 06:00, one at 18:00 that of 18:00."""
    circuit = Circuit("known-feed", 1.0, 8.0)
    drive = Drive(irrigation_l_d=6.0, crop_l_d=3.0, feed_from=0.2 * FEED)
    lost = [
        simulate(
            circuit, INERT, PLANTS, start(circuit, INERT, REFERENCE),
            Timeline(((0.0, drive),), (Event(hour / 24, "bleed", litres=1.0, point="root_zone"),)), [1.0],
        ).account().row("Na")["bleed"]
        for hour in (6.0, 18.0)
    ]  # fmt: skip
    assert lost[0] < lost[1] < 0.0


def test_irrigation_that_stops_lets_the_slab_dry_to_its_last_water() -> None:
    circuit = Circuit("known-feed", 1.0, 8.0)
    run = simulate(
        circuit, INERT, PLANTS, start(circuit, INERT, REFERENCE),
        Timeline(((0.0, Drive(crop_l_d=3.0)), (5.0, Drive(irrigation_l_d=6.0, crop_l_d=3.0, feed_from=FEED)))),
        [5.0, 10.0],
    )  # fmt: skip
    assert run.states[1].water_l[0, ROOT] == pytest.approx(0.05 * 8.0)
    assert run.end.water_l[0, ROOT] == pytest.approx(8.0)


def test_drain_share_of_a_blended_loop() -> None:
    circuit = Circuit("drain-blend", 1.0, 8.0, store_l=3.0, store_max_l=3.0, drain_share=0.5)
    drive = Drive(irrigation_l_d=4.0, crop_l_d=2.0, make_up=WELL)
    run = simulate(circuit, INERT, PLANTS, start(circuit, INERT, REFERENCE), Timeline(((0.0, drive),)), [1.0])
    np.testing.assert_allclose(run.feeds[0][0], 0.5 * REFERENCE + 0.5 * WELL)


def test_a_hold_that_cannot_reach_its_set_point_is_refused() -> None:
    with pytest.raises(ValueError, match="does not move the reading"):
        Hold("acid", -NITRIC, np.eye(10)[9] * -1.0, 0.0, -0.5)


def test_capacity_beyond_all_cations_leaves_sites_to_hydrogen() -> None:
    """Fewer cations than sites: the medium takes what there is, alkalinity carries the hydrogen it gives for it."""
    circuit, medium = Circuit("known-feed", 1.0, 8.0), Medium(5000.0)
    state = start(circuit, INERT, REFERENCE)._replace(exchanged_meq=np.zeros((1, 5)))
    run = simulate(circuit, medium, PLANTS, state, Timeline(((0.0, Drive()),)), [1.0])
    np.testing.assert_allclose(run.end.ions_mmol[0, ROOT, :5], 0.0, atol=1e-6)
    assert run.account().gap().max() < 1e-9
