"""Acid and base over the whole family: closure, order, refusals."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fertui.chemistry.acidity import (
    ACIDS,
    BASES,
    Water,
    acid_demand,
    alkalinity,
    base_demand,
    ph,
    solution_ml_per_m3,
    total_carbonate,
)
from fertui.refusals import Refusal

alkalinities = st.floats(0.5, 6.0)
starts = st.floats(6.8, 8.3)
targets = st.floats(4.5, 6.5)


def _dosed(water: Water, acid: str, dose: float) -> Water:
    """The water with the acid's own buffer in it."""
    extra = {"phosphoric": "phosphate", "sulfuric": "sulfate"}.get(acid)
    return water._replace(**{extra: getattr(water, extra) + dose}) if extra else water


@pytest.mark.parametrize("acid", [name for name in ACIDS if name != "citric"])
@settings(max_examples=25, deadline=None)
@given(alkalinity_meq=alkalinities, start=starts, target=targets)
def test_dosed_water_has_the_target_ph(acid: str, alkalinity_meq: float, start: float, target: float) -> None:
    """Alkalinity less the acid's constant protons, with the acid's buffer added, stands at the target pH."""
    water = Water.hard(alkalinity_meq)
    dose = acid_demand(alkalinity_meq, start, target, open_to_air=False, acid=acid)
    zero_level_protons = {"nitric": 1, "hydrochloric": 1, "sulfuric": 2, "phosphoric": 1}[acid]
    carbonate = total_carbonate(alkalinity_meq, start, water)
    left = alkalinity_meq - zero_level_protons * dose
    assert ph(left, _dosed(water, acid, dose), carbonate) == pytest.approx(target, abs=1e-5)


@pytest.mark.parametrize("acid", ACIDS)
@settings(max_examples=25, deadline=None)
@given(alkalinity_meq=alkalinities, start=starts, target=targets)
def test_an_open_tank_takes_more_than_a_closed_line(
    acid: str, alkalinity_meq: float, start: float, target: float
) -> None:
    closed, is_open = (acid_demand(alkalinity_meq, start, target, way, acid=acid) for way in (False, True))
    assert 0 < closed < is_open


@pytest.mark.parametrize("acid", ACIDS)
@settings(max_examples=25, deadline=None)
@given(alkalinity_meq=alkalinities, start=starts, target=targets, deeper=st.floats(0.1, 0.5))
def test_a_deeper_target_takes_more(
    acid: str, alkalinity_meq: float, start: float, target: float, deeper: float
) -> None:
    near, far = (acid_demand(alkalinity_meq, start, goal, False, acid=acid) for goal in (target, target - deeper))
    assert far > near


@pytest.mark.parametrize("acid", ACIDS)
def test_protons_rise_with_ph_and_stay_within_the_formula(acid: str) -> None:
    given_off = ACIDS[acid].protons(np.linspace(1, 12, 60), Water(ionic_strength=0.01))
    assert np.all(np.diff(given_off) >= 0)
    assert given_off.min() >= 0
    assert given_off.max() <= {"nitric": 1, "hydrochloric": 1, "sulfuric": 2, "phosphoric": 3, "citric": 3}[acid]


@pytest.mark.parametrize("base", BASES)
@settings(max_examples=25, deadline=None)
@given(alkalinity_meq=st.floats(0.2, 1.5), start=st.floats(4.6, 5.4), target=st.floats(5.6, 6.4))
def test_base_brings_the_water_to_its_target(base: str, alkalinity_meq: float, start: float, target: float) -> None:
    dose = base_demand(alkalinity_meq, start, target, open_to_air=False, base=base)
    water = Water.hard(alkalinity_meq)
    carbonate = total_carbonate(alkalinity_meq, start, water) + BASES[base].carbonate * dose
    assert ph(alkalinity_meq + BASES[base].alkalinity * dose, water, carbonate) == pytest.approx(target, abs=1e-5)


def test_acid_and_base_undo_each_other() -> None:
    water = Water.hard(3.0)
    carbonate = total_carbonate(3.0, 7.72, water)
    acid = acid_demand(3.0, 7.72, 5.8, open_to_air=False, ionic_strength=water.ionic_strength)
    left = alkalinity(5.8, water, carbonate)
    assert left == pytest.approx(3.0 - acid)


def test_members_are_dosed_together() -> None:
    doses = acid_demand(np.array([1.0, 2.0, 3.0]), np.array([7.3, 7.5, 7.7]), 5.8, open_to_air=False)
    assert doses.shape == (3,)
    assert doses[2] == pytest.approx(acid_demand(3.0, 7.7, 5.8, open_to_air=False))


def test_sulfuric_takes_half_of_nitric() -> None:
    """Two protons a molecule at nutrient pH (textbook)."""
    nitric, sulfuric = (acid_demand(3.0, 7.7, 5.8, True, acid=acid) for acid in ("nitric", "sulfuric"))
    assert nitric / sulfuric == pytest.approx(2.0, rel=1e-3)


def test_volume_of_strong_acid() -> None:
    """60 % nitric acid, 1367.3 kg/m3 (Laliberte 2009): 13.02 mol/L, 76.8 mL/m3 for 1 meq/L."""
    assert solution_ml_per_m3(1.0, "nitric", 60, 1367.3) == pytest.approx(76.8, abs=0.05)


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        ((float("nan"), 7.5, 5.8, False), "measure it"),
        ((3.0, 5.8, 6.5, False), "use a base"),
        ((0.1, 7.0, 5.8, False, 20.0, "phosphoric", None, {"H2PO4": 3, "HCO3": 0.1}), "do not fit together"),
        ((3.0, 7.5, 5.8, False, 20.0, "vinegar"), "nitric, hydrochloric"),
    ],
)
def test_no_dose_without_sense(arguments: tuple, says: str) -> None:
    with pytest.raises(Refusal, match=says):
        acid_demand(*arguments)


def test_bicarbonate_cannot_pass_its_own_ph() -> None:
    with pytest.raises(Refusal, match="as much CO2"):
        base_demand(0.5, 5.0, 9.0, open_to_air=False, base="KHCO3")
