"""Random numbers that depend on the day they are for and on nothing else.

Keyed by (seed, loop, local day): a new entry, an earlier start or a cache never reshuffles the days before or after.
Each number is a hash of its place, so no generator carries a state from one day to the next.
"""

from __future__ import annotations

from zlib import crc32

import numpy as np
import numpy.typing as npt

from fertui.chemistry.ions import Array

_GOLDEN = np.uint64(0x9E3779B97F4A7C15)
_MULTIPLY = (np.uint64(0xBF58476D1CE4E5B9), np.uint64(0x94D049BB133111EB))
_SHIFTS = (np.uint64(30), np.uint64(27), np.uint64(31))
_TO_UNIT, _HALF = np.float32(2.0**-32), np.float32(0.5)
Single = npt.NDArray[np.float32]


def normals(seed: int, loop: str, key: int | str, members: int, columns: int, apart: bool = False) -> Array:
    """Standard normal numbers (members, columns) whose mean over the members is zero; zeros for a single member.

    ``apart``: columns are made uncorrelated and of variance one to rounding, where there are members enough.

    Box-Muller on hashed counters (splitmix64: Steele, Lea & Flood 2014, OOPSLA, from memory), in single precision: its
    seven digits are plenty for noise, and its sines cost a tenth.

    >>> bool(np.allclose(normals(1, "bay", 738000, 300, 2).mean(0), 0))
    True
    """
    if members == 1:
        return np.zeros((members, columns))
    high, low = _hashed(f"{seed} {loop} {key}", (members * columns + 1) // 2)
    radius, angle = np.sqrt(-2.0 * np.log(high)), (2.0 * np.pi) * low
    drawn = np.concatenate([radius * np.cos(angle), radius * np.sin(angle)], dtype=float)[: members * columns]
    drawn = drawn.reshape(members, columns)
    drawn = np.asfortranarray(drawn - drawn.mean(axis=0))
    if not apart or members <= 2 * columns:
        return drawn
    root = np.linalg.cholesky(drawn.T @ drawn / members)
    return np.linalg.solve(root, drawn.T).T


def _hashed(words: str, count: int) -> tuple[Single, Single]:
    """Two rows of numbers in (0, 1] from a text and their place in the row."""
    start = (crc32(words.encode()) << 32) | crc32(words[::-1].encode())
    z: npt.NDArray[np.uint64] = np.arange(1, count + 1, dtype=np.uint64) * _GOLDEN + np.uint64(start)
    z = (z ^ (z >> _SHIFTS[0])) * _MULTIPLY[0]
    z = (z ^ (z >> _SHIFTS[1])) * _MULTIPLY[1]
    z ^= z >> _SHIFTS[2]
    halves = z.view(np.uint32).astype(np.float32)
    return (halves[0::2] + _HALF) * _TO_UNIT, (halves[1::2] + _HALF) * _TO_UNIT
