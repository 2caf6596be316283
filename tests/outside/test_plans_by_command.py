"""Plans as an outsider gets them: through the command line, from a fresh site."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from fertui.catalogue.salts import salt
from fertui.cli.main import run_command

# Hoagland & Arnon 1950, Circular 347: mmol of each salt per litre
HOAGLAND = {
    "hoagland-1": {"KNO3": 5, "Ca(NO3)2.4H2O": 5, "MgSO4.7H2O": 2, "KH2PO4": 1},
    "hoagland-2": {"KNO3": 6, "Ca(NO3)2.4H2O": 4, "MgSO4.7H2O": 2, "NH4H2PO4": 1},
}
FOUR_MORE = ("KH2PO4", "NH4H2PO4", "K2SO4", "NH4NO3", "Mg(NO3)2.6H2O")
LITRES, STEP_KG = 1000.0, 0.05


def said(capsys: pytest.CaptureFixture[str], *words: object) -> tuple[int, str]:
    code = run_command([str(word) for word in words])
    return code, capsys.readouterr().out


@pytest.mark.parametrize("target", HOAGLAND)
@pytest.mark.parametrize("shelf", ["its four salts", "more salts"])
@pytest.mark.parametrize("analysed", [False, True])
def test_hoagland_from_pure_water(capsys, tmp_path: Path, target: str, shelf: str, analysed: bool) -> None:
    names = [*HOAGLAND[target], *(each for each in FOUR_MORE if shelf == "more salts" and each not in HOAGLAND[target])]
    site = tmp_path / "site"
    new = (
        "new",
        site,
        "--crop",
        "lettuce",
        "--medium",
        "none",
        "--layout",
        "shared-tank",
        "--area",
        10,
        "--tank",
        1000,
    )
    assert said(capsys, *new, "--target", target, "--supplies", ",".join(names), "--timezone", "UTC")[0] == 0
    if analysed:
        zeros = [f"{ion}=0" for ion in ("K", "Ca", "Mg", "NO3", "SO4", "H2PO4", "NH4", "Na", "Cl", "EC")]
        assert said(capsys, "record", site, "analysis", "point=tank", "by=T", *zeros)[0] == 0
    code, out = said(capsys, "plan", site, "--days", 0, "--json")
    plan = json.loads(out)
    assert code == 0
    assert plan["feasible"] is True
    weighed = {step["formula"]: step["kg"] for step in plan["steps"]}
    assert set(weighed) == set(HOAGLAND[target])
    for formula, mmol in HOAGLAND[target].items():
        wanted = mmol * salt(formula).molar_mass * LITRES / 1e6
        assert weighed[formula] == pytest.approx(wanted, abs=0.5 * STEP_KG + 1e-9), formula
    assert plan["cautions"][0]["code"] == "sds-first"


def test_fourteen_days_from_pure_water_climbs_in_steps(capsys, tmp_path: Path) -> None:
    site = tmp_path / "site"
    names = ",".join(HOAGLAND["hoagland-1"])
    new = (
        "new",
        site,
        "--crop",
        "lettuce",
        "--medium",
        "none",
        "--layout",
        "shared-tank",
        "--area",
        10,
        "--tank",
        1000,
    )
    assert said(capsys, *new, "--target", "hoagland-1", "--supplies", names, "--timezone", "UTC")[0] == 0
    code, out = said(capsys, "plan", site, "--days", 14, "--json")
    plan = json.loads(out)
    assert code in (0, 1)
    days = sorted({step["at"] for step in plan["steps"]})
    assert len(days) > 1
    for (
        day
    ) in days:  # a kilogram of salt in 1000 L makes at most 1.4 mS/cm: KCl, the strongest here is KNO3 (IUPAC, CRC)
        assert 1.4 * sum(step["kg"] for step in plan["steps"] if step["at"] == day) <= 0.8


def test_one_stock_tank_for_everything_is_refused(capsys, tmp_path: Path) -> None:
    site = tmp_path / "site"
    new = (
        "new",
        site,
        "--crop",
        "tomato",
        "--medium",
        "coir",
        "--layout",
        "drain-blend",
        "--area",
        1000,
        "--timezone",
        "UTC",
    )
    assert said(capsys, *new)[0] == 0
    text = (site / "site.toml").read_text(encoding="utf-8")
    tanks = text.count("[[stock_tanks]]")
    assert tanks >= 2
    code, out = said(capsys, "stock", site, "--json")
    sheet = json.loads(out)
    assert code == 0
    assert sheet["refused"] == []
    contents = {tank["content"] for tank in sheet["tanks"]}
    assert contents >= {"calcium", "sulfate"}
