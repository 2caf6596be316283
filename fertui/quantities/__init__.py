"""Quantities as people write them, and back: a text with unit and species becomes an ion and a canonical number.

Canonical: mmol/L for ions, umol/L for micronutrients, meq/L for HCO3 (alkalinity), mS/cm at 25 C, L, kg, C, J/cm2, %.
Nothing is guessed: what can be read in two ways is refused with the two ways named.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

from fertui.quantities import units
from fertui.quantities.names import Head, Named, column, form, qualified, unit_and_species
from fertui.quantities.numbers import Number, parse_number, split
from fertui.quantities.refusal import QuantityError

__all__ = [
    "Head", "Number", "Quantity", "QuantityError", "column", "concentration", "in_unit", "parse_number", "read",
    "shown_in",
]  # fmt: skip

MMOL_PER_DH = 10.0 / 56.077
"""mmol/L of Ca or Mg in a German degree: 10 mg CaO per litre, by definition."""

MMOL_PER_FH = 0.1
"""mmol/L of Ca or Mg in a French degree."""

HARDNESS_IONS = ("Ca", "Mg", "HCO3")
_MASS_SHOWN_AS = {"NO3": "NO3-N", "NH4": "NH4-N", "H2PO4": "P", "SO4": "S"}


@dataclass(frozen=True, slots=True)
class Quantity:
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
    """A value as written, of an ion in any form or of one of ``units.CANONICAL`` (EC, pH, temperature, light, litres ...).

    ``unit`` is used when the text carries none. Raises ``QuantityError``.

    >>> read("260 10^-5 S/cm", "EC").number
    2.6
    >>> read("<0,1 mg/L", "NH4-N").below
    True
    """
    if what in units.CANONICAL:
        return _measured(text, what, unit)
    return _concentration(text, form(what), unit, what)


def in_unit(number: float, ion: str, unit: str, species: str = "") -> float:
    """Canonical number of an ion shown in another unit; the reverse of ``concentration``. Arrays pass through too.

    Raises ``QuantityError``.

    >>> round(in_unit(5.0, "Ca", "mg/L"), 1)
    200.4
    """
    return number / _factor(form(species or ion), unit)


def shown_in(ion: str, unit: str) -> tuple[str, str]:
    """Unit and species in which an ion is shown on a screen set to mmol/L, meq/L or mg/L.

    Micronutrients stay in umol/L unless mg/L is chosen; mg/L are of the element where the trade counts so.

    >>> shown_in("NO3", "mg/L"), shown_in("Fe", "meq/L")
    (('mg/L', 'NO3-N'), ('umol/L', 'Fe'))
    """
    if unit == "mg/L":
        return unit, _MASS_SHOWN_AS.get(ion, ion)
    if form(ion).species.is_micronutrient:
        return "umol/L", ion
    return ("meq/L" if ion == "HCO3" else unit), ion


def _concentration(text: str | float, meant: Named, unit: str, written_as: str) -> Quantity:
    number, rest = split(text, negative=meant.species.ion == "HCO3")
    written_unit, qualifier = unit_and_species(rest or unit)
    if qualifier:
        meant = qualified(meant, qualifier)
    value = number.value * _factor(meant, written_unit)
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


@lru_cache(maxsize=4096)
def _factor(meant: Named, unit: str) -> float:
    """Canonical units of the ion in one written unit of the form."""
    species = meant.species
    canonical = 1e3 if species.is_micronutrient else 1.0
    if not unit:
        if not meant.has_mass or species.name == species.ion:
            return 1.0
        raise QuantityError(
            f"{species.name} is given without a unit", "mg/L, mmol/L ...", "write the unit behind the number"
        )
    basis, worth = units.basis(unit)
    return canonical * worth * _per_basis(meant, basis, unit)


def _per_basis(meant: Named, basis: str, unit: str) -> float:
    species = meant.species
    if basis == "mg/L":
        if not meant.has_mass:
            raise _mass_of_what(species.ion, unit)
        return 1.0 / species.grams_per_mol_of_ion
    if basis == "mmol/L":
        return species.per_formula if meant.has_mass else 1.0
    if basis == "meq/L":
        if not species.charge:
            raise _no_equivalents(species.name, species.ion)
        return 1.0 / species.charge
    if species.ion not in HARDNESS_IONS:
        raise QuantityError(
            f"{basis} is a degree of hardness, not of {species.name}", "mmol/L, meq/L, mg/L", "use one of these"
        )
    return (MMOL_PER_DH if basis == "dH" else MMOL_PER_FH) * (2.0 if species.ion == "HCO3" else 1.0)


def _mass_of_what(ion: str, unit: str) -> QuantityError:
    pair = {
        "NO3": "NO3 or NO3-N", "NH4": "NH4 or NH4-N", "SO4": "SO4, S or SO3", "H2PO4": "P, PO4, H2PO4 or P2O5",
        "HCO3": "CaCO3 or HCO3",
    }[ion]  # fmt: skip
    return QuantityError(f"{unit} of {ion}: the mass of what is not said", pair, "name the form, as on the report")


def _no_equivalents(name: str, ion: str) -> QuantityError:
    if ion == "H2PO4":
        return QuantityError(
            f"equivalents of {name} are 1 a mol on some reports and 3 on others",
            "H2PO4 in meq/L (1 a mol), or mmol/L, mg/L",
            "ask the laboratory, then enter mmol/L",
        )
    return QuantityError(f"{name} has no agreed charge, so no equivalents", "umol/L, mg/L", "enter umol/L or mg/L")
