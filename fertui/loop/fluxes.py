"""What moves in a loop, by cause: the vocabulary of every account."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fertui.chemistry.ions import Array

CAUSES = ("make_up", "stock", "dose", "acid", "feed", "uptake", "exchange", "bleed", "drain", "unexplained")
"""Order of the cause axis of every account."""
CAUSE = {cause: position for position, cause in enumerate(CAUSES)}
WATERS = ("make_up", "feed", "irrigation", "crop", "drain", "bleed", "overflow")
"""Order of the water axis of ``Fluxes.litres``; ``overflow`` is a part of ``bleed``."""


@dataclass(frozen=True, slots=True)
class Fluxes:
    """What moved over a stretch: ``by_cause`` (M, causes, 10) [mmol], gains of the solution positive;

    ``overflow`` (M, 10) [mmol]: the part of ``bleed`` that ran over; ``litres`` (M, waters) [L].
    """

    by_cause: Array
    overflow: Array
    litres: Array

    def cause(self, name: str) -> Array:
        """Flux of one cause (M, 10) [mmol]."""
        return self.by_cause[:, CAUSE[name]]

    def __add__(self, other: Fluxes) -> Fluxes:
        return Fluxes(self.by_cause + other.by_cause, self.overflow + other.overflow, self.litres + other.litres)


def no_fluxes(members: int) -> Fluxes:
    """An account with nothing in it."""
    shapes = ((members, len(CAUSES), 10), (members, 10), (members, len(WATERS)))
    return Fluxes(*(np.zeros(shape, order="F") for shape in shapes))
