"""Quantities as people write them, and back: a text with unit and species becomes an ion and a canonical number.

Canonical: mmol/L for ions, umol/L for micronutrients, meq/L for HCO3 (alkalinity), mS/cm at 25 C, L, kg, C, J/cm2, %.
Nothing is guessed: what can be read in two ways is refused with the two ways named.
"""

from __future__ import annotations

from fertui.quantities.concentration import in_unit, shown_in
from fertui.quantities.heads import Head, column
from fertui.quantities.numbers import Number, parse_number
from fertui.quantities.reading import Quantity, concentration, read
from fertui.quantities.refusal import QuantityError

__all__ = [
    "Head", "Number", "Quantity", "QuantityError", "column", "concentration", "in_unit", "parse_number", "read",
    "shown_in",
]  # fmt: skip
