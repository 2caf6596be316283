"""Of a book of many years only what still matters is read; nothing of what matters is left out."""

from __future__ import annotations

from datetime import timedelta
from pathlib import Path

from fertui.workbench import open_site
from tests.conftest import DEMO_MORNING


def test_old_readings_are_left_and_what_stays_in_force_is_kept(demo: Path) -> None:
    bench = open_site(demo)
    long_ago = (DEMO_MORNING - timedelta(days=400)).strftime("%Y-%m-%d %H:%M")
    for kind, fields in (
        ("reading", {"EC": "2.0"}),
        ("recipe", {"K": "9"}),
        ("bleed", {"litres": "100", "reason": "leak"}),
    ):
        bench.record(kind, {**fields, "at": long_ago, "by": "MK"}, "north bay")
    old = [entry.kind for entry in bench.entries(DEMO_MORNING) if entry.at < DEMO_MORNING - timedelta(days=300)]
    assert sorted(old) == ["bleed", "recipe"]


def test_everything_of_the_last_months_is_read_once_in_the_order_of_its_time(demo_once: Path) -> None:
    bench = open_site(demo_once)
    entries = bench.entries(DEMO_MORNING)
    assert entries == bench.book.entries(at=DEMO_MORNING)
    assert len({entry.number for entry in entries}) == len(entries)


def test_a_plan_for_days_to_come_is_read_once(demo: Path) -> None:
    bench = open_site(demo)
    planned = bench.record("plan", {"crop": "600", "at": "2027-06-09 08:00", "by": "RV"}, "lettuce")
    assert [entry.number for entry in bench.entries()].count(planned.number) == 1
