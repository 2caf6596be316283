"""A book of ten years costs what an empty one costs: to write into, and to open its last sixty days."""

from __future__ import annotations

import statistics
import time
from collections.abc import Callable
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest

from fertui.logbook.entries import Entry, Value
from fertui.logbook.store import FILE_NAME, Logbook

pytestmark = pytest.mark.long

Ratio = Callable[[str, float, str], None]
MANY = 100_000
A_DAY = 28
NOW = datetime(2026, 7, 1, tzinfo=UTC)
DEARER_TO_APPEND, DEARER_TO_OPEN = 2.0, 1.3


def reading(age_in_entries: int) -> Entry:
    """A reading of seven numbers, so many entries before now, at 28 entries a day."""
    at = NOW - timedelta(days=age_in_entries / A_DAY)
    values = tuple(Value(name, "2,6", 2.6) for name in ("EC", "pH", "temperature", "K", "Ca", "NO3", "Na"))
    return Entry("reading", "bay", at, at, "MK", values, point="feed")


def book_of(path: Path, entries: int) -> Path:
    """A logbook with so many entries, the newest now."""
    with Logbook.create(path) as book:
        for first in range(entries, 0, -5000):
            book.append([reading(age) for age in range(first, max(first - 5000, 0), -1)])
    return path


@pytest.fixture(scope="module")
def large(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The book of ten years."""
    return book_of(tmp_path_factory.mktemp("large") / FILE_NAME, MANY)


@pytest.fixture(scope="module")
def small(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A book that holds just the sixty days."""
    return book_of(tmp_path_factory.mktemp("small") / FILE_NAME, 60 * A_DAY)


def ratio(costly: Callable[[], object], cheap: Callable[[], object], times: int) -> float:
    """Median cost of one over the other, measured in turns so that a busy machine slows both."""
    costs: dict[str, list[float]] = {"costly": [], "cheap": []}
    for _ in range(times):
        for name, work in (("costly", costly), ("cheap", cheap)):
            started = time.perf_counter()
            work()
            costs[name].append(time.perf_counter() - started)
    return statistics.median(costs["costly"]) / statistics.median(costs["cheap"])


def test_appending_to_a_large_book_costs_little_more(large: Path, tmp_path: Path, says_ratio: Ratio) -> None:
    with Logbook.open(large) as full, Logbook.create(tmp_path / FILE_NAME) as empty:
        found = ratio(lambda: full.append(reading(0)), lambda: empty.append(reading(0)), 300)
    says_ratio(f"append, book of {MANY:,} entries / empty book", found, "at most 2")
    assert found <= DEARER_TO_APPEND


def test_opening_sixty_days_of_a_large_book_costs_little_more(large: Path, small: Path, says_ratio: Ratio) -> None:
    def window(path: Path) -> int:
        with Logbook.open(path) as book:
            return len(book.entries("bay", since=NOW - timedelta(days=59), at=NOW - timedelta(minutes=1)))

    assert window(large) == window(small) > 1600
    found = ratio(lambda: window(large), lambda: window(small), 25)
    says_ratio(f"open 60 days, book of {MANY:,} entries / {60 * A_DAY:,}", found, "at most 1.3")
    assert found <= DEARER_TO_OPEN
