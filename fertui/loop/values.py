"""What the engine is told and what it answers: circuit, medium, state, drive, event. Members lead every array.

Axes: M members; 2 compartments (``STORE``: shared tank or drain store, ``ROOT``: water of the root zone);
10 ions in the order of ``fertui.chemistry.ions.IONS`` (HCO3 stands for alkalinity and may be negative);
5 exchangeable cations. A number that is the same for all members may be given as a scalar or without the member axis.
In memory the members lie side by side (Fortran order), which makes arithmetic on thin arrays about twice as fast.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from fertui.chemistry.conductivity import Linearised
from fertui.chemistry.exchange import PHREEQC_SELECTIVITY, loading
from fertui.chemistry.ions import CATION_CHARGE, IONS, Array

LAYOUTS = ("shared-tank", "drain-blend", "known-feed")
STORE, ROOT = 0, 1
NOTHING: Array = np.zeros(len(IONS))
DRY_L = 1e-6
"""A vessel with less water than this is dry: it has no concentration, what it holds is salt."""


@dataclass(frozen=True, slots=True)
class Circuit:
    """The pipes and vessels of one loop.

    ``store_l`` [L] is the level that automatic make-up (shared-tank) or automatic reuse (drain-blend) keeps;
    ``store_max_l`` [L] is where it runs over. ``root_zone_l`` [L] is the water of medium and pipes, of the whole loop.
    ``mixed`` (shared-tank with medium none): all water is one volume, ``root_zone_l``; the store stays empty.
    drain-blend feeds ``drain_share`` (0-1) of store water, or blends to ``premix_ec`` [mS/cm], or, with neither, reuses
    what keeps the store at its level. ``driest`` is the fraction of root-zone water the crop cannot take.
    Raises ``ValueError`` for an unknown layout, a volume below zero, or a root zone without water.
    """

    layout: str
    area_m2: float
    root_zone_l: float
    store_l: float = 0.0
    store_max_l: float = np.inf
    mixed: bool = False
    drain_share: float | None = None
    premix_ec: float | None = None
    driest: float = 0.05

    def __post_init__(self) -> None:
        if self.layout not in LAYOUTS:
            raise ValueError(f"layout {self.layout!r} is not one of {', '.join(LAYOUTS)}")
        if not (self.root_zone_l > 0 and self.store_l >= 0 and self.store_max_l >= self.store_l and self.area_m2 > 0):
            raise ValueError(
                f"root_zone_l {self.root_zone_l:g}, store_l {self.store_l:g}, store_max_l {self.store_max_l:g}, "
                f"area_m2 {self.area_m2:g}: root zone and area must be above 0, 0 <= store_l <= store_max_l"
            )
        if self.mixed and self.layout != "shared-tank":
            raise ValueError(f"one mixed volume is a shared-tank without medium; this loop is {self.layout}")
        if self.drain_share is not None and not 0.0 <= self.drain_share <= 1.0:
            raise ValueError(f"drain_share {self.drain_share:g} must lie between 0 and 1")

    @property
    def fed(self) -> int:
        """The compartment that make-up water and hand doses go into."""
        return ROOT if self.mixed or self.layout == "known-feed" else STORE


class Medium(NamedTuple):
    """What the root zone exchanges: ``capacity_meq`` [meq] of the whole loop, scalar or (M,), root free space included;

    ``selectivity`` (5,) or (M, 5), Gaines-Thomas on concentrations, calcium 1, monovalents in (mmol/L)^-1/2.
    """

    capacity_meq: float | Array = 0.0
    selectivity: Array = PHREEQC_SELECTIVITY

    @property
    def inert(self) -> bool:
        """Whether nothing is exchanged at all (stone wool, NFT)."""
        return not np.any(np.asarray(self.capacity_meq) > 0)

    def load(self, solution_mmol_l: Array) -> Array:
        """Charge on the sites [meq] (..., 5) in equilibrium with a root-zone solution (..., 10) [mmol/L].

        >>> Medium(100.0).load(np.array([6, 5, 2, 3, 0, 15, 2, 2, 1, 0.0])).round(1)
        array([13.9, 67.6, 17.1,  1.4,  0. ])
        """
        capacity = np.asarray(self.capacity_meq, dtype=float)[..., None]
        return capacity * loading(np.maximum(solution_mmol_l[..., :5], 1e-9), self.selectivity)


INERT = Medium()


class State(NamedTuple):
    """Water [L] (M, 2), ions in solution [mmol] (M, 2, 10) and charge on the exchanger [meq] (M, 5) of every member."""

    water_l: Array
    ions_mmol: Array
    exchanged_meq: Array

    @property
    def members(self) -> int:
        """Number of members M."""
        return int(self.water_l.shape[0])

    def concentration(self, compartment: int) -> Array:
        """Concentrations [mmol/L] (M, 10) of one compartment; zero where it is dry."""
        water = self.water_l[:, compartment, None]
        return self.ions_mmol[:, compartment] * (water > DRY_L) / np.maximum(water, DRY_L)

    def reloaded(self, medium: Medium) -> State:
        """The same solution with the exchanger in equilibrium with it: what follows an analysis."""
        if medium.inert:
            return self
        return self._replace(exchanged_meq=_members(medium.load(self.concentration(ROOT)), self.members, 5))

    def laid_out(self) -> State:
        """The same state with members side by side in memory."""
        return State(*(np.asfortranarray(array) for array in (self.water_l, self.ions_mmol, self.exchanged_meq)))

    def equivalents_held(self) -> Array:
        """Amount of every cation on the exchanger [mmol] (M, 5)."""
        return self.exchanged_meq / CATION_CHARGE


def start(
    circuit: Circuit,
    medium: Medium,
    root_mmol_l: npt.ArrayLike,
    store_mmol_l: npt.ArrayLike | None = None,
    members: int = 1,
    held: npt.ArrayLike | None = None,
) -> State:
    """State with vessels at their working level and known compositions.

    ``root_mmol_l``, ``store_mmol_l`` (10,) or (M, 10) [mmol/L]; the store takes the root zone's where it is not given.
    ``held`` (5,) or (M, 5): equivalent fractions on the exchanger, as for new coir; without it the medium is in
    equilibrium with the root-zone solution.

    >>> start(Circuit("known-feed", 1.0, 8.0), INERT, NOTHING + 1.0, members=3).ions_mmol[:, ROOT].shape
    (3, 10)
    """
    root = _members(np.asarray(root_mmol_l, dtype=float), members, 10)
    store = root if store_mmol_l is None else _members(np.asarray(store_mmol_l, dtype=float), members, 10)
    store_l = 0.0 if circuit.fed == ROOT else circuit.store_l
    water = np.tile([store_l, circuit.root_zone_l], (members, 1))
    ions = np.stack([store * store_l, root * circuit.root_zone_l], axis=1)
    state = State(water, ions, np.zeros((members, 5))).laid_out()
    if held is None or medium.inert:
        return state.reloaded(medium)
    fractions = np.asarray(held, dtype=float)
    charge = np.asarray(medium.capacity_meq, dtype=float)[..., None] * fractions / fractions.sum(-1, keepdims=True)
    return state._replace(exchanged_meq=_members(charge, members, 5))


@dataclass(frozen=True, slots=True)
class Hold:
    """Doses a fixed proportion whenever a linear reading of the solution falls below its set point.

    Reading = ``offset`` + ``slope`` (10,) . c; ``proportions`` (10,) or (M, 10) [mmol of each ion per unit dosed] must
    raise it; ``set_point`` scalar or (M,). ``cause``: "stock" or "acid". Made by ``hold_ec`` and ``hold_ph``.
    Raises ``ValueError`` where the proportion does not raise the reading.
    """

    cause: str
    proportions: Array
    slope: Array
    offset: float
    set_point: float | Array

    def __post_init__(self) -> None:
        if not np.all(self.proportions @ self.slope > 0):
            raise ValueError(f"{self.cause}: what is dosed does not move the reading towards its set point")

    def lacking(self, ions_mmol: Array, litres: Array) -> Array:
        """Reading times litres (M,) by which amounts (M, 10) [mmol] in water (M,) [L] fall short; never negative."""
        return np.maximum((self.set_point - self.offset) * litres - ions_mmol @ self.slope, 0.0)

    def needed(self, mmol_l: Array) -> Array:
        """Units to dose per litre (M,) that bring compositions (M, 10) [mmol/L] up to the set point; never negative."""
        return self.lacking(mmol_l, np.ones(mmol_l.shape[0])) / (self.proportions @ self.slope)


def hold_ec(set_point: float | Array, proportions: Array, ec: Linearised) -> Hold:
    """Hold EC [mS/cm at 25 C] by stock of given proportions (10,) [any scale]: how ratios drift while EC does not.

    ``ec``: ``fertui.chemistry.conductivity.linearise`` at a solution near the set point (1.5 ms; once a run is enough:
    while EC is held the line stays within 1 % of the full EC).
    """
    return Hold("stock", np.asarray(proportions, dtype=float), ec.slope, ec.ec - float(ec.slope @ ec.at), set_point)


def hold_ph(alkalinity_meq_l: float, acid: Array) -> Hold:
    """Hold pH by acid: alkalinity above the set point [meq/L] is taken away; ``acid`` (10,) ions per mmol of acid.

    The pH itself follows from alkalinity and CO2 of the open solution; 0.3-1.0 meq/L left is common practice.

    >>> nitric = NOTHING.copy(); nitric[5], nitric[9] = 1.0, -1.0
    >>> hold_ph(0.5, nitric).needed(np.array([[0, 0, 0, 0, 0, 0, 0, 0, 0, 3.0]]))
    array([2.5])
    """
    slope = NOTHING.copy()
    slope[-1] = -1.0
    return Hold("acid", np.asarray(acid, dtype=float), slope, 0.0, -alkalinity_meq_l)


class Drive(NamedTuple):
    """Rates over a stretch of time, all of the whole loop [L/d]; scalar or (M,), compositions (10,) or (M, 10).

    ``make_up_l_d`` None: automatic, replaces crop water, bleed and losses so that the store stays at its level.
    ``make_up`` [mmol/L]: the water that fills up (any source water, or a dated blend). ``condensate_l_d``: pure water
    returned to the tank. ``stock_mmol_d`` [mmol/d]: stock fed by logged litres (into the tank, or into the feed of a
    drain-blend loop); ``holds``: what is dosed by set point, in this order. ``feed_from``, ``feed_to`` [mmol/L]:
    known-feed at both ends of the stretch, linear between. ``light``: relative to the usual light sum.
    ``nitrification_per_d``: first-order, in the root zone. ``excursion_c``: root temperature less the usual one.
    """

    irrigation_l_d: float | Array = 0.0
    crop_l_d: float | Array = 0.0
    make_up: Array = NOTHING
    make_up_l_d: float | Array | None = None
    condensate_l_d: float | Array = 0.0
    stock_mmol_d: Array = NOTHING
    holds: tuple[Hold, ...] = ()
    ec: Linearised | None = None
    feed_from: Array = NOTHING
    feed_to: Array | None = None
    bleed_l_d: float | Array = 0.0
    light: float | Array = 1.0
    nitrification_per_d: float = 0.0
    excursion_c: float = 0.0

    def feed_at(self, when: float) -> Array:
        """Known feed [mmol/L] at a place of the stretch, 0 at its beginning and 1 at its end."""
        return self.feed_from if self.feed_to is None else self.feed_from + when * (self.feed_to - self.feed_from)

    def laid_out(self) -> Drive:
        """The same drive with members side by side in memory, as the state: mixed orders cost twice the time."""
        return self._replace(
            make_up=np.asfortranarray(self.make_up),
            stock_mmol_d=np.asfortranarray(self.stock_mmol_d),
            feed_from=np.asfortranarray(self.feed_from),
            feed_to=None if self.feed_to is None else np.asfortranarray(self.feed_to),
        )

    def part(self, first: float, last: float) -> Drive:
        """The drive of a part of the stretch, from place ``first`` to ``last`` (0-1)."""
        return self._replace(feed_from=self.feed_at(first), feed_to=self.feed_at(last))


class Event(NamedTuple):
    """Something that happens at one time: ``at`` [d from the start], booked under ``cause``.

    Additions (``dose``, ``acid``, ``stock``, ``make_up``, ``feed``): ``ions_mmol`` (10,) or (M, 10) and ``litres``.
    ``bleed``: ``litres`` of the solution at ``point`` go out (at most what is there); ``np.inf`` empties it.
    ``level``: the vessel at ``point`` is found to hold ``litres``; amounts stay, nothing is booked.
    ``point``: "tank", "drain_store" (the store), "drain", "root_zone" (the root zone). ``entry``: its number in the
    logbook.
    """

    at: float
    cause: str
    ions_mmol: Array = NOTHING
    litres: float | Array = 0.0
    point: str = "tank"
    reason: str = ""
    entry: int | None = None


def by_ion(rate: Array, composition: Array) -> Array:
    """Rate (M,) times composition (10,) or (M, 10), laid out with members side by side."""
    if composition.ndim == 1:
        return np.multiply.outer(composition, rate).T
    return rate[:, None] * np.asfortranarray(composition)


def _members(values: Array, members: int, width: int) -> Array:
    return np.asfortranarray(np.broadcast_to(values, (members, width)), dtype=float)
