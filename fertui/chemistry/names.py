"""Names, order, charge and weight of the ions, as plain tuples: readable without loading numpy."""

from __future__ import annotations

IONS = ("K", "Ca", "Mg", "Na", "NH4", "NO3", "Cl", "SO4", "H2PO4", "HCO3")
"""Order of the last axis of every composition."""

CATIONS = IONS[:5]
"""The five exchangeable cations, in the order the exchanger uses."""

MICRONUTRIENTS = ("Fe", "Mn", "Zn", "B", "Cu", "Mo", "Si")
"""Carried in umol/L through recipes, analyses and sheets, without exchange."""

CHARGES = {"K": 1, "Ca": 2, "Mg": 2, "Na": 1, "NH4": 1, "NO3": -1, "Cl": -1, "SO4": -2, "H2PO4": -1, "HCO3": -1}

INDEX = {ion: position for position, ion in enumerate(IONS)}

# fmt: off
ATOMIC_WEIGHT = {
    "H": 1.008, "B": 10.81, "C": 12.011, "N": 14.007, "O": 15.999, "Na": 22.990, "Mg": 24.305, "Si": 28.085,
    "P": 30.974, "S": 32.06, "Cl": 35.45, "K": 39.098, "Ca": 40.078, "Mn": 54.938, "Fe": 55.845, "Cu": 63.546,
    "Zn": 65.38, "Mo": 95.95,
}
# fmt: on
"""Standard atomic weights, abridged to five digits: IUPAC CIAAW 2021 table, Pure Appl. Chem. 94:573 (from memory)."""
