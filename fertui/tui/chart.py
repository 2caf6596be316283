"""A chart of one quantity over days: band, range, estimate, measurements, marks of what was done, and a cursor."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from datetime import datetime, timedelta
from typing import NamedTuple

from fertui.tui.figures import digits_for, number
from fertui.tui.ink import Line, Span, fit, line

AXIS = 7
"""Columns of the numbers left of a chart."""
MARK_LETTERS = {
    "analysis": "A", "dose": "D", "batch": "B", "recipe": "R", "setpoint": "S", "bleed": "L", "acid": "H", "crop": "C",
    "disinfection": "X", "sample": "P",
}  # fmt: skip
"""Letters of what was done, under the chart: L is a bleed (let go), H is acid."""


class Curve(NamedTuple):
    """What a chart draws: days with value, low and high; what was measured; a band; letters at times."""

    unit: str
    times: tuple[datetime, ...]
    values: tuple[tuple[float, float, float], ...]
    measured: tuple[tuple[datetime, float], ...] = ()
    band: tuple[float | None, float | None] = (None, None)
    marks: tuple[tuple[datetime, str], ...] = ()
    other: tuple[float, ...] = ()
    start: datetime | None = None
    end: datetime | None = None
    now: datetime | None = None

    @property
    def span(self) -> tuple[datetime, datetime]:
        """First and last moment of the axis."""
        every = [*self.times, *(at for at, _ in self.measured)]
        start, end = self.start or min(every), self.end or max(every)
        return start, max(end, start + timedelta(days=1))


def draw_chart(curve: Curve, cursor: float, width: int, height: int) -> list[Line]:
    """The chart in ``height`` lines: plot, marks, axis with the cursor at a fraction 0..1 of its length, dates."""
    plot_width, plot_height = width - AXIS - 2, height - 3
    low, high = _reach(curve)
    cells = [[(" ", "plain")] * plot_width for _ in range(plot_height)]
    _draw_band(cells, curve, low, high)
    _draw_values(cells, curve, low, high)
    _draw_measured(cells, curve, low, high)
    labels = _labels(low, high, plot_height)
    rows = [
        line(Span(fit(labels[y], AXIS, right=True) + " ", "faint"), *(Span(c, ink) for c, ink in cells[y]))
        for y in range(plot_height)
    ]
    return [*rows, _marks(curve, plot_width), _axis(cursor, plot_width), _dates(curve, plot_width)]


def column_of(moment: datetime, curve: Curve, width: int) -> int:
    """The column of a moment on the axis."""
    start, end = curve.span
    return max(0, min(width - 1, round((moment - start) / (end - start) * (width - 1))))


def _reach(curve: Curve) -> tuple[float, float]:
    """The axis: everything drawn and the band, with some room."""
    every = (
        [number for three in curve.values for number in three]
        + [value for _, value in curve.measured]
        + list(curve.other)
    )
    every += [edge for edge in curve.band if edge is not None]
    low, high = min(every), max(every)
    room = max((high - low) * 0.06, abs(high) * 0.01, 1e-6)
    return max(0.0, low - room) if low >= 0 else low - room, high + room


def _row_of(value: float, low: float, high: float, height: int) -> int:
    return max(0, min(height - 1, round((high - value) / (high - low) * (height - 1))))


def _draw_band(cells: list[list[tuple[str, str]]], curve: Curve, low: float, high: float) -> None:
    height = len(cells)
    for edge in curve.band:
        if edge is not None:
            y = _row_of(edge, low, high, height)
            cells[y] = [("╌", "band")] * len(cells[y])


def _draw_values(cells: list[list[tuple[str, str]]], curve: Curve, low: float, high: float) -> None:
    """The range as a shade in every column, the estimate as a dot, a second course as a cross."""
    width, height = len(cells[0]), len(cells)
    for x, index in _columns(curve, width):
        value, below, above = curve.values[index]
        for y in range(_row_of(above, low, high, height), _row_of(below, low, high, height) + 1):
            cells[y][x] = ("░", "faint")
        ahead = curve.now is not None and curve.times[index] > curve.now
        cells[_row_of(value, low, high, height)][x] = ("•", "accent" if ahead else "plain")
        if curve.other:
            cells[_row_of(curve.other[index], low, high, height)][x] = ("+", "watch")


def _columns(curve: Curve, width: int) -> Iterable[tuple[int, int]]:
    """For every column between the first and the last day, the day nearest to it."""
    if not curve.times:
        return
    columns = [column_of(at, curve, width) for at in curve.times]
    for x in range(columns[0], columns[-1] + 1):
        yield x, min(range(len(columns)), key=lambda index: abs(columns[index] - x))


def _draw_measured(cells: list[list[tuple[str, str]]], curve: Curve, low: float, high: float) -> None:
    width, height = len(cells[0]), len(cells)
    for at, value in curve.measured:
        cells[_row_of(value, low, high, height)][column_of(at, curve, width)] = ("◆", "strong")


def _labels(low: float, high: float, height: int) -> list[str]:
    digits = digits_for(high - low) + 1 if high - low < 20 else 0
    marked = {0, height - 1, (height - 1) // 2}
    return [
        number(high - (high - low) * y / (height - 1), min(digits, 2)) if y in marked else "" for y in range(height)
    ]


def _marks(curve: Curve, width: int) -> Line:
    row = [" "] * width
    for at, letter in curve.marks:
        x = column_of(at, curve, width)
        row[x] = letter if row[x] in (" ", letter) else "*"
    return line(Span(fit("done", AXIS, right=True) + " ", "faint"), Span("".join(row), "accent"))


def _axis(cursor: float, width: int) -> Line:
    x = round(cursor * (width - 1))
    return line(" " * (AXIS + 1), Span("─" * x, "faint"), Span("▲", "strong"), Span("─" * (width - 1 - x), "faint"))


def _dates(curve: Curve, width: int) -> Line:
    start, end = curve.span
    middle = start + (end - start) / 2
    texts = [f"{moment:%-d %b}" for moment in (start, middle, end)]
    gap = width - sum(map(len, texts))
    return line(
        " " * (AXIS + 1), Span(texts[0] + " " * (gap // 2) + texts[1] + " " * (gap - gap // 2) + texts[2], "faint")
    )


def nearest(times: Sequence[datetime], moment: datetime) -> int:
    """The index of the time nearest to a moment."""
    return min(range(len(times)), key=lambda index: abs(times[index] - moment))
