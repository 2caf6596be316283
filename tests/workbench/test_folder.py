"""Of a book of many years only what still matters is read; nothing of what matters is left out."""

from __future__ import annotations

from datetime import timedelta
from pathlib import Path

from fertui.cli.views.analysis import text
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


def a_year_ago(days: int = 0) -> str:
    return (DEMO_MORNING - timedelta(days=365 + days)).strftime("%Y-%m-%d %H:%M")


def test_the_last_report_stands_however_old_it_is_with_the_one_before(demo: Path) -> None:
    bench = open_site(demo)
    point = {"point": "root_zone", "by": "MK"}
    for days, k in ((200, "5.0"), (100, "6.0"), (0, "7.0")):
        bench.record("analysis", {"K": k, "Ca": "9", "Mg": "4", "at": a_year_ago(days), **point}, "north bay")
    at = DEMO_MORNING - timedelta(days=365 - 250)
    found = bench.analysis("north bay", at)
    assert found.managed is not None
    assert found.previous is not None
    assert (found.managed.values["K"], found.previous.values["K"]) == (7.0, 6.0)
    assert [entry.number_of("K") for entry in bench.entries(at) if entry.kind == "analysis"] == [7.0]
    glance = bench.glance("north bay", at)
    assert glance.last_analysis is not None
    assert glance.last_analysis.values["K"] == 7.0
    assert bench.today("north bay", at).last_analysis == glance.last_analysis


def test_a_report_struck_later_stands_only_as_the_book_was_known_then(demo: Path) -> None:
    bench = open_site(demo)
    texts = {"point": "root_zone", "by": "MK", "K": "7.0", "at": a_year_ago()}
    at = DEMO_MORNING - timedelta(days=200)
    struck = bench.record("analysis", texts, "north bay")
    before = struck.entered
    bench.void(struck.number or 0, "another grower's", "MK")
    assert bench.analysis("north bay", at).managed is None
    assert bench.analysis("north bay", at, before).managed is not None


def test_set_points_readings_checks_and_stock_drawn_do_not_vanish_with_the_months(demo: Path) -> None:
    bench = open_site(demo)
    tank = bench.site.loop("north bay").stock_tanks[0]
    logged = (
        ("batch", {"tank": tank, "litres": "1000"}, 30),
        ("stock", {"tank": tank, "litres": "400"}, 20),
        ("setpoint", {"EC": "2.2"}, 10),
        ("calibration", {"quantity": "EC", "standard": "1.41", "reading": "1.60", "instrument": "EC pen"}, 8),
        ("reading", {"point": "feed", "EC": "2.1"}, 5),
    )
    for kind, texts, days in logged:
        bench.record(kind, {**texts, "at": a_year_ago(days), "by": "MK"}, "north bay")
    at = DEMO_MORNING - timedelta(days=200)
    glance = bench.glance("north bay", at)
    assert glance.set_ec == 2.2
    assert glance.readings["feed"].values["EC"] == 2.1
    assert {row.name: row.litres_left for row in bench.stock_rows("north bay", at)}[tank] == 600.0
    kinds = [entry.kind for entry in bench.entries(at)]
    assert [kinds.count(kind) for kind in ("calibration", "reading", "stock")] == [1, 1, 1]


def test_acid_plan_and_stock_sheet_count_with_the_water_as_last_analysed(demo: Path) -> None:
    bench = open_site(demo)
    before, sheet = bench.acid("lettuce"), bench.stock("north bay")
    report = {"point": "source", "at": (DEMO_MORNING - timedelta(days=3)).strftime("%Y-%m-%d %H:%M"), "by": "MK"}
    bench.record("analysis", {**report, "source": "rain", "HCO3": "3.3"}, "north bay")
    bench.record("analysis", {**report, "source": "well", "Ca": "2.6"}, "north bay")
    after = bench.acid("lettuce")
    assert (before.alkalinity_meq_l, after.alkalinity_meq_l) == (0.3, 3.3)
    calcium = [
        sum(each.kg for tank in made.tanks for each in tank.salts if "calcium" in each.salt)
        for made in (sheet, bench.stock("north bay"))
    ]
    assert calcium[1] < calcium[0]
    assert [water.composition.source for water in bench.site.waters] == ["invented analysis"] * 2
    estimate = bench.estimate("lettuce", DEMO_MORNING)
    assert [water.composition.ions["HCO3"] for water in estimate.site.waters] == [2.9, 3.3]


def test_what_takes_its_time_tells_how_far_it_is(demo_once: Path) -> None:
    bench = open_site(demo_once)
    heard: list[tuple[str, float]] = []
    bench.progress = lambda doing, part: heard.append((doing, part))
    bench.plan("lettuce", 7, DEMO_MORNING)
    bench.hindcast("lettuce", DEMO_MORNING)
    told = {doing: [part for name, part in heard if name == doing] for doing, _ in heard}
    assert list(told) == ["following the logbook of lettuce", "trying plans", "forecasting the past"]
    for parts in told.values():
        assert parts == sorted(parts)
        assert 0.0 <= parts[0] < 0.2
        assert 0.3 < parts[-1] <= 1.0


def test_the_report_of_the_make_up_water_stands_with_the_analysis_on_screen_and_in_words(demo: Path) -> None:
    bench = open_site(demo)
    assert bench.analysis("lettuce", DEMO_MORNING).water is None
    report = {"point": "source", "at": "2026-05-20 09:00", "by": "MK", "HCO3": "1.2", "pH": "7.1"}
    other = bench.record("analysis", {**report, "source": "well"}, "north bay")
    entry = bench.record("analysis", {**report, "source": "rain"}, "north bay")  # noted at the other loop: shared
    found = bench.analysis("lettuce", DEMO_MORNING)
    assert found.water is not None
    assert (found.water.number, found.water_name, found.water.values["HCO3"]) == (entry.number, "rain", 1.2)
    said = text(found, bench.site.timezone, "mmol/L")
    assert f"Make-up water rain, Wed 20 May 2026 09:00, entry {entry.number}, used from then on" in said
    last = bench.glance("north bay", DEMO_MORNING).last_analysis
    assert last is not None
    assert last.number not in (entry.number, other.number)
