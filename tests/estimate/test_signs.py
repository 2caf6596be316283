"""A sign means one thing: on screens, in text, on paper and in the glossary."""

from __future__ import annotations

from pathlib import Path

import pytest

from fertui.catalogue.cautions import Caution
from fertui.cli.views.tables import check_text
from fertui.estimate.notices.notice import SEVERITIES
from fertui.estimate.signs import CAUTION_SIGNS, LEGEND, MEANINGS, SIGNS
from fertui.paper.cautions import read_first
from fertui.tui.figures import CAUTION_INKS, MARKS
from fertui.workbench.checks import CheckRow

GLOSSARY = Path(__file__).parent.parent.parent / "docs" / "glossary.md"


def test_every_severity_has_one_sign_of_its_own() -> None:
    assert tuple(SIGNS) == SEVERITIES
    assert len(set(SIGNS.values())) == len(SIGNS)


@pytest.mark.parametrize("severity", SEVERITIES)
def test_screens_check_and_glossary_use_the_sign_of_a_severity(severity: str) -> None:
    sign = SIGNS[severity]
    row = CheckRow("watch bay", "x", "words", passed=severity == "note", severity=severity)
    assert MARKS[severity] == sign
    assert check_text([row]).splitlines()[1] == f"  {sign:2} words"
    assert f"| `{sign}` | {MEANINGS[severity]} |" in GLOSSARY.read_text(encoding="utf-8")
    assert f"  {sign:2} {MEANINGS[severity]}" in LEGEND.splitlines()


@pytest.mark.parametrize("severity", CAUTION_SIGNS)
def test_cautions_bear_the_sign_of_their_severity_on_screen_and_on_paper(severity: str) -> None:
    sign = CAUTION_SIGNS[severity]
    assert MARKS[CAUTION_INKS[severity]] == sign
    assert read_first([Caution("c", severity, "words", "")])[1] == f"{sign:2} words"


def test_what_failed_without_a_severity_is_to_be_acted_upon() -> None:
    assert CheckRow("logbook", "chain", "broken", passed=False).sign == "!!"
    assert CheckRow("logbook", "chain", "unbroken", passed=True).sign == "ok"
