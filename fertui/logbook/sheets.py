"""A table file as cells of text: encoding, delimiter, decimal mark, units row and shape found out, no more."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Sequence
from pathlib import Path
from typing import NamedTuple

from fertui.logbook.errors import LogbookError
from fertui.quantities.names import named
from fertui.quantities.refusal import QuantityError
from fertui.quantities.units import is_unit

LARGEST_BYTES = 20_000_000
MOST_TITLE_LINES = 20
DELIMITERS = ("\t", ";", "|", ",")

_COMMA_DECIMAL = re.compile(r"<?\s*-?(\d+,\d{1,2}|0,\d+|\d+,\d{4,}|\d{1,3}(\.\d{3})+,\d+)")
_POINT_DECIMAL = re.compile(r"<?\s*-?(\d+\.\d{1,2}|0\.\d+|\d+\.\d{4,}|\d{1,3}(,\d{3})+\.\d+)")
_NUMERIC = re.compile(r"<?\s*-?\d[\d.,]*")
_NAME_HEADS = ("parameter", "analyte", "determinand", "determination", "element")
_RESULT_HEADS = ("result", "value")
_UNIT_HEADS = ("unit", "units")


class Sheet(NamedTuple):
    """Heads, units (from a row of their own, '' where none) and rows of a table; ``lines``: the rows' line numbers."""

    heads: tuple[str, ...]
    units: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    lines: tuple[int, ...]
    delimiter: str = ","
    decimal: str = ""

    def number(self, cell: str) -> str:
        """A numeric cell with a decimal point and no thousands marks, where the whole sheet shows which is which."""
        if not self.decimal or not _NUMERIC.fullmatch(cell):
            return cell
        if self.decimal == ",":
            return cell.replace(".", "").replace(",", ".")
        return cell.replace(",", "")


def read_sheet(path: str | Path, delimiter: str = "", decimal: str = "") -> Sheet:
    """The table in a file; ``delimiter`` and ``decimal`` are sniffed where not given.

    Raises ``LogbookError`` for a file that is missing, empty, too large, not text, or without rows.
    """
    path = Path(path)
    try:
        with path.open("rb") as file:
            raw = file.read(LARGEST_BYTES + 1)
    except (OSError, ValueError) as error:
        raise LogbookError(f"{path} cannot be read: {getattr(error, 'strerror', None) or error}.") from error
    if len(raw) > LARGEST_BYTES:
        raise LogbookError(f"{path} is larger than {LARGEST_BYTES:,} bytes; cut it into smaller tables.")
    return sheet_of(_decoded(raw, path.name), path.name, delimiter, decimal)


def sheet_of(text: str, name: str, delimiter: str = "", decimal: str = "") -> Sheet:
    """The table in a text; see ``read_sheet``.

    >>> sheet_of("date;K\\n;mg/L\\n2024-12-01;280,5\\n", "lab.csv").units
    ('', 'mg/L')
    """
    if not text.strip():
        raise LogbookError(f"{name} is empty.")
    delimiter = delimiter or _delimiter(text)
    try:
        reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, strict=False)
        numbered = [(reader.line_num, [cell.strip() for cell in row]) for row in reader]
    except csv.Error as error:
        raise LogbookError(f"{name} is not a table: {error}.") from error
    filled = _below_title([(line, row) for line, row in numbered if any(row)])
    if len(filled) < 2:
        raise LogbookError(f"{name} has no rows below its heads.")
    (_, heads), *body = filled
    width = max(len(heads), *(len(row) for _, row in body))
    sheet = Sheet(
        heads=_padded(heads, width),
        units=("",) * width,
        rows=tuple(_padded(row, width) for _, row in body),
        lines=tuple(line for line, _ in body),
        delimiter=delimiter,
    )
    sheet = _wide(_upright(_with_units_row(sheet)))
    return sheet._replace(decimal=decimal or _decimal(sheet.rows))


def _decoded(raw: bytes, name: str) -> str:
    marked = raw.startswith((b"\xff\xfe", b"\xfe\xff"))
    for encoding in ("utf-16",) if marked else ("utf-8-sig", "cp1252", "latin-1"):
        try:
            text = raw.decode(encoding)
        except UnicodeDecodeError:
            continue
        if "\x00" in text:
            break
        return text
    raise LogbookError(f"{name} is not a text table; save it as CSV and import that.")


def _delimiter(text: str) -> str:
    sample = [line for line in text.splitlines()[:40] if line.strip()]

    def evenness(delimiter: str) -> tuple[float, int]:
        counts = [len(row) for row in csv.reader(sample, delimiter=delimiter) if row]
        most = max(set(counts), key=lambda count: (counts.count(count), count)) if counts else 1
        return (counts.count(most) / len(counts) if most > 1 else 0.0), most

    try:
        return max(DELIMITERS, key=evenness)
    except csv.Error:
        return ","


def _decimal(rows: Sequence[Sequence[str]]) -> str:
    cells = [cell for row in rows for cell in row]
    comma = any(_COMMA_DECIMAL.fullmatch(cell) for cell in cells)
    point = any(_POINT_DECIMAL.fullmatch(cell) for cell in cells)
    return "" if comma == point else "," if comma else "."


def _below_title(rows: list[tuple[int, list[str]]]) -> list[tuple[int, list[str]]]:
    """The rows from the heads on: lines of a title or address above them have far fewer cells."""
    cells = [sum(map(bool, row)) for _, row in rows]
    heads = next((place for place, count in enumerate(cells[:MOST_TITLE_LINES]) if count >= 0.6 * max(cells)), 0)
    return rows[heads:]


def _padded(row: Sequence[str], width: int) -> tuple[str, ...]:
    return (*row, *("",) * (width - len(row)))


def _with_units_row(sheet: Sheet) -> Sheet:
    """The sheet with its second row taken as units, when everything in it is one."""
    second = [cell.strip("[]() ") for cell in sheet.rows[0]]
    written = [cell for cell in second if cell and cell.lower() not in (*_UNIT_HEADS, "-")]
    if len(sheet.rows) < 2 or not written or not all(_like_unit(cell) for cell in written):
        return sheet
    units = tuple(cell if _like_unit(cell) else "" for cell in second)
    return sheet._replace(units=units, rows=sheet.rows[1:], lines=sheet.lines[1:])


def _like_unit(cell: str) -> bool:
    return is_unit(cell) or is_unit(cell.split(" ")[0])


def _upright(sheet: Sheet) -> Sheet:
    """A sheet with ions down its first column turned so that each sample is a row."""
    names = [row[0] for row in sheet.rows]
    if sum(map(_is_measure, names)) < max(2, len(names) / 2) or any(map(_is_measure, sheet.heads)):
        return sheet
    columns = list(zip(sheet.heads, *sheet.rows, strict=True))
    units_at = next((place for place, column in enumerate(columns) if column[0].lower() in _UNIT_HEADS), None)
    units = columns[units_at][1:] if units_at is not None else ("",) * len(names)
    samples = [column for place, column in enumerate(columns[1:], start=1) if place != units_at and any(column)]
    return Sheet(
        heads=(sheet.heads[0] or "at", *names),
        units=("", *units),
        rows=tuple(samples),
        lines=(sheet.lines[0] - 1,) * len(samples),
        delimiter=sheet.delimiter,
    )


def _wide(sheet: Sheet) -> Sheet:
    """A sheet with one result a row turned into one sample a row."""
    lower = [head.lower() for head in sheet.heads]
    name_at, result_at = (
        next((lower.index(each) for each in heads if each in lower), None) for heads in (_NAME_HEADS, _RESULT_HEADS)
    )
    if name_at is None or result_at is None:
        return sheet
    unit_at = next((lower.index(each) for each in _UNIT_HEADS if each in lower), None)
    keys = [place for place in range(len(lower)) if place not in (name_at, result_at, unit_at)]
    columns: dict[tuple[str, str], int] = {}
    samples: dict[tuple[str, ...], dict[int, str]] = {}
    lines: dict[tuple[str, ...], int] = {}
    for line, row in zip(sheet.lines, sheet.rows, strict=True):
        column = columns.setdefault((row[name_at], row[unit_at] if unit_at is not None else ""), len(columns))
        sample = tuple(row[place] for place in keys)
        if column in samples.setdefault(sample, {}):
            raise LogbookError(f"line {line}: {row[name_at]} is given twice for one sample.")
        samples[sample][column] = row[result_at]
        lines.setdefault(sample, line)
    return Sheet(
        heads=(*(sheet.heads[place] for place in keys), *(name for name, _ in columns)),
        units=(*("" for _ in keys), *(unit for _, unit in columns)),
        rows=tuple((*key, *(cells.get(place, "") for place in range(len(columns)))) for key, cells in samples.items()),
        lines=tuple(lines.values()),
        delimiter=sheet.delimiter,
    )


def _is_measure(head: str) -> bool:
    from fertui.quantities import column

    try:
        name = column(head).name
        return name in ("EC", "pH") or named(name) is not None
    except QuantityError:
        return False
