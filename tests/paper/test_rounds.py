"""The round sheet and the shift handover."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from datetime import timedelta
from typing import Any

import pytest

from fertui.estimate.notices import Notice
from fertui.logbook.entries import Entry
from fertui.logbook.parse import entry_from_text
from fertui.paper.handover import LoopShift, handover
from fertui.paper.page import WIDTH, Page
from fertui.paper.round_sheet import round_sheet
from tests.paper.hand_made import GUTTERS, NOW, SITE, SLABS


def said(kind: str, at: str, loop: str = "slabs", by: str = "MK", **texts: str) -> Entry:
    return entry_from_text(kind, {"by": by, "at": at, **texts}, SITE, loop, NOW)


def a_morning() -> list[Entry]:
    return [
        said("reading", "2026-06-29 07:40", point="feed", EC="2.55", pH="5.4"),
        said("water", "2026-06-29", irrigation="5200", drain="1800", make_up="3500"),
        said("stock", "2026-06-30", tank="calcium", litres="23.4"),
        said("reading", "2026-06-30 07:40", point="feed", EC="2.61", pH="5.5"),
        said("reading", "2026-06-30 07:40", point="drain", EC="3.44", pH="5.9"),
    ]


def row_of(page: Page, what: str) -> list[str]:
    _, *rows = csv.reader(io.StringIO(page.csv()))
    return next(row for row in rows if row[0] == what)


# Round sheet ---------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("loop", [GUTTERS, SLABS])
@pytest.mark.parametrize("entries", [a_morning(), []])
def test_the_round_sheet_fits_its_page_and_every_blank_has_a_unit(loop, entries: Sequence[Entry]) -> None:
    page = round_sheet(SITE, loop, entries, NOW, ["1.75 kg potassium nitrate into tank " + "and more " * 20])
    assert max(map(len, page.text.splitlines())) <= WIDTH
    _, *rows = csv.reader(io.StringIO(page.csv()))
    assert all(row[1].strip("_") == "" and row[2] for row in rows)


def test_the_last_value_stands_beside_its_blank_with_its_day() -> None:
    page = round_sheet(SITE, SLABS, a_morning(), NOW)
    assert row_of(page, "drip EC")[2:] == ["mS/cm", "2.6", "Tue 30 Jun"]
    assert row_of(page, "drip pH")[2:] == ["pH", "5.5", "Tue 30 Jun"]
    assert row_of(page, "irrigation")[2:] == ["L", "5200", "Mon 29 Jun"]
    assert row_of(page, "calcium stock used")[2:] == ["L", "23.4", "Tue 30 Jun"]
    assert row_of(page, "sulfate stock used")[3:] == ["", ""]


def test_the_round_goes_from_the_crop_to_drip_drain_water_stock_and_light() -> None:
    # Order of the morning round: field practice, daily steps 1-8.
    text = round_sheet(SITE, SLABS, a_morning(), NOW).text
    order = ["1 crop, drippers", "drip EC", "drain EC", "make-up water", "calcium stock used", "acid used", "light sum"]
    assert [text.index(each) for each in order] == sorted(text.index(each) for each in order)


def test_a_meter_read_lately_takes_the_place_of_the_amount() -> None:
    page = round_sheet(SITE, SLABS, [*a_morning(), said("water", "2026-06-30 07:50", make_up_meter="91250")], NOW)
    assert row_of(page, "make-up meter")[2:] == ["L", "91250", "Tue 30 Jun"]
    assert "make-up water" not in page.text


def test_a_hand_meter_in_use_gets_a_line_and_others_do_not() -> None:
    page = round_sheet(SITE, SLABS, [*a_morning(), said("reading", "2026-06-30 08:00", point="drain", NO3="22")], NOW)
    assert row_of(page, "drain NO3, hand meter")[2:4] == ["mmol/L", "22.0"]
    assert "drain K" not in page.text


def test_doubtful_values_and_other_loops_are_not_what_stood_there_last() -> None:
    log = [*a_morning(), said("reading", "2026-07-01 07:40", point="feed", EC="9.9", doubtful="probe dry")]
    log += [said("reading", "2026-07-01 07:41", "gutters", point="tank", EC="1.8")]
    assert row_of(round_sheet(SITE, SLABS, log, NOW), "drip EC")[3] == "2.6"


# Handover ------------------------------------------------------------------------------------------------------------


def shift(*watch: Notice, **changes: Any) -> LoopShift:
    return LoopShift(watch, {"calcium": 4.1, "sulfate": 3.9}, NOW - timedelta(days=9), **changes)


def handed_over() -> Page:
    act = Notice("share_out", "act", "K share in the root zone is 12 % (7-17), band 18-28 %. EC is on set point.", "p")
    log = [
        *a_morning(),
        said("note", "2026-06-30 16:00", text="drippers of row 4 cleaned"),
        said("acid", "2026-06-30", acid="nitric 60", litres="1.2"),
        said("dose", "2026-06-30 10:00", "gutters", salt="MKP", kg="0.4"),
    ]
    steps = ["slabs: Tue 30 Jun 1.75 kg potassium nitrate into tank (plan 3); partly done: 1 kg"]
    return handover(SITE, NOW, log, {"slabs": shift(act, awaited=("sample of the drain, sent Mon 29 Jun",))}, steps)


def test_the_handover_fits_its_page() -> None:
    assert max(map(len, handed_over().text.splitlines())) <= WIDTH


def test_readings_stand_with_their_age_and_the_loop_with_its_stock_and_analysis() -> None:
    lines = handed_over().text.splitlines()
    (drip,) = [line for line in lines if line.startswith("slabs") and "drip" in line]
    assert drip.split() == ["slabs", "drip", "2.6", "5.5", "24", "h", "ago", "3.9", "d", "9", "d", "old"]
    assert not any(line.startswith("gutters") for line in lines)


def test_what_to_look_at_what_is_partly_done_and_what_is_awaited_can_be_ticked() -> None:
    text = handed_over().text
    assert "[ ] !! K share in the root zone is 12 %" in text
    assert "[ ] slabs: Tue 30 Jun 1.75 kg potassium nitrate into tank (plan 3); partly done:" in text
    assert "[ ] -  awaited: sample of the drain, sent Mon 29 Jun" in text


def test_the_handover_goes_both_ways() -> None:
    # Shift handover guidance: two-way, prepared, cross-checked by the one who takes over (field practice).
    text = handed_over().text
    for asked in (
        "handed over by",
        "gone through together [ ]",
        "read by",
        "read back and taken over [ ]",
        "ON CALL",
        "DO NOT",
    ):
        assert asked in text


def test_what_was_written_since_yesterday_is_told_in_its_units_and_the_round_is_not_repeated() -> None:
    text = handed_over().text
    news = text[text.index("WRITTEN DOWN SINCE YESTERDAY") :]
    assert "drippers of row 4 cleaned (MK)" in news
    assert "dose: MKP, 0.4 kg (MK)" in news
    assert "acid, 1 entry: 1.2 L" in news
    assert "irrigation" not in news


def test_an_empty_site_hands_over_too() -> None:
    page = handover(SITE, NOW, [], {"slabs": LoopShift(), "gutters": LoopShift()}, [])
    assert "never" in page.text
    assert max(map(len, page.text.splitlines())) <= WIDTH


def test_an_analysis_is_handed_over_in_the_forms_the_report_gave() -> None:
    report = {"NO3-N": "260 mg/L", "NH4-N": "4.2 mg/L", "S": "52 mg/L", "P": "47 mg/L", "CaCO3": "20 mg/L"}
    log = [*a_morning(), said("analysis", "2026-06-30 08:50", point="drain", K="8,0", Fe="15", **report)]
    text = " ".join(handover(SITE, NOW, log, {"slabs": shift()}, []).text.split())
    for words in ("NO3-N 260 mg/L", "NH4-N 4.2 mg/L", "SO4 as S 52 mg/L", "H2PO4 as P 47 mg/L"):
        assert words in text
    for words in ("HCO3 as CaCO3 20 mg/L", "K 8,0 mmol/L", "Fe 15 umol/L"):
        assert words in text
