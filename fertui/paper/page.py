"""A page for people and for machines: text at 80 columns, and the same as plain data."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any
from zoneinfo import ZoneInfo

WIDTH = 80
ADVICE = "fertui advises and you decide; the safety data sheet, site procedure and local code come first."


@dataclass(frozen=True, slots=True)
class Page:
    """One sheet: ``text`` to print, ``data`` for JSON, ``rows`` where it is a table for CSV."""

    text: str
    data: Mapping[str, Any]
    rows: tuple[tuple[str, ...], ...] = field(default=())

    def csv(self) -> str:
        """The table as CSV text; cells that a spreadsheet would run are defused."""
        import csv
        import io

        from fertui.logbook.exporting import defused

        out = io.StringIO()
        csv.writer(out, lineterminator="\n").writerows([defused(cell) for cell in row] for row in self.rows)
        return out.getvalue()


def heading(title: str, *under: str) -> list[str]:
    """Title lines of a page."""
    return [title, "=" * min(len(title), WIDTH), *under, ""]


def section(title: str, lines: Iterable[str]) -> list[str]:
    """A titled block, nothing where there are no lines."""
    body = list(lines)
    return [title, *body, ""] if body else []


def folded(text: str, mark: str = "  ") -> list[str]:
    """One sentence folded to the width of the page, hanging under its mark.

    >>> folded("short", "- ")
    ['- short']
    """
    return textwrap.wrap(text, WIDTH, initial_indent=mark, subsequent_indent=" " * len(mark)) or [mark.rstrip()]


def columns(rows: Sequence[Sequence[str]], right: Sequence[int] = ()) -> list[str]:
    """Rows as aligned lines.

    >>> columns([("salt", "kg"), ("potassium nitrate", "5.25")], right=(1,))
    ['salt                 kg', 'potassium nitrate  5.25']
    """
    if not rows:
        return []
    widths = [max(len(row[place]) for row in rows) for place in range(len(rows[0]))]
    return [
        "  ".join(
            cell.rjust(width) if place in right else cell.ljust(width)
            for place, (cell, width) in enumerate(zip(row, widths, strict=True))
        ).rstrip()
        for row in rows
    ]


def clock(at: datetime, timezone: str) -> str:
    """A time on the site's clock."""
    return f"{at.astimezone(ZoneInfo(timezone)):%a %d %b %Y %H:%M}"


def amount(value: float | None) -> str:
    """A number with the digits it deserves.

    >>> amount(4.56), amount(0.214), amount(None)
    ('4.6', '0.21', '')
    """
    if value is None:
        return ""
    size = abs(value)
    return f"{value:.{0 if size >= 100 else 1 if size >= 1 else 2}f}"
