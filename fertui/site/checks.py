"""One table of site.toml under inspection: each value is asked for by name, what nobody asked for is refused."""

from __future__ import annotations

import difflib
import math
from collections.abc import Collection, Mapping
from typing import Any

from fertui.refusals import Refusal

LONGEST_TEXT = 300
"""Characters a name, source or note may have."""

MOST_TABLES = 200
"""Tables of one kind a site may have."""


class SiteError(Refusal):
    """site.toml refused: the message names file, table, key, value found and what is allowed."""


class Table:
    """A table of site.toml with the place it stands at, for messages.

    Values are taken by the methods below; ``close`` then refuses every key that was not taken, with the nearest known.
    """

    def __init__(self, data: Mapping[str, Any], place: str, file: str = "site.toml") -> None:
        self.data = data
        self.place = place
        self.file = file
        self.known: set[str] = set()

    def refuse(self, key: str, why: str) -> SiteError:
        """The error for a key of this table, its value quoted; to be raised by the caller."""
        found = f" = {shortened(self.data[key])}" if key in self.data else ""
        return SiteError(f"{self.file}, {self.place}: {key[:60]}{found}: {why}")

    def text(self, key: str, default: str | None = None, among: Collection[str] = ()) -> str:
        """A line of text; required without a default; one of ``among`` where given."""
        value = self._take(key, default)
        if not isinstance(value, str):
            raise self.refuse(key, "a text in quotes is allowed here.")
        if why := text_trouble(value):
            raise self.refuse(key, why)
        if among and value != default and value not in among:
            raise self.refuse(key, f"allowed: {', '.join(among)}{nearest(value, among)}.")
        return value

    def said(self, key: str) -> str:
        """A line of text that may not be empty."""
        value = self.text(key)
        if not value.strip():
            raise self.refuse(key, "say where it comes from, such as own trial.")
        return value

    def name(self, key: str = "name") -> str:
        """A name people choose: not empty, at most 60 characters, no leading or trailing space."""
        value = self.text(key)
        if why := name_trouble(value):
            raise self.refuse(key, why)
        return value

    def number(self, key: str, low: float, high: float, unit: str = "", default: float | None = None) -> float:
        """A finite number within ``low`` to ``high``; required without a default."""
        return self._checked(key, self._take(key, default), low, high, unit)

    def maybe(self, key: str, low: float, high: float, unit: str = "") -> float | None:
        """A number as ``number`` takes it, or None where the key is absent."""
        self.known.add(key)
        return self._checked(key, self.data[key], low, high, unit) if key in self.data else None

    def flag(self, key: str) -> bool | None:
        """true or false, or None where the key is absent."""
        self.known.add(key)
        value = self.data.get(key)
        if value is not None and not isinstance(value, bool):
            raise self.refuse(key, "true or false is allowed here, without quotes.")
        return value

    def texts(self, key: str, default: tuple[str, ...] = ()) -> tuple[str, ...]:
        """A list of texts."""
        value = self._take(key, list(default))
        if not isinstance(value, list) or len(value) > MOST_TABLES:
            raise self.refuse(key, f'a list of at most {MOST_TABLES} texts is allowed here: ["...", "..."].')
        row = Table({str(n): each for n, each in enumerate(value)}, f"{self.place} {key}", self.file)
        return tuple(row.text(each) for each in row.data)

    def numbers(self, key: str, names: Collection[str], low: float, high: float, unit: str) -> dict[str, float]:
        """A table of numbers whose keys are among ``names`` (any name where that is empty); {} where absent."""
        inner = self.table(key)
        if names:
            inner.only(names)
        return {each: inner.number(inner.checked_key(each), low, high, unit) for each in inner.data}

    def table(self, key: str) -> Table:
        """The table below this one, empty where absent."""
        value = self._take(key, {})
        if not isinstance(value, dict):
            raise self.refuse(key, f"a table is allowed here: [{key}] or {{ name = value }}.")
        return Table(value, self._below(key), self.file)

    def tables(self, key: str) -> list[Table]:
        """The list of tables [[key]], empty where absent, each placed by its name or number."""
        value = self._take(key, [])
        if not isinstance(value, list) or any(not isinstance(each, dict) for each in value):
            raise self.refuse(key, f"tables headed [[{key}]] are allowed here{self._instead(key)}.")
        if len(value) > MOST_TABLES:
            raise SiteError(f"{self.file}: {len(value)} tables [[{key}]]; at most {MOST_TABLES} are allowed.")
        return [Table(each, f"[[{key}]] {_title(each, number)}", self.file) for number, each in enumerate(value, 1)]

    def checked_key(self, key: str) -> str:
        """A key the writer of the file chose, refused where it is empty, long or not printable."""
        if not 0 < len(key) <= 60 or not key.isprintable() or key != key.strip():
            raise SiteError(
                f"{self.file}, {self.place}: key {shortened(key)} is not allowed: 1 to 60 printable characters."
            )
        return key

    def only(self, names: Collection[str]) -> None:
        """Refuse a key that is not among ``names``."""
        for key in self.data:
            if key not in names:
                raise SiteError(
                    f"{self.file}, {self.place}: unknown key {shortened(key)}{nearest(key, names)}; "
                    f"allowed: {', '.join(sorted(names))}."
                )

    def close(self) -> None:
        """Refuse every key that nobody has taken."""
        self.only(self.known)

    def _take(self, key: str, default: Any) -> Any:
        self.known.add(key)
        if key not in self.data and default is None:
            raise SiteError(f"{self.file}, {self.place}: {key} is missing{self._instead(key)}.")
        return self.data.get(key, default)

    def _below(self, key: str) -> str:
        """The place of a table below this one."""
        if self.place.startswith("[["):
            return f"{self.place}, {key}"
        return f"{self.place.rstrip(']')}.{key}]" if self.place.startswith("[") else f"[{key}]"

    def _instead(self, key: str) -> str:
        """Names a key of this table that looks like a slip of the missing one."""
        near = difflib.get_close_matches(key, [each for each in self.data if each not in self.known], n=1)
        return f" (found {shortened(near[0])}: is that meant?)" if near else ""

    def _checked(self, key: str, value: Any, low: float, high: float, unit: str) -> float:
        allowed = f"a number from {plain(low)} to {plain(high)}{' ' + unit if unit else ''} is allowed."
        if isinstance(value, bool) or not isinstance(value, int | float):
            raise self.refuse(key, allowed)
        if not low <= value <= high or not math.isfinite(value):
            raise self.refuse(key, allowed)
        return float(value)


def text_trouble(text: str) -> str:
    """Why a text is not taken as a line of site.toml, "" where it is."""
    if len(text) > LONGEST_TEXT:
        return f"{len(text)} characters; at most {LONGEST_TEXT} are allowed."
    return "" if text.isprintable() else "control characters and line breaks are not allowed in a text."


def name_trouble(text: str) -> str:
    """Why a text is not taken as a name that people choose, "" where it is."""
    if not 0 < len(text) <= 60 or text != text.strip():
        return "a name of 1 to 60 characters without spaces around it is allowed."
    return text_trouble(text)


def nearest(word: str, words: Collection[str]) -> str:
    """ " (did you mean ...?)" for the known word nearest to one that is not known, "" where none is near."""
    folded = {each.lower(): each for each in words}
    near = difflib.get_close_matches(word[:60].lower(), folded, n=1)
    return f" (did you mean {folded[near[0]]}?)" if near else ""


def plain(number: float) -> str:
    """A number as a sentence writes it: no exponent.

    >>> plain(1e7), plain(0.01)
    ('10,000,000', '0.01')
    """
    return f"{number:,.6f}".rstrip("0").rstrip(".")


def shortened(value: object) -> str:
    """A value as a message quotes it: printable, at most 60 characters."""
    if isinstance(value, int) and abs(value) > 10**40:
        return "a whole number of more than 40 digits"
    shown = ascii(value) if isinstance(value, str) and not value.isprintable() else repr(value)
    return shown if len(shown) <= 60 else f"{shown[:57]}..."


def _title(entry: Mapping[str, Any], number: int) -> str:
    name = entry.get("name")
    return f"{shortened(name)}" if isinstance(name, str) and name else f"number {number}"
