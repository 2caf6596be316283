"""What a plan is after at a point: the aim, the bands of the shares, and the limits nothing may pass."""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from fertui.chemistry.ions import INDEX, IONS, Array, vector
from fertui.site.model import Composition, Loop, Site, Sourced
from fertui.site.presets import bands_of, limits_of, target_of

SHARED = ("K", "Ca", "Mg")
EC_STEP_FEED, EC_STEP_ROOT_ZONE = 0.3, 0.5
"""Most that EC may change in one step at the dripper, and in a day in the root zone [mS/cm] (common practice)."""
NH4_PART_OF_N = 0.15
"""Most ammonium among the nitrogen of a feed: 5-15 % (Nutrient Solutions for Greenhouse Crops 2016, second-hand)."""
NH4_STOP_PH = 5.2
"""Root-zone pH below which no ammonium is added (common practice)."""
LIMITED = ("NH4", "Na", "Cl")


class Goal(NamedTuple):
    """Aim, bands and limits at one point.

    ``aim`` (10,) [mmol/L] with NaN where the target names no number; ``share_low`` and ``share_high`` (3,) as
    fractions of K + Ca + Mg; ``most`` (10,) [mmol/L], infinite without a limit; ``sources`` says where each limit
    comes from. ``ec_least`` and ``ec_most`` [mS/cm]: the band of EC, 0 and infinite without one.
    """

    point: str
    name: str
    aim: Array
    share_low: Array
    share_high: Array
    most: Array
    ec_most: float
    ec_step: float
    sources: Mapping[str, str]
    named: bool
    ec_least: float = 0.0

    @property
    def wants(self) -> npt.NDArray[np.bool_]:
        """True for the ions of the aim that are nutrients asked for, shape (10,)."""
        return np.nan_to_num(self.aim, nan=0.0) > 0.0

    def scaled(self, factor: float) -> Goal:
        """The same goal with its aim at another strength."""
        return self._replace(aim=self.aim * factor)


def goal_of(site: Site, loop: Loop, point: str, target: str | None) -> Goal:
    """The goal at a point; a ``target`` named for this plan alone brings its own bands of shares and EC with it.

    Raises ``SiteError`` for an unknown target.
    """
    aim = _aim(target_of(site, loop, target), point)
    if target is not None and target != (loop.target or loop.crop):
        free = loop._replace(target=target, bands={})
        bands = {**bands_of(site, loop, point), **_shares_and_ec(bands_of(site._replace(bands={}), free, point))}
    else:
        bands = bands_of(site, loop, point)
    limits = limits_of(site, loop, point)
    own = {**site.limits.get(point, {}), **loop.limits.get(point, {})}
    ec_limit = limits.get("EC") or bands.get("EC")
    ec_band = bands.get("EC")
    shares = [bands.get(f"{ion} share") for ion in SHARED]
    return Goal(
        point, target or loop.target or loop.crop, _numbers(aim),
        np.array([0.0 if each is None or each.low is None else each.low / 100.0 for each in shares]),
        np.array([1.0 if each is None or each.high is None else each.high / 100.0 for each in shares]),
        _most(limits, own, aim), np.inf if ec_limit is None or ec_limit.high is None else ec_limit.high,
        _step(limits, point), _sources(limits, bands), target is not None,
        0.0 if ec_band is None or ec_band.low is None else ec_band.low,
    )  # fmt: skip


def _aim(target: Mapping[str, Composition], point: str) -> Composition:
    alike = {"tank": "root_zone", "drain": "root_zone", "drain_store": "root_zone"}
    return target.get(point) or target.get(alike.get(point, ""), Composition())


def _numbers(aim: Composition) -> Array:
    given = vector({ion: value for ion, value in aim.ions.items() if ion in INDEX})
    return np.where([ion in aim.ions for ion in IONS], given, np.nan)


def _shares_and_ec(bands: Mapping[str, Sourced]) -> dict[str, Sourced]:
    return {what: band for what, band in bands.items() if what.endswith("share") or what == "EC"}


def _most(limits: Mapping[str, Sourced], own: Mapping[str, Sourced], aim: Composition) -> Array:
    """Upper limits; a preset gives way to an aim that asks for more, a grower's own limit does not."""
    most = np.full(len(IONS), np.inf)
    for ion in IONS:
        limit = limits.get(ion)
        if limit is not None and limit.high is not None:
            most[INDEX[ion]] = limit.high if ion in own else max(limit.high, aim.ions.get(ion, 0.0))
    return most


def _step(limits: Mapping[str, Sourced], point: str) -> float:
    given = limits.get("EC step")
    if given is not None and given.high is not None:
        return given.high
    return EC_STEP_ROOT_ZONE if point in ("root_zone", "drain") else EC_STEP_FEED


def _sources(limits: Mapping[str, Sourced], bands: Mapping[str, Sourced]) -> dict[str, str]:
    return {what: each.source for what, each in {**bands, **limits}.items()}
