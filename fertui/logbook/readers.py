"""One value of an entry from the text people wrote: its canonical number, the unit and species written."""

from __future__ import annotations

from collections.abc import Iterable
from datetime import datetime

from fertui import quantities
from fertui.logbook.entries import Value
from fertui.logbook.errors import LogbookError
from fertui.logbook.kinds import Field, Kind, nearest
from fertui.logbook.times import read_moment
from fertui.quantities.names import named
from fertui.site.model import Loop, Site

_MEASURED_AS = {"meter": "litres", "entry": "number"}
"""Fields that are written like another quantity."""


def read_value(field: Field, name: str, text: str, site: Site, loop: Loop | None, now: datetime) -> Value:
    """The value of one field. ``name`` is the name as written (``NO3-N`` for the field NO3).

    Raises ``LogbookError``, naming the field, for what is not a value of it.
    """
    written = text.strip()
    if not written:
        raise LogbookError(f"{name} is empty; leave it out if it was not measured.")
    if not field.is_number:
        return Value(field.name, _word(field, written, site, loop))
    value = _number(field, name, written, site, now)
    _check_possible(field, value)
    return value


def field_named(kind: Kind, name: str) -> Field | None:
    """The field that a name means: its own name in any case, or a form of one of its ions. None: not known.

    Raises ``QuantityError`` for a name that stands for more than one ion ("N").
    """
    found = kind.field(name) or next((field for field in kind.fields if field.name.lower() == name.lower()), None)
    if found is not None or not any(field.what == "ion" for field in kind.fields):
        return found
    ion = named(name)
    return kind.field(ion.species.ion) if ion else None


def unknown_name(kind: Kind, name: str, others: Iterable[str]) -> LogbookError:
    """The refusal of a name that a kind does not know, with the nearest one it does."""
    known = (*kind.names, *others)
    return LogbookError(f"{kind.name} has no value {name!r}{nearest(name, known)}. Known: {', '.join(known)}.")


def tank_names(site: Site, loop: Loop | None) -> tuple[str, ...]:
    """Names a tank can have here: ``tank``, ``drain_store``, the stores' and the stock tanks' own names."""
    stores = [each.drain_store for each in ([loop] if loop else site.loops) if each.drain_store]
    return tuple(dict.fromkeys(("tank", "drain_store", *stores, *(tank.name for tank in site.stock_tanks))))


def _number(field: Field, name: str, written: str, site: Site, now: datetime) -> Value:
    if field.what == "time":
        return Value(field.name, written, read_moment(written, site.timezone, now)[0].timestamp())
    if field.what in ("ion", "micronutrient"):
        what = field.name if name.lower() == field.name.lower() else name
    else:
        what = _MEASURED_AS.get(field.what, field.what)
    try:
        quantity = quantities.read(written, what)
    except quantities.QuantityError as trouble:
        raise LogbookError(f"{name}: {trouble}") from trouble
    return Value(field.name, written, quantity.number, quantity.unit, quantity.species, quantity.below)


def _word(field: Field, written: str, site: Site, loop: Loop | None) -> str:
    if field.words:
        return _one_of(field.name, written, field.words)
    if field.what == "tank":
        letters = {tank.letter: tank.name for tank in site.stock_tanks if tank.letter}
        return letters.get(written) or _one_of(field.name, written, tank_names(site, loop))
    if field.what == "water":
        return _one_of(field.name, written, [water.name for water in site.waters])
    if field.what in ("salt", "acid"):
        return supply_named(written, site)
    return written


def supply_named(written: str, site: Site) -> str:
    """The supply that a name, kind, formula or trade name means, as the site spells it; else the catalogue's own name.

    Raises ``CatalogueError`` for a name that means several products ("calcium nitrate") or none.
    """
    names = {_plain(supply.name): supply.name for supply in site.supplies}
    kinds = {_plain(supply.kind): supply.name for supply in reversed(site.supplies)}
    if _plain(written) in names or _plain(written) in kinds:
        return names.get(_plain(written)) or kinds[_plain(written)]
    from fertui.catalogue.supplies import substance

    kind = substance(written).name
    return kinds.get(_plain(kind), kind)


def _one_of(name: str, written: str, known: Iterable[str]) -> str:
    known = tuple(known)
    plain = {_plain(each): each for each in known}
    if _plain(written) in plain:
        return plain[_plain(written)]
    listed = f"Known: {', '.join(known)}." if known else "site.toml names none."
    raise LogbookError(f"{name} = {written!r} is not known here{nearest(written, known)}. {listed}")


def _plain(word: str) -> str:
    return word.lower().replace("_", " ").replace("-", " ").strip()


def _check_possible(field: Field, value: Value) -> None:
    number = value.number
    if number is None or (field.low is None or number >= field.low) and (field.high is None or number <= field.high):
        return
    unit = f" {field.unit}" if field.unit else ""
    raise LogbookError(
        f"{field.name} = {value.text!r} is {number:g}{unit}, which cannot be ({field.low:g} to {field.high:g}{unit})."
        + _perhaps(field, value, number)
    )


def _perhaps(field: Field, value: Value, number: float) -> str:
    ten = f" Out by ten? {number / 10:g}." if field.high is not None and number / 10 <= field.high else ""
    if value.unit:
        return ten
    if field.what == "EC":
        unit, factor = ("uS/cm", 1000) if number >= 500 else ("10^-5 S/cm", 100)
        return f" Was it {unit} ({number / factor:g} mS/cm)? Write the unit behind it."
    return " Was it mg/L? Write the unit behind it." + ten if field.what == "ion" else ten
