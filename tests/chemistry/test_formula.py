"""Formulas: atoms and molar masses, held against molmass, a reference library with its own table of atomic weights."""

from __future__ import annotations

import pytest
from molmass import Formula

from fertui.catalogue.acids import acids
from fertui.catalogue.salts import salts
from fertui.chemistry.formula import atoms, molar_mass
from fertui.refusals import Refusal

FORMULAS = sorted({each.formula for each in (*salts(), *acids()) if each.formula})


@pytest.mark.parametrize("formula", FORMULAS)
def test_molar_mass_agrees_with_molmass(formula: str) -> None:
    assert molar_mass(formula) == pytest.approx(Formula(formula.replace(".", "+")).mass, rel=2e-4)


@pytest.mark.parametrize(
    ("formula", "expected"),
    [("K2SO4", {"K": 2, "S": 1, "O": 4}), ("5Ca(NO3)2.NH4NO3.10H2O", {"Ca": 5, "N": 12, "O": 43, "H": 24})],
)
def test_atoms_count_brackets_leading_numbers_and_water(formula: str, expected: dict[str, int]) -> None:
    assert atoms(formula) == expected


@pytest.mark.parametrize("text", ["", "K2SO4)", "(K2SO4", "kno3", "K-NO3", "KNO3.", "()2", "KNO3 "])
def test_what_is_no_formula_is_refused(text: str) -> None:
    with pytest.raises(Refusal, match="not a chemical formula"):
        atoms(text)


def test_an_element_without_weight_is_named() -> None:
    with pytest.raises(Refusal, match="no atomic weight for Au"):
        molar_mass("AuCl3")
