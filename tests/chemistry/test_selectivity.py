"""Constants from pairs: round trip, spread that means what it says, gaps filled by the prior."""

from __future__ import annotations

import numpy as np
import pytest

from fertui.chemistry.exchange import PHREEQC_SELECTIVITY, loading
from fertui.chemistry.ions import CATIONS
from fertui.chemistry.selectivity import Prior, fit

COIR = 10.0 ** np.array([-1.45, 0.0, -0.2, -1.9, -1.5])
CATALOGUE = Prior(np.log10(COIR), np.array([0.3, 0.0, 0.15, 0.3, 0.3]))


def pairs(random: np.random.Generator, number: int, k: np.ndarray, error: float = 0.0) -> tuple[np.ndarray, np.ndarray]:
    """Drains of invented loops and extracts of their medium (42 meq/L), both with a relative error of analysis."""
    drain = np.array([6.0, 6.0, 3.0, 4.0, 0.4]) * random.lognormal(0.0, 0.4, (number, 5))
    held = 42.0 * loading(drain, k)
    return drain * (1 + error * random.standard_normal(drain.shape)), held * (
        1 + error * random.standard_normal(drain.shape)
    )


@pytest.mark.parametrize("k", [PHREEQC_SELECTIVITY, COIR], ids=["phreeqc", "coir"])
@pytest.mark.parametrize("number", [1, 2, 7])
def test_exact_pairs_give_their_constants_back(k: np.ndarray, number: int) -> None:
    fitted = fit(*pairs(np.random.default_rng(1), number, k))
    np.testing.assert_allclose(fitted.selectivity, k, rtol=1e-10)
    assert fitted.sd[CATIONS.index("Ca")] == 0.0
    assert (fitted.sd[[0, 2, 3, 4]] > 0.0).all()


def test_spread_covers_the_truth_as_often_as_it_claims() -> None:
    """600 fits to five noisy pairs: z scores have unit spread, so an 80 % range holds 80 % (exact statistics)."""
    random = np.random.default_rng(2)
    scores = []
    for _ in range(600):
        fitted = fit(*pairs(random, 5, COIR, error=0.05))
        stated = fitted.sd / max(1.0, fitted.scatter)
        scores.append((fitted.log10_k - np.log10(COIR))[[0, 2, 3, 4]] / stated[[0, 2, 3, 4]])
    assert np.std(scores) == pytest.approx(1.0, abs=0.06)
    assert np.mean(np.abs(scores) < 1.2816) == pytest.approx(0.80, abs=0.03)


def test_more_pairs_narrow_the_spread() -> None:
    random = np.random.default_rng(3)
    few, many = fit(*pairs(random, 2, COIR)), fit(*pairs(random, 8, COIR))
    np.testing.assert_allclose(many.sd[[0, 2, 3, 4]], few.sd[[0, 2, 3, 4]] / 2.0, rtol=0.1)


def test_pairs_that_disagree_more_than_stated_widen_the_spread() -> None:
    solution, held = pairs(np.random.default_rng(4), 6, COIR, error=0.3)
    fitted = fit(solution, held)
    assert fitted.scatter > 2.0
    assert (fitted.sd[[0, 2, 3]] > 2.0 * fit(*pairs(np.random.default_rng(4), 6, COIR)).sd[[0, 2, 3]]).all()


def test_a_prior_stands_where_no_pair_tells() -> None:
    solution, held = pairs(np.random.default_rng(5), 3, COIR)
    solution[:, 4], held[:, 4] = 0.0, 0.0
    fitted = fit(solution, held, prior=CATALOGUE)
    assert fitted.log10_k[4] == pytest.approx(CATALOGUE.mean[4], abs=1e-9)
    assert fitted.sd[4] == pytest.approx(0.3, rel=1e-6)
    assert fitted.sd[0] < 0.05
    assert np.isnan(fitted.residuals[:, 4]).all()


def test_a_prior_pulls_little_against_good_pairs() -> None:
    away = Prior(CATALOGUE.mean + 0.3, CATALOGUE.sd)
    fitted = fit(*pairs(np.random.default_rng(6), 4, COIR), prior=away)
    np.testing.assert_allclose(fitted.log10_k, np.log10(COIR), atol=0.02)


def test_extract_in_another_measure_changes_nothing() -> None:
    solution, held = pairs(np.random.default_rng(7), 3, COIR)
    np.testing.assert_allclose(fit(solution, held).log10_k, fit(solution, held * 12.5).log10_k, atol=1e-12)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (lambda s, h: (s[:2], h), "do not pair"),
        (lambda s, h: (s[:0], h[:0]), "do not pair"),
        (lambda s, h: (s * [1, 0, 1, 1, 1], h), "calcium is the reference"),
        (lambda s, h: (s * [1, 1, 1, 1, 0], h), "no pair tells about NH4; give a prior"),
        (lambda s, h: (s, -h), "exchangeable_meq holds a negative"),
        (lambda s, h: (s * np.nan, h), "solution_mmol_per_l holds a negative or not finite"),
    ],
)
def test_pairs_that_cannot_tell_are_refused(change, message: str) -> None:
    solution, held = pairs(np.random.default_rng(8), 3, COIR)
    with pytest.raises(ValueError, match=message):
        fit(*change(solution, held))
