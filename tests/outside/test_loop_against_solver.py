"""The engine against scipy's stiff solver on ten invented loops of all layouts, over 28 days.

Outside judge: scipy.integrate.solve_ivp, BDF, rtol 1e-6, on the equations of docs/model.md chapters 3-5 written out
plainly in ``tests/loop/plain_model.py``.
"""

from __future__ import annotations

import numpy as np
import pytest

from fertui.chemistry.exchange import batch
from fertui.chemistry.ions import Array
from fertui.loop import ROOT, STORE, State, Timeline, circulation, simulate
from tests.loop.invented_sites import SITES, engine, plain_start
from tests.loop.plain_model import Site, solve

DAYS = 28.0
ALKALINITY_MEQ_L = 0.005
"""Alkalinity may be near 0 or negative and is the small difference of large uptakes: this much comes on top."""


def by_engine(site: Site, tolerance: float = circulation.TOLERANCE) -> State:
    circuit, medium, plants, state, drive = engine(site)
    return simulate(circuit, medium, plants, state, Timeline(((0.0, drive),)), [DAYS], tolerance=tolerance).end


def by_solver(site: Site) -> tuple[Array, Array | None]:
    amounts = solve(site, plain_start(site), DAYS)
    root = amounts[10:] / site.root_l
    if site.capacity_meq:
        root[:5] = batch(amounts[10:15], site.root_l, site.capacity_meq, site.selectivity)[0]
    return root, amounts[:10] / site.store_l if site.store_l else None


def assert_close(found: Array, expected: Array) -> None:
    np.testing.assert_allclose(found[:9], expected[:9], rtol=0.005, atol=1e-6)
    np.testing.assert_allclose(found[9], expected[9], rtol=0.005, atol=ALKALINITY_MEQ_L)


@pytest.mark.parametrize("site", SITES, ids=lambda site: site.name)
def test_within_half_a_percent_of_a_stiff_solver(site: Site) -> None:
    end = by_engine(site)
    root, store = by_solver(site)
    assert_close(end.concentration(ROOT)[0], root)
    if store is not None:
        assert_close(end.concentration(STORE)[0], store)


@pytest.mark.parametrize("site", SITES, ids=lambda site: site.name)
def test_halved_steps_change_the_end_by_less_than_half_a_percent(site: Site, monkeypatch: pytest.MonkeyPatch) -> None:
    ordinary = by_engine(site)
    monkeypatch.setattr(circulation, "LONGEST_STEP_D", 0.5)
    halved = by_engine(site, circulation.TOLERANCE / 4)
    assert_close(ordinary.concentration(ROOT)[0], halved.concentration(ROOT)[0])
