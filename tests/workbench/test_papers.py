"""The papers of the invented site, as the command line and the terminal interface hand them out."""

from __future__ import annotations

from pathlib import Path

import pytest

from fertui.paper.page import WIDTH, Page
from fertui.refusals import Refusal
from fertui.workbench import open_site
from fertui.workbench.bench import Bench
from tests.conftest import DEMO_MORNING


@pytest.fixture
def bench(demo: Path) -> Bench:
    return open_site(demo)


@pytest.mark.parametrize("loop", ["north bay", "lettuce"])
def test_round_stock_and_acid_sheets_of_every_loop_fit_their_page(bench: Bench, loop: str) -> None:
    pages: list[Page] = [
        bench.round_sheet(loop, DEMO_MORNING),
        bench.stock_page(bench.stock(loop), loop),
        bench.acid_page(bench.acid(loop), loop),
    ]
    for page in pages:
        assert max(map(len, page.text.splitlines())) <= WIDTH
        assert loop.upper() in page.text


def test_the_handover_names_all_loops_and_fits_its_page(bench: Bench) -> None:
    page = bench.handover(at=DEMO_MORNING)
    assert max(map(len, page.text.splitlines())) <= WIDTH
    assert all(f"TO LOOK AT, {loop}" in page.text for loop in bench.loops)


def test_one_loop_can_be_handed_over_alone(bench: Bench) -> None:
    assert "lettuce" not in bench.handover("north bay", DEMO_MORNING).text


def test_a_planned_step_stands_on_the_round_sheet_until_it_is_done(bench: Bench) -> None:
    planned = bench.record(
        "plan",
        {"salt": "potassium nitrate", "kg": "1.5", "tank": "tank", "at": "2026-06-01 08:00", "by": "RV"},
        "lettuce",
    )
    assert planned.number is not None
    assert "[ ] Mon 1 Jun 08:00 1.5 kg potassium nitrate into tank" in bench.round_sheet("lettuce").text
    bench.mark_done(planned.number, "AN")
    assert "1.5 kg potassium nitrate into tank" not in bench.round_sheet("lettuce").text


def test_acid_for_water_treated_on_its_way_is_told_for_a_cubic_metre(bench: Bench) -> None:
    # What is above 0.5 meq/L, by an acid of 38 %: 1.233 kg/L x 0.38 / 63.01 g/mol = 7.44 mol/L (by hand).
    sheet = bench.acid("north bay")
    well = next(water for water in bench.site.waters if water.name == "well")
    assert sheet.volume_l == 1000.0
    assert sheet.litres_total == pytest.approx((well.composition.ions["HCO3"] - 0.5) / 7.44, rel=0.002)


def test_the_acid_sheet_names_what_its_alkalinity_comes_from(bench: Bench, tmp_path: Path) -> None:
    well = {"point": "source", "source": "well", "by": "RV"}
    of_alkalinity = bench.record("analysis", {**well, "HCO3": "4.1", "at": "2026-05-30 09:00"}, "north bay")
    bench.record("analysis", {**well, "Na": "1.2", "Cl": "1.1", "at": "2026-05-31 09:00"}, "north bay")
    sheet = bench.acid("north bay", DEMO_MORNING)
    assert sheet.alkalinity_meq_l == 4.1
    assert (
        f"alkalinity from: analysis {of_alkalinity.number} of 30 May 2026" in bench.acid_page(sheet, "north bay").text
    )
    before = bench.acid("north bay", DEMO_MORNING.replace(year=2020))
    assert before.alkalinity_from.startswith("site.toml")


def test_soft_water_needs_no_acid_and_says_so(bench: Bench) -> None:
    assert "no acid needed" in bench.acid_page(bench.acid("lettuce"), "lettuce").text


def test_a_sheet_is_written_once_and_never_over_another(bench: Bench, tmp_path: Path) -> None:
    path = bench.write("one", tmp_path / "sheet.txt")
    with pytest.raises(Refusal, match="is there already"):
        bench.write("two", path)
    assert path.read_text() == "one\n"


def test_the_report_holds_all_that_was_logged_over_new_starts_of_the_crop(demo: Path) -> None:
    bench, loop = open_site(demo), "north bay"
    for at, litres, reason in (("08:00", "800", "sodium"), ("08:10", "1500", "crop change")):
        fields = {"litres": litres, "from": "drain", "reason": reason, "at": f"2026-06-01 {at}", "by": "MK"}
        bench.record("bleed", fields, loop)
    for at, event in (("08:10", "planted"), ("08:20", "emptied"), ("08:21", "removed")):
        bench.record("crop", {"event": event, "at": f"2026-06-01 {at}", "by": "MK"}, loop)
    page = bench.report(loop, bench.time("2026-01-01"), DEMO_MORNING)
    assert page.text.splitlines()[2].startswith("Thu 1 Jan 2026 00:00 to Mon 1 Jun 2026 08:30")
    let_go = {each["reason"]: each for each in page.data["discharges"]}
    assert (let_go["sodium"]["m3"], let_go["crop change"]["m3"]) == (0.8, 1.5)
    assert let_go["sodium"]["kg_N"] > 0
    kinds = ("analysis", "bleed", "water", "stock", "acid", "dose")
    logged = {str(each.number) for each in bench.book.entries(loop=loop, kinds=kinds, at=DEMO_MORNING)}
    assert logged <= {row[5] for row in page.rows}
    assert [run["analyses"] > 0 for run in page.data["estimate"]][-2:] == [False, False]
    assert "begun anew, because crop, medium or solution were renewed" in " ".join(page.text.split())


def test_a_report_that_ends_before_it_begins_is_refused(bench: Bench) -> None:
    with pytest.raises(Refusal, match="before it begins"):
        bench.report(start=DEMO_MORNING, end=DEMO_MORNING.replace(year=2025))
