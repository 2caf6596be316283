"""Loops that share a tank or a drain store: each holds its part, and the parts are mixed at every midnight and report.

What a loop gains or loses by the mixing stands under ``drain``: it is drain water of its neighbours.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import Array
from fertui.loop.circulation import feed_composition
from fertui.loop.fluxes import CAUSE, Fluxes, no_fluxes
from fertui.loop.simulation import Record, Timeline, Trajectory, simulate
from fertui.loop.uptake import Plants
from fertui.loop.values import ROOT, STORE, Circuit, Medium, State


class Sharer(NamedTuple):
    """One of the loops that share a vessel; ``circuit.store_l`` (``root_zone_l`` where mixed) is its part of it."""

    circuit: Circuit
    medium: Medium
    plants: Plants
    state: State
    timeline: Timeline

    @property
    def vessel(self) -> int:
        """The compartment that is a part of the shared vessel."""
        return ROOT if self.circuit.mixed else STORE

    @property
    def part_l(self) -> float:
        """Its part of the shared vessel at working level [L]."""
        return self.circuit.root_zone_l if self.circuit.mixed else self.circuit.store_l


def pooled(sharers: Sequence[Sharer]) -> tuple[tuple[State, ...], tuple[Fluxes, ...]]:
    """States with the shared vessel mixed and shared out again by the parts, and what each loop got by it.

    Raises ``ValueError`` for a known-feed loop, which has no vessel to share, and for parts without volume.
    """
    if any(each.circuit.layout == "known-feed" or each.part_l <= 0 for each in sharers):
        raise ValueError("loops that share a vessel are shared-tank or drain-blend, each with a part above 0 L")
    parts = np.array([each.part_l for each in sharers])
    water = sum(each.state.water_l[:, each.vessel] for each in sharers)
    ions = sum(each.state.ions_mmol[:, each.vessel] for each in sharers)
    shared = [
        _given(each, fraction * water, fraction * ions)
        for each, fraction in zip(sharers, parts / parts.sum(), strict=True)
    ]
    return tuple(state for state, _ in shared), tuple(fluxes for _, fluxes in shared)


def _given(sharer: Sharer, water_l: Array, ions_mmol: Array) -> tuple[State, Fluxes]:
    state, fluxes = sharer.state, no_fluxes(sharer.state.members)
    water, ions = state.water_l.copy(order="K"), state.ions_mmol.copy(order="K")
    fluxes.by_cause[:, CAUSE["drain"]] = ions_mmol - ions[:, sharer.vessel]
    water[:, sharer.vessel], ions[:, sharer.vessel] = water_l, ions_mmol
    return state._replace(water_l=water, ions_mmol=ions), fluxes


def simulate_together(
    sharers: Mapping[str, Sharer], report_at: Sequence[float], begin: float = 0.0
) -> dict[str, Trajectory]:
    """Trajectory of every loop, by name, with their shared vessel mixed at every whole day and report.

    Events on the shared vessel act on the part of the loop that names them: give each loop its share.
    """
    reports = sorted({float(time) for time in report_at if time > begin} | {begin})
    days = np.arange(np.floor(begin) + 1.0, reports[-1]).tolist()
    stops = sorted({*reports, *days})
    records = {name: Record(no_fluxes(each.state.members)) for name, each in sharers.items()}
    now, current = begin, dict(sharers)
    for until in stops:
        if until > now:
            current = _together(current, records, now, until)
        if until in reports:
            _report(current, records, until)
        now = until
    return {name: record.trajectory() for name, record in records.items()}


def _together(sharers: dict[str, Sharer], records: Mapping[str, Record], now: float, until: float) -> dict[str, Sharer]:
    moved_on = {}
    for name, each in sharers.items():
        run = simulate(each.circuit, each.medium, each.plants, each.state, each.timeline, [until], begin=now)
        records[name].take(run)
        moved_on[name] = each._replace(state=run.end)
    states, fluxes = pooled(tuple(moved_on.values()))
    for (name, each), state, moved in zip(list(moved_on.items()), states, fluxes, strict=True):
        records[name].book(until, until, moved)
        moved_on[name] = each._replace(state=state)
    return moved_on


def _report(sharers: Mapping[str, Sharer], records: Mapping[str, Record], now: float) -> None:
    for name, each in sharers.items():
        drive = each.timeline.between(now, now, now + 1.0)
        records[name].report(now, each.state, feed_composition(each.circuit, drive, each.state))
