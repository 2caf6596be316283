"""A page of plain text: a sheet, the arithmetic of a plan, cautions. It can be written to a file or copied."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any, ClassVar

from textual.binding import Binding

from fertui.tui.desk import Answer
from fertui.tui.ink import BLANK, Line, Span, cells, cut, line, literal, wrap
from fertui.tui.snapshot import Snapshot
from fertui.tui.view import SCROLLING, View


class TextPage(View):
    """Lines as they are: too long ones are wrapped. ``go_on``: what Enter does, where the page asks to be read
    first. ``printed``: lines made for the whole width of a sheet, shown without a margin."""

    TITLE = "Text"
    HELP = "A page of text. o writes it to a file, y copies it to the clipboard of your terminal, Esc goes back."
    BINDINGS: ClassVar[list[Any]] = [
        *SCROLLING,
        Binding("enter", "go_on", "go on", show=False, id="text.on", tooltip="Go on, once this has been read."),
        Binding("o", "write", "write to a file", id="text.write", tooltip="Write the text to a new file."),
        Binding("y", "copy", "copy", id="text.copy", tooltip="Copy the text to the clipboard of your terminal."),
        Binding("escape", "close", "back", id="page.close", tooltip="Back to where you were."),
    ]

    def __init__(
        self,
        title: str,
        text: Sequence[str],
        file_name: str = "",
        go_on: Callable[[], None] | None = None,
        asks: str = "",
        printed: bool = False,
    ) -> None:
        super().__init__()
        self.heading, self.text, self.file_name = title, tuple(text), file_name
        self._go_on, self._asks, self._printed = go_on, asks, printed

    def draw(self, snapshot: Snapshot, width: int) -> list[Line]:
        """The heading and the lines; where it asks for something, that comes last."""
        how = "   Space reads on, Enter once all is read" if self._asks else ""
        heading = cut(literal(self.heading), width - 2 - len(how))
        rows = [line(Span(f" {heading}", "title"), Span(how, "watch")), BLANK]
        for text in self.text:
            if self._printed and (cells(text) <= width or len(set(text)) == 1):
                rows.append(line(literal(text[:width])))  # a rule is as wide as the screen
            else:
                rows += _paragraph(literal(text), width)
        return [*rows, BLANK, line(" ", Span(self._asks, "watch"))] if self._asks else rows

    def action_go_on(self) -> None:
        """Go on, where the page asks to be read first."""
        if self._go_on is not None:
            self.fertui.close_page()
            self._go_on()

    def action_write(self) -> None:
        """Ask for a file name and write."""
        text = "\n".join(self.text)

        def into(path: str) -> None:
            if path:
                self.fertui.clerk(
                    lambda bench: bench.write(text, Path(path).expanduser()), self._written, "writing the file"
                )

        self.fertui.ask("Write to file:", into, self.file_name or "sheet.txt")

    def _written(self, answer: Answer) -> None:
        self.fertui.say(answer.trouble or f"written to {answer.value}", "act" if answer.trouble else "good")

    def action_copy(self) -> None:
        """Copy by the terminal's own means."""
        self.app.copy_to_clipboard("\n".join(self.text))
        self.fertui.say("copied, if your terminal allows it", "good")


def _paragraph(text: str, width: int) -> list[Line]:
    """A text in as many lines as it needs; what follows a mark hangs below its first word."""
    if cells(text) < width - 1:
        return [line(" ", text)]
    mark = re.match(r"[^\w\s(]{1,2} ", text)
    hang = " " * len(mark[0]) if mark else ""
    first, *more = wrap(text, width - 2 - len(hang))
    return [line(" ", first), *(line(" ", hang, words) for words in more)]
