"""A correction keeps the form a value was written in: mg of nitrogen do not become mg of nitrate."""

from __future__ import annotations

from datetime import UTC, datetime

import pytest

from fertui.logbook.entries import Entry
from fertui.logbook.parse import corrected, entry_from_text
from fertui.tui.forms.correction import spec_of
from tests.paper.hand_made import NOW, SITE

REPORT = {"NO3-N": "260 mg/L", "S": "52 mg/L", "CaCO3": "20 mg/L", "K": "8,0"}


@pytest.fixture
def entry() -> Entry:
    texts = {"by": "MK", "at": "2026-06-18 08:50", "point": "drain", **REPORT}
    return entry_from_text("analysis", texts, SITE, "slabs", datetime(2026, 7, 1, tzinfo=UTC))._replace(number=3)


def test_fields_bear_the_form_and_text_of_the_report_each_ion_once(entry: Entry) -> None:
    offered = [each for group in spec_of(entry).groups for each in group.fields]
    held = {each.name: each.default for each in offered if each.default}
    assert held == {**REPORT, "point": "drain"}
    names = [each.name for each in offered]
    assert not {"NO3", "SO4", "HCO3"} & set(names)
    assert len(names) == len(set(names))


def test_a_corrected_number_is_of_what_the_old_one_was(entry: Entry) -> None:
    # 262 mg/L N / 14.007 g/mol (CIAAW 2021) = 18.70 mmol/L NO3; as mg of nitrate it would be 4.23.
    new = corrected(entry, {"NO3-N": "262 mg/L"}, SITE, NOW, why="misread", by="MK")
    assert new.number_of("NO3") == pytest.approx(18.70, rel=0.001)
