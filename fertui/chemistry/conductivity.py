"""Electrical conductivity from the ions, its temperature compensation, and a straight-line form for inner loops."""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np

from fertui.chemistry.activity import FREE_IONS, speciate
from fertui.chemistry.ions import INDEX, IONS, Array, composition

# Columns: a2, a1, a0 of the limiting conductivity lambda0(t) [S cm2/mol]; a2, a1, a0 of A(t); B.
#
# Form, and rows CO3, HSO4, H, OH: McCleskey, Nordstrom, Ryan & Ball 2012, Geochim. Cosmochim. Acta 77:369-382, read
# in an open copy that had lost signs; with the pairs used here it reads MgCl2 7 % high and Na2SO4 30 % low. So
# the other rows keep its B and the course of A, but lambda0 at 25 degrees C is that of the CRC Handbook, and the course
# of lambda0 and the size of A were laid by least squares through the single-salt equations of McCleskey 2011, J. Chem.
# Eng. Data 56:317-327 (NaCl, NH4Cl, CaCl2, MgCl2, Na2SO4, K2SO4, KNO3, CaSO4, KHCO3; 5-35 degrees C, ionic strength to
# 0.12), each relative to its KCl and brought onto IUPAC's KCl (Pratt et al. 2001, Pure Appl. Chem. 73:1783).
_ROWS: dict[str, tuple[float, ...]] = {
    "K": (0.004101, 1.2136, 40.576, 0.006166, 1.0736, 26.034, 1.5),
    "Ca": (0.009079, 1.9979, 63.319, 0.038059, 2.7987, 158.64, 2.8),
    "Mg": (0.009769, 1.7925, 55.081, 0.035344, 2.7592, 115.99, 2.1),
    "Na": (0.004503, 0.82753, 26.577, 0.000214, 0.90323, 25.387, 1.7),
    "NH4": (0.001817, 1.3929, 37.542, 0.001792, 0.82382, 15.187, 0.3),
    "NO3": (0.001329, 1.2668, 38.92, 0.001298, 0.55498, 25.642, 0.1),
    "Cl": (0.004030, 1.3329, 40.469, 0.005733, 0.88556, 20.584, 1.5),
    "SO4": (0.01007, 2.8888, 81.483, 0.027873, 4.9381, 162.26, 2.6),
    "HCO3": (0.000787, 0.90629, 21.351, -0.004785, 0.85204, 10.435, 0.1),
    "CO3": (-0.000326, 2.998, 64.03, 0.00181, 5.542, 120.2, 2.3),
    "HSO4": (0.000927, 0.8337, 29.56, 0.02887, 0.873, 36.25, 7.0),
    "H": (-0.01414, 5.355, 224.2, -0.00918, 1.842, 39.23, 0.3),
    "OH": (0.003396, 2.925, 121.3, 0.00933, 0.1086, 35.9, 0.01),
}

# The source has no phosphates: they follow the ion of their own charge, scaled to their limiting conductivity at
# 25 degrees C (CRC Handbook: H2PO4 36, HPO4 114 S cm2/mol). They carry about 1.3 % of a nutrient solution's EC.
_SCALED = {"H2PO4": ("HCO3", 36.0 / 44.5), "HPO4": ("SO4", 114.0 / 160.0)}


def _table() -> Array:
    rows = dict(_ROWS)
    for ion, (like, factor) in _SCALED.items():
        rows[ion] = (*(factor * value for value in _ROWS[like][:6]), _ROWS[like][6])
    return np.array([rows[ion] for ion in FREE_IONS])


IONIC: Array = _table()
"""Coefficients of the ionic conductivities, one row for each of ``activity.FREE_IONS``."""

SULFATE_PAIR, SULFATE_PAIR_PER_K = 166.0, 0.02
"""Molar conductivity [S cm2/mol] of KSO4-, NaSO4-, NH4SO4- at 25 degrees C and its relative change per K, from the
same least squares. An effective number: the ions themselves would carry about 45, the rest gives back what their
strong pair constants take from free sulfate. Neutral pairs, and the charged phosphate pairs, carry nothing."""

_ALKALI = [INDEX[ion] for ion in ("K", "Na", "NH4")]

F25: Array = np.array([
    1.918, 1.857, 1.800, 1.745, 1.693, 1.643, 1.596, 1.551, 1.508, 1.467, 1.428, 1.390, 1.354, 1.320, 1.287, 1.256,
    1.225, 1.196, 1.168, 1.141, 1.116, 1.091, 1.067, 1.044, 1.021, 1.000, 0.979, 0.959, 0.940, 0.921, 0.903, 0.886,
    0.869, 0.853, 0.837, 0.822,
])  # fmt: skip
"""Factors to 25 degrees C at 0, 1 ... 35 degrees C: ISO 7888:1985 (DIN EN 27888), read in two instrument manuals."""


def conductivity(
    ions_mmol_per_l: Mapping[str, float | Array] | Array, temperature_c: float | Array = 25.0, ph: float | Array = 5.8
) -> Array:
    """Electrical conductivity [mS/cm] at the temperature given, shape of the leading axes.

    ``ions_mmol_per_l``: mapping, or array (..., 10) [mmol/L]; HCO3 stands for alkalinity [meq/L].
    Raises ``ValueError`` for a pH outside 0-14 or a temperature outside 0-40 degrees C.
    EC = sum of lambda m over free ions and alkali-sulfate pairs, lambda = lambda0(t) - A(t) sqrt I / (1 + B sqrt I).
    Form of McCleskey et al. 2012, coefficients as told at the head of this file, free ions of ``activity``; range 0-40
    degrees C, ionic strength to 0.5 mol/L.

    >>> round(float(conductivity({"K": 6, "Ca": 5, "Mg": 2, "NO3": 15, "SO4": 2, "H2PO4": 1})), 2)
    2.14
    """
    ions, temperature = composition(ions_mmol_per_l), np.asarray(temperature_c, dtype=float)
    solution = speciate(ions, ph, temperature)
    paired = (np.maximum(ions[..., _ALKALI], 0.0) - solution.free[..., _ALKALI]).sum(axis=-1)
    by_pairs = SULFATE_PAIR * (1.0 + SULFATE_PAIR_PER_K * (temperature - 25.0)) * paired
    by_ions = np.einsum("...i,...i->...", _ionic(solution.ionic_strength, temperature), solution.free)
    return (1e-3 * (by_ions + by_pairs))[()]


def _ionic(strength: Array, temperature: Array) -> Array:
    """Molar conductivities [S cm2/mol] of ``FREE_IONS``, shape (..., 15)."""
    root = np.sqrt(strength)[..., None]
    t = temperature[..., None]
    limiting = IONIC[:, 2] + t * (IONIC[:, 1] + t * IONIC[:, 0])
    decrease = IONIC[:, 5] + t * (IONIC[:, 4] + t * IONIC[:, 3])
    return limiting - decrease * (root / (1.0 + IONIC[:, 6] * root))


def to_reference(
    ec_ms_per_cm: float | Array,
    temperature_c: float | Array,
    coefficient_per_k: float | None = None,
    reference_c: float = 25.0,
) -> Array:
    """EC [mS/cm] at the reference temperature from EC [mS/cm] read at the temperature of the sample.

    ``coefficient_per_k``: None for the ISO 7888 factors, or the meter's linear coefficient, 0.0191-0.021 as a rule.
    Raises ``ValueError`` for ISO 7888 outside 0-35 degrees C.

    >>> round(float(to_reference(2.0, 20.0)), 3), round(float(to_reference(2.0, 20.0, coefficient_per_k=0.02)), 3)
    (2.232, 2.222)
    """
    return np.asarray(ec_ms_per_cm) * _factor(temperature_c, coefficient_per_k, reference_c)


def from_reference(
    ec_ms_per_cm: float | Array,
    temperature_c: float | Array,
    coefficient_per_k: float | None = None,
    reference_c: float = 25.0,
) -> Array:
    """EC [mS/cm] at the temperature of the sample from EC [mS/cm] at the reference: undoes ``to_reference``.

    >>> round(float(from_reference(2.232, 20.0)), 3)
    2.0
    """
    return np.asarray(ec_ms_per_cm) / _factor(temperature_c, coefficient_per_k, reference_c)


def _factor(temperature_c: float | Array, coefficient_per_k: float | None, reference_c: float) -> Array:
    """EC at the reference temperature over EC at the temperature of the sample."""
    if coefficient_per_k is not None:
        return 1.0 / (1.0 + coefficient_per_k * (np.asarray(temperature_c, dtype=float) - reference_c))
    return _f25(temperature_c) / _f25(reference_c)


def _f25(temperature_c: float | Array) -> Array:
    temperature = np.asarray(temperature_c, dtype=float)
    last = len(F25) - 1
    if not np.all((temperature >= 0.0) & (temperature <= last)):
        raise ValueError(f"ISO 7888 covers 0 to {last} degrees C; found {temperature.min():g} to {temperature.max():g}")
    return np.interp(temperature, np.arange(last + 1), F25)


class Linearised(NamedTuple):
    """EC as a straight line in the ions about one composition: EC = ec + (c - at) . slope."""

    at: Array
    """Composition [mmol/L] it was drawn at, shape (10,)."""
    ec: float
    """EC there [mS/cm]."""
    slope: Array
    """[mS/cm per mmol/L] of each ion, shape (10,)."""

    def __call__(self, composition: Array) -> Array:
        """EC [mS/cm] of compositions (..., 10) [mmol/L], shape (...)."""
        return self.ec + (composition - self.at) @ self.slope


def linearise(
    ions_mmol_per_l: Mapping[str, float | Array] | Array,
    temperature_c: float = 25.0,
    ph: float = 5.8,
    step: float = 0.05,
) -> Linearised:
    """Straight-line form of ``conductivity`` about one composition, for many compositions that scatter around it.

    ``ions_mmol_per_l``: mapping, or array (10,) [mmol/L]. ``step`` [mmol/L]: half width of the differences.
    Range: within 2.5 % while the ions scatter by 30 % about the composition (checked in the tests).

    >>> line = linearise({"K": 6, "Ca": 5, "Mg": 2, "NO3": 15, "SO4": 2, "H2PO4": 1})
    >>> round(float(line(line.at * 1.1)), 2)
    2.34
    """
    at = composition(ions_mmol_per_l)
    moves = step * np.eye(len(IONS))
    ec = conductivity(np.concatenate([at[None], at + moves, at - moves]), temperature_c, ph)
    up, down = ec[1 : 1 + len(IONS)], ec[1 + len(IONS) :]
    width = step + np.minimum(step, np.maximum(at, 0.0))  # below zero an ion carries nothing
    return Linearised(at, float(ec[0]), (up - down) / width)
