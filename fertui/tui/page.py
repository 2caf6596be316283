"""A widget that shows lines and sends only what changed in them."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, ClassVar, cast

from rich.segment import Segment
from rich.style import Style
from textual import events
from textual.geometry import Region, Size
from textual.strip import Strip
from textual.widget import Widget

from fertui.tui.ink import BLANK, INKS, Line, cells, filled

if TYPE_CHECKING:
    from fertui.tui.frame import FertuiApp


class Page(Widget):
    """Rows of lines. ``show`` compares with what stands there and refreshes the changed columns alone."""

    COMPONENT_CLASSES: ClassVar[set[str]] = {f"ink--{ink}" for ink in INKS}

    def __init__(self) -> None:
        super().__init__()
        self._rows: list[Line] = []

    @property
    def fertui(self) -> FertuiApp:
        """The app, by its own type."""
        return cast("FertuiApp", self.app)

    def show(self, rows: Sequence[Line]) -> None:
        """Put these lines in place of the ones shown, each filled to the width of the widget."""
        shown, fresh = self._rows, self.place(rows, self.size)
        if len(shown) != len(fresh):
            self.refresh()
            return
        changed = [_changed(y, old, new) for y, (old, new) in enumerate(zip(shown, fresh, strict=True)) if old != new]
        if changed:
            self.refresh(*changed)

    def place(self, rows: Sequence[Line], size: Size) -> list[Line]:
        """Set the lines for a size without asking for a repaint: before the first one, which then shows them."""
        self._rows = [filled(row, size.width) for row in (*rows[: size.height], *[BLANK] * (size.height - len(rows)))]
        return self._rows

    def redraw(self) -> None:
        """Draw for the size there is now; a part of the frame has that done for all of them."""
        self.fertui.draw_frame()

    def on_resize(self, _: events.Resize) -> None:
        """A new size: draw for it."""
        self.redraw()

    def take_key(self, event: events.Key) -> bool:
        """Whether a key was typed into the page; if not, it is looked up among the bindings."""
        return False

    def render_line(self, y: int) -> Strip:
        """One row as the toolkit wants it."""
        row = self._rows[y] if y < len(self._rows) else BLANK
        plain = self._ink("plain")
        segments = [Segment(self.fertui.terminal.text(span.text), self._ink(span.ink)) for span in row]
        return Strip(segments).adjust_cell_length(self.size.width, plain)

    def _ink(self, ink: str) -> Style:
        return self.get_component_rich_style(f"ink--{ink}")


def _changed(y: int, old: Line, new: Line) -> Region:
    """The columns of a row between the first and the last difference."""
    old_cells, new_cells = _spread(old), _spread(new)
    if len(old_cells) != len(new_cells):
        return Region(0, y, max(len(old_cells), len(new_cells)), 1)
    different = [x for x, (a, b) in enumerate(zip(old_cells, new_cells, strict=True)) if a != b]
    return Region(different[0], y, different[-1] - different[0] + 1, 1) if different else Region(0, y, 1, 1)


def _spread(row: Line) -> list[tuple[str, str]]:
    """One (character, ink) a column; a wide character stands in its first column, '' in its second."""
    columns: list[tuple[str, str]] = []
    for span in row:
        for character in span.text:
            width = cells(character)
            if width == 0 and columns:
                columns[-1] = (columns[-1][0] + character, span.ink)
            elif width:
                columns += [(character, span.ink), *[("", span.ink)] * (width - 1)]
    return columns
