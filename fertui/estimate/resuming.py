"""What an earlier run through a record may lend to a later one: its members wherever nothing before them has changed.

Two runs are compared by what drives the members, stretch by stretch, not by their entries: an entry may reach back to
the one before it (litres since the last reading, a feed analysis), and then the stretches it touches differ.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from fertui.chemistry.conductivity import Linearised
from fertui.chemistry.ions import Array
from fertui.estimate.drives import Drives
from fertui.estimate.ensemble import Ensemble
from fertui.estimate.ranges import Spread
from fertui.estimate.setting import Setting
from fertui.loop import Event, Hold

if TYPE_CHECKING:
    from fertui.estimate.assimilation import Assimilation


class Stop(NamedTuple):
    """The state of a run right before a stretch; ``counts``: how long each of its growing lists was."""

    span: int
    setting: Setting
    ensemble: Ensemble
    spread: Spread
    analyses: int
    meters: Mapping[str, Linearised | None]
    counts: tuple[int, ...]


def spans_alike(old: Assimilation, new: Assimilation) -> int:
    """How many stretches from the beginning come out the same in two runs."""
    same_start = (
        (old.record.site, old.record.loop, old.record.zero, old.members, old.seed)
        == (new.record.site, new.record.loop, new.record.zero, new.members, new.seed)
    ) and (old.begin, old.record.stages) == (new.begin, new.record.stages)
    if not same_start:
        return 0
    count = _equal(old.grid, new.grid) - 1
    for one, other in zip(_driven(old.drives), _driven(new.drives), strict=True):
        count = min(count, _equal(one, other))
    count = min(count, _equal(old.drives.feeds, new.drives.feeds) - 1)
    until = float(new.grid[max(count, 0)])
    return max(min(count, _first_other(old, new, until), _first_other(new, old, until)), 0)


def _equal(one: Array, other: Array) -> int:
    """Length of the common beginning of two arrays, along their first axis."""
    shortest = min(len(one), len(other))
    same = np.isclose(one[:shortest], other[:shortest], rtol=0.0, atol=0.0, equal_nan=True)
    differs = ~same.reshape(shortest, -1).all(axis=1)
    return int(np.argmax(differs)) if differs.any() else shortest


def _driven(drives: Drives) -> tuple[Array, ...]:
    """What drives the members, one row a stretch."""
    water = drives.water
    holds = np.array(
        [[hold.set_point, *hold.proportions] if hold else [0.0] * 11 for hold in map(_first, drives.holds)]
    )
    rates = (water.irrigation, water.drain, water.crop, water.make_up, water.condensate, water.origin, water.reference)
    return (*rates, np.array(drives.make_up), drives.stock_mmol_d, holds)


def _first(holds: tuple[Hold, ...]) -> Hold | None:
    return holds[0] if holds else None


def _first_other(one: Assimilation, other: Assimilation, until: float) -> int:
    """The stretch at whose beginning something happens in one run that does not in the other."""
    known = {_event_key(event) for event in other.record.events}
    times = [event.at for event in one.record.events if event.at < until and _event_key(event) not in known]
    times += [seen.time for seen in one.observed if seen.time < until and seen not in other.observed]
    times += [time for time, day in one.nights if time < until and (time, day) not in other.nights]
    return int(np.searchsorted(one.grid, min(times) - 1e-4)) if times else len(one.grid)


def _event_key(event: Event) -> tuple[object, ...]:
    return event.at, event.cause, event.point, np.asarray(event.ions_mmol).tobytes(), np.asarray(event.litres).tobytes()
