"""The questions of a new site: refused at their question, echoed as understood, kept until the site is made."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from pathlib import Path
from types import SimpleNamespace

import pytest

from fertui.cli.main import run_command
from fertui.site.files import read_site

Ask = Callable[..., tuple[int, str]]
"""Runs ``fertui new home`` with options and answers; the exit code and all that was shown."""

GOOD = ("lettuce", "180", "shared-tank", "none", "700", "well", "", "", "", "", "", "Europe/Rome")


@pytest.fixture
def ask(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> Ask:
    monkeypatch.setenv("XDG_STATE_HOME", str(tmp_path / "state"))
    monkeypatch.setenv("TZ", "Europe/Rome")
    monkeypatch.setattr("sys.stdin", SimpleNamespace(isatty=lambda: True))

    def run(answers: Sequence[str], *options: str) -> tuple[int, str]:
        waiting = iter(answers)

        def typed(prompt: str) -> str:
            answer = next(waiting, None)
            if answer is None:
                raise EOFError
            print(prompt + answer)
            return answer

        monkeypatch.setattr("builtins.input", typed)
        code = run_command(["new", str(tmp_path / "home"), *options])
        assert next(waiting, None) is None
        shown = capsys.readouterr()
        return code, shown.out + shown.err

    return run


def test_every_wrong_answer_is_refused_at_its_own_question(ask: Ask, tmp_path: Path) -> None:
    wrong = {
        "crop": "letuce", "stage": "flowering", "area": "pepper", "layout": "closed", "medium": "slabs",
        "drain store": "two", "medium volume": "0", "root zone water": "much", "water": "w" * 61, "target": "best",
        "supplies": "ca", "loop": "l" * 61, "name": "n" * 61, "timezone": "Europe/Roma",
    }  # fmt: skip
    right = ("sweet-pepper", "fruit-set", "800", "drain-blend", "peat", "", "", "", "rain", "", "", "", "", "")
    code, shown = ask([answer for pair in zip(wrong.values(), right, strict=True) for answer in pair])
    assert code == 0
    for label, answer in wrong.items():
        below = shown.split(f": {answer}\n", 1)[1]
        assert below.startswith(f"  {label}: ")
        assert "--" not in below.split("\n" + label)[0]
    assert read_site(tmp_path / "home").loops[0].stage == "fruit-set"


def test_what_was_understood_stands_under_the_answer(ask: Ask) -> None:
    said = ("Salad", "180", "Shared tank", "none", "0.7 m3", "well", "", "", "KNO3; HNO3 38%", "", "", "")
    code, shown = ask(said)
    assert code == 0
    for understood in ("lettuce", "180 m2", "shared-tank", "700 L", "potassium nitrate, nitric acid 38 %"):
        assert f"\n  = {understood}\n" in shown
    assert "= none" not in shown


def test_brackets_hold_what_enter_takes_in_the_unit_asked_for(ask: Ask) -> None:
    _, shown = ask(("sweet-pepper", "", "800", "drain-blend", "peat", *[""] * 10))
    for hint in ("drain store [2000 L]: ", "medium volume [12 L/m2]: ", "stage [standard]: ", "timezone [Europe/Rome]"):
        assert f"\n{hint}" in shown
    assert re.search(r"standard +the crop's usual feed\n +fruit-set +feed K \+1 +Ca -0.5 mmol/L\n", shown)


def test_enter_alone_where_an_answer_has_to_be_known_asks_again(ask: Ask) -> None:
    code, shown = ask(("", *GOOD))
    assert code == 0
    assert "  crop: Which crop? This has to be known.\n" in shown


def test_a_run_that_was_left_goes_on_where_it_was(ask: Ask, tmp_path: Path) -> None:
    code, _ = ask(GOOD[:5])
    assert code == 130
    assert not (tmp_path / "home").exists()
    code, shown = ask(("", *GOOD[5:]))
    assert code == 0
    assert "crop lettuce; area 180 m2; layout shared-tank; medium none; tank 700 L." in " ".join(shown.split())
    assert "Which crop?" not in shown
    assert read_site(tmp_path / "home").loops[0].tank_l == 700
    assert "lettuce" not in (tmp_path / "state" / "fertui" / "new-sites.json").read_text()


def test_a_run_that_was_left_can_be_begun_anew(ask: Ask, tmp_path: Path) -> None:
    ask(("tomato", "start"))
    code, _ = ask(("n", *GOOD))
    assert code == 0
    assert read_site(tmp_path / "home").loops[0].crop == "lettuce"


def test_an_answer_can_be_taken_back(ask: Ask, tmp_path: Path) -> None:
    code, _ = ask(("<", "tomato", "<", "lettuce", "1800", "<", *GOOD[1:]))
    assert code == 0
    loop = read_site(tmp_path / "home").loops[0]
    assert (loop.crop, loop.area_m2) == ("lettuce", 180)


def test_an_option_that_is_refused_is_asked(ask: Ask, tmp_path: Path) -> None:
    code, shown = ask(GOOD[1:-1], "--crop", "letuce", "--timezone", "Europe/Rome")
    assert code == 130
    code, shown = ask(("n", *GOOD[:-1]), "--crop", "letuce", "--timezone", "Europe/Rome")
    assert code == 0
    assert "crop: no crop 'letuce'; nearest: lettuce" in shown
    assert read_site(tmp_path / "home").loops[0].crop == "lettuce"


def test_answers_that_cannot_be_kept_do_not_stop_the_questions(ask: Ask, tmp_path: Path) -> None:
    (tmp_path / "state").write_text("a file where the folder should be")
    assert ask(GOOD)[0] == 0
