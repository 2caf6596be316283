"""The record: what past forecasts said, and what the laboratory then found."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, ClassVar

from textual.binding import Binding

from fertui.site.points import point_name
from fertui.tui.figures import MARKS, number
from fertui.tui.ink import BLANK, Line, Span, col, line, literal, wrap
from fertui.tui.snapshot import Ask, Snapshot
from fertui.tui.view import SCROLLING, View, waiting

if TYPE_CHECKING:
    from fertui.estimate.hindcast import Hindcast, HindcastRow


class RecordPage(View):
    """What past forecasts said, and what was then found."""

    TITLE = "Record"
    HELP = (
        "Each line is an analysis: what the forecast issued right after the one before had said, what the "
        "laboratory found, and what "
        "'no change' would have said. ✓ means found within the 80 % range; about eight in ten should be. "
        "i changes between the inputs as logged later and as they were planned when the forecast was made."
    )
    BINDINGS: ClassVar[list[Any]] = [
        *SCROLLING,
        Binding(
            "i", "inputs", "inputs", id="record.inputs", tooltip="Inputs as logged, or as planned when it was issued."
        ),
        Binding("escape,g", "close", "back", id="record.close", tooltip="Back to the forecast."),
    ]

    def __init__(self) -> None:
        super().__init__()
        self.inputs = "logged"

    def _ask(self, snapshot: Snapshot) -> Ask:
        return Ask("hindcast", snapshot.loop, (("inputs", self.inputs),))

    def asks(self, snapshot: Snapshot) -> tuple[Ask, ...]:
        """The record."""
        return (self._ask(snapshot),)

    def draw(self, snapshot: Snapshot, width: int) -> list[Line]:
        """Summary in words, then shares of K, Ca and Mg one analysis a line."""
        record: Hindcast | None = snapshot.get(self._ask(snapshot))
        if record is None:
            return waiting(snapshot, self._ask(snapshot), "the record", width)
        rows = [line(Span(f" The record, with inputs as {self.inputs}", "title"))]
        rows += [line(" ", text) for text in wrap(literal(record.summary.words), width - 2)]
        heads = (("found", 9), ("said", 8), ("80 % range", 14), ("no change", 11))
        rows += [BLANK, line(col("", 34), *(col(head, size, "faint") for head, size in heads))]
        judged = [row for row in record.rows if row.measured_share_pct is not None]
        rows += [_record_row(row) for row in judged]
        return (
            rows
            if judged
            else [*rows, line(" ", Span("Nothing to judge yet: it takes two analyses of the same point.", "faint"))]
        )

    def action_inputs(self) -> None:
        """The other inputs."""
        self.inputs = "planned" if self.inputs == "logged" else "logged"
        self.redraw()
        self.fertui.work_out()


def _record_row(row: HindcastRow) -> Line:
    """One share at one analysis: found, said with its range, what 'no change' would have said."""
    low, high, found = row.low_share_pct or 0.0, row.high_share_pct or 0.0, row.measured_share_pct or 0.0
    ink = "good" if low <= found <= high else "watch"
    words = " first" if row.cold_start else " doubtful" if row.doubtful else ""
    label = f" {row.at:%a %-d %b} {point_name(row.point)}, {row.ion} share, %"
    return line(
        col(label, 34, right=False), col(number(found), 9, "strong"), col(number(row.predicted_share_pct), 8),
        col(f"({number(low)}-{number(high)})", 14, "faint"), col(number(row.no_change_share_pct), 11, "faint"),
        Span(f"  {MARKS[ink]}{words}", ink),
    )  # fmt: skip
