"""Chemical formulas read for what is in them: atoms and molar mass."""

from __future__ import annotations

import re
from collections import Counter
from functools import cache

from fertui.chemistry.names import ATOMIC_WEIGHT
from fertui.refusals import Refusal

TOKEN = re.compile(r"([A-Z][a-z]?)(\d*)|(\()|\)(\d*)")


@cache
def atoms(formula: str) -> dict[str, int]:
    """Number of each atom in one formula unit; a dot separates parts, each with a leading count.

    Raises ``Refusal`` for a text that is not a formula.

    >>> atoms("5Ca(NO3)2.NH4NO3.10H2O")["Ca"]
    5
    """
    total: Counter[str] = Counter()
    for part in formula.split("."):
        leading = re.match(r"\d*", part)
        count = leading.group() if leading else ""
        for element, number in _part(part[len(count) :], formula).items():
            total[element] += number * int(count or 1)
    return dict(total)


def _part(text: str, formula: str) -> Counter[str]:
    open_groups: list[Counter[str]] = [Counter()]
    position = 0
    while position < len(text):
        token = TOKEN.match(text, position)
        if token is None:
            raise Refusal(f"{formula!r} is not a chemical formula: stopped at {text[position:]!r}")
        position = token.end()
        if token.group(1):
            open_groups[-1][token.group(1)] += int(token.group(2) or 1)
        elif token.group(3):
            open_groups.append(Counter())
        elif len(open_groups) > 1:
            for element, number in open_groups.pop().items():
                open_groups[-1][element] += number * int(token.group(4) or 1)
        else:
            raise Refusal(f"{formula!r} is not a chemical formula: a bracket closes that was not opened")
    if len(open_groups) > 1 or not open_groups[0]:
        raise Refusal(f"{formula!r} is not a chemical formula: empty, or a bracket stays open")
    return open_groups[0]


@cache
def molar_mass(formula: str) -> float:
    """Molar mass [g/mol] from the atomic weights of ``fertui.chemistry.names``.

    Raises ``Refusal`` for an element without an atomic weight there.

    >>> round(molar_mass("KNO3"), 2)
    101.1
    """
    unknown = [element for element in atoms(formula) if element not in ATOMIC_WEIGHT]
    if unknown:
        raise Refusal(f"{formula!r}: no atomic weight for {', '.join(unknown)}")
    return sum(number * ATOMIC_WEIGHT[element] for element, number in atoms(formula).items())
