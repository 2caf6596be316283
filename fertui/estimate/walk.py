"""One step of the members through time, the same for the estimate, the forecast and the hindcast."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from itertools import pairwise
from typing import NamedTuple, Protocol

import numpy as np

from fertui.chemistry.ions import Array
from fertui.estimate.ensemble import Ensemble, wandered
from fertui.estimate.record import Record
from fertui.estimate.setting import Setting
from fertui.loop import Drive, Event, advance, apply
from fertui.loop.account import Booking, booking, unexplained

INSTANT, CLOSE = 1e-6, 1e-4
TOLERANCE = 0.03
"""Error estimate of one step of the engine. On the measured houses ions then end within 0.1 % of steps a hundred times
finer, where one night of noise moves a member by 2 %."""


class Step(NamedTuple):
    """Members at the end of a stretch, the drive they went under, and the lines of the account."""

    ensemble: Ensemble
    drive: Drive
    lines: tuple[Booking, ...]


class Referenced(Protocol):
    """What is looked at of water beside the drives: the season mean of crop water [L/d] in every stretch."""

    @property
    def reference(self) -> Array: ...


class Driven(Protocol):
    """Drives of neighbouring stretches: of a record, or of the days to come."""

    @property
    def grid(self) -> Array: ...
    @property
    def water(self) -> Referenced: ...
    def drive(self, span: int, log_drain: Array, log_stock: Array) -> Drive: ...


class Way(NamedTuple):
    """Where members are led: loop, drives, events, times [d] of the noise of each day with the day that keys it."""

    setting: Setting
    drives: Driven
    events: tuple[Event, ...]
    nights: tuple[tuple[float, int], ...]
    seed: int

    def led(self, ensemble: Ensemble, first: int, until: float, noisy: bool = True) -> Iterator[tuple[float, Ensemble]]:
        """Members at the end of every stretch from the ``first`` on, up to a time; no night before the first."""
        nights = spans_of(self.drives.grid, self.nights)
        for span in range(first, len(self.drives.grid) - 1):
            begin, end = float(self.drives.grid[span]), float(self.drives.grid[span + 1])
            if begin >= until - CLOSE:
                return
            if noisy and span > first and span in nights:
                ensemble, _ = night(self.setting, ensemble, self.seed, nights[span], begin)
            events = events_between(self.events, begin, end)
            ensemble = stretch(self.setting, self.drives, span, ensemble, events).ensemble
            yield end, ensemble


def spans_of(grid: Array, nights: Sequence[tuple[float, int]]) -> dict[int, int]:
    """Day by the number of the stretch that begins with its noise."""
    places = np.searchsorted(grid, [time - CLOSE for time, _ in nights])
    return {int(place): day for place, (_, day) in zip(places, nights, strict=True)}


def nights_of(record: Record, begin: float, end: float, seen: Sequence[float] = ()) -> tuple[tuple[float, int], ...]:
    """When the noise of each local day falls within (begin, end) [d], and the day that keys it.

    At the first observation of the day, where there is one in ``seen``, else at its midnight: one stretch a day less.
    """
    midnights = [*record.midnights(begin, end), end]
    ordered, found = np.sort(np.asarray(seen, dtype=float)), []
    for midnight, next_one in pairwise(midnights):
        place = int(np.searchsorted(ordered, midnight))
        first = ordered[place] if place < len(ordered) and ordered[place] < next_one - CLOSE else midnight
        found.append((float(first), record.local_day(midnight)))
    return tuple(found)


def stretch(setting: Setting, drives: Driven, span: int, ensemble: Ensemble, events: Sequence[Event]) -> Step:
    """Events at the beginning of a stretch, then the stretch itself."""
    begin, end = float(drives.grid[span]), float(drives.grid[span + 1])
    medium = ensemble.medium(setting)
    drive = drives.drive(span, ensemble.drain, ensemble.stock)
    state, lines = ensemble.state, []
    for event in events:
        state, moved = apply(setting.circuit, medium, state, event)
        lines.append(booking(begin, begin, moved, event))
    plants = ensemble.plants(setting, float(drives.water.reference[span]))
    state, moved = advance(setting.circuit, medium, plants, state, drive, end - begin, TOLERANCE)
    lines.append(booking(begin, end, moved))
    return Step(ensemble._replace(state=state), drive, tuple(lines))


def night(setting: Setting, ensemble: Ensemble, seed: int, day: int, now: float) -> tuple[Ensemble, Booking]:
    """The members after the noise of one day, booked as unexplained."""
    after = wandered(ensemble, setting, seed, day)
    return after, unexplained(now, ensemble.state, after.state)


def events_between(events: Sequence[Event], begin: float, end: float) -> list[Event]:
    """Events from ``begin`` on and before ``end``."""
    return [event for event in events if begin - INSTANT <= event.at < end - INSTANT]


def grid_of(begin: float, end: float, *times: Sequence[float]) -> Array:
    """Ascending times [d] from begin to end with every given time between them, none closer than a few seconds."""
    inner = sorted(time for some in times for time in some if begin + INSTANT < time < end - INSTANT)
    kept = [begin]
    for time in inner:
        if time - kept[-1] > 1e-4:
            kept.append(time)
    if end - kept[-1] <= 1e-4 and len(kept) > 1:
        kept.pop()
    return np.array([*kept, end])
