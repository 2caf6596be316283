"""What the crop takes: one rate law for every ion, its table of constants, and the notices that go with it.

Per loop and day, ion i:

    U_i = Tq_i UC_i m_i (c_i / c_ref,i)^b_i  phi(c_i) / phi(c_ref,i)  r_i         [mmol/d]
    phi(c) = (c - Cmin)+ / (Km + (c - Cmin)+)         Tq_i = T^q_i T_ref^(1 - q_i)

T crop water [L/d], UC uptake concentration [mmol/L] at the reference composition, m the multiplier learned from the
grower's own data, r antagonism. Carriers saturate (Michaelis-Menten with Cmin: Claassen & Barber 1976,
Agron. J. 68:961, from memory); the exponent carries channels and mass flow.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from fertui.chemistry.ions import CHARGE, INDEX, IONS, Array

_K, _CA, _MG, _NA, _NH4, _NO3 = (INDEX[ion] for ion in ("K", "Ca", "Mg", "Na", "NH4", "NO3"))
_TRACE = 1e-12
COOL_ROOTS_C, WARM_ROOTS_C = 15.0, 26.0


class Parameter(NamedTuple):
    """One constant: its value, the range it may lie in, unit, source and status ("read", "derived", "assumed")."""

    name: str
    ion: str
    value: float
    low: float
    high: float
    unit: str
    source: str
    status: str


_CARRIERS = "Lazaroff & Pitman 1966; measured houses, analyses every 14 d"
_SUGGESTED = "default from published ranges"
_WATER = "measured houses: water to the power 0.5-0.75"


def _rows(
    name: str, unit: str, source: str, status: str, **by_ion: tuple[float, float, float]
) -> tuple[Parameter, ...]:
    return tuple(Parameter(name, ion, *numbers, unit, source, status) for ion, numbers in by_ion.items())


UPTAKE_TABLE: tuple[Parameter, ...] = (
    *_rows(
        "b", "-", _CARRIERS, "derived",
        K=(0.4, 0.0, 1.0), NO3=(0.4, 0.0, 1.0), H2PO4=(0.4, 0.0, 1.0), Cl=(0.4, 0.0, 1.0), Ca=(1.0, 0.3, 1.0),
        Mg=(1.0, 0.3, 1.0), SO4=(1.0, 0.3, 1.0), NH4=(1.0, 0.4, 1.0), Na=(1.0, 0.5, 1.5),
    ),
    *_rows(
        "q", "-", _WATER, "derived",
        K=(0.6, 0.5, 1.0), NO3=(0.6, 0.5, 1.0), H2PO4=(0.6, 0.5, 1.0), Cl=(1.0, 0.5, 1.0), Ca=(0.6, 0.5, 1.0),
        Mg=(0.6, 0.5, 1.0), SO4=(0.6, 0.5, 1.0), NH4=(0.6, 0.5, 1.0), Na=(1.0, 0.5, 1.0),
    ),
    *_rows(
        "Km", "mmol/L", "Kochian & Lucas 1982, Plant Physiol. 70:1723: 0.016-0.086 in maize", "read",
        K=(0.05, 0.01, 0.09),
    ),
    *_rows(
        "Km", "mmol/L", "tomato 'T-5', intact plants, Plant Cell Environ. 1993", "read",
        NO3=(0.05, 0.01, 0.05), NH4=(0.02, 0.02, 0.05),
    ),
    *_rows(
        "Km", "mmol/L", "barley, Planta 1973, 112:159: 0.077 meq/L", "read", Ca=(0.04, 0.02, 0.08),
    ),
    *_rows(
        "Km", "mmol/L", _SUGGESTED, "assumed",
        H2PO4=(0.01, 0.003, 0.03), Cl=(0.02, 0.01, 0.05), Mg=(0.05, 0.02, 0.1), SO4=(0.03, 0.01, 0.05),
        Na=(0.02, 0.01, 0.05),
    ),
    *_rows(
        "Cmin", "mmol/L", "Gonzales, Maruo & Shinohara 2010: tomato in NFT, three plant sizes", "read",
        K=(0.03, 0.03, 0.10), NO3=(0.01, 0.01, 0.04), Ca=(0.03, 0.01, 0.10), Mg=(0.02, 0.005, 0.045),
        H2PO4=(0.005, 0.001, 0.09),
    ),
    *_rows("Cmin", "mmol/L", _SUGGESTED, "assumed",
           Cl=(0.0, 0.0, 0.01), SO4=(0.0, 0.0, 0.01), NH4=(0.005, 0.0, 0.01), Na=(0.0, 0.0, 0.0)),
    Parameter("a", "K+NH4 on Ca, Mg", 0.15, 0.0, 0.30, "-",
              "sign: Bar-Tal & Pressman 1996, JASHS 121:649; size: no published figure found", "assumed"),
    Parameter("Ki", "NaCl on NO3", 62.5, 40.0, 100.0, "mmol/L",
              "from Massa, Mattson & Lieth 2009, Plant Soil 318:101 (rose)", "derived"),
    Parameter("Q10", "all but Ca", 2.0, 1.5, 2.5, "per 10 C",
              "barley influx of K, Cl, NO3, SO4; J. Exp. Bot.; about 1 for Ca", "read"),
)  # fmt: skip
"""Every constant of the rate law, one row each; ``Kinetics`` reads its defaults here."""


def _column(name: str, otherwise: float) -> Array:
    column = np.full(len(IONS), otherwise)
    for row in UPTAKE_TABLE:
        if row.name == name and row.ion in INDEX:
            column[INDEX[row.ion]] = row.value
    return column


def _single(name: str) -> float:
    return next(row.value for row in UPTAKE_TABLE if row.name == name)


class Kinetics(NamedTuple):
    """The constants of the rate law as arrays (10,) in ion order; HCO3 is not taken up but follows from charge."""

    b: Array = _column("b", 0.0)
    q: Array = _column("q", 1.0)
    km: Array = _column("Km", 1.0)
    c_min: Array = _column("Cmin", 0.0)
    antagonism: float = _single("a")
    salt_half: float = _single("Ki")
    q10: float = _single("Q10")


@dataclass(frozen=True, slots=True)
class Plants:
    """A crop in its stage, on its loop.

    ``uptake_concentration`` (10,) or (M, 10) [mmol per L of crop water] at the ``reference`` composition (10,) [mmol/L]
    of the root zone; ``reference_l_d`` [L/d]: the loop's own season mean of crop water; ``multiplier`` (10,) or
    (M, 10); ``light_share`` (10,): fraction of the drive that follows light instead of water (0: none).
    Raises ``ValueError`` for an ion taken up whose reference is not above its Cmin.
    """

    uptake_concentration: Array
    reference: Array
    reference_l_d: float
    multiplier: Array | float = 1.0
    light_share: Array | float = 0.0
    kinetics: Kinetics = Kinetics()

    def __post_init__(self) -> None:
        wanted = np.asarray(self.uptake_concentration)
        starved = np.any(wanted > 0, axis=tuple(range(wanted.ndim - 1))) & (self.reference <= self.kinetics.c_min)
        if starved.any() or not self.reference_l_d > 0:
            names = ", ".join(ion for ion, bad in zip(IONS, starved, strict=True) if bad) or "none"
            raise ValueError(
                f"reference composition must lie above Cmin for every ion taken up (too low: {names}) "
                f"and reference_l_d ({self.reference_l_d:g}) above 0"
            )


def demand(plants: Plants, crop_l_d: npt.ArrayLike, light: npt.ArrayLike = 1.0, excursion_c: float = 0.0) -> Array:
    """What does not depend on the solution (M, 10) or (1, 10): Tq UC m and the factors that are 1 at the reference.

    ``crop_l_d`` scalar or (M,) [L/d]; ``light`` relative to the usual; ``excursion_c`` of the root temperature [C].
    """
    kin = plants.kinetics
    at_reference = np.maximum(plants.reference - kin.c_min, _TRACE)
    scale = (kin.km + at_reference) / at_reference * np.maximum(plants.reference, _TRACE) ** -kin.b
    if excursion_c:
        scale = scale * excursion_factor(excursion_c, kin.q10)
    wanted = np.asfortranarray(np.atleast_2d(plants.uptake_concentration * plants.multiplier)) * scale
    wanted = wanted * _drive(plants, crop_l_d, light)
    wanted[:, -1] = 0.0
    return wanted


def conductance(plants: Plants, wanted: Array, mmol_l: Array) -> Array:
    """The k [L/d] (M, 10) for which uptake is k (c - Cmin)+: the form the implicit step needs.

    ``wanted``: from ``demand``; ``mmol_l`` (M, 10) [mmol/L] of the root zone. Zero at and below Cmin.
    """
    kin = plants.kinetics
    above = mmol_l - kin.c_min
    k = wanted * np.exp(kin.b * np.log(np.maximum(mmol_l, _TRACE))) / (kin.km + np.maximum(above, 0.0))
    _oppose(plants, mmol_l, k)
    return k * (above > 0.0)


def uptake(
    plants: Plants, mmol_l: Array, crop_l_d: npt.ArrayLike, light: npt.ArrayLike = 1.0, excursion_c: float = 0.0
) -> Array:
    """Uptake [mmol/d] (M, 10) of the whole loop; the HCO3 column is the charge taken up (negative: alkalinity rises).

    >>> plants = Plants(uptake_concentration=np.full(10, 2.0), reference=np.full(10, 4.0), reference_l_d=3.0)
    >>> uptake(plants, np.full((1, 10), 4.0), 3.0)[0, :3]
    array([6., 6., 6.])
    """
    k = conductance(plants, demand(plants, crop_l_d, light, excursion_c), mmol_l)
    taken = k * np.maximum(mmol_l - plants.kinetics.c_min, 0.0)
    taken[:, -1] = taken[:, :-1] @ CHARGE[:-1]
    return taken


def _drive(plants: Plants, crop_l_d: npt.ArrayLike, light: npt.ArrayLike) -> Array:
    """Tq [L/d] (M, 10) or (1, 10): water to the power q about the season mean, part of it by light where asked."""
    relative = np.maximum(np.atleast_1d(np.asarray(crop_l_d, dtype=float)) / plants.reference_l_d, _TRACE)
    by_water = np.exp(np.multiply.outer(plants.kinetics.q, np.log(relative)).T)
    if np.any(np.asarray(plants.light_share) > 0):
        by_light = np.atleast_1d(np.asarray(light, dtype=float))[:, None]
        by_water = by_water + plants.light_share * (by_light - by_water)
    return plants.reference_l_d * by_water


def _oppose(plants: Plants, mmol_l: Array, k: Array) -> None:
    """Antagonism, in place: K and NH4 on Ca and Mg, one way, within 0.5-2; NaCl on NO3; 1 at the reference."""
    kin, reference = plants.kinetics, plants.reference
    rivals = reference[_K] + reference[_NH4]
    if kin.antagonism and rivals > 0:
        crowd = np.maximum(mmol_l[:, _K] + mmol_l[:, _NH4], _TRACE) / rivals
        factor = np.minimum(np.maximum(np.exp(-kin.antagonism * np.log(crowd)), 0.5), 2.0)
        k[:, _CA] *= factor
        k[:, _MG] *= factor
    k[:, _NO3] *= (1.0 + reference[_NA] / kin.salt_half) / (1.0 + mmol_l[:, _NA] / kin.salt_half)


def excursion_factor(excursion_c: float, q10: float = 2.0) -> Array:
    """Factor (10,) on uptake for a short departure [C] from the usual root temperature; calcium does not answer.

    After a few days roots adapt and the factor no longer holds. Departures count to 10 C either way.

    >>> excursion_factor(-5.0)[:2].round(3)
    array([0.707, 1.   ])
    """
    factor = np.full(len(IONS), q10 ** (np.clip(excursion_c, -10.0, 10.0) / 10.0))
    factor[_CA] = 1.0
    return factor


def temperature_notice(root_c: float) -> str:
    """What to say about a root temperature [C]; '' within 15-26 C (common practice, no source).

    >>> temperature_notice(12.0)[:62]
    'Root temperature 12.0 C is below 15 C: phosphate and nitrate u'
    """
    if root_c < COOL_ROOTS_C:
        return (
            f"Root temperature {root_c:.1f} C is below {COOL_ROOTS_C:.0f} C: phosphate and nitrate uptake slow down; "
            "the forecast does not know by how much."
        )
    if root_c > WARM_ROOTS_C:
        return (
            f"Root temperature {root_c:.1f} C is above {WARM_ROOTS_C:.0f} C: roots lack oxygen and take up less; "
            "the forecast does not know by how much."
        )
    return ""
