"""Exchange by itself: mass and sites close, limits hold, impossible input is refused."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fertui.chemistry.exchange import PHREEQC_SELECTIVITY, batch, cations, intensity, loading
from fertui.chemistry.ions import CATION_CHARGE, CATIONS

amounts = st.one_of(st.just(0.0), st.floats(1e-6, 1e5))
totals = st.tuples(*[amounts] * 5).filter(lambda each: max(each) > 0.0).map(np.array)
constants = st.tuples(*[st.floats(1e-4, 1e3)] * 5).map(np.array)
fullness = st.floats(1e-6, 1.0 - 1e-6)
litres = st.floats(1e-3, 1e5)

settings.register_profile("exchange", max_examples=200, deadline=None)


def supply(total: np.ndarray) -> np.ndarray:
    return (total * CATION_CHARGE).sum(axis=-1)


@settings(settings.get_profile("exchange"))
@given(totals, litres, fullness, constants)
def test_mass_closes_to_the_last_bits_and_sites_are_full(total, water, full, k) -> None:
    capacity = full * supply(total)
    solution, exchanged = batch(total, water, capacity, k)
    np.testing.assert_allclose(solution * water + exchanged / CATION_CHARGE, total, rtol=1e-14, atol=0.0)
    assert exchanged.sum() == pytest.approx(capacity, rel=1e-12)
    assert (solution >= 0.0).all()
    assert (exchanged >= 0.0).all()


@settings(settings.get_profile("exchange"))
@given(totals, litres, st.floats(0.01, 0.99), constants)
def test_the_exchanger_of_a_batch_is_the_one_its_solution_loads(total, water, full, k) -> None:
    capacity = full * supply(total)
    solution, exchanged = batch(total, water, capacity, k)
    np.testing.assert_allclose(exchanged / capacity, loading(solution, k), atol=1e-10)


@settings(settings.get_profile("exchange"))
@given(totals, constants, st.floats(0.01, 100.0))
def test_fractions_sum_to_one_and_divalents_lose_with_strength(solution, k, stronger) -> None:
    fractions = loading(solution, k)
    assert fractions.sum() == pytest.approx(1.0, rel=1e-12)
    divalent = fractions[[1, 2]].sum()
    again = loading(solution * stronger, k)[[1, 2]].sum()
    assert again <= divalent + 1e-12 if stronger >= 1.0 else again >= divalent - 1e-12


def test_100_000_random_cases_over_wide_ranges() -> None:
    """Fifteen decades of amounts, ten of water, twelve of constants; sites from nearly empty to nearly all there is."""
    random = np.random.default_rng(7)
    size = 100_000
    total = 10.0 ** random.uniform(-9, 6, (size, 5)) * (random.random((size, 5)) < 0.8)
    total[:, 1] += 1e-9
    water, k = 10.0 ** random.uniform(-4, 6, size), 10.0 ** random.uniform(-6, 6, (size, 5))
    part = np.choose(
        random.integers(3, size=size),
        [random.random(size), 10.0 ** random.uniform(-12, 0, size), 1.0 - 10.0 ** random.uniform(-11, 0, size)],
    )
    capacity = part * supply(total)
    with np.errstate(over="raise", divide="raise", invalid="raise"):
        solution, exchanged = batch(total, water, capacity, k)
    np.testing.assert_allclose(solution * water[:, None] + exchanged / CATION_CHARGE, total, rtol=1e-14)
    np.testing.assert_allclose(exchanged.sum(axis=1), capacity, rtol=1e-12)


def test_two_far_ends_that_newton_alone_swings_between() -> None:
    """Ammonium in great excess, calcium held a million times harder: plain Newton steps swing from end to end."""
    total = np.array([1.4e-5, 46.3, 0.0, 0.0026, 810870.0])
    k = np.array([226230.0, 19326.0, 22.5, 4.1e-5, 0.00564])
    _, exchanged = batch(total, 24341.6, 0.4225, k)
    assert exchanged.sum() == pytest.approx(0.4225, rel=1e-12)


def test_as_many_cations_as_sites_leave_the_water_empty() -> None:
    solution, exchanged = batch([10.0, 5.0, 2.0, 3.0, 1.0], 2.0, 28.0, PHREEQC_SELECTIVITY)
    assert (solution == 0.0).all()
    np.testing.assert_array_equal(exchanged, [10.0, 10.0, 4.0, 3.0, 1.0])


def test_without_sites_everything_stays_in_the_water() -> None:
    solution, exchanged = batch([10.0, 5.0, 2.0, 3.0, 1.0], 2.0, 0.0, PHREEQC_SELECTIVITY)
    np.testing.assert_array_equal(solution, [5.0, 2.5, 1.0, 1.5, 0.5])
    assert (exchanged == 0.0).all()


def test_pure_water_without_sites_is_no_failure() -> None:
    solution, exchanged = batch(np.zeros(5), 2.0, 0.0, PHREEQC_SELECTIVITY)
    assert not solution.any()
    assert not exchanged.any()


def test_fewer_cations_than_sites_are_refused_by_member() -> None:
    total = np.array([[10.0, 5.0, 2.0, 3.0, 1.0], [1.0, 0.0, 0.0, 0.0, 0.0]])
    with pytest.raises(ValueError, match=r"member 1: 1 meq of cations cannot fill 20 meq of sites; add cations"):
        batch(total, 1.0, 20.0, PHREEQC_SELECTIVITY)


def test_members_of_all_sorts_in_one_call_give_what_each_gives_alone() -> None:
    random = np.random.default_rng(3)
    total = random.lognormal(1.0, 1.0, (6, 5))
    capacity = np.array([0.0, 0.5, 1.0, 0.2, 0.0, 0.9]) * supply(total)
    water, k = random.uniform(0.5, 2.0, 6), PHREEQC_SELECTIVITY * random.lognormal(0.0, 0.3, (6, 5))
    together = batch(total, water, capacity, k)
    alone = [batch(total[each], water[each], capacity[each], k[each]) for each in range(6)]
    np.testing.assert_allclose(together[0], [each[0] for each in alone], rtol=1e-12)
    np.testing.assert_allclose(together[1], [each[1] for each in alone], rtol=1e-12)


def test_leading_axes_broadcast() -> None:
    total = np.full((4, 1, 5), 10.0)
    solution, exchanged = batch(total, np.ones((1, 3)), 20.0, PHREEQC_SELECTIVITY)
    assert solution.shape == exchanged.shape == (4, 3, 5)
    assert loading(np.ones((2, 3, 5)), PHREEQC_SELECTIVITY).shape == (2, 3, 5)


def test_no_members_give_no_answers() -> None:
    solution, exchanged = batch(np.empty((0, 5)), 1.0, 1.0, PHREEQC_SELECTIVITY)
    assert solution.shape == exchanged.shape == (0, 5)


@pytest.mark.parametrize("name", CATIONS)
def test_more_of_a_cation_means_more_of_it_on_the_sites(name: str) -> None:
    total = np.tile([30.0, 20.0, 10.0, 10.0, 3.0], (20, 1))
    total[:, CATIONS.index(name)] = np.linspace(1.0, 60.0, 20)
    _, exchanged = batch(total, 0.6, 40.0, PHREEQC_SELECTIVITY)
    assert (np.diff(exchanged[:, CATIONS.index(name)]) > 0.0).all()


@pytest.mark.parametrize("off", [-40.0, -0.05, 0.0, 1e-6, 40.0])
def test_where_the_search_starts_does_not_change_the_answer(off: float) -> None:
    drain = np.array([[6.0, 5.0, 2.0, 3.0, 0.3], [2.0, 9.0, 4.0, 9.0, 0.0]])
    total = 0.65 * drain + 40.0 * loading(drain, PHREEQC_SELECTIVITY) / CATION_CHARGE
    start = np.log(intensity(drain, PHREEQC_SELECTIVITY)) + off
    solution, _ = batch(total, 0.65, [40.0, 0.0], PHREEQC_SELECTIVITY, start)
    np.testing.assert_allclose(solution[0], drain[0], rtol=1e-12)
    np.testing.assert_allclose(solution[1], total[1] / 0.65, rtol=1e-15)


def test_a_start_that_is_no_number_is_refused() -> None:
    with pytest.raises(ValueError, match="start holds a number that is not finite"):
        batch(np.full(5, 10.0), 1.0, 20.0, PHREEQC_SELECTIVITY, np.nan)


def test_a_mapping_and_an_array_say_the_same() -> None:
    by_name = batch({"K": 30.0, "Ca": 20.0, "NO3": 99.0}, 0.6, 40.0, PHREEQC_SELECTIVITY)
    by_order = batch([30.0, 20.0, 0.0, 0.0, 0.0], 0.6, 40.0, PHREEQC_SELECTIVITY)
    np.testing.assert_array_equal(by_name, by_order)


@pytest.mark.parametrize("bad", [np.nan, np.inf, -1.0])
@pytest.mark.parametrize("place", ["total_mmol", "water_l", "capacity_meq", "selectivity"])
def test_numbers_that_cannot_be_are_refused_by_name(bad: float, place: str) -> None:
    given_values = {
        "total_mmol": np.full(5, 10.0),
        "water_l": np.array(1.0),
        "capacity_meq": np.array(5.0),
        "selectivity": PHREEQC_SELECTIVITY.copy(),
    }
    given_values[place] = np.where(np.arange(given_values[place].size) == 0, bad, given_values[place])
    given_values["water_l"], given_values["capacity_meq"] = (
        given_values["water_l"].reshape(()),
        given_values["capacity_meq"].reshape(()),
    )
    with pytest.raises(ValueError, match=place):
        batch(**given_values)


def test_no_water_is_refused() -> None:
    with pytest.raises(ValueError, match="water_l holds a number that is not finite or not more than 0"):
        batch(np.ones(5), 0.0, 1.0, PHREEQC_SELECTIVITY)


@pytest.mark.parametrize("solution", [np.zeros(5), [1.0, -1.0, 0, 0, 0], [np.nan, 1, 1, 1, 1], [np.inf, 1, 1, 1, 1]])
def test_a_solution_that_says_nothing_is_refused(solution) -> None:
    with pytest.raises(ValueError, match="solution"):
        loading(solution, PHREEQC_SELECTIVITY)


def test_another_number_of_ions_is_refused() -> None:
    with pytest.raises(ValueError, match="five cations K, Ca, Mg, Na, NH4"):
        cations(np.ones(10))


def test_constants_of_phreeqc_as_the_reference_prints_them() -> None:
    """phreeqc.dat in (mmol/L)^-1/2: K 0.0631, NH4 0.0501, Na 0.01259, Mg 0.631, Ca 1."""
    np.testing.assert_allclose(PHREEQC_SELECTIVITY, [0.0631, 1.0, 0.631, 0.01259, 0.0501], rtol=1e-3)
