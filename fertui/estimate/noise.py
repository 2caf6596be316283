"""Random numbers that depend on the day they are for and on nothing else.

Keyed by (seed, loop, local day): a new entry, an earlier start or a cache never reshuffles the days before or after.
"""

from __future__ import annotations

from zlib import crc32

import numpy as np

from fertui.chemistry.ions import Array


def normals(seed: int, loop: str, key: int | str, members: int, columns: int) -> Array:
    """Standard normal numbers (members, columns) whose mean over the members is zero.

    >>> bool(np.allclose(normals(1, "bay", 738000, 300, 2).mean(0), 0))
    True
    """
    word = key if isinstance(key, int) else crc32(key.encode())
    generator = np.random.Generator(np.random.PCG64([seed, crc32(loop.encode()), word]))
    drawn = generator.standard_normal((members, columns))
    return drawn - drawn.mean(axis=0) if members > 1 else np.zeros((members, columns))
