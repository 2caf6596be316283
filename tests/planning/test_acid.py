"""The acid sheet: never without alkalinity, never a portion that can overshoot."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fertui.planning.acid import acid_sheet
from fertui.planning.shelf import PlanningError
from fertui.site.model import Composition, Loop, Site, Supply

LOOP = Loop("l", "shared-tank", 500.0, "lettuce", "none", tank_l=2000.0)


def site(*supplies: Supply) -> Site:
    return Site("S", "UTC", (LOOP,), supplies=supplies)


NITRIC = Supply("nitric acid", "nitric acid", strength_pct=60.0)


def test_without_alkalinity_there_is_no_dose_whatever_the_ph() -> None:
    sheet = acid_sheet(site(NITRIC), LOOP, water=Composition({"Ca": 2.0}, ph=8.4))
    assert not sheet.feasible
    assert "measure it" in sheet.reason
    assert sheet.splits == ()
    assert sheet.litres_total == 0.0


def test_too_low_a_ph_is_told_by_what_to_do_not_by_a_paper_nobody_has() -> None:
    words = " ".join(acid_sheet(site(NITRIC), LOOP, water=Composition({"HCO3": 3.5})).words)
    assert "Below 3.5 roots burn: no solution to the crop" in words
    assert "card" not in words


def test_no_acid_where_none_is_needed_even_with_none_on_the_shelf() -> None:
    sheet = acid_sheet(site(), LOOP, water=Composition({"HCO3": 0.3}))
    assert sheet.feasible
    assert sheet.splits == ()
    assert "no acid needed" in sheet.words[0]


@settings(max_examples=40, deadline=None)
@given(
    st.sampled_from(
        [("nitric acid", 60.0), ("phosphoric acid", 75.0), ("sulfuric acid", 37.0), ("hydrochloric acid", 32.0)]
    ),
    st.floats(0.6, 8.0), st.floats(100.0, 50_000.0), st.floats(6.0, 8.6),
)  # fmt: skip
def test_no_portion_is_more_than_a_third_of_the_closed_figure(
    acid, alkalinity: float, litres: float, ph: float
) -> None:
    kind, strength = acid
    sheet = acid_sheet(
        site(Supply(kind, kind, strength_pct=strength)),
        LOOP,
        water=Composition({"HCO3": alkalinity}, ph=ph),
        volume_l=litres,
    )
    assert sum(each.litres for each in sheet.splits) == pytest.approx(sheet.litres_total)
    assert max(each.litres for each in sheet.splits) <= sheet.litres_closed / 3 * (1 + 1e-6)
    assert sheet.litres_closed <= sheet.litres_total * (1 + 1e-9)
    assert all(each.stop_ph < each.retest_ph for each in sheet.splits)


def test_phosphoric_counts_part_of_its_second_proton() -> None:
    # 1.066 protons at pH 5.8 (PHREEQC titration, Amm.dat, 20 degrees C)
    sheet = acid_sheet(
        site(Supply("phosphoric acid", "phosphoric acid", strength_pct=75.0)), LOOP, water=Composition({"HCO3": 3.5})
    )
    assert 3.0 / sheet.demand_mmol_l == pytest.approx(1.066, rel=0.01)
    assert sheet.adds_mg_l["P"] == pytest.approx(3.0 / 1.066 * 30.974, rel=0.01)


def test_lye_raises_what_is_short_and_counts_its_potassium() -> None:
    lye = Supply("KOH", "potassium hydroxide", strength_pct=25.0)
    sheet = acid_sheet(site(lye), LOOP, water=Composition({"HCO3": 0.1}), acid=lye)
    assert sheet.adds_mmol_l["K"] == pytest.approx(0.4)
    assert sheet.litres_total == pytest.approx(0.4 * 2.0 / 5.51, rel=0.01)  # 25 %: 5.51 mol/L (Laliberte 2009)
    assert len(sheet.splits) >= 3


def test_no_tank_no_strength_no_acid_are_refused() -> None:
    bare = Loop("l", "drain-blend", 500.0, "tomato", "coir")
    with pytest.raises(PlanningError, match="litres"):
        acid_sheet(site(NITRIC), bare, water=Composition({"HCO3": 3.0}))
    with pytest.raises(PlanningError, match="no acid"):
        acid_sheet(site(), LOOP, water=Composition({"HCO3": 3.0}))
    with pytest.raises(PlanningError, match="strength"):
        acid_sheet(site(), LOOP, water=Composition({"HCO3": 3.0}), acid=Supply("x", "nitric acid"))
