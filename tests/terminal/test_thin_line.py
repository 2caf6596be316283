"""What travels over the line: budgets of bytes for a terminal of 80x24 in 256 colours (they are the project's own)."""

from __future__ import annotations

import re
from base64 import b64decode

import pytest
from pseudo_terminal import PseudoTerminal

from fertui.tui.slate import Slate

START, REPAINT, CURSOR = 14_000, 4_000, 300


def test_start_up_stays_within_its_bytes(terminal: PseudoTerminal) -> None:
    assert len(terminal.sent) <= START


def test_nothing_is_sent_while_nothing_happens(terminal: PseudoTerminal) -> None:
    before = len(terminal.sent)
    terminal.read(5.0)
    assert len(terminal.sent) == before


def test_a_full_repaint_stays_within_its_bytes(terminal: PseudoTerminal) -> None:
    assert 1_500 < terminal.press("f5") <= REPAINT


@pytest.mark.parametrize("view", "23456789")
def test_opening_a_view_costs_at_most_a_repaint(shared_terminal: PseudoTerminal, view: str) -> None:
    terminal = shared_terminal
    terminal.press(view)
    terminal.until(lambda text: "orking out" not in text)
    terminal.settle()
    assert terminal.press("1") <= REPAINT
    assert terminal.press(view) <= REPAINT


@pytest.mark.parametrize(
    ("view", "keys"),
    [("1", ("down", "up")), ("2", ("down", "up")), ("3", ("left", "right", "up", "down", "home", "end")),
     ("4", ("down", "right", "up", "left")), ("5", ("down", "up")), ("6", ("down", "up")), ("7", ("down", "up")),
     ("8", ("down", "up")), ("9", ("down", "up"))],
)  # fmt: skip
def test_a_cursor_key_stays_within_its_bytes(shared_terminal: PseudoTerminal, view: str, keys: tuple[str, ...]) -> None:
    terminal = shared_terminal
    terminal.press(view)
    terminal.until(lambda text: "orking out" not in text)
    terminal.settle()
    costs = {(key, time): terminal.press(key) for time in range(2) for key in keys}
    assert max(costs.values()) <= CURSOR, costs


def test_typing_in_a_form_stays_within_its_bytes(shared_terminal: PseudoTerminal) -> None:
    terminal = shared_terminal
    terminal.press("r")
    assert max(terminal.press(key) for key in ("2", ",", "6", "backspace", "6")) <= CURSOR
    assert terminal.press("enter") <= CURSOR


@pytest.mark.parametrize(
    "string",
    ["\x1b]52;c;" + "bGFiZWw6" * 40 + "\x07", "\x1bP1;2|6f6e65\x1b\\", "\x1b_picture\x1b\\", "\x1b]0;a title\x1b\\"],
)
def test_a_string_for_the_terminal_itself_passes_whole_and_takes_no_column(string: str) -> None:
    """Operating system, device control and application program strings as ECMA-48 (1991), 5.6 and 8.3, frames them."""
    slate = Slate(20, 2)
    slate.thin("\x1b[1;1Hab")
    assert slate.thin(string) == string
    assert slate.thin(f"c{string}d") == f"c{string}d"
    assert slate.thin("\x1b[1;1Habcd") == ""


@pytest.mark.parametrize("unasked", ["\x07", "\x1b]22;default\x07"])
def test_no_bell_and_no_pointer_shape_is_sent(unasked: str) -> None:
    slate = Slate(20, 2)
    assert slate.thin(f"\x1b[1;1Ha{unasked}b") == "\x1b[1;1Hab"


def test_copying_hands_the_text_to_the_terminal_and_leaves_the_screen_alone(shared_terminal: PseudoTerminal) -> None:
    terminal = shared_terminal
    terminal.press("8", "enter")
    before, sent = terminal.text, len(terminal.sent)
    terminal.press("y")
    [copied] = re.findall(rb"\x1b\]52;c;([^\x07]*)\x07", terminal.sent[sent:])
    text = b64decode(copied, validate=True).decode()
    assert all(word in before.split() for word in text.splitlines()[0].split())
    assert terminal.text.splitlines()[:23] == before.splitlines()[:23]
    assert b"\x1b]22" not in terminal.sent
    terminal.press("esc")
