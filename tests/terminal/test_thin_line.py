"""What travels over the line: budgets of bytes for a terminal of 80x24 in 256 colours (they are the project's own)."""

from __future__ import annotations

import re
from base64 import b64decode
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest
from conftest import Opened, own_folders
from pseudo_terminal import PseudoTerminal
from ready_program import ReadyProgram

from fertui.tui.slate import Slate

START, REPAINT, CURSOR = 14_000, 4_000, 300


@pytest.fixture(scope="module")
def wide_terminal(ready: ReadyProgram, copied: Callable[[], Path]) -> Iterator[PseudoTerminal]:
    """A site in a terminal of 120x40: keys must not cost more there, though what is shown does."""
    site = copied()
    with PseudoTerminal(ready.on(site), (120, 40), own_folders(site.parent), site.parent) as shown:
        shown.until_text("more to look at")
        yield shown


def test_start_up_stays_within_its_bytes(site: Path, open_terminal: Opened) -> None:
    terminal = open_terminal(site, from_nothing=True)
    terminal.until_text("more to look at")
    terminal.settle()
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


CURSOR_KEYS = {"3": ("left", "right", "up", "down", "home", "end"), "4": ("down", "right", "up", "left")}
"""Keys that move a cursor, by view; in the others Down and Up."""


def cursor_costs(terminal: PseudoTerminal, view: str) -> dict[tuple[str, int], int]:
    """Bytes of each cursor key in a view, pressed in turn, twice."""
    terminal.press(view)
    terminal.until(lambda text: "orking out" not in text)
    terminal.settle()
    return {(key, time): terminal.press(key) for time in range(2) for key in CURSOR_KEYS.get(view, ("down", "up"))}


@pytest.mark.parametrize("view", "123456789")
def test_a_cursor_key_stays_within_its_bytes(shared_terminal: PseudoTerminal, view: str) -> None:
    costs = cursor_costs(shared_terminal, view)
    assert max(costs.values()) <= CURSOR, costs


@pytest.mark.parametrize("view", "123456789")
def test_a_cursor_key_costs_no_more_on_a_wide_screen(wide_terminal: PseudoTerminal, view: str) -> None:
    costs = cursor_costs(wide_terminal, view)
    assert max(costs.values()) <= CURSOR, costs


def test_typing_in_a_form_stays_within_its_bytes(shared_terminal: PseudoTerminal) -> None:
    terminal = shared_terminal
    terminal.press("r")
    assert max(terminal.press(key) for key in ("2", ",", "6", "backspace", "6")) <= CURSOR
    assert terminal.press("enter") <= CURSOR
    terminal.press("esc")


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
    terminal.until_text("y copy")
    before, sent = terminal.text, len(terminal.sent)
    terminal.press("y")
    [copied] = re.findall(rb"\x1b\]52;c;([^\x07]*)\x07", terminal.sent[sent:])
    text = b64decode(copied, validate=True).decode()
    assert all(word in before.split() for word in text.splitlines()[0].split())
    assert terminal.text.splitlines()[:23] == before.splitlines()[:23]
    assert b"\x1b]22" not in terminal.sent
    terminal.press("esc")
