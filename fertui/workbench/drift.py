"""Drift: shares, ions, EC and pH on one time axis, estimate with its range, what was measured, what was done."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import datetime, timedelta
from typing import TYPE_CHECKING, NamedTuple

from fertui.estimate.points import Band, Estimated
from fertui.logbook.entries import Entry
from fertui.workbench.today import reading_of, unit_of

if TYPE_CHECKING:
    from fertui.estimate.assimilation import Estimate

FOLLOWED = ("K share", "Ca share", "Mg share", "K", "Ca", "Mg", "Na", "NH4", "NO3", "Cl", "SO4", "H2PO4", "EC", "pH")
MARKED = ("dose", "bleed", "batch", "recipe", "setpoint", "acid", "analysis", "crop", "disinfection")


class Series(NamedTuple):
    """One quantity over time: estimate with its 80 % range a day, and what was measured when."""

    what: str
    unit: str
    band: Band | None
    times: tuple[datetime, ...]
    values: tuple[Estimated, ...]
    measured: tuple[tuple[datetime, float], ...]


class Mark(NamedTuple):
    """Something done or measured, by its entry number."""

    at: datetime
    kind: str
    text: str
    number: int


class Drift(NamedTuple):
    """The managed point of a loop over the days past."""

    loop: str
    point: str
    series: tuple[Series, ...]
    marks: tuple[Mark, ...]


def drift(estimate: Estimate, entries: Sequence[Entry], days: int) -> Drift:
    """Courses of the managed point over the last ``days`` days, with band, measurements and marks."""
    start, point = estimate.at - timedelta(days=days), estimate.managed
    own = [entry for entry in entries if entry.loop == estimate.loop.name and entry.at >= start]
    trail = [(day.at, day.state) for day in estimate.course(point, days + 2) if day.at >= start]
    series = []
    for what in FOLLOWED:
        course = [(at, value) for at, state in trail if (value := reading_of(state, what)) is not None]
        measured = _measured(own, point, what)
        if course or measured:
            band = course[-1][1].band if course else None
            times, values = tuple(at for at, _ in course), tuple(value for _, value in course)
            series.append(Series(what, unit_of(what), band, times, values, measured))
    marks = tuple(Mark(entry.at, entry.kind, _said(entry), entry.number or 0) for entry in own if entry.kind in MARKED)
    return Drift(estimate.loop.name, point, tuple(series), marks)


def _measured(entries: Sequence[Entry], point: str, what: str) -> tuple[tuple[datetime, float], ...]:
    """What was measured of a quantity: at the point itself, or in its drain."""
    from fertui.workbench.analysis import share_of

    there = (point, "drain") if point == "root_zone" else (point,)
    found = []
    for entry in entries:
        if entry.kind not in ("analysis", "reading") or entry.point not in there or entry.doubtful:
            continue
        number = share_of(entry, what.removesuffix(" share")) if what.endswith(" share") else entry.number_of(what)
        if number is not None:
            found.append((entry.at, number))
    return tuple(found)


def _said(entry: Entry) -> str:
    """An entry in one short line: its values as written."""
    return " ".join(f"{value.label} {value.written}" for value in entry.values[:4])
