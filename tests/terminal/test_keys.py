"""Every binding has a name, a help line and a key that gets through; every one is pressed in every place that has it;
settings can move them."""

from __future__ import annotations

import importlib
import pkgutil
import re
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest
from conftest import AT, Opened, frame_stands, own_folders
from pseudo_terminal import KEYS, PseudoTerminal
from ready_program import ReadyProgram

import fertui.tui
from fertui.logbook.kinds import KINDS
from fertui.refusals import Refusal
from fertui.tui.actions import all_bindings
from fertui.tui.chooser import Chooser
from fertui.tui.entry_list import EntryList
from fertui.tui.entry_page import EntryPage
from fertui.tui.forms.form import Form
from fertui.tui.help import HelpPage
from fertui.tui.keys import GLOBAL_KEYS
from fertui.tui.page import Page
from fertui.tui.prompt import Prompt
from fertui.tui.record_page import RecordPage
from fertui.tui.settings import Settings, read_settings, write_settings
from fertui.tui.text_page import TextPage
from fertui.tui.view import View
from fertui.tui.views import view_numbered

TAKEN_BY_TERMINALS = {"ctrl+a", "ctrl+b", "ctrl+s", "ctrl+i", "ctrl+j", "ctrl+m", "ctrl+z", "ctrl+c"}
"""Keys that tmux, screen and terminals take for themselves, or that are Tab and Enter (common practice, no source)."""
NAMES = {"question_mark": "?", "slash": "/", "escape": "esc", "plus": "+", "asterisk": "*"}
LEAVES = ("leave", "leave.at_once")
"""Bindings that end the program: test_leaving.py presses them."""

FORM_KEYS = {"reading": ("r",), "analysis": ("a",), "water": ("w",), "dose": ("d",), "batch": ("m",)}
FORMS = {kind: FORM_KEYS.get(kind, ("e", kind, "enter")) for kind in KINDS if kind not in ("plan", "site")}
"""Kinds of entry with the keys that open their forms."""
PLACES: dict[str, tuple[type[Page], tuple[str, ...]]] = {
    **{view_numbered(n).TITLE: (view_numbered(n), (str(n),)) for n in range(1, 10)},
    **{f"form {kind}": (Form, keys) for kind, keys in FORMS.items()},
    "correction": (Form, ("7", "c")), "chooser": (Chooser, ("o",)), "entries": (EntryList, ("4", "enter")),
    "entry": (EntryPage, ("7", "enter")), "help": (HelpPage, ("?",)), "record": (RecordPage, ("5", "g")),
    "text": (TextPage, ("6", "i")), "question": (Prompt, ("7", "/")),
}  # fmt: skip
"""Every place with keys of its own, by the keys that lead there from Today."""
TERMINALS = {
    "256 colours": {"TERM": "xterm-256color"}, "16 colours": {"TERM": "linux"}, "no colour": {"NO_COLOR": "1"},
    "no UTF-8": {"LANG": "C"},
}  # fmt: skip


def keys_of(bindings: list[Any]) -> list[str]:
    """The keys of bindings as ``KEYS`` names them; fails for one nobody told how to type."""
    names = [NAMES.get(key, key) for each in bindings if each.id not in LEAVES for key in each.key.split(",")]
    assert all(len(name) == 1 or name in KEYS for name in names), names
    return list(dict.fromkeys(names))


def pages() -> Iterator[type[Page]]:
    """Every page there is."""
    for module in pkgutil.walk_packages(fertui.tui.__path__, "fertui.tui."):
        importlib.import_module(module.name)
    rest: list[type[Page]] = [Page]
    while rest:
        page = rest.pop()
        rest += page.__subclasses__()
        yield page


def test_every_page_with_keys_is_among_the_places_that_are_walked() -> None:
    with_keys = {page for page in pages() if page is not View and page.__dict__.get("BINDINGS")}
    assert with_keys == {page for page, _ in PLACES.values() if page.__dict__.get("BINDINGS")}


def test_every_binding_has_id_help_and_a_key_that_gets_through() -> None:
    for binding in all_bindings():
        assert binding.id, binding
        assert len(binding.tooltip) > 8, binding
        assert not set(binding.key.split(",")) & (
            TAKEN_BY_TERMINALS | ({"ctrl+q"} if binding.id != "leave.at_once" else set())
        )


def test_the_settings_file_can_name_every_binding() -> None:
    known = {binding.id for binding in all_bindings()}
    assert {binding.id for page, _ in PLACES.values() for binding in page.BINDINGS} <= known


def test_the_page_about_files_names_every_action_with_its_key() -> None:
    page = (Path(__file__).parents[2] / "docs" / "files.md").read_text(encoding="utf-8")
    rows = (f"| `{binding.id}` | {binding.key.replace(',', ', ')} |" for binding in all_bindings())
    assert [row for row in rows if row not in page] == []


@pytest.mark.parametrize("number", range(1, 10))
def test_no_key_of_a_view_is_bound_twice(number: int) -> None:
    keys = [key for binding in view_numbered(number).BINDINGS for key in binding.key.split(",")]
    assert len(keys) == len(set(keys))
    assert issubclass(view_numbered(number), View)
    assert view_numbered(number).HELP


class Walker:
    """Goes to places on one site and presses keys there; what a form kept of it is forgotten before the next."""

    def __init__(self, terminal: PseudoTerminal, site: Path) -> None:
        self.terminal, self._drafts = terminal, site / "drafts.json"

    def go(self, place: str) -> None:
        """To a place from wherever this is."""
        self._drafts.unlink(missing_ok=True)
        self.press("esc", "esc", "esc", *PLACES[place][1])

    def press(self, *keys: str) -> None:
        """Press keys one after the other, as fast as they can be typed."""
        self.terminal.type("".join(KEYS.get(key, key) for key in keys).encode())

    def look(self, *pressed: str) -> None:
        """Wait until the frame stands at rest; nothing of the program's own has failed."""
        self.terminal.settle()
        self.terminal.until(lambda _: frame_stands(self.terminal, "Demo nursery"))
        assert "fault of its own" not in self.terminal.text, (pressed, self.terminal.text)


@pytest.fixture(scope="module")
def walkers(ready: ReadyProgram, copied: Callable[[], Path]) -> Iterator[dict[str, Walker]]:
    """A walker on a site of its own in every kind of terminal; at the end each leaves, having shown what it can."""
    made: dict[str, Walker] = {}
    for name, own in TERMINALS.items():
        site = copied()
        terminal = PseudoTerminal(
            ready.on(site, AT.isoformat()), (80, 24), {**own_folders(site.parent), **own}, site.parent
        )
        made[name] = Walker(terminal, site)
    yield made
    for walker in made.values():
        walker.terminal.__exit__()


def only_what_it_can_show(sent: bytes, terminal: str) -> None:
    """No sign and no colour has been sent that this kind of terminal has not."""
    codes = {code for found in re.findall(rb"\x1b\[([\d;]*)m", sent) for code in found.split(b";") if code}
    if terminal == "no UTF-8":
        assert sent.isascii()
    if terminal == "no colour":
        assert {int(code) for code in codes} <= {0, 1, 2, 4, 7, 9, 22, 24, 27, 29}
    if terminal == "16 colours":
        assert not codes & {b"38", b"48"}


@pytest.mark.parametrize("place", PLACES)
def test_every_key_of_a_place_can_be_pressed_there(walkers: dict[str, Walker], place: str) -> None:
    """In all terminals side by side."""
    page = PLACES[place][0]
    for walker in walkers.values():
        walker.go(place)
    for walker in walkers.values():
        walker.look(place)
        for key in keys_of(page.BINDINGS):
            walker.press(key)
            if page is not Form:  # a form stays open, whatever is pressed in it
                walker.go(place)
    for terminal, walker in walkers.items():
        walker.look(terminal, place, "after all its keys")
        only_what_it_can_show(bytes(walker.terminal.sent), terminal)


@pytest.mark.parametrize("number", range(1, 10))
def test_every_key_of_the_frame_can_be_pressed_in_every_view(walkers: dict[str, Walker], number: int) -> None:
    walker = walkers["256 colours"]
    for key in keys_of(GLOBAL_KEYS):
        walker.go(view_numbered(number).TITLE)
        walker.press(key)
    walker.look(f"all of the frame's in view {number}")


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
