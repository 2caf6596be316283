"""The questions of a new site in a real terminal: a refused line is brought back, a dropped line loses no answer."""

from __future__ import annotations

import sys
from pathlib import Path

from fertui.site.files import read_site
from tests.terminal.pseudo_terminal import Command, PseudoTerminal

FIRST = (("crop: ", "lettuce"), ("area: ", "180"), ("layout: ", "shared-tank"), ("medium: ", "none"), ("tank: ", "700"))
REST = ("loop [lettuce]: ", "name [the folder's name]: ", "timezone [Europe/Rome]: ")


def asked(folder: Path) -> PseudoTerminal:
    """The questions, in a home of their own."""
    home = {"HOME": str(folder), "XDG_STATE_HOME": str(folder / "state"), "TZ": "Europe/Rome"}
    return PseudoTerminal(Command([sys.executable, "-m", "fertui", "new", "home"]), environment=home, folder=folder)


def answer(terminal: PseudoTerminal, prompt: str, *keys: str) -> None:
    """Press keys once the question stands on the screen."""
    terminal.until(lambda text: text.rstrip("\n").rstrip().endswith(prompt.rstrip()))
    terminal.press(*keys, "enter")


def test_a_dropped_line_loses_no_answer_and_a_refused_one_can_be_mended(tmp_path: Path) -> None:
    with asked(tmp_path) as terminal:
        for prompt, text in FIRST:
            answer(terminal, prompt, text)
        terminal.until_text("make-up water?")
        terminal.hang_up()
        assert terminal.wait() != 0
    with asked(tmp_path) as terminal:
        answer(terminal, "n begins anew: ")
        assert "tank 700 L" in " ".join(terminal.text.split())
        answer(terminal, "water [make-up water, not analysed]: ", "rain")
        answer(terminal, "target [the crop's own]: ")
        answer(terminal, "supplies [the common salts, no acid]: ", "KNO3, epsom salt, MKQ")
        terminal.until_text("'MKQ' is no salt or acid")
        answer(terminal, "supplies [the common salts, no acid]: ", "up", "backspace", "P")
        for prompt in REST:
            answer(terminal, prompt)
        assert terminal.wait() == 0
    supplies = [each.name for each in read_site(tmp_path / "home").supplies]
    assert supplies == ["potassium nitrate", "magnesium sulfate heptahydrate", "monopotassium phosphate"]
