"""The shelf, the stock tanks, and the last known numbers for the first paint."""

from __future__ import annotations

import subprocess
import sys
from datetime import timedelta
from pathlib import Path

import pytest

from fertui.workbench import open_site
from fertui.workbench.bench import Bench
from tests.conftest import DEMO_MORNING


@pytest.fixture(scope="module")
def bench(demo_once: Path) -> Bench:
    return open_site(demo_once)


def test_every_supply_stands_on_the_shelf_with_formula_label_and_hazards(bench: Bench) -> None:
    rows = {row.name: row for row in bench.supplies_rows()}
    assert rows.keys() == {supply.name for supply in bench.site.supplies}
    acid = rows["nitric acid 38"]
    # Nitric acid 38 % by weight: 1.233 kg/L at 20 C (handbook table, see the catalogue's own source).
    assert (acid.label, acid.density_kg_per_l) == ("38 %", pytest.approx(1.233, abs=0.001))
    assert any("H314" in hazard for hazard in acid.hazards)
    assert rows["potassium nitrate"].formula == "KNO3"
    # Signal words of labels: Regulation (EC) 1272/2008, see the catalogue's own sources; dust alone bears none.
    signals = [rows[name].signal for name in ("nitric acid 38", "potassium nitrate", "potassium sulfate")]
    assert signals == ["danger", "warning", ""]
    assert rows["potassium nitrate"].density_kg_per_l is None


def test_stock_left_is_the_last_batch_less_what_was_drawn_since(bench: Bench) -> None:
    entries = [entry for entry in bench.entries(DEMO_MORNING) if entry.loop == "north bay"]
    mixed = [entry for entry in entries if entry.kind == "batch" and entry.text_of("tank") == "calcium"][-1]
    drawn = sum(
        entry.number_of("litres") or 0.0
        for entry in entries
        if entry.kind == "stock" and entry.text_of("tank") == "calcium" and entry.at > mixed.at
    )
    (row, *_) = bench.stock_rows("north bay", DEMO_MORNING)
    assert (row.name, row.letter, row.mixed_at) == ("calcium", "A", mixed.at)
    # The day of mixing and the hours since midnight are counted in part: at most two days' use apart.
    assert row.litres_left == pytest.approx(1000.0 - drawn, abs=60.0)
    assert row.litres_left is not None
    assert row.days_left == pytest.approx(row.litres_left / 24.5, rel=0.15)


def test_a_glance_holds_the_last_reading_of_every_point_and_the_set_points(bench: Bench) -> None:
    seen = bench.glance("north bay", DEMO_MORNING)
    assert set(seen.readings) == {"feed", "drain"}
    last = [each for each in bench.entries(DEMO_MORNING) if each.kind == "reading" and each.point == "feed"][-1]
    assert (seen.readings["feed"].number, seen.readings["feed"].values["EC"]) == (last.number, last.number_of("EC"))
    assert (seen.set_ec, seen.set_ph, seen.stage) == (2.6, 5.5, "fruit-set")
    assert seen.last_analysis is not None
    assert DEMO_MORNING - seen.last_analysis.at < timedelta(days=15)


def test_a_glance_before_everything_is_empty(bench: Bench) -> None:
    seen = bench.glance("north bay", DEMO_MORNING - timedelta(days=100))
    assert (seen.readings, seen.last_analysis, seen.set_ec) == ({}, None, 2.6)


def test_the_first_paint_loads_no_numpy(demo_once: Path) -> None:
    look = (
        "import sys; from fertui.workbench import open_site; "
        f"open_site({str(demo_once)!r}).glance('north bay'); print('numpy' in sys.modules)"
    )
    done = subprocess.run([sys.executable, "-c", look], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "False"
