"""What nobody analysed is never shown as known: source waters, solutions before the first analysis, alkalinity."""

from __future__ import annotations

import numpy as np
import pytest

from fertui.chemistry.ions import CHARGE, INDEX
from fertui.estimate.assimilation import Estimate, assimilate
from fertui.estimate.forecast import forecast
from fertui.estimate.notices import notices
from fertui.estimate.unanalysed import guessed
from fertui.logbook.entries import Entry
from fertui.site.model import Composition, Sourced, Water
from tests.estimate.logs import SALAD, SITE, TANK, entry, moment

LIMITED = TANK._replace(limits={"tank": {"Na": Sourced(None, 6.0, "invented"), "Cl": Sourced(None, 6.5, "invented")}})


def estimated(water: Composition, *log: Entry) -> Estimate:
    site = SITE._replace(waters=(Water("rain", water),))
    return assimilate(site, LIMITED, log, moment(10.0), members=120)


ANALYSED = entry("analysis", 9.5, "tank", "tank", **SALAD, Na=2.0, Cl=1.0)


@pytest.mark.parametrize("ion", ["Na", "Cl", "Ca", "Mg", "SO4", "HCO3"])
def test_an_unanalysed_water_gives_no_sure_ion(ion: str) -> None:
    known = estimated(Composition({})).points()["tank"].ions[ion].mmol_l
    assert known.low < known.value < known.high
    assert known.high > 3.0 * max(known.low, 0.1)


def test_sodium_and_chloride_of_an_unanalysed_water_are_no_safe_forecast() -> None:
    rows = {each.what: each for each in forecast(estimated(Composition({}), ANALYSED), 14).leaves_band}
    assert rows["Na"].probability > 0.1
    assert rows["Cl"].probability > 0.1
    sure = forecast(estimated(Composition({"Na": 0.1, "Cl": 0.1}), ANALYSED), 14)
    assert {each.what: each.probability for each in sure.leaves_band}["Na"] < 0.05
    assert not any("never analysed" in each for each in sure.assumed)
    assert any("never analysed" in each for each in forecast(estimated(Composition({}), ANALYSED), 2).assumed)


def test_a_logged_analysis_ends_the_guessing() -> None:
    logged = entry("analysis", 9.0, "tank", "source", Na=0.2, Cl=0.2, Ca=0.3)
    assert estimated(Composition({})).unanalysed_water == "rain"
    assert estimated(Composition({}), logged).unanalysed_water is None
    assert estimated(Composition({"Na": 0.0})).unanalysed_water is None


def test_guesses_are_waters_whose_charges_close_wherever_alkalinity_can_close_them() -> None:
    water = guessed("tank", 300)
    closes = np.abs(water @ CHARGE) < 1e-9
    assert closes.mean() > 0.7
    assert (water[~closes, INDEX["HCO3"]] == 0.0).all()
    low, high = np.quantile(water[:, INDEX["Na"]], [0.1, 0.9])
    assert low < 0.35
    assert high > 3.0


def test_before_the_first_analysis_the_only_alarm_is_to_take_a_sample() -> None:
    nothing_known = estimated(Composition({}))
    found = notices(nothing_known, (), forecast(nothing_known, 14))
    assert found[0].code == "few_analyses"
    assert found[0].severity == "act"
    assert "sample" in found[0].text
    assert not {each.code for each in found} & {"share_out", "share_leaving", "sodium", "limit_over", "limit_leaving"}
    assert any(each.code == "water_unknown" and "rain" in each.text for each in found)


def test_alkalinity_is_no_higher_than_its_ph_allows() -> None:
    read = entry("reading", 9.9, "tank", "tank", EC=2.5, pH=5.9)
    shown = estimated(Composition({"HCO3": 2.9, "Ca": 1.45}), ANALYSED, read).points()["tank"]
    assert shown.ph is not None
    # CO2 + H2O: HCO3 = CO2 x 10^(pH - 6.35); 2.5 mmol/L of CO2 are eighty times what air leaves in water
    assert shown.ions["HCO3"].mmol_l.high <= 2.5 * 10 ** (shown.ph.high - 6.35) + 1e-9
    assert shown.ions["HCO3"].mmol_l.value <= 0.9


def test_without_a_medium_the_root_zone_is_the_tank_in_everything() -> None:
    traced = entry("analysis", 9.5, "tank", "tank", **SALAD, Fe=40.0)
    read = entry("reading", 9.9, "tank", "tank", EC=2.5, pH=5.9)
    points = estimated(Composition({"Na": 0.1}), traced, read).points()
    assert points["root_zone"].ph is not None
    assert points["root_zone"].ph.value == 5.9
    assert points["root_zone"].ions["Fe"].mmol_l.value == points["tank"].ions["Fe"].mmol_l.value
