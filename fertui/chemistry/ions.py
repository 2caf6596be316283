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
    "ATOMIC_WEIGHT", "CATIONS", "CATION_CHARGE", "CHARGE", "INDEX", "IONS", "MICRONUTRIENTS", "NOT_NORMALISED",
    "REFERENCE_BELOW_TARGET", "Array", "charges", "composition", "imbalance_meq", "imbalance_pct", "mapping",
    "normalised", "nutrient_ec", "shares", "vector",
]  # fmt: skip

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


def composition(ions_mmol_per_l: Mapping[str, float | Array] | Array) -> Array:
    """Composition array [mmol/L], shape (..., 10), from a mapping or from an array that is one already.

    Raises ``ValueError`` when the last axis of an array is not the ten ``IONS``.

    >>> composition([6, 0, 0, 0, 0, 6, 0, 0, 0, 0]).shape
    (10,)
    """
    if isinstance(ions_mmol_per_l, Mapping):
        return vector(ions_mmol_per_l)
    array = np.asarray(ions_mmol_per_l, dtype=float)
    if array.ndim == 0 or array.shape[-1] != len(IONS):
        raise ValueError(f"the last axis must hold {len(IONS)} ions ({', '.join(IONS)}); found shape {array.shape}")
    return array


def mapping(composition: Array) -> dict[str, float]:
    """Mapping of ion name to number [mmol/L; HCO3 meq/L] from one composition array of shape (10,).

    >>> mapping(vector({"Ca": 5}))["Ca"]
    5.0
    """
    return {ion: float(value) for ion, value in zip(IONS, composition, strict=True)}


def imbalance_meq(ions: Array) -> Array:
    """Charge left over [meq/L], cations less anions, of compositions (..., 10) [mmol/L].

    >>> tomato = vector({"K": 8, "Ca": 5, "Mg": 2.4, "NH4": 1, "NO3": 16, "SO4": 4, "H2PO4": 1.5})
    >>> round(float(imbalance_meq(tomato)), 2)
    -1.7
    """
    return np.asarray(ions) @ CHARGE


def charges(ions: Array) -> tuple[Array, Array]:
    """Sum of cations and sum of anions [meq/L] of compositions (..., 10) [mmol/L]; both positive.

    >>> cations, anions = charges(vector({"K": 6, "Ca": 5, "Mg": 2, "NO3": 15, "SO4": 2, "H2PO4": 1}))
    >>> float(cations), float(anions)
    (20.0, 20.0)
    """
    equivalents = np.asarray(ions) * CHARGE
    return equivalents[..., :5].sum(axis=-1), -equivalents[..., 5:].sum(axis=-1)


def imbalance_pct(ions: Array) -> Array:
    """Charge imbalance [%], 100 (cations - anions) / (cations + anions), of compositions (..., 10) [mmol/L].

    >>> tomato = vector({"K": 8, "Ca": 5, "Mg": 2.4, "NH4": 1, "NO3": 16, "SO4": 4, "H2PO4": 1.5})
    >>> round(float(imbalance_pct(tomato)), 1)
    -3.4
    """
    cations, anions = charges(ions)
    return 100.0 * (cations - anions) / np.maximum(cations + anions, 1e-12)


def shares(ions: Array) -> Array:
    """Shares [%] of K, Ca, Mg in their sum, in equivalents, (..., 3), of compositions (..., 10) [mmol/L].

    >>> shares(vector({"K": 6, "Ca": 5, "Mg": 2})).tolist()
    [30.0, 50.0, 20.0]
    """
    equivalents = np.asarray(ions, dtype=float)[..., :3] * CHARGE[:3]
    return 100.0 * equivalents / np.maximum(equivalents.sum(axis=-1, keepdims=True), 1e-12)


def nutrient_ec(ec_ms_per_cm: float | Array, na_mmol_per_l: float | Array) -> Array:
    """EC without the part of sodium [mS/cm]: EC - 0.1 Na (Dutch booklet 2016, second-hand), EC at 25 degrees C.

    >>> round(float(nutrient_ec(4.0, 8.0)), 1)
    3.2
    """
    return np.asarray(ec_ms_per_cm) - 0.1 * np.asarray(na_mmol_per_l)


NOT_NORMALISED = ("Na", "NH4", "HCO3")
"""Ions that do not scale with the strength of the feed (Dutch booklet 2016: Na, HCO3; NH4 by practice)."""

REFERENCE_BELOW_TARGET = 0.3
"""The reference EC lies this far [mS/cm] below the target EC (Dutch booklet 2016, second-hand)."""


def normalised(ions: Array, ec_ms_per_cm: float | Array, target_ec_ms_per_cm: float | Array) -> Array:
    """Composition scaled to the reference EC, so that only its proportions are compared with a target.

    ``ions`` (..., 10) [mmol/L]; EC measured and target [mS/cm] at 25 degrees C. Returns (..., 10) [mmol/L].
    c EC_ref / nutrient EC, EC_ref = target EC - 0.3; Na, NH4, HCO3 stay as they are (Dutch booklet 2016, second-hand).
    Raises ``ValueError`` where the nutrient EC is not above zero.

    >>> normalised(vector({"K": 10, "Na": 5}), ec_ms_per_cm=4.2, target_ec_ms_per_cm=4.0)[:4].tolist()
    [10.0, 0.0, 0.0, 5.0]
    """
    ions = np.asarray(ions, dtype=float)
    nutrient = nutrient_ec(ec_ms_per_cm, ions[..., INDEX["Na"]])
    if not np.all(nutrient > 0.0):
        raise ValueError(
            f"EC {ec_ms_per_cm} mS/cm less 0.1 x Na leaves nothing to scale by: check EC and Na of the analysis"
        )
    scale = (np.asarray(target_ec_ms_per_cm) - REFERENCE_BELOW_TARGET) / nutrient
    scaled = ions * scale[..., None]
    kept = [INDEX[ion] for ion in NOT_NORMALISED]
    scaled[..., kept] = ions[..., kept]
    return scaled
