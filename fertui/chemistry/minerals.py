"""Saturation of the minerals that can fall out of a nutrient solution, and which of them may raise an alarm."""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np

from fertui.chemistry.activity import Speciation, speciate
from fertui.chemistry.equilibria import EQUILIBRIA
from fertui.chemistry.ions import Array


class Mineral(NamedTuple):
    """A solid: what it gives off when one formula unit dissolves, and what its saturation is worth as a warning."""

    formula: str
    gives: tuple[tuple[str, int], ...]
    """Free ions and their number; a negative number of H is acid taken up in dissolving."""
    may_alarm: bool = False
    remark: str = ""


MINERALS = {
    "gypsum": Mineral("CaSO4.2H2O", (("Ca", 1), ("SO4", 1)), may_alarm=True,
        remark="falls out readily once above 0"),
    "brushite": Mineral(
        "CaHPO4.2H2O", (("Ca", 1), ("HPO4", 1)), may_alarm=True,
        remark="the calcium phosphate that forms first in acid solution, pH 2-6 (Materials 2010, 3:3994)",
    ),
    "calcite": Mineral(
        "CaCO3", (("Ca", 1), ("CO3", 1)),
        remark="matters in hard make-up water and above pH 7; an acid nutrient solution does not reach it",
    ),
    "hydroxyapatite": Mineral(
        "Ca5(PO4)3OH", (("Ca", 5), ("HPO4", 3), ("H", -4)),
        remark="above 0 in every normal solution from pH 5.8 up without falling out: never an alarm of its own",
    ),
    "struvite": Mineral(
        "MgNH4PO4.6H2O", (("Mg", 1), ("NH4", 1), ("HPO4", 1), ("H", -1)),
        remark="its constant is from memory: shown, never an alarm",
    ),
}  # fmt: skip


def saturation(
    ions_mmol_per_l: Mapping[str, float | Array] | Array, ph: float | Array, temperature_c: float | Array = 20.0
) -> dict[str, Array]:
    """Saturation index of each of ``MINERALS``: log10 of activity over solubility product; above 0 it may fall out.

    ``ions_mmol_per_l``: mapping, or array (..., 10) [mmol/L]; HCO3 stands for alkalinity [meq/L]. ``ph`` and
    ``temperature_c`` broadcast over the leading axes. An index is minus infinity where one of its ions is missing.
    Raises ``ValueError`` for a pH outside 0-14 or a temperature outside 0-40 degrees C.
    Constants: ``equilibria``; range as in ``activity``.

    >>> tomato = {"K": 9.7, "Ca": 5, "Mg": 2.4, "NH4": 1, "NO3": 16, "SO4": 4, "H2PO4": 1.5}
    >>> round(float(saturation(tomato, ph=5.8, temperature_c=20)["gypsum"]), 1)
    -0.9
    """
    solution = speciate(ions_mmol_per_l, ph, temperature_c)
    return {name: _index(name, solution, temperature_c) for name in MINERALS}


def _index(name: str, solution: Speciation, temperature_c: float | Array) -> Array:
    with np.errstate(divide="ignore"):
        product = sum(count * np.log10(solution.activity(ion)) for ion, count in MINERALS[name].gives)
    return (product - EQUILIBRIA[name].log_k(temperature_c))[()]
