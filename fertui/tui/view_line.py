"""The second line: the numbered views, the open one marked."""

from __future__ import annotations

from collections.abc import Sequence

from fertui.tui.ink import Line, Span, line
from fertui.tui.page import Page


class ViewLine(Page):
    """One line of view names."""

    def mark(self, names: Sequence[str], open_view: int, loops: str) -> None:
        """Show the names with one of them marked; ``loops`` says which of how many loops."""
        self.show([view_names(names, open_view, loops, self.size.width)])


def view_names(names: Sequence[str], open_view: int, loops: str, width: int) -> Line:
    """As many words as fit: all names spaced, all names tight, or the open one and the numbers of the others."""
    for gap, between, every in ((" ", "  ", True), (" ", " ", True), ("", " ", True), (" ", "  ", False)):
        spans: list[Span | str] = []
        for number, name in enumerate(names, 1):
            chosen = number == open_view
            if every or chosen:
                spans += [
                    between,
                    Span(f"{number}", "chosen" if chosen else "accent"),
                    Span(gap + name, "chosen" if chosen else "plain"),
                ]
            else:
                spans += [between, Span(f"{number}", "accent")]
        row = line(" ", *spans[1:])
        used = sum(len(span.text) for span in row)
        if used + len(loops) + 1 < width:
            return line(*row, " " * (width - used - len(loops) - 1), Span(loops, "faint"))
        if used < width:
            return row
    return line(Span(f" {open_view} {names[open_view - 1]}", "chosen"))
