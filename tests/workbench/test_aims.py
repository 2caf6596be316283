"""Bands and limits in force: the loop's own go before the crop's presets, and each says where it comes from."""

from __future__ import annotations

from pathlib import Path

from fertui.site.model import Sourced
from fertui.workbench import open_site
from fertui.workbench.aims import aims
from fertui.workbench.demo import build_demo


def test_every_aim_has_a_unit_and_a_source_and_the_loops_own_goes_first(tmp_path: Path) -> None:
    bench = open_site(build_demo(tmp_path / "demo"))
    found = bench.aims("north bay")
    assert all(each.source for each in found)
    assert all(each.unit or each.what == "pH" for each in found)
    assert {each.point for each in found} == {"feed", "root_zone"}

    loop = bench.loop("north bay")
    own = loop._replace(limits={"root_zone": {"Na": Sourced(None, 5.0, "own trial")}, "drain": {}})
    [sodium] = [each for each in aims(bench.site, own) if (each.point, each.what) == ("root_zone", "Na")]
    assert (sodium.words, sodium.source) == ("at most 5 mmol/L", "own trial")
    assert "drain" in {each.point for each in aims(bench.site, own)}


def test_a_water_as_last_analysed_is_in_force_with_its_entry(demo: Path) -> None:
    bench = open_site(demo)
    report = {"point": "source", "source": "well", "at": "2026-05-20 09:00", "by": "MK"}
    entry = bench.record("analysis", {**report, "Ca": "2.6", "pH": "7.9"}, "north bay")
    rows = {aim.what: aim for aim in bench.aims("north bay") if aim.kind == "analysed"}
    assert {aim.point for aim in rows.values()} == {"water well"}
    assert (rows["Ca"].words, rows["pH"].words, rows["Mg"].words) == ("2.6 mmol/L", "7.9", "0.5 mmol/L")
    assert rows["Ca"].source == f"analysis {entry.number} of 20 May 2026"
