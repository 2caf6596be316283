"""From an exact amount to what can be weighed: scale, whole bags, liquids by volume, pre-solutions for small
weights."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

from fertui.planning.shelf import Material
from fertui.site.model import Site

WORST_ERROR_PCT = {"micronutrient": 5.0, "nutrient": 10.0}
"""Half a scale step may be at most this part of a weight; smaller weights go by way of a pre-solution (common
practice)."""
PRE_SOLUTION_G_PER_L = 50.0
"""Strength a pre-solution is kept under, well below what any micronutrient salt dissolves to (common practice)."""
LITRE_STEP = 0.01
"""Liquids are measured to 10 mL (common practice)."""


class Scale(NamedTuple):
    """A scale of the site: its step and the most it carries [kg]."""

    name: str
    step_kg: float
    capacity_kg: float = math.inf


class PreSolution(NamedTuple):
    """Weigh ``weigh_kg`` into ``water_l`` of solution, use ``use_l`` of it for one tank; keeps for ``batches``
    tanks."""

    weigh_kg: float
    water_l: float
    use_l: float
    batches: int


class Weighing(NamedTuple):
    """One line of a sheet: what goes in, rounded to what the site can measure. ``kg`` is what then really goes in.

    ``strength_pct``: mass % of an acid or lye, None for salts.
    """

    salt: str
    kind: str
    formula: str
    kg: float
    exact_kg: float
    litres: float | None
    bags: int
    bag_kg: float | None
    rest_kg: float
    scale: str
    step_kg: float
    pre_solution: PreSolution | None
    words: str
    strength_pct: float | None = None

    @property
    def share_error_pct(self) -> float:
        """How far rounding moves this line [%]."""
        return 100.0 * (self.kg - self.exact_kg) / self.exact_kg if self.exact_kg else 0.0


def scales_of(site: Site) -> tuple[Scale, ...]:
    """The scales of the site, finest first; the site's own step counts as a scale without a limit.

    >>> [each.step_kg for each in scales_of(Site("S", "UTC", (), scale_step_kg=0.05))]
    [0.05]
    """
    named = [
        Scale(each.name, each.step_kg, each.capacity_kg or math.inf)
        for each in site.instruments
        if each.kind == "scale" and each.step_kg
    ]
    return tuple(sorted([*named, Scale("scale", site.scale_step_kg)], key=lambda each: each.step_kg))


def weigh(material: Material, kg: float, scales: Sequence[Scale]) -> Weighing:
    """The line for ``kg`` of a material: a liquid by volume, else whole bags and a rest on the finest scale that
    carries it.

    >>> from fertui.planning.shelf import material
    >>> from fertui.site.model import Supply
    >>> bag = material(Supply("calcium nitrate", "calcium nitrate double salt", bag_kg=25.0))
    >>> weigh(bag, 106.02, [Scale("floor", 0.05)]).words
    '4 bags of 25 kg + 6.00 kg (floor, step 50 g)'
    """
    if material.density_kg_per_l is not None:
        return _poured(material, kg, material.density_kg_per_l)
    bag = material.supply.bag_kg
    bags = int((kg + 1e-9) // bag) if bag else 0
    rest = kg - bags * (bag or 0.0)
    scale = next((each for each in scales if rest <= each.capacity_kg), scales[-1])
    if bags == 0 and 0.0 < kg < _least(material, scale):
        return _pre_dissolved(material, kg, scale)
    weighed = rounded(rest, scale.step_kg)
    words = f"{amount(weighed)} ({scale.name}, step {step(scale.step_kg)})"
    if bags:
        words = f"{bags} bag{'s' if bags > 1 else ''} of {bag:g} kg" + (f" + {words}" if weighed else "")
    return _line(material, bags * (bag or 0.0) + weighed, kg, None, bags, weighed, scale, None, words)


def _least(material: Material, scale: Scale) -> float:
    """Least weight [kg] of a material that a scale weighs well enough."""
    return scale.step_kg * 50.0 / WORST_ERROR_PCT.get(material.use, WORST_ERROR_PCT["nutrient"])


def rounded(kg: float, step_kg: float) -> float:
    """``kg`` to the nearest step of the scale.

    >>> rounded(5.216, 0.05)
    5.2
    """
    return round(round(kg / step_kg) * step_kg, 9)


def amount(kg: float) -> str:
    """A weight as a person reads it off a scale.

    >>> amount(5.2), amount(0.0121)
    ('5.20 kg', '12.1 g')
    """
    return f"{kg:.2f} kg" if kg >= 0.9995 else f"{kg * 1000:.4g} g"


def step(step_kg: float) -> str:
    """A scale step in words: grams."""
    return f"{step_kg * 1000:g} g"


def _poured(material: Material, kg: float, density: float) -> Weighing:
    litres = rounded(kg / density, LITRE_STEP if kg / density >= 0.1 else LITRE_STEP / 10)
    scale = Scale("measuring cylinder", LITRE_STEP)
    words = f"{litres:.3g} L ({density:.3f} kg/L)"
    return _line(material, litres * density, kg, litres, 0, litres * density, scale, None, words)


def _pre_dissolved(material: Material, kg: float, scale: Scale) -> Weighing:
    batches = 10
    while batches * kg < _least(material, scale):
        batches *= 10
    use = max(1.0, math.ceil(1000.0 * kg / PRE_SOLUTION_G_PER_L))
    weighed = rounded(batches * kg, scale.step_kg)
    pre = PreSolution(weighed, use * batches, use, batches)
    words = (
        f"too little for the {scale.name} (step {step(scale.step_kg)}, +-{50 * scale.step_kg / kg:.0f} %): dissolve "
        f"{amount(weighed)} to {pre.water_l:g} L, use {use:g} L of it ({amount(weighed / batches)})"
    )
    return _line(material, weighed / batches, kg, None, 0, weighed, scale, pre, words)


def _line(
    material: Material, kg: float, exact: float, litres: float | None, bags: int, rest: float, scale: Scale,
    pre: PreSolution | None, words: str,
) -> Weighing:  # fmt: skip
    return Weighing(
        material.name, material.kind, material.formula, kg, exact, litres, bags, material.supply.bag_kg, rest,
        scale.name, scale.step_kg, pre, words, material.supply.strength_pct,
    )  # fmt: skip
