"""What a plan says of its bands: only what is out, by the numbers the tables show."""

from __future__ import annotations

import numpy as np

from fertui.chemistry.ions import vector
from fertui.planning.goal import goal_of
from fertui.planning.reasons import outside_words
from tests.paper.hand_made import SITE, SLABS

GOAL = goal_of(SITE, SLABS, "root_zone", None)._replace(
    share_low=np.array([0.18, 0.481, 0.203]), share_high=np.array([0.28, 0.601, 0.283])
)
END = vector({"K": 6.8, "Ca": 11.1, "Mg": 5.6})
"""Equivalents 6.8 : 22.2 : 11.2 of 40.2, shares 16.9, 55.2 and 27.9 % (by hand)."""


def test_only_the_share_that_is_out_is_named_with_its_band() -> None:
    assert outside_words(END, {"K": 16.9, "Ca": 55.3, "Mg": 27.9}, GOAL) == "K share 17 %, band 18-28 %"


def test_a_share_that_the_table_shows_inside_is_said_to_be_at_the_edge() -> None:
    assert outside_words(END, {"K": 18.0, "Ca": 55.3, "Mg": 27.9}, GOAL) == "K share at the edge of its band 18-28 %"


def test_two_shares_out_are_both_named() -> None:
    words = outside_words(END, {"K": 14.0, "Ca": 62.4, "Mg": 23.6}, GOAL)
    assert words == "K share 14 %, band 18-28 %; Ca share 62 %, band 48.1-60.1 %"


def test_a_solution_too_thin_for_shares_is_said_to_be_empty() -> None:
    assert outside_words(vector({"K": 0.03, "Ca": 0.03}), {}, GOAL) == "hardly any K, Ca and Mg is left"
