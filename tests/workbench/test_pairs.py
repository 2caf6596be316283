"""A batch of things that must not meet in one stock tank is asked about, by screen and command alike."""

from __future__ import annotations

from pathlib import Path

import pytest

from fertui.workbench import open_site
from fertui.workbench.bench import Bench

CALCIUM = {"calcium nitrate double salt": "60"}


@pytest.fixture
def bench(demo: Path) -> Bench:
    return open_site(demo)


def pairs(bench: Bench, **fields: str) -> list[str]:
    texts = {"litres": "1000", "left": "0", "by": "MK", **fields}
    return [each.text for each in bench.questions("batch", texts, "north bay") if each.code == "pair"]


@pytest.mark.parametrize(
    ("other", "solid"),
    [("magnesium sulfate heptahydrate", "gypsum"), ("monopotassium phosphate", "calcium phosphate")],
)
def test_calcium_with_sulfate_or_phosphate_is_asked_about_with_the_reason(bench: Bench, other: str, solid: str) -> None:
    # Calcium apart from sulfates and phosphates: Quaderno ARSIA 5/2004, Tab. 5.
    (text,) = pairs(bench, tank="calcium", **CALCIUM, **{other: "10"})
    assert text.startswith(f"calcium nitrate double salt and {other} in one stock tank: {solid} falls out")


def test_what_stands_together_in_practice_is_not_asked_about(bench: Bench) -> None:
    assert pairs(bench, tank="calcium", **CALCIUM, **{"potassium nitrate": "30", "iron DTPA": "1.4"}) == []


def test_old_solution_left_in_the_tank_counts(bench: Bench) -> None:
    assert pairs(bench, tank="sulfate", **CALCIUM) == []
    assert any("gypsum" in text for text in pairs(bench, tank="sulfate", **CALCIUM, left="400"))


def test_an_unanswered_question_stays_with_the_entry(bench: Bench) -> None:
    fields = {"tank": "calcium", "litres": "100", "left": "0", "by": "MK", "magnesium sulfate heptahydrate": "5"}
    entry = bench.record("batch", {**fields, **CALCIUM}, "north bay", asked=False)
    assert "pair" in entry.flags.split()
