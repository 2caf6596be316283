"""Linear programs solved for one aim after the other, with whole numbers where something is weighed or switched.

scipy's HiGHS does the work and is imported on the first call. Three of its traps decide the form used here: a switch
needs a physical maximum and no arbitrary big number, an aim has to be of order 1, and whole numbers come back
unrounded.
"""

from __future__ import annotations

import ctypes
import os
import sys
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from fertui.chemistry.ions import Array

Whole = npt.NDArray[np.int_]

NODES = 20_000
"""Branch-and-bound nodes after which the best found stands: a bound by count gives the same answer on every machine."""


class Region(NamedTuple):
    """What is allowed: ``low <= matrix x <= high`` row by row and ``least <= x <= most``; ``whole`` marks whole
    numbers.

    ``matrix`` has shape (rows, variables); ``low`` and ``high`` (rows,); ``least``, ``most`` and ``whole``
    (variables,).
    """

    matrix: Array
    low: Array
    high: Array
    least: Array
    most: Array
    whole: Whole

    def holds(self, x: Array, tolerance: float = 1e-6) -> bool:
        """True where ``x`` keeps every row and bound within ``tolerance``.

        >>> one = np.ones(1)
        >>> Region(np.eye(1), 0 * one, one, 0 * one, one, np.zeros(1, int)).holds(np.array([2.0]))
        False
        """
        rows = self.matrix @ x
        kept = (rows >= self.low - tolerance) & (rows <= self.high + tolerance)
        return bool(kept.all() and (x >= self.least - tolerance).all() and (x <= self.most + tolerance).all())

    def with_row(self, row: Array, high: float) -> Region:
        """The same region cut by ``row x <= high``."""
        return Region(
            np.vstack([self.matrix, row]), np.append(self.low, -np.inf), np.append(self.high, high),
            self.least, self.most, self.whole,
        )  # fmt: skip

    def without(self, variables: Whole) -> Region:
        """The same region with those variables held at zero."""
        least, most = self.least.copy(), self.most.copy()
        least[variables] = most[variables] = 0.0
        return Region(self.matrix, self.low, self.high, least, most, self.whole)


class Aim(NamedTuple):
    """Something to make small: ``cost`` per variable, scaled to order 1, and how much of it later aims may give
    away."""

    cost: Array
    give: float = 1e-6


@dataclass(slots=True)
class Solver:
    """Counts its calls: a plan says what it cost."""

    calls: int = field(default=0)

    def minimise(self, cost: Array, region: Region) -> Array | None:
        """The point of ``region`` with the least ``cost``, whole numbers rounded; None where there is no such point.

        The answer is checked against the region here, whatever status the solver reports.

        >>> square = Region(np.eye(2), np.zeros(2), np.full(2, 3.0), np.zeros(2), np.full(2, 2.0), np.zeros(2, int))
        >>> Solver().minimise(np.array([-1.0, 1.0]), square).tolist()
        [2.0, 0.0]
        """
        from scipy.optimize import Bounds, LinearConstraint, milp

        self.calls += 1
        with _standard_output_kept_clean():
            result = milp(
                cost,
                integrality=region.whole,
                bounds=Bounds(region.least, region.most),
                constraints=LinearConstraint(region.matrix, region.low, region.high),
                options={"mip_rel_gap": 1e-7, "node_limit": NODES, "presolve": False},
            )
        if result.x is None:
            return None
        x = np.where(region.whole > 0, np.round(result.x), result.x)
        x = np.clip(x, region.least, region.most)
        return x if region.holds(x, 1e-5) else None


@contextmanager
def _standard_output_kept_clean() -> Iterator[None]:
    """Turns away what HiGHS prints on standard output from within the library, whatever its options say.

    A line of it would stand in the middle of JSON. The terminal interface draws by way of standard error.
    """
    sys.stdout.flush()
    kept, nowhere = os.dup(1), os.open(os.devnull, os.O_WRONLY)
    os.dup2(nowhere, 1)
    try:
        yield
    finally:
        ctypes.CDLL(None).fflush(None)
        os.dup2(kept, 1)
        os.close(kept)
        os.close(nowhere)


def lexicographic(solver: Solver, region: Region, aims: Sequence[Aim]) -> Array | None:
    """The point that is best in the first aim, among those the best in the second, and so on; None where nothing is
    allowed.

    Each aim is held at its optimum plus its ``give`` while the next is pursued. One solver call an aim.

    >>> square = Region(np.eye(2), np.zeros(2), np.full(2, 3.0), np.zeros(2), np.full(2, 2.0), np.zeros(2, int))
    >>> lexicographic(Solver(), square, [Aim(np.array([-1.0, 0.0])), Aim(np.array([0.0, -1.0]))]).round(3).tolist()
    [2.0, 2.0]
    """
    best: Array | None = None
    for aim in aims:
        found = solver.minimise(aim.cost, region)
        if found is None:
            return best
        best = found
        region = region.with_row(aim.cost, float(aim.cost @ best) + aim.give)
    return best
