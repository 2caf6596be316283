"""What stands on the shelf, as the planner needs it: what a kilogram brings, and what it must not stand in one tank
with."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np

from fertui.catalogue.acids import Acid
from fertui.catalogue.salts import Salt
from fertui.catalogue.supplies import contents, of_supply
from fertui.chemistry.ions import INDEX, IONS, MICRONUTRIENTS, Array
from fertui.refusals import Refusal
from fertui.site.model import Supply

TRACE_MMOL_PER_KG = 50.0
"""What a kilogram may bring of an ion before it counts as a source of it: below this it is an impurity of the lot."""


class PlanningError(Refusal):
    """A plan or sheet that cannot be asked for like this; the message says why and what to do."""


@dataclass(frozen=True, slots=True, eq=False)
class Material:
    """One supply: per kg mmol of each ion (10,) and umol of each micronutrient (7,); price or 1 as ``cost_per_kg``."""

    name: str
    found: Salt | Acid
    supply: Supply
    ions_mmol_per_kg: Array
    micros_umol_per_kg: Array
    cost_per_kg: float = 1.0

    @property
    def kind(self) -> str:
        """Name in the catalogue."""
        return self.found.name

    @property
    def formula(self) -> str:
        """Formula of the trade form."""
        return self.found.formula

    @property
    def is_acid(self) -> bool:
        """An acid, or an alkali in solution: it is dosed by its own rules, never as a salt."""
        return isinstance(self.found, Acid)

    @property
    def use(self) -> str:
        """nutrient, micronutrient, alkali, disinfectant or acid."""
        return "acid" if isinstance(self.found, Acid) else self.found.use

    @property
    def density_kg_per_l(self) -> float | None:
        """Density of a liquid [kg/L]: the label's, else an acid's table; None for a solid."""
        if self.supply.density_kg_per_l is not None or not isinstance(self.found, Acid):
            return self.supply.density_kg_per_l
        assert self.supply.strength_pct is not None
        return self.found.density(self.supply.strength_pct)

    def brings(self, ion: str) -> bool:
        """Whether it is a source of that ion or micronutrient, traces apart.

        >>> material(Supply("MKP", "monopotassium phosphate")).brings("K")
        True
        """
        if ion in INDEX:
            return bool(self.ions_mmol_per_kg[INDEX[ion]] > TRACE_MMOL_PER_KG)
        return bool(self.micros_umol_per_kg[MICRONUTRIENTS.index(ion)] > 0.0)


def material(supply: Supply) -> Material:
    """A supply of the site as a material; its label goes before the formula.

    Raises ``CatalogueError`` for an unknown or ambiguous kind, an impossible label, an acid without its strength.
    """
    brought = contents(supply)
    micros = np.array([1000.0 * brought.get(name, 0.0) for name in MICRONUTRIENTS])
    ions = np.array([brought.get(ion, 0.0) for ion in IONS])
    price = 1.0 if supply.price_per_kg is None else supply.price_per_kg
    return Material(supply.name, of_supply(supply), supply, ions, micros, price)


def shelf(
    supplies: Sequence[Supply], only: Iterable[str] | None = None, without: Iterable[str] = ()
) -> tuple[Material, ...]:
    """The supplies as materials: ``only`` those named (a name unknown to the site is looked up in the catalogue),
    less ``without``.

    Names are those of the site or of the catalogue. A price counts only where all have one.
    Raises ``PlanningError`` for a name left out that is not on the shelf, ``CatalogueError`` as ``material`` does.
    """
    chosen = list(supplies) if only is None else [_named(supplies, name) for name in only]
    materials = [material(each) for each in chosen]
    for name in without:
        left = [each for each in materials if not _is(each, name)]
        if len(left) == len(materials):
            raise PlanningError(
                f"{name!r} is not on the shelf; there are {', '.join(each.name for each in materials)}."
            )
        materials = left
    return tuple(_priced(materials))


def _named(supplies: Sequence[Supply], name: str) -> Supply:
    for supply in supplies:
        if _key(name) in (_key(supply.name), _key(supply.kind)):
            return supply
    return Supply(name, name)


def _is(each: Material, name: str) -> bool:
    aliases = each.found.aliases
    return _key(name) in {_key(word) for word in (each.name, each.kind, each.formula, each.supply.kind, *aliases)}


def _key(name: str) -> str:
    return "".join(name.lower().split())


def _priced(materials: list[Material]) -> list[Material]:
    if all(each.supply.price_per_kg is not None for each in materials):
        return materials
    return [
        Material(each.name, each.found, each.supply, each.ions_mmol_per_kg, each.micros_umol_per_kg)
        for each in materials
    ]


def salts_of(materials: Sequence[Material]) -> tuple[Material, ...]:
    """Those that are weighed as salts: neither acid nor alkali nor disinfectant."""
    return tuple(each for each in materials if each.use in ("nutrient", "micronutrient"))
