"""What a recipe has to do with: the loop, its goals, the salts of the stock, the running recipe and what the water
brings."""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

from fertui.chemistry.ions import IONS, Array
from fertui.planning.goal import Goal
from fertui.planning.runs import Situation
from fertui.planning.shelf import Material

MOVED = tuple(i for i, ion in enumerate(IONS) if ion != "HCO3")
"""Ions of the feed that a recipe moves; its alkalinity belongs to the water and the acid."""


class RecipeTask(NamedTuple):
    """The loop, the goals by point, the stock's salts, the running recipe and what the water brings of it (10,)."""

    situation: Situation
    goals: Mapping[str, Goal]
    materials: tuple[Material, ...]
    running: Array
    own: Array
    horizon: int
    days: tuple[int, ...] = (0,)

    @property
    def managed(self) -> Goal:
        """Goal of the point the loop is steered by."""
        return self.goals[self.situation.managed]
