"""What the salts of a stock must bring: the recipe less what the water, the acid and the silicate bring; and what they
then miss."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import NamedTuple

import numpy as np

from fertui.catalogue.acids import Acid
from fertui.chemistry.ions import INDEX, IONS, MICRONUTRIENTS, Array, vector
from fertui.planning.acid import MEASURE_IT, PH_START, PH_TARGET, demanded
from fertui.planning.composing import SPECIES, Composed, importance
from fertui.planning.shelf import Material, material
from fertui.site.model import Composition, Supply

MISSED = 0.05
"""Misfit of one ion, in parts of what is asked, from which the sheet speaks of it."""


ACID_ANIONS = ("NO3", "SO4", "H2PO4", "Cl")


class Needed(NamedTuple):
    """What salts must bring (17,), what comes without them, and the fixed kg/m3 of acid and silicate.

    ``by_acid`` (17,): what the acid of the acid sheet makes of the make-up water before any stock: its anion, less
    HCO3.
    """

    asked: Array
    own: Array
    fixed: Mapping[Material, float]
    notices: tuple[str, ...]
    by_acid: Array

    @property
    def wanted(self) -> Array:
        """What is left for the salts, shape (17,) [mmol/L, umol/L]; below zero where there is too much without them."""
        brought = [1.0 * kg * per_kg(each) / 1000.0 for each, kg in self.fixed.items()]
        return self.asked - self.own - self.by_acid - sum(brought, np.zeros(len(SPECIES)))


def asked(composition: Composition) -> Array:
    """A composition as one vector, ions then micronutrients, shape (17,); what it does not name is zero."""
    micros = [composition.micronutrients.get(name, 0.0) for name in MICRONUTRIENTS]
    return np.concatenate([vector(dict(composition.ions)), np.array(micros, dtype=float)])


def per_kg(each: Material) -> Array:
    """What a kilogram of a material brings, shape (17,) [mmol, umol]."""
    return np.concatenate([each.ions_mmol_per_kg, each.micros_umol_per_kg])


def needed_of(
    recipe: Composition, water: Composition, acid: Supply | None, materials: Sequence[Material], leave: float,
    in_water: Supply | None = None,
) -> Needed:  # fmt: skip
    """Silicate first, as its alkalinity adds to what the acid has to take; then the acid; the salts bring the rest.

    ``acid`` is fixed in the stock, ``in_water`` goes into the make-up water by the acid sheet.
    """
    want, own = asked(recipe), asked(water)
    fixed: dict[Material, float] = {}
    notices: list[str] = []
    silicon = SPECIES.index("Si")
    source = next((each for each in materials if each.brings("Si")), None)
    if want[silicon] > own[silicon] and source is not None:
        fixed[source] = 1000.0 * float(want[silicon] - own[silicon]) / float(source.micros_umol_per_kg[-1])
    alkalinity = water.ions.get("HCO3")
    if acid is not None and alkalinity is None:
        notices.append(MEASURE_IT)
    elif acid is not None and alkalinity is not None:
        brought = sum(kg * float(each.ions_mmol_per_kg[INDEX["HCO3"]]) / 1000.0 for each, kg in fixed.items())
        fixed |= _fixed_acid(material(acid), water._replace(ions={**water.ions, "HCO3": alkalinity + brought}), leave)
    by_acid = np.zeros(len(SPECIES)) if in_water is None else brought_by_acid(in_water, water, leave)
    left = (own + by_acid)[INDEX["HCO3"]] + sum(
        kg * float(each.ions_mmol_per_kg[INDEX["HCO3"]]) / 1000.0 for each, kg in fixed.items()
    )
    want[INDEX["HCO3"]] = max(left, 0.0)
    return Needed(want, own, fixed, tuple(notices), by_acid)


def brought_by_acid(acid: Supply, water: Composition, leave: float) -> Array:
    """What an acid poured to leave so much alkalinity [meq/L] adds to a water (17,) [mmol/L]; none where the alkalinity
    is not known.

    >>> nitric = Supply("nitric acid", "nitric acid", strength_pct=60.0)
    >>> added = brought_by_acid(nitric, Composition({"HCO3": 3.5}), 0.5)
    >>> {ion: round(float(added[INDEX[ion]]), 2) for ion in ("NO3", "HCO3")}
    {'NO3': 3.0, 'HCO3': -3.0}
    """
    if water.ions.get("HCO3") is None:
        return np.zeros(len(SPECIES))
    brought = (1e-3 * kg * per_kg(each) for each, kg in _fixed_acid(material(acid), water, leave).items())
    return sum(brought, np.zeros(len(SPECIES)))


def acid_words(acid: Supply | None, water: Composition, leave: float) -> tuple[str, ...]:
    """What is said of the HCO3 of the make-up water beside a mix of salts: nothing where it is no more than is left."""
    alkalinity = water.ions.get("HCO3")
    if alkalinity is None:
        return (MEASURE_IT,) if acid is not None and water.ions else ()
    if alkalinity <= leave:
        return ()
    if acid is None:
        return (
            f"HCO3: the water brings {alkalinity:.1f} meq/L and no acid on the shelf takes it: the feed keeps a pH "
            "above 7, where phosphate and iron fall out; add an acid to the shelf and make the acid sheet",
        )
    added = brought_by_acid(acid, water, leave)
    anions = " and ".join(f"{added[INDEX[ion]]:.2f} mmol/L {ion}" for ion in ACID_ANIONS if added[INDEX[ion]] > 0.0)
    return (
        f"HCO3: the water brings {alkalinity:.1f} meq/L; the acid sheet ({acid.name}) takes it down to {leave:g} "
        f"before the stocks go in. The {anions} it brings is taken off these salts: without the acid they are too "
        "little",
    )


def _fixed_acid(acid: Material, water: Composition, leave: float) -> dict[Material, float]:
    assert isinstance(acid.found, Acid)
    assert acid.supply.strength_pct is not None
    mmol = demanded(acid.found, water, leave, PH_TARGET, water.ph or PH_START).to_leave
    return {acid: mmol * acid.found.molar_mass / 1000.0 / (acid.supply.strength_pct / 100.0)} if mmol > 0.0 else {}


def not_covered(composed: Composed, needed: Needed) -> tuple[str, ...]:
    """Ions and micronutrients of which less than half of what is wanted is there."""
    short = composed.misfit < -0.5 * np.maximum(needed.wanted, 1e-9)
    return tuple(name for name, bad, want in zip(SPECIES, short, needed.wanted, strict=True) if bad and want > 1e-6)


def _not_on_shelf(composed: Composed, needed: Needed) -> list[str]:
    """One line for the micronutrients that no supply brings."""
    names = [
        name for name, want, got in zip(SPECIES, needed.wanted, composed.brought, strict=True)
        if name in MICRONUTRIENTS and want > 1e-6 and got <= 0.0
    ]  # fmt: skip
    return [f"no supply brings {', '.join(names)}: add them to the shelf, or mix them as you do now"] if names else []


def misfits(composed: Composed, needed: Needed) -> list[str]:
    """What is missing or too much with these supplies, in words."""
    parts = composed.misfit * importance(needed.asked)
    notices = _not_on_shelf(composed, needed)
    given = needed.own + needed.by_acid
    for name, part, off, own, ask in zip(SPECIES, parts, composed.misfit, given, needed.asked, strict=True):
        if part > MISSED and own > ask:
            by = (
                "the water and its acid bring"
                if needed.by_acid[SPECIES.index(name)] > 0.0
                else "the water alone brings"
            )
            notices.append(f"{name}: {by} {own:.2f}, the recipe asks for {ask:.2f}; no salt takes it out")
        elif abs(part) > MISSED and name != "HCO3" and (name in IONS or composed.brought[SPECIES.index(name)] > 0):
            notices.append(f"{name}: {abs(off):.2f} {'too much' if off > 0 else 'missing'} with these supplies")
            if name == "NH4" and off > 0:
                notices[-1] += "; a calcium nitrate without ammonium would bring none"
    return notices


def subtraction(needed: Needed) -> tuple[str, ...]:
    """Recipe less water, the acid in it, and what acid and silicate in the stock bring, ion by ion."""
    lines = []
    for i, name in enumerate(SPECIES):
        if needed.asked[i] > 1e-9 and name != "HCO3":
            fixed = needed.asked[i] - needed.own[i] - needed.by_acid[i] - needed.wanted[i]
            less_acid = f" - {needed.by_acid[i]:.3f} acid in the water" if abs(needed.by_acid[i]) > 1e-9 else ""
            less_acid += f" - {fixed:.3f} acid and silicate" if abs(fixed) > 1e-9 else ""
            unit = "mmol/L" if name in IONS else "umol/L"
            lines.append(
                f"{name}: recipe {needed.asked[i]:.3f} - water {needed.own[i]:.3f}{less_acid} = "
                f"{needed.wanted[i]:.3f} {unit} from salts"
            )
    return tuple(lines)
