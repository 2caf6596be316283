"""Dose, stock-tank and acid sheets: what stands on them, in which order, and that a printer can print them."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Callable, Mapping

import pytest

from fertui.cli.views.plan import text as plan_text
from fertui.paper.acid_page import acid_page
from fertui.paper.cautions import read_first
from fertui.paper.dose_sheet import dose_sheet
from fertui.paper.page import ADVICE, SIGN, WIDTH, Page, folded
from fertui.paper.tank_cards import stock_page
from fertui.planning import acid_sheet
from fertui.planning.stock import stock_sheet
from fertui.planning.values import Plan
from fertui.site.model import Composition, Supply, Water
from tests.paper.hand_made import (
    GUTTERS,
    RECIPE,
    SITE,
    SLABS,
    acid,
    acid_step,
    hand_plan,
    recipe_change,
    renewal,
    stocks,
)

ZONE = SITE.timezone


def rich_plan() -> Plan:
    return hand_plan(
        acid=(acid_step(),), renewal=renewal(), recipe=recipe_change(), cautions=stocks().cautions + acid().cautions
    )


PAGES: Mapping[str, Callable[[], Page]] = {
    "doses": lambda: dose_sheet(hand_plan(), SITE.name, ZONE),
    "everything": lambda: dose_sheet(rich_plan(), SITE.name, ZONE),
    "no plan": lambda: dose_sheet(hand_plan(feasible=False, reason="Na is over its limit", steps=()), SITE.name, ZONE),
    "stocks": lambda: stock_page(stocks(), "slabs", SITE.name, "recipe 12"),
    "one salt": lambda: stock_page(stocks(supplies=("calcium nitrate",)), "slabs", SITE.name),
    "acid in the stock": lambda: stock_page(stocks(acid=SITE.supplies[-1]), "slabs", SITE.name),
    "acid": lambda: acid_page(acid(), "gutters", SITE.name),
}


@pytest.fixture(params=sorted(PAGES))
def page(request: pytest.FixtureRequest) -> Page:
    return PAGES[request.param]()


def test_no_line_is_wider_than_80_columns_and_whose_word_counts_stands_below(page: Page) -> None:
    assert max(len(line) for line in page.text.splitlines()) <= WIDTH
    assert not any(line != line.rstrip() for line in page.text.splitlines())
    assert " ".join(page.text.splitlines()[-2:]) == ADVICE


def test_every_table_can_be_read_back_and_names_the_unit_of_its_numbers(page: Page) -> None:
    head, *rows = list(csv.reader(io.StringIO(page.csv())))
    assert all(len(row) == len(head) for row in rows)
    for column, name in enumerate(head):
        numbers = [row[column] for row in rows if re.fullmatch(r"-?\d+(\.\d+)?", row[column])]
        assert not numbers or "[" in name or "unit" in head or name in ("order", "split"), name


def test_the_dose_sheet_has_a_line_to_sign_under_every_step_in_the_order_of_the_days() -> None:
    text = dose_sheet(hand_plan(), SITE.name, ZONE).text
    first, second = text.index("Wed 1 Jul 2026 08:00 INTO tank"), text.index("Fri 3 Jul 2026 08:00 INTO tank")
    assert first < text.index("1. potassium nitrate") < text.index("2. MKP") < second
    assert text.count(SIGN) == 3
    assert "1.75 kg" in text
    assert "0.40 kg" in text


def test_what_comes_of_it_stands_beside_what_would_come_without() -> None:
    lines = dose_sheet(hand_plan(), SITE.name, ZONE).text.splitlines()
    (row,) = [line for line in lines if line.startswith("K share")]
    assert re.findall(r"\d+ \(\d+-\d+\)", row) == ["28 (24-32)", "36 (32-40)", "24 (20-28)"]
    assert row.endswith("30-45")
    for title in ("IF IT GOES OTHERWISE", "LIMITS THAT BIND", "RULE OF THUMB", "WHY", "THE SUM, STEP BY STEP"):
        assert any(line.startswith(title) for line in lines)


def test_a_plan_says_that_it_is_no_record() -> None:
    assert "A plan is no record: log each step as done, partly or not." in " ".join(
        dose_sheet(hand_plan(), SITE.name, ZONE).text.split()
    )


def test_cautions_stand_before_anything_is_weighed_and_the_data_sheet_before_all_cautions() -> None:
    text = dose_sheet(hand_plan(acid=(acid_step(),), cautions=acid().cautions), SITE.name, ZONE).text
    start = text.index("READ BEFORE YOU START")
    assert start < text.index("INTO tank")
    assert text[start:].splitlines()[1].startswith("!! Read the safety data sheet")


@pytest.mark.parametrize("named", ["nitric", "nitric 60", "nitric 60 %"])
def test_the_strength_of_an_acid_is_said_once_however_the_shelf_calls_it(named: str) -> None:
    plan = hand_plan(acid=(acid_step()._replace(acid=named),))
    for text in (dose_sheet(plan, SITE.name, ZONE).text, plan_text(plan, ZONE, "mmol/L")):
        assert "nitric 60 % (1.367 kg/L)" in text
        assert text.count("60 %") == 1


def test_what_a_renewal_costs_is_told_in_one_measure() -> None:
    plan = hand_plan(renewal=renewal())
    for text in (dose_sheet(plan, SITE.name, ZONE).text, plan_text(plan, ZONE, "mmol/L")):
        assert "the year comes to 4.2 kg N" not in " ".join(text.split())


def test_cautions_come_worst_first_and_the_same_words_only_once() -> None:
    lines = read_first(stocks().cautions)
    signs = [line[:2] for line in lines[1:] if line[:2].strip()]
    assert signs == sorted(signs, key=["!!", "! ", "- "].index)
    assert len([line for line in lines if "reportable precursor" in line]) == 1


def test_a_plan_that_is_none_says_so_first_and_asks_nothing_to_be_weighed() -> None:
    text = dose_sheet(hand_plan(feasible=False, reason="Na is over its limit", steps=()), SITE.name, ZONE).text
    assert text.splitlines()[5:7] == ["THE ANSWER IS NO", "!! Na is over its limit"]
    assert "INTO" not in text


def test_a_renewal_says_what_leaves_with_it() -> None:
    # Field practice: 25 % of 10 m3 at 12 mmol/L N loses 0.42 kg N (computed there).
    text = " ".join(dose_sheet(hand_plan(renewal=renewal()), SITE.name, ZONE).text.split())
    assert "let go 2500 L and refill with K 5.0, Ca 3.0 mmol/L" in text
    assert "with it leave 0.42 kg N and 0.05 kg P" in text


# Stock tanks ---------------------------------------------------------------------------------------------------------


def test_one_card_a_tank_by_content_with_the_letter_beside_it_in_the_order_of_dissolving() -> None:
    sheet = stocks()
    text = stock_page(sheet, "slabs", SITE.name).text
    for tank in sheet.tanks:
        card = text[text.index(f"TANK {tank.name}") :]
        places = [card.index(f"{place}. {each.salt} ") for place, each in enumerate(tank.salts, start=1)]
        assert places == sorted(places)
        assert f"letter {tank.letter}" in card.splitlines()[0]
        assert "1 litre of this stock in every 100 litres of feed (1:100)" in " ".join(card.split())
    assert text.count("old solution left in the tank ______ L") == len(sheet.tanks)


def test_weights_on_the_cards_are_those_of_the_sheet() -> None:
    sheet = stocks()
    text = stock_page(sheet, "slabs", SITE.name).text
    for tank in sheet.tanks:
        for each in tank.salts:
            if each.pre_solution is None and each.litres is None and each.kg >= 1.0:
                assert re.search(rf"{re.escape(each.salt)} \.+ +{each.kg:.2f} kg", text)


def test_a_weight_too_small_for_the_scale_goes_by_a_pre_solution() -> None:
    # Field practice: 12.1 g of molybdate on a 5 g scale is +-21 %: a pre-solution.
    assert re.search(r"sodium molybdate \.+ +\d+ L of it", stock_page(stocks(), "slabs", SITE.name).text)


def test_a_loop_without_drippers_is_fed_at_its_inlet() -> None:
    text = stock_page(stocks(), "gutters", "Testing house", layout="shared-tank").text
    assert "EC to expect at the inlet" in text
    assert "AT THE INLET [mmol/L; HCO3 meq/L]" in text
    assert "drip" not in text.lower()


def test_what_reaches_the_crop_stands_beside_what_the_recipe_asks() -> None:
    text = stock_page(stocks(), "slabs", SITE.name).text
    block = text[text.index("AT THE DRIP [mmol/L; HCO3 meq/L]") :].splitlines()
    assert block[2].startswith("asked")
    assert block[3].startswith("reached")


def test_a_refused_pair_is_told_before_any_card() -> None:
    together = (Supply("one", "calcium nitrate double salt"), Supply("other", "magnesium sulfate heptahydrate"))
    site = SITE._replace(supplies=together, stock_tanks=SITE.stock_tanks[:1])
    sheet = stock_sheet(site, SLABS._replace(stock_tanks=("calcium",)), recipe=RECIPE)
    text = stock_page(sheet, "slabs", site.name).text
    assert not sheet.feasible
    assert text.index("REFUSED") < text.index("\nTANK ")


# Acid ----------------------------------------------------------------------------------------------------------------


def test_the_acid_sheet_comes_cautions_bottle_portions() -> None:
    text = acid_page(acid(), "gutters", SITE.name).text
    order = ["READ BEFORE YOU START", "THE BOTTLE", "HOW", "PORTIONS", "WHAT IT FEEDS", "THE SUM"]
    assert [text.index(each) for each in order] == sorted(text.index(each) for each in order)


def test_the_acid_sheet_names_strength_density_second_person_wait_retest_and_stop() -> None:
    text = " ".join(acid_page(acid(), "gutters", SITE.name).text.split())
    assert "counted on: nitric 60, 60 % by weight, 1.367 kg/L, 13.02 mol/L" in text
    assert "second person" in text
    assert "wait 15 min, retest; go on only above pH 5.8; stop everything at pH 4.5" in text
    assert "eyewash" in text


def test_portions_sum_to_the_dose_and_each_has_a_line_to_sign() -> None:
    # Make-up 5 m3 with HCO3 3.5, 0.5 to be left, nitric 60 %: 1.15 L, NO3 +3 mmol/L (computed by hand:
    # 3.0 x 5000 / 1000 = 15 mol; 1.367 kg/L x 0.60 / 63.01 = 13.02 mol/L; 15 / 13.02 = 1.15 L).
    sheet = acid()
    page = acid_page(sheet, "gutters", SITE.name)
    _, *rows = list(csv.reader(io.StringIO(page.csv())))
    assert sum(float(row[3]) for row in rows) == pytest.approx(1.15, abs=0.005)
    assert page.text.count(SIGN) == len(sheet.splits)
    assert "in all, if every retest allows it: 1.15 L" in page.text
    assert "3.00 mmol/L NO3 (42 mg/L N): the stock sheet takes it off the" in page.text


def test_water_of_unknown_alkalinity_gets_no_dose_but_the_reason() -> None:
    site = SITE._replace(waters=(Water("well", Composition()),))
    page = acid_page(acid_sheet(site, GUTTERS), "gutters", SITE.name)
    assert "NO DOSE" in page.text
    assert "pH alone never tells the acid" in " ".join(page.text.split())
    assert "PORTIONS" not in page.text


def test_lye_is_added_while_ph_is_too_low_and_never_above() -> None:
    soft = Composition({"HCO3": 0.1}, ph=6.0)
    lye = Supply("lye", "potassium hydroxide", strength_pct=20.0)
    text = " ".join(acid_page(acid_sheet(SITE, GUTTERS, water=soft, acid=lye), "gutters", SITE.name).text.split())
    assert "go on only below pH" in text


def test_a_number_is_never_torn_from_its_unit() -> None:
    for length in range(60, 90):
        lines = folded("x" * length + " of 12.5 mmol/L and 30 % in 14 days", "- ")
        assert any("12.5 mmol/L" in line for line in lines)
        assert any("30 %" in line for line in lines)
        assert any("14 days" in line for line in lines)
