"""Stock tanks against reference chemistry (PHREEQC 3.8.6, phreeqc.dat), handbook solubility and published tables."""

from __future__ import annotations

import numpy as np
import pytest

from fertui.planning.shelf import material
from fertui.planning.stock import stock_sheet
from fertui.planning.tanks import SULFATE_TOLERATED, conflicts, fullest
from fertui.site.model import Composition, Loop, Site, StockTank, Supply

CALCIUM, SULFATE = "calcium nitrate tetrahydrate", "magnesium sulfate heptahydrate"


def on_shelf(name: str, **more):
    return material(Supply(name, name, **more))


@pytest.mark.parametrize("calcium", [25.0, 50.0, 100.0, 250.0, 500.0])
def test_sulfate_a_calcium_stock_tolerates(phreeqc, calcium: float) -> None:
    # PHREEQC adds the salt to a calcium nitrate solution until gypsum is saturated, 20 degrees C
    script = (
        "SELECTED_OUTPUT 1\n-reset false\nUSER_PUNCH 1\n-headings sulfate\n"
        '10 PUNCH TOT("S(6)")\nEND\n'
        f"SOLUTION 1\nunits mmol/kgw\ntemp 20\npH 5\npe 8\nCa {calcium}\nN(5) {2 * calcium} charge\nEND\n"
        "USE solution 1\nEQUILIBRIUM_PHASES 1\nGypsum 0 %s 10\nEND\n"
    )
    potassium, magnesium = (
        1000.0 * float(phreeqc(script % salt, "phreeqc.dat")["sulfate"][-1]) for salt in ("K2SO4", "MgSO4")
    )
    tolerated = np.exp(np.interp(np.log(calcium), *np.log(SULFATE_TOLERATED)))
    assert tolerated == pytest.approx(potassium, rel=0.01)
    assert tolerated < magnesium


def test_calcium_and_sulfate_in_one_hundredfold_tank_are_refused_with_the_gypsum() -> None:
    # feed with SO4 1.5 mmol/L at 100 times = 150 mol in 1000 L = 25.8 kg CaSO4.2H2O (M 172.17)
    amounts = {on_shelf(CALCIUM): 0.5 * 236.15, on_shelf(SULFATE): 0.15 * 246.47}
    refused = conflicts(amounts, 1000.0, "one tank")
    assert [each.pair for each in refused] == [(CALCIUM, SULFATE)]
    assert refused[0].solid_kg == pytest.approx(25.8, abs=0.05)
    assert "25.8 kg" in refused[0].why


def test_the_same_pair_in_the_dilute_tank_is_allowed() -> None:
    # Hoagland No. 1 strength: gypsum SI -1.13 by PHREEQC
    assert conflicts({on_shelf(CALCIUM): 0.005 * 236.15, on_shelf(SULFATE): 0.002 * 246.47}, 1000.0, "tank") == ()


def tomato_times(times: float) -> dict:
    """Tomato recipe (K 9.5 Ca 5.4 Mg 2.4 NH4 1.2 NO3 16 SO4 4.4 P 1.5) concentrated, kg in 1000 L."""
    mmol = {
        "calcium nitrate tetrahydrate": 5.4, "magnesium sulfate heptahydrate": 2.4, "monopotassium phosphate": 0.3,
        "monoammonium phosphate": 1.2, "potassium nitrate": 5.2, "potassium sulfate": 2.0,
    }  # fmt: skip
    return {(each := on_shelf(name)): value * times * each.found.molar_mass / 1000.0 for name, value in mmol.items()}


@pytest.mark.parametrize(("times", "pair"), [(1, None), (3, None), (10, "gypsum"), (100, "gypsum")])
def test_a_concentrated_recipe_drops_gypsum_from_about_five_times(times: float, pair: str | None) -> None:
    # PHREEQC: SI 0 near 5 times (+0.03), +0.38 at 10, +1.7 at 100 times, 20 degrees C
    found = [each for each in conflicts(tomato_times(times), 1000.0, "tank") if "gypsum" in each.why]
    assert bool(found) is (pair is not None)


def test_brushite_from_about_five_times_at_stock_ph() -> None:
    # PHREEQC: brushite SI 0 near pH 5.1 at 5 times, 4.7 at 10 times, 5.8 at 2 times; stocks stand near pH 5
    assert not [each for each in conflicts(tomato_times(2), 1000.0, "tank") if "phosphate falls" in each.why]
    assert [each for each in conflicts(tomato_times(10), 1000.0, "tank") if "phosphate falls" in each.why]


# CRC Handbook 98th ed., g of trade form per kg of added water at 0, 10, 20, 30 degrees C
SOLUBILITY = {
    "potassium nitrate": (136, 214, 319, 456),
    "potassium sulfate": (77, 92, 110, 129),
    "monopotassium phosphate": (133, 175, 223, 278),
    "magnesium sulfate heptahydrate": (594, 800, 1057, 1367),
    "ammonium nitrate": (1174, 1506, 1899, 2367),
    "monoammonium phosphate": (217, 282, 359, 453),
}


@pytest.mark.parametrize("name", SOLUBILITY)
@pytest.mark.parametrize("i", range(4))
def test_one_salt_is_full_at_its_solubility(name: str, i: int) -> None:
    each = on_shelf(name)
    kg = float(SOLUBILITY[name][i])  # per 1000 kg of water; the tank is as large as water and displaced volume
    solid = fullest({each: kg}, 1000.0 + 0.45 * kg, 10.0 * i)
    assert solid is not None
    assert solid.salt == name
    assert solid.degree == pytest.approx(1.0, abs=0.01)


def test_a_common_ion_lowers_what_dissolves() -> None:
    alone = fullest({on_shelf("potassium sulfate"): 60.0}, 1000.0, 10.0)
    beside = fullest({on_shelf("potassium sulfate"): 60.0, on_shelf("potassium nitrate"): 60.0}, 1000.0, 10.0)
    assert beside.degree > 1.2 * alone.degree


def test_the_dutch_tomato_stock_fits_at_100_times_and_not_at_200_in_a_cold_shed() -> None:
    # 35 kg K2SO4, 20 KNO3, 17 MKP, 59 MgSO4, 3 MAP in 1000 L (Nutrient Solutions for Greenhouse Crops 2016) is in use;
    # twice that exceeds the K2SO4 that potassium of the other salts leaves soluble (92 g/kg alone at 10 degrees C, CRC)
    names = {
        "potassium nitrate": 20, "potassium sulfate": 35, "monopotassium phosphate": 17,
        "magnesium sulfate heptahydrate": 59, "monoammonium phosphate": 3,
    }  # fmt: skip
    once = {on_shelf(name): float(kg) for name, kg in names.items()}
    assert fullest(once, 1000.0, 10.0).degree < 1.0
    twice = fullest({each: 2 * kg for each, kg in once.items()}, 1000.0, 10.0)
    assert twice.salt == "potassium sulfate"
    assert twice.degree > 1.0


def site_with(tanks: tuple[StockTank, ...], *names: str, **more) -> tuple[Site, Loop]:
    site = Site("S", "UTC", (), supplies=tuple(Supply(n, n) for n in names), stock_tanks=tanks, **more)
    return site, Loop("l", "drain-blend", 1000.0, "tomato", "stone-wool", stock_tanks=tuple(t.name for t in tanks))


SALTS = (
    "calcium nitrate tetrahydrate",
    "potassium nitrate",
    "monopotassium phosphate",
    "magnesium sulfate heptahydrate",
)
HOAGLAND_1 = Composition({"K": 6, "Ca": 5, "Mg": 2, "NO3": 15, "H2PO4": 1, "SO4": 2})


def test_a_loop_with_one_stock_tank_is_refused() -> None:
    site, loop = site_with((StockTank("all in one", 1000.0),), *SALTS)
    sheet = stock_sheet(site, loop, recipe=HOAGLAND_1, water=Composition({}))
    assert not sheet.feasible
    assert {"calcium nitrate tetrahydrate", "magnesium sulfate heptahydrate"} in [
        set(each.pair) for each in sheet.refused
    ]


def test_a_tank_the_site_describes_with_a_bad_pair_is_refused() -> None:
    bad = StockTank("A", 1000.0, salts_kg={CALCIUM: 100.0, SULFATE: 40.0})
    site, loop = site_with((bad, StockTank("B", 1000.0)), *SALTS)
    sheet = stock_sheet(site, loop, recipe=HOAGLAND_1, water=Composition({}))
    assert not sheet.feasible
    assert sheet.refused[0].tank == "A"


def test_letters_do_not_matter() -> None:
    reversed_letters = (StockTank("calcium", 1000.0, letter="B"), StockTank("sulfate", 1000.0, letter="A"))
    site, loop = site_with(reversed_letters, *SALTS)
    sheet = stock_sheet(site, loop, recipe=HOAGLAND_1, water=Composition({}))
    assert sheet.feasible
    by_content = {tank.content: {line.kind for line in tank.salts} for tank in sheet.tanks}
    assert CALCIUM in by_content["calcium"]
    assert SULFATE in by_content["sulfate"]


# Make-up acid: 5 m3, HCO3 3.5 mmol/L, 0.5 to be left: 3 mmol/L x 5000 L = 15 mol; nitric 60 % 13.02, 38 % 7.435 mol/L
# (densities 1.367 and 1.233 at 20 degrees C: Laliberte 2009 correlation)
@pytest.mark.parametrize(("strength", "litres"), [(60.0, 1.15), (38.0, 2.02)])
def test_make_up_acid(strength: float, litres: float) -> None:
    from fertui.planning.acid import acid_sheet

    supply = Supply("nitric acid", "nitric acid", strength_pct=strength)
    site = Site("S", "UTC", (), supplies=(supply,))
    loop = Loop("l", "shared-tank", 500.0, "lettuce", "none", tank_l=5000.0)
    sheet = acid_sheet(site, loop, water=Composition({"HCO3": 3.5}))
    assert sheet.litres_total == pytest.approx(litres, abs=0.005)
    assert sheet.adds_mmol_l == pytest.approx({"NO3": 3.0})
    assert sum(each.litres for each in sheet.splits) == pytest.approx(sheet.litres_total)
    assert max(each.litres for each in sheet.splits) <= sheet.litres_closed / 3 + 1e-9


# Published table (horticultural supplier, "Acid choices", table 1): per 50 ppm CaCO3 in 100 US gal
US_GALLON_L, US_FLUID_OUNCE_L = 3.785411784, 0.0295735295625


@pytest.mark.parametrize(
    ("kind", "strength", "ounces", "element", "ppm"),
    [("nitric acid", 67.0, 0.87, "N", 14.3), ("sulfuric acid", 35.0, 1.42, "S", 16.1)],
)
def test_published_acid_table(kind: str, strength: float, ounces: float, element: str, ppm: float) -> None:
    from fertui.planning.acid import acid_sheet

    site = Site("S", "UTC", (), supplies=(Supply(kind, kind, strength_pct=strength),))
    loop = Loop("l", "shared-tank", 500.0, "lettuce", "none", tank_l=100 * US_GALLON_L)
    sheet = acid_sheet(site, loop, water=Composition({"HCO3": 50 / 50.04 + 0.5}))  # 1 meq/L = 50.04 mg/L CaCO3
    assert sheet.litres_total / US_FLUID_OUNCE_L == pytest.approx(ounces, rel=0.02)
    assert sheet.adds_mg_l[element] == pytest.approx(ppm, rel=0.025)
