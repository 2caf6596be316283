"""Media: every number has source and status, one convention, lookups by name; the loads close."""

from __future__ import annotations

import numpy as np
import pytest

from fertui.catalogue.figures import STATUSES, CatalogueError
from fertui.catalogue.media import media, medium
from fertui.chemistry.exchange import CONVENTION, PHREEQC_SELECTIVITY, batch, loading
from fertui.chemistry.ions import CATION_CHARGE, CATIONS


@pytest.mark.parametrize("each", media(), ids=lambda each: each.name)
def test_every_number_has_a_source_with_a_status(each) -> None:
    figures = [each.capacity_meq_per_l, each.volume_l_per_m2, each.water_fraction, *each.log10_selectivity.values()]
    for figure in figures:
        assert figure.source.text
        assert figure.source.status in STATUSES
        assert figure.sd >= 0.0
    assert each.load_source.status in STATUSES


@pytest.mark.parametrize("each", media(), ids=lambda each: each.name)
def test_constants_are_in_the_convention_of_the_exchanger(each) -> None:
    assert each.convention == CONVENTION
    mean, sd = each.selectivity()
    assert mean.shape == sd.shape == (5,)
    assert mean[CATIONS.index("Ca")] == sd[CATIONS.index("Ca")] == 0.0
    assert loading([6.0, 5.0, 2.0, 3.0, 0.5], 10.0**mean).sum() == pytest.approx(1.0)


@pytest.mark.parametrize("each", [each for each in media() if each.initial_load], ids=lambda each: each.name)
def test_a_new_medium_is_loaded_with_all_of_its_sites(each) -> None:
    assert each.load().sum() == pytest.approx(1.0, abs=1e-9)
    assert (each.load() >= 0.0).all()


@pytest.mark.parametrize("name", ["none", "stone-wool", "perlite"])
def test_inert_media_do_not_exchange(name: str) -> None:
    assert not medium(name).exchanges


def test_mineral_media_start_from_the_constants_of_phreeqc() -> None:
    """phreeqc.dat, EXCHANGE_SPECIES."""
    mean, _ = medium("lapilli").selectivity()
    np.testing.assert_allclose(10.0**mean, PHREEQC_SELECTIVITY, rtol=1e-9)


def test_buffered_coir_is_new_coir_after_its_soak() -> None:
    """100 meq Ca per litre in 0.6 L, PHREEQC constants, from K .60 Na .30 Ca .06 Mg .04: as the source says."""
    start = 50.0 * np.array([0.60, 0.06, 0.04, 0.30, 0.0])
    _, sites = batch(start / CATION_CHARGE + np.array([0.0, 50.0, 0.0, 0.0, 0.0]), 0.6, 50.0, PHREEQC_SELECTIVITY)
    np.testing.assert_allclose(medium("coir").load(), sites / 50.0, atol=0.005)


def test_slabs_hold_the_water_of_practice() -> None:
    """60-75 % of 6-12 L of slab per m2 (common practice, no source)."""
    for name in ("stone-wool", "coir", "coir-new"):
        assert 0.60 <= medium(name).water_fraction.mean <= 0.75
        assert 6.0 <= medium(name).volume_l_per_m2.mean <= 12.0


def test_capacities_lie_in_the_published_ranges() -> None:
    """Coir 16-48 (Evans et al. 1996), 20-95 (Abad et al. 2002), peat 86-183 potential (Rippy & Nelson 2007) meq/L."""
    assert 20.0 <= medium("coir").capacity_meq_per_l.mean <= 48.0
    assert 86.0 <= medium("peat").capacity_meq_per_l.mean <= 183.0


@pytest.mark.parametrize("name", ["zeolite", "coir-new", "vermiculite"])
def test_media_that_deserve_a_warning_carry_one(name: str) -> None:
    assert len(medium(name).warning) > 80


@pytest.mark.parametrize(
    ("written", "name"),
    [
        ("Coir", "coir"),
        ("rockwool", "stone-wool"),
        ("Stone wool", "stone-wool"),
        ("coir_new", "coir-new"),
        ("tuff", "lapilli"),
    ],
)
def test_names_as_people_write_them(written: str, name: str) -> None:
    assert medium(written).name == name


def test_an_unknown_medium_is_refused_with_the_nearest() -> None:
    with pytest.raises(CatalogueError, match=r"'perlit' is not a medium; nearest: perlite\. Media: none, stone-wool"):
        medium("perlit")
