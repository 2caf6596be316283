"""An odd value on the command line: asked about at a terminal, kept with its question elsewhere."""

from __future__ import annotations

from pathlib import Path
from types import SimpleNamespace

import pytest

from fertui.cli.main import run_command
from fertui.workbench import open_site

ODD = ("stock", "tank=calcium", "litres=900", "at=2026-06-01 09:00", "by=MK")


def last(site: Path) -> object:
    bench = open_site(site)
    return bench.book.entry(bench.last_number())


def at_a_terminal(monkeypatch: pytest.MonkeyPatch, answer: str) -> None:
    monkeypatch.setattr("sys.stdin", SimpleNamespace(isatty=lambda: True))
    monkeypatch.setattr("builtins.input", lambda: answer)


@pytest.mark.parametrize("answer", ["n", "", "what"])
def test_at_a_terminal_it_can_be_refused(
    demo: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], answer: str
) -> None:
    before = open_site(demo).last_number()
    at_a_terminal(monkeypatch, answer)
    assert run_command(["record", str(demo), *ODD]) == 2
    assert "Out by ten?" in capsys.readouterr().err
    assert open_site(demo).last_number() == before


def test_at_a_terminal_yes_logs_it_without_an_open_question(demo: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    at_a_terminal(monkeypatch, "y")
    assert run_command(["record", str(demo), *ODD]) == 0
    assert (last(demo).number_of("litres"), last(demo).flags) == (900.0, "")  # type: ignore[attr-defined]


def test_without_a_terminal_it_is_kept_with_its_question_and_the_way_to_strike_it(
    demo: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert run_command(["record", str(demo), *ODD]) == 0
    out, err = capsys.readouterr()
    number = open_site(demo).last_number()
    assert "out_by_ten" in last(demo).flags.split()  # type: ignore[attr-defined]
    assert "asked, not answered: " in out
    assert f"fertui void {demo} {number} why=" in err


def test_a_correction_is_asked_about_like_any_entry(demo: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    run_command(["record", str(demo), "stock", "tank=calcium", "litres=24", "at=2026-06-01 09:00", "by=MK"])
    number = open_site(demo).last_number()
    at_a_terminal(monkeypatch, "n")
    assert run_command(["supersede", str(demo), str(number), "litres=240", "why=slip", "by=MK"]) == 2
    assert open_site(demo).last_number() == number


def test_an_ordinary_value_asks_nothing(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    site = str(tmp_path / "site")
    run_command(["new", site, *["--crop", "tomato", "--medium", "coir", "--layout", "drain-blend", "--area", "1200"]])
    at_a_terminal(monkeypatch, "n")
    assert run_command(["record", site, "reading", "point=feed", "EC=2.6", "by=MK"]) == 0
