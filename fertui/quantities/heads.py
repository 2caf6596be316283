"""Heads of table columns: name, unit and form of what stands below them."""

from __future__ import annotations

import re
from functools import cache
from typing import NamedTuple

from fertui.quantities import units
from fertui.quantities.concentration import factor
from fertui.quantities.names import fold, named, qualified, unit_and_species
from fertui.quantities.numbers import LONGEST, tidy
from fertui.quantities.refusal import QuantityError

MEASURES: dict[str, tuple[str, str]] = {
    "EC": ("EC", "EC"), "EC25": ("EC", "EC"), "conductivity": ("EC", "EC"), "soluble salts": ("EC", "EC"),
    "SS": ("EC", "EC"), "pH": ("pH", "pH"), "temperature": ("temperature", "temperature"),
    "temp": ("temperature", "temperature"), "light_sum": ("light_sum", "light"),
    "radiation_sum": ("light_sum", "light"),
}  # fmt: skip
"""What else a table of readings carries: canonical name and what it measures."""

LONGEST_HEAD = 200


class Head(NamedTuple):
    """Head of a column: canonical name, unit and form as written ('' where the canonical ones are meant)."""

    name: str
    unit: str
    species: str


def column(head: str) -> Head:
    """What a column head says: "NO3-N [mg/L]", "alkalinity [mg/L CaCO3]", "EC [10^-5 S/cm]", "K_mmol_L".

    A name that is no ion and no measure comes back as written, with its unit. Raises ``QuantityError`` for no
    name and for a unit that does not go with an ion or a measure.

    >>> column("NO3-N [mg/L]")
    Head(name='NO3', unit='mg/L', species='NO3-N')
    >>> column("EC [10^-5 S/cm]").unit
    '10^-5 S/cm'
    >>> column("K_mmol_L")
    Head(name='K', unit='mmol/L', species='')
    """
    name, unit = _parted(tidy(head, LONGEST_HEAD))
    if not name:
        raise QuantityError(
            "a column has no head", "a name, with its unit in brackets", "name it, for example K [mmol/L]"
        )
    measure = _measures().get(fold(name)) if len(name) <= LONGEST else None
    if measure is not None:
        if unit and measure[1] != "temperature":
            units.factor(unit, measure[1])
        return Head(measure[0], unit, "")
    found = named(name) if len(name) <= LONGEST else None
    if found is None:
        return Head(name, unit, "")
    unit, qualifier = unit_and_species(unit)
    if qualifier:
        found = qualified(found, qualifier)
    if unit:
        factor(found, unit)
    own_name = found.has_mass and found.species.name == found.species.ion
    return Head(found.species.ion, unit, "" if own_name else found.species.name if found.has_mass else name)


def _parted(head: str) -> tuple[str, str]:
    """Name and unit of a head, the unit in brackets, behind a space or behind underscores."""
    bracketed = re.fullmatch(r"(.+?)\s*[\[(]\s*([^\[\]()]*?)\s*[\])]", head)
    if bracketed:
        return bracketed[1], bracketed[2]
    for mark, between in ((" ", " "), ("_", "/")):
        parts = head.split(mark)
        for cut in range(1, len(parts)):
            unit = between.join(parts[cut:])
            if len(unit) < 20 and units.is_unit(unit) and units.fold(unit) != "pct":
                return mark.join(parts[:cut]).rstrip(" ,:"), unit
    return head, ""


@cache
def _measures() -> dict[str, tuple[str, str]]:
    return {fold(name): measure for name, measure in MEASURES.items()}
