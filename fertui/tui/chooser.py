"""A list to choose from: move with the arrows or type part of a name, Enter takes it."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any, ClassVar, NamedTuple

from textual import events
from textual.binding import Binding

from fertui.tui.ink import BLANK, Line, Span, barred, cells, fit, line, literal, width_of, wrap
from fertui.tui.snapshot import Snapshot
from fertui.tui.view import SCROLLING, View


class Option(NamedTuple):
    """Something to choose: what it is called, what it means, the key that does the same from outside, its value."""

    name: str
    about: str = ""
    key: str = ""
    value: str = ""


class Chooser(View):
    """Shows options, narrows them by what is typed, hands the chosen value over."""

    TITLE = "Choose"
    HELP = (
        "Up and Down move the bar, Enter takes what is under it; "
        "typing narrows the list, Backspace widens it, Esc leaves."
    )
    BINDINGS: ClassVar[list[Any]] = [
        *(binding for binding in SCROLLING if binding.key != "pagedown,space"),
        Binding("pagedown", "leaf(1)", "page down", show=False, id="page.pagedown", tooltip="A screenful down."),
        Binding("enter", "take", "take it", id="choose.take", tooltip="Take what is under the bar."),
        Binding("escape", "close", "leave", id="page.close", tooltip="Back to where you were."),
    ]

    def __init__(
        self, title: str, options: Sequence[Option], then: Callable[[str], None], narrows: bool = True
    ) -> None:
        super().__init__()
        self._narrows = narrows
        self._title, self._options, self._then = title, tuple(options), then
        self._typed = ""
        self._row = 0

    @property
    def _left(self) -> list[Option]:
        wanted = self._typed.lower()
        return [each for each in self._options if wanted in f"{each.name} {each.about}".lower()]

    def draw(self, snapshot: Snapshot, width: int) -> list[Line]:
        """Title, what was typed, and the options left."""
        narrowed = f"  containing {self._typed!r}" if self._typed else "  type to narrow" if self._narrows else ""
        rows: list[Line] = [line(Span(f" {text}", "title")) for text in wrap(self._title, width - 2)]
        rows = [*rows[:-1], line(*rows[-1], Span(literal(narrowed), "faint")), BLANK]
        head = len(rows)
        size = max((cells(each.name) for each in self._options), default=0)
        for index, each in enumerate(self._left):
            option = option_rows(each, min(size, width - 20), index == self._row, width)
            if index == self._row:
                self.reveal(len(rows) + len(option) - 1)
                self.reveal(len(rows))
            rows += option
        return (
            rows
            if len(rows) > head
            else [*rows, line(" ", Span("Nothing has that in it; Backspace widens the list.", "faint"))]
        )

    def take_key(self, event: events.Key) -> bool:
        """Typing narrows the list, where it may."""
        if not self._narrows:
            return event.is_printable
        if event.is_printable and event.character:
            self._typed += event.character
        elif event.key == "backspace":
            self._typed = self._typed[:-1]
        else:
            return False
        self._row = 0
        self.redraw()
        return True

    def _move(self, row: int) -> None:
        self._row = max(0, min(row, len(self._left) - 1))
        self.redraw()

    def action_up(self) -> None:
        """The option above."""
        self._move(self._row - 1)

    def action_down(self) -> None:
        """The option below."""
        self._move(self._row + 1)

    def action_leaf(self, leaves: int) -> None:
        """A screenful of options on."""
        self._move(self._row + leaves * (self.room.height - 3))

    def action_top(self) -> None:
        """The first option."""
        self._move(0)

    def action_bottom(self) -> None:
        """The last option."""
        self._move(len(self._options))

    def action_take(self) -> None:
        """Close the list and hand over."""
        left = self._left
        if left:
            self.fertui.close_page()
            self._then(left[self._row].value or left[self._row].name)


def option_rows(option: Option, size: int, chosen: bool, width: int) -> list[Line]:
    """Key, name and meaning, in as many lines as the meaning needs, the chosen one as a bar with a mark."""
    head = line(Span(fit(option.key, 6), "accent"), Span(fit(literal(option.name), size), "strong"), "  ")
    first, *more = wrap(literal(option.about), width - width_of(head) - 3)
    rows = [line("▸ " if chosen else "  ", *head, first), *(line(" " * (width_of(head) + 2), text) for text in more)]
    return [barred(row, width) for row in rows] if chosen else rows
