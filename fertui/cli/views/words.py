"""Numbers, ranges, times and tables as an operator reads them: no more digits than they deserve."""

from __future__ import annotations

from datetime import datetime
from zoneinfo import ZoneInfo

from fertui.estimate.points import Band, Estimated
from fertui.workbench.units import shown

ABSENT = "-"


def factor(ion: str, unit: str) -> float:
    """What a concentration in mmol/L is multiplied by to be shown in ``unit``.

    >>> factor("Ca", "meq/L")
    2.0
    """
    return shown(ion, 1.0, unit)[0]


def label(ion: str, unit: str) -> str:
    """The name an ion goes by in ``unit``: mg/L are of N, P and S.

    >>> label("NO3", "mg/L"), label("NO3", "mmol/L")
    ('NO3-N', 'NO3')
    """
    species = shown(ion, 1.0, unit)[1].partition(" ")[2]
    return species or ion


def number(value: float | None, digits: int | None = None) -> str:
    """A number with one to three digits that mean something.

    >>> number(4.56), number(0.213), number(123.4), number(None)
    ('4.6', '0.21', '123', '-')
    """
    if value is None:
        return ABSENT
    if digits is None:
        size = abs(value)
        digits = 0 if size >= 100 else 1 if size >= 1 else 2
    written = f"{value:.{digits}f}"
    return written.removeprefix("-") if float(written) == 0 else written


def ranged(value: Estimated, scale: float = 1.0, unit: str = "") -> str:
    """A value with its 80 % range; shares in whole per cent.

    >>> ranged(Estimated(4.6, 4.0, 5.2)), ranged(Estimated(12.1, 7.2, 17.1), unit="%")
    ('4.6 (4.0-5.2)', '12 (7-17)')
    """
    digits = 0 if unit == "%" else None
    middle, low, high = (number(each * scale, digits) for each in (value.value, value.low, value.high))
    return middle if low == high else f"{middle} ({low}-{high})"


def band(limits: Band | None, scale: float = 1.0) -> str:
    """A band in words.

    >>> band((18, 28)), band((None, 8)), band(None)
    ('18-28', 'up to 8.0', '')
    """
    if limits is None:
        return ""
    low, high = limits
    if low is None:
        return "" if high is None else f"up to {number(high * scale)}"
    if high is None:
        return f"from {number(low * scale)}"
    digits = 0 if float(low * scale).is_integer() and float(high * scale).is_integer() else None
    return f"{number(low * scale, digits)}-{number(high * scale, digits)}"


def local(at: datetime, timezone: str) -> str:
    """A time on the clock of the site."""
    return f"{at.astimezone(ZoneInfo(timezone)):%a %d %b %Y %H:%M}"


def age(at: datetime, now: datetime) -> str:
    """How old something is, in words."""
    hours = (now - at).total_seconds() / 3600
    return f"{hours:.0f} h old" if hours < 72 else f"{hours / 24:.0f} days old"
