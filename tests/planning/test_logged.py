"""What a plan reads out of the logbook: nitrogen the year has discharged, acid that is dosed by habit."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

import numpy as np
import pytest

from fertui.chemistry.ions import INDEX
from fertui.estimate.assimilation import Estimate, assimilate
from fertui.logbook.entries import Entry, Value
from fertui.planning.acid_steps import usual_acid
from fertui.planning.renewal import year_kg_n
from fertui.site.model import Composition, Loop, Site, Supply, Water

AT = datetime(2026, 5, 20, 8, tzinfo=UTC)
LITRES = 2000.0
ACID = Supply("nitric acid", "nitric acid", strength_pct=38.0)


def entry(kind: str, days_ago: float, point: str = "", number: int | None = None, **values: float | str) -> Entry:
    at = AT - timedelta(days=days_ago)
    written = (Value(name, str(each), each if isinstance(each, float) else None) for name, each in values.items())
    return Entry(kind, "nft", at, at, "T", tuple(written), number=number, point=point)


def tank(entries: list[Entry]) -> Estimate:
    loop = Loop("nft", "shared-tank", 100.0, "lettuce", "none", tank_l=LITRES, water="well")
    site = Site(
        "T", "UTC", (loop,), supplies=(ACID,), waters=(Water("well", Composition({"HCO3": 3.5})),),
        budget_n_kg_per_ha=75.0,
    )  # fmt: skip
    return assimilate(site, loop, entries, AT)


def analysis(days_ago: float, nitrate: float) -> Entry:
    ions = {"K": 6.0, "Ca": 3.0, "Mg": 1.0, "NO3": nitrate, "SO4": 0.5, "H2PO4": 1.0, "NH4": 0.0, "Na": 1.0}
    return entry("analysis", days_ago, "tank", **ions, Cl=15.5 - nitrate)


def test_the_year_counts_each_bleed_with_the_nitrogen_it_held_then() -> None:
    logged = [
        analysis(40, 12.0), entry("bleed", 39.9, litres=500.0, reason="renewal"),
        analysis(20, 4.0), analysis(1, 4.0), entry("water", 1, make_up=1.0),
        entry("bleed", 60.0, litres=100.0, reason="renewal"),
    ]  # fmt: skip
    found = tank(logged)
    # mmol/L x L x 14.007e-6 kg/mmol: 500 L at 12, 100 L at what the estimate, begun at its first analysis, holds today
    then = 12.0 * 500.0 * 14.007e-6
    now = found.points()["tank"].ions["NO3"].mmol_l.value + found.points()["tank"].ions["NH4"].mmol_l.value
    assert now < 6.0
    assert found.since > AT - timedelta(days=60)
    assert year_kg_n(found, logged) == pytest.approx(then + 100.0 * now * 14.007e-6, rel=0.02)


def test_what_was_let_go_last_year_is_not_counted() -> None:
    logged = [analysis(150, 12.0), entry("bleed", 145.0, litres=500.0, reason="renewal"), analysis(1, 12.0)]
    assert (AT - timedelta(days=145)).year == 2025
    assert year_kg_n(tank(logged), logged) == pytest.approx(0.0, abs=1e-6)


def test_acid_twice_in_a_fortnight_is_a_habit_unless_it_carried_out_a_plan() -> None:
    acids = [entry("acid", day, number=int(10 + day), acid="nitric acid", litres=0.7) for day in (2.0, 6.0)]
    by_plan = entry("acid", 4.0, number=30, acid="nitric acid", litres=5.0, plan=7.0)
    logged = [analysis(20, 10.0), *acids, by_plan]
    habit = usual_acid(tank(logged), logged)
    # 38 % nitric acid holds 7.435 mol/L at 20 degrees C; the alkalinity it takes is its protons
    assert habit[INDEX["NO3"]] == pytest.approx(2 * 0.7 * 7435.0 / 14.0, rel=0.01)
    assert habit[INDEX["HCO3"]] == pytest.approx(-habit[INDEX["NO3"]], rel=1e-6)
    once = [analysis(20, 10.0), acids[0], by_plan]
    assert not np.any(usual_acid(tank(once), once))
