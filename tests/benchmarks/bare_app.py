"""The least a program with this toolkit can be at 80x24: a line above, a list of lines with a bar moved by the arrows,
a line below. What the terminal interface is measured against."""

from __future__ import annotations

from typing import Any, ClassVar

from textual.app import App, ComposeResult
from textual.widgets import Static

ROWS = 21


class BareApp(App[None]):
    """Three widgets, two keys."""

    CSS = "#body { height: 1fr; }"
    ENABLE_COMMAND_PALETTE = False
    BINDINGS: ClassVar[list[Any]] = [("down", "move(1)", "down"), ("up", "move(-1)", "up")]

    def __init__(self) -> None:
        super().__init__()
        self.row = 0

    def compose(self) -> ComposeResult:
        """Header, body, footer."""
        yield Static("bare app", id="head")
        yield Static(self.text(), id="body", markup=False)
        yield Static("keys", id="keys")

    def text(self) -> str:
        """All rows, the one under the bar marked."""
        return "\n".join(f"{'>' if row == self.row else ' '} row {row} of the bare app" for row in range(ROWS))

    def action_move(self, step: int) -> None:
        """Move the bar."""
        self.row = (self.row + step) % ROWS
        self.query_one("#body", Static).update(self.text())


if __name__ == "__main__":
    BareApp().run(mouse=False)
