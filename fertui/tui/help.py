"""Help for the place one is in: what it is for, its keys, and the keys that work everywhere."""

from __future__ import annotations

from typing import Any, ClassVar

from textual.binding import Binding

from fertui.estimate.signs import MEANINGS, SIGNS
from fertui.tui.ink import BLANK, Line, Span, fit, line, wrap
from fertui.tui.key_line import key_name
from fertui.tui.keys import GLOBAL_KEYS
from fertui.tui.snapshot import Snapshot
from fertui.tui.view import SCROLLING, View

SIGNS_HERE = {
    **{SIGNS[severity]: meaning for severity, meaning in MEANINGS.items()},
    "✓": "all right", "?": "kept but in doubt: not used", "×": "corrected or struck", "▸": "what the keys act upon",
}  # fmt: skip
"""Every sign with its meaning; those of severity are the same in text and on paper."""


class HelpPage(View):
    """The words and keys of the page it was opened from."""

    TITLE = "Help"
    BINDINGS: ClassVar[list[Any]] = [
        Binding("escape,question_mark,f1,enter", "close", "back", id="help.close", tooltip="Back to where you were."),
    ]

    def __init__(self, page: View) -> None:
        super().__init__()
        self._page = page

    def draw(self, snapshot: Snapshot, width: int) -> list[Line]:
        """What the page is for, then keys with what they do."""
        rows: list[Line] = [line(Span(f" {self._page.TITLE}", "title")), BLANK]
        rows += [line(" ", text) for text in wrap(self._page.HELP, min(width - 2, 78))]
        keymap = self.fertui.settings.keys if self.is_attached else {}
        scrolling = {binding.id for binding in SCROLLING}
        own = [b for b in self._page.BINDINGS if isinstance(b, Binding) and b.id not in scrolling]
        for title, bindings in (("Keys here", own), ("Keys everywhere", GLOBAL_KEYS[9:]), ("Moving", SCROLLING)):
            if bindings:
                rows += [BLANK, line(Span(f" {title}", "title"))]
                rows += [_row(binding, keymap.get(binding.id or "", binding.key), width) for binding in bindings]
        signs = [line(" ", Span(fit(sign, 10), "accent"), meaning) for sign, meaning in SIGNS_HERE.items()]
        return [*rows, BLANK, line(Span(" Signs", "title")), *signs]


def _row(binding: Binding, key: str, width: int) -> Line:
    keys = ", ".join(key_name(each) for each in key.split(","))
    return line(" ", Span(fit(keys, 10), "accent"), fit(binding.tooltip or binding.description, width - 12))
