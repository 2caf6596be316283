"""Rows on an analysis: limits by strength, failures with their reason, guesses that change nothing."""

from __future__ import annotations

import numpy as np
import pytest

from fertui.chemistry.ions import normalised, nutrient_ec, vector
from fertui.chemistry.verdicts import allowed_imbalance_pct, guesses, verdicts

HOAGLAND = {"K": 6, "Ca": 5, "Mg": 2, "NO3": 15, "H2PO4": 1, "SO4": 2}

# Standard Methods 1030E (from memory): 0.2 meq/L to 3 meq/L of anions, 2 % to 10, 5 % to 800.
LIMITS = [(1.0, 10.0), (2.0, 5.0), (5.0, 2.0), (10.0, 2.0), (20.0, 5.0)]


@pytest.mark.parametrize(("side", "percent"), LIMITS)
def test_limit_follows_the_strength(side: float, percent: float) -> None:
    assert allowed_imbalance_pct(side, side) == pytest.approx(percent)


def test_balanced_analysis_passes_every_row() -> None:
    rows = verdicts(HOAGLAND, ec_measured=2.1, ph=5.8)
    assert [row.passed for row in rows] == [True, True, True]
    assert all(row.limit and row.source and row.remark for row in rows)


def test_without_ec_the_row_is_left_out() -> None:
    assert [row.what for row in verdicts(HOAGLAND)] == ["charge balance", "charge balance, usable"]


def test_ec_far_from_the_ions_holds_the_analysis_back() -> None:
    rows = verdicts(HOAGLAND, ec_measured=3.0)
    assert [row.passed for row in rows] == [True, True, False]


def test_between_the_two_limits_it_is_flagged_but_used() -> None:
    rows = verdicts(HOAGLAND | {"K": 9})
    assert [row.passed for row in rows] == [False, True]
    assert "too many cations" in rows[0].remark


def test_guesses_leave_the_analysis_alone() -> None:
    misread = vector(HOAGLAND | {"NO3": 3.389})
    before = misread.copy()
    assert guesses(misread)
    assert np.array_equal(misread, before)


def test_nothing_is_guessed_of_a_balanced_analysis() -> None:
    assert guesses(HOAGLAND) == ()


def test_normalising_scales_all_but_sodium_ammonium_and_bicarbonate() -> None:
    """EC 4.0, Na 8: nutrient EC 3.2. Target 3.5 means reference 3.2, nothing moves; at target 1.9 half remains."""
    ions = vector(HOAGLAND | {"Na": 8, "NH4": 1, "HCO3": 0.5})
    assert nutrient_ec(4.0, 8.0) == pytest.approx(3.2)
    assert normalised(ions, 4.0, 3.5) == pytest.approx(ions)
    halved = normalised(ions, 4.0, 1.9)
    assert halved == pytest.approx(np.where([0, 0, 0, 1, 1, 0, 0, 0, 0, 1], ions, ions / 2))


def test_normalising_needs_an_ec_above_its_sodium() -> None:
    with pytest.raises(ValueError, match="check EC and Na"):
        normalised(vector({"Na": 30}), 2.0, 2.5)
