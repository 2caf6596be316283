"""A source water that nobody analysed: what it may hold, so that nothing of it is shown as known."""

from __future__ import annotations

from collections.abc import Mapping
from functools import lru_cache

import numpy as np

from fertui.chemistry.ions import CHARGE, INDEX, IONS, Array
from fertui.estimate.noise import normals

USUAL = {"Na": 1.0, "Cl": 1.0, "Ca": 1.0, "Mg": 0.4, "SO4": 0.5}
"""What wells, rivers and mains hold, middle of a wide range [mmol/L] (from memory); alkalinity closes the charges."""
UNSEEN = {"Na": 0.3, "Cl": 0.3}
"""What a solution may hold beyond its feed of ions that no recipe asks for, middle of as wide a range (our own)."""
USUAL_SD = 1.2
"""Spread (log): 80 % of waters within a factor of 4.7 either way (from memory)."""


def filled_up(water: Array, loop: str, members: int) -> Array:
    """The water (10,) [mmol/L] as it was analysed; where it is nan, a guess of its own for every member (M, 10)."""
    if not np.isnan(water).any():
        return water
    found = guessed(loop, members)
    return found[0] if members == 1 else found


@lru_cache(maxsize=8)
def guessed(loop: str, members: int) -> Array:
    """What each member takes an unanalysed water to hold (M, 10) [mmol/L]: the same at all times, charges closed.

    >>> water = guessed("bay", 200)
    >>> bool((np.abs(water @ CHARGE) < 1e-9).mean() > 0.5), round(float(np.median(water[:, INDEX["Na"]])), 1)
    (True, 1.0)
    """
    found = _drawn(loop, "water that nobody analysed", members, USUAL)
    found[:, INDEX["HCO3"]] = np.maximum(found @ CHARGE, 0.0)
    return found


def unseen(loop: str, vessel: int, members: int) -> Array:
    """What each member takes a vessel to hold (M, 10) [mmol/L] of what neither feed nor analysis speaks of."""
    return _drawn(loop, f"unseen in vessel {vessel}", members, UNSEEN)


def _drawn(loop: str, key: str, members: int, middles: Mapping[str, float]) -> Array:
    drawn = normals(0, loop, key, members, len(middles), apart=True)
    found = np.zeros((members, len(IONS)))
    for (ion, middle), column in zip(middles.items(), drawn.T, strict=True):
        found[:, INDEX[ion]] = middle * np.exp(USUAL_SD * column)
    return found
