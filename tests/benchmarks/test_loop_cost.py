"""What the engine costs, as ratios within one run; the figures stand in docs/model.md chapter 12.

See conftest.py for how to run it.
"""

from __future__ import annotations

import time
from collections.abc import Callable

import numpy as np
import pytest

from fertui.loop import Timeline, simulate
from tests.loop.invented_sites import SITES, engine, plain_start
from tests.loop.plain_model import Site, solve

pytestmark = pytest.mark.long
Ratio = Callable[[str, float, str], None]
DAYS = 60.0


def seconds(work: Callable[[], object], repeat: int = 3) -> float:
    """Best processor time of a few runs: other work on the machine adds to wall time, not to this."""
    times = []
    for _ in range(repeat):
        begin = time.process_time()
        work()
        times.append(time.process_time() - begin)
    return min(times)


def ensemble(site: Site, members: int, days: float) -> None:
    circuit, medium, plants, state, drive = engine(site, members)
    spread = np.exp(np.random.default_rng(1).normal(0.0, 0.1, (members, 10)))
    plants = type(plants)(plants.uptake_concentration * spread, plants.reference, plants.reference_l_d)
    simulate(circuit, medium, plants, state, Timeline(((0.0, drive),)), [days])


def test_256_members_cost_no_more_than_two_members_of_the_stiff_solver(says_ratio: Ratio) -> None:
    """Outside judge: scipy.integrate.solve_ivp, BDF, rtol 1e-6, vectorised, over the same 60 days, twice one member.

    Judged over the ten loops together; a loop without exchange or holds is nearly linear and costs the solver little.
    """
    rows = []
    for site in SITES:
        ours = seconds(lambda site=site: ensemble(site, 256, DAYS))
        theirs = 2 * seconds(lambda site=site: solve(site, plain_start(site), DAYS))
        rows.append((ours, theirs))
        says_ratio(f"{site.name}: 256 members / two of the stiff solver, 60 days", ours / theirs, "judged together")
    ours, theirs = np.sum(rows, axis=0)
    says_ratio("all ten loops: 256 members / two of the stiff solver, 60 days", ours / theirs, "at most 1")
    assert ours <= theirs


def test_cost_grows_no_faster_than_members_and_days(says_ratio: Ratio) -> None:
    site = next(site for site in SITES if site.capacity_meq)
    by_members = {members: seconds(lambda m=members: ensemble(site, m, 14.0)) for members in (64, 256, 1024, 4096)}
    by_days = {days: seconds(lambda d=days: ensemble(site, 256, d)) for days in (14.0, 60.0, 180.0, 365.0)}
    for members, cost in by_members.items():
        says_ratio(f"{members} members / 64, 14 days", cost / by_members[64], f"linear: {members / 64:g}")
    for days, cost in by_days.items():
        says_ratio(f"{days:g} days / 14, 256 members", cost / by_days[14.0], f"linear: {days / 14:.1f}")
    assert by_members[4096] <= 64 * 1.3 * by_members[64]
    assert by_days[365.0] <= 365 / 14 * 1.5 * by_days[14.0]
