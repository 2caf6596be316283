"""The least squares that laid the ionic conductivities, done again, and the salts they must return."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pytest

from fertui.chemistry.activity import FREE_INDEX, FREE_IONS, speciate
from fertui.chemistry.conductivity import IONIC, SULFATE_PAIR, SULFATE_PAIR_PER_K, conductivity
from fertui.chemistry.ions import CHARGE, INDEX, IONS, vector

# Single salts: McCleskey 2011, J. Chem. Eng. Data 56:317-327, as tabled in the package chemicals 1.5.2. kappa [mS/cm] =
# m x factor x (L0 - A sqrt m / (1 + B sqrt m)) with m in mol/kg. Rows: ions, L0 and A as parabolas in t, B, factor.
SALTS = {
    "KCl": ({"K": 1, "Cl": 1}, (0.009385, 2.533, 81.17), (0.0139, 1.886, 44.11), 1.7, 1),
    "NaCl": ({"Na": 1, "Cl": 1}, (0.008967, 2.196, 67.03), (0.00726, 1.762, 44.55), 1.3, 1),
    "NH4Cl": ({"NH4": 1, "Cl": 1}, (0.006575, 2.684, 78.03), (0.006133, 1.423, 30.0), 0.7, 1),
    "CaCl2": ({"Ca": 1, "Cl": 2}, (0.01124, 2.224, 72.36), (0.03918, 3.905, 137.7), 3.8, 2),
    "MgCl2": ({"Mg": 1, "Cl": 2}, (0.009534, 2.247, 68.19), (0.02469, 4.374, 129.8), 3.1, 2),
    "Na2SO4": ({"Na": 2, "SO4": 1}, (0.009501, 2.317, 66.58), (0.02388, 4.509, 135.5), 2.2, 2),
    "K2SO4": ({"K": 2, "SO4": 1}, (0.008819, 2.872, 83.72), (0.03799, 9.784, 247.1), 5.3, 2),
    "KNO3": ({"K": 1, "NO3": 1}, (0.009117, 2.309, 80.33), (0.00909, 1.099, 49.12), 0.7, 1),
    "CaSO4": ({"Ca": 1, "SO4": 1}, (0.01192, 2.564, 73.3), (0.2402, 19.78, 644.4), 9.6, 2),
    "KHCO3": ({"K": 1, "HCO3": 1}, (0.007807, 2.04, 63.03), (0.00661, 1.577, 38.58), 0.9, 1),
}

# IUPAC KCl standards [mS/cm] at 0.01 and 0.1 mol/kg (Pratt et al. 2001, Pure Appl. Chem. 73:1783); CRC at 25 C.
TEMPERATURES = (5.0, 15.0, 25.0, 35.0)
IUPAC = {0.01: (0.89096, 1.14145, 1.40823, 1.68779), 0.1: (8.18370, 10.4371, 12.8246, 15.3160)}
CRC_KCL_25 = {0.001: 0.14688, 0.005: 0.7169, 0.02: 2.7654, 0.05: 6.665}

# Limiting conductivities at 25 C [S cm2/mol]: CRC Handbook.
LIMITING = {
    "K": 73.48, "Ca": 118.94, "Mg": 106.0, "Na": 50.08, "NH4": 73.5, "NO3": 71.42, "Cl": 76.31, "SO4": 160.0,
    "HCO3": 44.5,
}  # fmt: skip

# McCleskey et al. 2012, Geochim. Cosmochim. Acta 77:369, open copy with its signs set again: lambda0, A, B.
START = {
    "K": (0.003046, 1.261, 40.70, 0.00535, 0.9316, 22.59, 1.5),
    "Ca": (0.009645, 1.984, 62.28, 0.03174, 2.334, 132.3, 2.8),
    "Mg": (0.01068, 1.695, 57.16, 0.02453, 1.915, 80.50, 2.1),
    "Na": (0.003763, 0.877, 26.23, 0.00027, 1.141, 32.07, 1.7),
    "NH4": (0.003341, 1.285, 39.04, 0.00132, 0.607, 11.19, 0.3),
    "NO3": (0.001925, 1.214, 39.90, 0.00118, 0.5045, 23.31, 0.1),
    "Cl": (0.003817, 1.337, 40.99, 0.00613, 0.9469, 22.01, 1.5),
    "SO4": (0.01037, 2.838, 82.37, 0.03324, 5.889, 193.5, 2.6),
    "HCO3": (0.000614, 0.9048, 21.14, -0.00503, 0.8957, 10.97, 0.1),
}

FITTED = [ion for ion in FREE_IONS if ion in START]


@dataclass(frozen=True)
class Measured:
    """One conductivity [mS/cm] of a single salt."""

    ions: dict[str, float]
    temperature: float
    kappa: float
    ph: float = 7.0


def published(salt: str, molal: float, t: float) -> float:
    _, limiting, decrease, b, factor = SALTS[salt]
    root = molal**0.5
    return molal * factor * (np.polyval(limiting, t) - np.polyval(decrease, t) * root / (1 + b * root))


def strength_per_mol(salt: str) -> float:
    return 0.5 * sum(count * CHARGE[INDEX[ion]] ** 2 for ion, count in SALTS[salt][0].items())


def on_iupac_scale(strength: float, temperature: float) -> float:
    """KCl of IUPAC over KCl of the source, at an ionic strength [mol/kg]."""
    at = TEMPERATURES.index(temperature)
    ratios = [IUPAC[molal][at] / published("KCl", molal, temperature) for molal in IUPAC]
    return float(np.interp(np.log(strength), np.log(list(IUPAC)), ratios))


def measurements() -> list[Measured]:
    found = []
    for salt in SALTS.keys() - {"KCl"}:
        most = 0.01 if salt == "CaSO4" else 0.12 / strength_per_mol(salt)
        for molal in (m for m in (0.001, 0.002, 0.005, 0.01, 0.02, 0.05, 0.1) if m <= most):
            ions = {ion: 1000 * molal * count for ion, count in SALTS[salt][0].items()}
            for t in TEMPERATURES:
                kappa = published(salt, molal, t) * on_iupac_scale(molal * strength_per_mol(salt), t)
                found.append(Measured(ions, t, kappa, 8.3 if salt == "KHCO3" else 7.0))
    for molal, row in IUPAC.items():  # primary standards, so they count three times
        kcl = {"K": 1000 * molal, "Cl": 1000 * molal}
        found += 3 * [Measured(kcl, t, kappa) for t, kappa in zip(TEMPERATURES, row, strict=True)]
    return found + [Measured({"K": 1e3 * m, "Cl": 1e3 * m}, 25.0, kappa) for m, kappa in CRC_KCL_25.items()]


def equation_of(measured: Measured) -> tuple[np.ndarray, float]:
    """Relative kappa as a line in the unknowns (A factors, pair, two slopes of lambda0 an ion), and the rest."""
    solution = speciate(measured.ions, measured.ph, measured.temperature)
    above, root = measured.temperature - 25.0, float(solution.ionic_strength) ** 0.5
    factors, first, second, known = [], [], [], 0.0
    for ion in FREE_IONS:
        *curves, b = START.get(ion, IONIC[FREE_INDEX[ion]])
        amount = 1e-3 * solution.free[FREE_INDEX[ion]]
        limiting, decrease = (np.polyval(curve, measured.temperature) for curve in (curves[:3], curves[3:]))
        if ion not in START:
            known += amount * (limiting - decrease * root / (1 + b * root))
            continue
        known += amount * limiting * LIMITING[ion] / np.polyval(curves[:3], 25.0)
        factors.append(-amount * decrease * root / (1 + b * root))
        first.append(amount * LIMITING[ion] * above * 1e-3)
        second.append(amount * LIMITING[ion] * above**2 * 1e-5)
    alkali = [INDEX[ion] for ion in ("K", "Na", "NH4")]
    paired = 1e-3 * (vector(measured.ions)[alkali] - solution.free[alkali]).sum()
    row = np.array([*factors, paired * (1 + SULFATE_PAIR_PER_K * above), *first, *second])
    return row / measured.kappa, (measured.kappa - known) / measured.kappa


def test_coefficients_are_the_least_squares_of_their_sources() -> None:
    """A weak pull settles what the salts leave open: factor 1 +- 0.3, pair 45 +- 60, slopes +- 0.5e-3, 2e-5."""
    rows, left = (np.array(part) for part in zip(*map(equation_of, measurements()), strict=True))
    number = len(FITTED)
    start = np.concatenate([np.ones(number), [45.0], np.zeros(2 * number)])
    pull = 0.01 / np.concatenate([np.full(number, 0.3), [60.0], np.full(number, 0.5), np.full(number, 2.0)])
    solved = np.linalg.lstsq(np.vstack([rows, np.diag(pull)]), np.concatenate([left, pull * start]), rcond=None)[0]
    factors, pair, first, second = np.split(solved, [number, number + 1, 2 * number + 1])
    assert pair[0] == pytest.approx(SULFATE_PAIR, abs=0.5)
    t = np.array([5.0, 15.0, 25.0, 35.0])
    for ion, factor, slope, bend in zip(FITTED, factors, first, second, strict=True):
        course = np.polyval(START[ion][:3], t) / np.polyval(START[ion][:3], 25.0)
        limiting = LIMITING[ion] * (course + 1e-3 * slope * (t - 25) + 1e-5 * bend * (t - 25) ** 2)
        shipped = IONIC[FREE_INDEX[ion]]
        assert np.polyval(shipped[:3], t) == pytest.approx(limiting, rel=1e-3), ion
        assert np.polyval(shipped[3:6], t) == pytest.approx(factor * np.polyval(START[ion][3:6], t), rel=2e-3), ion


@pytest.mark.parametrize("salt", sorted(SALTS.keys() - {"KCl", "CaSO4"}))
@pytest.mark.parametrize("temperature", TEMPERATURES)
def test_single_salts_relative_to_kcl(salt: str, temperature: float) -> None:
    """Each salt over KCl of the same source at the same ionic strength: the scale of the source drops out."""
    for strength in (0.003, 0.01, 0.03, 0.06):
        molal = strength / strength_per_mol(salt)
        ratio = published(salt, molal, temperature) / published("KCl", strength, temperature)
        ours = conductivity({ion: 1e3 * molal * n for ion, n in SALTS[salt][0].items()}, temperature, ph=8.3)
        kcl = conductivity({"K": 1e3 * strength, "Cl": 1e3 * strength}, temperature, ph=7.0)
        assert ours / kcl == pytest.approx(ratio, rel=0.03), f"{salt}, ionic strength {strength}"


def test_every_ion_of_the_table_has_its_limiting_conductivity() -> None:
    assert set(LIMITING) | {"H2PO4"} == set(IONS)
    for ion, value in LIMITING.items():
        assert np.polyval(IONIC[FREE_INDEX[ion]][:3], 25.0) == pytest.approx(value, rel=1e-3)
