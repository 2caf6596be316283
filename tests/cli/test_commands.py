"""The commands as a shell sees them: what they print, their exit codes, and that a refusal changes nothing."""

from __future__ import annotations

import json
import sqlite3
from datetime import datetime
from pathlib import Path
from typing import Any

import pytest

from fertui.cli.main import run_command

NOON = "2026-06-01T12:00+02:00"


def run(capsys: pytest.CaptureFixture[str], *words: object) -> tuple[int, str, str]:
    code = run_command([str(word) for word in words])
    out, err = capsys.readouterr()
    return code, out, err


def book(site: Path) -> list[tuple[object, ...]]:
    with sqlite3.connect(f"file:{site / 'logbook.sqlite3'}?mode=ro", uri=True) as connection:
        return connection.execute("SELECT * FROM entries ORDER BY number").fetchall()


@pytest.mark.parametrize(
    ("words", "code", "said"),
    [
        (["record", "SITE", "reading", "EC=-2", "by=MK"], 2, "negative"),
        (["record", "SITE", "reading", "EC=nan", "by=MK"], 2, "nan"),
        (["record", "SITE", "reading", "EC=260 ppm", "by=MK"], 2, "ppm"),
        (["record", "SITE", "reading", "point=drian", "EC=2", "by=MK"], 2, "did you mean 'drain'"),
        (["record", "SITE", "reading", "EZ=2", "by=MK"], 2, "EC"),
        (["record", "SITE", "reading", "EC=2", "at=2999-01-01", "by=MK"], 2, "2999"),
        (["record", "SITE", "reading", "EC=2"], 2, "by="),
        (["record", "SITE", "redaing", "EC=2", "by=MK"], 2, "did you mean 'reading'"),
        (["record", "SITE", "reading", "EC", "by=MK"], 2, "name=value"),
        (["supersede", "SITE", "999999", "EC=2", "why=typo", "by=MK"], 2, "999999"),
        (["void", "SITE", "1", "by=MK"], 2, "why="),
        (["today", "SITE", "--loop", "south"], 2, "north bay"),
        (["today", "SITE", "--at", "yesterweek"], 2, "yesterweek"),
        (["forecast", "SITE", "--days", "0"], 2, "--days"),
        (["plan", "SITE", "--steps", "9"], 2, "--steps"),
        (["import", "SITE", "EMPTY", "--as", "analysis"], 2, "empty"),
        (["import", "SITE", "MISSING.csv", "--as", "analysis"], 2, "MISSING.csv"),
        (["today", "NOWHERE"], 2, "fertui new"),
        (["todya", "SITE"], 2, "did you mean 'fertui today'?"),
        (["north-side"], 2, "fertui new north-side"),
    ],
)
def test_what_cannot_be_taken_is_refused_in_words_and_changes_nothing(
    demo: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str], words: list[str], code: int, said: str
) -> None:
    (tmp_path / "empty.csv").write_text("")
    before = book(demo)
    places = {"SITE": str(demo), "EMPTY": str(tmp_path / "empty.csv")}
    found, out, err = run(capsys, *(places.get(word, word) for word in words))
    assert (found, out) == (code, "")
    assert err.startswith("fertui: ")
    assert said in err
    assert "Traceback" not in err
    assert book(demo) == before


def test_a_recorded_entry_is_printed_as_read_back(demo: Path, capsys: pytest.CaptureFixture[str]) -> None:
    code, out, _ = run(
        capsys, "record", demo, "reading", "point=drain", "EC=4,1", "pH=5.7", "by=MK", "--loop", "north bay"
    )
    assert code == 0
    assert "EC=4,1" in out
    assert "by MK" in out


def test_a_correction_leaves_the_old_entry_visible(demo: Path, capsys: pytest.CaptureFixture[str]) -> None:
    run(capsys, "record", demo, "note", "text=first", "by=MK")
    number = len(book(demo))
    code, out, _ = run(capsys, "supersede", demo, number, "text=second", "why=clearer", "by=RV")
    assert code == 0
    assert f"corrects {number}: clearer" in out
    _, out, _ = run(capsys, "logbook", demo, "--kind", "note")
    assert [line[0] for line in out.splitlines()] == ["x", " "]


def test_a_logbook_of_a_newer_program_is_left_untouched(demo: Path, capsys: pytest.CaptureFixture[str]) -> None:
    with sqlite3.connect(demo / "logbook.sqlite3") as connection:
        connection.execute("PRAGMA user_version = 999")
    before = (demo / "logbook.sqlite3").read_bytes()
    code, _, err = run(capsys, "record", demo, "note", "text=x", "by=MK")
    assert code == 3
    assert "newer" in err
    assert (demo / "logbook.sqlite3").read_bytes() == before


def test_new_without_a_necessary_value_and_without_a_terminal_names_what_is_missing(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("sys.stdin.isatty", lambda: False, raising=False)
    code, _, err = run(capsys, "new", tmp_path / "bay", "--crop", "tomato")
    assert code == 2
    assert "--medium --layout --area" in err
    assert not (tmp_path / "bay").exists()


@pytest.mark.parametrize("loop", ["north bay", "lettuce"])
def test_today_answers_in_the_shape_of_the_contract(
    demo_once: Path, capsys: pytest.CaptureFixture[str], loop: str
) -> None:
    code, out, _ = run(capsys, "today", demo_once, "--loop", loop, "--at", NOON, "--json")
    state = json.loads(out)
    assert code == 0
    assert state["schema"] == "fertui.today/1"
    wanted = {"north bay": {"feed", "root_zone", "drain", "drain_store"}, "lettuce": {"tank", "root_zone"}}
    assert set(state["points"]) == wanted[loop]
    for point in state["points"].values():
        for number in (point["EC_mS_cm"], point["ions"]["K"]["mmol_L"], point["ions"]["K"]["share_pct"]):
            assert number["low"] <= number["value"] <= number["high"]
        assert point["ions"]["Na"]["share_pct"] is None
    assert {watch["severity"] for watch in state["watch"]} <= {"note", "watch", "act"}


@pytest.mark.parametrize("loop", ["north bay", "lettuce"])
def test_the_account_of_the_demo_closes_for_every_ion(
    demo_once: Path, capsys: pytest.CaptureFixture[str], loop: str
) -> None:
    words = ("balance", demo_once, "--loop", loop, "--from", "2026-04-15", "--to", NOON, "--at", NOON, "--json")
    code, out, _ = run(capsys, *words)
    assert code == 0
    for ion, row in json.loads(out)["ions"].items():
        flows = sum(value for name, value in row.items() if name not in ("start_mmol", "end_mmol"))
        size = max(map(abs, row.values()))
        assert abs(row["start_mmol"] + flows - row["end_mmol"]) <= 1e-9 * size, ion


def test_the_demo_prints_state_forecast_and_plan(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    code, out, _ = run(capsys, "demo", "--text", "--into", tmp_path / "demo")
    assert code == 0
    assert "north bay: tomato" in out
    assert "Next recipe" in out
    assert "Weigh and dissolve" in out
    assert "EC is on set point" in " ".join(out.split())


def test_the_last_mix_of_a_crop_is_a_sum_to_check_by_hand(demo_once: Path, capsys: pytest.CaptureFixture[str]) -> None:
    words = (
        "stock",
        demo_once,
        "--loop",
        "north bay",
        "--at",
        NOON,
        "--crop-ends",
        "40",
        "--plain-water",
        "4",
        "--json",
    )
    code, out, _ = run(capsys, *words)
    assert code == 0
    for tank in json.loads(out)["tanks"]:
        assert tank["mix_l"] == pytest.approx(max(tank["needed_l"] - tank["left_l"], 0.0))
        assert f"{tank['mix_l']:.0f} L to mix" in tank["words"]


def test_what_a_crop_was_given_can_be_told_for_any_day(demo_once: Path, capsys: pytest.CaptureFixture[str]) -> None:
    def answer(*words: object) -> dict[str, Any]:
        return json.loads(run(capsys, *words, "--loop", "north bay", "--json", "--at", NOON)[1])

    given = answer("given", demo_once, "--on", "2026-05-20")
    book = answer("logbook", demo_once, "--kind", "stock")["entries"]
    used = [each for each in book if each["at"].startswith("2026-05-19T22")]
    values = [value for each in used for value in each["values"]]
    litres = {value["text"] if value["name"] == "tank" else value["number"] for value in values}
    # a day's litres are logged for the whole local day, so what was given is what stands in its two entries
    assert litres == {*given["stock_l"], *given["stock_l"].values()}
    assert set(given["entries"]) >= {each["number"] for each in used}
    weighed = {tank["tank"]: tank["kg_per_l"] for tank in given["tanks"]}
    iron = "iron DTPA"
    assert given["salts_kg"][iron] == pytest.approx(given["stock_l"]["calcium"] * weighed["calcium"][iron])
    text = run(capsys, "given", demo_once, "--on", "2026-05-20", "--at", NOON)[1]
    assert "Wed 20 May 2026" in text
    assert max(map(len, text.splitlines())) <= 80


def test_forecast_names_the_day_of_the_next_sample(demo_once: Path, capsys: pytest.CaptureFixture[str]) -> None:
    found = json.loads(run(capsys, "forecast", demo_once, "--days", "7", "--json", "--at", NOON)[1])["next_sample"]
    taken, known = (datetime.fromisoformat(found[each]) for each in ("take_at", "result_at"))
    assert datetime.fromisoformat(NOON) <= taken < known
    assert found["why"]
    assert {each["what"] for each in found["narrows"]} >= {"K share", "Ca share", "Mg share"}
    text = run(capsys, "forecast", demo_once, "--days", "7", "--at", NOON)[1]
    assert f"{taken:%a} {taken.day} {taken:%b} ({found['why']})" in " ".join(text.split())


def test_the_acid_of_a_plan_is_said_to_be_that_of_the_acid_sheet(
    demo_once: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    text = run(capsys, "plan", demo_once, "--loop", "north bay", "--at", NOON)[1]
    assert "in these tanks is all that the make-up water takes" in " ".join(text.split())


def test_old_stock_left_in_a_tank_is_taken_off_by_what_its_batch_put_in(
    demo_once: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    def weighed(*words: object) -> float:
        found = json.loads(run(capsys, "stock", demo_once, "--json", "--at", NOON, *words)[1])
        (tank,) = (each for each in found["tanks"] if each["name"] == "calcium")
        return sum(each["kg"] for each in tank["salts"] if each["salt"] == "calcium nitrate double salt")

    mixed = json.loads(run(capsys, "given", demo_once, "--json", "--at", NOON)[1])["tanks"]
    (strength,) = (each["kg_per_l"]["calcium nitrate double salt"] for each in mixed if each["tank"] == "calcium")
    # by hand: 200 L of the batch hold 200 x its kg per litre; the scale of the demo steps by 0.05 kg
    assert weighed() - weighed("--left", "calcium=200") == pytest.approx(200.0 * strength, abs=0.05)
    code, _, err = run(capsys, "stock", demo_once, "--left", "lime=20")
    assert (code, "calcium, sulfate" in err) == (2, True)
