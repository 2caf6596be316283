"""One line of text being typed: the text, where the cursor stands, and what the editing keys do to them."""

from __future__ import annotations

from typing import NamedTuple

from fertui.tui.ink import Line, Span, cells, cut, line

LONGEST = 20_000
"""Characters a field takes; a note of ten thousand is more than anyone has typed."""


class Typed(NamedTuple):
    """A text and the cursor in it, 0 before its first character.

    ``found``: the text stood there when the cursor came; the first character typed takes its place.
    """

    text: str = ""
    cursor: int = 0
    found: bool = False

    @classmethod
    def at_end(cls, text: str) -> Typed:
        """The text with the cursor behind it."""
        return cls(text, len(text))

    @classmethod
    def standing(cls, text: str) -> Typed:
        """A text that stands there already: typing replaces it, an editing key goes into it.

        >>> Typed.standing("252.5").insert("2").text, Typed.standing("2.5").edit("backspace").text
        ('2', '2.')
        """
        return cls(text, len(text), bool(text))

    def insert(self, characters: str) -> Typed:
        """Characters put in at the cursor, line breaks as blanks."""
        if self.found:
            return Typed().insert(characters)
        characters = " ".join(characters.splitlines())[: LONGEST - len(self.text)]
        text = self.text[: self.cursor] + characters + self.text[self.cursor :]
        return Typed(text, self.cursor + len(characters))

    def edit(self, key: str) -> Typed | None:
        """The line after an editing key, None for a key that is none.

        >>> Typed.at_end("4,5").edit("backspace").text
        '4,'
        """
        text, at = self.text, self.cursor
        match key:
            case "backspace" | "ctrl+h":
                return Typed(text[: max(at - 1, 0)] + text[at:], max(at - 1, 0))
            case "delete":
                return Typed(text[:at] + text[at + 1 :], at)
            case "left":
                return Typed(text, max(at - 1, 0))
            case "right":
                return Typed(text, min(at + 1, len(text)))
            case "home":
                return Typed(text, 0)
            case "end":
                return Typed(text, len(text))
            case "ctrl+u":
                return Typed("", 0)
        return None

    def shown(self, width: int) -> Line:
        """The line in ``width`` columns with its cursor, the part around the cursor where it is longer; what typing
        would replace is marked whole."""
        if self.found:
            text = cut(self.text, width)
            return line(Span(text, "chosen"), Span("_" * (width - cells(text)), "field"))
        before, after = self.text[: self.cursor], self.text[self.cursor :]
        while cells(before) > width - 1:
            before = before[1:]
        under, rest = after[:1] or "_", after[1:]
        left = width - cells(before) - cells(under)
        tail = cut(rest, max(left, 0), "")
        return line(Span(before, "field"), Span(under, "chosen"), Span(tail + "_" * (left - cells(tail)), "field"))
