"""What may come: the logged routine, the plan that was entered, or a what-if."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import datetime
from typing import NamedTuple

from fertui.chemistry.ions import Array

Number = float | Array
"""One number for all members, or one per member (M,)."""


class Dose(NamedTuple):
    """Salt weighed in at a time: kg of a supply or salt, or ``adds_mmol`` (10,) or (M, 10), which goes before it."""

    at: datetime
    salt: str = ""
    kg: Number = 0.0
    adds_mmol: Array | None = None


class Renewal(NamedTuple):
    """Solution discharged and replaced: litres, and the composition [mmol/L] of what fills up."""

    at: datetime
    litres: Number
    refill: Mapping[str, Number]


class FeedRecipe(NamedTuple):
    """A feed composition [mmol/L] that holds from a time on; proportions where stock is dosed to an EC."""

    at: datetime
    ions: Mapping[str, Number]


class Scenario(NamedTuple):
    """What differs from the routine; None: as logged. Light [J/cm2 a day], crop water [L/m2/d], bleed [L/d]."""

    light_j_per_cm2_d: float | None = None
    crop_water_l_per_m2_d: float | None = None
    source: str | None = None
    recipe: Mapping[str, Number] | None = None
    recipes: tuple[FeedRecipe, ...] = ()
    feed_ec: float | None = None
    bleed_l_per_d: float | None = None
    doses: tuple[Dose, ...] = ()
    renewals: tuple[Renewal, ...] = ()


ROUTINE = Scenario()
