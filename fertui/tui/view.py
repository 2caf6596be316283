"""What all views have in common: they draw lines from the snapshot, scroll, and say what they need worked out."""

from __future__ import annotations

from typing import Any, ClassVar

from textual.binding import Binding
from textual.geometry import Size

from fertui.tui.ink import Line, Span, line, wrap
from fertui.tui.page import Page
from fertui.tui.snapshot import Ask, Snapshot
from fertui.tui.terminal import FLOOR

SCROLLING = [
    Binding("up", "up", "up", show=False, id="page.up", tooltip="One line up, or the row above."),
    Binding("down", "down", "down", show=False, id="page.down", tooltip="One line down, or the row below."),
    Binding("pageup", "leaf(-1)", "page up", show=False, id="page.pageup", tooltip="A screenful up."),
    Binding("pagedown,space", "leaf(1)", "page down", show=False, id="page.pagedown", tooltip="A screenful down."),
    Binding("home", "top", "top", show=False, id="page.top", tooltip="To the first line."),
    Binding("end", "bottom", "bottom", show=False, id="page.bottom", tooltip="To the last line."),
]


class View(Page, can_focus=True):
    """A scrolling page. A subclass draws; ``HELP`` says in plain words what it is for."""

    BINDINGS: ClassVar[list[Any]] = SCROLLING
    TITLE: ClassVar[str] = ""
    HELP: ClassVar[str] = ""

    def __init__(self) -> None:
        super().__init__()
        self._top = 0
        self._total = 0

    def asks(self, snapshot: Snapshot) -> tuple[Ask, ...]:
        """What the view needs worked out, most urgent first."""
        return ()

    def draw(self, snapshot: Snapshot, width: int) -> list[Line]:
        """All lines of the view for this width."""
        raise NotImplementedError

    @property
    def room(self) -> Size:
        """Columns and rows there are for the view: those of the stage while it is not laid out, for keys typed
        ahead."""
        return self.size or self.fertui.stage_size

    @property
    def below(self) -> int:
        """Lines below the last one shown."""
        return max(0, self._total - self._top - self.size.height)

    def redraw(self) -> None:
        """Draw again and send what changed."""
        if self.size.height:
            self.show(self._visible(self.size))
            self.fertui.update_keys()

    def prepare(self, snapshot: Snapshot, size: Size) -> None:
        """Have the lines ready for the first paint."""
        self.place(self._visible(size, snapshot), size)

    def _visible(self, size: Size, snapshot: Snapshot | None = None) -> list[Line]:
        if self.fertui.too_small:
            lines = [line(f" fertui needs {FLOOR[0]} columns and {FLOOR[1]} rows."), line(" Make the window larger.")]
        else:
            lines = self.draw(snapshot or self.fertui.snapshot, size.width)
        self._total = len(lines)
        self._top = max(0, min(self._top, self._total - size.height))
        return lines[self._top : self._top + size.height]

    def offers(self, action: str) -> bool:
        """Whether a key of the page can do something now: the bottom line names only those."""
        return True

    def keep(self) -> bool:
        """Keep what must not be lost when the program ends; False where that failed. Most pages have nothing."""
        return True

    def reveal(self, row: int) -> None:
        """Scroll just so far that a line is in sight."""
        if row < self._top:
            self._top = row
        elif row >= self._top + self.room.height:
            self._top = row - self.room.height + 1

    def action_close(self) -> None:
        """Back to what was open before."""
        self.fertui.close_page()

    def _scroll(self, top: int) -> None:
        before, height = self._top, self.room.height
        self._top = max(0, min(top, self._total - height))
        moved = self._top - before
        if 0 < abs(moved) < height // 2:
            self.fertui.roll(self.region, moved)
        self.redraw()

    def action_up(self) -> None:
        """One line up."""
        self._scroll(self._top - 1)

    def action_down(self) -> None:
        """One line down."""
        self._scroll(self._top + 1)

    def action_leaf(self, leaves: int) -> None:
        """Screenfuls up or down."""
        self._scroll(self._top + leaves * (self.room.height - 1))

    def action_top(self) -> None:
        """To the first line."""
        self._scroll(0)

    def action_bottom(self) -> None:
        """To the last line."""
        self._scroll(self._total)


def waiting(snapshot: Snapshot, ask: Ask, what: str, width: int) -> list[Line]:
    """What stands in place of an answer: that it is being worked out, or the sentence why it cannot be had."""
    trouble = snapshot.trouble(ask)
    if trouble:
        return [
            line(),
            *(
                line(" ", Span("! " if i == 0 else "  ", "watch"), text)
                for i, text in enumerate(wrap(trouble, width - 4))
            ),
        ]
    return [line(), line(" ", Span(f"Working out {what}.", "faint"))]
