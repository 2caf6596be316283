"""A water report typed in one line: read with its units, refused where it is none, used by the new site."""

from __future__ import annotations

from pathlib import Path

import pytest

from fertui.refusals import Refusal
from fertui.site.new import first_steps
from fertui.site.questions import new_site_from
from fertui.site.water_report import read_report, report_text

NFT = {"crop": "lettuce", "area": "180", "layout": "shared-tank", "medium": "none", "tank": "700", "water": "tap"}


def test_numbers_are_taken_in_the_units_of_the_report() -> None:
    # Atomic weights (IUPAC): Ca 40.078, N 14.007; 50.04 mg CaCO3 to the meq.
    found = read_report("EC=0.5 pH: 7,6; Ca 52 mg/L, NO3-N 2 mg/L, CaCO3 145 mg/L, Na 0,5")
    assert (found.ec, found.ph) == (0.5, 7.6)
    by_hand = {"Ca": 52 / 40.078, "NO3": 2 / 14.007, "HCO3": 145 / 50.04, "Na": 0.5}
    assert dict(found.ions) == pytest.approx(by_hand, rel=1e-3)
    assert read_report(report_text(found)) == found


NO_REPORT = ("good water", "Ca", "Ca 52", "alkalinity 145 mg/L", "Xy 3", "Ca 1 mmol/L 2", "pH 76")


@pytest.mark.parametrize("written", NO_REPORT)
def test_what_is_no_report_is_refused_with_what_is_wanted(written: str) -> None:
    with pytest.raises(Refusal):
        read_report(written)


def test_a_new_site_counts_with_it_and_does_not_ask_for_it_again(tmp_path: Path) -> None:
    told = new_site_from(tmp_path / "told", {**NFT, "water-report": "Ca 1.3, HCO3 2.9"})
    assert told.waters[0].composition.ions == {"Ca": 1.3, "HCO3": 2.9}
    assert told.waters[0].composition.source == "water report"
    assert not any("report of the water" in step for step in first_steps(told))
    untold = new_site_from(tmp_path / "untold", NFT)
    assert any("report of the water 'tap'" in step for step in first_steps(untold))
