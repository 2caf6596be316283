"""Amounts in the unit a reader wants: canonical numbers in, shown numbers out. Loads no pint."""

from __future__ import annotations

from fertui.chemistry.names import MICRONUTRIENTS

UNITS = ("mmol/L", "meq/L", "mg/L")
"""The units a screen cycles through; micronutrients are shown in umol/L, or in mg/L with the others."""


def shown(ion: str, canonical: float, unit: str) -> tuple[float, str]:
    """A concentration and its unit as shown; mg/L names the species it is expressed as.

    ``canonical`` is mmol/L (umol/L for micronutrients, meq/L of alkalinity for HCO3).

    >>> shown("Ca", 5.0, "meq/L")
    (10.0, 'meq/L')
    >>> number, label = shown("NO3", 15.0, "mg/L")
    >>> round(number), label
    (210, 'mg/L NO3-N')
    """
    from fertui.quantities import in_unit, shown_in

    if ion in MICRONUTRIENTS and unit != "mg/L":
        return canonical, "umol/L"
    words, species = shown_in(ion, unit)
    number = float(in_unit(canonical, ion, words, species))
    return number, words if species in ("", ion) else f"{words} {species}"
