"""One step of the members through time, the same for the estimate, the forecast and the hindcast."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from fertui.chemistry.ions import Array
from fertui.estimate.drives import Drives
from fertui.estimate.ensemble import Ensemble, wandered
from fertui.estimate.setting import Setting
from fertui.loop import Drive, Event, advance, apply, corrected
from fertui.loop.account import Booking, booking

INSTANT = 1e-6
TOLERANCE = 0.03
"""Error estimate of one step of the engine; on the measured houses the ions then end within 0.1 % of steps a hundred times finer,
where one night of noise moves a member by 2 %."""


@dataclass(frozen=True, slots=True)
class Step:
    """Members at the end of a stretch, the drive they went under, and the lines of the account."""

    ensemble: Ensemble
    drive: Drive
    lines: tuple[Booking, ...]


def stretch(setting: Setting, drives: Drives, span: int, ensemble: Ensemble, events: Sequence[Event]) -> Step:
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
    return Step(replace(ensemble, state=state), drive, tuple(lines))


def night(setting: Setting, ensemble: Ensemble, seed: int, day: int, now: float) -> tuple[Ensemble, Booking]:
    """The members after the noise of one day, booked as unexplained."""
    after = wandered(ensemble, setting, seed, day)
    return after, booking(now, now, corrected(ensemble.state, after.state))


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
