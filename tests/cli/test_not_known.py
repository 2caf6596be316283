"""On the command line nothing unsure is shown as sure: a new site with a well that nobody analysed."""

from __future__ import annotations

import json
import re
from pathlib import Path

import pytest

from fertui.cli.main import run_command

AT = "2026-07-01T08:00+00:00"
NEW = "--crop lettuce --medium none --layout shared-tank --area 180 --tank 700 --water well --timezone UTC"
SHELF = (
    "calcium nitrate double salt,potassium nitrate,monopotassium phosphate,magnesium sulfate heptahydrate,"
    "nitric acid 38 %"
)
ANALYSIS = "K=10 Ca=5 Mg=1.2 Na=2 Cl=1 NO3=19 NH4=0.5 SO4=1.2 H2PO4=1.8 EC=2.5 pH=5.9"


def told(capsys: pytest.CaptureFixture[str], *words: object) -> tuple[int, str]:
    code = run_command([str(word) for word in words])
    return code, capsys.readouterr().out


@pytest.fixture
def fresh(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> Path:
    assert run_command(["new", str(tmp_path / "nft"), *NEW.split(), "--supplies", SHELF]) == 0
    capsys.readouterr()
    return tmp_path / "nft"


def flat(text: str) -> str:
    return " ".join(text.split())


def test_today_of_a_new_site_asks_for_a_sample_and_raises_no_alarm(
    fresh: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    _, out = told(capsys, "today", fresh, "--at", AT)
    looked = out.split("To look at")[1].strip().splitlines()
    assert looked[0].startswith("!! Take a sample.")
    assert out.count("!!") == 1
    assert "out since" not in out
    assert re.search(r"K share +not known yet +[\d.]+-[\d.]+ %", out)
    assert re.search(r"Na +not known: the water 'well' was never analysed", out)


def test_its_json_holds_honestly_wide_ranges(fresh: Path, capsys: pytest.CaptureFixture[str]) -> None:
    _, out = told(capsys, "today", fresh, "--at", AT, "--json")
    for ion, known in json.loads(out)["points"]["tank"]["ions"].items():
        assert known["mmol_L"]["low"] < known["mmol_L"]["value"] < known["mmol_L"]["high"] or ion in ("K", "NH4",
            "NO3", "H2PO4")  # fmt: skip
        assert known["mmol_L"]["high"] > 10 * known["mmol_L"]["low"]


def test_its_forecast_gives_no_chances(fresh: Path, capsys: pytest.CaptureFixture[str]) -> None:
    _, out = told(capsys, "forecast", fresh, "--at", AT)
    assert "chance" not in out
    assert "not known yet: no analysis stands behind these ranges; take a sample first" in out
    assert "the make-up water was never analysed" in flat(out)


def test_its_plan_is_to_take_a_sample(fresh: Path, capsys: pytest.CaptureFixture[str]) -> None:
    code, out = told(capsys, "plan", fresh, "--at", AT)
    assert code == 1
    assert "take a sample first" in out
    assert "Weigh and dissolve" not in out


def test_sheets_say_that_the_water_is_not_known(fresh: Path, capsys: pytest.CaptureFixture[str]) -> None:
    told(capsys, "record", fresh, "analysis", "point=tank", "at=2026-07-01T07:00+00:00", "by=MK", *ANALYSIS.split())
    for command in ("plan", "stock", "acid"):
        _, out = told(capsys, command, fresh, "--at", AT)
        assert "the water 'well' was never analysed" in flat(out), command
    _, out = told(capsys, "acid", fresh, "--at", AT)
    assert "NO DOSE" in out


def test_a_logged_analysis_of_the_water_ends_it(fresh: Path, capsys: pytest.CaptureFixture[str]) -> None:
    water = "K=0.1 Ca=2 Mg=0.5 Na=1.2 Cl=1.1 NO3=0.2 SO4=0.7 HCO3=2.9"
    told(capsys, "record", fresh, "analysis", "point=tank", "at=2026-07-01T07:00+00:00", "by=MK", *ANALYSIS.split())
    told(capsys, "record", fresh, "analysis", "point=source", "at=2026-07-01T06:00+00:00", "by=MK", *water.split())
    for command in ("today", "forecast", "plan", "stock", "acid"):
        _, out = told(capsys, command, fresh, "--at", AT)
        assert "never analysed" not in flat(out), command


def test_a_tank_that_was_read_and_never_analysed_gets_no_weighings(
    fresh: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    told(capsys, "record", fresh, "reading", "point=tank", "at=2026-07-01T07:00+00:00", "by=MK", "EC=2.5", "pH=5.9")
    code, out = told(capsys, "plan", fresh, "--at", AT)
    assert code == 1
    assert "take a sample first: the tank was never analysed, nor its water" in flat(out)
    assert "Weigh and dissolve" not in out
