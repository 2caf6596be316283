"""What a loop let go in a period, by reason: litres as logged, nitrogen and phosphorus as far as the estimate knows.

The litres logged and those the estimate booked are held against each other: a discharge that no run of the estimate
reaches keeps its litres, and its N and P are said to be unknown.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from typing import TYPE_CHECKING, NamedTuple

from fertui.logbook.entries import Entry

if TYPE_CHECKING:
    from fertui.loop import Discharge

NEARLY = 0.99
"""Booked litres within a hundredth of those logged are all of them."""
M2_PER_HA = 10_000.0


class LetGo(NamedTuple):
    """A reason with its litres [L], how many of them the estimate followed, and the N and P of those [kg]."""

    reason: str
    litres: float
    followed_l: float
    kg_n: float
    kg_p: float

    @property
    def is_known(self) -> bool:
        """Whether N and P are those of all its litres."""
        return self.followed_l >= NEARLY * self.litres

    @property
    def unknown_words(self) -> str:
        """What is not known of its N and P."""
        of = f"{self.followed_l / 1000:.2f} of {self.litres / 1000:.2f} m3"
        return f"{self.reason}: N and P are those of {of}; what the rest held nobody can say from the logbook."


def let_go(entries: Iterable[Entry], booked: Iterable[Discharge], drain_is_lost: bool) -> tuple[LetGo, ...]:
    """Discharges by reason, most N first, from the entries of a period and what the estimate booked in it.

    ``drain_is_lost``: drain does not come back (known feed), so its litres are let go too.
    """
    logged = _logged(entries, drain_is_lost)
    followed: dict[str, tuple[float, float, float]] = {}
    for each in booked:
        litres, kg_n, kg_p = followed.get(each.reason, (0.0, 0.0, 0.0))
        followed[each.reason] = litres + each.litres, kg_n + each.kg_n, kg_p + each.kg_p
    rows = []
    for reason in dict.fromkeys((*followed, *logged)):
        litres, kg_n, kg_p = followed.get(reason, (0.0, 0.0, 0.0))
        rows.append(LetGo(reason or "no reason given", max(logged.get(reason, 0.0), litres), litres, kg_n, kg_p))
    return tuple(sorted(rows, key=lambda row: (-row.kg_n, -row.litres)))


def _logged(entries: Iterable[Entry], drain_is_lost: bool) -> Mapping[str, float]:
    """Litres [L] by reason as they stand in the logbook; doubtful ones under a name of their own."""
    sums: dict[str, float] = {}
    for entry in entries:
        for reason, litres in _lost(entry, drain_is_lost):
            name = f"{reason}, doubtful" if entry.doubtful else reason
            sums[name] = sums.get(name, 0.0) + litres
    return sums


def _lost(entry: Entry, drain_is_lost: bool) -> Iterator[tuple[str, float]]:
    if entry.kind == "bleed":
        yield entry.text_of("reason"), entry.number_of("litres") or 0.0
    elif entry.kind == "water" and drain_is_lost and (litres := entry.number_of("drain")):
        yield "drain", litres


def rows_of(lost: Iterable[LetGo], area_m2: float) -> list[tuple[str, ...]]:
    """A table: litres in m3, N and P in kg and in kg/ha, with sums; a dash where nothing is known."""
    rows: list[tuple[str, ...]] = [("reason", "m3", "kg N", "kg P", "kg N/ha", "kg P/ha")]
    sums = [0.0] * 5
    for each in lost:
        per_ha = M2_PER_HA / area_m2
        numbers = [each.litres / 1000, each.kg_n, each.kg_p, each.kg_n * per_ha, each.kg_p * per_ha]
        known = 5 if each.followed_l > 0 else 1
        written = [f"{number:.2f}" for number in numbers[:known]] + ["-"] * (5 - known)
        rows.append((each.reason, *written))
        sums = [total + number for total, number in zip(sums, numbers, strict=True)]
    return [*rows, ("in all", *(f"{total:.2f}" for total in sums))]
