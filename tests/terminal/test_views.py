"""Every view of the demo site at 80x24, word for word. FERTUI_GOLDEN=write keeps what is shown now as the new text.

The results under the screens are made by hand (hand_made.py): these tests are about what is drawn, not about the model.
"""

from __future__ import annotations

import os
import re
from pathlib import Path

import pytest
from conftest import HERE, Opened
from pseudo_terminal import PseudoTerminal

from fertui.tui.ink import text_of
from fertui.tui.snapshot import Snapshot
from fertui.tui.text_page import TextPage
from fertui.tui.views.supplies import shelf_table
from fertui.workbench.shelf import SupplyRow

GOLDEN = HERE / "golden"
SCREENS = {
    "loops": (), "today": ("v",), "today lettuce": ("v", "n"), "today in mg": ("v", "u", "u"), "analysis": ("2",),
    "drift": ("3", "left", "left"), "balance": ("4", "down", "right"), "forecast": ("5",), "record": ("5", "g"),
    "plan recipe": ("6",), "plan doses": ("n", "6"), "logbook": ("7", "down"), "entry": ("7", "enter"),
    "supplies": ("8", "down"),
    "site": ("9", "down"),
    "in force": ("9", "i", "down"), "help": ("2", "?"), "actions": ("x",), "reading": ("r",), "analysis form": ("a",),
    "entries": ("e",),
}  # fmt: skip
"""Screens by name with the keys that lead there."""


def show(terminal: PseudoTerminal, keys: tuple[str, ...]) -> str:
    terminal.until(lambda text: "look at" in text or "HCO3" in text)
    for key in keys:
        terminal.press(key)
        terminal.until(lambda text: "orking out" not in text and "Opening" not in text)
    terminal.settle()
    return terminal.text


def golden(name: str, shown: str) -> None:
    path: Path = GOLDEN / f"{name.replace(' ', '_')}.txt"
    if os.environ.get("FERTUI_GOLDEN") == "write":
        path.parent.mkdir(exist_ok=True)
        path.write_text(shown + "\n", encoding="utf-8")
    assert shown + "\n" == path.read_text(encoding="utf-8")


@pytest.mark.parametrize("name", SCREENS)
def test_a_screen_word_for_word(site: Path, open_terminal: Opened, name: str) -> None:
    golden(name, show(open_terminal(site, fixed=True), SCREENS[name]))


@pytest.mark.parametrize("name", ["today", "drift", "balance"])
def test_wide_terminals_use_their_width(site: Path, open_terminal: Opened, name: str) -> None:
    shown = show(open_terminal(site, fixed=True, size=(120, 40)), SCREENS[name])
    golden(f"{name} wide", shown)
    assert max(map(len, shown.splitlines())) > 84


def test_without_utf8_every_mark_has_an_ascii_stand_in(site: Path, open_terminal: Opened) -> None:
    for name in ("today", "drift", "balance", "plan doses"):
        terminal = open_terminal(site, fixed=True, LANG="C")
        shown = show(terminal, SCREENS[name])
        assert shown.isascii(), shown
        assert bytes(terminal.sent).isascii()


def test_without_colour_none_is_sent_and_states_are_still_told_apart(site: Path, open_terminal: Opened) -> None:
    terminal = open_terminal(site, fixed=True, NO_COLOR="1")
    shown = show(terminal, SCREENS["today"])
    codes = {
        code for found in re.findall(rb"\x1b\[([\d;]*)m", bytes(terminal.sent)) for code in found.split(b";") if code
    }
    assert {int(code) for code in codes} <= {0, 1, 2, 4, 7, 9, 22, 24, 27, 29}
    assert all(mark in shown for mark in ("!!", "! ", "✓"))


def test_an_empty_no_color_asks_for_nothing(site: Path, open_terminal: Opened) -> None:
    terminal = open_terminal(site, fixed=True, NO_COLOR="")
    show(terminal, ())
    assert b"38;5" in bytes(terminal.sent)


def test_in_sixteen_colours_the_palette_of_the_terminal_is_used(site: Path, open_terminal: Opened) -> None:
    terminal = open_terminal(site, fixed=True, TERM="linux")
    assert "K share" in show(terminal, ())
    assert b"38;5" not in bytes(terminal.sent)
    assert b"\x1b[38;2" not in bytes(terminal.sent)


OFTEN_USED = ["light", "terminal"]
THEMES = [*OFTEN_USED, *(pytest.param(theme, marks=pytest.mark.long) for theme in ("dark", "contrast"))]


@pytest.mark.parametrize("theme", THEMES)
def test_each_theme_shows_the_same_words(site: Path, tmp_path: Path, open_terminal: Opened, theme: str) -> None:
    folder = tmp_path / "config" / "fertui"
    folder.mkdir(parents=True)
    (folder / "settings.toml").write_text(f'theme = "{theme}"\n', encoding="utf-8")
    golden("today", show(open_terminal(site, fixed=True), SCREENS["today"]))


def test_the_theme_chosen_is_remembered(site: Path, tmp_path: Path, open_terminal: Opened) -> None:
    terminal = open_terminal(site, fixed=True)
    show(terminal, ("t",))
    terminal.until_text("colours: light")
    assert 'theme = "light"' in (tmp_path / "config" / "fertui" / "settings.toml").read_text(encoding="utf-8")


@pytest.mark.parametrize("size", [(60, 20), (80, 24)])
def test_no_word_of_an_analysis_is_cut_in_any_unit(site: Path, open_terminal: Opened, size: tuple[int, int]) -> None:
    terminal = open_terminal(site, fixed=True, size=size)
    for keys in (("2",), ("u",), ("u",)):
        rows = show(terminal, keys).splitlines()[2:-1]
        assert any(row.endswith("a little high") for row in rows)
        assert any(row.endswith("on target") for row in rows)
        assert not any("~" in row for row in rows), "\n".join(rows)
        assert "HCO3 " in terminal.text
        assert not re.search(r"HCO3 +m\S+/L", terminal.text)
        assert not re.search(r"\d\.\d{3}", "\n".join(row for row in rows if row.startswith((" K ", " NH4", " HCO3"))))


def test_the_forecast_says_when_to_take_the_next_sample(site: Path, open_terminal: Opened) -> None:
    terminal = open_terminal(site, fixed=True, size=(80, 40))
    terminal.press("5")
    terminal.until_text("next sample:")
    assert "one today would make the range of K share in 14 days 38 %" in " ".join(terminal.text.split())


def test_site_shows_what_is_in_force_and_where_it_comes_from(site: Path, open_terminal: Opened) -> None:
    terminal = open_terminal(site, fixed=True)
    terminal.until_text("look at")
    terminal.press("9")
    terminal.until_text("rows of")
    terminal.press("i")
    shown = terminal.until_text("in force: feed K share band")
    assert re.search(r"root zone Na limit +at most 8 mmol/L", shown)
    terminal.press("down", "enter")
    terminal.until_text("It comes from: unverified preset")
    terminal.press("esc", "backspace")
    terminal.until_text("site.timezone")


MORE_SIZES = [pytest.param(size, marks=pytest.mark.long) for size in ((61, 21), (79, 23), (81, 25), (200, 60))]


@pytest.mark.parametrize("size", [(60, 20), (100, 30), *MORE_SIZES])
def test_no_line_is_wider_than_the_screen(site: Path, open_terminal: Opened, size: tuple[int, int]) -> None:
    terminal = open_terminal(site, fixed=True, size=size)
    terminal.until_text("look at")
    for key in "v23456789":
        terminal.press(key)
        terminal.until(lambda text: "orking out" not in text)
        assert all(len(row) <= size[0] for row in terminal.text.splitlines())
        assert terminal.text.splitlines()[0].rstrip().endswith("09:00"), terminal.text


@pytest.mark.parametrize("width", [60, 80, 120])
def test_a_sheet_is_shown_in_the_width_it_is_made_for(width: int) -> None:
    full = "SHIFT HANDOVER".ljust(68) + "Demo nursery"
    shown = TextPage("handover", [full, "=" * 80], printed=True).draw(Snapshot(), width)
    rows = [text_of([row]) for row in shown][2:]
    assert rows[-1] == "=" * min(width, 80)
    assert all(len(row) <= width for row in rows)
    if width >= 80:
        assert rows == [full, "=" * 80]


def test_below_the_floor_it_says_so_and_comes_back(site: Path, open_terminal: Opened) -> None:
    terminal = open_terminal(site, fixed=True)
    terminal.until_text("look at")
    for columns, rows in ((40, 10), (3, 2), (20, 50), (200, 5)):
        terminal.resize(columns, rows)
        terminal.settle()
    terminal.resize(50, 15)
    terminal.until_text("fertui needs 60 columns and 20 rows")
    terminal.resize(80, 24)
    terminal.until_text("All loops, worst first")


def test_a_size_that_goes_there_and_back_at_once_leaves_a_whole_screen(site: Path, open_terminal: Opened) -> None:
    """The terminal cuts what it shows, the program may never see the smaller size."""
    terminal = open_terminal(site, fixed=True)
    whole = show(terminal, ())
    for wait in (0.0, 0.005, 0.01, 0.02, 0.03) * 4:
        terminal.resize(50, 15)
        terminal.read(wait)
        terminal.resize(80, 24)
        terminal.settle()
        assert terminal.text == whole


@pytest.mark.parametrize("width", [60, 80, 120])
def test_columns_of_the_shelf_stay_apart_and_no_name_is_cut(width: int) -> None:
    names = ("magnesium sulfate heptahydrate", "calcium nitrate double salt", "nitric acid 38")
    shelf = [SupplyRow(name, "", "5Ca(NO3)2.NH4NO3.10H2O", "38 %", 1.23, 1.2, 120.0, (), "warning") for name in names]
    head, *rows = text_of(shelf_table(shelf, width)).splitlines()
    assert max(map(len, (head, *rows))) <= width
    for name, row in zip(names, rows, strict=True):
        assert [text for text in re.split(" {2,}", row) if text][:1] == [name]
        assert len(re.split(" {2,}", row.strip())) == len(head.split())


def test_a_stock_tank_with_a_long_name_keeps_it_and_its_columns(site: Path, open_terminal: Opened) -> None:
    file = site / "site.toml"
    file.write_text(file.read_text(encoding="utf-8").replace('"sulfate"', '"sulfate and phosphate"'), encoding="utf-8")
    terminal = open_terminal(site, fixed=True)
    terminal.until_text("look at")
    terminal.press("8")
    terminal.until(lambda text: re.search(r"sulfate and phosphate \(B\) +1000 L 100x  ", text) is not None)


def test_the_list_of_actions_cuts_no_word_and_shows_no_name_of_the_program(site: Path, open_terminal: Opened) -> None:
    terminal = open_terminal(site, fixed=True, size=(60, 24))
    terminal.until_text("look at")
    terminal.press("6", "x")
    listed = terminal.until_text("All actions").splitlines()[4:23]
    assert [row for row in listed if row.endswith("~") or "plan." in row] == []
