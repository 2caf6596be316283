"""Entries of invented loops, made in a line: what the tests of the estimate write into a logbook."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

from fertui.logbook.entries import Entry, Value
from fertui.site.model import Composition, Loop, Site, Water

ZERO = datetime(2026, 3, 1, tzinfo=UTC)
SLAB = Loop("slab", "known-feed", 1000.0, "tomato", "stone-wool", root_zone_water_l_per_m2=8.0)
TANK = Loop("tank", "shared-tank", 200.0, "lettuce", "none", tank_l=2000.0, water="rain", crop_water_l_per_m2_d=2.0)
SITE = Site("Testing house", "UTC", (SLAB, TANK), waters=(Water("rain", Composition({"Na": 0.1, "Cl": 0.1})),))

FEED = {"NH4": 1.2, "K": 9.5, "Ca": 5.4, "Mg": 2.4, "Na": 1.1, "NO3": 15.0, "Cl": 2.1, "SO4": 4.4, "H2PO4": 1.5}
DRAIN = {"K": 8.0, "Ca": 10.0, "Mg": 4.5, "Na": 3.0, "NH4": 0.1, "NO3": 22.0, "Cl": 4.0, "SO4": 6.8, "H2PO4": 1.0}
"""Tomato, dripper and root zone: Nutrient Solutions for Greenhouse Crops, 2016 (second-hand); Na, Cl are invented."""
SALAD = {"K": 11.0, "Ca": 4.5, "Mg": 1.0, "NH4": 1.25, "NO3": 19.0, "SO4": 1.125, "H2PO4": 2.0}
"""Lettuce in NFT: Sonneveld & Straver 1994 (from memory)."""


def moment(days: float) -> datetime:
    """So many days after ``ZERO``."""
    return ZERO + timedelta(days=days)


def entry(
    kind: str, when: float, loop: str = "slab", point: str = "", entered: float | None = None,
    number: int | None = None, doubtful: str = "", whole_day: bool = False, **values: float | str,
) -> Entry:  # fmt: skip
    """An entry of a kind at so many days."""
    made = tuple(
        Value(name, str(each)) if isinstance(each, str) else Value(name, f"{each:g}", float(each))
        for name, each in values.items()
    )
    noted = moment(when if entered is None else entered)
    return Entry(
        kind,
        loop,
        moment(when),
        noted,
        "TEST",
        made,
        number=number,
        point=point,
        doubtful=doubtful,
        whole_day=whole_day,
    )


def daily_water(days: int, crop_l: float = 3000.0, drain_l: float = 1500.0) -> list[Entry]:
    """Irrigation and drain of the slab loop, day by day."""
    amounts = {"irrigation": crop_l + drain_l, "drain": drain_l}
    return [entry("water", float(day), whole_day=True, **amounts) for day in range(days)]


def fed(days: float, every: float = 7.0) -> list[Entry]:
    """The feed of the slab loop, analysed again and again."""
    return [entry("analysis", 0.4 + every * turn, point="feed", **FEED) for turn in range(int(days / every) + 1)]


def scaled(ions: dict[str, float], **others: float) -> dict[str, float]:
    """A composition with some ions changed."""
    return {**ions, **others}
