"""Numbers as people write them: decimal point or comma, "<0,1" for below detection; nothing guessed."""

from __future__ import annotations

import re
import unicodedata
from typing import NamedTuple

from fertui.quantities.refusal import QuantityError, quoted

LONGEST = 60
"""Characters in a value with its unit and species; nobody writes more, so more is a slip or a wrong file."""

LARGEST = 1e12

_POWER = re.compile(r"\s*<?\s*[+-]?[\d.,]+[\u2070\u00b9\u00b2\u00b3\u2074-\u207b]")

_NUMBER = re.compile(r"(<?)\s*([+-]?(?:\d[\d.,']*|[.,]\d+)(?:e[+-]?\d+)?)(.*)", re.IGNORECASE | re.DOTALL | re.ASCII)
_PLAIN = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:e[+-]?\d+)?", re.IGNORECASE | re.ASCII)
_GROUPED_BY_COMMA = re.compile(r"[+-]?[1-9]\d{0,2}(?:,\d{3})+(?:\.\d*)?")
_GROUPED_BY_SPACE = re.compile(r"\s+\d{3}(?!\d|\s*\^)")
_ALLOWED = "digits with at most one . or , as decimal mark; '<' in front for below detection"


class Number(NamedTuple):
    """A number as written; ``below``: written with '<', so the value is the limit of detection."""

    value: float
    below: bool


def parse_number(text: str | float) -> Number:
    """The number of a text that holds nothing else.

    Raises ``QuantityError`` for an empty text, words, NaN, infinity, a negative number, and for thousands marks:
    "1,234" is 1.234 to one reader and 1234 to the next.

    >>> parse_number("2,6")
    Number(value=2.6, below=False)
    >>> parse_number("<0.1")
    Number(value=0.1, below=True)
    """
    number, rest = split(text)
    if rest:
        raise QuantityError(f"{quoted(str(text))} is not a number", _ALLOWED, "leave out everything but the number")
    return number


def split(text: str | float, *, negative: bool = False) -> tuple[Number, str]:
    """The number that a text begins with and what stands behind it (unit, species), stripped.

    Raises ``QuantityError`` as ``parse_number`` does.

    >>> split("120 ppm CaCO3")
    (Number(value=120.0, below=False), 'ppm CaCO3')
    """
    written = repr(float(text)) if isinstance(text, float) else str(text)
    plain = tidy(written)
    found = _NUMBER.fullmatch(plain)
    if not plain or found is None or _POWER.match(written):
        raise QuantityError(
            _why_none(plain, found is not None), _ALLOWED, "write a number such as 7.2, or leave the field out"
        )
    sign, digits, rest = found.groups()
    if _GROUPED_BY_SPACE.match(rest) or _GROUPED_BY_COMMA.fullmatch(digits) or "'" in digits:
        raise QuantityError(
            f"{quoted(plain)} has a mark that can stand between thousands or before decimals",
            _ALLOWED,
            "write 1234 for a number above a thousand, 1.234 for one just above 1",
        )
    return Number(_value(digits, plain, negative), sign == "<"), rest.strip()


def tidy(text: str, longest: int = LONGEST) -> str:
    """Text with typographic variants (non-breaking space, minus sign, sub- and superscripts) made plain.

    Raises ``QuantityError`` for a text that is too long.

    >>> tidy("NO\\u2083\\u207b")
    'NO3-'
    """
    if len(text) > longest:
        raise QuantityError(
            f"{quoted(text)} is too long", f"up to {longest} characters", "write one number with its unit, or one name"
        )
    plain = unicodedata.normalize("NFKC", text).replace("\u2212", "-").replace("\u2013", "-").replace("\u2019", "'")
    return plain.strip()


def _value(digits: str, plain: str, negative: bool) -> float:
    with_point = digits.replace(",", ".") if digits.count(",") == 1 and "." not in digits else digits
    if not _PLAIN.fullmatch(with_point):
        raise QuantityError(f"{quoted(plain)} is not a number", _ALLOWED, "write it with one decimal mark")
    value = float(with_point) + 0.0
    if abs(value) > LARGEST:
        raise QuantityError(f"{quoted(plain)} is too large", f"up to {LARGEST:.0e}", "check the number and its unit")
    if value < 0.0 and not negative:
        raise QuantityError(f"{quoted(plain)} is negative", "0 or more", "check the sign")
    return value


def _why_none(plain: str, raised: bool) -> str:
    if not plain:
        return "the value is empty"
    return f"{quoted(plain)} " + ("is a power" if raised else "does not begin with a number")
