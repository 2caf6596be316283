"""The plain alternative a forecast must beat: the loop as a reactor with the last interval's uptake concentration."""

from __future__ import annotations

import numpy as np

from fertui.chemistry.ions import INDEX, Array
from fertui.estimate import compositions
from fertui.estimate.assimilation import Assimilation
from fertui.estimate.ensemble import compartment
from fertui.estimate.observations import Observation
from fertui.estimate.walk import events_between
from fertui.loop import INERT, ROOT, Kinetics, Plants, State, advance, apply, start

TRIALS = 3
"""Rounds of adjusting the uptake until the interval ends at what was found; it is nearly linear."""
_HCO3 = INDEX["HCO3"]


def last_uptake(run: Assimilation, before: Observation, origin: Observation, target: Observation) -> Array:
    """Composition (10,) [mmol/L] at the target, with the uptake per litre of water that led from before to origin.

    Water, feed, stock and doses as logged; no exchange, no dependence on concentration, no uncertainty.
    """
    found = compositions.array(origin.ions)
    litres = _crop_water(run, before.time, origin.time)
    uptake = np.maximum(np.asarray(run.setting.uptake), 0.0)
    for _ in range(TRIALS):
        ended = _ran(run, before, origin.time, uptake)
        held = _litres(run, ended)
        missed = (ended.concentration(_vessel(run, before))[0] - found) * held * _turned_over(run, before, origin)
        uptake = np.maximum(uptake + missed / max(litres, 1e-6), 0.0)
        uptake[_HCO3] = 0.0
    return _ran(run, origin, target.time, uptake).concentration(_vessel(run, origin))[0]


def _vessel(run: Assimilation, seen: Observation) -> int:
    where = compartment(run.setting, seen.point)
    return ROOT if where is None else where


def _litres(run: Assimilation, state: State) -> float:
    return float(state.water_l.sum())


def _crop_water(run: Assimilation, begin: float, end: float) -> float:
    inside = (run.grid[:-1] >= begin - 1e-4) & (run.grid[1:] <= end + 1e-4)
    return float((run.drives.water.crop * np.diff(run.grid))[inside].sum())


def _turned_over(run: Assimilation, before: Observation, origin: Observation) -> float:
    """How many times more must be taken up for a change at the end, because drain carries part of it away."""
    inside = (run.grid[:-1] >= before.time - 1e-4) & (run.grid[1:] <= origin.time + 1e-4)
    water = run.drives.water
    drained = float(((water.irrigation - water.crop) * np.diff(run.grid))[inside].sum())
    if run.setting.circuit.layout != "known-feed":
        return 1.0
    turns = max(drained, 0.0) / run.setting.circuit.root_zone_l
    return float(turns / -np.expm1(-turns)) if turns > 1e-6 else 1.0


def _ran(run: Assimilation, begin: Observation, end: float, uptake: Array) -> State:
    """One member from an analysis to a time under the drives of the record."""
    circuit = run.setting.circuit
    state = start(circuit, INERT, np.maximum(compositions.array(begin.ions), 0.0))
    flat = Kinetics(b=np.zeros(10), q=np.ones(10), antagonism=0.0, salt_half=np.inf)
    nothing, alike = np.zeros(1), np.zeros((1, 10))
    for span in range(len(run.grid) - 1):
        now, until = float(run.grid[span]), float(run.grid[span + 1])
        if now < begin.time - 1e-4 or now >= end - 1e-4:
            continue
        for event in events_between(run.record.events, now, until):
            state, _ = apply(circuit, INERT, state, event)
        plants = Plants(uptake, np.ones(10), float(run.drives.water.reference[span]), kinetics=flat)
        state, _ = advance(circuit, INERT, plants, state, run.drives.drive(span, nothing, alike), until - now)
    return state
