"""What is known of a point: values with their 80 % range and the band they should stay in."""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

Band = tuple[float | None, float | None]
"""Allowed range; one side may be open."""


class Estimated(NamedTuple):
    """A number with its 80 % range (``low`` to ``high``) and the band it should stay in, where there is one."""

    value: float
    low: float
    high: float
    band: Band | None = None


class IonState(NamedTuple):
    """One ion at a point: concentration [mmol/L; umol/L for micronutrients] and, for K, Ca and Mg, its share [%]."""

    mmol_l: Estimated
    share_pct: Estimated | None = None


class PointState(NamedTuple):
    """One point of a loop: EC [mS/cm at 25 C], pH where known, ions by name."""

    ec: Estimated
    ph: Estimated | None
    ions: Mapping[str, IonState]
