"""The analysis view: normalisation, deviation, shares, checks, what the last recipe change did."""

from __future__ import annotations

from datetime import UTC, datetime

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fertui.logbook.entries import Entry
from fertui.logbook.parse import entry_from_text
from fertui.site.model import Composition, Loop, Site
from fertui.workbench.analysis import AnalysisView, analysis

NOW = datetime(2026, 7, 1, 6, 0, tzinfo=UTC)
TARGET = Composition({"K": 8.0, "Ca": 10.0, "Mg": 4.5, "NO3": 22.0, "Na": 4.0}, {"Fe": 35.0}, ec=4.0)
"""Root zone of tomato: Nutrient Solutions for Greenhouse Crops, 2016 (second-hand); Na our own, to see it unscaled."""
SLABS = Loop("bay", "drain-blend", 1000.0, "tomato", "stone-wool", target="own")
SITE = Site("Testing house", "UTC", (SLABS,), targets={"own": {"root_zone": TARGET, "feed": TARGET}})


def said(kind: str, at: str, **texts: str) -> Entry:
    return entry_from_text(kind, {"by": "MK", "at": at, **texts}, SITE, SLABS, NOW)


def view(*entries: Entry) -> AnalysisView:
    return analysis(SITE, SLABS, entries, NOW)


def test_normalisation_by_hand() -> None:
    # Nutrient Solutions for Greenhouse Crops 2016 (second-hand): EC_nutrients = EC - 0.1 Na; c_ref = c EC_ref /
    # EC_nutrients; EC_ref = target EC - 0.3; Na, HCO3 (and here NH4) are not scaled. By hand: EC 4.5, Na 6:
    # 4.5 - 0.6 = 3.9; EC_ref 4.0 - 0.3 = 3.7; factor 0.94872; K 6.0 -> 5.692; against 8.0: -28.8 %.
    found = view(said("analysis", "2026-06-25 09:00", point="root_zone", EC="4.5", Na="6", K="6.0", Ca="12", NH4="0.4"))
    rows = {row.ion: row for row in found.rows}
    assert found.ec_reference == pytest.approx(3.7)
    assert rows["K"].normalised == pytest.approx(5.692, abs=0.001)
    assert rows["K"].deviation_pct == pytest.approx(-28.8, abs=0.1)
    assert rows["K"].words == "low"
    assert rows["Ca"].normalised == pytest.approx(12 * 3.7 / 3.9)
    assert rows["Na"].normalised == 6.0
    assert rows["Na"].deviation_pct == pytest.approx(50.0)
    assert rows["NH4"].normalised == 0.4


@given(ec=st.floats(1.0, 9.0), na=st.floats(0.0, 8.0), k=st.floats(0.1, 20.0), dilution=st.floats(0.3, 1.0))
def test_diluting_a_sample_without_sodium_changes_no_normalised_value(
    ec: float, na: float, k: float, dilution: float
) -> None:
    def normalised(part: float, sodium: float) -> float:
        texts = {"EC": f"{ec * part:.9f}", "K": f"{k * part:.9f}", "Na": f"{sodium:.9f}"}
        rows = view(said("analysis", "2026-06-25 09:00", point="root_zone", **texts)).rows
        found = next(row.normalised for row in rows if row.ion == "K")
        assert found is not None
        return found

    assert normalised(dilution, 0.0) == pytest.approx(normalised(1.0, 0.0), rel=1e-6)
    assert normalised(1.0, na) >= normalised(1.0, 0.0) - 1e-9


@pytest.mark.parametrize(
    ("k", "words"),
    [("8.4", "on target"), ("9.2", "a little high"), ("11", "high"), ("13", "very high"), ("3.5", "very low")],
)  # 25 and 50 %: steps of the correction rule, Nutrient Solutions for Greenhouse Crops 2016 (second-hand)
def test_deviation_in_words(k: str, words: str) -> None:
    rows = view(said("analysis", "2026-06-25 09:00", point="root_zone", EC="3.7", K=k)).rows
    assert next(row.words for row in rows if row.ion == "K") == words


def test_without_ec_nothing_is_scaled() -> None:
    rows = view(said("analysis", "2026-06-25 09:00", point="root_zone", K="6.0")).rows
    assert next(row.normalised for row in rows if row.ion == "K") == 6.0


def test_feed_previous_and_last_stand_side_by_side_with_their_shares() -> None:
    found = view(
        said("analysis", "2026-06-11 09:00", point="root_zone", K="8", Ca="10", Mg="4.5"),
        said("analysis", "2026-06-25 09:00", point="feed", K="9.5", Ca="5.4", Mg="2.4"),
        said("analysis", "2026-06-25 09:00", point="root_zone", K="4.6", Ca="11.2", Mg="5.0"),
    )
    row = found.rows[0]
    assert (row.ion, row.feed, row.managed, row.previous) == ("K", 9.5, 4.6, 8.0)
    # By hand, in equivalents: 4.6 / (4.6 + 22.4 + 10.0) = 12.4 %; 8 / (8 + 20 + 9) = 21.6 %.
    assert found.shares["K"] == (pytest.approx(12.43, abs=0.01), pytest.approx(21.62, abs=0.01))


def test_the_drain_stands_in_where_the_root_zone_was_never_sampled() -> None:
    assert view(said("analysis", "2026-06-25 09:00", point="drain", K="6.0")).managed_point == "drain"


def test_an_extract_is_shown_as_the_pore_water_it_stands_for() -> None:
    # Factor of the site for its own paste extracts: its setting, here 2.0.
    loop = SLABS._replace(extract_factors={"paste": 2.0})
    texts = {"by": "MK", "at": "2026-06-25 09:00", "point": "root_zone", "method": "paste", "K": "3.0", "EC": "2.0"}
    entry = entry_from_text("analysis", texts, SITE._replace(loops=(loop,)), loop, NOW)
    found = analysis(SITE, loop, [entry], NOW)
    assert (found.method, found.rows[0].managed) == ("paste", 6.0)


def test_micronutrients_are_compared_but_not_scaled() -> None:
    (fe, *_) = view(said("analysis", "2026-06-25 09:00", point="root_zone", EC="4.5", Na="6", Fe="28")).micronutrients
    assert (fe.ion, fe.normalised, fe.unit) == ("Fe", 28.0, "umol/L")
    assert fe.deviation_pct == pytest.approx(-20.0)


def test_what_the_last_recipe_change_did_is_told_between_the_analyses_around_it() -> None:
    before = said("analysis", "2026-06-11 09:00", point="root_zone", K="8", Ca="10", Mg="4.5")
    change = said("recipe", "2026-06-15 09:00", K="11", Ca="5")
    after = said("analysis", "2026-06-25 09:00", point="root_zone", K="9.1", Ca="9.5", Mg="4.4")
    assert (
        view(before, change, after).last_change
        == "Since the recipe of 15 Jun: K 8.0 to 9.1, Ca 10.0 to 9.5, Mg 4.5 to 4.4 mmol/L."
    )
    late = said("recipe", "2026-06-28 09:00", K="11")
    assert "after both" in view(before, after, late).last_change
    assert view(before, after).last_change == ""


def test_a_loop_without_analysis_has_an_empty_view() -> None:
    found = view()
    assert found.managed is None
    assert all(row.managed is None and row.deviation_pct is None for row in found.rows)


def test_an_analysis_that_does_not_close_fails_its_check() -> None:
    # NO3 730 mg/L read as N: 52 mmol/L, anions far above cations (field practice, scenario 2).
    odd = view(
        said("analysis", "2026-06-25 09:00", point="root_zone", K="8", Ca="10", Mg="4.5", NO3="52", SO4="6.8", EC="4")
    )
    assert any(not check.passed for check in odd.checks["root_zone"])
