"""From when an estimate runs, and what the members begin with."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import INDEX, IONS, Array
from fertui.estimate.compositions import array, target_feed
from fertui.estimate.correction import ElectroMeter, corrected
from fertui.estimate.drives import stock_proportions
from fertui.estimate.ensemble import ALKALINITY_MEQ_L, Ensemble, compartment, unknowns
from fertui.estimate.noise import normals
from fertui.estimate.observations import Observation
from fertui.estimate.reach import HISTORY_DAYS, WHOLE_DAYS, start_among
from fertui.estimate.record import Record
from fertui.estimate.setting import Setting
from fertui.estimate.unanalysed import filled_up, unseen
from fertui.loop import ROOT, STORE, start

LEAST_IONS = 3
"""An analysis of fewer ions cannot begin an estimate."""
NOT_ANALYSED = 0.3
"""What may be in a solution that nobody analysed: most likely nothing more, else some part of the feed."""
UNSEEN_SD = 0.30
"""Spread (log) of an ion, or of a vessel, that the first analysis did not show."""
NEW_MEDIUM_DAYS = 28.0
"""A new medium gives and takes for about a month; later its load is that of the solution."""
SHORTEST = 1e-3


class Beginning(NamedTuple):
    """Time [d] of the start, and the analysis it starts from (None: from the feed alone)."""

    time: float
    analysis: Observation | None


def beginning(record: Record, setting: Setting, usable: tuple[Observation, ...]) -> Beginning:
    """Where an estimate of this record begins.

    At an analysis since the crop, the medium or the solution was last renewed: the first one for the whole record, else
    the one that ``start_among`` names. A medium that exchanges and was new after that begins with itself: its load
    matters more than the first analysis. Without any analysis the estimate begins with the record, from the feed.
    """
    anew = max((time for time in record.anew if time <= record.end), default=-np.inf)
    oldest = record.end - (WHOLE_DAYS if record.whole else HISTORY_DAYS)
    shown = [
        each
        for each in usable
        if each.time >= max(anew, oldest) and len(each.ions) >= LEAST_IONS and shows_a_vessel(setting, each)
    ]
    times = [each.time for each in shown]
    begin = (times or [oldest])[0] if record.whole else start_among(times, record.end)
    if setting.exchanges and record.new_medium is not None and record.new_medium >= begin - NEW_MEDIUM_DAYS:
        return Beginning(max(record.new_medium, anew), None)
    if shown:
        return next(Beginning(each.time, each) for each in shown if each.time >= begin)
    first = record.first if record.first is not None else record.end
    return Beginning(float(min(max(anew, begin, first), record.end - SHORTEST)), None)


def shows_a_vessel(setting: Setting, seen: Observation) -> bool:
    """Whether it is an analysis of a solution that the members carry."""
    return seen.is_analysis and compartment(setting, seen.point) is not None


def first_members(record: Record, setting: Setting, begin: Beginning, members: int, seed: int) -> Ensemble:
    """Members at the start: the first analysis with its error, or the feed, widely spread."""
    drawn = normals(seed, setting.loop.name, "first", members, 2 * len(IONS) + 1, apart=True)
    vessels = np.stack([_vessel(record, setting, begin, drawn, where) for where in (STORE, ROOT)], axis=1)
    unknown = unknowns(setting, seed, members)
    medium = setting.medium(unknown["capacity"], unknown["selectivity"])
    load = setting.growing.load() if begin.analysis is None and setting.exchanges else None
    state = start(setting.circuit, medium, vessels[:, ROOT], vessels[:, STORE], members, load)
    seen = begin.analysis
    ensemble = Ensemble(state, **unknown, alkalinity=_alkalinity(record, setting, begin))
    if seen is None or seen.ec is None:
        return ensemble
    return corrected(ensemble, setting, seen._replace(ions={}), None, ElectroMeter(), seed)[0]


def _vessel(record: Record, setting: Setting, begin: Beginning, drawn: Array, where: int) -> Array:
    """Concentrations (M, 10) of one vessel at the start."""
    middle = _unseen(record, setting, begin.time, len(drawn))
    middle += unseen(setting.loop.name, where, len(drawn))
    noise = UNSEEN_SD * drawn[:, : len(IONS)]
    seen = begin.analysis
    if seen is not None:
        columns = seen.columns()
        middle[:, columns] = [seen.ions[IONS[column]] for column in columns]
        noise[:, columns] = drawn[:, : len(columns)] @ np.linalg.cholesky(seen.covariance()).T
        if compartment(setting, seen.point) != where:
            noise = noise + UNSEEN_SD * (drawn[:, len(IONS) : 2 * len(IONS)] + drawn[:, -1, None])
    vessel = np.maximum(middle, 0.0) * np.exp(noise)
    if seen is None:
        feed = array(target_feed(record.site, record.loop).ions)
        vessel += np.maximum(NOT_ANALYSED * drawn[:, -1, None] - 0.1, 0.0) * feed
    of_water = seen is None and setting.circuit.layout == "shared-tank"
    vessel[:, INDEX["HCO3"]] = middle[:, INDEX["HCO3"]] if of_water else _alkalinity(record, setting, begin)
    return vessel


def _alkalinity(record: Record, setting: Setting, begin: Beginning) -> float:
    """Alkalinity [meq/L] at the start: as measured, that of the source water in a tank, else the usual."""
    if begin.analysis is not None:
        return begin.analysis.ions.get("HCO3", ALKALINITY_MEQ_L)
    water = record.make_up_as_said(begin.time)[INDEX["HCO3"]]
    known = setting.circuit.layout == "shared-tank" and not np.isnan(water)
    return float(water) if known else ALKALINITY_MEQ_L


def _unseen(record: Record, setting: Setting, time: float, members: int) -> Array:
    """What a vessel holds (M, 10) before anyone analysed it: its feed; a shared tank its source water."""
    if setting.circuit.layout == "shared-tank":
        held = filled_up(record.make_up_as_said(time), setting.loop.name, members)
    elif setting.circuit.layout == "known-feed" and record.feed:
        held = record.feed[0][1]
    else:
        held = stock_proportions(record, time)
    return np.array(np.broadcast_to(held, (members, len(IONS))))
