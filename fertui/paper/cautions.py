"""Cautions as they stand on a sheet: the data sheet first, worst next, the same words about several salts said once."""

from __future__ import annotations

from collections.abc import Iterable

from fertui.catalogue.cautions import SEVERITIES, Caution
from fertui.estimate.signs import CAUTION_SIGNS
from fertui.paper.page import folded, section


def read_first(found: Iterable[Caution]) -> list[str]:
    """A block of cautions: the first as it comes, the others worst first, same words about several supplies once."""
    kept = merged(found)
    ranked = [*kept[:1], *sorted(kept[1:], key=lambda each: SEVERITIES.index(each.severity))]
    lines = [line for each in ranked for line in folded(each.text, f"{CAUTION_SIGNS[each.severity]:2} ")]
    return section("READ BEFORE YOU START   (!! danger   ! warning   - note)", lines)


def merged(found: Iterable[Caution]) -> list[Caution]:
    """Cautions of the form "name: words" with the same words made one: "name, other name: words".

    >>> notice = "EU: reportable precursor"
    >>> two = [Caution("precursor-a", "note", f"{salt}: {notice}", "") for salt in ("KNO3", "Ca(NO3)2")]
    >>> [each.text for each in merged(two)]
    ['KNO3, Ca(NO3)2: EU: reportable precursor']
    """
    kept: dict[tuple[str, str], Caution] = {}
    for each in found:
        name, words = _parts(each)
        before = kept.get((each.severity, words))
        if before is None:
            kept[each.severity, words] = each
        elif name:
            names = before.text[: -len(words) - 2]
            kept[each.severity, words] = Caution(each.code, each.severity, f"{names}, {name}: {words}", each.source)
    return list(kept.values())


def _parts(caution: Caution) -> tuple[str, str]:
    """The supply a caution names, and what it says of it."""
    if not caution.code.startswith(("precursor-", "label-")):
        return "", caution.text
    name, _, words = caution.text.partition(": ")
    return name, words
