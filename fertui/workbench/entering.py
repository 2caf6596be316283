"""What entry forms need before anything is written: what was understood, what was last, what an analysis shows."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from datetime import UTC, datetime
from typing import TYPE_CHECKING, NamedTuple

from fertui.logbook.entries import Entry, Value
from fertui.site.model import Loop, Site

if TYPE_CHECKING:
    from fertui.chemistry.verdicts import Check

Place = tuple[str, str, str, str]
"""Kind, point, field and tank: where a value belongs."""


class LastValue(NamedTuple):
    """A value as written and when; its canonical number, None for words; whether that is a limit of detection."""

    written: str
    at: datetime
    number: float | None = None
    below: bool = False


def echo(kind: str, name: str, text: str, site: Site, loop: Loop) -> str:
    """What was understood of one value with its canonical unit, or of ``at`` on the clock of the site."""
    if name == "at":
        return _moment(text, site)
    from fertui.logbook.kinds import kind_named, unit_of
    from fertui.logbook.parse import named_value

    chosen = kind_named(kind)
    name, value = named_value(chosen, name, text, site, loop, datetime.now(UTC))
    return said(value, unit_of(chosen, name)) if value is not None else ""


def _moment(text: str, site: Site) -> str:
    """A time as understood: the day, and the hour where one was given."""
    from fertui.logbook.times import read_moment, zone

    at, whole_day = read_moment(text, site.timezone, datetime.now(UTC))
    local = at.astimezone(zone(site.timezone))
    return f"{local:%a %d %b %Y}" if whole_day else f"{local:%a %d %b %Y %H:%M}"


def said(value: Value, unit: str) -> str:
    """A value in words: as written where it is a word, else the number kept."""
    if value.number is None:
        return value.text
    kept = f"{'below ' if value.below else ''}{value.number:.4g} {unit}".strip()
    as_ion = f" {value.name}" if value.species and value.species != value.name else ""
    return kept + as_ion


def previous(entries: Iterable[Entry]) -> Mapping[Place, LastValue]:
    """The last value for every place a form asks for, from effective entries in order of time."""
    last: dict[Place, LastValue] = {}
    for entry in entries:
        tank = entry.text_of("tank")
        for value in entry.values:
            place = (entry.kind, entry.point, value.name, tank)
            last[place] = LastValue(value.written, entry.at, value.number, value.below)
    return last


def check_analysis(entry: Entry) -> tuple[Check, ...]:
    """Charge balance and EC check of an analysis, whether or not it has been written down yet."""
    from fertui.chemistry.names import IONS
    from fertui.chemistry.verdicts import verdicts

    ions = {ion: number for ion in IONS if (number := entry.number_of(ion)) is not None}
    return verdicts(ions, ec_measured=entry.number_of("EC"), ph=entry.number_of("pH"))
