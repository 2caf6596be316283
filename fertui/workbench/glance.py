"""What can be said of a loop without running the model: the last numbers written down. For the first paint."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from datetime import datetime
from typing import NamedTuple

from fertui.logbook.entries import Entry
from fertui.logbook.growing import NO_CROP, stands_after
from fertui.site.model import Loop


class Seen(NamedTuple):
    """A reading or analysis as logged: its number, when, where, by whom, and its canonical numbers by name."""

    number: int
    at: datetime
    point: str
    by: str
    values: Mapping[str, float]


class Glance(NamedTuple):
    """The last known numbers of one loop."""

    loop: str
    layout: str
    crop: str
    stage: str
    medium: str
    at: datetime
    managed_point: str
    readings: Mapping[str, Seen]
    last_analysis: Seen | None
    set_ec: float | None
    set_ph: float | None


def managed_point(loop: Loop) -> str:
    """The point a loop is steered by: the tank where nothing but water surrounds the roots, else the root zone."""
    return "tank" if loop.layout == "shared-tank" and loop.medium == "none" else "root_zone"


def glance(loop: Loop, entries: Iterable[Entry], at: datetime) -> Glance:
    """Last reading of every point, last analysis, set points, from effective entries in the order of their time."""
    readings: dict[str, Seen] = {}
    analysis = None
    set_ec, set_ph, stage, stands = loop.feed_ec, loop.feed_ph, loop.stage, True
    for entry in entries:
        if entry.kind == "reading":
            readings[entry.point or managed_point(loop)] = seen(entry)
        elif entry.kind == "analysis" and entry.point != "source":
            analysis = seen(entry)
        elif entry.kind == "setpoint":
            set_ec = _later(entry.number_of("EC"), set_ec)
            set_ph = _later(entry.number_of("pH"), set_ph)
        elif entry.kind == "crop":
            stage, stands = entry.text_of("stage") or stage, stands_after(entry, stands)
    return Glance(
        loop.name,
        loop.layout,
        loop.crop if stands else NO_CROP,
        stage if stands else "",
        loop.medium,
        at,
        managed_point(loop),
        readings,
        analysis,
        set_ec,
        set_ph,
    )


def seen(entry: Entry) -> Seen:
    """An entry as it is shown: numbers alone."""
    numbers = {value.name: value.number for value in entry.values if value.number is not None}
    return Seen(entry.number or 0, entry.at, entry.point, entry.by, numbers)


def _later(new: float | None, old: float | None) -> float | None:
    return old if new is None else new
