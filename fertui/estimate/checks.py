"""Whether an analysis agrees with itself: its charges close, and its ions carry the EC the laboratory measured."""

from __future__ import annotations

from fertui.chemistry.conductivity import conductivity
from fertui.chemistry.ions import CHARGE
from fertui.estimate import compositions
from fertui.estimate.observations import Observation

CHARGE_PCT = 10.0
"""Largest 100 (C - A)/(C + A): the tolerance of the RIVM protocol and of the Dutch booklet of 2016 (second-hand)."""
EC_RATIO = (0.75, 1.33)
"""EC from the ions over EC measured. Standard Methods 1030E accepts 0.9-1.1 (from memory); an error of the EC model and
of the meter comes on top, and an analysis is held back only where something must be wrong."""
MUST_HAVE = ("K", "Ca", "Mg", "NO3", "SO4")
"""Without these the check says nothing."""


def imbalance_pct(seen: Observation) -> float | None:
    """100 (C - A)/(C + A) of an analysis; None where main ions are missing."""
    if not all(ion in seen.ions for ion in MUST_HAVE):
        return None
    charges = compositions.array(seen.ions) * CHARGE
    total = abs(charges).sum()
    return float(100.0 * charges.sum() / total) if total > 0 else None


def failed(seen: Observation) -> str:
    """Why an analysis must be held back; '' for one that agrees with itself or cannot be checked."""
    off = imbalance_pct(seen)
    if off is None:
        return ""
    if abs(off) > CHARGE_PCT:
        more, less = ("cations", "anions") if off > 0 else ("anions", "cations")
        return (
            f"charges do not close: {abs(off):.0f} % more {more} than {less} (allowed {CHARGE_PCT:.0f} %); "
            "look for NO3 read as NO3-N, or a slip of the hand"
        )
    if seen.ec is None or seen.ec <= 0:
        return ""
    ratio = float(conductivity(compositions.array(seen.ions))) / seen.ec
    if EC_RATIO[0] <= ratio <= EC_RATIO[1]:
        return ""
    return f"its ions make EC {ratio * seen.ec:.1f}, the laboratory measured {seen.ec:.1f}; look at units and reference temperature"
