"""A notice, and the few words and digits all rules share."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from typing import TYPE_CHECKING, NamedTuple

from fertui.estimate.points import Band, Estimated

if TYPE_CHECKING:
    from fertui.estimate.notices.look import Look

SEVERITIES = ("act", "watch", "note")
ACT, WATCH, NOTE = SEVERITIES

ACT_FROM, WATCH_FROM = 0.6, 0.35
"""Probabilities of being out that make an alarm (chosen on measured houses; finer rules did no better there)."""

KEYS = ("r", "a", "w", "d", "m", "p", *"123456789")
"""Entry keys and views a notice may point to."""

NORMAL_10 = 1.2815515655446004
"""Standard deviations from the median to the 10 % and 90 % quantiles of a normal distribution."""


class Notice(NamedTuple):
    """One thing to look at: ``severity`` act, watch or note; ``key`` of the form or view where it is acted upon."""

    code: str
    severity: str
    text: str
    key: str


Rule = Callable[["Look"], Iterator[Notice]]
"""Looks at one thing and says so where it is not as it should be."""


def severity_of(probability: float, out: bool) -> str:
    """The severity of being out with a probability, or already; '' where nothing needs saying.

    >>> severity_of(0.4, False), severity_of(0.4, True), severity_of(0.2, False)
    ('watch', 'act', '')
    """
    if out or probability >= ACT_FROM:
        return ACT
    return WATCH if probability >= WATCH_FROM else ""


def is_out(known: Estimated, band: Band) -> bool:
    """Whether the value itself lies outside a band."""
    low, high = band
    return (low is not None and known.value < low) or (high is not None and known.value > high)


def chance_out(known: Estimated, band: Band) -> float:
    """Probability of being outside a band now, each side of the 80 % range taken as half a normal distribution.

    >>> round(chance_out(Estimated(5.0, 4.0, 6.0), (4.0, None)), 2)
    0.1
    """
    low, high = band
    below = 0.0 if low is None else _chance_beyond(known, known.value - low, from_below=True)
    above = 0.0 if high is None else _chance_beyond(known, high - known.value, from_below=False)
    return min(below + above, 1.0)


def _chance_beyond(known: Estimated, room: float, from_below: bool) -> float:
    """Probability of lying more than ``room`` below (or above) the median."""
    towards_low = from_below == (room > 0)
    width = (known.value - known.low if towards_low else known.high - known.value) / NORMAL_10
    if width <= 0:
        return float(room < 0)
    return 0.5 * math.erfc(room / width / math.sqrt(2.0))


def plain(value: float) -> str:
    """A number with the two digits that mean something.

    >>> plain(171.6), plain(11.7), plain(8.02), plain(0.213)
    ('172', '12', '8.0', '0.21')
    """
    size = abs(value)
    return f"{value:.{0 if size >= 9.95 else 1 if size >= 0.995 else 2}f}"


def ranged(known: Estimated, unit: str) -> str:
    """A value with its unit and 80 % range.

    >>> ranged(Estimated(12.1, 7.2, 17.1), "%"), ranged(Estimated(4.6, 4.0, 5.2), "mmol/L")
    ('12 % (7-17)', '4.6 mmol/L (4.0-5.2)')
    """
    digits = (lambda value: f"{value:.0f}") if unit == "%" else plain
    return f"{digits(known.value)} {unit} ({digits(known.low)}-{digits(known.high)})".replace("  ", " ")


def allowed(band: Band, unit: str) -> str:
    """A band in words.

    >>> allowed((18, 28), "%"), allowed((None, 8.0), "mmol/L"), allowed((0.5, None), "mmol/L")
    ('band 18-28 %', 'limit 8 mmol/L', 'at least 0.5 mmol/L')
    """
    low, high = band
    if low is None:
        return f"limit {high:g} {unit}".rstrip()
    if high is None:
        return f"at least {low:g} {unit}".rstrip()
    return f"band {low:g}-{high:g} {unit}".rstrip()
