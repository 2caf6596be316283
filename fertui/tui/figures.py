"""Numbers as people read them: no more digits than they deserve, never without their range where one is known."""

from __future__ import annotations

import re
from datetime import datetime, timedelta
from typing import TYPE_CHECKING

from fertui.estimate.signs import SIGNS

if TYPE_CHECKING:
    from fertui.estimate.points import Band, Estimated

OUT, LEAVING, INSIDE = "act", "watch", "good"
MARKS = {**SIGNS, "good": "✓", "faint": SIGNS["note"]}
"""The sign that goes with each ink of a state, so that the state is never colour alone."""

CAUTION_INKS = {"danger": "act", "warning": "watch", "note": "faint"}
"""The ink of a caution by its severity in the catalogue."""

def digits_for(spread: float, unit: str = "") -> int:
    """Decimals a number deserves whose range is this wide: the last one shown still means something.

    >>> digits_for(1.2), digits_for(0.04), digits_for(40), digits_for(4, "%")
    (1, 2, 0, 0)
    """
    if spread <= 0:
        return 0 if unit == "%" else 1
    return 0 if spread >= (1 if unit == "%" else 10) else 1 if spread >= 0.2 else 2


def number(value: float | None, decimals: int = 1) -> str:
    """A number with so many decimals, '-' where there is none.

    >>> number(-0.04), number(None), number(12345.6, 0)
    ('0.0', '-', '12346')
    """
    if value is None:
        return "-"
    text = f"{value:.{decimals}f}"
    return text.lstrip("-") if float(text) == 0 else text


def unit_and_species(label: str, ion: str) -> tuple[str, str]:
    """Unit and species of a label such as ``mg/L NO3-N``; the ion itself where the label names none.

    >>> unit_and_species("mg/L NO3-N", "NO3"), unit_and_species("meq/L", "HCO3")
    (('mg/L', 'NO3-N'), ('meq/L', 'HCO3'))
    """
    unit, _, species = label.partition(" ")
    return unit, species or ion


def amount(value: float | None) -> str:
    """A number with two or three significant digits, at most two decimals from 0.1 on and three below it.

    >>> amount(1234.5), amount(12.34), amount(0.39), amount(0.1), amount(0.0123)
    ('1234', '12.3', '0.39', '0.10', '0.012')
    """
    if value is None:
        return "-"
    size = abs(value)
    decimals = 0 if size >= 100 else 1 if size >= 10 else 2 if size >= 0.1 else 3
    return number(value, decimals)


def estimated(value: Estimated, unit: str = "") -> tuple[str, str]:
    """The value and its 80 % range as texts."""
    places = digits_for(value.high - value.low, unit)
    return number(value.value, places), span(value.low, value.high, places)


def span(low: float, high: float, decimals: int = 1) -> str:
    """A range.

    >>> span(4.0, 5.2), span(-0.2, 0.3)
    ('4.0-5.2', '-0.2 to 0.3')
    """
    between = " to " if low < 0 or high < 0 else "-"
    return f"{number(low, decimals)}{between}{number(high, decimals)}"


def band_words(band: Band | None, decimals: int = 0) -> str:
    """A band, one side possibly open.

    >>> band_words((18.0, 28.0)), band_words((None, 8.0))
    ('18-28', 'up to 8')
    """
    if band is None or band == (None, None):
        return ""
    low, high = band
    if low is None:
        return f"up to {_plain(high or 0.0, decimals)}"
    if high is None:
        return f"from {_plain(low, decimals)}"
    return f"{_plain(low, decimals)}-{_plain(high, decimals)}"


def _plain(value: float, decimals: int) -> str:
    return f"{value:.{decimals}f}" if decimals else f"{value:g}"


def standing(value: Estimated) -> str:
    """The ink of a value against its band: out, its range reaching out, inside; '' where there is no band."""
    if value.band is None or value.band == (None, None):
        return ""
    low, high = value.band
    if (low is not None and value.value < low) or (high is not None and value.value > high):
        return OUT
    if (low is not None and value.low < low) or (high is not None and value.high > high):
        return LEAVING
    return INSIDE


def age(moment: datetime, now: datetime) -> str:
    """How long ago, in words.

    >>> from datetime import UTC
    >>> age(datetime(2026, 6, 1, tzinfo=UTC), datetime(2026, 6, 3, 15, tzinfo=UTC))
    '2 days'
    """
    passed = now - moment
    if passed < timedelta(hours=1):
        return "under 1 h"
    if passed < timedelta(hours=48):
        return f"{passed / timedelta(hours=1):.0f} h"
    return f"{passed.days} days"


def short_leaving(words: str) -> str:
    """When a value leaves its band, in the room of a gauge row.

    >>> short_leaving("in 6 (0-over 14) days"), short_leaving("in 4 (2-9) days")
    ('in 6 (0-14+) days', 'in 4 (2-9) days')
    """
    return re.sub(r"over (\d+)\)", r"\1+)", words)
