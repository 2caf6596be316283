"""The report for a consultant or an inspector, from entries and an account made by hand."""

from __future__ import annotations

import csv
import io
import re
from datetime import UTC, datetime
from types import SimpleNamespace
from typing import Any

import pytest

from fertui.estimate.balance import Stretch
from fertui.logbook.entries import Entry
from fertui.logbook.parse import corrected, entry_from_text
from fertui.loop import Discharge
from fertui.paper.page import WIDTH, Page
from fertui.paper.report import Reported, report
from tests.paper.hand_made import NOW, SITE, SLABS

START = datetime(2026, 6, 16, 22, 0, tzinfo=UTC)


def said(number: int, kind: str, at: str, by: str = "MK", **texts: str) -> Entry:
    entry = entry_from_text(kind, {"by": by, "at": at, **texts}, SITE, None if kind == "calibration" else "slabs", NOW)
    return entry._replace(number=number)


ANALYSIS = said(1, "analysis", "2026-06-18 08:50", point="root_zone", K="8.0", Ca="6.1", NO3="15", H2PO4="1.0",
                HCO3="0.5", NH4="<0.1", Fe="15", EC="4.0", pH="5.8")  # fmt: skip
CORRECTED = corrected(ANALYSIS, {"Ca": "5.1"}, SITE, NOW, why="read the wrong line", by="RV")._replace(number=9)
LOG = [
    said(2, "water", "2026-06-19", make_up="3500", source="well", irrigation="5000", drain="1500"),
    said(3, "water", "2026-06-20", make_up="3300", source="well", irrigation="4800", drain="1500"),
    said(4, "acid", "2026-06-19", acid="nitric 60", litres="1.2"),
    said(5, "acid", "2026-06-20", acid="nitric 60", litres="1.1"),
    said(6, "calibration", "2026-06-20 09:00", instrument="EC pen", quantity="EC", standard="2.76", reading="2.80"),
    said(7, "dose", "2026-06-21 10:00", salt="MKP", kg="0.4"),
    said(8, "bleed", "2026-06-22 10:00", litres="2500", reason="sodium"),
]
SITE_WITH_BUDGET = SITE._replace(budget_n_kg_per_ha=50.0)


def reported(**changes: Any) -> Reported:
    taken = {"K": -26_000.0 * 40, "NO3": -26_000.0 * 60, "HCO3": 26_000.0}
    account = SimpleNamespace(
        start=START, end=NOW, ions={ion: SimpleNamespace(uptake=mmol) for ion, mmol in taken.items()},
        is_cut=False, began="with the analysis of entry 1",
    )  # fmt: skip
    history = [ANALYSIS, *LOG, CORRECTED]
    effective = [CORRECTED, *LOG]
    lost = (Discharge("sodium", 2500.0, 0.42, 0.08, 16.2, 3.1),)
    run = Stretch(account, lost, 104_000.0, analyses=3)
    it = Reported(SITE_WITH_BUDGET, SLABS._replace(area_m2=260.0), START, NOW, history, effective, (run,))
    return it._replace(**changes)


def run_of(**changes: Any) -> Stretch:
    """The run behind the report, changed."""
    return reported().stretches[0]._replace(**changes)


@pytest.fixture
def page() -> Page:
    return report(reported())


def flat(page: Page) -> str:
    return " ".join(page.text.split())


def test_the_report_fits_its_page_with_all_ions_and_micronutrients() -> None:
    every = dict.fromkeys(("K", "Ca", "Mg", "Na", "NO3", "Cl", "SO4"), "22.5")
    every |= {"NH4": "0.1", "H2PO4": "1", "HCO3": "0.5", "Fe": "150", "Mn": "10", "Zn": "7", "B": "120", "Cu": "1"}
    every |= {"Mo": "0.5", "Si": "1200"}
    full = said(1, "analysis", "2026-06-18 08:50", point="root_zone", **every)
    page = report(reported(effective=[full, *LOG]))
    assert max(map(len, page.text.splitlines())) <= WIDTH


def test_an_analysis_stands_in_mmol_and_in_mg_with_what_the_mg_are_of(page: Page) -> None:
    # Standard atomic weights (CIAAW 2021, abridged): 15 mmol/L NO3 = 210 mg/L N; 8.0 mmol/L K = 313 mg/L;
    # 1.0 mmol/L H2PO4 = 31 mg/L P; 5.1 mmol/L Ca = 204 mg/L.
    block = page.text[page.text.index("ANALYSES") :].splitlines()
    names, mmol, mg, of = (line.split() for line in block[2:6])
    shown = dict(zip(names, zip(mmol[1:], mg[1:], of[1:], strict=True), strict=True))
    assert shown["NO3"] == ("15.0", "210", "NO3-N")
    assert shown["K"] == ("8.0", "313", "K")
    assert shown["H2PO4"] == ("1.0", "31.0", "P")
    assert shown["Ca"] == ("5.1", "204", "Ca")
    assert shown["NH4"][0] == "<0.10"


def test_uptake_is_told_per_m2_and_per_litre(page: Page) -> None:
    # 26,000 x 40 mmol on 260 m2 = 4000 mmol/m2 = 156 g K/m2; over 104,000 L = 10 mmol/L = 391 mg/L.
    block = page.text[page.text.index("UPTAKE") :]
    (row,) = re.findall(r"^K +.*$", block, re.M)
    assert row.split() == ["K", "4000", "156", "10.0", "391", "K"]
    assert "crop water 104.0 m3" in block
    assert "HCO3" not in block[: block.index("WATER")]


def test_without_crop_water_uptake_per_litre_is_left_out_and_said() -> None:
    page = report(reported(stretches=(run_of(crop_water_l=None),)))
    assert "crop water is not known" in page.text


def test_water_stock_and_acid_are_summed_with_their_number_of_entries(page: Page) -> None:
    rows = [line.split() for line in page.text.splitlines()]
    assert ["make-up", "water,", "well", "6.80", "m3", "2"] in rows
    assert ["acid", "nitric", "60,", "60", "%", "2.3", "L", "2"] in rows


def test_discharges_are_told_in_m3_and_kg_by_reason_beside_the_budget(page: Page) -> None:
    rows = [line.split() for line in page.text.splitlines()]
    assert ["sodium", "2.50", "0.42", "0.08", "16.15", "3.08"] in rows  # kg on 260 m2, by hand
    assert "budget of the year: 50 kg N/ha" in page.text


def test_a_correction_shows_both_values_who_when_and_why(page: Page) -> None:
    # Field practice, scenario 24: the old value stays visible, the reason is demanded, the audit print shows both.
    text = flat(page)
    assert "was K 8.0 mmol/L, Ca 6.1 mmol/L" in text
    assert "now K 8.0 mmol/L, Ca 5.1 mmol/L" in text
    assert "RV, Wed 1 Jul 2026 08:00, entry 9; why: read the wrong line" in text


def test_calibrations_and_doses_name_instrument_amount_and_author(page: Page) -> None:
    text = flat(page)
    assert "calibration EC pen by MK: quantity EC, standard 2.76, reading 2.80" in text
    assert "dose by MK: MKP, 0.4 kg" in text


def test_the_table_holds_every_number_with_its_unit_entry_and_author(page: Page) -> None:
    head, *rows = csv.reader(io.StringIO(page.csv()))
    assert head == ["table", "at", "what", "value", "unit", "entry", "by"]
    assert ["analysis", "Thu 18 Jun 2026 08:50", "root_zone Ca", "5.1", "mmol/L", "9", "RV"] in rows
    assert ["discharge", "", "N, sodium", "0.42", "kg", "", ""] in rows
    assert ["uptake", "", "K", "4000", "mmol/m2", "", ""] in rows


def test_what_lies_outside_the_period_is_left_out() -> None:
    early = said(11, "dose", "2026-05-01 10:00", salt="MKP", kg="9.9")
    assert "9.9" not in report(reported(effective=[CORRECTED, *LOG, early])).text


def test_a_discharge_that_the_estimate_cannot_follow_keeps_its_litres_and_says_what_is_not_known() -> None:
    leak = said(12, "bleed", "2026-06-17 10:00", litres="1500", reason="leak")
    more = said(13, "bleed", "2026-06-23 10:00", litres="900", reason="sodium")
    page = report(reported(effective=[*LOG, leak, more]))
    rows = [line.split() for line in page.text.splitlines()]
    assert ["leak", "1.50", "-", "-", "-", "-"] in rows
    assert ["sodium", "3.40", "0.42", "0.08", "16.15", "3.08"] in rows  # 0.42 kg on 260 m2 = 16.15 kg/ha, by hand
    assert ["in", "all", "4.90", "0.42", "0.08", "16.15", "3.08"] in rows
    assert "leak: N and P are those of 0.00 of 1.50 m3" in flat(page)
    assert "sodium: N and P are those of 2.50 of 3.40 m3" in flat(page)


def test_without_any_estimate_all_that_was_logged_is_reported() -> None:
    page = report(reported(stretches=()))
    rows = [line.split() for line in page.text.splitlines()]
    assert "Nothing is estimated" in page.text
    assert ["sodium", "2.50", "-", "-", "-", "-"] in rows
    assert ["make-up", "water,", "well", "6.80", "m3", "2"] in rows
    assert "ANALYSES" in page.text


def test_a_doubtful_amount_stands_apart_from_the_sums() -> None:
    odd = said(14, "water", "2026-06-21", make_up="90000", source="well", doubtful="meter misread")
    rows = [line.split() for line in report(reported(effective=[*LOG, odd])).text.splitlines()]
    assert ["make-up", "water,", "well", "6.80", "m3", "2"] in rows
    assert ["make-up", "water,", "well,", "doubtful", "90.00", "m3", "1"] in rows


def test_litres_by_a_meter_count_from_the_position_before() -> None:
    # 41 m3, 44.5 m3, 47 m3: the first lies before the period, so 3.5 + 2.5 m3 (by hand).
    days = (("2026-06-15 08:00", "41000"), ("2026-06-18 08:00", "44500"), ("2026-06-20 08:00", "47000"))
    meters = [said(20 + n, "water", at, make_up_meter=litres) for n, (at, litres) in enumerate(days)]
    rows = [line.split() for line in report(reported(effective=meters)).text.splitlines()]
    assert ["make-up", "water", "6.00", "m3", "2"] in rows
