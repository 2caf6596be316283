"""Label analyses and strengths -> what a kilogram brings."""

from __future__ import annotations

from types import SimpleNamespace
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fertui.catalogue.acids import acids
from fertui.catalogue.figures import CatalogueError
from fertui.catalogue.salts import salt, salts
from fertui.catalogue.supplies import LABEL_SPECIES, contents, of_supply, substance
from fertui.chemistry.names import CHARGES


def supply(kind: str, label: dict[str, float] | None = None, strength: float | None = None) -> Any:
    return SimpleNamespace(name=kind, kind=kind, label_pct=label or {}, strength_pct=strength)


def imbalance_pct(kind: str, amounts: dict[str, float]) -> float:
    found = of_supply(supply(kind))
    charges = [getattr(found, "charge_of", CHARGES.get)(ion) * mmol for ion, mmol in amounts.items()]
    return 100.0 * sum(charges) / sum(abs(each) for each in charges)


def test_a_blend_has_no_formula_to_count_by() -> None:
    assert salt("blend").mmol_per_kg == {}


def test_without_a_label_the_formula_counts() -> None:
    assert contents(supply("KNO3")) == pytest.approx({"K": 9891.0, "NO3": 9891.0}, rel=1e-4)


# Guaranteed analyses as printed on bags, in percent of the product: a growers' handbook on fertiliser quality (seen).
BAGS = {
    "calcium nitrate double salt": {"Ca": 19, "NO3-N": 14.4, "NH4-N": 1.1},
    "calcium nitrate tetrahydrate": {"NO3-N": 11.8, "Ca": 17},
    "potassium nitrate": {"NO3-N": 13, "K": 38},
    "magnesium nitrate": {"NO3-N": 11, "Mg": 9.5},
    "magnesium sulfate": {"Mg": 10, "S": 13},
    "monopotassium phosphate": {"P": 22, "K": 28},
    "potassium sulfate": {"K": 42, "S": 17},
    "monoammonium phosphate": {"NH4-N": 12, "P": 27},
    "calcium chloride dihydrate": {"Ca": 27, "Cl": 48},
    "potassium chloride": {"K": 52, "Cl": 48},
}


@pytest.mark.parametrize("kind", BAGS)
def test_printed_analyses_are_accepted_and_close_in_charge_within_five_percent(kind: str) -> None:
    amounts = contents(supply(kind, BAGS[kind]))
    assert abs(imbalance_pct(kind, amounts)) < 5.0


def test_a_label_goes_before_the_formula() -> None:
    """K2SO4 at 42 % K instead of the formula's 44.9: 420 g/kg over 39.098 g/mol (Quaderno ARSIA 5/2004 has 43)."""
    assert contents(supply("K2SO4", {"K": 42, "S": 17}))["K"] == pytest.approx(420_000 / 39.098)


# Factors to the element: Virginia Cooperative Extension SPES-201, conversion factors (P2O5 0.4365, K2O 0.8301,
# MgO 0.6032, CaO 0.7147); SO3 to S 0.4005 from atomic weights.
@pytest.mark.parametrize(
    ("kind", "oxide", "element"),
    [
        ("MKP", {"P2O5": 52.0, "K2O": 34.0}, {"P": 52.0 * 0.4365, "K": 34.0 * 0.8301}),
        ("magnesium sulfate", {"MgO": 16.0, "SO3": 32.0}, {"Mg": 16.0 * 0.6032, "S": 32.0 * 0.4005}),
        ("calcium nitrate tetrahydrate", {"CaO": 24.0, "NO3-N": 11.8}, {"Ca": 24.0 * 0.7147, "NO3-N": 11.8}),
    ],
)
def test_oxides_and_elements_agree(kind: str, oxide: dict[str, float], element: dict[str, float]) -> None:
    assert contents(supply(kind, oxide)) == pytest.approx(contents(supply(kind, element)), rel=3e-4)


@pytest.mark.parametrize(
    ("kind", "label", "filled"),
    [
        ("potassium nitrate", {"K2O": 46}, "NO3"),
        ("potassium bicarbonate", {"K": 39}, "HCO3"),
        ("calcium nitrate double salt", {"Ca": 19, "NO3-N": 14.4}, "NH4"),
        ("iron DTPA", {"Fe": 11}, "Na"),
        ("potassium silicate", {"K2O": 12, "SiO2": 24}, "HCO3"),
        ("blend", {"NO3-N": 8, "P2O5": 10, "K2O": 30, "MgO": 3}, "SO4"),
    ],
)
def test_what_a_label_leaves_out_closes_the_charge(kind: str, label: dict[str, float], filled: str) -> None:
    amounts = contents(supply(kind, label))
    assert amounts[filled] > 0
    assert imbalance_pct(kind, amounts) == pytest.approx(0.0, abs=1e-9)


@given(st.sampled_from(sorted(BAGS)), st.floats(0.5, 0.999))
def test_a_diluted_bag_brings_proportionally_less(kind: str, part: float) -> None:
    whole = contents(supply(kind, BAGS[kind]))
    diluted = contents(supply(kind, {species: pct * part for species, pct in BAGS[kind].items()}))
    assert diluted == pytest.approx({ion: mmol * part for ion, mmol in whole.items()})


@pytest.mark.parametrize(
    ("kind", "label", "says"),
    [
        ("potassium nitrate", {"K": 38, "NO3-N": 2}, "does not balance"),
        ("potassium nitrate", {"K": -1}, "0 to 100"),
        ("potassium nitrate", {"K": float("nan")}, "0 to 100"),
        ("potassium nitrate", {"K": 38, "K2O": 46}, "twice"),
        ("potassium nitrate", {"Kalium": 38}, "allowed: K, K2O"),
        ("ammonium nitrate", {"N": 34}, "NO3-N and NH4-N"),
        ("magnesium sulfate", {"Mg": 60, "S": 79}, "more than 100 %"),
        ("potassium silicate", {}, "label only"),
        ("blend", {}, "label only"),
        ("blend", {"NO3-N": 20, "K2O": 5}, "does not balance"),
    ],
)
def test_an_impossible_label_is_refused_with_its_reason(kind: str, label: dict[str, float], says: str) -> None:
    with pytest.raises(CatalogueError, match=says):
        contents(supply(kind, label))


def test_n_alone_is_nitrate_where_the_salt_has_no_other() -> None:
    assert contents(supply("KNO3", {"N": 13, "K": 38})) == contents(supply("KNO3", {"NO3-N": 13, "K": 38}))


@pytest.mark.parametrize("found", [each for each in acids() if each.name != "citric acid"], ids=lambda each: each.name)
def test_every_acid_and_lye_is_neutral_with_its_alkalinity(found: Any) -> None:
    amounts = contents(supply(found.name, strength=20.0))
    assert sum(CHARGES[ion] * mmol for ion, mmol in amounts.items()) == pytest.approx(0.0, abs=1e-6)
    assert amounts["HCO3"] == pytest.approx(-found.protons * 2e5 / found.molar_mass)


def test_an_acid_needs_the_strength_on_its_label() -> None:
    with pytest.raises(CatalogueError, match="mass % on its label"):
        contents(supply("nitric acid"))
    with pytest.raises(CatalogueError, match="not possible"):
        contents(supply("nitric acid", strength=120.0))
    with pytest.raises(CatalogueError, match="not an acid"):
        contents(supply("potassium nitrate", strength=20.0))


def test_a_solid_alkali_is_a_salt_and_its_solution_an_acid_of_negative_protons() -> None:
    assert contents(supply("KOH"))["HCO3"] == pytest.approx(contents(supply("KOH", strength=50.0))["HCO3"] * 2)


@pytest.mark.parametrize("name", [each.name for each in (*salts(), *acids())])
def test_every_substance_is_found(name: str) -> None:
    assert substance(name).name == name


@pytest.mark.parametrize("species", LABEL_SPECIES)
def test_a_blend_may_name_every_species(species: str) -> None:
    ion = LABEL_SPECIES[species][0]
    base = {"Na": 38.0, "Cl": 58.6} if ion in ("K", "NO3") else {"K": 37.9, "NO3-N": 13.57}
    assert contents(supply("blend", {**base, species: 0.3}))[ion] > 0


@pytest.mark.parametrize(
    ("written", "near"),
    [
        ("ca", "calcium nitrate double salt, calcium nitrate tetrahydrate"),
        ("phosphoric acd", "phosphoric acid"),
        ("calcium nitrat", "calcium nitrate double salt, calcium nitrate tetrahydrate"),
        ("unobtainium", "calcium nitrate double salt, calcium nitrate tetrahydrate, potassium nitrate"),
    ],
)
def test_an_unknown_name_is_answered_with_names_of_the_catalogue_each_once(written: str, near: str) -> None:
    with pytest.raises(CatalogueError, match=f"{written}.*{near}") as refused:
        substance(written)
    assert str(refused.value).count("double salt") <= 1
