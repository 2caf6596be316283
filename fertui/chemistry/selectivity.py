"""Selectivity constants from pairs of a solution and what was then found on the exchanger, with their spread."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from fertui.chemistry.exchange import Cations, cations
from fertui.chemistry.ions import CATION_CHARGE, CATIONS, Array

Flags = npt.NDArray[np.bool_]

_CALCIUM = CATIONS.index("Ca")
_OTHERS = [position for position in range(len(CATIONS)) if position != _CALCIUM]


class Prior(NamedTuple):
    """What is held of log10 k before the pairs: ``mean`` (5,) and standard deviation ``sd`` (5,)."""

    mean: Array
    sd: Array


class Fit(NamedTuple):
    """Constants fitted to pairs, in the convention of ``fertui.chemistry.exchange``.

    ``log10_k`` and ``sd`` (5,); ``covariance`` (5, 5) of log10 k, zero for calcium; ``residuals`` (pairs, 5) in log10,
    NaN where a pair does not tell; ``scatter``: how many times the stated errors the pairs disagree, 1 or less: as
    stated; above 1 the spread has been widened by it.
    """

    log10_k: Array
    sd: Array
    covariance: Array
    residuals: Array
    scatter: float

    @property
    def selectivity(self) -> Array:
        """The constants themselves, (5,)."""
        return 10.0**self.log10_k


def fit(
    solution_mmol_per_l: Cations,
    exchangeable_meq: Cations,
    solution_error: float = 0.05,
    exchangeable_error: float = 0.05,
    prior: Prior | None = None,
) -> Fit:
    """Selectivity constants from pairs, by weighted least squares on log k.

    Arguments: ``solution_mmol_per_l`` (pairs, 5) [mmol/L]; ``exchangeable_meq`` (pairs, 5), meq in any common measure
    (per L, per kg), from an extract corrected for the solution it held; ``..._error``: relative standard deviations of
    both analyses (5 %: common practice, no source); ``prior`` from the catalogue, or None.
    Raises ``ValueError`` for no pair, an unlike number of both, negative or not finite numbers, a pair without calcium,
    and a cation that neither a pair nor a prior tells about.

    Each pair gives log k_i = log(E_i/c_i) - z_i/2 log(E_Ca/c_Ca). Errors of all five cations enter all four constants
    of a pair (calcium and the sum are shared), so a pair is weighted by its whole error matrix.
    Range: constants are taken as the same over all pairs; on organic media that of K falls as K fills the sites (Munns
    1976, SSSAJ 40), so pairs should lie where the loop works.

    >>> from fertui.chemistry.exchange import PHREEQC_SELECTIVITY, loading
    >>> drain = np.array([[6.0, 5.0, 2.0, 3.0, 0.5], [4.0, 8.0, 3.0, 6.0, 0.2]])
    >>> fitted = fit(drain, 40.0 * loading(drain, PHREEQC_SELECTIVITY))
    >>> fitted.selectivity.round(4)
    array([0.0631, 1.    , 0.631 , 0.0126, 0.0501])
    """
    solution, held = _pairs(solution_mmol_per_l, exchangeable_meq)
    told = (solution > 0.0) & (held > 0.0)
    if not told[:, _CALCIUM].all():
        raise ValueError("a pair without calcium says nothing: calcium is the reference of all constants")
    seen, error = _constants_of_pairs(solution, held, told, solution_error, exchangeable_error)
    information, weighted = _gathered(seen, error, told, prior)
    untold = [CATIONS[each] for row, each in enumerate(_OTHERS) if information[row, row] <= 0.0]
    if untold:
        raise ValueError(f"no pair tells about {', '.join(untold)}; give a prior or a pair where it was measured")
    covariance = np.asarray(np.linalg.inv(information), dtype=np.float64)
    residuals = np.where(told[:, _OTHERS], seen - covariance @ weighted, np.nan)
    scatter = _scatter(residuals, error)
    return _fitted(covariance @ weighted, covariance * max(1.0, scatter) ** 2, residuals, scatter)


def _pairs(solution_mmol_per_l: Cations, exchangeable_meq: Cations) -> tuple[Array, Array]:
    solution, held = np.atleast_2d(cations(solution_mmol_per_l)), np.atleast_2d(cations(exchangeable_meq))
    if solution.shape != held.shape or solution.ndim != 2 or not solution.size:
        raise ValueError(f"{solution.shape} solutions and {held.shape} extracts do not pair; both are (pairs, 5)")
    for name, values in (("solution_mmol_per_l", solution), ("exchangeable_meq", held)):
        if not (values.min() >= 0.0 and values.max() < np.inf):
            raise ValueError(f"{name} holds a negative or not finite number")
    return solution, held


def _constants_of_pairs(
    solution: Array, held: Array, told: Flags, solution_error: float, exchangeable_error: float
) -> tuple[Array, Array]:
    """log10 k (pairs, 4) that every pair by itself gives, and its error matrix (pairs, 4, 4)."""
    fractions = held / held.sum(axis=1, keepdims=True)
    ratio = np.log10(np.where(told, fractions, 1.0) / np.where(told, solution, 1.0))
    half_charge = CATION_CHARGE[_OTHERS] / 2.0
    seen = ratio[:, _OTHERS] - half_charge * ratio[:, [_CALCIUM]]
    own = np.eye(len(CATIONS))[_OTHERS] - half_charge[:, None] * np.eye(len(CATIONS))[_CALCIUM]
    through_sum = (1.0 - half_charge)[None, :, None] * fractions[:, None, :]
    of_held = own[None] - through_sum
    variance_solution, variance_held = (np.square([solution_error, exchangeable_error])) / np.log(10.0) ** 2
    error = variance_held * of_held @ of_held.transpose(0, 2, 1) + variance_solution * (own @ own.T)[None]
    return seen, error


def _gathered(seen: Array, error: Array, told: Flags, prior: Prior | None) -> tuple[Array, Array]:
    """Information matrix (4, 4) and the constants weighted by it (4,), of all pairs and the prior."""
    known = told[:, _OTHERS]
    both = known[:, :, None] & known[:, None, :]
    placed = np.where(both, error, np.eye(len(_OTHERS)))
    weight = np.where(both, np.linalg.inv(placed), 0.0)
    information, weighted = weight.sum(axis=0), np.einsum("pij,pj->i", weight, np.where(known, seen, 0.0))
    if prior is not None:
        certainty = 1.0 / np.square(prior.sd[_OTHERS])
        information, weighted = information + np.diag(certainty), weighted + certainty * prior.mean[_OTHERS]
    return information, weighted


def _scatter(residuals: Array, error: Array) -> float:
    """Root mean square of the residuals in units of their stated error; 0 with one pair, which cannot disagree."""
    if len(residuals) < 2:
        return 0.0
    stated = np.sqrt(np.einsum("pii->pi", error))
    degrees = np.isfinite(residuals).sum() * (1.0 - 1.0 / len(residuals))
    return float(np.sqrt(np.nansum(np.square(residuals / stated)) / degrees)) if degrees else 0.0


def _fitted(log10_k: Array, covariance: Array, residuals: Array, scatter: float) -> Fit:
    """The four constants beside calcium's, which is 1 without spread."""
    whole, spread = np.zeros(len(CATIONS)), np.zeros((len(CATIONS), len(CATIONS)))
    rest = np.zeros((len(residuals), len(CATIONS)))
    whole[_OTHERS], rest[:, _OTHERS] = log10_k, residuals
    spread[np.ix_(_OTHERS, _OTHERS)] = covariance
    return Fit(whole, np.sqrt(np.diag(spread)), spread, rest, scatter)
