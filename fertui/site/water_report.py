"""What a water report says, typed in one line: each number by its name, with its unit."""

from __future__ import annotations

import re
from collections.abc import Iterator

from fertui.chemistry.names import IONS
from fertui.quantities import read
from fertui.site.checks import SiteError, shortened
from fertui.site.model import Composition

NUMBER = re.compile(
    r"(?P<name>[A-Za-z][A-Za-z0-9-]*)\s*[:=]?\s*(?P<number><?\s*\d+(?:[.,]\d+)?)\s*(?P<unit>(?:[a-zµ]+/[a-zA-Z]+(?:\s+(?:CaCO3|HCO3))?)?)"
)
BETWEEN = re.compile(r"[\s,;]*")
MOST = {"EC": 10.0, "pH": 14.0}
MOST_MMOL_L = 50.0
"""No grower tops up with more; what is above was meant in another unit (common practice, no source)."""


def read_report(text: str) -> Composition:
    """The composition of a water as its report says.

    Raises ``SiteError`` for what is no list of names and numbers, and ``QuantityError`` for a name or unit that is
    none.

    A number without a unit is mmol/L, meq/L for HCO3, mS/cm for EC.

    >>> found = read_report("EC 0.5, pH 7.6, Ca 52 mg/L, NO3-N 2 mg/L; CaCO3 145 mg/L, Na 0,5")
    >>> {ion: round(number, 2) for ion, number in found.ions.items()}, found.ec, found.ph
    ({'Ca': 1.3, 'Na': 0.5, 'NO3': 0.14, 'HCO3': 2.9}, 0.5, 7.6)
    """
    numbers: dict[str, float] = {}
    for name, written in _pairs(text):
        quantity = read(written, name)
        if quantity.number > MOST.get(quantity.name, MOST_MMOL_L):
            raise SiteError(f"{name} {written}: no make-up water holds that; look at the unit.")
        numbers[quantity.name] = float(f"{quantity.number:.4g}")  # no report has more digits
    ions = {ion: numbers[ion] for ion in IONS if ion in numbers}
    return Composition(ions, {}, numbers.get("EC"), numbers.get("pH"), "water report")


def report_text(water: Composition) -> str:
    """A composition as the text that reads back to it."""
    strength = {"EC": water.ec, "pH": water.ph}
    measured = [f"{name} {number:.4g}" for name, number in strength.items() if number is not None]
    return ", ".join([*measured, *(f"{ion} {number:.4g}" for ion, number in water.ions.items())])


def _pairs(text: str) -> Iterator[tuple[str, str]]:
    place = 0
    while place < len(text):
        found = NUMBER.match(text, place)
        if found is None:
            wanted = "a name and a number are wanted, commas between: Ca 52 mg/L, HCO3 2.9, pH 7.6."
            raise SiteError(f"{shortened(text[place:])}: {wanted}")
        yield found["name"], f"{found['number']} {found['unit']}".strip()
        between = BETWEEN.match(text, found.end())
        place = len(text) if between is None else between.end()
