"""Amounts that were logged for a stretch of time, and how much of them falls into any other stretch.

Times are days from the start of a record.
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import Generic, NamedTuple, TypeVar

import numpy as np

from fertui.chemistry.ions import Array

SHORTEST_DAYS = 1.0 / 1440.0


class Spread(NamedTuple):
    """Amounts (n, ...) each spread evenly from ``start`` (n,) to ``end`` (n,) [d]."""

    start: Array
    end: Array
    amount: Array

    def over(self, grid: Array) -> Array:
        """Amounts (spans, ...) that fall between neighbouring times of an ascending grid [d].

        >>> spread([(0.0, 2.0, 10.0)]).over(np.array([0.0, 0.5, 3.0]))
        array([2.5, 7.5])
        """
        return np.diff(np.tensordot(self._done(grid), self.amount, axes=1), axis=0)

    def covered(self, grid: Array) -> Array:
        """Fraction (spans,) of every span for which something was logged, at most 1."""
        lengths = np.diff(grid)
        logged = np.diff(self._done(grid) @ (self.end - self.start))
        return np.minimum(logged / np.maximum(lengths, SHORTEST_DAYS), 1.0)

    def _done(self, grid: Array) -> Array:
        """Fraction (times, n) of every amount that is over by each time of the grid."""
        return np.clip((grid[:, None] - self.start) / (self.end - self.start), 0.0, 1.0)


def spread(items: Iterable[tuple[float, float, float | Array]], width: tuple[int, ...] = ()) -> Spread:
    """A spread of (start, end, amount); ``width`` is the shape of one amount, for when there are none."""
    rows = list(items)
    starts = np.array([row[0] for row in rows], dtype=float)
    ends = np.maximum(np.array([row[1] for row in rows], dtype=float), starts + SHORTEST_DAYS)
    amounts = np.array([row[2] for row in rows], dtype=float) if rows else np.zeros((0, *width))
    return Spread(starts, ends, amounts)


Held = TypeVar("Held")


class Steps(NamedTuple, Generic[Held]):
    """Values that hold from their time on: set points, recipes, waters, stages."""

    times: tuple[float, ...]
    values: tuple[Held, ...]

    def at(self, time: float) -> Held | None:
        """The value in force at a time, None before the first.

        >>> Steps((1.0, 3.0), ("a", "b")).at(2.0)
        'a'
        """
        position = int(np.searchsorted(self.times, time + 1e-9, side="right")) - 1
        return self.values[position] if position >= 0 else None
