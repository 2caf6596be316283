"""A value as written, read: of an ion in any form, or of anything else that is measured."""

from __future__ import annotations

from typing import NamedTuple

from fertui.quantities import units
from fertui.quantities.concentration import factor
from fertui.quantities.names import Named, form, qualified, unit_and_species
from fertui.quantities.numbers import split
from fertui.quantities.refusal import QuantityError


class Quantity(NamedTuple):
    """One value read: canonical name and number; text, unit and species as written; ``below``: written with '<'."""

    name: str
    number: float
    text: str
    unit: str = ""
    species: str = ""
    below: bool = False


def concentration(text: str | float, species: str, unit: str = "") -> tuple[str, float]:
    """Ion and its canonical number [mmol/L; umol/L for micronutrients; meq/L for HCO3] of a value as written.

    ``species`` is the form the value is given in (NO3, NO3-N, P2O5, CaCO3, alkalinity ...); ``unit`` is used when the
    text carries none; without either the number is canonical already. Raises ``QuantityError``.

    >>> ion, mmol_per_l = concentration("730 mg/L", "NO3")
    >>> ion, round(mmol_per_l, 2)
    ('NO3', 11.77)
    >>> concentration("2,4 meq/L", "alkalinity")
    ('HCO3', 2.4)
    """
    value = _concentration(text, form(species), unit, species)
    return value.name, value.number


def read(text: str | float, what: str, unit: str = "") -> Quantity:
    """A value as written, of an ion in any form or of one of ``units.CANONICAL`` (EC, pH, light, litres ...).

    ``unit`` is used when the text carries none. Raises ``QuantityError``.

    >>> read("260 10^-5 S/cm", "EC").number
    2.6
    >>> read("<0,1 mg/L", "NH4-N").below
    True
    """
    if what in units.CANONICAL:
        return _measured(text, what, unit)
    return _concentration(text, form(what), unit, what)


def _concentration(text: str | float, meant: Named, unit: str, written_as: str) -> Quantity:
    number, rest = split(text, negative=meant.species.ion == "HCO3")
    written_unit, qualifier = unit_and_species(rest or unit)
    if qualifier:
        meant = qualified(meant, qualifier)
    value = number.value * factor(meant, written_unit)
    species = meant.species
    written = "" if species.name == species.ion and meant.has_mass else species.name if meant.has_mass else written_as
    return Quantity(species.ion, value, str(text), written_unit, written, number.below)


def _measured(text: str | float, what: str, unit: str) -> Quantity:
    number, rest = split(text, negative=what in ("temperature", "number"))
    written = rest or unit
    if what == "temperature":
        value = units.celsius(number.value, written)
    else:
        value = number.value * units.factor(written, what)
    if what == "pH" and value > 14.0:
        raise QuantityError(f"pH {value:g} cannot be", "0 to 14", "check the decimal mark")
    return Quantity(what, value, str(text), written, "", number.below)
