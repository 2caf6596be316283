"""The examples of docs/model.md chapters 4 and 5, worked again: by hand as printed there, and by the engine."""

from __future__ import annotations

from math import exp, log
from pathlib import Path

import numpy as np
import pytest

from fertui.chemistry.conductivity import linearise
from fertui.chemistry.ions import Array, shares
from fertui.loop import (
    INERT,
    ROOT,
    UPTAKE_TABLE,
    Circuit,
    Drive,
    Medium,
    Plants,
    Timeline,
    hold_ec,
    hold_ph,
    simulate,
    start,
)
from tests.loop.plain_model import ions

PAGE = (Path(__file__).parents[2] / "docs" / "model.md").read_text(encoding="utf-8")


def test_worked_day_by_hand_and_by_the_engine() -> None:
    """Potassium of one m2 of NFT: 10 L at 6 mmol/L, 2 L of crop water, uptake concentration 7 mmol/L at 6 mmol/L."""
    k_start = 2.0 * 7.0 / (6.0 - 0.03)
    half = (60.0 + 0.5 * k_start * 0.03) / (1.0 + 0.5 * k_start / 10.0)
    middle = half / 10.0
    carriers = ((middle - 0.03) / (0.05 + middle - 0.03)) / ((6.0 - 0.03) / (0.05 + 6.0 - 0.03))
    uptake = 14.0 * exp(0.4 * log(middle / 6.0)) * carriers
    k_middle = uptake / (middle - 0.03)
    w = k_middle / 10.0
    end = 60.0 * exp(-w) + 0.03 * k_middle * (1.0 - exp(-w)) / w
    for digits in (
        f"{k_start:.4f}",
        f"{half:.2f}",
        f"{uptake:.2f}",
        f"{k_middle:.4f}",
        f"{end:.2f}",
        f"{60 - end:.2f}",
    ):
        assert digits in worked_day(), digits

    circuit = Circuit("shared-tank", 1.0, 10.0, mixed=True)
    plants = Plants(ions(K=7.0), ions(K=6.0), 2.0)
    run = simulate(
        circuit, INERT, plants, start(circuit, INERT, ions(K=6.0)), Timeline(((0.0, Drive(crop_l_d=2.0)),)), [1.0]
    )
    row = run.account().row("K")
    assert row["start_mmol"] == pytest.approx(60.0)
    assert row["end_mmol"] == pytest.approx(end, rel=1e-9)
    assert row["uptake"] == pytest.approx(end - 60.0, rel=1e-9)


def worked_day() -> str:
    begin = PAGE.index("**A day by hand.**")
    return PAGE[begin : PAGE.index("**Layouts.**", begin)]


BASE = ions(K=9.5, Ca=5.4, Mg=2.4, NH4=1.2, NO3=15, Cl=1, SO4=4.4, H2PO4=1.5)
FRUIT_SET = BASE + ions(K=1.5, Ca=-0.5, Mg=-0.25)
"""Tomato feed and its change at fruit set: K +1.5, Ca -0.5, Mg -0.25 (Dutch booklet 2016, second-hand)."""
TAKEN = ions(K=6.5, Ca=2.75, Mg=1.0, NH4=1.0, NO3=10.75, Na=0.2, Cl=0.8, SO4=1.5, H2PO4=1.25)
"""Closed tomato top-up as mean uptake (Dutch tables, from memory)."""
TARGET = ions(K=8, Ca=10, Mg=4.5, Na=3, NH4=0.1, NO3=22, Cl=5, SO4=6.8, H2PO4=1.0)
WELL = ions(K=0.1, Ca=1.3, Mg=0.5, Na=0.5, Cl=0.5, SO4=0.4, HCO3=2.9)
ORGANIC = 10.0 ** np.array([-1.45, 0.0, -0.2, -1.9, -1.5])


def potassium_share(medium: Medium) -> Array:
    """K share [%] of the root zone 0, 1, 3 and 10 days after a slab loop turns to the richer recipe.

    Per m2 of the demo's slab loop: 6.5 L of water in 10 L of medium, drain store 5 L, crop water 3.0, irrigation
    4.7 L/d (36 % drain), well water, feed EC 2.6, alkalinity 0.5; 60 days of the first recipe before the change.
    """
    circuit = Circuit("drain-blend", 1.0, 6.5, store_l=2.5, store_max_l=5.0)
    line, nitric = linearise(BASE), ions(NO3=1.0, HCO3=-1.0)
    before, after = (
        Drive(irrigation_l_d=4.7, crop_l_d=3.0, make_up=WELL, holds=(hold_ph(0.5, nitric), hold_ec(2.6, recipe, line)))
        for recipe in (BASE, FRUIT_SET)
    )
    timeline = Timeline(((0.0, before), (60.0, after)))
    plants = Plants(TAKEN, TARGET, 3.0)
    run = simulate(circuit, medium, plants, start(circuit, medium, TARGET), timeline, [60.0, 61.0, 63.0, 70.0, 90.0])
    return shares(run.concentrations(ROOT)[1:, 0])[:, 0]


def test_buffering_of_coir_beside_stone_wool_as_printed() -> None:
    inert, coir = potassium_share(INERT), potassium_share(Medium(400.0, ORGANIC))
    for name, found in (("stone wool", inert), ("coir", coir)):
        numbers = " | ".join(f"{value:.1f}" for value in found)
        assert f"| {name} | {numbers} |" in PAGE, f"| {name} | {numbers} |"
    rise = [(found[1:4] - found[0]) / (found[4] - found[0]) for found in (inert, coir)]
    assert (rise[1] < rise[0]).all()


@pytest.mark.parametrize("row", UPTAKE_TABLE, ids=lambda row: f"{row.name} {row.ion}")
def test_every_constant_lies_in_its_range_and_names_its_source(row: object) -> None:
    assert row.low <= row.value <= row.high
    assert row.unit
    assert row.source
    assert row.status in ("read", "derived", "assumed")
