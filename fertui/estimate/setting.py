"""The loop as the engine sees it, with the spread of what nobody measured: volumes, exchange, uptake of the preset."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from fertui.catalogue.crops import crop
from fertui.catalogue.media import Medium as Growing
from fertui.catalogue.media import medium
from fertui.chemistry.ions import INDEX, IONS, Array
from fertui.estimate import compositions
from fertui.loop import INERT, Circuit, Medium, Plants
from fertui.site.model import Loop
from fertui.site.presets import root_zone_water

STORE_L_PER_M2 = 3.0
"""Drain store of a site that does not say: 20-30 m3/ha (field practice)."""
CIRCULATING_L_PER_M2 = 5.0
"""Water of a loop without medium whose tank is not given: NFT 1-5 L/m2 in gullies and tank (common practice)."""

PRESET_SD = 0.5
"""Spread (log) of uptake about the preset of a crop: presets come from other growers' crops."""
UNVERIFIED_SD = 0.7
"""The same for ions whose preset is unverified."""


REFERENCE_FLOOR = 0.1
"""Least reference concentration [mmol/L]; keeps the rate law away from Cmin."""


class Setting(NamedTuple):
    """Circuit, exchange and uptake prior of one loop. ``prior_sd`` (10,): spread (log) of each ion's uptake."""

    loop: Loop
    circuit: Circuit
    growing: Growing
    medium_l: float
    uptake: Array
    reference: Array
    prior_sd: Array
    crop_water_l_per_m2_d: float
    assumed: tuple[str, ...]

    @property
    def exchanges(self) -> bool:
        """Whether the medium trades cations with the solution."""
        return self.capacity_meq > 0

    @property
    def capacity_meq(self) -> float:
        """Exchange capacity [meq] of the whole loop as the site or the preset has it."""
        per_l = self.loop.capacity_meq_per_l
        return self.medium_l * (self.growing.capacity_meq_per_l.mean if per_l is None else per_l)

    @property
    def capacity_sd(self) -> float:
        """Spread (log) of the capacity: of the preset, or 10 % of a capacity the grower measured."""
        if self.loop.capacity_meq_per_l is not None:
            return 0.10
        figure = self.growing.capacity_meq_per_l
        return figure.sd / figure.mean if figure.mean > 0 else 0.0

    def medium(self, log_capacity: Array, selectivity: Array) -> Medium:
        """The exchanger of every member: capacity by its factor (M,), log10 selectivity (M, 5)."""
        if not self.exchanges:
            return INERT
        return Medium(self.capacity_meq * np.exp(log_capacity), 10.0**selectivity)

    def plants(self, multiplier: Array, reference_l_d: float) -> Plants:
        """The crop with every member's multipliers (M, 10)."""
        return Plants(self.uptake, self.reference, reference_l_d, multiplier)


def setting(loop: Loop, stage: str = "") -> Setting:
    """The setting of a loop in a stage ('' or one the preset does not know: the standard one).

    Raises ``CatalogueError`` for a crop or medium the catalogue does not know.
    """
    preset, growing = crop(loop.crop), medium(loop.medium)
    uptake = preset.uptake_at(stage if stage in preset.stages else "")
    taken, reference = _above_zero(compositions.array(uptake.ions), compositions.array(preset.reference.ions))
    unsure = [ion in uptake.unverified for ion in IONS]
    circuit, assumed = _circuit(loop)
    return Setting(
        loop, circuit, growing, _medium_l(loop, growing), taken, reference,
        np.where(unsure, UNVERIFIED_SD, PRESET_SD), loop.crop_water_l_per_m2_d or preset.water.value, assumed,
    )  # fmt: skip


def _circuit(loop: Loop) -> tuple[Circuit, tuple[str, ...]]:
    """Vessels of a loop, and what was taken for a size the site does not give."""
    root = root_zone_water(loop)[0] * loop.area_m2
    if loop.layout == "known-feed":
        return Circuit("known-feed", loop.area_m2, max(root, CIRCULATING_L_PER_M2 * loop.area_m2 * (root <= 0))), ()
    if loop.layout == "drain-blend":
        store = loop.drain_store_l or STORE_L_PER_M2 * loop.area_m2
        words = () if loop.drain_store_l else (f"drain store of {store:.0f} L ({STORE_L_PER_M2:g} L/m2)",)
        blended = Circuit(
            "drain-blend", loop.area_m2, root, store, drain_share=loop.drain_share, premix_ec=loop.premix_ec
        )
        return blended, words
    tank = loop.tank_l or CIRCULATING_L_PER_M2 * loop.area_m2
    words = () if loop.tank_l else (f"tank of {tank:.0f} L ({CIRCULATING_L_PER_M2:g} L/m2)",)
    if root <= 0:
        return Circuit("shared-tank", loop.area_m2, tank, mixed=True), words
    return Circuit("shared-tank", loop.area_m2, root, tank), words


def _medium_l(loop: Loop, growing: Growing) -> float:
    """Litres of medium of the whole loop: as given, else from its water, else the usual."""
    if loop.medium_volume_l_per_m2 is not None:
        return loop.medium_volume_l_per_m2 * loop.area_m2
    if loop.root_zone_water_l_per_m2 and growing.water_fraction.mean > 0:
        return loop.root_zone_water_l_per_m2 / growing.water_fraction.mean * loop.area_m2
    return growing.volume_l_per_m2.mean * loop.area_m2


def _above_zero(uptake: Array, reference: Array) -> tuple[Array, Array]:
    """A reference above Cmin for every ion taken up; alkalinity is never taken up by itself."""
    taken = uptake.copy()
    taken[INDEX["HCO3"]] = 0.0
    return taken, np.maximum(reference, REFERENCE_FLOOR)
