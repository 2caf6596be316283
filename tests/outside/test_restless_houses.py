"""Loops as restless as the measured houses that were kept back, which this project never saw.

Feed and water of the two measured houses (Hemming et al. 2020, see ``test_houses``); what the drain held is invented:
the model itself, run with twice its usual noise, charges closed, with the error an analysis has. "No change" is then
off by about 4.9 / 4.3 / 3.3 points of the K / Ca / Mg share, as it is on restless measured houses (4.9 / 4.2 / 2.6 in
the study that set out the form of the filter). Bars from there: no ion worse than "no change", ranges that hold
65-90 % of the ions.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from fertui.chemistry.conductivity import conductivity
from fertui.chemistry.ions import INDEX, Array
from fertui.estimate import ensemble
from fertui.estimate.assimilation import Assimilation
from fertui.estimate.hindcast import HindcastRow, hindcast
from fertui.estimate.ranges import neutral
from fertui.estimate.record import read
from fertui.estimate.scores import SCORED
from fertui.logbook.entries import Entry, Value
from fertui.workbench import open_site
from fertui.workbench.bench import Bench
from tests.outside.test_houses import _entered

NOISE = ("FAST_SD", "COMMON_SD", "STATE_SD", "STATE_COMMON_SD")
TIMES, TRUTHS, MEMBERS = 2.2, 12, 200
LEAST = {"Na": 0.09, "NH4": 0.09}
"""Detection limits of the data [mmol/L]."""


@pytest.fixture(scope="module")
def rows(house_folder: Path, tmp_path_factory: pytest.TempPathFactory) -> list[HindcastRow]:
    """The record of a dozen restless truths of each house."""
    folder, found = tmp_path_factory.mktemp("restless"), []
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv("FERTUI_OPERATOR", "TEST")
        sites = [_entered(house_folder, folder, house) for house in ("1", "2")]
    for site in sites:
        bench = open_site(site)
        entries = [entry for entry in bench.book.entries() if not entry.doubtful]
        at = max(entry.at for entry in entries)
        for truth in _truths(bench, entries):
            found += hindcast(bench.site, bench.loop(), truth, at, members=MEMBERS).rows
    return [row for row in found if row.judged and row.ion in SCORED]


def _truths(bench: Bench, entries: list[Entry]) -> list[list[Entry]]:
    drains = [entry for entry in entries if entry.kind == "analysis" and entry.point == "drain"]
    others = [entry for entry in entries if entry not in drains]
    with pytest.MonkeyPatch.context() as patch:
        for name in NOISE:
            patch.setattr(ensemble, name, TIMES * getattr(ensemble, name))
        record = read(bench.site, bench.loop(), [*others, drains[0]], entries[-1].at, whole=True)
        run = Assimilation(record, TRUTHS, 4242)
        run.run()
    times, chance = np.array([mark[0] for mark in run.marks]), np.random.default_rng(7)
    days = [(entry.at - record.zero).total_seconds() / 86400.0 for entry in drains]
    places = [int(np.argmin(np.abs(times - day))) for day in days]
    return [
        [*others, *(_analysed(entry, run.marks[place][1]["drain"][member], chance)
                    for entry, place in zip(drains, places, strict=True))]
        for member in range(TRUTHS)
    ]  # fmt: skip


def _analysed(entry: Entry, solution: Array, chance: np.random.Generator) -> Entry:
    """The analysis with the numbers of an invented solution in it."""
    error = 0.05 * chance.standard_normal(10) + 0.05 * chance.standard_normal()
    found = neutral(solution) * np.exp(error)
    numbers = {ion: max(float(found[INDEX[ion]]), LEAST.get(ion, 0.01)) for ion in INDEX if ion != "HCO3"}
    numbers["EC"] = float(conductivity(found))
    values = tuple(_with(value, numbers.get(value.name)) for value in entry.values)
    return entry._replace(values=values)


def _with(value: Value, number: float | None) -> Value:
    return value if number is None else value._replace(number=number, text=f"{number:.3g}", below=False)


@pytest.mark.long
def test_no_ion_is_worse_than_no_change(rows: list[HindcastRow]) -> None:
    ratios = {}
    for ion in SCORED:
        mine = [row for row in rows if row.ion == ion]
        error = np.array([row.predicted_mmol_l - row.measured_mmol_l for row in mine])
        no_change = np.array([row.no_change_mmol_l - row.measured_mmol_l for row in mine])
        ratios[ion] = float(np.sqrt(np.mean(error**2) / np.mean(no_change**2)))
    print({ion: round(ratio, 2) for ion, ratio in ratios.items()})
    assert max(ratios.values()) < 1.0


@pytest.mark.long
def test_ranges_widen_with_the_loop(rows: list[HindcastRow]) -> None:
    held = [row.low <= row.measured_mmol_l <= row.high for row in rows]
    shares = [row for row in rows if row.measured_share_pct is not None]
    inside = [(row.low_share_pct or 0.0) <= row.measured_share_pct <= (row.high_share_pct or 0.0) for row in shares]
    print(f"ions {100 * np.mean(held):.0f} %, shares {100 * np.mean(inside):.0f} %")
    assert 0.65 <= np.mean(held) <= 0.90
    assert 0.65 <= np.mean(inside) <= 0.97
