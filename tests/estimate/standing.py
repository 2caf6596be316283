"""A loop standing in a known state, so that one rule at a time can be looked at without running the filter."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import UTC, datetime

from fertui.chemistry.names import IONS
from fertui.estimate.assimilation import HeldBack, PointAt, Surprise
from fertui.estimate.points import Band, Estimated, IonState, PointState
from fertui.estimate.ranges import Spread
from fertui.estimate.record import Record, read
from fertui.estimate.setting import Setting, setting
from fertui.logbook.entries import Entry
from fertui.logbook.parse import entry_from_text
from fertui.site.model import Composition, Loop, Site, StockTank, Water

NOW = datetime(2026, 7, 1, 6, 0, tzinfo=UTC)
"""Wednesday morning, eight on the clock of the site."""

SLABS = Loop(
    name="bay", layout="drain-blend", area_m2=1000.0, crop="tomato", medium="coir", drain_store_l=5000.0,
    stock_tanks=("calcium", "sulfate"), water="well", feed_ec=2.6,
)  # fmt: skip
GUTTERS = Loop(
    name="gutters", layout="shared-tank", area_m2=260.0, crop="lettuce", medium="none", tank_l=2000.0, feed_ec=1.8
)
SITE = Site(
    name="Testing house",
    timezone="Europe/Amsterdam",
    loops=(SLABS, GUTTERS),
    waters=(Water("well", Composition({"Ca": 1.0, "HCO3": 2.0})),),
    stock_tanks=(StockTank("calcium", 1000.0, letter="A"), StockTank("sulfate", 1000.0, letter="B")),
    staffed_days=("Mon", "Tue", "Wed", "Thu", "Fri"),
)

USUAL = {"K": 8.0, "Ca": 10.0, "Mg": 4.5, "Na": 4.0, "NH4": 0.1, "NO3": 22.0, "Cl": 3.0, "SO4": 6.8, "H2PO4": 1.0,
         "HCO3": 0.5}  # fmt: skip
"""Root zone of tomato: Nutrient Solutions for Greenhouse Crops, 2016 (second-hand); Na and Cl within its limits."""


def known(value: float, band: Band | None = None, part: float = 0.1) -> Estimated:
    """A number with an 80 % range of so much either side."""
    return Estimated(value, value * (1 - part), value * (1 + part), band)


def point(shares: Mapping[str, Estimated] | None = None, ph: Estimated | None = None, **ions: Estimated) -> PointState:
    """A point with usual ions and without bands, but for what is given."""
    states = {ion: IonState(ions.get(ion, known(USUAL[ion])), (shares or {}).get(ion)) for ion in IONS}
    return PointState(known(4.0), ph, states)


@dataclass(frozen=True)
class Standing:
    """Has of an estimate what the notices look at."""

    loop: Loop = SLABS
    site: Site = SITE
    at: datetime = NOW
    state: PointState = field(default_factory=point)
    managed: str = "root_zone"
    analyses: int = 5
    last_analysis: Mapping[str, datetime] = field(default_factory=lambda: {"root_zone": NOW})
    surprises: tuple[Surprise, ...] = ()
    held_back: tuple[HeldBack, ...] = ()
    spread: Spread = field(default_factory=Spread)
    trail: tuple[PointAt, ...] = ()
    unanalysed_water: str | None = None

    @property
    def setting(self) -> Setting:
        """The loop as the engine sees it."""
        return setting(self.loop)

    @property
    def record(self) -> Record:
        """A record without a log: nothing is known of the stock used."""
        return read(self.site, self.loop, (), self.at)

    def course(self, point: str, last: int | None = None) -> tuple[PointAt, ...]:
        """The trail, whatever the point."""
        return self.trail if last is None else self.trail[-last:]

    def points(self) -> dict[str, PointState]:
        """The managed point alone."""
        return {self.managed: self.state}


def said(kind: str, at: str, loop: Loop | None = SLABS, now: datetime = NOW, **texts: str) -> Entry:
    """An entry as ``fertui record`` would make it."""
    return entry_from_text(kind, {"by": "MK", "at": at, **texts}, SITE, loop, now)
