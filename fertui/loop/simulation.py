"""A loop through time: drives that hold over stretches, events at their own times, states where they are asked for."""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import Array
from fertui.loop.account import Account, Booking, booking, summed
from fertui.loop.circulation import TOLERANCE, advance, feed_composition
from fertui.loop.fluxes import CAUSE, WATERS, Fluxes, no_fluxes
from fertui.loop.uptake import Plants
from fertui.loop.values import ROOT, STORE, Circuit, Drive, Event, Medium, State

_POINTS = {"tank": STORE, "drain_store": STORE, "drain": ROOT, "root_zone": ROOT}


@dataclass(frozen=True, slots=True)
class Timeline:
    """``drives``: pairs (from [d], drive) in order of time, each in force until the next; ``events`` in any order.

    Raises ``ValueError`` for drives out of order or none at all.
    """

    drives: tuple[tuple[float, Drive], ...]
    events: tuple[Event, ...] = ()

    def __post_init__(self) -> None:
        begins = [begin for begin, _ in self.drives]
        if not begins or sorted(begins) != begins:
            raise ValueError("a timeline needs at least one drive, and its drives in order of time")

    def between(self, now: float, until: float, horizon: float) -> Drive:
        """The drive in force from ``now`` to ``until`` [d]; its known feed runs to the next drive, or the horizon."""
        begins = [begin for begin, _ in self.drives]
        position = max(bisect_right(begins, now) - 1, 0)
        begin, drive = self.drives[position]
        if drive.feed_to is None:
            return drive
        length = (begins[position + 1] if position + 1 < len(begins) else horizon) - begin
        return drive.part((now - begin) / length, (until - begin) / length) if length > 0 else drive


class Trajectory(NamedTuple):
    """``times`` [d] in order, the state and the feed [mmol/L] (M, 10) at each, and the account of all that moved.

    ``fluxes``: totals per member over the whole run; ``bookings``: ensemble means piece by piece, in order;
    ``marks``: how many of them came before each of ``times``.
    """

    times: tuple[float, ...]
    states: tuple[State, ...]
    feeds: tuple[Array, ...]
    fluxes: Fluxes
    bookings: tuple[Booking, ...]
    marks: tuple[int, ...]

    @property
    def end(self) -> State:
        """State at the last time."""
        return self.states[-1]

    def concentrations(self, compartment: int) -> Array:
        """Concentrations [mmol/L] (times, M, 10) of one compartment; the root zone's is also the drain's."""
        return np.stack([state.concentration(compartment) for state in self.states])

    def account(self, begin: float | None = None, end: float | None = None) -> Account:
        """Account between two of ``times`` (default: the whole run). Raises ``ValueError`` for another time."""
        first, last = self._position(begin, 0), self._position(end, len(self.times) - 1)
        start, final = (self.states[position].ions_mmol.sum(axis=1).mean(axis=0) for position in (first, last))
        lines = self.bookings[self.marks[first] : self.marks[last]]
        return summed(self.times[first], self.times[last], start, final, lines)

    def _position(self, time: float | None, otherwise: int) -> int:
        if time is None:
            return otherwise
        if time not in self.times:
            raise ValueError(f"no state was asked for at {time:g} d; put it in report_at")
        return self.times.index(time)


def apply(circuit: Circuit, medium: Medium, state: State, event: Event) -> tuple[State, Fluxes]:
    """The loop right after an event, and what it moved.

    Additions go into solution; a bleed takes what is there at most; ``level`` sets water and leaves amounts.
    Raises ``ValueError`` for an unknown point or a cause that is none of an event.
    """
    if event.point not in _POINTS:
        raise ValueError(f"point {event.point!r} is not one of {', '.join(_POINTS)}")
    where = circuit.fed if event.point == "tank" or circuit.mixed else _POINTS[event.point]
    if event.cause == "bleed":
        return _bled(state, event, where)
    if event.cause == "level":
        return _levelled(state, event, where), no_fluxes(state.members)
    if event.cause not in ("make_up", "stock", "dose", "acid", "feed"):
        raise ValueError(f"cause {event.cause!r}: an event is make_up, stock, dose, acid, feed, bleed or level")
    return _added(circuit, state, event, where)


def _added(circuit: Circuit, state: State, event: Event, where: int) -> tuple[State, Fluxes]:
    fluxes = no_fluxes(state.members)
    water, ions = state.water_l.copy(order="K"), state.ions_mmol.copy(order="K")
    ions[:, where] += event.ions_mmol
    water[:, where] += event.litres
    fluxes.by_cause[:, CAUSE[event.cause]] = event.ions_mmol
    if event.cause == "make_up":
        fluxes.litres[:, WATERS.index("make_up")] = event.litres
    return _spilled(circuit, state._replace(water_l=water, ions_mmol=ions), where, fluxes), fluxes


def _spilled(circuit: Circuit, state: State, where: int, fluxes: Fluxes) -> State:
    """What an addition makes run over leaves mixed, as overflow."""
    most = max(circuit.store_max_l, circuit.root_zone_l) if where == circuit.fed == ROOT else circuit.store_max_l
    surplus = state.water_l[:, where] - most
    if (where == ROOT and circuit.fed != ROOT) or not np.any(surplus > 0):
        return state
    ended, out = _bled(state, Event(0.0, "bleed", litres=np.maximum(surplus, 0.0)), where)
    fluxes.by_cause[:] += out.by_cause
    fluxes.litres[:] += out.litres
    fluxes.litres[:, WATERS.index("overflow")] += out.litres[:, WATERS.index("bleed")]
    fluxes.overflow[:] += out.cause("bleed")
    return ended


def _bled(state: State, event: Event, where: int) -> tuple[State, Fluxes]:
    held = state.water_l[:, where]
    litres = np.minimum(np.maximum(event.litres, 0.0), held)
    share = np.where(held > 0, litres / np.where(held > 0, held, 1.0), 0.0)
    out = share[:, None] * state.ions_mmol[:, where]
    water, ions = state.water_l.copy(order="K"), state.ions_mmol.copy(order="K")
    water[:, where] = held - litres
    ions[:, where] -= out
    fluxes = no_fluxes(state.members)
    fluxes.by_cause[:, CAUSE["bleed"]] = -out
    fluxes.litres[:, WATERS.index("bleed")] = litres
    return state._replace(water_l=water, ions_mmol=ions), fluxes


def _levelled(state: State, event: Event, where: int) -> State:
    water = state.water_l.copy(order="K")
    water[:, where] = event.litres
    return state._replace(water_l=water)


def simulate(
    circuit: Circuit,
    medium: Medium,
    plants: Plants,
    state: State,
    timeline: Timeline,
    report_at: Sequence[float],
    begin: float = 0.0,
    tolerance: float = TOLERANCE,
) -> Trajectory:
    """Run a loop from ``begin`` [d] to the last of ``report_at`` [d]; a state is given at each, events included.

    Events happen at their own times, in the order given where times are equal. A period of the account begins and
    ends at times of ``report_at`` (or ``begin``). No step crosses a whole day, so that the answer does not depend on
    where a run was cut. ``tolerance``: see ``advance``.

    >>> circuit, medium = Circuit("known-feed", 1.0, 8.0), Medium()
    >>> plants = Plants(np.full(10, 1.0), np.full(10, 2.0), 3.0)
    >>> state = State(np.array([[0.0, 8.0]]), np.full((1, 2, 10), 16.0), np.zeros((1, 5)))
    >>> drive = Drive(irrigation_l_d=4.0, crop_l_d=3.0, feed_from=np.full(10, 2.0))
    >>> run = simulate(circuit, medium, plants, state, Timeline(((0.0, drive),)), [1.0, 2.0])
    >>> run.times, run.concentrations(ROOT).shape, bool(run.account(1.0, 2.0).gap().max() < 1e-12)
    ((0.0, 1.0, 2.0), (3, 1, 10), True)
    """
    reports = sorted({float(time) for time in report_at if time > begin} | {begin})
    horizon = reports[-1]
    events = sorted((each for each in timeline.events if begin <= each.at <= horizon), key=lambda each: each.at)
    record = Record(no_fluxes(state.members))
    stops = _stops(timeline, events, reports)
    for now, until in zip(stops, [*stops[1:], horizon], strict=True):
        for event in (each for each in events if each.at == now):
            state, moved = apply(circuit, medium, state, event)
            record.book(now, now, moved, event)
        drive = timeline.between(now, until, horizon)
        if now in reports:
            record.report(now, state, feed_composition(circuit, drive, state))
        if until == now:
            break
        state, moved = advance(circuit, medium, plants, state, drive, until - now, tolerance)
        record.book(now, until, moved)
    return record.trajectory()


def _stops(timeline: Timeline, events: Sequence[Event], reports: Sequence[float]) -> list[float]:
    """Times at which a stretch ends: whole days, changes of drive, events, reports."""
    begin, horizon = reports[0], reports[-1]
    days = np.arange(np.floor(begin) + 1.0, horizon)
    times = {*reports, *days.tolist(), *(event.at for event in events), *(start for start, _ in timeline.drives)}
    return sorted(time for time in times if begin <= time <= horizon)


@dataclass(slots=True)
class Record:
    """What a run leaves behind while it goes on."""

    fluxes: Fluxes
    times: list[float] = field(default_factory=list)
    states: list[State] = field(default_factory=list)
    feeds: list[Array] = field(default_factory=list)
    bookings: list[Booking] = field(default_factory=list)
    marks: list[int] = field(default_factory=list)

    def book(self, begin: float, end: float, moved: Fluxes, event: Event | None = None) -> None:
        """Book what moved from ``begin`` to ``end`` [d], or at one time by an event."""
        self.fluxes = self.fluxes + moved
        self.bookings.append(booking(begin, end, moved, event))

    def take(self, run: Trajectory) -> None:
        """Book all that moved in another run of the same loop, which began where this record ends."""
        self.fluxes = self.fluxes + run.fluxes
        self.bookings.extend(run.bookings)

    def report(self, now: float, state: State, feed: Array) -> None:
        """Keep the state and the feed (M, 10) [mmol/L] of a time [d]."""
        self.times.append(now)
        self.states.append(state)
        self.feeds.append(feed)
        self.marks.append(len(self.bookings))

    def trajectory(self) -> Trajectory:
        """All of it, frozen."""
        return Trajectory(
            tuple(self.times),
            tuple(self.states),
            tuple(self.feeds),
            self.fluxes,
            tuple(self.bookings),
            tuple(self.marks),
        )
