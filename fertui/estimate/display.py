"""Members turned into what is shown of every point: medians, 80 % ranges, shares, bands."""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Mapping, Sequence
from math import sqrt

import numpy as np

from fertui.chemistry.conductivity import conductivity
from fertui.chemistry.ions import INDEX, IONS, Array
from fertui.estimate.drives import Drives
from fertui.estimate.ensemble import Ensemble
from fertui.estimate.observations import Observation
from fertui.estimate.points import Band, Estimated, IonState, PointState
from fertui.estimate.quantiles import quantiles
from fertui.estimate.ranges import Spread, neutral, shared_meq, shares
from fertui.estimate.setting import Setting
from fertui.loop import ROOT, STORE, Drive, feed_composition
from fertui.site.model import Loop, Site, Sourced
from fertui.site.presets import bands_of, limits_of

POINTS_OF = {
    "shared-tank": ("tank", "root_zone"),
    "drain-blend": ("feed", "root_zone", "drain", "drain_store"),
    "known-feed": ("feed", "root_zone", "drain"),
}
"""Points of a layout, in the order they are shown."""
SHARED = ("K", "Ca", "Mg")
LEAST_SHARED_MEQ = 0.5
"""Below this sum of K, Ca and Mg [meq/L] shares say nothing: nearly pure water."""
LEAST_EC, EC_STEP = 0.01, 0.05
PH_ERROR, PH_DRIFT = 0.1, 0.1
"""pH is known to 0.1 where measured; its range widens by 0.1 times the square root of the days since (our own)."""
PH_DAYS = 28.0
MOST_CO2, PK1 = 2.5, 6.35
"""Dissolved CO2 that a loop may hold [mmol/L]: a well water acidified in a closed line; pK1 at 25 C (CRC Handbook)."""
FREE_ACID_PH = 5.0
"""Above it a solution holds no free acid worth a number: H+ is below 0.01 mmol/L (definition of pH)."""
SAME_WATER = {"root_zone": ("root_zone", "drain"), "drain": ("drain", "root_zone"), "feed": ("feed", "tank")}


def managed(loop: Loop) -> str:
    """The point a loop is managed by: the tank where there is no medium, else the root zone."""
    return "tank" if loop.layout == "shared-tank" and loop.medium == "none" else "root_zone"


def solutions(setting: Setting, ensemble: Ensemble, drive: Drive) -> dict[str, Array]:
    """Compositions (M, 10) [mmol/L] of every point of the layout."""
    state = ensemble.state
    found: dict[str, Array] = {}
    for point in POINTS_OF[setting.circuit.layout]:
        if same_solution(setting, point) in found:
            found[point] = found[same_solution(setting, point)]
            continue
        if point == "feed":
            fed = feed_composition(setting.circuit, drive, state)
            known = setting.circuit.layout == "known-feed"
            found[point] = fed * np.exp(ensemble.stock) if known else fed
        else:
            store = point in ("tank", "drain_store") and not setting.circuit.mixed
            found[point] = np.maximum(ensemble.holds(setting, STORE if store else ROOT), 0.0)
    return found


def same_solution(setting: Setting, point: str) -> str:
    """The point that shows the same solution: drain is the root zone's, and without a medium all is the tank."""
    if point == "drain":
        return "root_zone"
    return "tank" if setting.circuit.mixed and point == "root_zone" else point


def stacked(setting: Setting, said: Sequence[Mapping[str, Array]]) -> dict[str, Array]:
    """Compositions (times, M, 10) of every point from those of each time; the same solution is kept once."""
    found: dict[str, Array] = {}
    for point in said[0]:
        alike = same_solution(setting, point)
        found[point] = found[alike] if alike in found else np.stack([each[point] for each in said])
    return found


def feed_drive(drives: Drives, span: int, ensemble: Ensemble) -> Drive:
    """The drive in force at the end of a stretch."""
    drive = drives.drive(span, ensemble.drain, ensemble.stock)
    return drive.part(1.0, 1.0) if drive.feed_to is not None else drive


def allowed(site: Site, loop: Loop, point: str) -> dict[str, Band]:
    """Allowed range of everything at a point: its band, narrowed by its limit."""
    found: dict[str, Band] = {}
    for ranges in (limits_of(site, loop, point), bands_of(site, loop, point)):
        for what, each in ranges.items():
            found[what] = _narrower(found.get(what), each)
    return found


def _narrower(band: Band | None, other: Sourced) -> Band:
    if band is None:
        return (other.low, other.high)
    lows = [low for low in (band[0], other.low) if low is not None]
    highs = [high for high in (band[1], other.high) if high is not None]
    return (max(lows) if lows else None, min(highs) if highs else None)


def shown_members(members: Array, spread: Spread) -> Array:
    """What the members say at a point (..., M, 10), charges closed and ranges at the scale the loop has shown."""
    return spread.widened(neutral(members))


def log_ec(members: Array, middle: Array) -> Array:
    """log EC (times, M) [mS/cm] of compositions (times, M, 10): exact at ``middle`` (times, 10), linear about it."""
    steps = EC_STEP * np.vstack([np.zeros(len(IONS)), np.eye(len(IONS))])
    around = conductivity(middle[:, None] + steps)
    slope = (around[:, 1:] - around[:, :1]) / EC_STEP
    apart = members - middle[:, None]
    return np.log(np.maximum(around[:, :1] + np.einsum("tmi,ti->tm", apart, slope), LEAST_EC))


class Course:
    """Quantiles of one solution at many times: ``members`` (times, M, 10), already scaled; ``ec`` (times, M), logs.

    The members' alkalinity may fall below zero, which is free acid; HCO3 as it is shown is an ion, and cannot.
    """

    def __init__(self, members: Array, ec: Array) -> None:
        self.members = members
        self.ions = quantiles(members, axis=-2)
        self.ec_members = np.exp(log_ec(members, self.ions[0]) + ec)
        self.shares = quantiles(shares(members), axis=-2)
        self.enough = shared_meq(self.ions[0]) >= LEAST_SHARED_MEQ
        self.ec = quantiles(self.ec_members, axis=-1)
        self.ions[..., INDEX["HCO3"]] = np.maximum(self.ions[..., INDEX["HCO3"]], 0.0)


def courses(solutions: Mapping[str, Array], ec: Array, spread: Spread) -> dict[str, Course]:
    """Course of every point; points that hold the same solution share one."""
    found: dict[str, Course] = {}
    for point, members in solutions.items():
        alike = next((other for other in found if solutions[other] is members), None)
        found[point] = found[alike] if alike else Course(shown_members(members, spread), ec)
    return found


class Panel:
    """A course beside the bands of a point."""

    def __init__(self, course: Course, bands: Mapping[str, Band]) -> None:
        self.course, self.bands = course, bands

    def state(self, time: int, ph: Estimated | None) -> PointState:
        """The point at one of the times."""
        ions = {ion: self._ion(ion, time) for ion in IONS}
        if ph is not None:
            ions["HCO3"] = IonState(_as_ph_allows(ions["HCO3"].mmol_l, ph))
        return PointState(self._estimated(self.course.ec[:, time], "EC"), ph, ions)

    def _ion(self, ion: str, time: int) -> IonState:
        share = None
        if ion in SHARED and self.course.enough[time]:
            share = self._estimated(self.course.shares[:, time, SHARED.index(ion)], f"{ion} share")
        return IonState(self._estimated(self.course.ions[:, time, INDEX[ion]], ion), share)

    def _estimated(self, triple: Array, what: str) -> Estimated:
        middle, low, high = (float(value) for value in triple)
        return Estimated(middle, low, high, self.bands.get(what))


def _as_ph_allows(alkalinity: Estimated, ph: Estimated) -> Estimated:
    """An alkalinity [meq/L] no higher than its pH allows: HCO3 = CO2 x 10^(pH - pK1) with the most CO2 that stays.

    A solution of pH 5.9 to 6.0 holds at most about 1 meq/L: with more, it would have to fizz.
    """
    value, low, high = (
        min(found, MOST_CO2 * 10.0 ** (at - PK1))
        for found, at in ((alkalinity.value, ph.value), (alkalinity.low, ph.value), (alkalinity.high, ph.high))
    )
    return Estimated(value, low, max(high, value), alkalinity.band)


def no_free_acid(seen: Sequence[Observation], layout: str, time: float) -> bool:
    """Whether the pH measured last in every point that was measured rules free acid out, and so an alkalinity below
    zero."""
    found = (Acidity(seen, point).at(time, None) for point in POINTS_OF[layout])
    known = [ph.value for ph in found if ph is not None]
    return bool(known) and min(known) > FREE_ACID_PH


class Acidity:
    """pH of one point as it was measured; it has no model."""

    def __init__(self, seen: Sequence[Observation], point: str) -> None:
        here = SAME_WATER.get(point, (point,))
        given = [each for each in seen if each.ph is not None and each.point in here and not each.doubtful]
        self.times, self.values = [each.time for each in given], [each.ph or 0.0 for each in given]

    def at(self, time: float, band: Band | None) -> Estimated | None:
        """The last measurement up to a time, wider with age; None where it is more than four weeks old."""
        place = bisect_right(self.times, time + 1e-6) - 1
        if place < 0 or time - self.times[place] >= PH_DAYS:
            return None
        ph, width = self.values[place], PH_ERROR + PH_DRIFT * sqrt(max(time - self.times[place], 0.0))
        return Estimated(ph, ph - width, ph + width, band)


def micronutrients_at(
    seen: Sequence[Observation], point: str, time: float, bands: Mapping[str, Band]
) -> dict[str, Estimated]:
    """Micronutrients [umol/L] of a point as last analysed, their ranges widening with age; they have no model."""
    here = SAME_WATER.get(point, (point,))
    given = [each for each in seen if each.micronutrients and each.point in here and each.time <= time + 1e-6]
    given = [each for each in given if not each.doubtful]
    if not given:
        return {}
    last = given[-1]
    part = float(0.15 * np.sqrt(1.0 + max(time - last.time, 0.0) / 14.0))
    return {
        name: Estimated(value, value * (1.0 - part), value * (1.0 + part), bands.get(name))
        for name, value in last.micronutrients.items()
    }
