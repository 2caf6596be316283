"""The members: where each thinks the loop is, and what each thinks drives it.

Per member: the engine's state; logarithms of what is not known well: uptake of every ion (a fast part that reverts
within a month, a slow part that wanders), uptake common to all ions, drain, stock composition, the EC factor of the
loop, exchange capacity and selectivity. A multiplier trades off against water and volume: it is no plant physiology.
"""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np

from fertui.chemistry.ions import INDEX, Array
from fertui.estimate.noise import normals
from fertui.estimate.quantiles import median
from fertui.estimate.setting import Setting
from fertui.loop import ROOT, STORE, Medium, Plants, State

SPREAD = {"fast": 0.10, "common": 0.15, "drain": 0.15, "stock": 0.05, "ec": 0.05}
"""Spread (log) at the start; the slow part of uptake starts with the spread of the crop's preset."""

UNKNOWNS = ("fast", "slow", "stock", "common", "drain", "ec", "capacity", "selectivity")

DAILY = 1.0 / 14.0
"""Noise below is per fortnight; a day's variance is this part of it."""
FAST_SD, FAST_DAYS = 0.25, 30.0
SLOW_SD = 0.07
COMMON_SD, COMMON_DAYS = 0.10, 30.0
DRAIN_SD, DRAIN_DAYS = 0.15, 60.0
STOCK_SD, EC_SD = 0.03, 0.02
STATE_SD, STATE_COMMON_SD = 0.05, 0.04
ALKALINITY_DAYS, ALKALINITY_MEQ_L = 3.0, 0.5
"""Alkalinity is not estimated: it goes back to what was last measured (0.5 meq/L, common practice) within days."""

DRY = 0.02
"""Below this part of its level a store holds too little to speak of."""

_HCO3 = INDEX["HCO3"]
_IONS = slice(0, _HCO3)


class Ensemble(NamedTuple):
    """State and unknowns of M members. ``alkalinity`` [meq/L]: last measured, the value the state reverts to."""

    state: State
    fast: Array
    slow: Array
    stock: Array
    common: Array
    drain: Array
    ec: Array
    capacity: Array
    selectivity: Array
    alkalinity: float = ALKALINITY_MEQ_L

    @property
    def members(self) -> int:
        """Number of members M."""
        return self.state.members

    @property
    def multiplier(self) -> Array:
        """Multiplier of uptake (M, 10)."""
        return np.exp(self.fast + self.slow + self.common[:, None])

    def medium(self, setting: Setting) -> Medium:
        """The exchanger of every member."""
        return setting.medium(self.capacity, self.selectivity)

    def plants(self, setting: Setting, reference_l_d: float) -> Plants:
        """The crop of every member."""
        return setting.plants(self.multiplier, reference_l_d)

    def holds(self, setting: Setting, where: int) -> Array:
        """What a vessel holds (M, 10) [mmol/L], nothing negative but alkalinity; a store gone dry shows what runs in.

        Alkalinity of a root zone is what was last measured: roots give off more of it than stays, and pH is steered.
        """
        found = self.state.concentration(where)
        if setting.circuit.layout != "shared-tank":
            found[:, _HCO3] = self.alkalinity * np.exp(self.slow[:, _HCO3])
        if where == STORE:
            dry = self.state.water_l[:, STORE] < DRY * max(setting.circuit.store_l, 1.0)
            if dry.any():
                found = np.where(dry[:, None], self.state.concentration(ROOT), found)
        return found

    def chosen(self, members: Array) -> Ensemble:
        """The members of these positions, repeated where repeated."""
        state = State(*(getattr(self.state, name)[members] for name in ("water_l", "ions_mmol", "exchanged_meq")))
        return self._replace(state=state, **{name: getattr(self, name)[members] for name in UNKNOWNS})

    def middle(self, setting: Setting) -> Ensemble:
        """One member that stands in the middle: median of every amount and unknown, the exchanger loaded to match."""
        amounts = (self.state.water_l, self.state.ions_mmol, self.state.exchanged_meq)
        state = State(*(median(each)[None] for each in amounts))
        unknown: dict[str, Any] = {name: median(getattr(self, name))[None] for name in UNKNOWNS}
        found = self._replace(state=state, **unknown)
        return found._replace(state=state.reloaded(found.medium(setting)))


def unknowns(setting: Setting, seed: int, members: int) -> dict[str, Array]:
    """Starting values of everything but the state, by name."""
    draw = normals(seed, setting.loop.name, "start", members, 40, apart=True)
    selectivity, selectivity_sd = setting.growing.selectivity()
    return {
        "fast": SPREAD["fast"] * draw[:, 0:10],
        "slow": setting.prior_sd * draw[:, 10:20],
        "stock": SPREAD["stock"] * draw[:, 20:30],
        "common": SPREAD["common"] * draw[:, 30],
        "drain": SPREAD["drain"] * draw[:, 31],
        "ec": SPREAD["ec"] * draw[:, 32],
        "capacity": setting.capacity_sd * draw[:, 33],
        "selectivity": selectivity + selectivity_sd * draw[:, 34:39],
    }


def wandered(ensemble: Ensemble, setting: Setting, seed: int, day: int) -> Ensemble:
    """The members after one more local day of noise; ``day`` keys the random numbers."""
    blended = setting.circuit.layout != "known-feed"
    draw = normals(seed, setting.loop.name, day, ensemble.members, 43 if blended else 33)
    root = np.sqrt(DAILY)
    drain_keep = np.exp(-1.0 / DRAIN_DAYS)
    noise = root * (STATE_SD * draw[:, 23:32] + STATE_COMMON_SD * draw[:, 32, None])
    return ensemble._replace(
        fast=np.exp(-1.0 / FAST_DAYS) * ensemble.fast + FAST_SD * root * draw[:, 0:10],
        slow=ensemble.slow + SLOW_SD * root * draw[:, 10:20],
        stock=ensemble.stock + STOCK_SD * root * draw[:, 33:43] if blended else ensemble.stock,
        common=np.exp(-1.0 / COMMON_DAYS) * ensemble.common + COMMON_SD * root * draw[:, 20],
        drain=drain_keep * ensemble.drain + DRAIN_SD * np.sqrt(1.0 - drain_keep**2) * draw[:, 21],
        ec=ensemble.ec + EC_SD * root * draw[:, 22],
        state=_shaken(ensemble.state, noise, ensemble.alkalinity),
        alkalinity=_steered(setting, ensemble.alkalinity),
    )


def _steered(setting: Setting, alkalinity: float) -> float:
    """Alkalinity a day later: growers steer the pH of a root zone, so what was found there goes back to the usual."""
    if setting.circuit.layout == "shared-tank":
        return alkalinity
    return ALKALINITY_MEQ_L + (alkalinity - ALKALINITY_MEQ_L) * float(np.exp(-1.0 / ALKALINITY_DAYS))


def _shaken(state: State, noise: Array, alkalinity: float) -> State:
    """Amounts off by noise (M, 9) that is the same in every vessel; alkalinity drawn to where it was seen."""
    ions = state.ions_mmol.copy()
    ions[:, :, _IONS] *= np.exp(noise)[:, None, :]
    ions[:, :, _HCO3] += (1.0 - np.exp(-1.0 / ALKALINITY_DAYS)) * (alkalinity * state.water_l - ions[:, :, _HCO3])
    return state._replace(ions_mmol=ions)


def compartment(setting: Setting, point: str) -> int | None:
    """The vessel a sample of a point shows; None for a feed that is no vessel."""
    if setting.circuit.mixed:
        return ROOT
    if setting.circuit.layout == "shared-tank":
        return ROOT if point in ("root_zone", "drain") else STORE
    if point == "feed":
        return None
    return STORE if point in ("drain_store", "tank") and setting.circuit.layout == "drain-blend" else ROOT
