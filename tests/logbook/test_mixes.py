"""What stock tanks held and what the crop was given, told years later from the entries alone."""

from __future__ import annotations

from datetime import date, timedelta

import pytest

from fertui.logbook.mixes import given_on, mix_at, mixes, recipe_at
from fertui.logbook.store import Logbook
from tests.logbook.conftest import NOW, SITE, Say

DAY = date(2026, 6, 20)


def test_left_over_solution_is_blended_into_the_new_batch(book: Logbook, say: Say) -> None:
    book.append(say("batch", at="2026-06-01", tank="B", litres="1000", MKP="20", left="0", recipe="spring"))
    book.append(say("batch", at="2026-06-15", tank="B", litres="1000", MKP="10", left="200", recipe="summer"))
    first, second = mixes(book.entries(), "sulfate")
    assert first.kg_per_l == pytest.approx({"MKP": 0.020})
    # (10 kg + 200 L x 0.020 kg/L) / 1,000 L: by hand
    assert second.kg_per_l == pytest.approx({"MKP": 0.014})
    assert (second.blended, second.assumed_empty, second.recipe) == (True, False, "summer")
    assert mix_at(book.entries(), "sulfate", NOW - timedelta(days=20)) == first
    assert mix_at(book.entries(), "sulfate", NOW - timedelta(days=60)) is None


def test_a_batch_that_does_not_say_what_was_left_is_marked(book: Logbook, say: Say) -> None:
    book.append(say("batch", at="2026-06-01", tank="B", litres="1000", MKP="20"))
    book.append(say("batch", at="2026-06-15", tank="B", litres="1000", MKP="10"))
    assert [mix.assumed_empty for mix in mixes(book.entries(), "sulfate")] == [False, True]


def test_what_the_crop_got_on_a_day_can_be_told(book: Logbook, say: Say) -> None:
    book.append(say("recipe", at="2026-06-01", name="spring", K="7"))
    book.append(say("recipe", at="2026-06-25", name="summer", K="6"))
    book.append(say("batch", at="2026-06-01", tank="B", litres="1000", MKP="20", left="0"))
    book.append(say("stock", at="2026-06-20", tank="B", litres="50"))
    book.append(say("stock", at="2026-06-21", tank="B", litres="70"))
    book.append(say("acid", at="2026-06-20", acid="nitric 38", litres="2", cautions="acknowledged"))
    given = given_on(book.entries(), SITE, "bay", DAY)
    assert (given.recipe, given.stock_l, given.acid_l) == ("spring", {"sulfate": 50.0}, {"nitric 38": 2.0})
    assert given.salts_kg == pytest.approx({"MKP": 1.0})
    # KH2PO4 136.09 g/mol (CIAAW 2021): 7.348 mol of K and of P per kg
    assert given.ions_mmol["K"] == pytest.approx(7348, rel=1e-3)
    assert given.ions_mmol["H2PO4"] == pytest.approx(7348, rel=1e-3)
    # 2 L of 38 % nitric acid at 1.234 kg/L (CRC Handbook, from memory) carry 14.9 mol of HNO3 (63.01 g/mol)
    assert given.ions_mmol["NO3"] == pytest.approx(14_880, rel=0.01)
    assert given.unknown == ()
    assert recipe_at(book.entries(), "bay", NOW) == book.entry(2)


def test_stock_logged_by_the_clock_is_shared_out_over_its_time(book: Logbook, say: Say) -> None:
    book.append(say("batch", at="2026-06-01", tank="B", litres="1000", MKP="20", left="0"))
    book.append(say("stock", at="2026-06-19 12:00", tank="B", litres="40"))
    book.append(say("stock", at="2026-06-20 12:00", tank="B", litres="40"))
    book.append(say("stock", at="2026-06-21 12:00", tank="B", litres="80"))
    # half of the 40 L until noon of the 20th, half of the 80 L after it
    assert given_on(book.entries(), SITE, "bay", DAY).stock_l == pytest.approx({"sulfate": 60.0})
    total = sum(
        given_on(book.entries(), SITE, "bay", DAY + timedelta(days=shift)).stock_l.get("sulfate", 0.0)
        for shift in range(-3, 4)
    )
    assert total == pytest.approx(160.0)


def test_hand_doses_count_on_their_own_day(book: Logbook, say: Say) -> None:
    book.append(say("dose", "gutters", at="2026-06-20 23:30", salt="MKP", kg="0.5"))
    assert given_on(book.entries(), SITE, "gutters", DAY).salts_kg == {"MKP": 0.5}
    assert given_on(book.entries(), SITE, "gutters", DAY + timedelta(days=1)).salts_kg == {}
    assert given_on(book.entries(), SITE, "bay", DAY).salts_kg == {}
