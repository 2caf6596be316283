"""Whatever bytes stand in site.toml: a site or one clear refusal, never anything else."""

from __future__ import annotations

import tomllib
from collections.abc import Callable
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from fertui.site.checks import SiteError
from fertui.site.files import parse_site
from fertui.site.layout import toml_of
from fertui.site.model import Site
from fertui.site.reading import site_from
from fertui.site.writing import tables_of

VALID = b"""
[site]
name = "Elm Lane"
timezone = "UTC"
[[loops]]
name = "north"
layout = "shared-tank"
area_m2 = 1000
tank_l = 5000
crop = "lettuce"
medium = "none"
water = "well"
stock_tanks = ["calcium"]
[loops.bands.tank]
K_share = { low = 20, high = 30, source = "own" }
[[waters]]
name = "well"
ions = { Ca = 1.5, HCO3 = 3 }
[[stock_tanks]]
name = "calcium"
litres = 100
[[supplies]]
name = "bag"
kind = "KNO3"
label_pct = { N = 13, K = 38 }
[targets.mine.tank]
EC = 2.0
ions = { K = 6 }
source = "own"
[[instruments]]
name = "pen"
kind = "EC meter"
compensated = true
[scales]
step_kg = 0.01
[budget]
N_kg_per_ha = 25
"""

odd_values: st.SearchStrategy[Any] = st.recursive(
    st.none().map(lambda _: "") | st.booleans() | st.integers() | st.floats() | st.text(max_size=20),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=10), inner, max_size=3),
    max_leaves=6,
)


def refusal(read: Callable[[], Site]) -> str | None:
    """What a refused reading says, None where it was accepted; anything else fails the test."""
    try:
        read()
    except SiteError as refused:
        return str(refused)
    return None


def answered(raw: bytes) -> None:
    said = refusal(lambda: parse_site(raw))
    assert said is None or said.startswith("site.toml")


@given(st.binary(max_size=300))
@settings(max_examples=200)
def test_any_bytes(raw: bytes) -> None:
    answered(raw)


@given(st.integers(0, len(VALID) - 1), st.integers(0, 40), st.binary(max_size=8))
@settings(max_examples=400)
def test_a_valid_file_damaged_anywhere(start: int, cut: int, put: bytes) -> None:
    answered(VALID[:start] + put + VALID[start + cut :])


@st.composite
def with_one_odd_value(draw: st.DrawFn) -> dict[str, Any]:
    """The tables of a valid site with the value at a random place replaced, removed or added."""
    data = tomllib.loads(VALID.decode())
    table: Any = data
    while True:
        keys = list(table) if isinstance(table, dict) else list(range(len(table)))
        key = draw(st.sampled_from(keys)) if keys else None
        if key is not None and isinstance(table[key], dict | list) and draw(st.booleans()):
            table = table[key]
            continue
        break
    if key is None or draw(st.integers(0, 9)) == 0:
        return {**data, draw(st.text(max_size=10)): draw(odd_values)}
    table[key] = draw(odd_values)
    return data


@given(with_one_odd_value())
@settings(max_examples=400, suppress_health_check=[HealthCheck.too_slow])
def test_any_value_anywhere(data: dict[str, Any]) -> None:
    """Read, and where it is accepted written and read back to the same site."""
    said = refusal(lambda: site_from(data))
    if said is None:
        site = site_from(data)
        assert parse_site(toml_of(tables_of(site)).encode()) == site
    else:
        assert said.startswith("site.toml")


@pytest.mark.long
@given(with_one_odd_value(), st.integers(0, len(VALID) - 1), st.integers(0, 40), st.binary(max_size=8))
@settings(max_examples=10_000, suppress_health_check=[HealthCheck.too_slow])
def test_twenty_thousand(data: dict[str, Any], start: int, cut: int, put: bytes) -> None:
    """An odd value and a damaged file, ten thousand of each."""
    said = refusal(lambda: site_from(data))
    assert said is None or said.startswith("site.toml")
    answered(VALID[:start] + put + VALID[start + cut :])


def test_the_valid_file_is_valid() -> None:
    assert parse_site(VALID).loops[0].tank_l == 5000
