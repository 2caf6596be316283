"""The ways out: asked, told by a signal, cut off, suspended. The terminal is given back and nothing typed is lost."""

from __future__ import annotations

import signal
from pathlib import Path

import pytest
from conftest import Opened
from pseudo_terminal import KEYS, PseudoTerminal

ALTERNATE_SCREEN_OFF, CURSOR_ON = b"\x1b[?1049l", b"\x1b[?25h"


def given_back(terminal: PseudoTerminal) -> bool:
    return ALTERNATE_SCREEN_OFF in terminal.sent and CURSOR_ON in terminal.sent


def test_q_leaves(terminal: PseudoTerminal) -> None:
    terminal.type(b"q")
    assert terminal.wait() == 0
    assert given_back(terminal)


@pytest.mark.parametrize("key", ["\x1b[21~", "ctrl+q"])
def test_f10_leaves_from_a_form_and_from_a_question_and_keeps_the_draft(
    site: Path, terminal: PseudoTerminal, key: str
) -> None:
    terminal.press("r", "2", ".", "6", "+")
    terminal.until_text("Your initials:")
    terminal.press("M")
    terminal.type(KEYS.get(key, key).encode())
    assert terminal.wait(5.0) == 0
    assert given_back(terminal)
    assert "2.6" in (site / "drafts.json").read_text(encoding="utf-8")


@pytest.mark.parametrize("number", [signal.SIGHUP, signal.SIGTERM])
def test_a_signal_ends_it_at_once_with_its_code_and_the_draft_kept(
    site: Path, terminal: PseudoTerminal, number: int
) -> None:
    terminal.press("r", "2", ".", "6", "enter")
    terminal.signal(number)
    assert terminal.wait(5.0) == 128 + number
    assert given_back(terminal)
    assert "2.6" in (site / "drafts.json").read_text(encoding="utf-8")


def test_what_is_typed_but_not_entered_is_kept_too(site: Path, terminal: PseudoTerminal) -> None:
    terminal.press("r", "2", ".", "7")
    terminal.signal(signal.SIGHUP)
    terminal.wait(5.0)
    assert "2.7" in (site / "drafts.json").read_text(encoding="utf-8")


def test_a_closed_line_leaves_no_process_behind(site: Path, terminal: PseudoTerminal) -> None:
    terminal.press("r", "2", ".", "6", "enter")
    terminal.hang_up()
    assert terminal.wait(5.0) != 0
    assert "2.6" in (site / "drafts.json").read_text(encoding="utf-8")


def test_killed_it_keeps_the_fields_that_were_entered(
    site: Path, terminal: PseudoTerminal, open_terminal: Opened
) -> None:
    terminal.press("r", "2", ".", "6", "enter")
    terminal.signal(signal.SIGKILL)
    terminal.wait(5.0)
    again = open_terminal(site)
    again.until_text("more to look at")
    again.press("r")
    again.until_text("A half-filled form by someone who gave no initials")
    again.press("enter")
    assert "2.6___" in again.until_text("Reading, north bay")


def test_suspended_and_resumed_it_draws_itself_again(todays_site: Path, open_terminal: Opened) -> None:
    terminal = open_terminal(todays_site)
    terminal.until_text("more to look at")
    terminal.settle()
    terminal.signal(signal.SIGTSTP)
    terminal.until_stopped()
    assert given_back(terminal)
    terminal.screen.reset()
    terminal.signal(signal.SIGCONT)
    terminal.until_text("All loops, worst first")
    terminal.press("2")
    terminal.until_text("normalised")


@pytest.mark.parametrize(
    "code",
    [b"\x1b[M !!", b"\x1b[M\x20\xe0\x80", b"\x1b[M#\xff\xfe", b"\xff\xfe\x80", b"\x1b[<0;3;3M", b"\x1b[200~\xc3"],
)
def test_odd_bytes_do_not_end_it(shared_terminal: PseudoTerminal, code: bytes) -> None:
    terminal = shared_terminal
    terminal.type(code + b"\x1b[201~")
    terminal.settle()
    terminal.press("esc", "esc")
    terminal.press("1")
    terminal.until_text("worst first")
    terminal.press("7")
    terminal.until_text("newest first")


def test_a_terminal_that_cannot_show_screens_is_told_of_the_command(site: Path, open_terminal: Opened) -> None:
    shown = open_terminal(site, TERM="dumb")
    shown.until_text("This terminal (TERM=dumb) cannot show screens. 'fertui today SITE'"[:60])
    assert shown.wait() == 2
