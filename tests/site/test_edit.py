"""One value of a site listed and changed by its dotted name."""

from __future__ import annotations

from pathlib import Path

import pytest

from fertui.site.checks import SiteError
from fertui.site.edit import changed, rows
from fertui.site.model import Site
from fertui.site.new import new_site


@pytest.fixture
def site(tmp_path: Path) -> Site:
    return new_site(
        tmp_path, crop="tomato", medium="coir", layout="drain-blend", area_m2=1234567.0, loop="north 1.2",
        supplies=["KNO3", "nitric acid 60 %"],
    )  # fmt: skip


def test_every_row_can_be_written_back_and_changes_nothing(site: Site) -> None:
    for row in rows(site):
        assert changed(site, row.key, row.text, source=row.source) == site, row


def test_rows_show_value_and_source(site: Site) -> None:
    found = {row.key: row for row in rows(site)}
    assert found["loops.north 1.2.area_m2"].text == "1234567"
    assert found["loops.north 1.2.feed_EC"].source.startswith("Nutrient Solutions")
    assert found["loops.north 1.2.bands.root_zone.K_share.low"].source == "common practice, no source"


def test_a_changed_number_loses_the_source_of_the_old_one(site: Site) -> None:
    band = changed(site, "loops.north 1.2.bands.root_zone.K_share.low", "16,5", "MK, 1 Mar")
    assert band.loops[0].bands["root_zone"]["K share"].low == 16.5
    assert band.loops[0].bands["root_zone"]["K share"].source == "MK, 1 Mar"
    fed = changed(site, "loops.north 1.2.feed_EC", "2.9")
    assert fed.loops[0].sources["feed_EC"] == "own setting"


def test_a_new_limit_can_be_set_for_the_whole_site(site: Site) -> None:
    assert changed(site, "limits.drain.Na.high", "7").limits["drain"]["Na"].high == 7


def test_keys_may_hold_dots(site: Site) -> None:
    factored = changed(site, "loops.north 1.2.extract_factors.extract_1_1.5", "2,5")
    assert factored.loops[0].extract_factors == {"extract_1_1.5": 2.5}
    assert changed(factored, "loops.north 1.2.extract_factors.extract_1_1.5", "3").loops[0].extract_factors


def test_values_of_every_type(site: Site) -> None:
    assert changed(site, "loops.north 1.2.name", "12").loops[0].name == "12"
    assert changed(site, "site.staffed_days", "Mon, Tue").staffed_days == ("Mon", "Tue")
    assert changed(site, "loops.north 1.2.stage", "fruit-set").loops[0].stage == "fruit-set"
    assert changed(site, "supplies.nitric acid 60 %.strength_pct", "38").supplies[1].strength_pct == 38
    assert changed(site, "loops.north 1.2.feed_EC", "").loops[0].feed_ec is None


@pytest.mark.parametrize(
    ("key", "text", "says"),
    [
        ("loops.north 1.2.area_m2", "-3", "0.01 to 10,000,000 m2"),
        ("loops.north 1.2.area", "3", "did you mean area_m2?"),
        ("loops.south.area_m2", "3", "known: north 1.2"),
        ("loops.north 1.2.area_m2", "", "area_m2 is missing"),
        ("loops.north 1.2.bands", "5", "table"),
        ("loops", "5", "table"),
        ("loops.north 1.2", "5", "names no value"),
        ("", "5", "names no value"),
        ("site.units", "mmol", "did you mean mmol/L?"),
        ("supplies.nitric acid 60 %.strength_pct", "", "mass % on its label"),
        ("loops.north 1.2.area_m2", "[" * 3000, "a number"),
        ("site.name", "a\nb", "line breaks"),
    ],
)
def test_a_refused_change_says_why_and_changes_nothing(site: Site, key: str, text: str, says: str) -> None:
    before = rows(site)
    with pytest.raises(SiteError) as refused:
        changed(site, key, text)
    assert says in str(refused.value)
    assert rows(site) == before
