"""EC that the litres of stock do not explain, on the invented site, whose log scatters as meters and dip sticks do."""

from __future__ import annotations

from datetime import timedelta
from pathlib import Path

import pytest

from fertui.estimate.assimilation import assimilate
from fertui.estimate.notices import Notice, notices
from fertui.logbook.entries import Entry
from fertui.logbook.store import FILE_NAME, Logbook
from fertui.site.files import read_site
from tests.conftest import DEMO_MORNING


def explained(site_folder: Path, loop: str, factor: float) -> list[Notice]:
    """What is said of the stock when the litres logged of the last three days are so many times what they were."""
    site = read_site(site_folder)
    with Logbook.open(site_folder / FILE_NAME) as book:
        entries = [_scaled(each, factor) for each in book.entries(at=DEMO_MORNING)]
    estimate = assimilate(site, site.loop(loop), entries, DEMO_MORNING, members=20)
    return [each for each in notices(estimate, entries) if each.code == "ec_unexplained"]


def _scaled(entry: Entry, factor: float) -> Entry:
    if entry.kind != "stock" or entry.at < DEMO_MORNING - timedelta(days=5):
        return entry
    values = tuple(v._replace(number=v.number * factor) if v.number is not None else v for v in entry.values)
    return entry._replace(values=values)


@pytest.mark.parametrize("loop", ["north bay", "lettuce"])
def test_stock_as_logged_explains_the_ec(demo_once: Path, loop: str) -> None:
    assert explained(demo_once, loop, 1.0) == []


@pytest.mark.parametrize(
    ("loop", "factor"), [("north bay", 0.6), ("north bay", 1.5), ("lettuce", 0.6), ("lettuce", 1.5)]
)
def test_the_same_ec_from_much_less_or_more_stock_is_said(demo_once: Path, loop: str, factor: float) -> None:
    # Litres of stock x strength against feed EC x m3: common practice, no source.
    (found,) = explained(demo_once, loop, factor)
    assert found.severity == "watch"
    assert "heck" in found.text


def test_what_a_sample_would_narrow_is_computed_for_the_invented_site(demo_once: Path) -> None:
    site = read_site(demo_once)
    with Logbook.open(demo_once / FILE_NAME) as book:
        entries = book.entries(at=DEMO_MORNING)
    later = max(each.at for each in entries if each.kind == "analysis" and each.point == "root_zone") + timedelta(
        days=9
    )
    found = notices(assimilate(site, site.loop("north bay"), entries, later, members=100), entries)
    (due,) = [each for each in found if each.code == "sample_now"]
    assert "% narrower" in due.text
