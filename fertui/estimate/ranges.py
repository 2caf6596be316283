"""How wide the ranges are: a scale the loop sets from its own innovations, charge closed, shares computed last.

Errors of a forecast are of two kinds: common to all ions (water, EC) and specific to each. Both scales are learned
from the squares of the loop's own standardised innovations, older ones forgotten, single ones capped: a calm loop gets
narrow ranges, a volatile one wide ranges, and one odd analysis does not blow them up for good.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import CHARGE, INDEX, Array
from fertui.estimate.correction import TRACE
from fertui.estimate.points import Band, Estimated
from fertui.estimate.quantiles import median, quantiles

FORGETTING = 0.9
PRIOR_WEIGHT = 4.0
START_COMMON, START_SPECIFIC = 2.0, 1.8
"""Variance scales before the loop has shown anything: wider than the filter's own, on the safe side."""
MOST = 9.0
"""Largest squared standardised innovation that counts."""
VOLATILE = 2.0
"""A specific scale above this (in standard deviations) makes a loop volatile: weekly samples are the remedy."""
LARGEST_PROJECTION = 0.5
MOST_ALKALINITY = 6.0
"""Alkalinity [meq/L] above this is no water of a greenhouse; it is not let into the charge balance."""

_HCO3, _NH4 = INDEX["HCO3"], INDEX["NH4"]
_SHARED = [INDEX["K"], INDEX["Ca"], INDEX["Mg"]]


class Spread(NamedTuple):
    """Learned variance scales and the weight behind each; ``judged``: innovations they were learned from."""

    common_variance: float = START_COMMON
    specific_variance: float = START_SPECIFIC
    weight: float = PRIOR_WEIGHT
    judged: int = 0

    @property
    def common(self) -> float:
        """Scale of what is common to all ions, in standard deviations."""
        return float(np.sqrt(self.common_variance))

    @property
    def specific(self) -> float:
        """Scale of what is specific to an ion, in standard deviations."""
        return float(np.sqrt(self.specific_variance))

    @property
    def volatile(self) -> bool:
        """Whether the loop moves much more than the filter expects."""
        return self.judged >= 2 and max(self.common, self.specific) > VOLATILE

    def learned(self, columns: tuple[int, ...], anomalies: Array, noise: Array, difference: Array) -> Spread:
        """The scales after one more analysis: deviations (M, n), error covariance (n, n) and innovation (n,), as logs.

        Ammonium sits at its detection limit and teaches nothing; fewer than three ions teach nothing either.
        """
        kept = [place for place, column in enumerate(columns) if column != _NH4]
        if len(kept) < 3:
            return self
        covariance = np.cov(anomalies[:, kept], rowvar=False) + noise[np.ix_(kept, kept)]
        off = difference[kept]
        mean = np.full(len(kept), 1.0 / len(kept))
        common = min(float(off.mean() ** 2 / (mean @ covariance @ mean)), MOST)
        apart = np.eye(len(kept)) - mean
        specific = np.minimum((apart @ off) ** 2 / np.diag(apart @ covariance @ apart.T), MOST).mean()
        old = self.weight * FORGETTING
        return Spread(
            (old * self.common_variance + common) / (old + 1.0),
            (old * self.specific_variance + float(specific)) / (old + 1.0),
            old + 1.0,
            self.judged + 1,
        )

    def widened(self, mmol_l: Array) -> Array:
        """Concentrations (..., M, 10) with their deviations from the median scaled: common and specific apart."""
        logs = np.log(np.maximum(mmol_l[..., :_HCO3], TRACE))
        middle = median(logs, axis=-2)[..., None, :]
        common = (logs - middle).mean(axis=-1, keepdims=True)
        scaled = middle + self.common * common + self.specific * (logs - middle - common)
        return np.concatenate([np.exp(scaled), mmol_l[..., _HCO3:]], axis=-1)


def neutral(mmol_l: Array) -> Array:
    """Concentrations (..., 10) moved as little as possible (in logarithms) until their charges close, alkalinity kept.

    A projection of what is shown, never fed back into the members.

    >>> solution = np.array([6.0, 4, 2, 1, 0, 15, 1, 2, 1, 0])
    >>> abs(round(float(neutral(solution) @ CHARGE), 1)) < abs(float(solution @ CHARGE))
    True
    """
    charges = mmol_l[..., :_HCO3] * CHARGE[:_HCO3]
    imbalance = charges.sum(axis=-1, keepdims=True) - np.clip(mmol_l[..., _HCO3:], 0.0, MOST_ALKALINITY)
    weight = np.maximum((charges**2).sum(axis=-1, keepdims=True), TRACE)
    shift = np.clip(-imbalance * charges / weight, -LARGEST_PROJECTION, LARGEST_PROJECTION)
    return np.concatenate([mmol_l[..., :_HCO3] * np.exp(shift), mmol_l[..., _HCO3:]], axis=-1)


def shares(mmol_l: Array) -> Array:
    """Shares [%] (..., 3) of K, Ca and Mg in their sum, in equivalents; nan where there is none of them."""
    equivalents = mmol_l[..., _SHARED] * CHARGE[_SHARED]
    total = equivalents.sum(axis=-1, keepdims=True)
    return 100.0 * equivalents / np.where(total > 0, total, np.nan)


def shared_meq(mmol_l: Array) -> Array:
    """Sum of K, Ca and Mg [meq/L] (...)."""
    return (mmol_l[..., _SHARED] * CHARGE[_SHARED]).sum(axis=-1)


def estimated(values: Array, band: Band | None = None) -> Estimated:
    """Median and 80 % range of members' values (M,)."""
    middle, low, high = (float(value) for value in quantiles(values))
    return Estimated(middle, low, high, band)
