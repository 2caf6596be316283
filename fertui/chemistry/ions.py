"""The ions of a nutrient solution: their order, charge and mass, and what a composition says by itself.

A composition is the array of total analytical concentrations [mmol/L] in the order of ``IONS`` on its last axis.
Phosphate counts as H2PO4-. HCO3 stands for alkalinity [meq/L] and may be negative (free strong acid).
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import numpy.typing as npt

from fertui.chemistry.names import ATOMIC_WEIGHT, CATIONS, CHARGES, INDEX, IONS, MICRONUTRIENTS

__all__ = [
    "ATOMIC_WEIGHT", "CATIONS", "CATION_CHARGE", "CHARGE", "INDEX", "IONS", "MICRONUTRIENTS", "Array", "mapping", "vector",
]

Array = npt.NDArray[np.float64]

CHARGE: Array = np.array([CHARGES[ion] for ion in IONS], dtype=float)
CATION_CHARGE: Array = CHARGE[:5]


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
