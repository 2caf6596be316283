"""A small site and an empty book for the tests of the logbook."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from datetime import UTC, datetime
from pathlib import Path

import pytest

from fertui.logbook.entries import Entry
from fertui.logbook.parse import entry_from_text
from fertui.logbook.store import FILE_NAME, Logbook
from fertui.site.model import Composition, Instrument, Loop, Site, StockTank, Supply, Water

NOW = datetime(2026, 7, 1, 9, 0, tzinfo=UTC)
"""Eleven in the morning on the clock of the site."""

SITE = Site(
    name="Testing house",
    timezone="Europe/Amsterdam",
    loops=(
        Loop(
            name="bay",
            layout="drain-blend",
            area_m2=1000.0,
            crop="tomato",
            medium="coir",
            drain_store_l=20000.0,
            stock_tanks=("calcium", "sulfate"),
            extract_factors={"paste": 2.0},
        ),
        Loop(name="gutters", layout="shared-tank", area_m2=400.0, crop="lettuce", medium="none", tank_l=2000.0),
    ),
    waters=(Water("well", Composition()), Water("rain", Composition())),
    supplies=(
        Supply("MKP", "monopotassium phosphate", amount_kg=25.0),
        Supply("nitric 38", "nitric acid", strength_pct=38.0),
    ),
    stock_tanks=(StockTank("calcium", 1000.0, letter="A"), StockTank("sulfate", 1000.0, letter="B")),
    instruments=(
        Instrument("blue pen", "EC meter", compensated=False),
        Instrument("white pen", "EC meter"),
        Instrument("nitrate pen", "ion meter", compensated=True),
    ),
)

Say = Callable[..., Entry]


@pytest.fixture
def site() -> Site:
    """The site of these tests."""
    return SITE


@pytest.fixture
def book(tmp_path: Path) -> Iterator[Logbook]:
    """An empty logbook."""
    with Logbook.create(tmp_path / FILE_NAME) as made:
        yield made


@pytest.fixture
def say() -> Say:
    """An entry from ``kind`` and ``name=value`` words, by MK, now, on the first loop."""

    def entry(kind: str, loop: str | None = None, now: datetime = NOW, **texts: str) -> Entry:
        named = {name.replace("__", "-").replace("from_", "from"): text for name, text in texts.items()}
        return entry_from_text(kind, {"by": "MK", **named}, SITE, loop, now)

    return entry
