"""A grower's site as values: loops, waters, supplies, stock tanks, targets, bands and limits. Immutable."""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

LAYOUTS = ("shared-tank", "drain-blend", "known-feed")
POINTS = ("source", "feed", "tank", "root_zone", "drain", "drain_store")

Band = tuple[float | None, float | None]


class Sourced(NamedTuple):
    """A band or limit with where it comes from ("own trial", "permit", "unverified preset")."""

    low: float | None
    high: float | None
    source: str = ""


class Composition(NamedTuple):
    """Ions [mmol/L], micronutrients [umol/L], EC [mS/cm at 25 C] and pH of a water, recipe or target; None: unknown."""

    ions: Mapping[str, float] = {}
    micronutrients: Mapping[str, float] = {}
    ec: float | None = None
    ph: float | None = None
    source: str = ""


class Water(NamedTuple):
    """A source water by name, with its analysis (HCO3 [meq/L] stands for alkalinity; absent means unknown)."""

    name: str
    composition: Composition


class Supply(NamedTuple):
    """A salt, acid or lye on the shelf. ``kind`` is the catalogue name; a label analysis overrides the formula."""

    name: str
    kind: str
    strength_pct: float | None = None
    density_kg_per_l: float | None = None
    label_pct: Mapping[str, float] = {}
    amount_kg: float | None = None
    price_per_kg: float | None = None
    bag_kg: float | None = None


class StockTank(NamedTuple):
    """A stock tank named by content; ``letter`` is what the site paints on it; ``dilution`` is 100 for a 100x stock."""

    name: str
    litres: float
    dilution: float = 100.0
    letter: str = ""
    salts_kg: Mapping[str, float] = {}
    storage_temperature_c: float = 10.0
    source: str = ""


class Loop(NamedTuple):
    """One recirculating circuit with one root zone; ``sources`` says where a number of it comes from, by field name."""

    name: str
    layout: str
    area_m2: float
    crop: str
    medium: str
    stage: str = ""
    target: str = ""
    tank_l: float | None = None
    drain_store_l: float | None = None
    drain_store: str = ""
    medium_volume_l_per_m2: float | None = None
    root_zone_water_l_per_m2: float | None = None
    capacity_meq_per_l: float | None = None
    stock_tanks: tuple[str, ...] = ()
    water: str = ""
    feed_ec: float | None = None
    feed_ph: float | None = None
    drain_share: float | None = None
    premix_ec: float | None = None
    drain_fraction: float = 0.3
    crop_water_l_per_m2_d: float | None = None
    extract_factors: Mapping[str, float] = {}
    bands: Mapping[str, Mapping[str, Sourced]] = {}
    limits: Mapping[str, Mapping[str, Sourced]] = {}
    sources: Mapping[str, str] = {}


class Instrument(NamedTuple):
    """A meter or scale of the site; ``compensated``: whether an EC meter already reads at 25 C (None: not asked)."""

    name: str
    kind: str
    compensated: bool | None = None
    step_kg: float | None = None
    capacity_kg: float | None = None
    digits: int | None = None


class Site(NamedTuple):
    """Everything ``site.toml`` says, checked."""

    name: str
    timezone: str
    loops: tuple[Loop, ...]
    units: str = "mmol/L"
    waters: tuple[Water, ...] = ()
    supplies: tuple[Supply, ...] = ()
    stock_tanks: tuple[StockTank, ...] = ()
    targets: Mapping[str, Mapping[str, Composition]] = {}
    bands: Mapping[str, Mapping[str, Sourced]] = {}
    limits: Mapping[str, Mapping[str, Sourced]] = {}
    scale_step_kg: float = 0.05
    instruments: tuple[Instrument, ...] = ()
    budget_n_kg_per_ha: float | None = None
    budget_p_kg_per_ha: float | None = None
    lab_turnaround_d: int = 2
    staffed_days: tuple[str, ...] = ("Mon", "Tue", "Wed", "Thu", "Fri", "Sat", "Sun")

    def loop(self, name: str | None = None) -> Loop:
        """The loop of that name, the first when none is named; raises ``KeyError`` with the known names."""
        if name is None:
            return self.loops[0]
        for loop in self.loops:
            if loop.name == name:
                return loop
        raise KeyError(f"no loop {name!r}; this site has {', '.join(each.name for each in self.loops)}")
