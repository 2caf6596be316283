"""Ten invented loops of all layouts, for the engine and for the plain equations alike (per m2 of crop)."""

from __future__ import annotations

import numpy as np

from fertui.chemistry.conductivity import linearise
from fertui.chemistry.exchange import PHREEQC_SELECTIVITY
from fertui.chemistry.ions import Array
from fertui.loop import Circuit, Drive, Hold, Medium, Plants, State, hold_ec, hold_ph, start
from tests.loop.plain_model import Site, ions

UPTAKE = ions(K=6.5, Ca=2.75, Mg=1.0, Na=0.2, NH4=0.9, NO3=10.75, Cl=0.9, SO4=1.5, H2PO4=1.2)
ROOT = ions(K=8, Ca=8, Mg=4, Na=3, NH4=0.25, NO3=22, Cl=3, SO4=5, H2PO4=1.0, HCO3=0.25)
FEED = ions(K=9.5, Ca=5.4, Mg=2.4, Na=0.8, NH4=1.2, NO3=15, Cl=1.8, SO4=4.4, H2PO4=1.5, HCO3=0.5)
TOP_UP = ions(K=6.5, Ca=2.75, Mg=1.0, NH4=1.0, NO3=10.75, Cl=0.5, SO4=1.5, H2PO4=1.25)
RICH_IN_K = ions(K=12, Ca=4.5, Mg=2.0, Na=0.8, NH4=1.0, NO3=16, Cl=1.8, SO4=4.0, H2PO4=1.5, HCO3=0.5)
WELL = ions(K=0.1, Ca=1.5, Mg=0.4, Na=1.2, Cl=1.0, SO4=0.5, HCO3=2.9)
RAIN = ions(Na=0.2, Cl=0.2)
NITRIC = ions(NO3=1.0, HCO3=-1.0)
LINE = linearise(FEED)
EC = np.array(LINE.slope)
OFFSET = float(LINE.ec - LINE.slope @ LINE.at)
"""EC = OFFSET + EC . c; the plain equations get set points less OFFSET, so that both hold the same reading."""

CROP = {"uptake_concentration": UPTAKE, "reference": ROOT, "reference_l_d": 3.0}
ORGANIC = PHREEQC_SELECTIVITY * np.array([0.5, 1.0, 1.0, 1.0, 0.6])

SITES = (
    Site(
        "known-feed on stone wool", "known-feed", 8.0, ROOT, **CROP, crop_l_d=3.5, irrigation_l_d=5.0,
        feed=(FEED, FEED),
    ),
    Site(
        "known-feed on coir, feed turning richer in K", "known-feed", 8.0, ROOT, **CROP, crop_l_d=3.0,
        irrigation_l_d=4.5, capacity_meq=350.0, selectivity=ORGANIC, feed=(FEED, RICH_IN_K),
    ),
    Site(
        "known-feed on peat, little water", "known-feed", 6.0, 0.5 * ROOT, **CROP, crop_l_d=1.2, irrigation_l_d=1.6,
        capacity_meq=600.0, selectivity=PHREEQC_SELECTIVITY, feed=(RICH_IN_K, FEED),
    ),
    Site(
        "NFT, EC and pH held", "shared-tank", 6.0, 0.7 * ROOT, **CROP, mixed=True, crop_l_d=2.5, irrigation_l_d=0.0,
        make_up=WELL, ec=EC, hold_ec=2.0, proportions=TOP_UP, hold_alkalinity=0.5,
    ),
    Site(
        "raft, stock by logged litres, some bleed", "shared-tank", 120.0, 0.7 * ROOT, **CROP, mixed=True, crop_l_d=2.0,
        irrigation_l_d=0.0, make_up=RAIN, stock_mmol_d=2.2 * TOP_UP, bleed_l_d=1.0,
    ),
    Site(
        "ebb and flood on stone wool, EC and pH held", "shared-tank", 6.0, ROOT, **CROP, crop_l_d=3.0,
        irrigation_l_d=12.0, store_l=15.0, store0=FEED, make_up=WELL, ec=EC, hold_ec=2.6, proportions=TOP_UP,
        hold_alkalinity=0.5,
    ),
    Site(
        "troughs on coir, EC held, bleed", "shared-tank", 8.0, ROOT, **CROP, crop_l_d=4.0, irrigation_l_d=8.0,
        store_l=10.0, store0=FEED, capacity_meq=350.0, selectivity=ORGANIC, make_up=RAIN, ec=EC, hold_ec=2.6,
        proportions=TOP_UP, bleed_l_d=0.4,
    ),
    Site(
        "drain-blend on coir, a quarter of drain water", "drain-blend", 8.0, ROOT, **CROP, crop_l_d=3.0,
        irrigation_l_d=4.5, store_l=4.0, store0=ROOT, capacity_meq=350.0, selectivity=ORGANIC, make_up=WELL, ec=EC,
        hold_ec=2.7, proportions=FEED, hold_alkalinity=0.5, drain_share=0.25,
    ),
    Site(
        "drain-blend on stone wool, pre-mix EC", "drain-blend", 7.0, ROOT, **CROP, crop_l_d=3.0, irrigation_l_d=4.5,
        store_l=6.0, store0=ROOT, make_up=RAIN, ec=EC, hold_ec=2.6, proportions=FEED, premix_ec=0.9,
    ),
    Site(
        "drain-blend on new coir, nitrifying", "drain-blend", 8.0, ROOT, **CROP, crop_l_d=2.0, irrigation_l_d=3.2,
        store_l=3.0, store0=ROOT, capacity_meq=400.0, selectivity=ORGANIC, make_up=WELL, ec=EC, hold_ec=2.6,
        proportions=RICH_IN_K, hold_alkalinity=0.5, drain_share=0.2, nitrification_per_d=0.3,
    ),
)  # fmt: skip

NEW_COIR = np.array([0.60, 0.06, 0.04, 0.30, 0.0])
"""Equivalent fractions K Ca Mg Na NH4 on unbuffered coir: uptake_and_exchange.md table B7 (assumed there)."""


def engine(site: Site, members: int = 1) -> tuple[Circuit, Medium, Plants, State, Drive]:
    """The site as the engine wants it."""
    circuit = Circuit(
        site.layout, area_m2=1.0, root_zone_l=site.root_l, store_l=site.store_l, mixed=site.mixed,
        store_max_l=site.store_l if site.layout == "drain-blend" else np.inf,
        drain_share=site.drain_share, premix_ec=None if site.premix_ec is None else site.premix_ec + OFFSET,
    )  # fmt: skip
    medium = Medium(site.capacity_meq, PHREEQC_SELECTIVITY if site.selectivity is None else site.selectivity)
    plants = Plants(site.uptake_concentration, site.reference, site.reference_l_d)
    held = NEW_COIR if "new coir" in site.name else None
    state = start(circuit, medium, site.root0, site.store0, members=members, held=held)
    feed = (np.zeros(10), np.zeros(10)) if site.feed is None else site.feed
    drive = Drive(
        irrigation_l_d=site.irrigation_l_d, crop_l_d=site.crop_l_d, holds=holds(site), ec=LINE,
        make_up=np.zeros(10) if site.make_up is None else site.make_up, feed_from=feed[0], feed_to=feed[1],
        stock_mmol_d=np.zeros(10) if site.stock_mmol_d is None else site.stock_mmol_d, bleed_l_d=site.bleed_l_d,
        nitrification_per_d=site.nitrification_per_d,
    )  # fmt: skip
    return circuit, medium, plants, state, drive


def holds(site: Site) -> tuple[Hold, ...]:
    both: list[Hold] = []
    if site.hold_alkalinity is not None:
        both.append(hold_ph(site.hold_alkalinity, NITRIC))
    if site.hold_ec is not None and site.proportions is not None:
        both.append(hold_ec(site.hold_ec + OFFSET, site.proportions, LINE))
    return tuple(both)


def plain_start(site: Site) -> Array:
    """Start of the plain equations, equal to the engine's: amounts in the store, in the root zone with its sites."""
    _, _, _, state, _ = engine(site)
    amounts = state.ions_mmol[0].copy()
    amounts[1, :5] += state.exchanged_meq[0] / np.array([1, 2, 2, 1, 1])
    return amounts.reshape(20)
