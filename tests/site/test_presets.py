"""Bands, limits and targets: the loop's over the site's over the crop's, each with its source."""

from __future__ import annotations

import pytest

from fertui.site.checks import SiteError
from fertui.site.model import Composition, Loop, Site, Sourced
from fertui.site.presets import bands_of, limits_of, root_zone_water, target_of

SLAB = Loop("slab", "drain-blend", 1000.0, "tomato", "stone-wool")
NFT = Loop("nft", "shared-tank", 400.0, "lettuce", "none", tank_l=2000.0)
SITE = Site("Elm Lane", "UTC", (SLAB, NFT))


def test_without_own_words_the_crop_counts() -> None:
    """Root-zone K share of tomato 18-28 % and Na 8 mmol/L: common practice, and the Dutch booklet 2016."""
    assert bands_of(SITE, SLAB, "root_zone")["K share"] == Sourced(18, 28, "common practice, no source")
    assert limits_of(SITE, SLAB, "root_zone")["Na"].high == 8
    assert limits_of(SITE, SLAB, "feed")["NH4"].high == 1.5


def test_loop_over_site_over_crop() -> None:
    own = {"root_zone": {"K share": Sourced(20, 30, "site"), "Mg share": Sourced(10, 20, "site")}}
    site = SITE._replace(bands=own, limits={"root_zone": {"Na": Sourced(None, 12, "permit")}})
    loop = SLAB._replace(bands={"root_zone": {"K share": Sourced(22, 32, "loop")}})
    bands = bands_of(site, loop, "root_zone")
    assert bands["K share"].source == "loop"
    assert bands["Mg share"].source == "site"
    assert "unverified preset" in bands["Ca share"].source
    assert limits_of(site, loop, "root_zone")["Na"].high == 12
    assert limits_of(site, loop, "root_zone")["Cl"].high == 8


def test_drain_follows_the_root_zone_unless_it_has_its_own() -> None:
    loop = SLAB._replace(bands={"root_zone": {"EC": Sourced(3, 5, "loop")}})
    assert bands_of(SITE, loop, "drain")["EC"].source == "loop"
    loop = loop._replace(bands={**loop.bands, "drain": {"EC": Sourced(3, 6, "drain")}})
    assert bands_of(SITE, loop, "drain")["EC"].source == "drain"
    assert bands_of(SITE, loop, "root_zone")["EC"].source == "loop"


def test_without_a_medium_the_root_zone_is_the_tank() -> None:
    loop = NFT._replace(
        bands={"tank": {"EC": Sourced(1.5, 2.0, "loop")}}, limits={"tank": {"Na": Sourced(None, 3, "x")}}
    )
    assert bands_of(SITE, loop, "root_zone") == bands_of(SITE, loop, "tank")
    assert limits_of(SITE, loop, "root_zone") == limits_of(SITE, loop, "tank")
    assert limits_of(SITE, loop, "tank")["NH4"].high == 1.5
    on_slabs = loop._replace(medium="perlite")
    assert limits_of(SITE, on_slabs, "root_zone")["NH4"].high == 0.5


def test_points_of_targets_follow_the_layout() -> None:
    assert set(target_of(SITE, SLAB)) == {"feed", "root_zone", "drain"}
    assert set(target_of(SITE, NFT)) == {"feed", "tank", "root_zone"}
    assert target_of(SITE, NFT)["feed"].ions["K"] == 11
    assert target_of(SITE, SLAB._replace(layout="shared-tank"))["feed"].ec == 1.6


def test_stage_shifts_the_feed_target() -> None:
    """Dutch booklet 2016 (second-hand): fruit set K +1.5 on 9.5."""
    assert target_of(SITE, SLAB._replace(stage="fruit-set"))["feed"].ions["K"] == 11


def test_published_solutions_are_the_aim_at_feed_and_roots() -> None:
    """Hoagland & Arnon 1950, Circular 347: K 6, Ca 5, Mg 2."""
    aims = target_of(SITE, NFT, "hoagland-1")
    assert aims["tank"] == aims["feed"]
    assert {ion: aims["tank"].ions[ion] for ion in ("K", "Ca", "Mg")} == {"K": 6, "Ca": 5, "Mg": 2}
    loop = NFT._replace(target="hoagland-1")
    assert bands_of(SITE, loop, "tank")["K share"].low == 25
    assert bands_of(SITE, loop, "tank")["pH"] == bands_of(SITE, NFT, "tank")["pH"]


def test_own_targets_go_first_and_unknown_ones_are_refused() -> None:
    own = {"feed": Composition({"K": 8.0}, source="own trial")}
    site = SITE._replace(targets={"tomato": own})
    assert target_of(site, SLAB) == own
    with pytest.raises(SiteError, match="hoagland-1"):
        target_of(SITE, SLAB, "hoagland-3")


@pytest.mark.parametrize(
    ("loop", "litres"),
    [
        (SLAB._replace(root_zone_water_l_per_m2=8.0), 8.0),
        (SLAB._replace(medium_volume_l_per_m2=10.0, medium="coir"), 6.5),
        (NFT, 0.0),
    ],
)
def test_root_zone_water(loop: Loop, litres: float) -> None:
    """Slabs hold water in 60-75 % of their volume (common practice, no source); coir 65 % by the catalogue."""
    found, source = root_zone_water(loop)
    assert found == pytest.approx(litres)
    assert source


def test_slabs_hold_sixty_to_seventy_five_percent() -> None:
    """6-12 L of slab per m2, water in 60-75 % of it (common practice, no source)."""
    assert 6 * 0.60 <= root_zone_water(SLAB)[0] <= 12 * 0.75
