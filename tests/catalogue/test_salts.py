"""Salts: analysis, charge, solubility and names, against handbook figures named beside them."""

from __future__ import annotations

import pytest

from fertui.catalogue.figures import STATUSES, CatalogueError
from fertui.catalogue.salts import Salt, question, salt, salts
from fertui.chemistry.formula import atoms
from fertui.chemistry.names import ATOMIC_WEIGHT, CHARGES, MICRONUTRIENTS

NAMES = [each.name for each in salts()]
CARRIED = {
    "NO3": ("N", 1), "NH4": ("N", 1), "SO4": ("S", 1), "H2PO4": ("P", 1), "K": ("K", 1), "Ca": ("Ca", 1),
    "Mg": ("Mg", 1), "Na": ("Na", 1), "Cl": ("Cl", 1), **{each: (each, 1) for each in MICRONUTRIENTS},
}  # fmt: skip
ORGANIC = {"chelate"}


@pytest.mark.parametrize("name", NAMES)
def test_every_salt_is_neutral(name: str) -> None:
    found = salt(name)
    if found.formula:
        assert sum(found.charge_of(ion) * count for ion, count in found.gives.items()) == 0


@pytest.mark.parametrize("name", NAMES)
def test_the_ions_of_a_salt_are_its_atoms(name: str) -> None:
    """Every N, P, S, Cl, metal and B of the formula comes back as an ion; chelates keep the N of their carrier."""
    found = salt(name)
    if not found.formula or found.use == "disinfectant":
        return
    counted: dict[str, int] = {}
    for ion, count in found.gives.items():
        if ion in CARRIED:
            element, number = CARRIED[ion]
            counted[element] = counted.get(element, 0) + count * number
    expected = {element: count for element, count in atoms(found.formula).items() if element not in ("H", "O", "C")}
    if ORGANIC & set(found.cautions):
        expected.pop("N")
    assert counted == expected


@pytest.mark.parametrize("name", NAMES)
def test_every_salt_says_where_its_numbers_come_from(name: str) -> None:
    found = salt(name)
    assert found.sources["composition"].status in STATUSES
    assert bool(found.dissolves) == ("solubility" in found.sources)
    assert found.cautions


# Mass % of the element in the pure salt: arithmetic on IUPAC abridged atomic weights, written out to two digits
@pytest.mark.parametrize(
    ("name", "ion", "weighed", "pct"),
    [
        ("calcium nitrate double salt", "Ca", "Ca", 18.54),
        ("calcium nitrate double salt", "NO3", "N", 14.26),
        ("calcium nitrate double salt", "NH4", "N", 1.30),
        ("calcium nitrate tetrahydrate", "Ca", "Ca", 16.97),
        ("KNO3", "K", "K", 38.67),
        ("KNO3", "NO3", "N", 13.85),
        ("magnesium nitrate", "Mg", "Mg", 9.48),
        ("magnesium sulfate", "Mg", "Mg", 9.86),
        ("magnesium sulfate", "SO4", "S", 13.01),
        ("MKP", "H2PO4", "P", 22.76),
        ("MKP", "K", "K", 28.73),
        ("K2SO4", "K", "K", 44.88),
        ("K2SO4", "SO4", "S", 18.40),
        ("MAP", "H2PO4", "P", 26.93),
        ("calcium chloride dihydrate", "Ca", "Ca", 27.26),
        ("calcium chloride hexahydrate", "Cl", "Cl", 32.36),
        ("KCl", "K", "K", 52.45),
        ("KOH", "K", "K", 69.69),
        ("calcium hydroxide", "Ca", "Ca", 54.09),
        ("boric acid", "B", "B", 17.48),
        ("borax", "B", "B", 11.34),
        ("sodium molybdate", "Mo", "Mo", 39.66),
    ],
)
def test_analysis_of_the_pure_salt(name: str, ion: str, weighed: str, pct: float) -> None:
    assert salt(name).mmol_per_kg[ion] * ATOMIC_WEIGHT[weighed] / 1e4 == pytest.approx(pct, abs=0.01)


# Grams of the trade form per kg of added water. KNO3 13.3/20.9/31.6/45.8, KH2PO4 14.8/18.3/22.6/28 and K2SO4
# 7.4/9.3/11.1/13 g/100 g at 0/10/20/30 C: open solubility tables, second-hand. KNO3 35, K2SO4 12, MKP 22, Mg nitrate
# and MgSO4.7H2O 71 kg/100 L at 20 C: Quaderno ARSIA 5/2004, p. 179 (MgSO4 and Mg nitrate there per 100 L of solution).
@pytest.mark.parametrize(
    ("name", "temperature", "grams", "within"),
    [
        ("KNO3", 0, 133, 0.03),
        ("KNO3", 10, 209, 0.03),
        ("KNO3", 20, 316, 0.03),
        ("KNO3", 30, 458, 0.03),
        ("MKP", 10, 183, 0.06),
        ("MKP", 20, 226, 0.06),
        ("K2SO4", 10, 93, 0.03),
        ("K2SO4", 20, 111, 0.03),
        ("KCl", 20, 342, 0.03),
        ("NH4NO3", 20, 1920, 0.03),
        ("MAP", 20, 368, 0.06),
    ],
)
def test_solubility_agrees_with_a_second_table(name: str, temperature: float, grams: float, within: float) -> None:
    assert salt(name).solubility(temperature) == pytest.approx(grams, rel=within)


def test_crystal_water_joins_the_solvent() -> None:
    """A saturated MgSO4 solution of 25.1 mass % at 20 C (CRC Handbook, 98th ed.) made from the heptahydrate."""
    grams = salt("MgSO4.7H2O").solubility(20)
    assert grams is not None
    anhydrous = grams * 120.37 / 246.47
    assert anhydrous / (grams + 1000.0) == pytest.approx(0.251, rel=1e-3)


@pytest.mark.parametrize("name", NAMES)
def test_solubility_moves_between_its_table_and_stays_flat_beyond(name: str) -> None:
    found = salt(name)
    if not found.dissolves:
        assert found.solubility(10) is None
        return
    for temperature, grams in found.dissolves:
        assert found.solubility(temperature) == pytest.approx(grams)
    assert found.solubility(-40) == found.dissolves[0][1]
    assert found.solubility(90) == found.dissolves[-1][1]
    direction = [more[1] - less[1] for less, more in zip(found.dissolves, found.dissolves[1:], strict=False)]
    assert all(step <= 0 for step in direction) if name == "calcium hydroxide" else all(step >= 0 for step in direction)


@pytest.mark.parametrize("name", NAMES)
def test_a_salt_is_found_by_name_formula_and_alias(name: str) -> None:
    found = salt(name)
    for other in (name.upper(), f"  {name} ", *found.aliases):
        assert salt(other) == found
    if found.formula and question(found.formula) is None:
        assert salt(found.formula.replace(".", "·")) == found


def test_calcium_nitrate_alone_asks_which() -> None:
    with pytest.raises(CatalogueError) as refused:
        salt("Calcium nitrate")
    said = str(refused.value)
    assert "double salt" in said
    assert "tetrahydrate" in said
    assert "9 % more Ca" in said
    assert "NH4" in said


def test_the_nine_percent_and_the_hidden_ammonium_are_true() -> None:
    double, tetra = salt("calcium nitrate double salt"), salt("calcium nitrate tetrahydrate")
    assert double.mmol_per_kg["Ca"] / tetra.mmol_per_kg["Ca"] == pytest.approx(1.09, abs=0.005)
    assert double.mmol_per_kg["NH4"] * 14.007 / 1e4 == pytest.approx(1.3, abs=0.05)


@pytest.mark.parametrize("name", ["iron chelate", "CaCl2", "ammonium phosphate", "Ca(NO3)2", "molybdate"])
def test_other_ambiguous_names_ask_too(name: str) -> None:
    asked = question(name)
    assert asked is not None
    assert all(isinstance(salt(option), Salt) for option in asked[1])
    with pytest.raises(CatalogueError, match="which one"):
        salt(name)


def test_an_unknown_name_is_answered_with_near_ones() -> None:
    with pytest.raises(CatalogueError, match="'potassium nitrate'"):
        salt("potasium nitrat")
    with pytest.raises(CatalogueError, match="not a salt"):
        salt("x" * 10_000)


def test_charges_of_macro_ions_are_those_of_the_chemistry() -> None:
    assert all(salt("KNO3").charge_of(ion) == charge for ion, charge in CHARGES.items())
