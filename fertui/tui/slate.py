"""Remembers what the terminal shows and passes on only the cells that differ.

The toolkit repaints whole regions, some of them twice, when a page is opened. On a thin line what is already on the
screen need not travel again. Anything this module does not understand it passes on as it is.
"""

from __future__ import annotations

import re

from fertui.tui.ink import cells
from fertui.tui.pen import PLAIN, Style, change, styled

_STRING = r"\x1b[\]P_^X][^\x07\x1b]*(?:\x07|\x1b\\)"
_TOKEN = re.compile(
    r"\x1b\[([\d;]*)m|\x1b\[(\d*);?(\d*)H|"
    rf"({_STRING}|\x1b\[[\d;?<>=$ ]*[@-GI-ln-~]|\x1b[^\[]|[\x00-\x1a\x1c-\x1f\x7f])"
)
_NOT_SENT = re.compile(r"\x07|\x1b\]22;.*")
"""A bell and the shape of the pointer: the toolkit's own, which nobody asked for."""
_CLEARS = ("\x1b[?1049h", "\x1b[?1049l", "\x1b[2J", "\x1b[J")
WORTH_A_JUMP = 5
"""Unchanged cells that are sent again rather than jumped over: a jump costs about as many bytes."""

_SHOWS_ON_BLANK = frozenset("479")

Cell = tuple[str, Style]


class Slate:
    """The terminal's screen as far as it is known. ``thin`` takes what the toolkit sends and returns what must
    travel."""

    def __init__(self, columns: int, rows: int) -> None:
        self.size = (columns, rows)
        self._cells: list[list[Cell | None]] = [[None] * columns for _ in range(rows)]
        self._pen, self._wanted = PLAIN, PLAIN
        self._at: tuple[int, int] | None = None
        self._x = self._y = 0

    def thin(self, data: str) -> str:
        """The same drawing in as few bytes as its changes need.

        >>> slate = Slate(10, 2)
        >>> slate.thin("\\x1b[1;1H\\x1b[31mab\\x1b[0m")
        '\\x1b[1;1H\\x1b[31mab'
        >>> slate.thin("\\x1b[1;1H\\x1b[31mab\\x1b[0m"), slate.thin("\\x1b[1;1H\\x1b[31mac\\x1b[0m")
        ('', '\\x08c')
        """
        out: list[str] = []
        end = 0
        for token in _TOKEN.finditer(data):
            self._write(data[end : token.start()], out)
            end = token.end()
            self._obey(token, out)
        self._write(data[end:], out)
        return "".join(out)

    def roll(self, top: int, bottom: int, lines: int) -> str:
        """Shift the rows from ``top`` up to ``bottom`` by so many lines (up where positive), and the sequence for it.

        Rows that come free are unknown until they are written.

        >>> Slate(10, 5).roll(1, 4, 1).count('\\x1b')
        5
        """
        columns, _ = self.size
        free: list[list[Cell | None]] = [[None] * columns for _ in range(abs(lines))]
        rows = self._cells[top:bottom]
        self._cells[top:bottom] = rows[lines:] + free if lines > 0 else free + rows[:lines]
        self._at = None
        letter = "M" if lines > 0 else "L"
        plain, self._pen = "\x1b[m", PLAIN
        return f"{plain}\x1b[{top + 1};{bottom}r\x1b[{top + 1};1H\x1b[{abs(lines)}{letter}\x1b[r"

    def forget(self) -> None:
        """What the terminal shows is no longer known: a new size, a screen that was away."""
        columns, rows = self.size
        self._cells = [[None] * columns for _ in range(rows)]
        self._at = None

    def lift(self) -> str:
        """The sequence back to the terminal's own style, for the end."""
        sequence = change(self._pen, PLAIN)
        self._pen = self._wanted = PLAIN
        return sequence

    def _obey(self, token: re.Match[str], out: list[str]) -> None:
        codes, row, column, other = token.groups()
        if codes is not None:
            self._wanted = styled(self._wanted, codes)
        elif other is None:
            self._y, self._x = int(row or 1) - 1, int(column or 1) - 1
        elif other == "\r":
            self._x = 0
        elif other == "\n":
            self._y += 1
        elif not _NOT_SENT.fullmatch(other):
            out.append(other)
            if other in _CLEARS:
                self.forget()

    def _write(self, text: str, out: list[str]) -> None:
        if not text:
            return
        columns, rows = self.size
        if not 0 <= self._y < rows or self._x >= columns:
            return
        if any(cells(character) != 1 for character in text) if not text.isascii() else False:
            self._write_whole(text, out)
            return
        text = text[: columns - self._x]
        row, style = self._cells[self._y], self._wanted
        if text.isspace():
            style = _of_blank(style)
        for start, stop in _changes(row, self._x, text, style):
            self._send(self._x + start, text[start:stop], out)
        row[self._x : self._x + len(text)] = [(character, style) for character in text]
        self._x += len(text)

    def _write_whole(self, text: str, out: list[str]) -> None:
        """Text with wide or combining characters: sent as it is, its cells then count as unknown."""
        width = min(cells(text), self.size[0] - self._x)
        self._send(self._x, text, out)
        self._cells[self._y][self._x : self._x + width] = [None] * width
        self._x += width
        self._at = None

    def _send(self, x: int, text: str, out: list[str]) -> None:
        out.append(self._jump(x))
        if not (text.isspace() and _of_blank(self._pen) == _of_blank(self._wanted)):
            out.append(change(self._pen, self._wanted))
            self._pen = self._wanted
        out.append(text)
        after = x + len(text)
        self._at = (after, self._y) if after < self.size[0] else None

    def _jump(self, x: int) -> str:
        """The shortest move from where the cursor is."""
        if self._at == (x, self._y):
            return ""
        if self._at == (x + 1, self._y):
            return "\b"
        if self._at is not None and self._at[1] == self._y and x > self._at[0]:
            step = x - self._at[0]
            return f"\x1b[{step if step > 1 else ''}C"
        return f"\x1b[{self._y + 1};{x + 1}H"


def _of_blank(style: Style) -> Style:
    """What of a style shows on a blank: its paper and its lines, not its ink."""
    return Style(style.on & _SHOWS_ON_BLANK, style.ink if "7" in style.on else "", style.paper)


def _changes(row: list[Cell | None], x: int, text: str, style: Style) -> list[tuple[int, int]]:
    """Pieces of the text that differ from the row, close ones taken together."""
    pieces: list[tuple[int, int]] = []
    for index, character in enumerate(text):
        if row[x + index] != (character, style):
            if pieces and index - pieces[-1][1] < WORTH_A_JUMP:
                pieces[-1] = (pieces[-1][0], index + 1)
            else:
                pieces.append((index, index + 1))
    return pieces
