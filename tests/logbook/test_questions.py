"""What a careful colleague asks: each question with the slip it is for, and silence about what is fine."""

from __future__ import annotations

from datetime import datetime, timedelta

import pytest

from fertui.logbook.calibrations import doubted_by
from fertui.logbook.entries import Entry
from fertui.logbook.questions import Question, flagged, questions
from fertui.logbook.store import Logbook
from tests.logbook.conftest import NOW, SITE, Say

DAY = timedelta(days=1)


def asked(entry: Entry, book: Logbook) -> dict[str, Question]:
    """Questions by code."""
    return {question.code: question for question in questions(entry, book, SITE)}


def on(day: int, hour: int = 8) -> str:
    """A time in June."""
    return f"2026-06-{day:02d} {hour:02d}:00"


def test_an_ordinary_morning_is_not_asked_about(book: Logbook, say: Say) -> None:
    book.append(say("reading", point="feed", at=on(29), EC="2.6", pH="5.6", K="8.0", Ca="5"))
    book.append(say("water", at="2026-06-28", make_up="3000", irrigation="4000", drain="1200"))
    assert asked(say("reading", point="feed", EC="2,7", pH="5.5", K="7.4", Ca="5.2"), book) == {}
    assert asked(say("water", at="2026-06-29", make_up="3300", irrigation="4100", drain="1300"), book) == {}


@pytest.mark.parametrize(
    ("written", "code", "suggestion"),
    [
        ("80", "out_by_ten", "8"),
        ("0.75", "out_by_ten", "7.5"),
        ("45", "unusual", ""),
    ],
)
def test_a_slip_of_the_decimal_mark_is_asked_about(
    book: Logbook, say: Say, written: str, code: str, suggestion: str
) -> None:
    book.append(say("reading", point="feed", at=on(29), K="8.0"))
    found = asked(say("reading", point="feed", K=written), book)
    assert list(found) == [code]
    assert (found[code].field, found[code].value, found[code].suggestion) == ("K", written, suggestion)


def test_a_number_that_fits_in_mg_per_litre_is_recognised(book: Logbook, say: Say) -> None:
    # 51 mg/L Mg is 2.10 mmol/L (24.305 g/mol, CIAAW 2021)
    book.append(say("reading", point="feed", at=on(29), Mg="2.0"))
    found = asked(say("reading", point="feed", Mg="51"), book)
    assert found["other_unit"].suggestion == "Mg=51 mg/L"


def test_the_last_value_of_another_point_does_not_count(book: Logbook, say: Say) -> None:
    book.append(say("reading", point="drain", at=on(29), K="1.0"))
    assert asked(say("reading", point="feed", K="8.0"), book) == {}


def test_the_same_within_minutes_is_asked_about_once(book: Logbook, say: Say) -> None:
    book.append(say("reading", point="feed", at="10:55", EC="2.6"))
    book.append(say("water", at="yesterday", make_up="900"))
    assert "entry 1" in asked(say("reading", point="feed", EC="2,6"), book)["duplicate"].text
    assert "duplicate" in asked(say("water", at="yesterday", make_up="900"), book)
    assert "duplicate" not in asked(say("reading", point="drain", EC="2.6"), book)
    assert "duplicate" not in asked(say("reading", point="feed", EC="2.7"), book)


@pytest.mark.parametrize(
    ("written", "suggestion"), [("25", "2.5"), ("280", "28"), ("0.26", "2.6"), ("2.4", None), ("9", None)]
)
def test_stock_unlike_the_last_of_that_tank_is_asked_about(
    book: Logbook, say: Say, written: str, suggestion: str | None
) -> None:
    book.append(say("stock", at="2026-06-29", tank="calcium", litres="2.6"))
    book.append(say("stock", at="2026-06-29", tank="sulfate", litres="26"))
    for when in ("2026-06-30", "2026-06-30 07:30"):
        found = asked(say("stock", at=when, tank="calcium", litres=written), book)
        assert found.get("out_by_ten", Question("", "")).suggestion == (suggestion or "")
    assert "out_by_ten" not in asked(say("stock", at="2026-06-30", tank="sulfate", litres="25"), book)


def test_stock_of_a_week_is_not_ten_times_that_of_a_day(book: Logbook, say: Say) -> None:
    book.append(say("stock", at="2026-06-20 08:00", tank="calcium", litres="2.6"))
    assert "out_by_ten" not in asked(say("stock", at="2026-06-30 08:00", tank="calcium", litres="25"), book)


def test_acid_unlike_the_last_into_that_tank_is_asked_about(book: Logbook, say: Say) -> None:
    book.append(say("acid", at="2026-06-29", acid="nitric 38", litres="1.1"))
    found = asked(say("acid", at="2026-06-30", acid="nitric 38", litres="11"), book)
    assert found["out_by_ten"].text == "nitric 38, 11 L? The last was 1.1 L (entry 1). Out by ten?"
    assert "out_by_ten" not in asked(say("acid", at="2026-06-30", acid="nitric 38", tank="tank", litres="11"), book)


def test_dates_long_past_and_jumping_clocks_are_asked_about(book: Logbook, say: Say) -> None:
    assert "long_past" in asked(say("reading", point="feed", EC="2.6", at="2025-07-01"), book)
    assert "long_past" not in asked(say("analysis", point="feed", EC="2.6", at="2026-05-20"), book)
    book.append(say("note", text="x"))
    assert "clock" in asked(say("reading", point="feed", EC="2.6", now=NOW - DAY), book)
    assert "clock" in asked(say("reading", point="feed", EC="2.6", now=datetime(2038, 1, 1, tzinfo=NOW.tzinfo)), book)


def metered(book: Logbook, say: Say) -> None:
    """Five mornings of a water meter at about 3,000 L a day."""
    for day in range(24, 29):
        book.append(say("water", at=on(day), make_up_meter=str(900_000 + 3000 * (day - 24))))


def test_a_meter_that_runs_backwards_or_jumps_is_asked_about(book: Logbook, say: Say) -> None:
    metered(book, say)
    slip = asked(say("water", at=on(29), make_up_meter="91500"), book)["meter_backwards"]
    assert slip.suggestion == "meter=rolled over"
    other = asked(say("water", at=on(29), make_up_meter="911000"), book)["meter_backwards"]
    assert other.suggestion == "meter=replaced"
    assert asked(say("water", at=on(29), make_up_meter="120", meter="replaced"), book) == {}
    assert "meter_jump" in asked(say("water", at=on(29), make_up_meter="951000"), book)
    assert asked(say("water", at=on(29), make_up_meter="915.2 m3"), book) == {}


def test_a_meter_that_contradicts_the_litres_is_asked_about(book: Logbook, say: Say) -> None:
    metered(book, say)
    found = asked(say("water", at=on(29), make_up_meter="915000", make_up="300"), book)
    assert found["meter_amount"].suggestion == "3000"
    assert "meter_amount" not in asked(say("water", at=on(29), make_up_meter="915000", make_up="2950"), book)


def test_litres_are_of_the_whole_loop_and_fit_its_tanks(book: Logbook, say: Say) -> None:
    # 3.2 on 1,000 m2 is what a screen shows in L/m2; 0.2-10 L/m2/d are met over the year (common practice, no source)
    assert asked(say("water", at=on(29), irrigation="3.2"), book)["per_area"].suggestion == "3200"
    assert "per_area" in asked(say("water", at=on(29), irrigation="50 m3"), book)
    assert "drain_over_irrigation" in asked(say("water", at=on(29), irrigation="3000", drain="3500"), book)
    assert "over_full" in asked(say("level", "gutters", litres="20000"), book)
    assert "over_full" in asked(say("batch", tank="A", litres="1500", MKP="5", left="0"), book)
    assert "over_full" not in asked(say("bleed", litres="15000", reason="sodium"), book)


def test_batches_doses_and_acids_are_asked_about(book: Logbook, say: Say) -> None:
    assert asked(say("batch", tank="B", litres="1000", MKP="5"), book)["left_over"].suggestion == "0"
    assert "shelf" in asked(say("dose", "gutters", salt="MKP", kg="30"), book)
    acid = asked(say("acid", "gutters", acid="nitric 38", litres="1", strength="60 %"), book)
    assert set(acid) == {"acid_cautions", "acid_strength"}
    assert asked(say("acid", "gutters", acid="nitric 38", litres="1", cautions="acknowledged"), book) == {}
    assert asked(say("acid", "gutters", acid="nitric 38", litres="1", at="yesterday"), book) == {}
    assert set(asked(say("acid", "gutters", acid="nitric 38", litres="1", at="2026-06-29", tank="tank"), book)) == {
        "acid_cautions"
    }


def test_a_stage_the_catalogue_does_not_know_is_asked_about(book: Logbook, say: Say) -> None:
    assert "Known: " in asked(say("crop", stage="fruitset"), book)["stage"].text
    known = asked(say("crop", stage="fruitset"), book)["stage"].text.split("Known: ")[1].split(",")[0].rstrip(".")
    assert asked(say("crop", stage=known), book) == {}


def test_whether_a_meter_compensates_is_asked_with_the_number_it_would_be(book: Logbook, say: Say) -> None:
    found = asked(say("reading", point="feed", EC="2.60", temperature="15", instrument="white pen"), book)
    # 2.60 x 1.256 (ISO 7888:1985, factor at 15 C)
    assert found["compensated"].suggestion == "3.27"
    assert asked(say("reading", point="feed", EC="2.60", temperature="24", instrument="white pen"), book) == {}


@pytest.mark.parametrize(("temperature", "error"), [("10", "+31 %"), ("25", "-24 %"), ("5", "+50 %")])
def test_a_nitrate_electrode_on_a_cold_or_warm_sample_is_flagged(
    book: Logbook, say: Say, temperature: str, error: str
) -> None:
    # Errors by sample temperature: Pena-Fleitas et al. 2022, Agronomy 12:3031
    entry = say("reading", point="drain", NO3="12", temperature=temperature, instrument="nitrate pen")
    assert error in asked(entry, book)["sample_temperature"].text
    assert asked(say("reading", point="drain", NO3="12", temperature="18", instrument="nitrate pen"), book) == {}


def test_a_meter_found_off_puts_its_readings_in_doubt_and_offers_the_correction(book: Logbook, say: Say) -> None:
    book.append(say("calibration", at=on(20), instrument="white pen", quantity="EC", standard="1.413", reading="1.42"))
    for day in (18, 22, 25):
        book.append(say("reading", point="feed", at=on(day), EC="2.6", instrument="white pen"))
    book.append(say("reading", point="feed", at=on(26), EC="2.6", instrument="nitrate pen"))
    before = book.history()
    off = say(
        "calibration", at=on(28), instrument="white pen", quantity="EC", standard="1.413", reading="1.60", result="off"
    )
    (number,) = book.append(off)
    doubted = doubted_by(book.entry(number), book.entries())
    assert [each.entry.number for each in doubted] == [3, 4]
    assert doubted[0].corrected == pytest.approx(2.6 * 1.413 / 1.60)
    assert book.history()[:-1] == before
    assert "instrument_off" in asked(say("reading", point="feed", EC="2.6", instrument="white pen"), book)
    good = say("calibration", at=on(29), instrument="white pen", quantity="EC", standard="1.413", reading="1.41")
    assert doubted_by(good, book.entries()) == ()
    book.append(good)
    assert asked(say("reading", point="feed", EC="2.6", instrument="white pen"), book) == {}


def test_nitrate_taken_for_nitrogen_is_caught_by_charges_and_ec(book: Logbook, say: Say) -> None:
    # The trap of practice: 730 mg/L nitrate is 11.8 mmol/L as NO3 and 52 mmol/L as NO3-N
    ions = {"K": "7", "Ca": "4", "Mg": "2", "SO4": "3.2", "P": "1.5 mmol/L", "EC": "2.2", "NH4": "1"}
    right = asked(say("analysis", point="drain", **ions, NO3="730 mg/L"), book)
    wrong = asked(say("analysis", point="drain", **ions, NO3__N="730 mg/L"), book)
    assert "charge_balance" not in right
    assert {"charge_balance", "ec_check"} <= set(wrong)
    assert "NO3" in wrong["charge_balance"].suggestion
    assert "NO3-N" in wrong["charge_balance"].text


def test_an_analysis_of_a_few_ions_is_not_judged_by_its_charges(book: Logbook, say: Say) -> None:
    assert asked(say("analysis", point="drain", K="7", NO3="12", EC="2.2"), book) == {}


def test_what_nobody_answered_stays_as_flags(book: Logbook, say: Say) -> None:
    book.append(say("reading", point="feed", at=on(29), K="8.0", EC="2"))
    entry = say("reading", point="feed", K="80", EC="21")
    (number,) = book.append(flagged(entry, questions(entry, book, SITE)))
    assert book.entry(number).flags == "out_by_ten"
