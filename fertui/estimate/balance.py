"""The account of a period: what the solution held, what moved it by which cause, what no cause explains.

Start + flows = end for every ion, always: both are cut from the same lines. Between the times at which the members
stood still amounts are taken to move evenly.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from datetime import datetime, timedelta
from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import IONS, Array
from fertui.estimate.assimilation import Estimate
from fertui.estimate.display import no_free_acid
from fertui.loop import CAUSES, WATERS, Discharge
from fertui.loop import discharged as discharged_by
from fertui.loop.account import Account, Booking, summed
from fertui.refusals import Refusal

AT_ONCE = 1e-9


class BalanceRow(NamedTuple):
    """One ion of the account [mmol] in the solution of tank, stores and root zone; gains positive."""

    start_mmol: float
    make_up: float
    stock: float
    dose: float
    acid: float
    feed: float
    uptake: float
    exchange: float
    bleed: float
    drain: float
    unexplained: float
    end_mmol: float

    @property
    def flows(self) -> tuple[str, ...]:
        """Names of the columns between start and end."""
        return self._fields[1:-1]


class Balance(NamedTuple):
    """The account of a period by ion, and the numbers of the entries behind a cell, by (ion, column).

    ``asked``: start of the period asked for; where the account starts later, ``began`` says why it could not then.
    """

    start: datetime
    end: datetime
    ions: Mapping[str, BalanceRow]
    entries: Mapping[tuple[str, str], tuple[int, ...]]
    asked: datetime
    began: str

    @property
    def columns(self) -> tuple[str, ...]:
        """Names of the columns of a row, in the order they are shown in."""
        return BalanceRow._fields

    @property
    def is_cut(self) -> bool:
        """Whether it starts later than asked."""
        return self.start - self.asked > timedelta(seconds=1)


class Stretch(NamedTuple):
    """What one run of the estimate says of a part of a period; ``analyses``: how many are behind the run."""

    account: Balance
    discharges: tuple[Discharge, ...]
    crop_water_l: float | None
    analyses: int


def stretch(estimate: Estimate, start: datetime, end: datetime) -> Stretch:
    """Account, discharges and crop water of the part of a period that an estimate covers; raises as ``balance``."""
    account = balance(estimate, start, end)
    lost, water = discharged(estimate, start, end), crop_water_l(estimate, start, end)
    return Stretch(account, lost, water, estimate.analyses)


def balance(estimate: Estimate, start: datetime, end: datetime) -> Balance:
    """The account of a period, ensemble means. It is cut to what the estimate covers; ``start``, ``end`` say to what.

    Raises ``Refusal`` for an end before the start, or a period before the estimate began.
    """
    account, begin, until = _account(estimate, start, end)
    rows = {ion: BalanceRow(**account.row(ion)) for ion in IONS}
    rows["HCO3"] = _believed(estimate, rows["HCO3"], begin, until)
    entries = {(ion, cause): account.entries(ion, cause) for ion in IONS for cause in CAUSES}
    moments = estimate.record.moment(begin), estimate.record.moment(until)
    behind = {cell: numbers for cell, numbers in entries.items() if numbers}
    return Balance(*moments, rows, behind, start, began(estimate))


def _believed(estimate: Estimate, row: BalanceRow, begin: float, until: float) -> BalanceRow:
    """The row of alkalinity, none of it below zero where a measured pH rules that out; what is cut off is
    unexplained."""

    def held(mmol: float, time: float) -> float:
        acid = mmol < 0.0 and not no_free_acid(estimate.record.observations, estimate.loop.layout, time)
        return mmol if acid else max(mmol, 0.0)

    start, end = held(row.start_mmol, begin), held(row.end_mmol, until)
    cut_off = (end - row.end_mmol) - (start - row.start_mmol)
    return row._replace(start_mmol=start, end_mmol=end, unexplained=row.unexplained + cut_off)


def began(estimate: Estimate) -> str:
    """Why an estimate, and so its account, begins when it does."""
    analysis, anew = estimate.begin.analysis, _anew(estimate)
    if analysis is not None:
        renewed = ", the first since crop, medium or solution were renewed" if anew else ""
        return f"with the analysis of entry {analysis.entry}{renewed}"
    if any(abs(time - _first(estimate)) < AT_ONCE for time in anew):
        return "anew, because crop, medium or solution were renewed"
    return "with the logbook, before any analysis"


def since(estimate: Estimate) -> datetime:
    """From when on an estimate has an account."""
    return estimate.record.moment(_first(estimate))


def discharged(estimate: Estimate, start: datetime, end: datetime) -> tuple[Discharge, ...]:
    """Nitrogen and phosphorus that left the loop in a period, by reason."""
    account, _, _ = _account(estimate, start, end)
    return discharged_by(account.lines, estimate.loop.area_m2)


def crop_water_l(estimate: Estimate, start: datetime, end: datetime) -> float | None:
    """Litres of water the crop took in a period; None where the estimate does not reach into it."""
    if _clipped(estimate, start, end) is None:
        return None
    account, _, _ = _account(estimate, start, end)
    return float(sum(line.litres[WATERS.index("crop")] for line in account.lines))


def _clipped(estimate: Estimate, start: datetime, end: datetime) -> tuple[float, float] | None:
    """The period in days from the record's zero, cut to the estimate; None where they do not meet."""
    first, last = _first(estimate), float(estimate.drives.grid[-1])
    begin, until = max(estimate.record.time(start), first), min(estimate.record.time(end), last)
    return (begin, until) if until >= begin else None


def _first(estimate: Estimate) -> float:
    """When an account can begin [d]: a run is never shorter than a minute, and may reach back over a new start."""
    return max([estimate.begin.time, *_anew(estimate)])


def _anew(estimate: Estimate) -> list[float]:
    return [time for time in estimate.record.anew if time <= estimate.record.end]


def _account(estimate: Estimate, start: datetime, end: datetime) -> tuple[Account, float, float]:
    if end < start:
        raise Refusal(f"the account ends ({end:%Y-%m-%d %H:%M}) before it begins ({start:%Y-%m-%d %H:%M})")
    period = _clipped(estimate, start, end)
    if period is None:
        raise Refusal(
            f"no account from {start:%Y-%m-%d} to {end:%Y-%m-%d}: the estimate runs from {estimate.since:%Y-%m-%d} "
            f"to {estimate.at:%Y-%m-%d}; ask for days within it"
        )
    begin, until = period
    first = float(estimate.drives.grid[0])
    origin = estimate.held_mmol[0] + _flows(_cut(estimate.lines, first, begin, from_start=True)).sum(axis=0)
    lines = tuple(_cut(estimate.lines, begin, until, from_start=begin <= first))
    flows = _flows(lines)
    return summed(begin, until, origin, origin + flows.sum(axis=0), lines), begin, until


def _flows(lines: Iterator[Booking] | tuple[Booking, ...]) -> Array:
    return sum((line.by_cause for line in lines), np.zeros((len(CAUSES), len(IONS))))


def _cut(lines: tuple[Booking, ...], begin: float, until: float, from_start: bool) -> Iterator[Booking]:
    """Lines within (begin, until], those that reach across an end with their part; ``from_start``: [begin, until]."""
    for line in lines:
        if line.end - line.begin < AT_ONCE:
            if begin < line.begin <= until or (from_start and line.begin == begin):
                yield line
            continue
        part = (min(line.end, until) - max(line.begin, begin)) / (line.end - line.begin)
        if part > 0:
            yield (
                line
                if part >= 1.0
                else line._replace(
                    by_cause=part * line.by_cause, overflow=part * line.overflow, litres=part * line.litres
                )
            )
