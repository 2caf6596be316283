"""Drift on the invented site: one time axis, what was measured, what was done."""

from __future__ import annotations

from datetime import timedelta
from pathlib import Path

import pytest

from fertui.workbench import open_site
from fertui.workbench.bench import Bench
from fertui.workbench.drift import MARKED, Drift
from tests.conftest import DEMO_MORNING


@pytest.fixture(scope="module")
def bench(demo_once: Path) -> Bench:
    return open_site(demo_once)


@pytest.fixture(scope="module")
def slabs(bench: Bench) -> Drift:
    return bench.drift("north bay", 28, DEMO_MORNING)


def test_every_course_keeps_to_the_days_asked_for_and_runs_forward(slabs: Drift) -> None:
    for series in slabs.series:
        assert list(series.times) == sorted(series.times)
        assert len(series.times) == len(series.values)
        assert all(DEMO_MORNING - timedelta(days=28) <= at <= DEMO_MORNING for at in series.times)
        assert all(value.low <= value.value <= value.high for value in series.values)


def test_each_quantity_has_its_unit_and_its_band(slabs: Drift) -> None:
    by_name = {series.what: series for series in slabs.series}
    assert (by_name["K share"].unit, by_name["K"].unit, by_name["EC"].unit) == ("%", "mmol/L", "mS/cm")
    assert by_name["K share"].band is not None
    assert {"K share", "Ca share", "Mg share", "Na", "NH4", "EC", "pH"} <= by_name.keys()


def test_what_the_laboratory_found_stands_on_the_same_axis(bench: Bench, slabs: Drift) -> None:
    found = [
        entry
        for entry in bench.entries(DEMO_MORNING)
        if entry.kind == "analysis" and entry.loop == "north bay" and entry.point in ("root_zone", "drain")
    ]
    (k,) = [series for series in slabs.series if series.what == "K"]
    recent = [(entry.at, entry.number_of("K")) for entry in found if entry.at >= DEMO_MORNING - timedelta(days=28)]
    assert recent
    assert list(k.measured) == recent


def test_marks_name_what_was_done_with_its_entry(bench: Bench, slabs: Drift) -> None:
    assert {mark.kind for mark in slabs.marks} <= set(MARKED)
    batch = next(mark for mark in slabs.marks if mark.kind == "batch")
    assert bench.book.entry(batch.number).kind == "batch"
    assert "litres 1000" in batch.text


def test_a_tank_is_followed_in_the_tank(bench: Bench) -> None:
    assert bench.drift("lettuce", 14, DEMO_MORNING).point == "tank"
