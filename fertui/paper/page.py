"""A page for people and for machines: text at 80 columns, and the same as plain data."""

from __future__ import annotations

import re
import textwrap
from collections.abc import Iterable, Mapping, Sequence
from datetime import datetime
from typing import Any, NamedTuple
from zoneinfo import ZoneInfo

WIDTH = 80
ADVICE = (
    "fertui advises and you decide. The safety data sheet, site procedure, local code and licensed practice come first."
)
SIGN = "done [ ]  partly [ ] ________  not done [ ]   by ____ at ______"
"""Under every step: a thing counts when it was done, not when it was printed."""

UNITS = "%|mmol/L|umol/L|meq/L|mg/L|mS/cm|m3|kg|g|L|mL|C|days?|h|min|ppm"
WITH_UNIT = re.compile(rf"(\d) ({UNITS})(?![\w/])")
BOUND = "\ue000"
"""Stands for the space between a number and its unit while lines are broken; no text of ours holds it."""


class Page(NamedTuple):
    """One sheet: ``text`` to print, ``data`` for JSON, ``rows`` where it is a table for CSV (units in the heads)."""

    text: str
    data: Mapping[str, Any]
    rows: tuple[tuple[str, ...], ...] = ()

    def csv(self) -> str:
        """The table as CSV text; cells that a spreadsheet would run are defused."""
        import csv
        import io

        from fertui.logbook.exporting import defused

        out = io.StringIO()
        csv.writer(out, lineterminator="\n").writerows([defused(cell) for cell in row] for row in self.rows)
        return out.getvalue()


def page(
    lines: Iterable[str], data: Mapping[str, Any], rows: Iterable[Sequence[str]] = (), advice: bool = False
) -> Page:
    """A page of lines; ``advice``: whose word counts stands under what somebody acts upon."""
    foot = ["-" * WIDTH, *folded(ADVICE, "")] if advice else []
    return Page("\n".join([*lines, *foot]).rstrip("\n"), data, tuple(tuple(row) for row in rows))


def heading(title: str, site: str, *under: str) -> list[str]:
    """What the page is, whose, and what it rests on.

    >>> heading("Round", "Nursery")[0] == "ROUND" + " " * 68 + "Nursery"
    True
    """
    room = WIDTH - len(title) - len(site)
    first = f"{title.upper()}{' ' * room}{site}" if room > 1 else title.upper()
    return [first[:WIDTH], "=" * WIDTH, *(line for each in under for line in folded(each, "")), ""]


def section(title: str, lines: Iterable[str]) -> list[str]:
    """A titled block, nothing where there are no lines."""
    body = list(lines)
    return [title, *body, ""] if body else []


def folded(text: str, mark: str = "  ") -> list[str]:
    """A text folded to the width of the page, hanging under its mark; a number is never torn from its unit.

    >>> folded("one two", "- "), folded("x" * 90, "")[0] == "x" * 80
    (['- one two'], True)
    >>> folded("y" * 76 + " 12 %", "")
    ['yyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyy', '12 %']
    """
    bound = WITH_UNIT.sub(f"\\1{BOUND}\\2", text)
    inset = len(text) - len(text.lstrip())
    hang = " " * (len(mark) + (inset + 2 if inset else 0))
    lines = textwrap.wrap(bound, WIDTH, initial_indent=mark, subsequent_indent=hang, break_on_hyphens=False)
    return [line.replace(BOUND, " ") for line in lines] or [mark.rstrip()]


def listed(texts: Iterable[str], mark: str = "- ") -> list[str]:
    """Several texts, each folded under its mark."""
    return [line for text in texts for line in folded(text, mark)]


def columns(rows: Sequence[Sequence[str]], right: Iterable[int] = ()) -> list[str]:
    """Rows as aligned lines; ``right`` names the columns set flush right.

    >>> columns([("salt", "kg"), ("potassium nitrate", "5.25")], right=(1,))
    ['salt                 kg', 'potassium nitrate  5.25']
    """
    if not rows:
        return []
    flush = frozenset(right)
    widths = [max(len(row[place]) for row in rows) for place in range(len(rows[0]))]
    return [
        "  ".join(
            cell.rjust(width) if place in flush else cell.ljust(width)
            for place, (cell, width) in enumerate(zip(row, widths, strict=True))
        ).rstrip()
        for row in rows
    ]


def day(at: datetime, timezone: str) -> str:
    """A date on the site's clock, without the year."""
    local = at.astimezone(ZoneInfo(timezone))
    return f"{local:%a} {local.day} {local:%b}"


def clock(at: datetime, timezone: str) -> str:
    """A time on the site's clock."""
    local = at.astimezone(ZoneInfo(timezone))
    return f"{day(at, timezone)} {local:%Y %H:%M}"


def amount(value: float | None) -> str:
    """A number with the digits it deserves.

    >>> amount(4.56), amount(0.214), amount(0.0), amount(None)
    ('4.6', '0.21', '0', '')
    """
    if value is None:
        return ""
    size = abs(value)
    written = f"{value:.{0 if size >= 100 else 1 if size >= 0.995 else 2}f}"
    return "0" if float(written) == 0 else written


def age(at: datetime, now: datetime) -> str:
    """How long ago something was.

    >>> from datetime import timedelta
    >>> now = datetime(2026, 1, 9, 8)
    >>> age(now - timedelta(hours=7), now), age(now - timedelta(days=9), now)
    ('7 h', '9 d')
    """
    hours = (now - at).total_seconds() / 3600
    return f"{hours:.0f} h" if hours < 72 else f"{hours / 24:.0f} d"
