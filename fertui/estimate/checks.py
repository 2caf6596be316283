"""Whether an analysis agrees with itself: its charges close, and its ions carry the EC the laboratory measured."""

from __future__ import annotations

from fertui.chemistry.conductivity import conductivity
from fertui.chemistry.ions import imbalance_pct
from fertui.chemistry.verdicts import DOUBT_PCT
from fertui.estimate import compositions
from fertui.estimate.observations import Observation

EC_RATIO = (0.75, 1.33)
"""EC from the ions over EC measured. Standard Methods 1030E accepts 0.9-1.1 (from memory); an error of the EC model and
of the meter comes on top, and an analysis is held back only where something must be wrong."""
MUST_HAVE = ("K", "Ca", "Mg", "NO3", "SO4")
"""Without these the check says nothing."""


def failed(seen: Observation) -> str:
    """Why an analysis must be held back; '' for one that agrees with itself or cannot be checked."""
    ions = compositions.array(seen.ions)
    if not all(ion in seen.ions for ion in MUST_HAVE) or not ions.any():
        return ""
    off = float(imbalance_pct(ions))
    if abs(off) > DOUBT_PCT:
        more, less = ("cations", "anions") if off > 0 else ("anions", "cations")
        return (
            f"charges do not close: {abs(off):.0f} % more {more} than {less} (allowed {DOUBT_PCT:.0f} %); "
            "look for NO3 read as NO3-N, or a slip of the hand"
        )
    if seen.ec is None or seen.ec <= 0:
        return ""
    ratio = float(conductivity(ions)) / seen.ec
    if EC_RATIO[0] <= ratio <= EC_RATIO[1]:
        return ""
    return (
        f"its ions make EC {ratio * seen.ec:.1f}, the laboratory measured {seen.ec:.1f}; "
        "look at units and at the temperature EC refers to"
    )
