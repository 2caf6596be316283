"""Units as people write them. The usual ones are tables; pint is asked, and loaded, for odd ones of concentration only.

Gallons, tons and barrels differ between countries and pint knows one of each: volumes and weights stay with the tables.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from functools import cache, lru_cache
from typing import Any

from fertui.quantities.numbers import tidy
from fertui.quantities.refusal import QuantityError, quoted

CANONICAL: Mapping[str, str] = {
    "EC": "mS/cm", "pH": "", "temperature": "C", "light": "J/cm2", "litres": "L", "litres a day": "L/d", "kg": "kg",
    "area": "m2", "litres per m2": "L/m2", "percent": "%", "fraction": "", "number": "",
}  # fmt: skip
"""Everything but ions that can be measured, with the unit it is kept in. EC is at 25 C."""

PER_LITRE: Mapping[str, Mapping[str, float]] = {
    "mg/L": {"mg/L": 1, "ppm": 1, "g/m3": 1, "ug/L": 1e-3, "ppb": 1e-3, "mg/m3": 1e-3, "g/L": 1e3, "kg/m3": 1e3},
    "mmol/L": {"mmol/L": 1, "mol/m3": 1, "mM": 1, "umol/L": 1e-3, "uM": 1e-3, "mmol/m3": 1e-3, "mol/L": 1e3},
    "meq/L": {"meq/L": 1, "me/L": 1, "mval/L": 1, "eq/m3": 1, "mmolc/L": 1, "ueq/L": 1e-3, "eq/L": 1e3},
    "dH": {"dH": 1, "d": 1, "dGH": 1},
    "fH": {"fH": 1, "f": 1},
}
"""Units of concentration by their basis (mass, amount, equivalents, German and French degrees): worth in the basis.
ppm by mass is taken as mg/L, which it is within 1 % in any solution a crop could live in."""

FACTORS: Mapping[str, Mapping[str, float]] = {
    "EC": {
        "mS/cm": 1, "mS": 1, "dS/m": 1, "mmho/cm": 1, "mmhos/cm": 1, "uS/cm": 1e-3, "uS": 1e-3, "umho/cm": 1e-3,
        "umhos/cm": 1e-3, "mS/m": 1e-2, "10^-5 S/cm": 1e-2, "1e-5 S/cm": 1e-2, "S/m": 10, "S/cm": 1e3,
    },
    "light": {"J/cm2": 1, "MJ/m2": 100, "kJ/m2": 0.1, "J/m2": 1e-4, "Wh/m2": 0.36, "kWh/m2": 360},
    "litres": {"L": 1, "mL": 1e-3, "dL": 0.1, "cL": 0.01, "hL": 100, "m3": 1e3, "dm3": 1, "cm3": 1e-3,
               "US gal": 3.785411784, "gal US": 3.785411784, "US fl oz": 0.0295735295625, "imp gal": 4.54609},
    "litres a day": {"L/d": 1, "L/day": 1, "m3/d": 1e3, "m3/day": 1e3, "US gal/d": 3.785411784, "L/h": 24},
    "area": {"m2": 1, "ha": 1e4, "sq ft": 0.09290304, "ft2": 0.09290304},
    "litres per m2": {"L/m2": 1, "mm": 1, "m3/ha": 0.1},
    "kg": {"kg": 1, "g": 1e-3, "mg": 1e-6, "t": 1e3, "lb": 0.45359237, "lbs": 0.45359237, "oz": 0.028349523125},
    "percent": {"%": 1, "pct": 1, "percent": 1, "permille": 0.1},
    "fraction": {"": 1, "%": 0.01, "pct": 0.01, "percent": 0.01},
    "pH": {"": 1, "pH": 1},
    "number": {"": 1},
}  # fmt: skip
"""Worth of a unit in the canonical one. mS and uS alone are the trade's short for mS/cm and uS/cm.
Gallon, pound, ounce, foot: exact by definition (NIST Handbook 44, from memory)."""

_TEMPERATURE = {"c": "C", "degc": "C", "celsius": "C", "f": "F", "degf": "F", "fahrenheit": "F"}
_TRAPS = {
    "EC": (
        r"ppm|ppt|mg/l|g/l|tds",
        "is not a unit of total strength: meters make it from EC by 500, 640 or 700, and do not say which",
        "read the EC itself off the meter, in mS/cm",
    ),
    "litres": (r"gal|gals|gallons?", "is a US or an imperial gallon", "write US gal or imp gal"),
    "kg": (r"tons?", "is a metric, a short or a long ton", "write it in kg"),
    "light": (r"u?mol/m2|mol", "counts photons, not energy", "enter the radiation sum in J/cm2 or MJ/m2"),
}
_FOR_PINT = re.compile(r"(?!.*(gal|ton|barrel))[a-z_]+\s*/\s*[a-z_]+(\^?[1-4])?", re.IGNORECASE)


def factor(unit: str, what: str) -> float:
    """Canonical units in one ``unit``, for anything but ions and temperature.

    Raises ``QuantityError`` with the allowed units.

    >>> factor("10^-5 S/cm", "EC")
    0.01
    """
    if not unit:
        return 1.0
    known = _folded(what)
    if fold(unit) in known:
        return known[fold(unit)]
    raise _unknown(unit, what)


def basis(unit: str) -> tuple[str, float]:
    """Basis of a unit of concentration (mg/L, mmol/L, meq/L, dH or fH) and what the unit is worth in it.

    Raises ``QuantityError`` with the allowed units.

    >>> basis("umol/l")
    ('mmol/L', 0.001)
    """
    found = _folded_bases().get(fold(unit))
    if found is not None:
        return found
    for name in ("mg/L", "mmol/L"):
        worth = pint_factor(unit, name)
        if worth is not None:
            return name, worth
    raise QuantityError(
        f"{quoted(unit)} is not a unit of concentration",
        "mmol/L, umol/L, meq/L, mg/L, ppm, ug/L, g/L; dH and fH for Ca, Mg and alkalinity",
        "write for example 7.2 mmol/L",
    )


def is_unit(text: str) -> bool:
    """Whether the text is one of the tabled units of anything (pint is not asked).

    >>> is_unit("dS m-1"), is_unit("NO3")
    (True, False)
    """
    folded = fold(text)
    tabled = any(folded in _folded(what) for what in FACTORS)
    return bool(folded) and (tabled or folded in _folded_bases() or folded in _TEMPERATURE)


def celsius(number: float, unit: str) -> float:
    """Temperature [C] from a number in C or F.

    Raises ``QuantityError`` for another unit.

    >>> celsius(68, "F")
    20.0
    """
    scale = _TEMPERATURE.get(fold(unit) or "c")
    if scale is None:
        raise QuantityError(f"{quoted(unit)} is not a unit of temperature", "C, F", "write for example 20.5 C")
    return number if scale == "C" else (number - 32.0) / 1.8


@lru_cache(maxsize=1024)
def fold(unit: str) -> str:
    """One spelling for the many a unit has: case, degree and micro signs, spaces, ``L-1`` for ``/L``, litre for L.

    >>> fold("mS cm\\u207b\\u00b9"), fold("\\u00b5mol / Liter"), fold("x 10\\u207b\\u2075 S/cm")
    ('ms/cm', 'umol/l', '10-5s/cm')
    """
    plain = tidy(unit).casefold().replace("\u03bc", "u").replace("\u00d7", "x")
    plain = re.sub(r"lit(er|re)s?", "l", plain).replace(" per ", "/")
    plain = re.sub(r"[\s\u00b0\u00ba^]", "", plain).removeprefix("x").removeprefix("*")
    plain = re.sub(r"[.*\u00b7\u22c5](?=l-1|cm-1|m-[123]|dm-3)", "", plain)
    plain = re.sub(r"(l|cm|m|d)-1$", r"/\1", plain)
    return re.sub(r"(cm|dm|m)-([23])$", r"/\1\2", plain)


@cache
def pint_factor(unit: str, target: str) -> float | None:
    """What pint makes of a unit: its worth in ``target``, or None when it is unknown or of another dimension.

    Only a unit over a unit is handed over, never an expression to compute.

    >>> round(pint_factor("oz/ft^3", "mg/L"), 1)
    1001.2
    """
    if not _FOR_PINT.fullmatch(unit):
        return None
    registry = _registry()
    import pint

    try:
        return float(registry.Quantity(1.0, unit).to(target).magnitude)
    except (pint.PintError, ValueError, AttributeError):
        return None


@cache
def _registry() -> Any:
    import pint

    return pint.UnitRegistry(cache_folder=None)


@cache
def _folded(what: str) -> dict[str, float]:
    return {fold(unit): float(worth) for unit, worth in FACTORS.get(what, {}).items()}


@cache
def _folded_bases() -> dict[str, tuple[str, float]]:
    return {fold(unit): (name, float(worth)) for name, units in PER_LITRE.items() for unit, worth in units.items()}


def _unknown(unit: str, what: str) -> QuantityError:
    trap, why, advice = _TRAPS.get(what, ("", "", ""))
    allowed = ", ".join(name for name in FACTORS[what] if name) or "no unit"
    folded = fold(unit)
    if trap and re.fullmatch(trap, folded):
        return QuantityError(f"{quoted(unit)} {why}", allowed, advice)
    if what == "litres" and (folded.endswith("/m2") or folded == "mm"):
        return QuantityError(f"{quoted(unit)} is an amount per area", allowed, "enter litres of the whole loop")
    return QuantityError(f"{quoted(unit)} is not a unit for {what}", allowed, f"write it in {allowed.split(', ')[0]}")
