"""The ions of a nutrient solution: their order, charge and mass, and what a composition says by itself.

A composition is the array of total analytical concentrations [mmol/L] in the order of ``IONS`` on its last axis.
Phosphate counts as H2PO4-. HCO3 stands for alkalinity [meq/L] and may be negative (free strong acid).
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]

IONS = ("K", "Ca", "Mg", "Na", "NH4", "NO3", "Cl", "SO4", "H2PO4", "HCO3")
"""Order of the last axis of every composition."""

CATIONS = IONS[:5]
"""The five exchangeable cations, in the order the exchanger uses."""

MICRONUTRIENTS = ("Fe", "Mn", "Zn", "B", "Cu", "Mo", "Si")
"""Carried in umol/L through recipes, analyses and sheets, without exchange."""

INDEX = {ion: position for position, ion in enumerate(IONS)}
CHARGE: Array = np.array([1.0, 2.0, 2.0, 1.0, 1.0, -1.0, -1.0, -2.0, -1.0, -1.0])
CATION_CHARGE: Array = CHARGE[:5]

ATOMIC_WEIGHT = {
    "H": 1.008, "B": 10.81, "C": 12.011, "N": 14.007, "O": 15.999, "Na": 22.990, "Mg": 24.305, "Si": 28.085,
    "P": 30.974, "S": 32.06, "Cl": 35.45, "K": 39.098, "Ca": 40.078, "Mn": 54.938, "Fe": 55.845, "Cu": 63.546,
    "Zn": 65.38, "Mo": 95.95,
}
"""Standard atomic weights, abridged to five digits: IUPAC CIAAW 2021 table, Pure Appl. Chem. 94:573 (from memory)."""


def vector(ions_mmol_per_l: Mapping[str, float | Array]) -> Array:
    """Composition array [mmol/L], shape (..., 10), from a mapping of ion name to number or array.

    Ions not named are zero. Raises ``KeyError`` naming an ion that is not one of ``IONS``.

    >>> vector({"K": 6, "NO3": 6})
    array([6., 0., 0., 0., 0., 6., 0., 0., 0., 0.])
    """
    for ion in ions_mmol_per_l:
        if ion not in INDEX:
            raise KeyError(f"{ion!r} is not one of {', '.join(IONS)}")
    columns = np.broadcast_arrays(*(np.asarray(ions_mmol_per_l.get(ion, 0.0), dtype=float) for ion in IONS))
    return np.stack(columns, axis=-1)


def mapping(composition: Array) -> dict[str, float]:
    """Mapping of ion name to number from one composition array of shape (10,).

    >>> mapping(vector({"Ca": 5}))["Ca"]
    5.0
    """
    return {ion: float(value) for ion, value in zip(IONS, composition, strict=True)}
