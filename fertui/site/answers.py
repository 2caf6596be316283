"""Answers to the questions of a new site, read: each is refused by quoting it and saying what is allowed."""

from __future__ import annotations

import re
from collections.abc import Callable

from fertui.quantities import QuantityError, read
from fertui.quantities.numbers import split
from fertui.site.checks import SiteError, name_trouble, nearest, plain, shortened
from fertui.site.new import supply_from
from fertui.site.reading import timezone_trouble

UNKNOWN = ("", "?", "-", "unknown", "do not know", "don't know", "i do not know", "i don't know")
"""Answers that mean "I do not know"."""

BETWEEN_SUPPLIES = re.compile(r"[;\n]|,(?!\d+\s*(?:%|[,;]|$))")
"""A comma or semicolon, unless it is the decimal comma of a strength: nitric acid 59,5 %."""


def amount(what: str, low: float, high: float, unit: str) -> Callable[[str], float]:
    """Reads a number within a range, in any unit that ``quantities`` has for it; ``unit``: as a refusal names it."""
    allowed = f"a number from {plain(low)} to {plain(high)} {unit} is allowed."

    def read_amount(text: str) -> float:
        try:
            split(text)
        except QuantityError as trouble:
            raise SiteError(f"{trouble.wrong}: {allowed}") from trouble
        number = read(text, what).number
        if not low <= number <= high:
            raise SiteError(f"{text[:60]!r}: {allowed}")
        return number

    return read_amount


def one_of(allowed: tuple[str, ...], text: str) -> str:
    """The one of ``allowed`` that is meant; case does not matter, nor a space for a hyphen."""
    wanted = text.strip().lower().replace(" ", "-")
    if wanted not in allowed:
        raise SiteError(f"{text[:60]!r} is not one of {', '.join(allowed)}{nearest(wanted, allowed)}.")
    return wanted


def name(text: str) -> str:
    """A name people choose."""
    if why := name_trouble(text):
        raise SiteError(f"{shortened(text)}: {why}")
    return text


def timezone(text: str) -> str:
    """A time zone by name."""
    if why := timezone_trouble(text):
        raise SiteError(f"{shortened(text)}: {why}")
    return text


def supplies(text: str) -> tuple[str, ...]:
    """Names of supplies, each once, from a list with commas or semicolons between."""
    names = (each.strip() for each in BETWEEN_SUPPLIES.split(text))
    return tuple(dict.fromkeys(supply_from(each).name for each in names if each))
