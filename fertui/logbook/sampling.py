"""What a reading stands for: EC brought to 25 C, an extract as the pore water of its medium."""

from __future__ import annotations

from fertui import quantities
from fertui.chemistry.names import IONS, MICRONUTRIENTS
from fertui.logbook.entries import Entry, Value
from fertui.logbook.errors import LogbookError
from fertui.site.model import Loop, Site

ISO_7888_C = (0.0, 35.0)
"""Sample temperatures the ISO 7888 table covers [C]."""


def at_25(entry: Entry, site: Site) -> Entry:
    """The entry with its EC at 25 C when its instrument does not compensate; its text stays, its unit says so.

    Raises ``LogbookError`` when such a meter's EC comes without a sample temperature, or outside the table's range.
    """
    meter = next((each for each in site.instruments if each.name == entry.instrument), None)
    ec = entry.value("EC")
    if entry.kind != "reading" or ec is None or meter is None or meter.compensated is not False:
        return entry
    temperature = entry.number_of("temperature")
    if temperature is None or not ISO_7888_C[0] <= temperature <= ISO_7888_C[1]:
        raise LogbookError(
            f"{meter.name} does not compensate for temperature, so its EC needs temperature= of the sample, "
            f"{ISO_7888_C[0]:g} to {ISO_7888_C[1]:g} C."
        )
    from fertui.chemistry.conductivity import to_reference

    number = float(to_reference(quantities.read(ec.text, "EC").number, temperature))
    told = ec._replace(number=number, unit=f"{ec.unit.split(' at ')[0] or 'mS/cm'} at {temperature:g} C")
    return entry._replace(values=tuple(told if value.name == "EC" else value for value in entry.values))


def check_method(entry: Entry, loop: Loop) -> None:
    """Raise ``LogbookError`` for an extract of the root zone without the site's factor, unless marked doubtful."""
    extract = entry.method not in ("", "pore") and entry.point == "root_zone"
    if extract and entry.method not in loop.extract_factors and not entry.doubtful:
        raise LogbookError(
            f"method {entry.method} is an extract, not pore water, and {loop.name} has no factor for it. Give one in "
            f'site.toml (extract_factors of the loop), or keep the numbers unused with doubtful="extract".'
        )


def as_pore_water(entry: Entry, loop: Loop) -> Entry:
    """The entry as it stands for the pore water: ions and EC of an extract times the site's factor for its method.

    pH and temperature stay. Samples of pore water, and of every other point, come back as they are. Raises
    ``LogbookError`` for an extract without a factor.
    """
    if entry.point != "root_zone" or entry.method in ("", "pore"):
        return entry
    if entry.method not in loop.extract_factors:
        raise LogbookError(f"entry {entry.number} is a {entry.method}; {loop.name} has no factor for it.")
    factor = loop.extract_factors[entry.method]

    def scaled(value: Value) -> Value:
        of_solution = value.name in (*IONS, *MICRONUTRIENTS, "EC")
        return value._replace(number=value.number * factor) if of_solution and value.number is not None else value

    return entry._replace(values=tuple(map(scaled, entry.values)))
