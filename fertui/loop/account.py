"""The account of a period: per ion, what it began with, what moved by which cause, what it ended with.

It always closes: start + flows = end, for the ensemble mean and for every member.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

import numpy as np

from fertui.chemistry.ions import ATOMIC_WEIGHT, INDEX, IONS, Array
from fertui.loop.circulation import CAUSE, CAUSES, Fluxes
from fertui.loop.values import Event


@dataclass(frozen=True, slots=True)
class Booking:
    """What moved between two times [d], as ensemble means: ``by_cause`` (causes, 10) [mmol], ``litres`` (waters,) [L].

    ``reason`` of a bleed; ``overflow`` (10,) [mmol] is the part of the bleed that ran over. ``entry``: number in the book.
    """

    begin: float
    end: float
    by_cause: Array
    overflow: Array
    litres: Array
    reason: str = ""
    entry: int | None = None


def booking(begin: float, end: float, fluxes: Fluxes, event: Event | None = None) -> Booking:
    """One line of the account from the fluxes of a stretch or an event."""
    means = (fluxes.by_cause.mean(axis=0), fluxes.overflow.mean(axis=0), fluxes.litres.mean(axis=0))
    return Booking(begin, end, *means, event.reason if event else "", event.entry if event else None)


@dataclass(frozen=True, slots=True)
class Account:
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
        """start + flows - end (10,), relative to the largest number of the ion's row: what must be rounding."""
        scale = np.abs(np.vstack([self.start_mmol, self.flows_mmol, self.end_mmol])).max(axis=0)
        return np.abs(self.start_mmol + self.flows_mmol.sum(axis=0) - self.end_mmol) / np.maximum(scale, 1e-12)


def summed(begin: float, end: float, start_mmol: Array, end_mmol: Array, lines: Iterable[Booking]) -> Account:
    """Account over the lines of one period."""
    kept = tuple(lines)
    flows = sum((line.by_cause for line in kept), np.zeros((len(CAUSES), len(IONS))))
    return Account(begin, end, start_mmol, flows, end_mmol, kept)


@dataclass(frozen=True, slots=True)
class Discharge:
    """Nitrogen and phosphorus discharged for one reason [kg of the loop, kg per hectare], and litres."""

    reason: str
    litres: float
    kg_n: float
    kg_p: float
    kg_n_per_ha: float
    kg_p_per_ha: float


def discharged(lines: Iterable[Booking], area_m2: float) -> tuple[Discharge, ...]:
    """N and P that left with bleed, overflow and lost drain, by reason, largest N first.

    N counts NH4 and NO3, P total phosphate; ``area_m2`` of the loop. Bleed by rate has the reason "continuous",
    what ran over "overflow", the drain of a known-feed loop "drain".
    """
    ions: dict[str, Array] = {}
    litres: dict[str, float] = {}
    for line in lines:
        bleed = -line.by_cause[CAUSE["bleed"]] + line.overflow
        parts = {
            line.reason or "continuous": bleed,
            "overflow": -line.overflow,
            "drain": -line.by_cause[CAUSE["drain"]],
        }
        for reason, amount in parts.items():
            if np.any(amount > 0):
                ions[reason] = ions.get(reason, np.zeros(len(IONS))) + amount
        reason = next((name for name in parts if name in ions), "continuous")
        litres[reason] = litres.get(reason, 0.0) + float(line.litres[-1])
    rows = [_discharge(reason, litres.get(reason, 0.0), amount, area_m2) for reason, amount in ions.items()]
    return tuple(sorted(rows, key=lambda row: -row.kg_n))


def _discharge(reason: str, litres: float, ions_mmol: Array, area_m2: float) -> Discharge:
    kg_n = float(ions_mmol[INDEX["NH4"]] + ions_mmol[INDEX["NO3"]]) * ATOMIC_WEIGHT["N"] * 1e-6
    kg_p = float(ions_mmol[INDEX["H2PO4"]]) * ATOMIC_WEIGHT["P"] * 1e-6
    hectares = area_m2 / 10_000.0
    return Discharge(reason, litres, kg_n, kg_p, kg_n / hectares, kg_p / hectares)
