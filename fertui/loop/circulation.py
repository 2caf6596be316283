"""One stretch of time in one loop: water runs, the crop takes, stock is dosed, the medium exchanges.

Within a step the loop is linear and solved exactly (``transfer``): loss rates, retardation and doses are taken at the
middle of the step, which an implicit half step foresees. Then the exchanger is set into equilibrium. A step is as long
as the error it leaves allows.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import CATION_CHARGE, CHARGE, INDEX, Array
from fertui.loop.exchanger import capacity_of, equilibrated, intensity, nudged, retained
from fertui.loop.fluxes import CAUSE, Fluxes, no_fluxes
from fertui.loop.transfer import Pair, Response, Transfer, alone, half_implicit, implicit_alone, transfer
from fertui.loop.uptake import Plants, conductance, demand
from fertui.loop.values import DRY_L, ROOT, STORE, Circuit, Drive, Hold, Medium, State, by_ion
from fertui.loop.water import Flows, flows

TOLERANCE = 0.003
"""Relative error estimate that one step may have; keeps 28 days within 0.5 % of a stiff solver on all layouts."""
LONGEST_STEP_D = 1.0
SHORTEST_STEP_D = 1.0 / 24.0
"""An hour: uptake is coupled to the water of the day, so that shorter steps would say nothing more."""
_FLOOR_MMOL_L = 0.05
_EVERY_ION: Array = np.ones(10)
_NH4, _NO3, _ALK = INDEX["NH4"], INDEX["NO3"], INDEX["HCO3"]


def advance(
    circuit: Circuit,
    medium: Medium,
    plants: Plants,
    state: State,
    drive: Drive,
    days: float,
    tolerance: float = TOLERANCE,
) -> tuple[State, Fluxes]:
    """The loop after ``days`` [d] under one drive, and what moved meanwhile.

    ``tolerance``: relative error a step may have; an ensemble whose noise is far larger may
    ask for less than the default.

    start + sum of fluxes = end for every member and ion to rounding; no amount but alkalinity becomes negative.

    >>> circuit = Circuit("shared-tank", 100.0, 500.0, store_l=2000.0)
    >>> plants = Plants(np.full(10, 1.0), np.full(10, 2.0), 300.0)
    >>> state = State(np.array([[2000.0, 500.0]]), np.full((1, 2, 10), 2000.0), np.zeros((1, 5)))
    >>> end, moved = advance(circuit, Medium(), plants, state, Drive(irrigation_l_d=2000.0, crop_l_d=300.0), 1.0)
    >>> bool(np.allclose(state.ions_mmol.sum(1) + moved.by_cause.sum(1), end.ions_mmol.sum(1), rtol=1e-12))
    True
    """
    drive = drive.laid_out()
    state, total = _hold_vessel(circuit, drive, state.laid_out())
    done, length = 0.0, min(days, LONGEST_STEP_D)
    while done < days * (1.0 - 1e-12):
        length = (days - done) / np.ceil((days - done) / length - 1e-9)
        step = _step(circuit, medium, plants, drive, state, length, (done + 0.5 * length) / days, tolerance)
        if isinstance(step, float):
            length = max(length * step, SHORTEST_STEP_D)
            continue
        state, fluxes, stretch = step
        total = fluxes if total is None else total + fluxes
        done += length
        length = min(max(length * stretch, SHORTEST_STEP_D), LONGEST_STEP_D)
    return state, total or no_fluxes(state.members)


class _Rates(NamedTuple):
    """Linear coefficients of a step; see ``transfer``. ``entering`` by cause (M, 10) [mmol/d].

    ``lost_store``, ``lost_root``, ``nitrified``: rates [1/d] at which amounts leave the loop or turn into nitrate;
    ``charge_foreseen`` (M,): charge taken up [meq/d], already among the sources.
    """

    p: Array
    q: Array
    r: Array
    w: Array
    s0: Array
    s1: Array
    entering: dict[str, Array]
    lost_store: Array
    lost_root: Array
    nitrified: Array
    charge_foreseen: Array


def _step(
    circuit: Circuit,
    medium: Medium,
    plants: Plants,
    drive: Drive,
    state: State,
    days: float,
    when: float,
    tolerance: float,
) -> tuple[State, Fluxes, float] | float:
    """One step, or the factor by which it must be shorter.

    ``when``: place of its middle in the stretch of the drive, 0-1.
    """
    store, root = state.concentration(STORE), state.concentration(ROOT)
    water = flows(circuit, drive, state.water_l, days, _store_share(circuit, drive, store))
    middle_l = np.maximum(state.water_l + 0.5 * days * water.change, DRY_L)
    retardation = _Retardation.of(medium, root, middle_l[:, ROOT])
    x, feed = (state.ions_mmol[:, STORE], _with_sites(medium, state)), drive.feed_at(when)
    wanted = demand(plants, water.crop, drive.light, drive.excursion_c)
    early = _rates(circuit, plants, wanted, drive, water, middle_l, store, root, retardation, feed)
    y = _half_way(circuit, drive, early, x, middle_l, 0.5 * days)
    retardation = retardation.moved(medium, y[1], middle_l[:, ROOT])
    store, root = y[0] / middle_l[:, STORE, None], y[1] / retardation.volume
    if circuit.premix_ec is not None:
        water = flows(circuit, drive, state.water_l, days, _store_share(circuit, drive, store))
    late = _rates(circuit, plants, wanted, drive, water, middle_l, store, root, retardation, feed)
    error = _error(early, late, y[1], middle_l[:, ROOT], days)
    if error > tolerance and days > SHORTEST_STEP_D * (1.0 + 1e-6):
        return max(0.1, 0.9 * np.sqrt(tolerance / error))
    end, fluxes = _closed(circuit, medium, drive, state, x, water, late, retardation, middle_l, days)
    return end, fluxes, min(4.0, 0.9 * np.sqrt(tolerance / max(error, 1e-9)))


def _half_way(circuit: Circuit, drive: Drive, rates: _Rates, x: Pair, middle_l: Array, days: float) -> Pair:
    """Amounts half a step ahead, by an implicit step, with the doses that a held tank takes meanwhile."""
    if circuit.fed == ROOT:
        response = implicit_alone(rates.w, days)
    else:
        response = half_implicit(rates.p, rates.q, rates.r, rates.w, days)
    y = response((x[0] + days * rates.s0, x[1] + days * rates.s1))
    for _, rate in _tank_doses(circuit, drive, y, response, middle_l):
        y = _added(y, _dosed(circuit, response, rate))
    return y


class _Retardation(NamedTuple):
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
        volume = by_ion(water_l, _EVERY_ION)
        if log_s is not None:
            capacity = capacity_of(medium, water_l.size)
            volume[:, :5] *= 1.0 + retained(log_s, water_l, capacity, medium.selectivity)
        return cls(log_s, volume)


def _with_sites(medium: Medium, state: State) -> Array:
    """Root-zone amounts [mmol] (M, 10), what sites hold included."""
    if medium.inert:
        return state.ions_mmol[:, ROOT]
    amounts = state.ions_mmol[:, ROOT].copy(order="K")
    amounts[:, :5] += state.equivalents_held()
    return amounts


def _rates(
    circuit: Circuit, plants: Plants, wanted: Array, drive: Drive, water: Flows, middle_l: Array, store: Array,
    root: Array, retardation: _Retardation, feed: Array,
) -> _Rates:  # fmt: skip
    """Coefficients of the linear step at given concentrations (M, 10) of store and root zone."""
    k = conductance(plants, wanted, root)
    c_min = plants.kinetics.c_min
    entering = _entering(circuit, drive, water, store, feed)
    sources = sum(entering.values(), np.zeros_like(root))
    charge = (k * np.maximum(root - c_min, 0.0))[:, :-1] @ CHARGE[:-1]
    into_tank = circuit.layout == "shared-tank" and not circuit.mixed
    s1 = k * c_min if into_tank else k * c_min + sources
    s1[:, _ALK] -= charge
    per_store, per_root = 1.0 / middle_l[:, STORE, None], 1.0 / retardation.volume
    to_root, back, lost_root = (flow[:, None] for flow in (water.to_root, water.back, water.lost_root))
    nitrified = drive.nitrification_per_d * middle_l[:, ROOT] * per_root[:, _NH4]
    w = (back + lost_root + k) * per_root
    w[:, _NH4] += nitrified
    return _Rates(
        p=(to_root + water.lost_store[:, None]) * per_store, q=back * per_root, r=to_root * per_store, w=w,
        s0=sources if into_tank else np.zeros_like(root), s1=s1, entering=entering,
        lost_store=water.lost_store[:, None] * per_store, lost_root=lost_root * per_root, nitrified=nitrified,
        charge_foreseen=charge,
    )  # fmt: skip


def _entering(circuit: Circuit, drive: Drive, water: Flows, store: Array, feed: Array) -> dict[str, Array]:
    """What enters the loop [mmol/d] (M, 10) by cause at given store concentrations (M, 10)."""
    if circuit.layout == "known-feed":
        return {"feed": by_ion(water.feed, feed)}
    fresh = by_ion(water.fresh_store + water.fresh_root, drive.make_up)
    entering = {"make_up": fresh, "stock": np.broadcast_to(drive.stock_mmol_d, fresh.shape)}
    if circuit.layout == "drain-blend" and drive.holds:
        litres = np.maximum(water.to_root + water.fresh_root, DRY_L)[:, None]
        blend = (water.to_root[:, None] * store + fresh + entering["stock"]) / litres
        for cause, per_litre in _doses(drive.holds, blend).items():
            entering[cause] = entering.get(cause, 0.0) + per_litre * litres
    return entering


def _doses(holds: tuple[Hold, ...], mmol_l: Array) -> dict[str, Array]:
    """Doses per litre [mmol/L] (M, 10) by cause that bring compositions to their set points, one after another."""
    doses: dict[str, Array] = {}
    for hold in holds:
        added = by_ion(hold.needed(mmol_l), hold.proportions)
        doses[hold.cause] = doses.get(hold.cause, 0.0) + added
        mmol_l = mmol_l + added
    return doses


def _tank_doses(
    circuit: Circuit, drive: Drive, end: Pair, response: Response, water_l: Array
) -> Iterator[tuple[str, Array]]:
    """Cause and steady rate (M, 10) of each hold that brings a tank to its set point at the end of a stretch.

    ``end``: amounts there without doses; ``response`` of the amounts at the end to a rate.
    """
    if circuit.layout != "shared-tank":
        return
    own = response.f11 if circuit.mixed else response.f00
    held, litres = end[circuit.fed], water_l[:, circuit.fed]
    for hold in drive.holds:
        lacking = hold.lacking(held, litres)
        rate = by_ion(lacking / ((own * hold.proportions) @ hold.slope), hold.proportions)
        held = held + own * rate
        yield hold.cause, rate


def _dosed(circuit: Circuit, response: Response, rate: Array) -> Pair:
    """What a rate (M, 10) into the tank makes of both volumes at the end of a stretch."""
    return (response.f01 * rate, response.f11 * rate) if circuit.mixed else (response.f00 * rate, response.f10 * rate)


def _added(y: Pair, more: Pair) -> Pair:
    return y[0] + more[0], y[1] + more[1]


def _hold_vessel(circuit: Circuit, drive: Drive, state: State) -> tuple[State, Fluxes | None]:
    """Bring a held tank to its set points at once; None where nothing had to be dosed."""
    if circuit.layout != "shared-tank":
        return state, None
    doses = _doses(drive.holds, state.concentration(circuit.fed))
    if not any(per_litre.any() for per_litre in doses.values()):
        return state, None
    fluxes, ions = no_fluxes(state.members), state.ions_mmol.copy(order="K")
    for cause, per_litre in doses.items():
        amount = per_litre * state.water_l[:, circuit.fed, None]
        ions[:, circuit.fed] += amount
        fluxes.by_cause[:, CAUSE[cause]] = amount
    return state._replace(ions_mmol=ions), fluxes


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


def _error(early: _Rates, late: _Rates, amounts: Array, water_l: Array, days: float) -> float:
    """What the change of loss rates within the step may leave as relative error; root mean square over members.

    Loss rates that change over half a step shift an amount by ``shift``; taking them at the middle leaves the part of
    it that the amount itself turns over meanwhile. Below ``_FLOOR_MMOL_L`` errors count absolutely.
    """
    turnover = days * late.w / (1.0 + days * late.w)
    shift = np.abs(late.w - early.w) * amounts * days / (1.0 + days * late.w)
    left = shift * turnover / (np.abs(amounts) + _FLOOR_MMOL_L * water_l[:, None])
    worst = left[:, :-1].max(axis=1)
    return float(np.sqrt(np.mean(worst * worst)))


def _closed(
    circuit: Circuit, medium: Medium, drive: Drive, state: State, x: Pair, water: Flows, rates: _Rates,
    retardation: _Retardation, middle_l: Array, days: float,
) -> tuple[State, Fluxes]:  # fmt: skip
    """Exact linear step, exchange, and every flux by its cause."""
    fluxes = no_fluxes(state.members)
    book = fluxes.by_cause
    for cause, rate in rates.entering.items():
        book[:, CAUSE[cause]] = rate * days
    water_l = np.maximum(state.water_l + days * water.change, 0.0)
    one_volume = circuit.fed == ROOT
    move = alone(rates.w, days) if one_volume else transfer(rates.p, rates.q, rates.r, rates.w, days)
    end, stay = move.end(x, (rates.s0, rates.s1)), move.integral(x, (rates.s0, rates.s1))
    for cause, rate in _tank_doses(circuit, drive, end, move.gained, water_l):
        book[:, CAUSE[cause]] += rate * days
        end, stay = _added(end, _dosed(circuit, move.gained, rate)), _added(stay, _dosed(circuit, move.ramp, rate))
    _nitrify(drive, move, rates, end, stay)
    entered = book.sum(axis=1)
    _balance_charge(move, rates, x, end, stay, entered)
    from_store = rates.lost_store * stay[0]
    from_root = rates.lost_root * stay[1]
    book[:, CAUSE["uptake"]] = (end[0] - x[0]) + (end[1] - x[1]) - entered + from_store + from_root
    book[:, CAUSE["bleed"]] = -from_store
    book[:, CAUSE["drain" if circuit.layout == "known-feed" else "bleed"]] -= from_root
    held = _exchange(medium, state, end[1], water_l[:, ROOT], retardation, book)
    _book_water(water, days, from_store + from_root, fluxes)
    return State(water_l, np.stack(end, axis=1), held), fluxes


def _nitrify(drive: Drive, move: Transfer, rates: _Rates, end: Pair, stay: Pair) -> None:
    """Ammonium that nitrified comes back as nitrate; in the account it stands with what was taken up."""
    if drive.nitrification_per_d:
        _return(move, end, stay, _NO3, rates.nitrified * stay[1][:, _NH4] / move.days)


def _balance_charge(move: Transfer, rates: _Rates, x: Pair, end: Pair, stay: Pair, entered: Array) -> None:
    """Set alkalinity right: the charge that was taken up instead of the one foreseen when the step began."""
    lost = rates.lost_store * stay[0] + rates.lost_root * stay[1]
    taken = (x[0] - end[0]) + (x[1] - end[1]) + entered - lost
    _return(move, end, stay, _ALK, rates.charge_foreseen - taken[:, :-1] @ CHARGE[:-1] / move.days)


def _return(move: Transfer, end: Pair, stay: Pair, ion: int, rate: Array) -> None:
    """A steady source (M,) [mmol/d] of one ion in the root zone, added to a step already taken; in place."""
    for amounts, response in ((end, move.gained), (stay, move.ramp)):
        amounts[0][:, ion] += response.f01[:, ion] * rate
        amounts[1][:, ion] += response.f11[:, ion] * rate


def _exchange(
    medium: Medium, state: State, end1: Array, root_l: Array, retardation: _Retardation, book: Array
) -> Array:
    """Equilibrium at the end of a step: splits ``end1`` into water (in place) and sites (returned) [meq]."""
    if medium.inert:
        return state.exchanged_meq
    in_water, held = equilibrated(medium, np.maximum(end1[:, :5], 0.0), root_l, retardation.log_s)
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
    rows = (fresh, water.feed, into_root, water.crop, drained, bled, water.overflow)
    fluxes.litres[:] = days * np.stack(rows, axis=1)


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
    litres = np.maximum(water.to_root + water.fresh_root, DRY_L)[:, None]
    entering = _entering(circuit, drive, water, store, drive.feed_from)
    return (water.to_root[:, None] * store + sum(entering.values())) / litres
