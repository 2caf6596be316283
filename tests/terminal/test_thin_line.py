"""What travels over the line: budgets of bytes for a terminal of 80x24 in 256 colours (they are the project's own)."""

from __future__ import annotations

import pytest
from pseudo_terminal import PseudoTerminal

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
