"""One value of site.toml by its dotted name: listed for the screen, changed by text, always checked as a whole."""

from __future__ import annotations

import tomllib
from collections.abc import Iterator
from copy import deepcopy
from typing import Any, NamedTuple

from fertui.site.checks import SiteError, nearest, shortened
from fertui.site.model import Site
from fertui.site.reading import METHODS, site_from
from fertui.site.writing import Tables, tables_of

Step = str | int
SOURCED = ("bands", "limits")
"""Tables whose every entry names its source."""


class Row(NamedTuple):
    """A value of site.toml: its dotted name, its text as TOML would have it, and where it comes from ("": not said)."""

    key: str
    text: str
    source: str


def rows(site: Site) -> tuple[Row, ...]:
    """Every value that is set, in file order; tables of a list are named: ``loops.north.feed_EC``."""
    return tuple(_rows(tables_of(site), "", ""))


def changed(site: Site, key: str, text: str, source: str = "own setting") -> Site:
    """The site with one value changed, checked whole; an empty text removes the value.

    ``key`` is dotted as in ``rows``; ``text`` a number, true, false, a text or a list. Where the value had a source, it
    now has ``source``. Raises ``SiteError`` for a name that is not there or a value that site.toml would refuse; the
    site given stays as it is.

    >>> from fertui.site.model import Loop
    >>> site = Site("s", "UTC", (Loop("north", "known-feed", 100.0, "tomato", "stone-wool"),))
    >>> changed(site, "loops.north.area_m2", "120").loops[0].area_m2
    120.0
    """
    tables = deepcopy(tables_of(site))
    *path, last = _steps(tables, key)
    table: Any = tables
    for step in path:
        table = table[step] if isinstance(step, int) else table.setdefault(step, {})
    if not isinstance(table, dict) or isinstance(table.get(last), dict | list) and not _is_texts(table[last]):
        raise SiteError(f"{key[:100]}: this is a table; change the values in it one by one.")
    if text.strip():
        table[last] = _value(text, table.get(last))
    else:
        table.pop(last, None)
    _credit(table, path, str(last), source)
    return site_from(tables)


def _credit(table: Tables, path: list[Step], last: str, source: str) -> None:
    """A changed number no longer has the source of the old one."""
    if last == "source":
        return
    if any(step in SOURCED for step in path):
        table["source"] = source
    if last in table.get("sources", {}):
        table["sources"][last] = source


def _rows(table: Tables, prefix: str, outer: str) -> Iterator[Row]:
    own: dict[str, str] = {**table.get("sources", {})}
    whole: str = table.get("source", "")
    for key, value in table.items():
        name = f"{prefix}{key}"
        if isinstance(value, dict):
            yield from _rows(value, f"{name}.", whole)
        elif isinstance(value, list) and value and isinstance(value[0], dict):
            for each in value:
                yield from _rows(each, f"{name}.{each['name']}.", "")
        elif key not in ("source", "sources"):
            yield Row(name, _text(value), own.get(key, whole or outer))


def _steps(tables: Tables, key: str) -> list[Step]:
    """The way to a value: names of tables, and places in the lists whose tables have names (which may hold dots)."""
    steps: list[Step] = []
    table: Any = tables
    rest = key.strip().replace(" share", "_share")
    while rest:
        if isinstance(table, list):
            place, rest = _place(table, rest, key)
            steps.append(place)
            table = table[place]
            continue
        name, rest = _key(table, rest)
        steps.append(name)
        table = table.get(name, {}) if isinstance(table, dict) else {}
    if not steps or isinstance(steps[-1], int):
        raise SiteError(
            f"{key[:100]!r} names no value of site.toml; such as loops.NAME.feed_EC or bands.root_zone.K_share.low."
        )
    return steps


def _key(table: Any, rest: str) -> tuple[str, str]:
    """The key that a dotted name begins with, and the rest; keys that are there, or are methods, may hold dots."""
    known = (*table, *METHODS) if isinstance(table, dict) else METHODS
    for key in sorted(known, key=len, reverse=True):
        if rest == key or rest.startswith(f"{key}."):
            return key, rest[len(key) + 1 :]
    name, _, rest = rest.partition(".")
    return name, rest


def _place(tables: list[Tables], rest: str, key: str) -> tuple[int, str]:
    names = [each["name"] for each in tables]
    for place, name in sorted(enumerate(names), key=lambda each: -len(each[1])):
        if rest == name or rest.startswith(f"{name}."):
            return place, rest[len(name) + 1 :]
    first = rest.partition(".")[0]
    raise SiteError(f"{key[:100]}: no {shortened(first)}{nearest(first, names)}; known: {', '.join(names)}.")


def _value(text: str, present: Any) -> Any:
    """Text as the value it replaces has it: a text, a list split at commas, else a number, true or false."""
    said = text.strip()
    if isinstance(present, str):
        return said
    if isinstance(present, list) and not said.startswith("["):
        return [each.strip() for each in said.split(",")]
    return _toml(said, said)


def _toml(text: str, otherwise: Any) -> Any:
    """Text read as a TOML number (a decimal comma is a point), truth value, text in quotes or list."""
    for candidate in (text, text.replace(",", ".", 1)):
        try:
            value = otherwise if "\n" in candidate else tomllib.loads(f"x = {candidate}")["x"]
        except (ValueError, RecursionError):
            continue
        if isinstance(value, str | bool | int | float | list):
            return value
    return otherwise


def _text(value: Any) -> str:
    if isinstance(value, list):
        return ", ".join(_text(each) for each in value)
    if isinstance(value, bool):
        return "true" if value else "false"
    return f"{value:.12g}" if isinstance(value, float) else str(value)


def _is_texts(value: Any) -> bool:
    return isinstance(value, list) and all(isinstance(each, str) for each in value)
