"""Equilibrium constants of dilute water between 5 and 35 degrees C, with their sources.

Every constant is a parabola in temperature, log10 K = at_25 + slope (t - 25) + curvature (t - 25)^2, laid through the
values that PHREEQC 3.8.6 evaluates from Amm.dat at 5, 10 ... 35 degrees C; it departs from them by 0.0016 at most.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import Array

LOW_C, HIGH_C = 5.0, 35.0
"""Temperatures [degrees C] between which the parabolas were laid."""

AMM = "PHREEQC 3.8.6, Amm.dat of May 2024"
MINTEQ = "PHREEQC 3.8.6, minteq.v4.dat; value at 25 C used throughout"


class Equilibrium(NamedTuple):
    """One reaction and its log10 K, activities in mol/L, with the place its numbers come from."""

    reaction: str
    at_25: float
    slope: float = 0.0
    curvature: float = 0.0
    source: str = AMM

    def log_k(self, temperature_c: float | Array) -> Array:
        """log10 K at a temperature [degrees C], any shape.

        >>> float(EQUILIBRIA["CaSO4"].log_k(25.0))
        2.25
        """
        above = np.asarray(temperature_c, dtype=float) - 25.0
        return self.at_25 + above * (self.slope + above * self.curvature)


EQUILIBRIA = {
    "water": Equilibrium("H2O = H+ + OH-", -13.9942, 0.033183, -0.0001779),
    "carbon_dioxide": Equilibrium("CO2(gas, atm) = CO2", -1.4686, -0.011790, 0.0001008),
    "carbonic_1": Equilibrium("CO2 + H2O = H+ + HCO3-", -6.3512, 0.005432, -0.0001394),
    "carbonic_2": Equilibrium("HCO3- = H+ + CO3--", -10.3284, 0.008808, -0.0001235),
    "phosphoric_1": Equilibrium("H3PO4 = H+ + H2PO4-", -2.1680, -0.005183, 0.0000183),
    "phosphoric_2": Equilibrium("H2PO4- = H+ + HPO4--", -7.2070, 0.002437, -0.0000086),
    "phosphoric_3": Equilibrium("HPO4-- = H+ + PO4---", -12.3459, 0.008688, -0.0000307),
    "ammonium": Equilibrium("NH4+ = H+ + NH3", -9.2439, 0.030712, -0.0001129),
    "hydrogen_sulfate": Equilibrium("HSO4- = H+ + SO4--", -1.9876, -0.009458, -0.0000415),
    "citric_1": Equilibrium("H3Cit = H+ + H2Cit-", -3.128, source=MINTEQ),
    "citric_2": Equilibrium("H2Cit- = H+ + HCit--", -4.761, source=MINTEQ),
    "citric_3": Equilibrium("HCit-- = H+ + Cit---", -6.396, source=MINTEQ),
    "CaSO4": Equilibrium("Ca++ + SO4-- = CaSO4", 2.2500, 0.003261, -0.0000115),
    "MgSO4": Equilibrium("Mg++ + SO4-- = MgSO4", 2.4180, 0.011172, -0.0000054),
    "KSO4": Equilibrium("K+ + SO4-- = KSO4-", 1.1821, 0.001719, 0.0000446),
    "NaSO4": Equilibrium("Na+ + SO4-- = NaSO4-", 1.2123, 0.003653, -0.0000697),
    "NH4SO4": Equilibrium("NH4+ + SO4-- = NH4SO4-", 1.2110, 0.005035, -0.0000178),
    "CaHPO4": Equilibrium("Ca++ + HPO4-- = CaHPO4", 2.7391, 0.008122, -0.0000287),
    "MgHPO4": Equilibrium("Mg++ + HPO4-- = MgHPO4", 2.8701, 0.008122, -0.0000287),
    "CaH2PO4": Equilibrium("Ca++ + H2PO4- = CaH2PO4+", 1.4081, 0.008368, -0.0000296),
    "MgH2PO4": Equilibrium("Mg++ + H2PO4- = MgH2PO4+", 1.5131, 0.008368, -0.0000296),
    "CaPO4": Equilibrium("Ca++ + PO4--- = CaPO4-", 6.4591, 0.007630, -0.0000270),
    "MgPO4": Equilibrium("Mg++ + PO4--- = MgPO4-", 6.5891, 0.007630, -0.0000270),
    "CaCO3": Equilibrium("Ca++ + CO3-- = CaCO3", 3.2238, 0.008534, 0.0001843),
    "MgCO3": Equilibrium("Mg++ + CO3-- = MgCO3", 2.9797, 0.006670),
    "CaHCO3": Equilibrium("Ca++ + HCO3- = CaHCO3+", 0.5865, 0.019558, -0.0000421),
    "MgHCO3": Equilibrium("Mg++ + HCO3- = MgHCO3+", 1.0681, 0.001911, 0.0000480),
    "gypsum": Equilibrium("CaSO4.2H2O = Ca++ + SO4-- + 2 H2O", -4.5821, 0.0000096, -0.0000706),
    "brushite": Equilibrium(
        "CaHPO4.2H2O = Ca++ + HPO4-- + 2 H2O",
        -6.59,
        source="Materials 2010, 3(7):3994, Table 3, doi 10.3390/ma3073994; 25 C used throughout (6.63 at 37 C)",
    ),
    "calcite": Equilibrium("CaCO3 = Ca++ + CO3--", -8.4796, -0.007156, -0.0001392),
    "hydroxyapatite": Equilibrium("Ca5(PO4)3OH + 4 H+ = 5 Ca++ + 3 HPO4-- + H2O", -3.4218, -0.088985, 0.0003145),
    "struvite": Equilibrium(
        "MgNH4PO4.6H2O + H+ = Mg++ + NH4+ + HPO4-- + 6 H2O",
        -13.26 + 12.3459,
        -0.008688,
        0.0000307,
        source="-13.26 for Mg++ + NH4+ + PO4---: Ohlinger et al. 1998, from memory, 25 C used throughout",
    ),
}
"""Reactions by name; a pair is named by its formula without charge."""


def constant(name: str, temperature_c: float | Array) -> Array:
    """K of a reaction of ``EQUILIBRIA`` at a temperature [degrees C], any shape, activities in mol/L.

    >>> round(float(constant("MgSO4", 20.0)))
    230
    """
    return 10.0 ** EQUILIBRIA[name].log_k(temperature_c)
