"""How good past forecasts were: error, skill beside doing nothing clever, coverage of ranges, CRPS."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from datetime import datetime
from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import Array
from fertui.estimate.display import SHARED

SCORED = ("K", "Ca", "Mg", "Na", "NO3", "SO4", "Cl", "H2PO4")
"""Ions whose ranges and errors are scored; ammonium sits at its detection limit."""
SKILL_PCT = 5.0
"""A skill within so many percent of none is none."""


class HindcastRow(NamedTuple):
    """One ion of one past forecast beside what the laboratory found; shares only of K, Ca and Mg.

    ``issued``: the analysis it was issued after; ``cold_start``: that was the first. Ranges hold the analysis' error.
    """

    at: datetime
    issued: datetime
    point: str
    ion: str
    measured_mmol_l: float
    predicted_mmol_l: float
    low: float
    high: float
    no_change_mmol_l: float
    measured_share_pct: float | None
    predicted_share_pct: float | None
    low_share_pct: float | None
    high_share_pct: float | None
    no_change_share_pct: float | None
    cold_start: bool
    doubtful: bool
    last_uptake_share_pct: float | None = None
    crps_share: float | None = None
    judged: bool = True


class Summary(NamedTuple):
    """The record in numbers; None where there is nothing to judge yet.

    Errors of shares are mean absolute errors in points; ``skill_pct``: how much smaller than "no change".
    """

    forecasts: int
    share_error_pct: Mapping[str, float] | None = None
    no_change_share_error_pct: Mapping[str, float] | None = None
    last_uptake_share_error_pct: Mapping[str, float] | None = None
    skill_pct: Mapping[str, float] | None = None
    coverage_ions_pct: float | None = None
    coverage_shares_pct: float | None = None
    crps_share: Mapping[str, float] | None = None
    rmse_mmol_l: Mapping[str, float] | None = None
    no_change_rmse_mmol_l: Mapping[str, float] | None = None
    words: str = ""


def crps(members: Array, measured: float) -> float:
    """Continuous ranked probability score of members (M,): mean distance to the measurement less half their own.

    >>> round(crps(np.array([1.0, 3.0]), 2.0), 2)
    0.5
    """
    ordered = np.sort(members)
    count = len(ordered)
    weights = 2.0 * np.arange(1, count + 1) - count - 1.0
    return float(np.abs(members - measured).mean() - (weights * ordered).sum() / count**2)


def summary(rows: Sequence[HindcastRow]) -> Summary:
    """The record of the rows that count: no doubtful target, origin or analysis before it, and no cold start."""
    judged = [row for row in rows if row.judged]
    share_rows = [row for row in judged if row.measured_share_pct is not None]
    forecasts = len({(row.at, row.point) for row in judged})
    if not share_rows:
        words = "No record yet: a forecast is judged from the third analysis on."
        return Summary(forecasts, words=words)
    error = _by_ion(share_rows, "predicted_share_pct")
    no_change = _by_ion(share_rows, "no_change_share_pct")
    skill = {ion: 100.0 * (1.0 - error[ion] / max(no_change[ion], 1e-9)) for ion in error}
    scored = [row for row in judged if row.ion in SCORED]
    covered = 100.0 * float(np.mean([row.low <= row.measured_mmol_l <= row.high for row in scored]))
    inside = [_share_inside(row) for row in share_rows]
    scores = {ion: _mean([row.crps_share for row in share_rows if row.ion == ion]) for ion in error}
    return Summary(
        forecasts, error, no_change, _by_ion(share_rows, "last_uptake_share_pct"), skill, covered,
        100.0 * float(np.mean(inside)), scores, _rmse(scored, "predicted_mmol_l"), _rmse(scored, "no_change_mmol_l"),
        _words(forecasts, error, no_change, skill),
    )  # fmt: skip


def _share_inside(row: HindcastRow) -> bool:
    low, measured, high = row.low_share_pct, row.measured_share_pct, row.high_share_pct
    return low is not None and measured is not None and high is not None and low <= measured <= high


def _by_ion(rows: Sequence[HindcastRow], name: str) -> dict[str, float]:
    """Mean absolute error of the shares by ion, of one way to forecast."""
    return {ion: _mean([_miss(row, name) for row in rows if row.ion == ion]) for ion in SHARED}


def _miss(row: HindcastRow, name: str) -> float | None:
    said, found = getattr(row, name), row.measured_share_pct
    return None if said is None or found is None else float(abs(said - found))


def _rmse(rows: Sequence[HindcastRow], name: str) -> dict[str, float]:
    found = {}
    for ion in SCORED:
        errors = [getattr(row, name) - row.measured_mmol_l for row in rows if row.ion == ion]
        if errors:
            found[ion] = float(np.sqrt(np.mean(np.square(errors))))
    return found


def _mean(values: Sequence[float | None]) -> float:
    given = [value for value in values if value is not None]
    return float(np.mean(given)) if given else float("nan")


def _words(
    forecasts: int, error: Mapping[str, float], no_change: Mapping[str, float], skill: Mapping[str, float]
) -> str:
    """The record in a sentence, honest where there is no skill."""
    parts = [f"{ion} {error[ion]:.1f} points (no change {no_change[ion]:.1f})" for ion in SHARED]
    better = [ion for ion in SHARED if skill[ion] > SKILL_PCT]
    worse = [ion for ion in SHARED if skill[ion] < -SKILL_PCT]
    verdict = f"better than no change for {', '.join(better)}" if better else "no better than no change"
    if worse:
        verdict += f", worse for {', '.join(worse)}"
    return f"Error of the shares over {forecasts} forecasts: {', '.join(parts)}: {verdict}."
