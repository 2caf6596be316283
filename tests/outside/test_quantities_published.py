"""Conversions against extension tables, published recipes, and reference libraries of units and atomic weights."""

from __future__ import annotations

import molmass
import pint
import pytest

from fertui.chemistry.species import SPECIES
from fertui.quantities import concentration, in_unit, read
from fertui.quantities.units import FACTORS, PER_LITRE

# Virginia Cooperative Extension SPES-201, conversion factors (mass of the second in a mass of the first).
SPES_201 = [
    ("P2O5", "P", 0.4365), ("P", "P2O5", 2.2910), ("K2O", "K", 0.8301), ("K", "K2O", 1.2051),
    ("MgO", "Mg", 0.6032), ("Mg", "MgO", 1.6578), ("CaO", "Ca", 0.7147), ("Ca", "CaO", 1.3992),
    ("SO4", "S", 0.3339), ("S", "SO4", 2.9963),
]  # fmt: skip

# Ratios of formula masses, computed by hand from IUPAC weights; the trade's 2.50 and 4.43 are among them.
BY_HAND = [
    ("SO3", "S", 0.4005), ("NO3", "NO3-N", 0.2259), ("NO3-N", "NO3", 4.4266), ("NH4", "NH4-N", 0.7765),
    ("NH4-N", "NH4", 1.2879), ("H2PO4", "P", 0.3194), ("PO4", "P", 0.3261),
]  # fmt: skip


def converted(written: str, wanted: str) -> float:
    ion, amount = concentration("1000 mg/L", written)
    return in_unit(amount, ion, "mg/L", wanted) / 1000.0


@pytest.mark.parametrize(("written", "wanted", "factor"), SPES_201)
def test_factors_of_the_extension_table(written: str, wanted: str, factor: float) -> None:
    """5e-4: the table uses older atomic weights (its K factors 0.8301 and 1.2051 are not each other's inverse)."""
    assert converted(written, wanted) == pytest.approx(factor, rel=5e-4)


@pytest.mark.parametrize(("written", "wanted", "factor"), BY_HAND)
def test_mass_of_one_form_in_another(written: str, wanted: str, factor: float) -> None:
    assert converted(written, wanted) == pytest.approx(factor, rel=2e-4)


# Oxide to element by division, as suppliers of fertiliser print it (second-hand).
@pytest.mark.parametrize(
    ("oxide", "element", "divisor"),
    [("P2O5", "P", 2.29), ("K2O", "K", 1.20), ("CaO", "Ca", 1.40), ("MgO", "Mg", 1.66), ("SO3", "S", 2.50)],
)
def test_oxides_of_the_fertiliser_bag(oxide: str, element: str, divisor: float) -> None:
    ion, amount = concentration("100 mg/L", oxide)
    assert in_unit(amount, ion, "mg/L", element) == pytest.approx(100.0 / divisor, rel=5e-3)


# Arithmetic on definitions: 1 meq/L = 50.04 mg/L CaCO3 = 61.02 mg/L HCO3 = 2.804 dH; 1 dH = 0.1783 mmol Ca or
# 0.3566 meq; 1 fH = 0.2 meq. 274 mg/L HCO3 = 4.49 meq (UF/IFAS SL142); 50 ppm CaCO3 = 1.0 meq/L (acid tables).
@pytest.mark.parametrize(
    ("text", "species", "ion", "canonical"),
    [
        ("50.04 mg/L", "alkalinity as CaCO3", "HCO3", 1.0),
        ("50,04 ppm CaCO3", "alkalinity", "HCO3", 1.0),
        ("61.02 mg/L", "HCO3", "HCO3", 1.0),
        ("2.804 dH", "alkalinity", "HCO3", 1.0),
        ("1 dH", "Ca", "Ca", 0.1783),
        ("1 \u00b0dH", "Mg", "Mg", 0.1783),
        ("1 dH", "alkalinity", "HCO3", 0.3566),
        ("1 fH", "alkalinity", "HCO3", 0.2),
        ("1 \u00b0f", "Ca", "Ca", 0.1),
        ("274 mg/L", "HCO3", "HCO3", 4.49),
        ("50 ppm", "CaCO3", "HCO3", 1.0),
        ("2.4 mmol/L", "acid capacity to pH 4.3", "HCO3", 2.4),
        ("2.4 meq/L", "alkalinity", "HCO3", 2.4),
    ],
)
def test_alkalinity_and_hardness(text: str, species: str, ion: str, canonical: float) -> None:
    assert concentration(text, species) == (ion, pytest.approx(canonical, rel=1e-3))


def test_the_nitrate_that_was_taken_for_nitrogen() -> None:
    """730 mg/L: as NO3 11.8 mmol/L or 165 mg/L N, as NO3-N 52 mmol/L (a grower's question, recomputed by hand)."""
    assert concentration("730 mg/L", "NO3")[1] == pytest.approx(11.8, abs=0.05)
    assert in_unit(concentration("730 mg/L", "NO3")[1], "NO3", "mg/L", "NO3-N") == pytest.approx(165.0, abs=0.5)
    assert concentration("730 mg/L", "NO3-N")[1] == pytest.approx(52.1, abs=0.1)


def test_a_laboratory_sheet_of_north_america() -> None:
    """SS 260, alkalinity 120 ppm CaCO3, P2O5 90, K2O 300: 2.60 mS/cm, 2.40 meq/L, P 39, K 249 mg/L (by hand)."""
    assert read("260 10^-5 S/cm", "EC").number == pytest.approx(2.60)
    assert concentration("120 ppm CaCO3", "alkalinity")[1] == pytest.approx(2.40, abs=0.005)
    assert in_unit(concentration("90 ppm", "P2O5")[1], "H2PO4", "mg/L", "P") == pytest.approx(39.0, abs=0.5)
    assert in_unit(concentration("300 ppm", "K2O")[1], "K", "mg/L") == pytest.approx(249.0, abs=0.5)


# Hoagland & Arnon 1950, Circular 347, solution 1: mg/L as printed in the usual lists beside its mmol/L.
@pytest.mark.parametrize(
    ("ppm", "species", "mmol_per_l"),
    [
        ("210", "NO3-N", 15.0),
        ("235", "K", 6.0),
        ("200", "Ca", 5.0),
        ("31", "P", 1.0),
        ("64", "S", 2.0),
        ("48.6", "Mg", 2.0),
    ],
)
def test_hoagland_in_ppm(ppm: str, species: str, mmol_per_l: float) -> None:
    assert concentration(f"{ppm} ppm", species)[1] == pytest.approx(mmol_per_l, rel=3e-3)


# Quaderno ARSIA 5/2004, p. 182: 50 mg/L P2O5 is 22 of P, 300 mg/L K2O is 249 of K (factors 0.44 and 0.83).
@pytest.mark.parametrize(("text", "oxide", "element", "mg_per_l"), [("50", "P2O5", "P", 22), ("300", "K2O", "K", 249)])
def test_arsia_example(text: str, oxide: str, element: str, mg_per_l: float) -> None:
    ion, amount = concentration(f"{text} mg/L", oxide)
    assert in_unit(amount, ion, "mg/L", element) == pytest.approx(mg_per_l, abs=0.5)


@pytest.mark.parametrize("species", SPECIES.values(), ids=lambda each: each.name)
def test_formula_masses_against_molmass(species) -> None:
    """Package molmass, its own atomic weights; 2e-4 covers ours, abridged to five digits (S 32.06, not 32.065)."""
    expected = molmass.Formula(species.formula).mass / species.per_formula
    assert species.grams_per_mol_of_ion == pytest.approx(expected, rel=2e-4)


PINT_NAMES = {
    "10^-5 S/cm": "1e-5 S/cm", "mS": "mS/cm", "uS": "uS/cm", "mmho/cm": "mS/cm",
    "mmhos/cm": "mS/cm", "umho/cm": "uS/cm", "umhos/cm": "uS/cm",
    "US gal": "gallon", "gal US": "gallon", "US fl oz": "fluid_ounce", "imp gal": "imperial_gallon",
    "US gal/d": "gallon/day", "L/d": "L/day", "m3/d": "m^3/day", "m3/day": "m^3/day", "L/h": "L/hour",
    "J/cm2": "J/cm^2", "MJ/m2": "MJ/m^2", "kJ/m2": "kJ/m^2", "J/m2": "J/m^2", "Wh/m2": "W*hour/m^2",
    "kWh/m2": "kW*hour/m^2", "m3": "m^3", "dm3": "dm^3", "cm3": "cm^3", "lbs": "lb", "g/m3": "g/m^3",
    "mg/m3": "mg/m^3", "kg/m3": "kg/m^3", "mol/m3": "mol/m^3", "mmol/m3": "mmol/m^3", "ppb": "ug/L", "ppm": "mg/L",
    "mM": "mmol/L", "uM": "umol/L",
}  # fmt: skip
"""What pint, or the definition of a unit it lacks (1 mho is 1 S, SI brochure), calls the units of our tables."""


@pytest.mark.parametrize("what", ["EC", "light", "litres", "litres a day", "kg"])
def test_tabled_units_against_pint(what: str) -> None:
    """Package pint, default registry."""
    registry = pint.UnitRegistry()
    canonical = next(unit for unit, worth in FACTORS[what].items() if worth == 1)
    for unit, worth in FACTORS[what].items():
        quantity = registry.Quantity(PINT_NAMES.get(unit, unit))
        assert quantity.to(PINT_NAMES.get(canonical, canonical)).magnitude == pytest.approx(worth, rel=1e-9), unit


@pytest.mark.parametrize("basis", ["mg/L", "mmol/L"])
def test_tabled_concentrations_against_pint(basis: str) -> None:
    """Package pint, default registry."""
    registry = pint.UnitRegistry()
    for unit, worth in PER_LITRE[basis].items():
        assert registry.Quantity(PINT_NAMES.get(unit, unit)).to(basis).magnitude == pytest.approx(worth, rel=1e-9), unit


@pytest.mark.parametrize(
    ("text", "celsius"),
    [("32 F", 0.0), ("68 \u00b0F", 20.0), ("-40 F", -40.0), ("20.5 \u00b0C", 20.5), ("212 degF", 100.0)],
)
def test_fahrenheit(text: str, celsius: float) -> None:
    """Fixed points of both scales, by definition."""
    assert read(text, "temperature").number == pytest.approx(celsius, abs=1e-12)
