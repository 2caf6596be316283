"""Which salt goes into which stock tank, what must not share one, and whether it all dissolves.

Tanks are known by what is in them, never by a letter: two traditions give the letters the opposite way.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import NamedTuple

import numpy as np

from fertui.catalogue.salts import salts
from fertui.chemistry.ions import CHARGE, INDEX, IONS, Array
from fertui.chemistry.minerals import saturation
from fertui.planning.shelf import Material
from fertui.site.model import StockTank

GYPSUM_KG_PER_MOL, BRUSHITE_KG_PER_MOL = 0.17217, 0.17209
"""Molar masses of CaSO4.2H2O and CaHPO4.2H2O."""

SULFATE_TOLERATED: Array = np.array([[15.0, 25.0, 50.0, 100.0, 250.0, 500.0], [15.0, 14.0, 10.0, 8.2, 6.4, 4.9]])
"""Calcium [mmol/L] of a calcium nitrate stock, and the sulfate [mmol/L] that then saturates gypsum at 20 degrees C:
PHREEQC 3.8.6, phreeqc.dat; above 100 beyond its good range. Used where a tank is too strong for the activity
model."""

ACTIVITY_RANGE = 0.5
"""Ionic strength [mol/L] up to which the mineral saturations hold."""
STOCK_PH = 5.0
"""pH a stock of phosphates and nitrates settles near (Hoagland solutions: 4.9 by PHREEQC); brushite is judged at it."""
TRACE = 1.0
"""Concentration in the tank [mmol/L] below which an ion is an impurity of the lots."""
STRONGEST = 250.0
"""Concentration a stock is not made beyond: 200-250 times (Quaderno ARSIA 5/2004, p. 181)."""
DISPLACED_L_PER_KG = 0.45
"""Water that a kilogram of dissolved salt displaces [L] (common practice, no source)."""

CONTENTS = ("calcium", "sulfate", "acid", "silicate")
WORDS = {
    "calcium": ("calcium", "nitrate"), "sulfate": ("sulfate", "sulphate", "phosphate", "potassium"),
    "acid": ("acid", "lye"), "silicate": ("silicate", "silicon"),
}  # fmt: skip


class Refused(NamedTuple):
    """Two things that must not share a tank, and why."""

    pair: tuple[str, str]
    why: str
    tank: str = ""
    solid_kg: float | None = None


class Fullest(NamedTuple):
    """The solid nearest to crystallising: its concentration product over that of its saturated solution, per ion."""

    salt: str
    degree: float
    temperature_c: float


def content_of(tank: StockTank) -> str:
    """What a tank is for by its name or, failing that, by what it holds; '' where neither tells.

    >>> content_of(StockTank("calcium tank", 1000.0)), content_of(StockTank("B", 1000.0, salts_kg={"MKP": 17}))
    ('calcium', 'sulfate')
    """
    for content, words in WORDS.items():
        if any(word in tank.name.lower() for word in words):
            return content
    held = " ".join(tank.salts_kg).lower()
    if "calcium" in held or "ca(no3)2" in held:
        return "calcium"
    if any(word in held for word in ("sulf", "sulph", "phosph", "so4", "po4", "mkp", "map")):
        return "sulfate"
    return ""


def roles(tanks: Sequence[StockTank]) -> dict[str, StockTank]:
    """Tank for each content; a single tank takes everything; unnamed tanks are taken in order, calcium first."""
    if len(tanks) == 1:
        return dict.fromkeys(CONTENTS, tanks[0])
    found: dict[str, StockTank] = {}
    left = []
    for tank in tanks:
        content = content_of(tank)
        if content and content not in found:
            found[content] = tank
        else:
            left.append(tank)
    for content in ("calcium", "sulfate"):
        if content not in found and left:
            found[content] = left.pop(0)
    return found


def home_of(material: Material) -> str:
    """The content a material belongs with: calcium, sulfate, acid or silicate; '' for a free salt such as potassium
    nitrate.

    Calcium, nitrates and chelates stand together; sulfates, phosphates, borates and molybdates together: ARSIA 2004,
    Tab. 5.
    """
    if material.is_acid:
        return "acid"
    if material.brings("Si") or material.use == "alkali":
        return "silicate"
    if material.brings("Ca") or is_chelate(material):
        return "calcium"
    if material.brings("SO4") or material.brings("H2PO4") or material.use == "micronutrient":
        return "sulfate"
    return "" if material.kind == "potassium nitrate" else "calcium"


def is_chelate(material: Material) -> bool:
    """Whether it is a chelated micronutrient, which acid takes apart."""
    return not material.is_acid and getattr(material.found, "complex_charge", None) is not None


def concentrations(kg: Mapping[Material, float], litres: float) -> Array:
    """Concentration in the tank [mmol/L], shape (10,)."""
    return sum((each.ions_mmol_per_kg * mass for each, mass in kg.items()), np.zeros(len(IONS))) / litres


def conflicts(kg: Mapping[Material, float], litres: float, tank: str) -> tuple[Refused, ...]:
    """Pairs in one tank that precipitate, gas or fall apart, each with the solid it can drop [kg]."""
    c = concentrations(kg, litres)
    found: list[Refused] = []
    if _gypsum(c):
        found += _precipitates(kg, litres, tank, "SO4", "gypsum", GYPSUM_KG_PER_MOL)
    if _brushite(c):
        found += _precipitates(kg, litres, tank, "H2PO4", "calcium phosphate", BRUSHITE_KG_PER_MOL)
    return (*found, *_alkali_conflicts(kg, tank), *_acid_conflicts(kg, tank))


def _precipitates(
    kg: Mapping[Material, float], litres: float, tank: str, anion: str, solid: str, kg_per_mol: float
) -> list[Refused]:
    """The main calcium salt with every source of an anion that calcium takes down, and how much of it can fall out."""
    calcium = float(concentrations(kg, litres)[INDEX["Ca"]])
    source = max(kg, key=lambda each: each.ions_mmol_per_kg[INDEX["Ca"]] * kg[each])
    found = []
    for other, mass in kg.items():
        brought = float(other.ions_mmol_per_kg[INDEX[anion]] * mass / litres)
        if other is not source and brought >= 0.5 * TRACE:
            weight = min(calcium, brought) * litres * kg_per_mol / 1000.0
            why = (
                f"{solid} falls out, up to {weight:.1f} kg in {litres:.0f} L; keep them in two stock tanks "
                "(in the dilute feed they stay dissolved)"
            )
            found.append(Refused((source.name, other.name), why, tank, weight))
    return found


def _gypsum(c: Array) -> bool:
    calcium, sulfate = c[INDEX["Ca"]], c[INDEX["SO4"]]
    if calcium < TRACE or sulfate < TRACE:
        return False
    if 0.0005 * float(np.abs(c) @ CHARGE**2) <= ACTIVITY_RANGE:
        return bool(saturation(c, STOCK_PH)["gypsum"] > 0.0)
    return sulfate > math.exp(np.interp(math.log(calcium), *np.log(SULFATE_TOLERATED)))


def _brushite(c: Array) -> bool:
    calcium, phosphate = c[INDEX["Ca"]], c[INDEX["H2PO4"]]
    if calcium < TRACE or phosphate < 0.5 * TRACE:
        return False
    if 0.0005 * float(np.abs(c) @ CHARGE**2) <= ACTIVITY_RANGE:
        return bool(saturation(c, STOCK_PH)["brushite"] > 0.0)
    return True


def _alkali_conflicts(kg: Mapping[Material, float], tank: str) -> list[Refused]:
    alkali = [each for each in kg if home_of(each) == "silicate"]
    partners = [
        each
        for each in kg
        if each not in alkali and (each.is_acid or any(each.brings(ion) for ion in ("Ca", "Mg", "NH4", "H2PO4")))
    ]
    whys = "carbonate, silica or hydroxide falls out, ammonia escapes, acid foams and heats: alkali has its own tank"
    return [Refused((one.name, other.name), whys, tank) for one in alkali for other in partners]


def _acid_conflicts(kg: Mapping[Material, float], tank: str) -> list[Refused]:
    found = []
    for acid in (each for each in kg if each.is_acid and each.ions_mmol_per_kg[INDEX["HCO3"]] < 0):
        for other in (each for each in kg if not each.is_acid):
            if is_chelate(other):
                found.append(Refused((acid.name, other.name), "acid takes the chelate apart below about pH 3-4", tank))
            elif other.brings("Ca") and (acid.brings("H2PO4") or acid.brings("SO4")):
                found.append(
                    Refused((acid.name, other.name), "never phosphoric or sulfuric acid in the calcium tank", tank)
                )
    return found


def fullest(kg: Mapping[Material, float], litres: float, temperature_c: float) -> Fullest | None:
    """The solid that is nearest to crystallising at a temperature [C]; None where no solubility is known.

    Each salt of the catalogue whose ions are all in the tank is judged, weighed in or not, by the product of its ions
    against that of its own saturated solution: a common ion lowers solubility, as potassium sulfate beside potassium
    nitrate. Activity coefficients are left out, which errs on the safe side for sulfates in strong stocks.

    >>> from fertui.planning.shelf import material
    >>> from fertui.site.model import Supply
    >>> round(fullest({material(Supply("K2SO4", "potassium sulfate")): 92.4}, 1000.0, 10.0).degree, 1)
    1.0
    """
    mass = sum(each for material, each in kg.items() if not material.is_acid)
    water = max(litres - DISPLACED_L_PER_KG * mass, 0.3 * litres)
    present = {
        ion: value for ion, value in zip(IONS, concentrations(kg, litres) * litres / water, strict=True) if value > 0
    }
    judged = []
    for salt in salts():
        alone = salt.solubility(temperature_c)
        if salt.use == "nutrient" and salt.gives and alone and all(ion in present for ion in salt.gives):
            saturated = alone / salt.molar_mass * 1000.0
            order = sum(salt.gives.values())
            logs = sum(count * math.log(present[ion] / (count * saturated)) for ion, count in salt.gives.items())
            judged.append(Fullest(salt.name, math.exp(logs / order), temperature_c))
    return max(judged, key=lambda each: each.degree, default=None)


def shared_so_both_weigh_alike(calcium_kg: float, sulfate_kg: float, free_kg: float) -> tuple[float, float]:
    """A free salt parted between the two tanks so that both hold the same mass, as far as it goes.

    >>> [round(each, 1) for each in shared_so_both_weigh_alike(112.0, 114.0, 43.0)]
    [22.5, 20.5]
    """
    calcium_part = min(max(0.5 * (sulfate_kg + free_kg - calcium_kg), 0.0), free_kg)
    return calcium_part, free_kg - calcium_part


def dissolving_order(material: Material) -> int:
    """Place in the order of dissolving: acid first, phosphates, slow potassium sulfate, the rest, chilling nitrates,
    chelates."""
    if material.is_acid:
        return 0
    if material.brings("H2PO4"):
        return 1
    if material.kind == "potassium sulfate":
        return 2
    if material.use == "micronutrient":
        return 6 if is_chelate(material) else 5
    return 4 if material.kind in ("potassium nitrate", "ammonium nitrate") else 3
