"""A newcomer's first hour at the shell: a new site, three mornings, one report, a plan. Numbers invented."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from fertui.cli.main import run_command

NFT = "--crop lettuce --medium none --layout shared-tank --area 180 --tank 700 --water rain --timezone Europe/Rome"
REPORT = """\
at;point;EC [mS/cm];pH;NH4 [mmol/L];K [mmol/L];Na [mmol/L];Ca [mmol/L];Mg [mmol/L];NO3 [mmol/L];Cl [mmol/L];\
SO4 [mmol/L];P [mmol/L];Fe [umol/L]
2026-05-31 10:00;tank;2,7;5,9;0,2;9,8;1,9;6,1;1,4;18,9;1,1;2,0;1,6;42
"""
NOW = ("--at", "2026-06-01T08:30")


@pytest.fixture(scope="module")
def home(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("newcomer")
    site, report = folder / "home", folder / "lab.csv"
    report.write_text(REPORT, encoding="utf-8")
    assert run_command(["new", str(site), *NFT.split()]) == 0
    for day in ("29", "30", "31"):
        at = [f"at=2026-05-{day} 08:00", "by=MK"]
        assert run_command(["record", str(site), "reading", "point=tank", "EC=2.6", "pH=6.0", *at]) == 0
        assert run_command(["record", str(site), "water", "make_up=260", *at]) == 0
    assert run_command(["import", str(site), str(report), "--as", "analysis", "--by", "MK"]) == 0
    return site


@pytest.mark.parametrize(
    "command", ["today", "analysis", "drift", "balance", "forecast", "hindcast", "plan", "round", "handover", "logbook"]
)
def test_every_answer_can_be_had_of_a_site_three_days_old(
    home: Path, capsys: pytest.CaptureFixture[str], command: str
) -> None:
    assert run_command([command, str(home), *NOW]) in (0, 1)
    assert capsys.readouterr().out


def test_micronutrients_of_the_report_stand_under_their_own_unit(
    home: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    run_command(["today", str(home), *NOW])
    shown = capsys.readouterr().out
    assert shown.index("umol/L") < shown.index("\nFe ")
    run_command(["today", str(home), "--json", *NOW])
    iron = json.loads(capsys.readouterr().out)["points"]["tank"]["ions"]["Fe"]
    assert iron["umol_L"]["value"] == pytest.approx(42.0)


def test_a_folder_with_a_site_is_refused_before_anything_is_asked(
    home: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert run_command(["new", str(home)]) == 2
    assert "already" in capsys.readouterr().err
