"""Identical twins: many true loops run by the model's own noise, and what a grower would have logged of each.

Each member of one ensemble is one truth. Its water as logged, its analyses with their own errors, its feed as planned
become entries; the filter sees nothing else.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta

import numpy as np

from fertui.chemistry.ions import IONS, Array
from fertui.estimate.compositions import array
from fertui.estimate.drives import drives
from fertui.estimate.ensemble import Ensemble, unknowns
from fertui.estimate.observations import Observation
from fertui.estimate.record import read
from fertui.estimate.setting import setting
from fertui.estimate.walk import grid_of, night, stretch
from fertui.logbook.entries import Entry, Value
from fertui.loop import ROOT, start
from fertui.site.model import Loop, Site

ZERO = datetime(2026, 3, 1, tzinfo=UTC)
EVERY, ANALYSES, BEHIND, AHEAD = 14, 7, 5, 14
"""Days between analyses, how many, days from the last one to now, days ahead."""
NOW = EVERY * (ANALYSES - 1) + BEHIND
FEED = {"K": 9.5, "Ca": 5.4, "Mg": 2.4, "NH4": 1.2, "Na": 0.3, "NO3": 15.0, "Cl": 1.0, "SO4": 4.4, "H2PO4": 1.5}
"""Tomato feed of Nutrient Solutions for Greenhouse Crops, 2016 (second-hand), with a little sodium."""
AROUND = {"K": 10.0, "Ca": 9.0, "Mg": 4.2, "NH4": 0.1, "Na": 1.5, "NO3": 22.0, "Cl": 3.0, "SO4": 7.0, "H2PO4": 1.2}


@dataclass(frozen=True, slots=True)
class Truth:
    """What was so: concentrations (10,) now, multipliers (10,), shares now and on every coming day (days + 1, 10)."""

    now: Array
    multiplier: Array
    capacity: float
    ahead: Array


@dataclass(frozen=True, slots=True)
class Twin:
    """One true loop and its logbook."""

    truth: Truth
    entries: tuple[Entry, ...]


def loop_on(medium: str) -> tuple[Site, Loop]:
    """A tomato loop with a known feed, 100 m2, on a medium."""
    loop = Loop("twin", "known-feed", 100.0, "tomato", medium, root_zone_water_l_per_m2=8.0)
    return Site("Twins", "UTC", (loop,)), loop


def twins(medium: str, count: int, seed: int) -> Iterator[Twin]:
    """So many true loops and their logbooks."""
    site, loop = loop_on(medium)
    chance = np.random.default_rng(seed)
    water = _water(chance)
    record = read(site, loop, water, ZERO + timedelta(days=NOW + AHEAD))
    where = setting(loop)
    grid = grid_of(
        0.5,
        float(NOW + AHEAD) + 0.5,
        [float(day) for day in range(1, NOW + AHEAD + 1)],
        np.arange(0.5, NOW + AHEAD, 1.0).tolist(),
    )
    ensemble = _first(loop, count, chance, seed)
    course = {0.5: ensemble}
    driven = drives(record, where, grid)
    for span in range(len(grid) - 1):
        begin, end = float(grid[span]), float(grid[span + 1])
        if begin == np.floor(begin):
            ensemble, _ = night(where, ensemble, seed, int(begin), begin)
        ensemble = stretch(where, driven, span, ensemble, ()).ensemble
        course[end] = ensemble
    for member in range(count):
        yield _twin(course, member, water, chance)


def _first(loop: Loop, count: int, chance: np.random.Generator, seed: int) -> Ensemble:
    """Truths at the start: compositions a third apart, unknowns as wide as the filter believes."""
    where = setting(loop)
    unknown = unknowns(where, seed, count)
    root = array(AROUND) * np.exp(0.3 * chance.standard_normal((count, len(IONS))))
    root[:, -1] = 0.5
    medium = where.medium(unknown["capacity"], unknown["selectivity"])
    return Ensemble(start(where.circuit, medium, root, members=count), **unknown)


def _water(chance: np.random.Generator) -> list[Entry]:
    """Daily irrigation and drain [L], for past and future, and the feed at every analysis."""
    found = []
    for day in range(NOW + AHEAD + 1):
        crop = 300.0 * np.exp(0.2 * chance.standard_normal())
        amounts = {"irrigation": 1.5 * crop, "drain": 0.5 * crop}
        found.append(_entry("water", float(day), whole_day=True, **amounts))
    found += [_entry("analysis", 0.5 + EVERY * turn, "feed", **FEED) for turn in range(ANALYSES)]
    return found


def _twin(course: dict[float, Ensemble], member: int, water: list[Entry], chance: np.random.Generator) -> Twin:
    solution = {when: each.state.concentration(ROOT)[member] for when, each in course.items()}
    analyses = [_analysed(0.5 + EVERY * turn, solution[0.5 + EVERY * turn], chance) for turn in range(ANALYSES)]
    past = [entry for entry in water if entry.at < ZERO + timedelta(days=NOW)]
    coming = [entry for entry in water if entry.at >= ZERO + timedelta(days=NOW)]
    now, end = course[NOW + 0.5], [solution[NOW + 0.5 + day] for day in range(AHEAD + 1)]
    truth = Truth(solution[NOW + 0.5], now.multiplier[member], float(now.capacity[member]), np.array(end))
    return Twin(truth, (*past, *analyses, *_planned(coming)))


def _analysed(when: float, solution: Array, chance: np.random.Generator) -> Entry:
    """A drain analysis with the errors an analysis has."""
    ions = {ion: float(value) for ion, value in zip(IONS, solution, strict=True) if ion != "HCO3"}
    exact = Observation(when, ZERO, "analysis", "drain", None, ions, frozenset(), None, None, None)
    noise = chance.multivariate_normal(np.zeros(len(ions)), exact.covariance())
    return _entry(
        "analysis",
        when,
        "drain",
        **{ion: value * float(np.exp(off)) for (ion, value), off in zip(ions.items(), noise, strict=True)},
    )


def _planned(coming: list[Entry]) -> list[Entry]:
    """The coming water and feed as a plan entered now."""
    days = [
        (entry.number_of("irrigation") or 0.0, entry.number_of("drain") or 0.0)
        for entry in coming
        if entry.kind == "water"
    ]
    return [
        _entry("plan", float(NOW + day), entered=NOW, irrigation=irrigation, drain=drain, **FEED)
        for day, (irrigation, drain) in enumerate(days)
    ]


def _entry(
    kind: str, when: float, point: str = "", whole_day: bool = False, entered: float | None = None, **values: float
) -> Entry:
    at = ZERO + timedelta(days=when)
    noted = at if entered is None else ZERO + timedelta(days=entered)
    return Entry(
        kind, "twin", at, noted, "TEST", tuple(Value(name, f"{value:g}", value) for name, value in values.items()),
        point=point, whole_day=whole_day,
    )  # fmt: skip
