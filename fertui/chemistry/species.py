"""The forms under which analyses and labels name an ion: ``NO3-N``, ``P2O5``, ``CaCO3`` ... and what each is worth.

An amount written as a form becomes an amount of the ion by the atoms both share: 1 mol P2O5 is 2 mol H2PO4-. Oxides
and "-N" are ways of counting; nothing else is meant to be in the water.
"""

from __future__ import annotations

from typing import NamedTuple

from fertui.chemistry.formula import molar_mass
from fertui.chemistry.names import MICRONUTRIENTS


class Species(NamedTuple):
    """One way of writing an ion.

    ``formula`` is what the mass is the mass of; ``per_formula`` how many mol of the ion (for HCO3: equivalents of
    alkalinity) one mol of the formula stands for; ``charge`` the equivalents in a mol of the ion, 0 where practice does
    not agree on a number and equivalents are therefore no unit for it.
    """

    name: str
    ion: str
    formula: str
    per_formula: float
    charge: int

    @property
    def grams_per_mol_of_ion(self) -> float:
        """Mass written per mol of the ion [g/mol] (for HCO3: per equivalent).

        >>> round(SPECIES["P2O5"].grams_per_mol_of_ion, 2)
        70.97
        """
        return molar_mass(self.formula) / self.per_formula

    @property
    def is_micronutrient(self) -> bool:
        """Whether the canonical unit is umol/L."""
        return self.ion in MICRONUTRIENTS


_FORMS: tuple[tuple[str, str, str, float, int], ...] = (
    ("K", "K", "K", 1, 1), ("K2O", "K", "K2O", 2, 1),
    ("Ca", "Ca", "Ca", 1, 2), ("CaO", "Ca", "CaO", 1, 2), ("Ca as CaCO3", "Ca", "CaCO3", 1, 2),
    ("Mg", "Mg", "Mg", 1, 2), ("MgO", "Mg", "MgO", 1, 2), ("Mg as CaCO3", "Mg", "CaCO3", 1, 2),
    ("Na", "Na", "Na", 1, 1), ("Na2O", "Na", "Na2O", 2, 1),
    ("NH4", "NH4", "NH4", 1, 1), ("NH4-N", "NH4", "N", 1, 1), ("NH3", "NH4", "NH3", 1, 1),
    ("NO3", "NO3", "NO3", 1, 1), ("NO3-N", "NO3", "N", 1, 1),
    ("Cl", "Cl", "Cl", 1, 1),
    ("SO4", "SO4", "SO4", 1, 2), ("S", "SO4", "S", 1, 2), ("SO3", "SO4", "SO3", 1, 2),
    ("H2PO4", "H2PO4", "H2PO4", 1, 1), ("HPO4", "H2PO4", "HPO4", 1, 0), ("PO4", "H2PO4", "PO4", 1, 0),
    ("P", "H2PO4", "P", 1, 0), ("P2O5", "H2PO4", "P2O5", 2, 0),
    ("HCO3", "HCO3", "HCO3", 1, 1), ("CO3", "HCO3", "CO3", 2, 1), ("CaCO3", "HCO3", "CaCO3", 2, 1),
    ("Fe", "Fe", "Fe", 1, 0), ("Mn", "Mn", "Mn", 1, 0), ("Zn", "Zn", "Zn", 1, 0), ("Cu", "Cu", "Cu", 1, 0),
    ("B", "B", "B", 1, 0), ("H3BO3", "B", "H3BO3", 1, 0), ("B2O3", "B", "B2O3", 2, 0),
    ("Mo", "Mo", "Mo", 1, 0), ("MoO4", "Mo", "MoO4", 1, 0),
    ("Si", "Si", "Si", 1, 0), ("SiO2", "Si", "SiO2", 1, 0),
)  # fmt: skip

SPECIES = {row[0]: Species(*row) for row in _FORMS}
"""Every form by the name the program writes it with. Phosphate in equivalents is 1 (H2PO4-) in some countries and 3
(PO4---) in others, so of the phosphates only H2PO4 has a charge. CaCO3 alone is alkalinity."""
