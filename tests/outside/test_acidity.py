"""Acid and base demand and pH against PHREEQC, kept and live, and against a published table of doses."""

from __future__ import annotations

import numpy as np
import pytest

from fertui.chemistry.acidity import (
    ACIDS,
    AIR_CO2_PPM,
    Water,
    acid_demand,
    alkalinity,
    base_demand,
    ph,
    solution_ml_per_m3,
    total_carbonate,
)

# PHREEQC 3.8.6, Amm.dat, 20 C: Ca(HCO3)2 + 0.5 Mg + 1 Na + 1 Cl + 0.5 SO4 mmol/kgw at log pCO2 -2.5. Columns:
# alkalinity [meq/L], its pH, target pH, dose [mmol/kgw] of HNO3 closed, HNO3 open, H2SO4 closed, H3PO4 closed and open.
TITRATIONS = [
    (2, 7.55, 5.8, 1.532, 1.997, 0.766, 1.443, 1.881),
    (3, 7.72, 6.5, 1.166, 2.978, 0.583, 0.923, 2.362),
    (3, 7.72, 6.2, 1.698, 2.990, 0.848, 1.474, 2.598),
    (3, 7.72, 5.8, 2.308, 2.997, 1.154, 2.165, 2.811),
    (3, 7.72, 5.5, 2.612, 3.001, 1.306, 2.526, 2.902),
    (3, 7.72, 4.5, 2.991, 3.035, 1.497, 2.992, 3.036),
    (4, 7.84, 5.8, 3.083, 3.997, 1.541, 2.881, 3.735),
    (5, 7.93, 5.8, 3.858, 4.997, 1.928, 3.593, 4.653),
]
DOSES = [("nitric", False), ("nitric", True), ("sulfuric", False), ("phosphoric", False), ("phosphoric", True)]
WAYS = [(row[:3], *dose, row[3 + column]) for row in TITRATIONS for column, dose in enumerate(DOSES)]


def _strength(alkalinity_meq: float) -> float:
    """Ionic strength [mol/L] of that water: half as much Ca as alkalinity, and the other ions."""
    return 0.5e-3 * (4 * alkalinity_meq / 2 + 4 * 0.5 + 1 + 1 + 4 * 0.5 + alkalinity_meq)


@pytest.mark.parametrize(("water", "acid", "is_open", "dose"), WAYS)
def test_titrations_within_1_percent_given_the_ionic_strength(
    water: tuple[float, float, float], acid: str, is_open: bool, dose: float
) -> None:
    got = acid_demand(*water, open_to_air=is_open, acid=acid, ionic_strength=_strength(water[0]))
    assert got == pytest.approx(dose, rel=0.01)


@pytest.mark.parametrize(("water", "acid", "is_open", "dose"), WAYS)
def test_titrations_within_1_percent_given_the_ions(
    water: tuple[float, float, float], acid: str, is_open: bool, dose: float
) -> None:
    ions = {"Ca": water[0] / 2, "Mg": 0.5, "Na": 1, "Cl": 1, "SO4": 0.5, "HCO3": water[0]}
    got = acid_demand(*water, open_to_air=is_open, acid=acid, ions_mmol_per_l=ions)
    assert got == pytest.approx(dose, rel=0.01)


@pytest.mark.parametrize(("water", "acid", "is_open", "dose"), WAYS)
def test_alkalinity_alone_stays_within_1_percent(
    water: tuple[float, float, float], acid: str, is_open: bool, dose: float
) -> None:
    assert acid_demand(*water, open_to_air=is_open, acid=acid) == pytest.approx(dose, rel=0.01)


def test_closed_line_77_percent_open_tank_100_percent() -> None:
    """3 meq/L to pH 5.8: 77 % of the alkalinity in a closed line, all of it in an open tank (PHREEQC, as above)."""
    closed, is_open = (acid_demand(3.0, 7.72, 5.8, way, ionic_strength=_strength(3)) / 3.0 for way in (False, True))
    assert closed == pytest.approx(0.77, abs=0.005)
    assert is_open == pytest.approx(1.00, abs=0.005)


# Fluid ounces of trade acid per 100 US gallons that neutralise 50 ppm of alkalinity as CaCO3, and the ppm of nutrient
# that dose brings: a growing-media maker, "Acid choices", table 1. Densities at 20 C [kg/m3]: Laliberte 2009.
TABLE = [
    ("nitric", 67, 1399.3, 0.87, ("N", 14.007, 14.3)),
    ("sulfuric", 35, 1260.9, 1.42, ("S", 32.06, 16.1)),
    ("phosphoric", 75, 1576.1, 0.94, ("P", 30.974, 27.5)),
]
US_GALLON_L, FLUID_OUNCE_ML = 3.785412, 29.57353


@pytest.mark.parametrize(("acid", "strength", "density", "ounces", "nutrient"), TABLE[:2])
def test_published_table_by_volume(
    acid: str, strength: float, density: float, ounces: float, nutrient: tuple[str, float, float]
) -> None:
    """50 ppm CaCO3 is 0.9993 meq/L; the table neutralises all of it, the protons of these acids all count."""
    demand = acid_demand(50 / 50.04, 7.5, 5.0, open_to_air=True, acid=acid)
    per_100_gallons = solution_ml_per_m3(demand, acid, strength, density) * 100 * US_GALLON_L / 1000 / FLUID_OUNCE_ML
    assert per_100_gallons == pytest.approx(ounces, rel=0.02)


@pytest.mark.parametrize(("acid", "strength", "density", "ounces", "nutrient"), TABLE)
def test_published_table_by_nutrient_per_fluid_ounce(
    acid: str, strength: float, density: float, ounces: float, nutrient: tuple[str, float, float]
) -> None:
    ml_per_m3_of_1_mmol = solution_ml_per_m3(1.0, acid, strength, density)
    ounce = FLUID_OUNCE_ML / (100 * US_GALLON_L / 1000) / ml_per_m3_of_1_mmol  # mmol/L from one ounce in 100 gallons
    _, weight, ppm = nutrient
    assert ounce * weight == pytest.approx(ppm / ounces, rel=0.03 if acid == "nitric" else 0.02)


def test_published_phosphoric_dose_is_that_of_ph_6_1() -> None:
    """0.94 fl oz of 75 % H3PO4 for 50 ppm is 1.127 protons a molecule: the acid's second step, near pH 6.1."""
    dose = 0.94 * FLUID_OUNCE_ML / (100 * US_GALLON_L / 1000) / solution_ml_per_m3(1.0, "phosphoric", 75, 1576.1)
    protons = 50 / 50.04 / dose
    assert protons == pytest.approx(ACIDS["phosphoric"].protons(6.1, Water.hard(3.0)), rel=0.02)


def test_published_citric_dose_is_that_of_ph_5_8_to_6() -> None:
    """1.78 fl oz of 50 % citric acid for 50 ppm is 2.2 protons a molecule (same table); density 1.24 from memory."""
    dose = 1.78 * FLUID_OUNCE_ML / (100 * US_GALLON_L / 1000) / solution_ml_per_m3(1.0, "citric", 50, 1240)
    protons = 50 / 50.04 / dose
    assert ACIDS["citric"].protons(5.6, Water.hard(1.0)) < protons < ACIDS["citric"].protons(6.0, Water.hard(1.0))


REACTANT = {"nitric": "HNO3", "hydrochloric": "HCl", "sulfuric": "H2SO4", "phosphoric": "H3PO4"}


@pytest.mark.parametrize("acid", REACTANT)
@pytest.mark.parametrize("is_open", [False, True])
def test_random_waters_against_phreeqc_live(phreeqc, acid: str, is_open: bool) -> None:
    rng = np.random.default_rng(sum(map(ord, acid)))
    for _ in range(12):
        ions = {"Ca": rng.uniform(0.3, 2.5), "Mg": rng.uniform(0.1, 1.0), "Na": rng.uniform(0.2, 3.0)}
        ions |= {"SO4": rng.uniform(0.1, 1.0), "Cl": 1.0, "HCO3": rng.uniform(1.0, 5.0)}
        start, target, temperature = rng.uniform(7.2, 8.0), rng.uniform(5.0, 6.4), rng.uniform(10, 30)
        reference = _titrated(phreeqc, ions, start, target, temperature, REACTANT[acid], is_open)
        got = acid_demand(ions["HCO3"], start, target, is_open, temperature, acid, ions_mmol_per_l=ions)
        assert got == pytest.approx(reference, rel=0.01)


@pytest.mark.parametrize(("base", "formula"), [("KOH", "KOH"), ("KHCO3", "KHCO3"), ("K2CO3", "K2CO3")])
def test_bases_against_phreeqc_live(phreeqc, base: str, formula: str) -> None:
    """A drain of pH 4.8-5.2 brought up to 5.8-6.2 without losing CO2, phosphate and ammonium in it."""
    rng = np.random.default_rng(len(base))
    for _ in range(12):
        ions = {"K": rng.uniform(4, 9), "Ca": rng.uniform(3, 7), "Mg": rng.uniform(1, 3), "SO4": rng.uniform(1, 4)}
        ions |= {"H2PO4": rng.uniform(0.5, 1.5), "NH4": rng.uniform(0, 1), "HCO3": rng.uniform(0.1, 0.5)}
        ions["NO3"] = ions["K"] + 2 * ions["Ca"] + 2 * ions["Mg"] - 2 * ions["SO4"] - ions["H2PO4"]
        start, target, temperature = rng.uniform(4.8, 5.2), rng.uniform(5.8, 6.2), rng.uniform(15, 28)
        reference = _titrated(phreeqc, ions, start, target, temperature, formula, is_open=False)
        got = base_demand(ions["HCO3"], start, target, False, temperature, base, ions_mmol_per_l=ions)
        assert got == pytest.approx(reference, rel=0.02)


def _titrated(
    phreeqc, ions: dict[str, float], start: float, target: float, temperature: float, reactant: str, is_open: bool
) -> float:
    """mmol of reactant per kg of water that PHREEQC adds to reach the target pH."""
    names = {"NH4": "Amm", "NO3": "N(5)", "SO4": "S(6)", "H2PO4": "P", "HCO3": "Alkalinity"}
    totals = "\n".join(f"{names.get(ion, ion)} {value}" for ion, value in ions.items())
    air = f"CO2(g) {np.log10(AIR_CO2_PPM * 1e-6)} 10\n" if is_open else ""
    script = (
        "SELECTED_OUTPUT 1\n-reset false\nUSER_PUNCH 1\n-headings dose ph\n"
        '10 PUNCH 1 - EQUI("Fix_H+"), -LA("H+")\nEND\n'
        "PHASES\nFix_H+\nH+ = H+\nlog_k 0\nEND\n"
        f"SOLUTION 1\nunits mmol/kgw\ntemp {temperature}\npH {start}\npe 8\n{totals}\nEND\n"
        f"USE solution 1\nEQUILIBRIUM_PHASES 1\nFix_H+ {-target} {reactant} 1\n{air}END\n"
    )
    columns = phreeqc(script)
    assert columns["ph"][-1] == pytest.approx(target, abs=1e-4)
    return 1000 * float(columns["dose"][-1])


def test_ph_against_phreeqc_live(phreeqc) -> None:
    """Nutrient solution open to air: pH from alkalinity and ions."""
    rng = np.random.default_rng(5)
    for _ in range(12):
        ions = {"K": rng.uniform(4, 9), "Ca": rng.uniform(3, 7), "Mg": rng.uniform(1, 3), "SO4": rng.uniform(1, 4)}
        ions |= {"H2PO4": rng.uniform(0.5, 1.5), "NH4": rng.uniform(0, 1), "HCO3": rng.uniform(0.3, 1.5)}
        names = {"NH4": "Amm", "SO4": "S(6)", "H2PO4": "P", "HCO3": "Alkalinity"}
        totals = "\n".join(f"{names.get(ion, ion)} {value}" for ion, value in ions.items())
        reference = float(
            phreeqc(
                'SELECTED_OUTPUT 1\n-reset false\nUSER_PUNCH 1\n-headings ph\n10 PUNCH -LA("H+")\nEND\n'
                f"SOLUTION 1\nunits mmol/kgw\ntemp 20\npH 5.5\npe 8\nN(5) 10\n{totals}\nEND\n"
                f"USE solution 1\nEQUILIBRIUM_PHASES 1\nCO2(g) {np.log10(AIR_CO2_PPM * 1e-6)} 10\nEND\n"
            )["ph"][-1]
        )
        water = Water.of(ions | {"NO3": 10}, ph=reference, temperature_c=20)
        assert ph(ions["HCO3"], water) == pytest.approx(reference, abs=0.02)


def test_ph_undoes_alkalinity() -> None:
    water = Water.of({"Ca": 3, "Mg": 1, "SO4": 1, "H2PO4": 1, "NH4": 0.5}, ph=6.0)
    values = np.linspace(3.5, 9.0, 40)
    assert ph(alkalinity(values, water, 2.0), water, 2.0) == pytest.approx(values, abs=1e-6)
    assert ph(alkalinity(values, water), water) == pytest.approx(values, abs=1e-6)
    assert total_carbonate(alkalinity(7.0, water, 2.0), 7.0, water) == pytest.approx(2.0)
