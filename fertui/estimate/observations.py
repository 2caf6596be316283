"""What was measured in a loop, each at its own time and with its own error, from the entries that carry it.

Errors are relative standard deviations, sampling included (common practice, no source): analysis 5 % at the dripper and
in tanks, 6 % in drain, 12 % by slab syringe, with a floor; EC reading 2.5 %; hand-meter ion 15 %, more when the sample
was cold or warm (nitrate electrode: +50 % at 5 C, +31 % at 10 C, least at 17-20 C, -24 % at 25 C; Pena-Fleitas et al.
2022, Agronomy 12:3031).
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from datetime import datetime
from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import INDEX, IONS, MICRONUTRIENTS, Array
from fertui.logbook.entries import Entry
from fertui.site.model import Loop

ANALYSIS_ERROR = {"feed": 0.05, "tank": 0.05, "drain_store": 0.05, "drain": 0.05, "root_zone": 0.12}
SAMPLE_ERROR = {"feed": 0.0, "tank": 0.0, "drain_store": 0.0, "drain": 0.05, "root_zone": 0.05}
"""Error common to all ions of one sample: how well the sample stands for the whole (dilution, evaporation, place)."""

FLOOR_MMOL_L, LEAST_MMOL_L = 0.05, 0.02
EC_ERROR = 0.025
HAND_METER_ERROR = 0.15
WIDE_BELOW = 0.8
"""Error of an ion reported below the detection limit: taken at the limit, wide (log units)."""

_NITRATE_BIAS_C = (5.0, 10.0, 17.0, 20.0, 25.0)
_NITRATE_BIAS = (0.50, 0.31, 0.03, 0.03, 0.24)


class Observation(NamedTuple):
    """One entry that measured something at a point: ions [mmol/L], EC [mS/cm at 25 C], pH.

    ``time`` [d from the start of the record]. ``below``: ions reported below their detection limit;
    ``micronutrients`` [umol/L].
    """

    time: float
    at: datetime
    kind: str
    point: str
    entry: int | None
    ions: Mapping[str, float]
    below: frozenset[str]
    ec: float | None
    ph: float | None
    temperature_c: float | None
    doubtful: str = ""
    zone: str = ""
    micronutrients: Mapping[str, float] = {}

    @property
    def is_analysis(self) -> bool:
        """Whether a laboratory measured it."""
        return self.kind == "analysis"

    def columns(self) -> list[int]:
        """Positions in ``IONS`` of the ions it measured; alkalinity may be negative and is no concentration."""
        return [INDEX[ion] for ion in IONS if ion in self.ions and ion != "HCO3"]

    def values(self) -> Array:
        """Concentrations [mmol/L] of those ions, none below ``LEAST_MMOL_L``: they are compared as logarithms."""
        return np.maximum([self.ions[IONS[column]] for column in self.columns()], LEAST_MMOL_L)

    def own_error(self) -> Array:
        """Error of every such ion by itself (log units)."""
        return np.array([self._error_of(IONS[column]) for column in self.columns()])

    def shared_error(self) -> float:
        """Error common to all ions of the sample (log units)."""
        return SAMPLE_ERROR.get(self.point, 0.0) if self.is_analysis else 0.0

    def covariance(self, at: Array | None = None) -> Array:
        """Error covariance (n, n) of the logarithms, at concentrations ``at`` (n,) or at those measured."""
        values = self.values() if at is None else at
        floor = np.minimum(FLOOR_MMOL_L / np.maximum(values, LEAST_MMOL_L), WIDE_BELOW)
        own = self.own_error() ** 2 + floor**2
        return np.diag(own) + self.shared_error() ** 2

    def _error_of(self, ion: str) -> float:
        if ion in self.below:
            return WIDE_BELOW
        if self.is_analysis:
            return ANALYSIS_ERROR.get(self.point, 0.06)
        if self.temperature_c is None:
            return HAND_METER_ERROR
        bias = float(np.interp(self.temperature_c, _NITRATE_BIAS_C, _NITRATE_BIAS)) if ion == "NO3" else 0.0
        return float(np.hypot(HAND_METER_ERROR, bias))


def observations(loop: Loop, entries: Iterable[Entry], days: Mapping[int, float]) -> tuple[Observation, ...]:
    """Readings and analyses of a loop in order of time; ``days`` gives the time [d] of every entry by its identity."""
    found = [
        _observation(loop, entry, days[id(entry)])
        for entry in entries
        if entry.kind in ("reading", "analysis") and (entry.point or "") != "source"
    ]
    return tuple(sorted((each for each in found if each is not None), key=lambda each: each.time))


def default_point(loop: Loop) -> str:
    """Where a sample without a point was taken: the shared tank, or the drain of a loop on a medium."""
    return "tank" if loop.layout == "shared-tank" else "drain"


def _observation(loop: Loop, entry: Entry, time: float) -> Observation | None:
    """The observation of one entry; None for an extract without the site's factor, or nothing measured."""
    factor = 1.0
    if entry.method and entry.method != "pore":
        if entry.method not in loop.extract_factors:
            return None
        factor = loop.extract_factors[entry.method]
    ions, below = _ions(entry, factor)
    ec = entry.number_of("EC")
    ec = ec * factor if ec else None
    ph = entry.number_of("pH")
    if not ions and ec is None and ph is None:
        return None
    return Observation(
        time, entry.at, entry.kind, entry.point or default_point(loop), entry.number, ions, below, ec, ph,
        entry.number_of("temperature"), entry.doubtful, entry.zone, _micronutrients(entry, factor),
    )  # fmt: skip


def _ions(entry: Entry, factor: float) -> tuple[dict[str, float], frozenset[str]]:
    given = [value for value in entry.values if value.name in INDEX and value.number is not None]
    ions = {value.name: value.number * factor for value in given if value.number is not None}
    return ions, frozenset(value.name for value in given if value.below)


def _micronutrients(entry: Entry, factor: float) -> dict[str, float]:
    given = [value for value in entry.values if value.name in MICRONUTRIENTS and value.number is not None]
    return {value.name: value.number * factor for value in given if value.number is not None}


def quarter_of(time: float) -> int:
    """The quarter of a day a time [d] falls into: what a round is told by."""
    return int(time * 4.0)


def pooled(seen: Iterable[Observation]) -> tuple[Observation, ...]:
    """What the filter takes in: analyses as they are; readings of one point within a quarter of a day as their mean.

    A round at the loop is one moment, its last, however many points and meters it touched. Doubtful ones are left out.
    """
    certain = [each for each in seen if not each.doubtful]
    rounds: dict[int, Observation] = {}
    groups: dict[tuple[str, int], list[Observation]] = {}
    for each in sorted((each for each in certain if not each.is_analysis), key=lambda each: each.time):
        quarter = quarter_of(each.time)
        rounds[quarter] = each
        groups.setdefault((each.point, quarter), []).append(each)
    readings = [
        _mean(group)._replace(time=rounds[quarter].time, at=rounds[quarter].at)
        for (_, quarter), group in groups.items()
    ]
    analyses = [each for each in certain if each.is_analysis]
    return tuple(sorted([*analyses, *readings], key=lambda each: (each.time, not each.is_analysis, each.point)))


def _mean(group: list[Observation]) -> Observation:
    """One observation for several: means of what was measured, at the time of the last; the first's entry number."""
    if len(group) == 1:
        return group[0]
    ions = {ion for each in group for ion in each.ions}
    last = group[-1]
    return Observation(
        last.time, last.at, last.kind, last.point, last.entry,
        {ion: float(np.mean([each.ions[ion] for each in group if ion in each.ions])) for ion in ions},
        frozenset.intersection(*(each.below for each in group)),
        _average([each.ec for each in group]), _average([each.ph for each in group]),
        _average([each.temperature_c for each in group]),
    )  # fmt: skip


def _average(values: list[float | None]) -> float | None:
    given = [value for value in values if value is not None]
    return float(np.mean(given)) if given else None
