"""Small pictures in one or more lines of text: a gauge against its band, a course of days, a chart with a cursor."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from fertui.tui.ink import Line, Span, line

if TYPE_CHECKING:
    from fertui.estimate.points import Band, Estimated

BARS = "▁▂▃▄▅▆▇█"
IN_BAND = 0.4
"""Part of a gauge that the band takes: it stands in the middle of every gauge, so that all read alike."""


def gauge(value: Estimated, width: int, ink: str) -> Line:
    """A value and its range against its band: the band is the shaded middle, the value a dot, the range a line.

    What lies beyond either end shows as an arrow head there.
    """
    if value.band is None or value.band == (None, None):
        return line(Span(" " * width))
    low_edge, high_edge = _scale(value.band)
    first, last = round((width - 1) * (1 - IN_BAND) / 2), round((width - 1) * (1 + IN_BAND) / 2)
    open_low, open_high = value.band[0] is None, value.band[1] is None

    def column(number: float) -> int:
        position = first + (number - low_edge) / (high_edge - low_edge) * (last - first)
        return max(0, min(width - 1, round(position)))

    cells: list[tuple[str, str]] = []
    for x in range(width):
        inside = (open_low or x >= first) and (open_high or x <= last)
        cells.append(("░", "band") if inside else ("·", "faint"))
    left, right, middle = column(value.low), column(value.high), column(value.value)
    for x in range(left, right + 1):
        cells[x] = ("─", ink)
    cells[middle] = ("●", ink)
    return _spans(_with_heads(cells, value, low_edge, high_edge, middle, ink))


def _with_heads(
    cells: list[tuple[str, str]], value: Estimated, low_edge: float, high_edge: float, middle: int, ink: str
) -> list[tuple[str, str]]:
    """Arrow heads where the value lies beyond the gauge."""
    reach = (high_edge - low_edge) * (1 - IN_BAND) / (2 * IN_BAND)
    if middle == 0 and value.value < low_edge - reach:
        cells[0] = ("◀", ink)
    if middle == len(cells) - 1 and value.value > high_edge + reach:
        cells[-1] = ("▶", ink)
    return cells


def _scale(band: Band) -> tuple[float, float]:
    """What the edges of the shaded part stand for; an open side is drawn to zero or to as much again."""
    low, high = band
    if low is None and high is not None:
        return 0.0, high or 1.0
    if high is None and low is not None:
        return low, low * 2 or 1.0
    low, high = low or 0.0, high or 0.0
    return (low, high) if high > low else (low, low + 1.0)


def _spans(cells: Sequence[tuple[str, str]]) -> Line:
    return line(*(Span(character, ink) for character, ink in cells))


def course(values: Sequence[float], today_index: int, width: int) -> Line:
    """A course of days in bars, the days ahead in another ink than those past.

    Bars span the lowest to the highest value; a course that hardly moves stays flat.
    """
    if not values:
        return line(" " * width)
    picked = [values[index] for index in _evenly(len(values), width)]
    split = sum(1 for index in _evenly(len(values), width) if index <= today_index)
    low, high = min(picked), max(picked)
    reach = max(high - low, 0.1 * abs(high), 1e-9)
    middle = (low + high) / 2
    bars = "".join(BARS[round(max(0.0, min(1.0, 0.5 + (v - middle) / reach)) * (len(BARS) - 1))] for v in picked)
    return line(Span(bars[:split], "plain"), Span(bars[split:], "accent"), " " * (width - len(bars)))


def _evenly(count: int, width: int) -> list[int]:
    if count <= width:
        return list(range(count))
    return [round(i * (count - 1) / (width - 1)) for i in range(width)]
