"""Points have one word to be shown by, and are understood by what people call them."""

from __future__ import annotations

from pathlib import Path

import pytest

from fertui.logbook.errors import LogbookError
from fertui.logbook.parse import entry_from_text
from fertui.site.model import POINTS
from fertui.site.points import POINT_NAMES, point_called
from tests.paper.hand_made import NOW, SITE

GLOSSARY = Path(__file__).parent.parent.parent / "docs" / "glossary.md"


def test_every_point_has_a_word_of_its_own_in_the_glossary() -> None:
    assert set(POINT_NAMES) == set(POINTS)
    assert len(set(POINT_NAMES.values())) == len(POINTS)
    (row,) = [line for line in GLOSSARY.read_text(encoding="utf-8").splitlines() if line.startswith("| point |")]
    assert all(name in row and f"`{point}`" in row for point, name in POINT_NAMES.items())


@pytest.mark.parametrize("point", POINTS)
def test_what_is_shown_is_understood(point: str) -> None:
    assert point_called(POINT_NAMES[point]) == point_called(point) == point


@pytest.mark.parametrize(("said", "point"), [("drip", "feed"), ("Dripper", "feed"), ("slab", "root_zone")])
def test_an_entry_takes_the_word_of_the_trade(said: str, point: str) -> None:
    assert entry_from_text("reading", {"by": "MK", "point": said, "EC": "2.6"}, SITE, "slabs", NOW).point == point


def test_an_unknown_point_is_refused_with_those_there_are() -> None:
    with pytest.raises(LogbookError, match="Points of slabs: "):
        entry_from_text("reading", {"by": "MK", "point": "elsewhere", "EC": "2.6"}, SITE, "slabs", NOW)
