"""Conductivity: shapes, families of ions, round trips and refusals."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fertui.chemistry.conductivity import conductivity, from_reference, linearise, to_reference
from fertui.chemistry.ions import INDEX, IONS, vector

TOMATO = {"K": 9.5, "Ca": 5.4, "Mg": 2.4, "NH4": 1.2, "NO3": 16, "SO4": 4.4, "H2PO4": 1.5, "HCO3": 0.5}


def test_mapping_and_array_read_alike() -> None:
    assert conductivity(TOMATO) == conductivity(vector(TOMATO))


def test_mapping_of_arrays_spreads_over_members() -> None:
    assert conductivity(TOMATO | {"K": np.array([8.0, 9.0, 10.0])}).shape == (3,)


def test_temperature_and_ph_spread_over_leading_axes() -> None:
    members = np.stack([vector(TOMATO)] * 4)
    assert conductivity(members, np.array([[15.0], [25.0]]), np.array([5.0, 5.5, 6.0, 6.5])).shape == (2, 4)


def test_pure_water_carries_next_to_nothing() -> None:
    """0.055 uS/cm at pH 7, 25 C (from memory)."""
    assert 1000 * conductivity(np.zeros(len(IONS)), 25.0, 7.0) == pytest.approx(0.055, abs=0.002)


@pytest.mark.parametrize("ion", [ion for ion in IONS if ion != "HCO3"])
@settings(max_examples=25, deadline=None)
@given(more=st.floats(0.2, 5.0), temperature=st.floats(5, 35))
def test_more_of_a_free_ion_carries_more(ion: str, more: float, temperature: float) -> None:
    """An ion carries more itself than its strength and its pairs take from the others."""
    assert conductivity(TOMATO | {ion: TOMATO.get(ion, 0.0) + more}, temperature) > conductivity(TOMATO, temperature)


@settings(max_examples=50, deadline=None)
@given(ec=st.floats(0.05, 12), temperature=st.floats(0, 35), reference=st.sampled_from([20.0, 25.0]))
def test_compensation_there_and_back(ec: float, temperature: float, reference: float) -> None:
    for coefficient in (None, 0.0191, 0.02, 0.021):
        compensated = to_reference(ec, temperature, coefficient, reference)
        assert from_reference(compensated, temperature, coefficient, reference) == pytest.approx(ec)
    assert to_reference(ec, reference, None, reference) == pytest.approx(ec)


def test_compensation_outside_the_table_is_refused() -> None:
    with pytest.raises(ValueError, match="0 to 35"):
        to_reference(2.0, 36.0)


def test_slopes_are_the_conductivity_of_one_more_mmol() -> None:
    line = linearise(TOMATO)
    for ion in ("K", "Ca", "NO3", "SO4", "Na"):
        more = conductivity(TOMATO | {ion: TOMATO.get(ion, 0.0) + 0.2}) - conductivity(TOMATO)
        assert line.slope[INDEX[ion]] == pytest.approx(more / 0.2, rel=0.03)


def test_line_goes_through_its_point() -> None:
    line = linearise(TOMATO)
    assert line(line.at) == pytest.approx(conductivity(TOMATO))
    assert line(np.stack([line.at] * 7)).shape == (7,)


def test_array_of_the_wrong_length_is_refused_with_the_order() -> None:
    with pytest.raises(ValueError, match="K, Ca, Mg"):
        conductivity(np.ones(9))
