"""What a composition dissolves into: free ions, ion pairs and their activity.

Davies' equation and nine ion pairs (five cations with sulfate; Ca and Mg with HPO4 and H2PO4), solved as a fixed point
over all leading axes at once. mmol/L is taken as mmol per kg of water, which differs by less than 0.5 % here.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from fertui.chemistry.equilibria import HIGH_C, LOW_C, constant
from fertui.chemistry.ions import IONS, Array, composition

FREE_IONS = (*IONS, "HPO4", "CO3", "HSO4", "H", "OH")
"""Order of the last axis of free ions: the ions of a composition, then what pH makes of them."""

FREE_INDEX = {ion: position for position, ion in enumerate(FREE_IONS)}
FREE_CHARGE: Array = np.array([1, 2, 2, 1, 1, -1, -1, -2, -1, -1, -2, -2, -1, 1, -1], dtype=float)

STRENGTH_LIMIT = 0.5
"""Ionic strength [mol/L] up to which Davies' equation is used; beyond it gamma is held and ``in_range`` says no."""

CONVERGED = 1e-6
"""Relative change of the free ions at which the fixed point is taken as reached."""

_ROUNDS = 200
_TRACE = 1e-12
_LN10 = float(np.log(10.0))


class Speciation(NamedTuple):
    """Free ions of a composition. ``free`` is (..., 15) [mmol/L] in the order of ``FREE_IONS``."""

    free: Array
    ionic_strength: Array
    """[mol/L], shape (...)."""
    gamma: Array
    """Activity coefficient of a singly charged ion, shape (...); charge z has gamma^(z^2)."""
    in_range: npt.NDArray[np.bool_]
    """False where ionic strength or temperature leaves the range the numbers were checked in, shape (...)."""

    def activity(self, ion: str) -> Array:
        """Activity [mol/L] of one of ``FREE_IONS``, shape (...)."""
        position = FREE_INDEX[ion]
        return 1e-3 * self.free[..., position] * self.gamma ** FREE_CHARGE[position] ** 2


def davies_slope(temperature_c: float | Array) -> Array:
    """A of Davies' equation [(mol/L)^-1/2] at a temperature [degrees C]: parabola through PHREEQC's DH_A, 5-35 C.

    >>> round(float(davies_slope(25.0)), 4)
    0.51
    """
    above = np.asarray(temperature_c, dtype=float) - 25.0
    return 0.51002 + above * (0.000875 + above * 0.0000043)


def davies(ionic_strength: float | Array, temperature_c: float | Array = 25.0) -> Array:
    """Activity coefficient of a singly charged ion; charge z has its z^2-th power.

    ``ionic_strength`` [mol/L] and ``temperature_c`` [degrees C], any shapes that broadcast.
    log10 gamma = -A (sqrt I / (1 + sqrt I) - 0.3 I) up to ``STRENGTH_LIMIT``, held there beyond it.
    Davies 1962, Ion Association (from memory).

    >>> round(float(davies(0.03)), 3)
    0.85
    """
    strength = np.minimum(ionic_strength, STRENGTH_LIMIT)
    root = np.sqrt(strength)
    return 10.0 ** (-davies_slope(temperature_c) * (root / (1.0 + root) - 0.3 * strength))


def speciate(
    ions_mmol_per_l: Mapping[str, float | Array] | Array, ph: float | Array = 5.8, temperature_c: float | Array = 25.0
) -> Speciation:
    """Free ions, ionic strength and activity coefficient of compositions.

    ``ions_mmol_per_l``: mapping, or array (..., 10) [mmol/L]; values below zero count as none, save for HCO3, which
    stands for alkalinity [meq/L]. ``ph`` (activity scale) and ``temperature_c`` broadcast over the leading axes.
    Raises ``ValueError`` for an ion that is not finite, a pH outside 0-14 or a temperature outside 0-40 degrees C.
    Range: ionic strength to 0.5 mol/L, 5-35 degrees C; ``in_range`` of the answer says where it is left.
    Constants: ``equilibria``.

    >>> solution = speciate({"K": 6, "Ca": 5, "Mg": 2, "NO3": 15, "SO4": 2, "H2PO4": 1})
    >>> round(float(solution.ionic_strength), 4)
    0.0266
    """
    totals = composition(ions_mmol_per_l)
    if not np.isfinite(totals).all():
        raise ValueError("a composition needs a finite number for every ion; leave out what was not analysed")
    shape = np.broadcast_shapes(totals.shape[:-1], np.shape(ph), np.shape(temperature_c))
    totals = 1e-3 * np.moveaxis(np.broadcast_to(totals, (*shape, len(IONS))), -1, 0)
    ph, temperature = np.array(ph, float, ndmin=len(shape)), np.array(temperature_c, float, ndmin=len(shape))
    _refuse_outside("pH", ph, 0.0, 14.0)
    _refuse_outside("temperature [degrees C]", temperature, 0.0, 40.0)
    state = _settled(_Amounts.of(totals, ph, temperature))
    free = np.empty((*shape, len(FREE_IONS)))
    for position, column in enumerate(state.columns()):
        free[..., position] = column
    in_range = (state.strength <= STRENGTH_LIMIT) & (temperature >= LOW_C) & (temperature <= HIGH_C)
    return Speciation(1e3 * free, state.strength, state.gamma, in_range)


def _refuse_outside(what: str, value: Array, low: float, high: float) -> None:
    if not np.all((value >= low) & (value <= high)):
        raise ValueError(f"{what} must lie between {low:g} and {high:g}; found {np.min(value):g} to {np.max(value):g}")


class _Amounts(NamedTuple):
    """What stays fixed while the free ions are sought: totals [mol/L], ions first, and the constants at hand.

    Single stands for K, Na, NH4; double for Ca, Mg; inert for NO3, Cl, which form no pairs here.
    """

    single: Array
    double: Array
    inert: Array
    sulfate: Array
    phosphate: Array
    alkalinity: Array
    hydrogen: Array
    slope: Array
    single_sulfate: Array
    double_sulfate: Array
    double_hpo4: Array
    double_h2po4: Array
    hso4_per_so4: Array
    hpo4_per_h2po4: Array
    co3_per_hco3: Array
    hydroxide: Array

    @classmethod
    def of(cls, totals: Array, ph: Array, temperature: Array) -> _Amounts:
        def constants(*names: str) -> Array:
            return np.stack([constant(name, temperature) for name in names])

        positive = np.maximum(totals, 0.0)
        hydrogen = 10.0**-ph
        return cls(
            single=positive[[0, 3, 4]],
            double=positive[1:3],
            inert=positive[5:7],
            sulfate=positive[7],
            phosphate=positive[8],
            alkalinity=totals[9],
            hydrogen=hydrogen,
            slope=davies_slope(temperature),
            single_sulfate=constants("KSO4", "NaSO4", "NH4SO4"),
            double_sulfate=constants("CaSO4", "MgSO4"),
            double_hpo4=constants("CaHPO4", "MgHPO4"),
            double_h2po4=constants("CaH2PO4", "MgH2PO4"),
            hso4_per_so4=hydrogen / constant("hydrogen_sulfate", temperature),
            hpo4_per_h2po4=constant("phosphoric_2", temperature) / hydrogen,
            co3_per_hco3=constant("carbonic_2", temperature) / hydrogen,
            hydroxide=constant("water", temperature) / hydrogen,
        )


class _State(NamedTuple):
    """One round of the fixed point: free ions [mol/L] and the strength and gamma that they make."""

    single: Array
    double: Array
    inert: Array
    so4: Array
    h2po4: Array
    hpo4: Array
    hco3: Array
    co3: Array
    hso4: Array
    h: Array
    oh: Array
    strength: Array
    gamma: Array

    def columns(self) -> tuple[Array, ...]:
        """Free ions in the order of ``FREE_IONS``."""
        k, na, nh4 = self.single
        ca, mg = self.double
        no3, cl = self.inert
        made_by_ph = (self.hpo4, self.co3, self.hso4, self.h, self.oh)
        return (k, ca, mg, na, nh4, no3, cl, self.so4, self.h2po4, self.hco3, *made_by_ph)

    def change(self, before: _State) -> float:
        """Largest relative change of the free ligands and of gamma, from which all else follows."""
        new, old = (self.so4, self.h2po4, self.gamma), (before.so4, before.h2po4, before.gamma)
        return max(float((np.abs(n - o) / (n + _TRACE)).max(initial=0.0)) for n, o in zip(new, old, strict=True))


def _settled(amounts: _Amounts) -> _State:
    """The fixed point: rounds until no free ion moves by more than ``CONVERGED``."""
    strength = 2.0 * amounts.double.sum(axis=0) + 0.5 * (amounts.single.sum(axis=0) + amounts.inert.sum(axis=0))
    state = _round(amounts, amounts.single, amounts.double, _gamma(strength, amounts.slope))
    for _ in range(_ROUNDS):
        before, state = state, _round(amounts, state.single, state.double, state.gamma)
        if state.change(before) < CONVERGED:
            return state
    raise ArithmeticError(
        f"ion pairing did not settle in {_ROUNDS} rounds (change {state.change(before):.1e}); "
        f"ionic strength reaches {np.max(state.strength):.2f} mol/L"
    )


def _gamma(strength: Array, slope: Array) -> Array:
    held = np.minimum(strength, STRENGTH_LIMIT)
    root = np.sqrt(held)
    return np.exp(-_LN10 * slope * (root / (1.0 + root) - 0.3 * held))


def _round(amounts: _Amounts, single: Array, double: Array, gamma: Array) -> _State:
    """Ligands from the free cations, cations from the free ligands, then strength and gamma of the result.

    A pair of charges z and y binds with K gamma^(-2 z y): Davies' gamma depends on the charge alone.
    """
    square = gamma * gamma
    cube, fourth = square * gamma, square * square
    eighth = fourth * fourth
    hpo4_ratio = amounts.hpo4_per_h2po4 / cube
    hso4_ratio = amounts.hso4_per_so4 * cube
    on_hpo4 = amounts.double_hpo4 * eighth * hpo4_ratio
    on_phosphate = amounts.double_h2po4 * fourth + on_hpo4
    on_sulfate = amounts.double_sulfate * eighth
    single_on_sulfate = amounts.single_sulfate * fourth

    so4_held = (single_on_sulfate * single).sum(axis=0) + (on_sulfate * double).sum(axis=0)
    so4 = amounts.sulfate / (1.0 + hso4_ratio + so4_held)
    h2po4 = amounts.phosphate / (1.0 + hpo4_ratio + (on_phosphate * double).sum(axis=0))
    single = amounts.single / (1.0 + single_on_sulfate * so4)
    double = amounts.double / (1.0 + on_sulfate * so4 + on_phosphate * h2po4)

    hpo4, hso4 = hpo4_ratio * h2po4, hso4_ratio * so4
    h, oh = amounts.hydrogen / gamma, amounts.hydroxide / gamma
    co3_ratio = amounts.co3_per_hco3 / cube
    hpo4_held = h2po4 * (hpo4_ratio + (on_hpo4 * double).sum(axis=0))
    hco3 = np.maximum(amounts.alkalinity - hpo4_held - oh + h + hso4, 0.0) / (1.0 + 2.0 * co3_ratio)
    co3 = co3_ratio * hco3

    charged_pairs = (amounts.single - single).sum(axis=0) + (amounts.double_h2po4 * fourth * double).sum(axis=0) * h2po4
    singly = single.sum(axis=0) + amounts.inert.sum(axis=0) + h2po4 + hco3 + hso4 + h + oh + charged_pairs
    doubly = double.sum(axis=0) + so4 + hpo4 + co3
    strength = 0.5 * singly + 2.0 * doubly
    gamma = _gamma(strength, amounts.slope)
    return _State(single, double, amounts.inert, so4, h2po4, hpo4, hco3, co3, hso4, h, oh, strength, gamma)
