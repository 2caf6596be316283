"""Every binding has a name, a help line and a key that gets through; every one can be pressed; settings can move
them."""

from __future__ import annotations

from pathlib import Path

import pytest
from conftest import Opened
from pseudo_terminal import KEYS, PseudoTerminal

from fertui.refusals import Refusal
from fertui.tui.actions import all_bindings
from fertui.tui.keys import GLOBAL_KEYS
from fertui.tui.settings import Settings, read_settings, write_settings
from fertui.tui.view import View
from fertui.tui.views import view_numbered

pytestmark = pytest.mark.long  # every key and random walks: minutes of waiting for screens

TAKEN_BY_TERMINALS = {"ctrl+a", "ctrl+b", "ctrl+s", "ctrl+i", "ctrl+j", "ctrl+m", "ctrl+z", "ctrl+c"}
"""Keys that tmux, screen and terminals take for themselves, or that are Tab and Enter (common practice, no source)."""
NAMES = {"question_mark": "?", "slash": "/", "escape": "esc", "plus": "+", "asterisk": "*"}


def test_every_binding_has_id_help_and_a_key_that_gets_through() -> None:
    for binding in all_bindings():
        assert binding.id, binding
        assert len(binding.tooltip) > 8, binding
        assert not set(binding.key.split(",")) & (
            TAKEN_BY_TERMINALS | ({"ctrl+q"} if binding.id != "leave.at_once" else set())
        )


@pytest.mark.parametrize("number", range(1, 10))
def test_no_key_of_a_view_is_bound_twice(number: int) -> None:
    keys = [key for binding in view_numbered(number).BINDINGS for key in binding.key.split(",")]
    assert len(keys) == len(set(keys))
    assert issubclass(view_numbered(number), View)
    assert view_numbered(number).HELP


@pytest.mark.parametrize("number", range(1, 10))
def test_every_key_of_a_view_can_be_pressed(shared_terminal: PseudoTerminal, number: int) -> None:
    terminal = shared_terminal
    own = [key for binding in view_numbered(number).BINDINGS for key in binding.key.split(",")]
    everywhere = [
        key for binding in GLOBAL_KEYS for key in binding.key.split(",") if binding.id not in ("leave", "leave.at_once")
    ]
    for key in dict.fromkeys([*own, *everywhere]):
        name = NAMES.get(key, key)
        terminal.type(str(number).encode())
        terminal.type(KEYS.get(name, name).encode())
        terminal.settle(0.05)
        terminal.type(b"\x1b")
        terminal.settle(0.12)  # an Esc is an Esc when nothing follows it
        terminal.type(b"\x1b")
        terminal.settle(0.12)
        assert "fault of its own" not in terminal.text, (key, terminal.text)
    terminal.press("7")
    terminal.until_text("newest first")


def test_a_key_can_be_moved_in_the_settings_file(site: Path, tmp_path: Path, open_terminal: Opened) -> None:
    folder = tmp_path / "config" / "fertui"
    folder.mkdir(parents=True)
    (folder / "settings.toml").write_text('[keys]\n"view.logbook" = "g"\n', encoding="utf-8")
    terminal = open_terminal(site)
    terminal.until_text("look at")
    terminal.press("g")
    terminal.until_text("newest first")


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ('them = "dark"\n', "'them' is not a setting; did you mean 'theme'?"),
        ('theme = "drak"\n', "it can be dark, light, contrast, terminal"),
        ('ascii = "yes"\n', "true or false"),
        ("initials_minutes = 0\n", "1 to 1440"),
        ("theme = \n", "not readable as TOML"),
        ('[keys]\n"view.logbok" = "g"\n', "did you mean 'view.logbook'?"),
    ],
)
def test_a_wrong_setting_is_refused_with_the_nearest_name(tmp_path: Path, text: str, says: str) -> None:
    (tmp_path / "settings.toml").write_text(text, encoding="utf-8")
    with pytest.raises(Refusal) as refused:
        read_settings(lambda: {binding.id for binding in all_bindings() if binding.id}, tmp_path)
    assert says in str(refused.value)
    assert str(tmp_path) in str(refused.value)


def test_settings_round_trip(tmp_path: Path) -> None:
    settings = Settings("light", "mg/L", True, False, 30, {"view.plan": "f6"})
    write_settings(settings, tmp_path)
    assert read_settings(lambda: {"view.plan"}, tmp_path) == settings
