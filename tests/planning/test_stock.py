"""Stock-tank sheets: remainders, bags, liquids, pre-solutions, silicate, order, micronutrients."""

from __future__ import annotations

import pytest

from fertui.catalogue.figures import CatalogueError
from fertui.chemistry.ions import INDEX
from fertui.planning.acid import acid_sheet
from fertui.planning.last_mix import last_mix
from fertui.planning.shelf import PlanningError, material, shelf
from fertui.planning.stock import StockSheet, stock_sheet
from fertui.planning.tanks import conflicts, content_of, shared_so_both_weigh_alike
from fertui.planning.weighing import Scale, scales_of, weigh
from fertui.site.model import Composition, Instrument, Loop, Site, StockTank, Supply

SALTS = (
    "calcium nitrate tetrahydrate",
    "potassium nitrate",
    "monopotassium phosphate",
    "magnesium sulfate heptahydrate",
)
HOAGLAND_1 = Composition({"K": 6, "Ca": 5, "Mg": 2, "NO3": 15, "H2PO4": 1, "SO4": 2})  # Circular 347
SILICATE = Supply("silicate", "potassium silicate", label_pct={"K2O": 10.0, "SiO2": 20.0}, density_kg_per_l=1.3)
TANKS = (StockTank("calcium", 1000.0), StockTank("sulfate", 1000.0))


def sheet_of(*, recipe: Composition = HOAGLAND_1, tanks=TANKS, supplies=None, water=None, **more) -> StockSheet:
    shelf_ = supplies or tuple(Supply(name, name) for name in SALTS)
    site = Site("S", "UTC", (), supplies=shelf_, stock_tanks=tanks, scale_step_kg=0.05)
    loop = Loop("l", "drain-blend", 1000.0, "tomato", "stone-wool", stock_tanks=tuple(each.name for each in tanks))
    return stock_sheet(site, loop, recipe=recipe, water=water or Composition({}), **more)


def kg(sheet: StockSheet) -> dict[str, float]:
    found: dict[str, float] = {}
    for tank in sheet.tanks:
        for line in tank.salts:
            found[line.kind] = found.get(line.kind, 0.0) + line.kg
    return found


def test_hoagland_at_100_times_is_molar_mass_times_mmol() -> None:
    # mmol/L x M x 100 x 1000 L: Ca(NO3)2.4H2O 5 x 236.15, KNO3 5 x 101.10, KH2PO4 136.09, MgSO4.7H2O 2 x 246.47
    expected = {
        "calcium nitrate tetrahydrate": 118.1, "potassium nitrate": 50.55, "monopotassium phosphate": 13.6,
        "magnesium sulfate heptahydrate": 49.3,
    }  # fmt: skip
    assert kg(sheet_of()) == pytest.approx(expected, abs=0.06)


def test_ammonium_of_the_double_salt_is_no_reason_to_leave_out_the_calcium() -> None:
    pepper = Composition({"K": 7.8, "Ca": 4.5, "Mg": 1.5, "NH4": 0.5, "NO3": 15.5, "SO4": 1.75, "H2PO4": 1.25})
    names = ("calcium nitrate double salt", *SALTS[1:], "magnesium nitrate hexahydrate", "potassium sulfate")
    sheet = sheet_of(recipe=pepper, supplies=tuple(Supply(name, name) for name in names))
    assert sheet.ions_mmol_l["Ca"] > 0.93 * 4.5
    # 5Ca(NO3)2.NH4NO3.10H2O: a fifth of its calcium; a feed may have 1.0-1.5 (Nutrient Solutions 2016, second-hand)
    assert sheet.ions_mmol_l["NH4"] == pytest.approx(sheet.ions_mmol_l["Ca"] / 5.0, rel=0.02)
    assert any("NH4" in each and "without ammonium" in each for each in sheet.notices)


def test_a_water_that_nobody_analysed_is_said_on_the_sheet() -> None:
    assert any("never analysed" in each for each in sheet_of().notices)
    pure = Composition(dict.fromkeys(("Ca", "Na"), 0.0))
    assert not any("never analysed" in each for each in sheet_of(water=pure).notices)


def test_both_tanks_weigh_alike_through_potassium_nitrate() -> None:
    # calcium nitrate alone (118 kg) outweighs all else (113 kg): all potassium nitrate goes with the sulfates
    sheet = sheet_of()
    assert {line.kind for line in sheet.tanks[0].salts} == {"calcium nitrate tetrahydrate"}
    assert shared_so_both_weigh_alike(10.0, 30.0, 40.0) == (30.0, 10.0)


def test_ion_by_ion_the_rounded_lines_deliver_what_the_sheet_says() -> None:
    sheet = sheet_of()
    for ion, value in HOAGLAND_1.ions.items():
        assert sheet.ions_mmol_l[ion] == pytest.approx(value, rel=0.005)
    assert sheet.ec == pytest.approx(2.16, abs=0.02)  # PHREEQC: 2.160 mS/cm at 25 degrees C


def test_a_remainder_of_the_same_stock_is_taken_off() -> None:
    full = kg(sheet_of())
    held = tuple(
        StockTank(tank.name, tank.litres, salts_kg={line.salt: line.kg for line in sheet.salts})
        for tank, sheet in zip(TANKS, sheet_of().tanks, strict=True)
    )
    rest = kg(sheet_of(tanks=held, remainder_l={"calcium": 200.0, "sulfate": 200.0}))
    assert rest == pytest.approx({name: 0.8 * value for name, value in full.items()}, abs=0.06)


def test_a_remainder_too_rich_for_the_new_recipe_is_said() -> None:
    held = (StockTank("calcium", 1000.0, salts_kg={"calcium nitrate tetrahydrate": 700.0}), TANKS[1])
    sheet = sheet_of(tanks=held, remainder_l={"calcium": 500.0})
    assert any("use it up first" in each for each in sheet.tanks[0].notices)


def test_bags_and_rest_liquids_and_scales() -> None:
    scales = [Scale("bench", 0.001, 2.0), Scale("floor", 0.05, 60.0)]
    bag = material(Supply("Ca", "calcium nitrate double salt", bag_kg=25.0))
    line = weigh(bag, 106.02, scales)
    assert (line.bags, line.rest_kg, line.kg, line.scale) == (4, 6.0, 106.0, "floor")
    acid = material(Supply("acid", "nitric acid", strength_pct=38.0))
    poured = weigh(acid, 12.33, scales)
    assert poured.litres == pytest.approx(10.0, abs=0.01)  # density 1.233: Laliberte 2009
    assert poured.strength_pct == 38.0


def test_molybdate_on_a_five_gram_scale_goes_by_way_of_a_pre_solution() -> None:
    # field practice, scenario 25: 12.1 g on a 5 g scale is +-21 %
    molybdate = material(Supply("Mo", "sodium molybdate"))
    line = weigh(molybdate, 0.0121, [Scale("scale", 0.005)])
    assert line.pre_solution is not None
    assert line.pre_solution.batches == 10
    assert line.pre_solution.weigh_kg == pytest.approx(0.120, abs=1e-9)
    assert line.kg == pytest.approx(0.0121, rel=0.02)
    assert "21 %" in line.words


def test_the_finest_scale_that_carries_a_weight_is_taken() -> None:
    site = Site(
        "S", "UTC", (), scale_step_kg=0.05, instruments=(Instrument("bench", "scale", step_kg=0.001, capacity_kg=3.0),)
    )
    salt = material(Supply("KNO3", "potassium nitrate"))
    assert weigh(salt, 2.4567, scales_of(site)).kg == pytest.approx(2.457)
    assert weigh(salt, 24.567, scales_of(site)).kg == pytest.approx(24.55)


def test_silicate_counts_its_potassium_and_alkalinity_and_stands_alone() -> None:
    acid = Supply("nitric acid", "nitric acid", strength_pct=60.0)
    supplies = (*(Supply(name, name) for name in SALTS), SILICATE, acid)
    recipe = Composition({**HOAGLAND_1.ions}, {"Si": 1000.0})
    tanks = (*TANKS, StockTank("silicate", 500.0), StockTank("acid", 500.0))
    water = Composition({"HCO3": 2.0, "Ca": 1.0})
    sheet = sheet_of(recipe=recipe, supplies=supplies, tanks=tanks, water=water, acid=acid)
    by_name = {tank.name: tank for tank in sheet.tanks}
    assert sheet.feasible
    assert [line.kind for line in by_name["silicate"].salts] == ["potassium silicate"]
    assert [line.kind for line in by_name["acid"].salts] == ["nitric acid"]
    assert sheet.micros_umol_l["Si"] == pytest.approx(1000.0, rel=0.01)
    assert sheet.ions_mmol_l["K"] == pytest.approx(6.0, rel=0.01)
    assert sheet.ions_mmol_l["HCO3"] == pytest.approx(0.5, abs=0.05)  # water 2.0 and the silicate's, less the acid
    assert sheet.ions_mmol_l["NO3"] == pytest.approx(15.0 - 0.5, rel=0.01)  # the bicarbonate left takes its charge


@pytest.mark.parametrize(
    ("one", "other"),
    [
        (SILICATE, Supply("Ca", "calcium nitrate tetrahydrate")),
        (Supply("K2CO3", "potassium carbonate"), Supply("Mg", "magnesium sulfate heptahydrate")),
        (Supply("K2CO3", "potassium carbonate"), Supply("acid", "nitric acid", strength_pct=38.0)),
        (Supply("acid", "phosphoric acid", strength_pct=75.0), Supply("Ca", "calcium nitrate tetrahydrate")),
        (Supply("acid", "sulfuric acid", strength_pct=37.0), Supply("Ca", "calcium nitrate double salt")),
        (Supply("acid", "nitric acid", strength_pct=38.0), Supply("Fe", "iron DTPA")),
        (Supply("Ca", "calcium nitrate double salt"), Supply("MKP", "monopotassium phosphate")),
    ],
)  # fmt: skip
def test_pairs_that_must_not_share_a_tank(one: Supply, other: Supply) -> None:
    refused = conflicts({material(one): 20.0, material(other): 20.0}, 1000.0, "tank")
    assert any(set(each.pair) == {one.name, other.name} for each in refused)


@pytest.mark.parametrize(("kind", "strength", "ion"), [("nitric acid", 60.0, "NO3"), ("sulfuric acid", 37.0, "SO4")])
def test_the_acid_of_the_acid_sheet_comes_off_the_salts(kind: str, strength: float, ion: str) -> None:
    acid = Supply(kind, kind, strength_pct=strength)
    water = Composition({"HCO3": 2.3, "Ca": 0.9})
    shelf_ = (*(Supply(name, name) for name in (*SALTS, "potassium sulfate", "magnesium nitrate hexahydrate")), acid)
    sheet = sheet_of(supplies=shelf_, water=water, acid_in_water=acid)
    site = Site("S", "UTC", (), supplies=shelf_)
    loop = Loop("l", "drain-blend", 1000.0, "tomato", "stone-wool")
    poured = acid_sheet(site, loop, water=water, acid=acid, volume_l=1000.0).adds_mmol_l
    # 2.3 - 0.5 left = 1.8 meq/L: 1.8 mmol/L of a monobasic acid, 0.9 of sulfuric (definition of the equivalent)
    assert poured[ion] == pytest.approx({"NO3": 1.8, "SO4": 0.9}[ion], rel=0.01)
    salts = sum(
        line.kg * material(Supply(line.kind, line.kind)).ions_mmol_per_kg[INDEX[ion]] / tank.litres / tank.dilution
        for tank in sheet.tanks
        for line in tank.salts
    )
    assert salts + poured[ion] == pytest.approx(HOAGLAND_1.ions[ion], abs=0.6)  # 0.5 meq/L of HCO3 and what Ca leaves
    assert salts + poured[ion] == pytest.approx(sheet.ions_mmol_l[ion], abs=0.01)
    assert sheet.ions_mmol_l["HCO3"] == pytest.approx(0.5, abs=0.01)
    assert not any(line.kind == kind for tank in sheet.tanks for line in tank.salts)
    assert any(f"- {poured[ion]:.3f} acid in the water" in line for line in sheet.arithmetic)
    (words,) = (each for each in sheet.notices if each.startswith("HCO3"))
    assert "2.3 meq/L" in words
    assert kind in words


def test_an_acid_that_brings_more_than_the_recipe_asks_is_named() -> None:
    acid = Supply("phosphoric acid", "phosphoric acid", strength_pct=75.0)
    shelf_ = (*(Supply(name, name) for name in SALTS), acid)
    sheet = sheet_of(supplies=shelf_, water=Composition({"HCO3": 3.5}), acid_in_water=acid)
    # 3.0 meq/L by about one proton a mole of H3PO4: three times the 1.0 mmol/L that is asked (Circular 347)
    assert any("the water and its acid bring" in each and each.startswith("H2PO4") for each in sheet.notices)
    assert "monopotassium phosphate" not in kg(sheet)


def test_hard_water_without_acid_on_the_shelf_is_named() -> None:
    hard = sheet_of(water=Composition({"HCO3": 3.5, "Ca": 1.5}))
    assert any(each.startswith("HCO3: the water brings 3.5 meq/L and no acid") for each in hard.notices)
    assert not any(each.startswith("HCO3") for each in sheet_of(water=Composition({"HCO3": 0.4})).notices)


def test_without_alkalinity_there_is_no_acid_in_the_stock() -> None:
    acid = Supply("nitric acid", "nitric acid", strength_pct=60.0)
    supplies = (*(Supply(name, name) for name in SALTS), acid)
    sheet = sheet_of(supplies=supplies, water=Composition({"Ca": 1.0}), acid=acid)
    assert not any(line.kind == "nitric acid" for tank in sheet.tanks for line in tank.salts)
    assert any("measure it" in each for each in sheet.notices)


def test_dissolving_order_and_ratio_in_words() -> None:
    acid = Supply("nitric acid", "nitric acid", strength_pct=60.0)
    supplies = (*(Supply(name, name) for name in SALTS), acid)
    sheet = sheet_of(supplies=supplies, water=Composition({"HCO3": 3.0}), acid=acid)
    kinds = [line.kind for line in sheet.tanks[1].salts]
    assert kinds[:2] == ["nitric acid", "monopotassium phosphate"]
    assert kinds[-1] == "potassium nitrate"
    assert sheet.tanks[0].ratio.startswith("1 litre of this stock in every 100 litres of feed")


def test_calcium_nitrate_alone_asks_which() -> None:
    with pytest.raises(CatalogueError, match="double salt.*tetrahydrate"):
        shelf((Supply("calcium nitrate", "calcium nitrate"),))


def test_names_that_are_not_there() -> None:
    with pytest.raises(PlanningError, match="not on the shelf"):
        shelf(tuple(Supply(name, name) for name in SALTS), without=("urea",))
    assert [each.name for each in shelf((), only=("KNO3",))] == ["KNO3"]


@pytest.mark.parametrize(
    ("name", "content"),
    [("Calcium tank", "calcium"), ("sulphate and phosphate", "sulfate"), ("acid", "acid"), ("A", "")],
)
def test_tanks_are_known_by_content(name: str, content: str) -> None:
    assert content_of(StockTank(name, 1000.0)) == content


def test_the_last_stock_runs_out_with_the_crop() -> None:
    found = last_mix(StockTank("calcium", 200.0), days_left=20, feed_l_per_d=4500, left_l=150, stop_days_before=4)
    assert found.mix_l == pytest.approx(4500 * 16 / 100 - 150)
    assert found.full_batches == 2
    with pytest.raises(PlanningError):
        last_mix(StockTank("calcium", 200.0), days_left=20, feed_l_per_d=4500, left_l=300)
