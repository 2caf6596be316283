"""One stretch of time in one loop: water runs, the crop takes, stock is dosed, the medium exchanges.

Within a step the loop is linear and solved exactly (``transfer``): loss rates, retardation and doses are taken at the
middle of the step, which an implicit half step foresees. Then the exchanger is set into equilibrium. A step is as long
as the error it leaves allows.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from fertui.chemistry.ions import CATION_CHARGE, CHARGE, INDEX, Array
from fertui.loop.exchanger import capacity_of, equilibrated, intensity, nudged, retained
from fertui.loop.transfer import two_volumes
from fertui.loop.uptake import Plants, conductance
from fertui.loop.values import NOTHING, ROOT, STORE, Circuit, Drive, Hold, Medium, State
from fertui.loop.water import Flows, flows

CAUSES = ("make_up", "stock", "dose", "acid", "feed", "uptake", "exchange", "bleed", "drain", "unexplained")
"""Order of the cause axis of every account."""
CAUSE = {cause: position for position, cause in enumerate(CAUSES)}
WATERS = ("make_up", "feed", "irrigation", "crop", "drain", "bleed")
"""Order of the water axis of ``Fluxes.litres``."""

TOLERANCE = 0.04
"""Change of the losses over half a step, as a fraction of the amount they act on, that a step may have."""
LONGEST_STEP_D = 1.0
SHORTEST_STEP_D = 1.0 / 256.0
_LITTLE_L = 1e-6
_FLOOR_MMOL_L = 0.05
_NH4, _NO3, _ALK = INDEX["NH4"], INDEX["NO3"], INDEX["HCO3"]


@dataclass(frozen=True, slots=True)
class Fluxes:
    """What moved over a stretch: ``by_cause`` (M, causes, 10) [mmol], gains of the solution positive;

    ``overflow`` (M, 10) [mmol]: the part of ``bleed`` that ran over; ``litres`` (M, waters) [L].
    """

    by_cause: Array
    overflow: Array
    litres: Array

    def cause(self, name: str) -> Array:
        """Flux of one cause (M, 10) [mmol]."""
        return self.by_cause[:, CAUSE[name]]

    def __add__(self, other: Fluxes) -> Fluxes:
        return Fluxes(self.by_cause + other.by_cause, self.overflow + other.overflow, self.litres + other.litres)


def no_fluxes(members: int) -> Fluxes:
    """An account with nothing in it."""
    return Fluxes(np.zeros((members, len(CAUSES), 10)), np.zeros((members, 10)), np.zeros((members, len(WATERS))))


def advance(
    circuit: Circuit, medium: Medium, plants: Plants, state: State, drive: Drive, days: float
) -> tuple[State, Fluxes]:
    """The loop after ``days`` [d] under one drive, and what moved meanwhile.

    start + sum of fluxes = end for every member and ion to rounding; no amount but alkalinity becomes negative.

    >>> circuit = Circuit("shared-tank", 100.0, 500.0, store_l=2000.0)
    >>> plants = Plants(np.full(10, 1.0), np.full(10, 2.0), 300.0)
    >>> state = State(np.array([[2000.0, 500.0]]), np.full((1, 2, 10), 2000.0), np.zeros((1, 5)))
    >>> end, moved = advance(circuit, Medium(), plants, state, Drive(irrigation_l_d=2000.0, crop_l_d=300.0), 1.0)
    >>> bool(np.allclose(state.ions_mmol.sum(1) + moved.by_cause.sum(1), end.ions_mmol.sum(1), rtol=1e-12))
    True
    """
    total = no_fluxes(state.members)
    state = _hold_vessel(circuit, drive, state, total)
    done, length = 0.0, min(days, LONGEST_STEP_D)
    while done < days * (1.0 - 1e-12):
        length = (days - done) / np.ceil((days - done) / length - 1e-9)
        step = _step(circuit, medium, plants, drive, state, length, (done + 0.5 * length) / days)
        if isinstance(step, float):
            length = max(length * step, SHORTEST_STEP_D)
            continue
        state, fluxes, stretch = step
        total = total + fluxes
        done += length
        length = min(length * stretch, LONGEST_STEP_D)
    return state, total


@dataclass(frozen=True, slots=True)
class _Rates:
    """Linear coefficients of a step; see ``transfer``. ``entering`` by cause (M, 10) [mmol/d], ``k`` [L/d]."""

    p: Array
    q: Array
    r: Array
    w: Array
    k: Array
    s0: Array
    s1: Array
    entering: dict[str, Array]
    share: Array


def _step(
    circuit: Circuit, medium: Medium, plants: Plants, drive: Drive, state: State, days: float, when: float
) -> tuple[State, Fluxes, float] | float:
    """One step, or the factor by which it must be shorter.

    ``when``: place of its middle in the stretch of the drive, 0-1.
    """
    water_flows = flows(circuit, drive, state.water_l, days, _store_share(circuit, drive, state.concentration(STORE)))
    middle_l = np.maximum(state.water_l + 0.5 * days * water_flows.change, _LITTLE_L)
    x0, x1 = state.ions_mmol[:, STORE], _with_sites(state)
    first = _Retardation.of(medium, state.concentration(ROOT), middle_l[:, ROOT])
    feed = drive.feed_at(when)
    early = _rates(
        circuit,
        plants,
        drive,
        water_flows,
        middle_l,
        state.concentration(STORE),
        state.concentration(ROOT),
        first,
        feed,
    )
    y0, y1 = _implicit(early, x0, x1, 0.5 * days)
    second = first.moved(medium, y1, middle_l[:, ROOT])
    c0, c1 = y0 / middle_l[:, STORE, None], y1 / second.volume
    dosed, c0, c1 = _foreseen_doses(circuit, drive, c0, c1, middle_l, 0.5 * days)
    if circuit.premix_ec is not None:
        water_flows = flows(circuit, drive, state.water_l, days, _store_share(circuit, drive, c0))
    rates = _rates(circuit, plants, drive, water_flows, middle_l, c0, c1, second, feed, dosed)
    error = _error(early, rates, y1, middle_l[:, ROOT], days)
    if error > TOLERANCE and days > SHORTEST_STEP_D:
        return max(0.1, 0.9 * np.sqrt(TOLERANCE / error))
    end, fluxes = _closed(circuit, medium, plants, drive, state, water_flows, rates, second, middle_l, days)
    return end, fluxes, min(4.0, 0.9 * np.sqrt(TOLERANCE / max(error, 1e-9)))


@dataclass(frozen=True, slots=True)
class _Retardation:
    """``volume`` (M, 10) [L]: water that would hold a cation's whole amount, sites included, at its concentration."""

    log_s: Array | None
    volume: Array

    @classmethod
    def of(cls, medium: Medium, root_mmol_l: Array, water_l: Array) -> _Retardation:
        log_s = None if medium.inert else intensity(root_mmol_l[:, :5], medium.selectivity)
        return cls._at(medium, log_s, water_l)

    def moved(self, medium: Medium, total_mmol: Array, water_l: Array) -> _Retardation:
        if self.log_s is None:
            return self
        capacity = capacity_of(medium, water_l.size)
        return self._at(medium, nudged(self.log_s, total_mmol[:, :5], water_l, capacity, medium.selectivity), water_l)

    @classmethod
    def _at(cls, medium: Medium, log_s: Array | None, water_l: Array) -> _Retardation:
        volume = np.repeat(water_l[:, None], 10, axis=1)
        if log_s is not None:
            capacity = capacity_of(medium, water_l.size)
            volume[:, :5] *= 1.0 + retained(log_s, water_l, capacity, medium.selectivity)
        return cls(log_s, volume)


def _with_sites(state: State) -> Array:
    """Root-zone amounts [mmol] (M, 10), what sites hold included."""
    amounts = state.ions_mmol[:, ROOT].copy()
    amounts[:, :5] += state.equivalents_held()
    return amounts


def _rates(
    circuit: Circuit, plants: Plants, drive: Drive, water: Flows, middle_l: Array, store: Array, root: Array,
    retardation: _Retardation, feed: Array, dosed: dict[str, Array] | None = None,
) -> _Rates:  # fmt: skip
    """Coefficients of the linear step at given concentrations (M, 10) of store and root zone."""
    k = conductance(plants, root, water.crop, drive.light, drive.excursion_c)
    c_min = plants.kinetics.c_min
    entering = _entering(circuit, drive, water, store, feed)
    for cause, rate in (dosed or {}).items():
        entering[cause] = entering.get(cause, NOTHING) + rate
    into_store = circuit.fed == STORE and circuit.layout == "shared-tank"
    sources = sum(entering.values(), np.zeros_like(root))
    taken_charge = (k * np.maximum(root - c_min, 0.0))[:, :-1] @ CHARGE[:-1]
    s1 = k * c_min + (0.0 if into_store else sources)
    s1[:, _ALK] -= taken_charge
    out = k + water.lost_root[:, None]
    out[:, _NH4] += drive.nitrification_per_d * middle_l[:, ROOT]
    back, volume = water.back[:, None], middle_l[:, STORE, None]
    return _Rates(
        p=(water.to_root + water.lost_store)[:, None] / volume, q=back / retardation.volume,
        r=water.to_root[:, None] / volume, w=(back + out) / retardation.volume, k=k,
        s0=sources if into_store else np.zeros_like(root), s1=s1, entering=entering, share=water.to_root,
    )  # fmt: skip


def _entering(circuit: Circuit, drive: Drive, water: Flows, store: Array, feed: Array) -> dict[str, Array]:
    """What enters the loop [mmol/d] (M, 10) by cause at given store concentrations (M, 10)."""
    if circuit.layout == "known-feed":
        return {"feed": water.feed[:, None] * feed}
    fresh = (water.fresh_store + water.fresh_root)[:, None] * drive.make_up
    entering = {"make_up": fresh, "stock": np.broadcast_to(drive.stock_mmol_d, fresh.shape)}
    if circuit.layout == "drain-blend" and drive.holds:
        litres = np.maximum(water.to_root + water.fresh_root, _LITTLE_L)[:, None]
        blend = (water.to_root[:, None] * store + fresh + entering["stock"]) / litres
        for cause, per_litre in _doses(drive.holds, blend).items():
            entering[cause] = entering.get(cause, 0.0) + per_litre * litres
    return entering


def _doses(holds: tuple[Hold, ...], mmol_l: Array) -> dict[str, Array]:
    """Doses per litre [mmol/L] (M, 10) by cause that bring compositions (M, 10) to their set points, one after another."""
    doses: dict[str, Array] = {}
    for hold in holds:
        added = hold.needed(mmol_l)[:, None] * hold.proportions
        doses[hold.cause] = doses.get(hold.cause, 0.0) + added
        mmol_l = mmol_l + added
    return doses


def _foreseen_doses(
    circuit: Circuit, drive: Drive, store: Array, root: Array, middle_l: Array, days: float
) -> tuple[dict[str, Array], Array, Array]:
    """Rates [mmol/d] at which a held tank is dosed, from what it lacks half a step ahead; and the corrected middle."""
    if not drive.holds or circuit.layout != "shared-tank":
        return {}, store, root
    vessel = root if circuit.mixed else store
    litres = middle_l[:, circuit.fed, None]
    doses = _doses(drive.holds, vessel)
    corrected = vessel + sum(doses.values())
    rates = {cause: per_litre * litres / days for cause, per_litre in doses.items()}
    return (rates, store, corrected) if circuit.mixed else (rates, corrected, root)


def _hold_vessel(circuit: Circuit, drive: Drive, state: State, total: Fluxes) -> State:
    """Bring a held tank to its set points at once; books into ``total``."""
    if not drive.holds or circuit.layout != "shared-tank":
        return state
    ions = state.ions_mmol.copy()
    litres = state.water_l[:, circuit.fed, None]
    for cause, per_litre in _doses(drive.holds, state.concentration(circuit.fed)).items():
        ions[:, circuit.fed] += per_litre * litres
        total.by_cause[:, CAUSE[cause]] += per_litre * litres
    return replace(state, ions_mmol=ions)


def _store_share(circuit: Circuit, drive: Drive, store: Array) -> Array | None:
    """Share of store water in the feed (M,); None: what keeps the store at its level."""
    if circuit.drain_share is not None:
        return np.full(store.shape[0], circuit.drain_share)
    if circuit.premix_ec is None:
        return None
    if drive.ec is None:
        raise ValueError("a pre-mix EC needs Drive.ec, the EC of a composition")
    fresh, drained = drive.ec(np.broadcast_to(drive.make_up, store.shape)), drive.ec(store)
    apart = drained - fresh
    share = (circuit.premix_ec - fresh) / np.where(apart > 0, apart, 1.0)
    return np.where(apart > 0, np.clip(share, 0.0, 1.0), 1.0)


def _implicit(rates: _Rates, x0: Array, x1: Array, days: float) -> tuple[Array, Array]:
    """Implicit Euler step of both volumes: first order, positive, cheap."""
    a, b = 1.0 + days * rates.p, 1.0 + days * rates.w
    from0, from1 = x0 + days * rates.s0, x1 + days * rates.s1
    determinant = a * b - days * days * rates.q * rates.r
    return (
        (from0 * b + days * rates.q * from1) / determinant,
        (from1 * a + days * rates.r * from0) / determinant,
    )


def _error(early: _Rates, late: _Rates, amounts: Array, water_l: Array, days: float) -> float:
    """Relative change that the change of loss rates over half a step makes; root mean square over members."""
    changed = days * np.abs(late.w - early.w) * amounts / (np.abs(amounts) + _FLOOR_MMOL_L * water_l[:, None])
    worst = changed[:, :-1].max(axis=1)
    return float(np.sqrt(np.mean(worst * worst)))


def _closed(
    circuit: Circuit, medium: Medium, plants: Plants, drive: Drive, state: State, water: Flows, rates: _Rates,
    retardation: _Retardation, middle_l: Array, days: float,
) -> tuple[State, Fluxes]:  # fmt: skip
    """Exact linear step, exchange, and every flux by its cause."""
    x0, x1 = state.ions_mmol[:, STORE], _with_sites(state)
    end0, end1, stay0, stay1 = two_volumes(
        x0, x1, rates.p, rates.q, rates.r, rates.w, rates.s0, rates.s1, days
    )  # fmt: skip
    in_water = stay1 / retardation.volume
    fluxes = no_fluxes(state.members)
    book = fluxes.by_cause
    for cause, rate in rates.entering.items():
        book[:, CAUSE[cause]] = rate * days
    entered = book.sum(axis=1)
    from_store = water.lost_store[:, None] * stay0 / middle_l[:, STORE, None]
    from_root = water.lost_root[:, None] * in_water
    taken = (x0 - end0) + (x1 - end1) + entered - from_store - from_root
    taken[:, _ALK] = 0.0
    _nitrify(drive, in_water * middle_l[:, ROOT, None], end1, taken)
    taken[:, _ALK] += taken[:, :-1] @ CHARGE[:-1]
    end1[:, _ALK] = x1[:, _ALK] + (x0 - end0)[:, _ALK] + (entered - from_store - from_root - taken)[:, _ALK]
    book[:, CAUSE["uptake"]] = -taken
    book[:, CAUSE["bleed"]] = -from_store
    book[:, CAUSE["drain" if circuit.layout == "known-feed" else "bleed"]] -= from_root
    water_l = np.maximum(state.water_l + days * water.change, 0.0)
    held = _exchange(medium, state, end1, water_l[:, ROOT], book)
    ended = State(water_l, np.stack([end0, end1], axis=1), held)
    _book_water(water, days, from_store + from_root, fluxes)
    return _hold_vessel(circuit, drive, ended, fluxes), fluxes


def _nitrify(drive: Drive, litre_days: Array, end1: Array, taken: Array) -> None:
    """Ammonium that nitrified comes back as nitrate; it stands in the account with what was taken up."""
    if drive.nitrification_per_d:
        nitrified = drive.nitrification_per_d * litre_days[:, _NH4]
        end1[:, _NO3] += nitrified
        taken[:, _NO3] -= nitrified


def _exchange(medium: Medium, state: State, end1: Array, root_l: Array, book: Array) -> Array:
    """Equilibrium at the end of a step: splits ``end1`` into water (in place) and sites (returned) [meq]."""
    if medium.inert:
        return state.exchanged_meq
    in_water, held = equilibrated(medium, np.maximum(end1[:, :5], 0.0), root_l)
    released = (state.exchanged_meq - held) / CATION_CHARGE
    hydrogen = (released @ CATION_CHARGE)[:, None]
    end1[:, :5] = in_water
    end1[:, _ALK] += hydrogen[:, 0]
    book[:, CAUSE["exchange"], :5] = released
    book[:, CAUSE["exchange"], _ALK] = hydrogen[:, 0]
    return held


def _book_water(water: Flows, days: float, lost: Array, fluxes: Fluxes) -> None:
    leaving = water.lost_store + water.lost_root
    run_over = np.where(leaving > 0, water.overflow / np.where(leaving > 0, leaving, 1.0), 0.0)
    fluxes.overflow[:] = -run_over[:, None] * lost
    into_root = water.to_root + water.feed + np.where(water.fresh_store > 0, 0.0, water.fresh_root)
    drained = water.back + np.where(water.feed > 0, water.lost_root, 0.0)
    bled = np.where(water.feed > 0, 0.0, leaving)
    fresh = water.fresh_store + water.fresh_root
    fluxes.litres[:] = days * np.stack([fresh, water.feed, into_root, water.crop, drained, bled], axis=1)


def feed_composition(circuit: Circuit, drive: Drive, state: State, when: float = 0.0) -> Array:
    """Composition [mmol/L] (M, 10) that reaches the root zone: store water or known feed, blended and dosed.

    ``when``: place in the stretch of the drive (0-1), for a known feed that changes along it.
    """
    if circuit.layout == "known-feed":
        return np.broadcast_to(drive.feed_at(when), (state.members, 10)).astype(float)
    store = state.concentration(circuit.fed)
    if circuit.layout == "shared-tank":
        return store
    water = flows(circuit, drive, state.water_l, LONGEST_STEP_D, _store_share(circuit, drive, store))
    litres = np.maximum(water.to_root + water.fresh_root, _LITTLE_L)[:, None]
    entering = _entering(circuit, drive, water, store, drive.feed_from)
    return (water.to_root[:, None] * store + sum(entering.values())) / litres
