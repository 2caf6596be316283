"""Concentrations of ions: what one written unit of a form is worth, and the way back to the screen."""

from __future__ import annotations

from functools import lru_cache

from fertui.quantities import units
from fertui.quantities.names import Named, form
from fertui.quantities.refusal import QuantityError

MMOL_PER_DH = 10.0 / 56.077
"""mmol/L of Ca or Mg in a German degree: 10 mg CaO per litre, by definition."""

MMOL_PER_FH = 0.1
"""mmol/L of Ca or Mg in a French degree."""

HARDNESS_IONS = ("Ca", "Mg", "HCO3")
_MASS_SHOWN_AS = {"NO3": "NO3-N", "NH4": "NH4-N", "H2PO4": "P", "SO4": "S"}


def in_unit(number: float, ion: str, unit: str, species: str = "") -> float:
    """Canonical number of an ion shown in another unit; the reverse of ``concentration``. Arrays pass through too.

    Raises ``QuantityError``.

    >>> round(in_unit(5.0, "Ca", "mg/L"), 1)
    200.4
    """
    return number / factor(form(species or ion), unit)


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


@lru_cache(maxsize=4096)
def factor(meant: Named, unit: str) -> float:
    """Canonical units of the ion in one written unit of the form; without a unit the ion's own name is canonical.

    Raises ``QuantityError`` for a unit that does not fit the form.

    >>> round(factor(form("CaCO3"), "mg/L"), 5)
    0.01998
    """
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
