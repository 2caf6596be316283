"""Free ions: nothing is lost, the fixed point is reached, and the range is told."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from fertui.chemistry.activity import FREE_INDEX, FREE_IONS, STRENGTH_LIMIT, davies, speciate
from fertui.chemistry.equilibria import EQUILIBRIA, constant
from fertui.chemistry.ions import INDEX, IONS, vector

TOMATO = {"K": 9.5, "Ca": 5.4, "Mg": 2.4, "NH4": 1.2, "NO3": 16, "SO4": 4.4, "H2PO4": 1.5}

solutions = arrays(float, (4, len(IONS)), elements=st.floats(0, 60))
ph_values = st.floats(3.0, 9.0)
temperatures = st.floats(5.0, 35.0)

# Pair, its ions: Davies makes K of a pair of charges z and y K gamma^(-2 z y).
PAIRS = [
    ("CaSO4", "Ca", "SO4", 8), ("MgSO4", "Mg", "SO4", 8), ("KSO4", "K", "SO4", 4), ("NaSO4", "Na", "SO4", 4),
    ("NH4SO4", "NH4", "SO4", 4), ("CaHPO4", "Ca", "HPO4", 8), ("MgHPO4", "Mg", "HPO4", 8),
    ("CaH2PO4", "Ca", "H2PO4", 4), ("MgH2PO4", "Mg", "H2PO4", 4),
]  # fmt: skip


@settings(max_examples=60, deadline=None)
@given(solutions, ph_values, temperatures)
def test_free_ions_and_pairs_add_up_to_the_totals(ions: np.ndarray, ph: float, temperature: float) -> None:
    """Each total is its free ions plus the pairs that mass action makes of them, as near as the fixed point comes."""
    solution = speciate(ions, ph, temperature)
    made = {ion: solution.free[..., FREE_INDEX[ion]].copy() for ion in FREE_IONS}
    found = {ion: made[ion] for ion in ("K", "Ca", "Mg", "Na", "NH4")}
    found["SO4"] = made["SO4"] + made["HSO4"]
    found["H2PO4"] = made["H2PO4"] + made["HPO4"]
    for pair, cation, ligand, power in PAIRS:
        bound = 1e-3 * constant(pair, temperature) * solution.gamma**power * made[cation] * made[ligand]
        found[cation] = found[cation] + bound
        home = "H2PO4" if "PO4" in ligand else "SO4"
        found[home] = found[home] + bound
    for ion, total in found.items():
        assert total == pytest.approx(ions[:, INDEX[ion]], rel=2e-5, abs=1e-9), ion


@settings(max_examples=60, deadline=None)
@given(solutions, ph_values, temperatures)
def test_free_ions_lie_between_nothing_and_the_total(ions: np.ndarray, ph: float, temperature: float) -> None:
    free = speciate(ions, ph, temperature).free
    assert np.all(free >= 0)
    assert np.all(free[:, :9] <= ions[:, :9] + 1e-12)


@settings(max_examples=30, deadline=None)
@given(arrays(float, (3, len(IONS)), elements=st.floats(-50, 3000)), st.floats(0, 14), st.floats(0, 40))
def test_stock_strength_and_nonsense_settle_too(ions: np.ndarray, ph: float, temperature: float) -> None:
    solution = speciate(ions, ph, temperature)
    assert np.all(np.isfinite(solution.free))
    assert np.array_equal(solution.in_range, (solution.ionic_strength <= STRENGTH_LIMIT) & (5 <= temperature <= 35))


def test_leading_axes_are_many_single_solutions() -> None:
    rng = np.random.default_rng(3)
    ions = vector(TOMATO) * np.exp(0.3 * rng.normal(size=(2, 5, len(IONS))))
    ph, temperature = rng.uniform(5, 7, (5,)), rng.uniform(10, 30, (2, 1))
    together = speciate(ions, ph, temperature).free
    for row in range(2):
        for column in range(5):
            alone = speciate(ions[row, column], ph[column], temperature[row, 0]).free
            assert together[row, column] == pytest.approx(alone, rel=1e-5, abs=1e-9)


def test_tomato_distribution_of_phreeqc() -> None:
    """PHREEQC 3.8.6, Amm.dat: K 8, Ca 5, Mg 2.4, NH4 1, NO3 16, SO4 4, P 1.5 at pH 5.8, 25 C, mmol/kgw free."""
    free = speciate({"K": 8, "Ca": 5, "Mg": 2.4, "NH4": 1, "NO3": 16, "SO4": 4, "H2PO4": 1.5}, 5.8, 25.0).free
    for ion, expected in {"Ca": 4.294, "Mg": 1.932, "K": 7.844, "SO4": 2.817, "H2PO4": 1.228, "HPO4": 0.078}.items():
        assert free[FREE_INDEX[ion]] == pytest.approx(expected, rel=0.02), ion


def test_davies_falls_and_holds() -> None:
    strength = np.linspace(0, STRENGTH_LIMIT, 50)
    gamma = davies(strength)
    assert gamma[0] == 1
    assert np.all(np.diff(gamma[:40]) < 0)
    assert davies(3.0) == davies(STRENGTH_LIMIT)


@pytest.mark.parametrize(
    ("ph", "temperature", "what"), [(15, 20, "pH"), (6, 60, "temperature"), (float("nan"), 20, "pH")]
)
def test_impossible_conditions_are_refused_by_name(ph: float, temperature: float, what: str) -> None:
    with pytest.raises(ValueError, match=what):
        speciate(TOMATO, ph, temperature)


def test_a_missing_number_is_refused() -> None:
    with pytest.raises(ValueError, match="finite"):
        speciate(TOMATO | {"K": float("nan")})


@pytest.mark.parametrize("name", EQUILIBRIA)
def test_every_constant_has_a_reaction_and_a_source(name: str) -> None:
    equilibrium = EQUILIBRIA[name]
    assert "=" in equilibrium.reaction
    assert equilibrium.source
