"""The account of a period: per ion, what it began with, what moved by which cause, what it ended with.

It always closes: start + flows = end, for the ensemble mean and for every member.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import ATOMIC_WEIGHT, INDEX, IONS, Array
from fertui.loop.fluxes import CAUSE, CAUSES, WATERS, Fluxes
from fertui.loop.values import Event, State

MICROMOLE = 1e-3
"""[mmol] Below this an amount is rounding of what the medium holds."""


class Booking(NamedTuple):
    """What moved between two times [d], as ensemble means: ``by_cause`` (causes, 10) [mmol], ``litres`` (waters,) [L].

    ``reason`` of a bleed; ``overflow`` (10,) [mmol] is the part of the bleed that ran over. ``entry``: its number in
    the logbook.
    """

    begin: float
    end: float
    by_cause: Array
    overflow: Array
    litres: Array
    reason: str = ""
    entry: int | None = None


def booking(begin: float, end: float, fluxes: Fluxes, event: Event | None = None) -> Booking:
    """One line of the account from the fluxes of a stretch or an event, ``begin`` to ``end`` [d]."""
    means = (fluxes.by_cause.mean(axis=0), fluxes.overflow.mean(axis=0), fluxes.litres.mean(axis=0))
    return Booking(begin, end, *means, event.reason if event else "", event.entry if event else None)


def unexplained(at: float, before: State, after: State) -> Booking:
    """One line of the account: what an analysis, or noise, changed in the solution at a time [d]."""
    by_cause = np.zeros((len(CAUSES), len(IONS)))
    by_cause[CAUSE["unexplained"]] = (after.ions_mmol - before.ions_mmol).sum(axis=1).mean(axis=0)
    return Booking(at, at, by_cause, np.zeros(len(IONS)), np.zeros(len(WATERS)))


class Account(NamedTuple):
    """Amounts in solution [mmol] (10,) at both ends, flows (causes, 10), and the lines they came from."""

    begin: float
    end: float
    start_mmol: Array
    flows_mmol: Array
    end_mmol: Array
    lines: tuple[Booking, ...]

    def row(self, ion: str) -> Mapping[str, float]:
        """One ion as name -> mmol: start_mmol, every cause, end_mmol."""
        column = INDEX[ion]
        flows = {cause: float(self.flows_mmol[position, column]) for position, cause in enumerate(CAUSES)}
        return {"start_mmol": float(self.start_mmol[column]), **flows, "end_mmol": float(self.end_mmol[column])}

    def entries(self, ion: str, cause: str) -> tuple[int, ...]:
        """Numbers of the entries behind one cell, in order of time."""
        cell = (CAUSE[cause], INDEX[ion])
        return tuple(line.entry for line in self.lines if line.entry is not None and line.by_cause[cell] != 0.0)

    def gap(self) -> Array:
        """start + flows - end (10,), relative to the largest number of the ion's row or a micromole: only rounding."""
        scale = np.abs(np.vstack([self.start_mmol, self.flows_mmol, self.end_mmol])).max(axis=0)
        return np.abs(self.start_mmol + self.flows_mmol.sum(axis=0) - self.end_mmol) / np.maximum(scale, MICROMOLE)


def summed(begin: float, end: float, start_mmol: Array, end_mmol: Array, lines: Iterable[Booking]) -> Account:
    """Account over the lines of one period, ``begin`` to ``end`` [d], which held (10,) [mmol] at either end."""
    kept = tuple(lines)
    flows = sum((line.by_cause for line in kept), np.zeros((len(CAUSES), len(IONS))))
    return Account(begin, end, start_mmol, flows, end_mmol, kept)


class Discharge(NamedTuple):
    """Nitrogen and phosphorus discharged for one reason [kg of the loop, kg per hectare], and litres."""

    reason: str
    litres: float
    kg_n: float
    kg_p: float
    kg_n_per_ha: float
    kg_p_per_ha: float


def discharged(lines: Iterable[Booking], area_m2: float) -> tuple[Discharge, ...]:
    """N and P that left with bleed, overflow and lost drain, by reason, largest N first.

    N counts NH4 and NO3, P total phosphate; ``area_m2`` of the loop [m2]. Bleed by rate has the reason "continuous",
    what ran over "overflow", the drain of a known-feed loop "drain".
    """
    amounts: dict[str, Array] = {}
    for line in lines:
        for reason, amount in _left(line).items():
            amounts[reason] = amounts.get(reason, 0.0) + amount
    rows = [_discharge(reason, amount, area_m2) for reason, amount in amounts.items() if amount[0] > 0]
    return tuple(sorted(rows, key=lambda row: -row.kg_n))


def running(lines: Iterable[Booking], area_m2: float) -> tuple[tuple[float, float, float], ...]:
    """Running total of discharge: (time [d], kg N per ha, kg P per ha) after every line, for a year's budget.

    >>> running([], 1000.0)
    ()
    """
    total, rows = np.zeros(len(IONS) + 1), []
    for line in lines:
        total = total + sum(_left(line).values())
        row = _discharge("", total, area_m2)
        rows.append((line.end, row.kg_n_per_ha, row.kg_p_per_ha))
    return tuple(rows)


def _left(line: Booking) -> dict[str, Array]:
    """What left the loop for good in one line, by reason: litres, then ions [mmol] (11,)."""
    litres = {name: line.litres[WATERS.index(name)] for name in ("bleed", "overflow", "drain", "feed")}
    overflow = np.append(litres["overflow"], -line.overflow)
    bleed = np.append(litres["bleed"], -line.by_cause[CAUSE["bleed"]]) - overflow
    lost = np.append(litres["drain"] if litres["feed"] > 0 else 0.0, -line.by_cause[CAUSE["drain"]])
    return {line.reason or "continuous": bleed, "overflow": overflow, "drain": lost}


def _discharge(reason: str, left: Array, area_m2: float) -> Discharge:
    litres, ions_mmol = float(left[0]), left[1:]
    kg_n = float(ions_mmol[INDEX["NH4"]] + ions_mmol[INDEX["NO3"]]) * ATOMIC_WEIGHT["N"] * 1e-6
    kg_p = float(ions_mmol[INDEX["H2PO4"]]) * ATOMIC_WEIGHT["P"] * 1e-6
    hectares = area_m2 / 10_000.0
    return Discharge(reason, litres, kg_n, kg_p, kg_n / hectares, kg_p / hectares)
