"""The bottom line: the keys that work here, and what is going on."""

from __future__ import annotations

from collections.abc import Sequence

from fertui.tui.ink import Line, Span, cells, cut_words, fit, line, literal, width_of
from fertui.tui.page import Page

SHORT = {"question_mark": "?", "escape": "Esc", "enter": "Enter", "slash": "/", "plus": "+", "asterisk": "*",
"up": "Up", "down": "Down", "left": "Left",
         "right": "Right", "tab": "Tab", "pagedown": "PgDn", "backspace": "Bksp", "space": "Space",
         "delete": "Del"}  # fmt: skip


def key_name(key: str) -> str:
    """A key as people call it.

    >>> key_name("question_mark")
    '?'
    """
    first = key.split(",")[0]
    named = SHORT.get(first, first.replace("ctrl+", "Ctrl-"))
    return named.upper() if named[:1] == "f" and named[1:].isdigit() else named


class KeyLine(Page):
    """One line: keys with what they do; on the right a notice, or how much there is below."""

    def say(self, keys: Sequence[tuple[str, str]], notice: str = "", ink: str = "faint") -> None:
        """Show keys and a notice."""
        self.show([key_words(keys, notice, ink, self.size.width)])


def key_words(keys: Sequence[tuple[str, str]], notice: str, ink: str, width: int) -> Line:
    """As many keys as fit beside the notice, the last ones (actions and help) always among them."""
    notice = literal(notice)
    if cells(notice) > width - 30:
        return line(Span(" " + fit(cut_words(notice, width - 1), width - 1), ink))
    room = width - cells(notice) - 3
    *some, actions, helping = keys if len(keys) > 1 else (*keys, ("", ""), ("", ""))
    row = line(" ")
    always = line(*_key(*actions), *_key(*helping))
    for key in some:
        if width_of(row) + width_of(line(*_key(*key))) + width_of(always) > room:
            break
        row = line(*row, *_key(*key))
    row = line(*row, *always)
    gap = width - width_of(row) - cells(notice) - 1
    return line(*row, " " * max(gap, 0), Span(notice, ink))


def _key(key: str, word: str) -> tuple[Span, Span]:
    return Span(key, "accent"), Span(f" {word}  ", "plain")
