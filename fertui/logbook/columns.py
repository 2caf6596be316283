"""What each column of a table means for a kind of entry, said before anything is read."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import NamedTuple

from fertui import quantities
from fertui.logbook.errors import LogbookError
from fertui.logbook.exporting import undefused
from fertui.logbook.kinds import WRITTEN_ABOUT_EVERY_ENTRY, Kind, nearest
from fertui.logbook.readers import field_named
from fertui.logbook.sheets import Sheet
from fertui.logbook.templates import Template
from fertui.quantities.names import unit_and_species
from fertui.quantities.refusal import QuantityError
from fertui.quantities.units import fold

KEPT_BY_THE_BOOK = ("number", "entered", "supersedes", "why", "flags")
"""Columns an export writes and an import leaves alone: the book gives them itself."""

HEADS: Mapping[str, str] = {
    "date": "at", "datetime": "at", "date and time": "at", "sampled": "at", "date sampled": "at", "sampling date": "at",
    "sample date": "at", "date of sampling": "at", "date of sample": "at", "sampled on": "at", "date collected": "at",
    "collection date": "at", "date of collection": "at", "sample point": "point", "sampling point": "point",
    "location": "point",
    "remark": "note", "remarks": "note", "comment": "note", "comments": "note", "operator": "by", "laboratory": "lab",
    "sample number": "sample", "sample no": "sample", "lab number": "sample", "sample id": "sample",
}  # fmt: skip
"""Other heads met on tables (common practice, no source)."""


class Column(NamedTuple):
    """A column by its head: the name it delivers (``at``, ``NO3-N`` ...; '' when left out), its unit and its field."""

    head: str
    name: str
    unit: str = ""
    field: str = ""

    @property
    def is_value(self) -> bool:
        """Whether it delivers a value of the kind."""
        return bool(self.field)

    def says(self) -> str:
        """What the column is taken as, in words."""
        if not self.name:
            return f"{self.head}: left out"
        unit = f" in {self.unit}" if self.unit else ""
        species = f", as {self.field}" if self.field not in ("", self.name) else ""
        return f"{self.head}: {self.name}{unit}{species}"


def columns_of(sheet: Sheet, kind: Kind, template: Template) -> tuple[Column, ...]:
    """The meaning of every column; unknown ones without a single cell are left out.

    Raises ``LogbookError`` that names every head it does not know, and for two columns of the same name.
    """
    columns, unknown = [], []
    for place, (head, unit) in enumerate(zip(sheet.heads, sheet.units, strict=True)):
        head = undefused(head)
        try:
            column = None if head in template.ignore else _column(head, template.columns.get(head, head), unit, kind)
        except QuantityError as trouble:
            raise LogbookError(f"{_called(head, place, sheet)}: {trouble}") from trouble
        columns.append(column or Column(head, ""))
        if column is None and head not in template.ignore and any(row[place] for row in sheet.rows):
            unknown.append(head)
    if unknown:
        raise _unknown(unknown, kind)
    _check_once(columns)
    return tuple(columns)


def _called(head: str, place: int, sheet: Sheet) -> str:
    """A column by its head; one without a head by its place and the line that has a cell there."""
    if head:
        return f"column {head!r}"
    line = next((line for line, row in zip(sheet.lines, sheet.rows, strict=True) if row[place]), None)
    return f"column {place + 1}" if line is None else f"column {place + 1}, in which line {line} has a cell"


def learned(template: Template, sheet: Sheet, columns: Sequence[Column], dates: str) -> Template:
    """The template with what this table showed: the meaning and unit of every head, delimiter, decimal mark, dates."""
    meant = {column.head: f"{column.name} [{column.unit}]" if column.unit else column.name for column in columns}
    return template._replace(
        columns={head: name for head, name in meant.items() if name},
        ignore=tuple(head for head, name in meant.items() if not name),
        dates=dates if dates != "ymd" else template.dates,
        delimiter=sheet.delimiter,
        decimal=sheet.decimal,
    )


def _column(head: str, meant: str, unit: str, kind: Kind) -> Column | None:
    plain = " ".join(meant.lower().replace("_", " ").split())
    about = HEADS.get(plain, plain.replace(" ", "_"))
    if about in (*WRITTEN_ABOUT_EVERY_ENTRY, "loop", "time"):
        return Column(head, about)
    if about in KEPT_BY_THE_BOOK:
        return Column(head, "")
    if kind.field(about) is not None and not unit and "[" not in meant:
        return Column(head, about, "", about)
    found = quantities.column(meant)
    if found.unit and unit and fold(found.unit) != fold(unit_and_species(unit)[0]):
        raise LogbookError(f"column {head!r} is in {found.unit} by name or template, but in {unit} by its units row.")
    name = found.species or found.name
    field = field_named(kind, name)
    if field is not None:
        return Column(
            head, name if field.what in ("ion", "micronutrient") else field.name, found.unit or unit, field.name
        )
    if kind.salts and (found.unit or unit) and name:
        return Column(head, name, found.unit or unit, name)
    return None


def _check_once(columns: Sequence[Column]) -> None:
    named: dict[str, str] = {}
    for column in columns:
        if column.name in named:
            raise LogbookError(
                f"the columns {named[column.name]!r} and {column.head!r} both are {column.name}; keep one."
            )
        if column.name:
            named[column.name] = column.head
    if "at" not in named:
        raise LogbookError("no column says when: name one `at` (or date), or map it in a template.")


def _unknown(heads: Sequence[str], kind: Kind) -> LogbookError:
    known = (*WRITTEN_ABOUT_EVERY_ENTRY, *kind.names)
    listed = ", ".join(f"{head!r}{nearest(head, known).replace(';', ' -')}" for head in heads)
    return LogbookError(
        f"columns not known for {kind.name}: {listed}. Rename them to one of {', '.join(known)} with the unit in "
        'brackets, as in "K [mmol/L]". Or say what they are in a template, templates/NAME.toml in the folder of the '
        f'site: columns = {{ "{heads[0]}" = "K [mg/L]" }} or ignore = ["{heads[0]}"]; then import with --template NAME.'
    )
