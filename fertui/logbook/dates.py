"""Dates of a table: which of day, month and year comes first is found out from all of them together, never guessed."""

from __future__ import annotations

import re
from collections.abc import Sequence

from fertui.logbook.errors import LogbookError

ORDERS = ("ymd", "dmy", "mdy")

_PARTS = re.compile(r"(\d{1,4})([./-])(\d{1,2})\2(\d{2,4})(?:[ T]+(\d{1,2}[:.h]\d{2}(?::\d{2})?))?")


def order_of(cells: Sequence[str]) -> str:
    """Order of the parts of dates that are not written year first: ``dmy`` or ``mdy``; ``ymd`` when none such is there.

    Points between the parts mean day first (common practice, no source). Raises ``LogbookError`` when every date could
    be read both ways.

    >>> order_of(["13/1/2024", "2/1/2024"]), order_of(["2024-01-13"])
    ('dmy', 'ymd')
    """
    found = [match for match in map(_PARTS.fullmatch, cells) if match and len(match[1]) <= 2]
    if not found:
        return "ymd"
    if any(int(match[1]) > 12 for match in found) or all(match[2] == "." for match in found):
        return "dmy"
    if any(int(match[3]) > 12 for match in found):
        return "mdy"
    raise LogbookError(
        f"{found[0][0]} can be day/month or month/day and no other date in the table settles it; "
        'write dates as 2024-12-01, or give the order in the template (dates = "dmy" or "mdy").'
    )


def iso(cell: str, order: str) -> str:
    """A date cell as ISO text; anything that is not a date of numbers comes back as it is.

    >>> iso("13/1/2024 7:30", "dmy"), iso("yesterday", "dmy")
    ('2024-01-13 07:30', 'yesterday')
    """
    match = _PARTS.fullmatch(cell.strip())
    if not match:
        return cell
    first, _, second, third, clock = match.groups()
    if len(first) == 4:
        year, month, day = first, second, third
    else:
        (day, month), year = ((first, second) if order != "mdy" else (second, first)), third
    year = f"20{year}" if len(year) == 2 else year
    date = f"{year}-{int(month):02d}-{int(day):02d}"
    return f"{date} {_clock(clock)}" if clock else date


def _clock(text: str) -> str:
    hours, rest = re.split(r"[:.h]", text, maxsplit=1)
    return f"{int(hours):02d}:{rest}"
