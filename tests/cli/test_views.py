"""What the commands print on the invented site keeps to 80 columns, and a sheet is written only when it may be."""

from __future__ import annotations

import csv
import io
import json
import re
from datetime import UTC, datetime
from pathlib import Path

import pytest

from fertui.cli.main import run_command
from fertui.workbench import open_site
from tests.conftest import DEMO_MORNING

AT = DEMO_MORNING.isoformat()


def printed(capsys: pytest.CaptureFixture[str], *words: str) -> tuple[int, str, str]:
    code = run_command([str(word) for word in words])
    out, err = capsys.readouterr()
    return code, out, err


@pytest.mark.parametrize("command", ["today", "analysis", "forecast", "drift", "balance", "plan", "handover", "round"])
@pytest.mark.parametrize("loop", ["north bay", "lettuce"])
def test_no_line_is_wider_than_80_columns(
    capsys: pytest.CaptureFixture[str], demo_once: Path, command: str, loop: str
) -> None:
    when = ("--to", AT) if command == "balance" else ("--at", AT)
    code, out, _ = printed(capsys, command, str(demo_once), "--loop", loop, *when)
    assert code in (0, 1)
    assert out.strip()
    assert [line for line in out.splitlines() if len(line) > 80] == []


@pytest.mark.parametrize("command", ["site", "check", "supplies"])
def test_what_is_told_of_the_site_keeps_to_80_columns(
    capsys: pytest.CaptureFixture[str], demo_once: Path, command: str
) -> None:
    _, out, _ = printed(capsys, command, str(demo_once))
    assert [line for line in out.splitlines() if len(line) > 80] == []


def test_every_value_of_the_site_stands_above_its_source(capsys: pytest.CaptureFixture[str], demo_once: Path) -> None:
    _, out, _ = printed(capsys, "site", str(demo_once))
    bench = open_site(demo_once)
    told = " ".join(out.split())
    for row in bench.site_rows():
        assert " ".join(f"{row.key} = {row.text}".split()) in told
        assert not row.source or f"from {row.source}" in told


def test_a_site_just_made_has_nothing_to_look_at(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    words = "--crop lettuce --medium none --layout shared-tank --area 180 --tank 700 --water well --timezone UTC"
    printed(capsys, "new", str(tmp_path / "home"), *words.split())
    code, out, _ = printed(capsys, "check", str(tmp_path / "home"))
    assert code == 0
    assert "Nothing is logged yet" in out
    printed(capsys, "record", str(tmp_path / "home"), "reading", "point=tank", "EC=2.5", "by=MK")
    code, out, _ = printed(capsys, "check", str(tmp_path / "home"))
    assert code == 1
    assert "  !! Take a sample" in out


def test_an_ion_goes_by_the_name_of_its_unit_in_every_table(
    capsys: pytest.CaptureFixture[str], demo_once: Path
) -> None:
    _, out, _ = printed(capsys, "today", str(demo_once), "--at", AT, "--unit", "mg/L")
    assert len([line for line in out.splitlines() if line.startswith("NH4-N ")]) == 2
    assert [line for line in out.splitlines() if line.startswith("NH4 ")] == []


def test_the_logbook_tells_a_changed_site_in_one_line(capsys: pytest.CaptureFixture[str], demo: Path) -> None:
    bench = open_site(demo)
    bench.change_site("site.name", "Other nursery", "MK")
    _, out, _ = printed(capsys, "logbook", str(demo), "--kind", "site")
    assert len(out.splitlines()) == len(bench.history("site"))
    assert " lines" in out.splitlines()[-1]


def test_a_water_typed_in_another_unit_is_looked_at(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    words = "--crop lettuce --medium none --layout shared-tank --area 180 --tank 700 --water well --timezone UTC"
    report = "EC 0.55, Ca 80 mg/L, Mg 12 mg/L, Na 16 mg/L, Cl 21 mg/L, SO4 24 mg/L, CaCO3 240 mg/L"
    site = tmp_path / "home"
    printed(capsys, "new", str(site), *words.split(), "--water-report", report)
    code, out, _ = printed(capsys, "check", str(site))
    assert code == 0
    assert "ok water well, EC calculated / EC measured: " in " ".join(out.split())
    text = (site / "site.toml").read_text()
    assert "Ca = 1.996" in text  # 80 mg/L at 40.078 g/mol (CIAAW 2021)
    (site / "site.toml").write_text(text.replace("Ca = 1.996", "Ca = 80"))  # mg/L typed as mmol/L
    code, out, _ = printed(capsys, "check", str(site))
    assert code == 1
    assert "look at its units" in " ".join(out.split())


def test_a_report_typed_in_the_wrong_unit_is_said_when_the_site_is_made(
    capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    # 20 mmol/L Ca alone makes several mS/cm: a report of a few ions shows the slip too.
    words = "--crop lettuce --medium none --layout shared-tank --area 180 --tank 700 --water well --timezone UTC"
    for name, report in (("few", "EC 0.55, Ca 20, Mg 3"), ("whole", "EC 0.55, Ca 20, Mg 3, CaCO3 240 mg/L")):
        code, _, err = printed(capsys, "new", str(tmp_path / name), *words.split(), "--water-report", report)
        assert code == 0
        assert "Look at water well, EC calculated / EC measured again: " in " ".join(err.split())
    good = "EC 0.55, Ca 80 mg/L, Mg 12 mg/L, Na 16 mg/L, Cl 21 mg/L, SO4 24 mg/L, CaCO3 240 mg/L"
    _, _, err = printed(capsys, "new", str(tmp_path / "good"), *words.split(), "--water-report", good)
    assert "Look at" not in err


def test_the_report_holds_its_sections(capsys: pytest.CaptureFixture[str], demo_once: Path) -> None:
    words = ("report", str(demo_once), "--loop", "north bay", "--from", "2026-05-10", "--to", "2026-05-31")
    code, out, _ = printed(capsys, *words)
    assert code == 0
    for title in ("ANALYSES", "UPTAKE BY THE ACCOUNT", "WATER, STOCK AND ACID USED", "DISCHARGES BY REASON"):
        assert title in out
    assert [line for line in out.splitlines() if len(line) > 80] == []


def test_an_acid_sheet_is_released_by_cautions_read_and_the_strength_on_the_label_alone(
    capsys: pytest.CaptureFixture[str], demo: Path, tmp_path: Path
) -> None:
    sheet = tmp_path / "acid.csv"
    asked = ("acid", str(demo), "--loop", "north bay", "--sheet", str(sheet))
    for wrong in ((), ("--cautions-read",), ("--label-strength", "38"), ("--cautions-read", "--label-strength", "60")):
        code, _, err = printed(capsys, *asked, *wrong)
        assert (code, sheet.exists()) == (2, False)
        assert "label" in err
        assert ("--cautions-read --label-strength PERCENT" in err) == (len(wrong) < 3)
    code, _, _ = printed(capsys, *asked, "--cautions-read", "--label-strength", "38")
    assert code == 0
    head, *rows = csv.reader(io.StringIO(sheet.read_text()))
    assert head[:4] == ["split", "acid", "strength [%]", "litres [L]"]
    assert len(rows) >= 3


def test_a_plan_says_that_accepted_steps_are_still_to_do_and_does_not_tell_them_again(
    capsys: pytest.CaptureFixture[str], demo: Path, tmp_path: Path
) -> None:
    bench = open_site(demo)
    _, now, _ = printed(capsys, "plan", str(demo), "--loop", "lettuce")
    assert "accepted and still to do" not in now
    step = {"at": datetime.now(UTC).isoformat(), "salt": "potassium nitrate", "kg": "0.35", "tank": "tank", "by": "RV"}
    number = bench.record("plan", step, "lettuce").number or 0
    _, out, _ = printed(capsys, "plan", str(demo), "--loop", "lettuce")
    assert f"0.35 kg potassium nitrate into tank (plan {number})" in out
    assert "Already planned: these steps stand" in out
    assert "Weigh and dissolve" not in out
    code, _, err = printed(capsys, "plan", str(demo), "--loop", "lettuce", "--sheet", str(tmp_path / "sheet.txt"))
    assert code == 2
    assert "Already planned" in err
    _, told, _ = printed(capsys, "plan", str(demo), "--loop", "lettuce", "--json")
    assert [each["number"] for each in json.loads(told)["accepted"]] == [number]
    assert json.loads(told)["steps"] == []
    bench.mark_done(number, "RV")
    assert "accepted and still to do" not in printed(capsys, "plan", str(demo), "--loop", "lettuce")[1]


def test_a_plan_on_the_command_line_holds_acid_back_until_its_cautions_are_read(
    capsys: pytest.CaptureFixture[str], demo_once: Path
) -> None:
    asked = ("plan", str(demo_once), "--loop", "north bay", "--at", AT)
    code, held, _ = printed(capsys, *asked)
    assert "nitric acid 38: held back, see above" in held
    assert "--cautions-read --label-strength PERCENT" in " ".join(held.split())
    assert held.index("READ BEFORE YOU START") < held.index("Next recipe")
    assert re.search(r"nitric acid 38: [\d.]+ L", held) is None
    assert printed(capsys, *asked, "--cautions-read")[1] == held
    assert printed(capsys, *asked, "--cautions-read", "--label-strength", "60")[0] == 2
    released, shown, _ = printed(capsys, *asked, "--cautions-read", "--label-strength", "38")
    assert released == code
    assert re.search(r"nitric acid 38: [\d.]+ L", shown)
    assert "held back" not in shown


def test_an_acid_page_on_the_command_line_shows_its_portions_to_who_has_read_the_cautions(
    capsys: pytest.CaptureFixture[str], demo_once: Path
) -> None:
    asked = ("acid", str(demo_once), "--loop", "north bay")
    _, held, _ = printed(capsys, *asked)
    assert "HELD BACK" in held
    assert "slowly into the moving water" not in held
    _, shown, _ = printed(capsys, *asked, "--cautions-read", "--label-strength", "38")
    assert "slowly into the moving water" in " ".join(shown.split())


def test_json_carries_acid_with_its_cautions_beside_it(capsys: pytest.CaptureFixture[str], demo_once: Path) -> None:
    _, out, _ = printed(capsys, "acid", str(demo_once), "--loop", "north bay", "--json")
    told = json.loads(out)
    assert told["splits"]
    assert told["splits"][0]["litres"] > 0
    assert told["cautions"][0]["code"] == "sds-first"
