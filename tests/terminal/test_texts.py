"""Text from people and files is shown as it is: no markup, no escape sequence, no bidirectional trick takes effect."""

from __future__ import annotations

import json
from datetime import UTC, datetime
from pathlib import Path

import pytest
from conftest import Opened, frame_stands
from hypothesis import given, settings
from hypothesis import strategies as st
from pseudo_terminal import PseudoTerminal
from test_keys import FORMS

from fertui.tui.drafts import Draft, Drafts
from fertui.tui.ink import cells, cut, filled, fit, line, literal, wrap
from fertui.tui.pen import PLAIN, change, styled
from fertui.tui.slate import Slate
from fertui.workbench import open_site

NASTY = {
    "markup": "[red]not red[/red] [@click=app.bell]x[/]", "wide": "日本語のメモ 温室",
    "combining": "e\u0301 a\u0300\u0316 z\u0335", "bidi": "abc \u202eevil\u202c", "long": "x" * 10_000,
    "lines": "one\ntwo\r\nthree", "emoji": "👩‍🌾 ok ☀️",
    "escapes": "a\x1b[2J\x1b[31mred\x1b]0;title\x07\x9b5A\x1b[?1049l z",
}  # fmt: skip
KEPT = [name for name in NASTY if name != "escapes"]
"""What a logbook takes: it refuses control characters."""
VIEWS = "123456789"


def look(terminal: PseudoTerminal, site_name: str = "Demo nursery") -> None:
    """Wait until the frame stands at rest: no text has coloured or moved anything of it."""
    terminal.settle()
    terminal.until(lambda _: frame_stands(terminal, site_name))
    assert "fault of its own" not in terminal.text


@pytest.mark.parametrize("name", KEPT)
def test_a_note_is_shown_literally_and_the_frame_stands(
    shared_site: Path, shared_terminal: PseudoTerminal, name: str
) -> None:
    terminal = shared_terminal
    number = open_site(shared_site).record("note", {"text": NASTY[name], "by": "MK"}).number
    terminal.press("7")
    terminal.until_text(f"▸{number}")
    terminal.press("enter")
    terminal.until_text("written down")
    look(terminal)
    assert "Esc back" in terminal.screen.display[23]
    if name == "markup":
        assert "[red]not red[/red]" in terminal.text


@pytest.mark.parametrize("name", KEPT)
def test_a_note_with_any_kind_of_entry_leaves_every_view_whole(
    shared_site: Path, shared_terminal: PseudoTerminal, name: str
) -> None:
    """Beside a copy of the last entry of every kind there is."""
    bench, terminal = open_site(shared_site), shared_terminal
    for kind in ("reading", "analysis", "water", "dose", "stock", "batch", "setpoint", "acid", "bleed", "crop"):
        last = bench.history(kind=kind)[-1]
        texts = {value.name: value.text for value in last.values} | ({"point": last.point} if last.point else {})
        number = bench.record(kind, {**texts, "by": "MK", "note": NASTY[name]}, last.loop).number
    terminal.press("7")
    terminal.until_text(f"▸{number}")
    for view in VIEWS:
        terminal.press(view)
        look(terminal)


@pytest.mark.parametrize("kind", FORMS)
def test_anything_can_be_pasted_into_every_field_of_a_form(
    shared_site: Path, shared_terminal: PseudoTerminal, kind: str
) -> None:
    terminal = shared_terminal
    (shared_site / "drafts.json").unlink(missing_ok=True)
    terminal.press("1", *FORMS[kind])
    terminal.until_text(", north bay")
    for text in NASTY.values():
        terminal.type(f"\x1b[200~{text}\x1b[201~".encode())
        look(terminal)
        terminal.press("down")
    terminal.press("esc", "esc")
    look(terminal)


@pytest.mark.parametrize("name", NASTY)
def test_a_draft_with_anything_in_it_is_offered_literally(site: Path, open_terminal: Opened, name: str) -> None:
    Drafts(site).keep("note", "north bay", Draft(NASTY[name], datetime.now(UTC), (NASTY[name], "")))
    terminal = open_terminal(site)
    terminal.until_text("more to look at")
    terminal.press("e", "note", "enter")
    terminal.until_text("half-filled")
    look(terminal)
    terminal.press("enter")
    look(terminal)


@pytest.mark.parametrize("name", NASTY)
def test_names_in_the_site_file_are_shown_literally_or_refused(site: Path, open_terminal: Opened, name: str) -> None:
    path = site / "site.toml"
    written = json.dumps(NASTY[name], ensure_ascii=False)[1:-1].replace("\x9b", "\\u009b")
    text = path.read_text(encoding="utf-8")
    for known in ("Demo nursery", "own setting: warm season", "invented analysis", "drain store"):
        text = text.replace(known, f"{known} {written}")
    path.write_text(text, encoding="utf-8")
    terminal = open_terminal(site)
    shown = terminal.until(lambda text: "to look at" in text or "cannot be opened" in text)
    if "cannot be opened" in shown:
        look(terminal, "nursery")
        return
    for view in VIEWS:
        terminal.press(view)
        look(terminal)


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
