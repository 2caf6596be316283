"""Every action of the program, by key: for the list, and for the settings file."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING, Any

from textual.binding import Binding

from fertui.tui.keys import GLOBAL_KEYS, VIEW_NAMES
from fertui.tui.view import SCROLLING, View

if TYPE_CHECKING:
    from fertui.tui.frame import FertuiApp


def all_bindings() -> Iterator[Binding]:
    """Bindings of the frame, of scrolling, of every view and of forms and lists, each id once."""
    from fertui.tui.chooser import Chooser
    from fertui.tui.entry_list import EntryList
    from fertui.tui.entry_page import EntryPage
    from fertui.tui.forms.form import Form
    from fertui.tui.help import HelpPage
    from fertui.tui.prompt import Prompt
    from fertui.tui.record_page import RecordPage
    from fertui.tui.text_page import TextPage
    from fertui.tui.views import view_numbered

    views = (view_numbered(n) for n in range(1, len(VIEW_NAMES) + 1))
    groups: list[list[Any]] = [GLOBAL_KEYS, SCROLLING, *(page.BINDINGS for page in views)]
    groups += [page.BINDINGS for page in (Form, Chooser, EntryList, EntryPage, HelpPage, RecordPage, TextPage)] + [
        Prompt.BINDINGS
    ]
    seen: set[str | None] = set()
    for group in groups:
        for binding in group:
            if isinstance(binding, Binding) and binding.id not in seen:
                seen.add(binding.id)
                yield binding


def action_list(app: FertuiApp) -> View:
    """A list of all actions that can be started from here; choosing one does it."""
    from fertui.tui.chooser import Chooser, Option
    from fertui.tui.key_line import key_name

    page = app.page
    here = [b for b in page.BINDINGS if isinstance(b, Binding)] if page is not None else []
    found = {binding.id: (binding, page) for binding in here if binding not in SCROLLING}
    found |= {binding.id: (binding, None) for binding in GLOBAL_KEYS if binding.id not in ("actions",)}
    keys = app.settings.keys
    options = [
        Option(binding.description, binding.tooltip, key_name(keys.get(name or "", binding.key)), name or "")
        for name, (binding, _) in found.items()
    ]

    def do(name: str) -> None:
        binding, owner = found[name]
        app.call_later(app.run_action, binding.action, default_namespace=owner or app)

    return Chooser("All actions here and everywhere", options, do)
