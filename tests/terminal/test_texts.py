"""Text from people and files is shown as it is: no markup, no escape sequence, no bidirectional trick takes effect."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pseudo_terminal import PseudoTerminal

from fertui.tui.ink import cells, cut, filled, fit, line, literal, wrap
from fertui.tui.pen import PLAIN, change, styled
from fertui.tui.slate import Slate
from fertui.workbench import open_site

pytestmark = pytest.mark.long  # every key and random walks: minutes of waiting for screens

NASTY = {
    "markup": "[red]not red[/red] [@click=app.bell]x[/]", "wide": "日本語のメモ 温室",
    "combining": "e\u0301 a\u0300\u0316 z\u0335", "bidi": "abc \u202eevil\u202c", "long": "x" * 10_000,
    "lines": "one\ntwo\r\nthree",
    "emoji": "👩‍🌾 ok ☀️",
}  # fmt: skip


@pytest.mark.parametrize("name", NASTY)
def test_a_note_is_shown_literally_and_the_frame_stands(
    shared_site: Path, shared_terminal: PseudoTerminal, name: str
) -> None:
    terminal = shared_terminal
    number = open_site(shared_site).record("note", {"text": NASTY[name], "by": "MK"}).number
    terminal.press("7")
    terminal.until_text(f"▸{number}")
    terminal.press("enter")
    rows = terminal.until_text("written down").splitlines()
    assert rows[0].startswith(" Demo nursery")
    assert "Esc back" in rows[-1]
    if name == "markup":
        assert "[red]not red[/red]" in terminal.text


@given(st.text(max_size=60), st.integers(1, 40))
def test_fitted_text_takes_exactly_its_columns(text: str, width: int) -> None:
    shown = literal(text)
    assert cells(fit(shown, width)) == width
    assert cells(cut(shown, width)) <= width
    assert sum(cells(span.text) for span in filled(line(shown), width)) == width
    assert all(cells(row) <= max(width, 2) for row in wrap(shown, width))


@given(st.text(max_size=80))
def test_literal_text_holds_no_control_character(text: str) -> None:
    assert not any(ord(character) < 32 or 127 <= ord(character) < 160 for character in literal(text))


STYLES = st.lists(st.sampled_from(["1", "2", "7", "38;5;9", "38;5;200", "48;5;17", "31", "44", "0"]), max_size=4)


@given(STYLES, STYLES)
def test_a_change_of_style_reaches_the_style_wanted(first: list[str], second: list[str]) -> None:
    has, wants = styled(PLAIN, ";".join(first)), styled(PLAIN, ";".join(second))
    sequence = change(has, wants)
    assert styled(has, sequence[2:-1]) == wants if sequence else has == wants


DRAWING = st.lists(
    st.tuples(st.integers(1, 6), st.integers(1, 20), st.sampled_from(["", "31", "1;32", "44", "7"]), st.text("ab é日",
    max_size=12)),
    min_size=1, max_size=12,
)  # fmt: skip


@settings(max_examples=150)
@given(DRAWING)
def test_what_is_left_out_is_on_the_screen_already(drawing: list[tuple[int, int, str, str]]) -> None:
    """A terminal fed the thinned stream shows what one fed the whole stream shows (pyte as the terminal)."""
    import pyte

    def screen() -> tuple[pyte.Screen, pyte.Stream]:
        made = pyte.Screen(20, 6)
        made.reset_mode(pyte.modes.DECAWM)
        return made, pyte.Stream(made)

    (whole, feed_whole), (thin, feed_thin) = screen(), screen()
    slate = Slate(20, 6)
    for row, column, codes, text in drawing:
        text = text[: 21 - column]  # the toolkit never writes beyond the edge
        sent = f"\x1b[{row};{column}H\x1b[{codes}m{text}\x1b[0m"
        feed_whole.feed(sent)
        feed_thin.feed(slate.thin(sent))
    if all("日" not in text for *_, text in drawing):  # half a wide character is left to the terminal
        assert [[(c.data, c.bg, c.reverse) for c in map(whole.buffer[y].__getitem__, range(20))] for y in range(6)] == [
            [(c.data, c.bg, c.reverse) for c in map(thin.buffer[y].__getitem__, range(20))] for y in range(6)
        ]
