"""What a screen is drawn of: lines of spans, each a text with the name of its ink. Pure values, no toolkit."""

from __future__ import annotations

import unicodedata
from collections.abc import Iterable, Sequence
from functools import lru_cache
from itertools import accumulate
from textwrap import wrap as wrap_words
from typing import NamedTuple

INKS = (
    "plain",
    "faint",
    "strong",
    "title",
    "good",
    "watch",
    "act",
    "accent",
    "band",
    "chosen",
    "field",
    "bar",
    "struck",
)
"""Names of the inks; the style sheets give each its colour and weight."""


class Span(NamedTuple):
    """A piece of text in one ink."""

    text: str
    ink: str = "plain"


Line = tuple[Span, ...]
BLANK: Line = ()


@lru_cache(4096)
def literal(text: str) -> str:
    """Text from people or files so that it shows what it holds and moves nothing.

    Control characters appear as ^X, invisible format characters (bidirectional marks, joiners) by their number.

    >>> literal("[b]x[/b]\\x1b[2J")
    '[b]x[/b]^[[2J'
    """
    return "".join(map(_shown, text)) if not text.isascii() or not text.isprintable() else text


def _shown(character: str) -> str:
    code = ord(character)
    if code < 32 or code == 127:
        return " " if character in "\n\t\r" else "^" + chr(code ^ 64)
    if 0xFE00 <= code <= 0xFE0F:  # asks for another picture of the same character; terminals disagree about its width
        return ""
    if unicodedata.category(character) in ("Cc", "Cf", "Cs", "Co", "Cn", "Zl", "Zp"):
        return f"<{code:X}>"
    return character


@lru_cache(4096)
def cells(text: str) -> int:
    """Columns a text takes."""
    return len(text) if text.isascii() else sum(map(_cells, text))


def _cells(character: str) -> int:
    if unicodedata.category(character) in ("Mn", "Me"):
        return 0
    return 2 if unicodedata.east_asian_width(character) in "WF" else 1


def cut(text: str, width: int, mark: str = "~") -> str:
    """The text in at most ``width`` columns, with a mark where something was left out.

    >>> cut("calcium nitrate", 9)
    'calcium ~'
    """
    if cells(text) <= width:
        return text
    kept: list[str] = []
    left = width - len(mark)
    for character in text:
        left -= _cells(character)
        if left < 0:
            break
        kept.append(character)
    return "".join(kept) + mark if width > 0 else ""


def cut_words(text: str, width: int) -> str:
    """The text in at most ``width`` columns, cut between words.

    >>> cut_words("saved 4 reading EC 2.6", 16)
    'saved 4 ...'
    """
    return text if cells(text) <= width else f"{wrap(text, width - 4)[0]} ..."


def fit(text: str, width: int, right: bool = False) -> str:
    """The text in exactly ``width`` columns, cut or padded.

    >>> fit("4.6", 6, right=True)
    '   4.6'
    """
    text = cut(text, width)
    padding = " " * (width - cells(text))
    return padding + text if right else text + padding


def wrap(text: str, width: int) -> list[str]:
    """The text in lines of at most ``width`` columns, broken between words where that can be done.

    >>> wrap("one two three", 8)
    ['one two', 'three']
    """
    if text.isascii():
        return wrap_words(text, max(width, 1), break_on_hyphens=False) or [""]
    lines: list[str] = [""]
    width = max(width, 2)  # a wide character takes two columns wherever it stands
    for word in text.split():
        while cells(word) > width:
            head = cut(word, width, "")
            lines.append(head)
            word = word[len(head) :]
        joined = f"{lines[-1]} {word}" if lines[-1] else word
        if cells(joined) <= width:
            lines[-1] = joined
        else:
            lines.append(word)
    return lines if lines[0] or len(lines) == 1 else lines[1:]


def line(*parts: str | Span) -> Line:
    """A line of texts in plain ink and spans; neighbours of the same ink become one span."""
    spans: list[Span] = []
    for part in parts:
        span = part if isinstance(part, Span) else Span(part)
        if spans and spans[-1].ink == span.ink:
            spans[-1] = Span(spans[-1].text + span.text, span.ink)
        elif span.text:
            spans.append(span)
    return tuple(spans)


def col(text: str, width: int, ink: str = "plain", right: bool = True) -> Span:
    """A cell of a table: the text cut or padded to its column."""
    return Span(fit(text, width, right), ink)


def width_of(spans: Line) -> int:
    """Columns a line takes."""
    return sum(cells(span.text) for span in spans)


def inked(spans: Line, ink: str) -> Line:
    """The same line in another ink."""
    return (Span("".join(span.text for span in spans), ink),)


BAR = 80
"""Columns of the bar on a chosen row: on a wide screen it must not cost more to move than on a usual one."""


def barred(spans: Line, width: int) -> Line:
    """The line under the bar, filled to ``width`` columns.

    >>> [(span.ink, len(span.text)) for span in barred(line("x" * 100), 120)]
    [('chosen', 80), ('plain', 40)]
    """
    text = "".join(span.text for span in filled(spans, width))
    end = sum(1 for reach in accumulate(map(cells, text)) if reach <= BAR)
    return line(Span(text[:end], "chosen"), Span(text[end:]))


def filled(spans: Line, width: int, ink: str = "plain") -> Line:
    """The line cut or padded to exactly ``width`` columns, padding in ``ink``."""
    used = width_of(spans)
    if used <= width:
        return line(*spans, Span(" " * (width - used), ink))
    kept: list[Span] = []
    left = width
    for span in spans:
        size = cells(span.text)
        if size >= left:
            kept.append(Span(fit(span.text, left), span.ink))
            break
        kept.append(span)
        left -= size
    return tuple(kept)


def beside(left: Sequence[Line], right: Sequence[Line], width: int, gap: int = 2) -> list[Line]:
    """Two blocks side by side, the left one padded to ``width`` columns."""
    height = max(len(left), len(right))
    left, right = [*left, *[BLANK] * (height - len(left))], [*right, *[BLANK] * (height - len(right))]
    return [line(*filled(one, width), " " * gap, *other) for one, other in zip(left, right, strict=True)]


def text_of(lines: Iterable[Line]) -> str:
    """The bare text of lines: what a test or a text file sees."""
    return "\n".join("".join(span.text for span in spans).rstrip() for spans in lines)


_ASCII = str.maketrans({
    "─": "-", "│": "|", "┼": "+", "├": "|", "┤": "|", "╶": "-", "╴": "-", "·": ".", "●": "o", "○": "o", "◆": "*",
    "▲": "^", "▼": "v", "◀": "<", "▶": ">", "±": "~", "▁": "_", "▂": ".", "▃": ":", "▄": "-", "▅": "=", "▆": "+",
    "▇": "*", "█": "#", "░": ":", "▒": "%", "✓": "v", "×": "x", "→": ">", "…": "~", "━": "=", "┃": "|", "╌": "-",
    "═": "=", "▸": ">", "–": "-", "µ": "u", "²": "2", "³": "3", "°": " ", "«": "<", "»": ">",
})  # fmt: skip


def ascii_only(text: str) -> str:
    """The text for a terminal that has no more than ASCII; each character keeps its column.

    >>> ascii_only("4.6 ±0.6 ▁▅ ü")
    '4.6 ~0.6 _= ?'
    """
    if text.isascii():
        return text
    changed = text.translate(_ASCII)
    return "".join(c if c.isascii() else "?" * _cells(c) for c in changed)
