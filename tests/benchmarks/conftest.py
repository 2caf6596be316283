"""Benchmarks print one table of ratios: ``python -m pytest tests/benchmarks -m "long or not long" -s``.

Each ratio is of two costs measured in one run on one machine; seconds alone say nothing here.
"""

from __future__ import annotations

from collections.abc import Callable

import pytest

ROWS = pytest.StashKey[list[tuple[str, float, str]]]()
Ratio = Callable[[str, float, str], None]


def pytest_configure(config: pytest.Config) -> None:
    config.stash[ROWS] = []


@pytest.fixture
def says_ratio(request: pytest.FixtureRequest) -> Ratio:
    """Puts a row into the table: what against what, the ratio found, the bar in words."""
    rows = request.config.stash[ROWS]
    return lambda what, found, bar: rows.append((what, found, bar))


def pytest_terminal_summary(terminalreporter: pytest.TerminalReporter, config: pytest.Config) -> None:
    rows = config.stash.get(ROWS, [])
    if not rows:
        return
    terminalreporter.section("ratios")
    width = max(len(what) for what, _, _ in rows)
    for what, found, bar in rows:
        terminalreporter.line(f"{what.ljust(width)}  {found:8.2f}   {bar}")
