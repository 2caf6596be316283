"""The loop as an ordinary differential equation, written out plainly: the second opinion on the engine.

Nothing here comes from ``fertui.loop`` but the description of the ten invented sites. Stock and acid are dosed by a
very fast proportional controller instead of a set point; water is constant in every vessel.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.integrate import solve_ivp

from fertui.chemistry.exchange import batch
from fertui.chemistry.ions import INDEX, Array

Z = np.array([1, 2, 2, 1, 1, -1, -1, -2, -1, -1.0])
B = np.array([0.4, 1, 1, 1, 1, 0.4, 0.4, 1, 0.4, 0])
Q = np.array([0.6, 0.6, 0.6, 1, 0.6, 0.6, 1, 0.6, 0.6, 1])
KM = np.array([0.05, 0.04, 0.05, 0.02, 0.02, 0.05, 0.02, 0.03, 0.01, 1])
CMIN = np.array([0.03, 0.03, 0.02, 0, 0.005, 0.01, 0, 0, 0.005, 0])
K, CA, MG, NA, NH4, NO3, CL, SO4, P, ALK = range(10)
CONTROLLER_PER_D = 20000.0


@dataclass(frozen=True)
class Site:
    """An invented loop, per m2 of crop [L/m2, mmol/m2, meq/m2]; the same numbers for engine and equations."""

    name: str
    layout: str
    root_l: float
    root0: Array
    uptake_concentration: Array
    reference: Array
    reference_l_d: float
    crop_l_d: float
    irrigation_l_d: float
    store_l: float = 0.0
    store0: Array | None = None
    mixed: bool = False
    capacity_meq: float = 0.0
    selectivity: Array | None = None
    make_up: Array | None = None
    feed: tuple[Array, Array] | None = None
    stock_mmol_d: Array | None = None
    ec: Array | None = None
    hold_ec: float | None = None
    proportions: Array | None = None
    hold_alkalinity: float | None = None
    drain_share: float | None = None
    premix_ec: float | None = None
    bleed_l_d: float = 0.0
    nitrification_per_d: float = 0.0


def uptake(site: Site, c: Array) -> Array:
    """Section 4 of docs/model.md for concentrations (10, n) [mmol/L] -> [mmol/d] (10, n)."""
    reference = site.reference[:, None]
    water = site.crop_l_d**Q * site.reference_l_d ** (1 - Q)
    above, above_reference = np.maximum(c - CMIN[:, None], 0), reference - CMIN[:, None]
    carriers = above / (KM[:, None] + above) * (KM[:, None] + above_reference) / above_reference
    taken = (water * site.uptake_concentration)[:, None] * carriers
    taken *= (np.maximum(c, 1e-12) / np.maximum(reference, 1e-12)) ** B[:, None]
    rivals = (np.maximum(c[K] + c[NH4], 1e-12) / (reference[K] + reference[NH4])) ** -0.15
    taken[[CA, MG]] *= np.clip(rivals, 0.5, 2.0)
    taken[NO3] *= (1 + reference[NA] / 62.5) / (1 + c[NA] / 62.5)
    taken[ALK] = Z[:ALK] @ taken[:ALK]
    return taken


def right_hand_side(site: Site, days: float) -> Callable[[float, Array], Array]:
    """dy/dt for y = amounts in store (10) and root zone with its sites (10), columns vectorised."""
    root_l, store_l, irrigation = site.root_l, site.store_l, site.irrigation_l_d
    drain = irrigation - site.crop_l_d

    def rates(t: float, y: Array) -> Array:
        y = y.reshape(20, -1)
        store, root = y[:10] / store_l if store_l else np.zeros_like(y[:10]), y[10:] / root_l
        if site.capacity_meq:
            root[:5] = batch(np.maximum(y[10:15].T, 0), root_l, site.capacity_meq, site.selectivity)[0].T
        d_root = -uptake(site, root)
        nitrified = site.nitrification_per_d * root_l * root[NH4]
        d_root[NH4] -= nitrified
        d_root[NO3] += nitrified
        d_root[ALK] -= 2 * nitrified
        d_store = np.zeros_like(store)
        if site.layout == "known-feed":
            feed = site.feed[0] + t / days * (site.feed[1] - site.feed[0])
            d_root += irrigation * feed[:, None] - drain * root
        elif site.mixed:
            d_root += (site.crop_l_d + site.bleed_l_d) * site.make_up[:, None] - site.bleed_l_d * root
            d_root += dosed(site, root, root_l)
        elif site.layout == "shared-tank":
            d_root += irrigation * store - drain * root
            d_store += drain * root - irrigation * store - site.bleed_l_d * store
            d_store += (site.crop_l_d + site.bleed_l_d) * site.make_up[:, None] + dosed(site, store, store_l)
        else:
            reused = irrigation * share(site, store)
            feed = blended(site, (reused * store + (irrigation - reused) * site.make_up[:, None]) / irrigation)
            d_root += irrigation * feed - drain * root
            d_store += drain * root - reused * store - (drain - reused) * store
        return np.concatenate([d_store, d_root])

    return rates


def share(site: Site, store: Array) -> Array:
    """Store water in the feed of a drain-blend loop; the store stays full, what is not reused runs over."""
    if site.premix_ec is not None:
        fresh, drained = site.ec @ site.make_up, site.ec @ store
        return np.clip((site.premix_ec - fresh) / (drained - fresh), 0, 1)
    return np.full(store.shape[1], site.drain_share)


def blended(site: Site, premix: Array) -> Array:
    """Feed of a drain-blend loop: acid to the alkalinity, then stock to the EC."""
    feed = premix.copy()
    if site.hold_alkalinity is not None:
        acid = np.maximum(feed[ALK] - site.hold_alkalinity, 0)
        feed[NO3] += acid
        feed[ALK] -= acid
    lacking = np.maximum(site.hold_ec - site.ec @ feed, 0) / (site.ec @ site.proportions)
    return feed + lacking * site.proportions[:, None]


def dosed(site: Site, c: Array, litres: float) -> Array:
    """Stock and acid that a controller doses into a held vessel [mmol/d]."""
    dose = np.zeros_like(c)
    if site.stock_mmol_d is not None:
        dose += site.stock_mmol_d[:, None]
    if site.hold_alkalinity is not None:
        acid = CONTROLLER_PER_D * litres * np.maximum(c[ALK] - site.hold_alkalinity, 0)
        dose[NO3] += acid
        dose[ALK] -= acid
    if site.hold_ec is not None:
        lacking = np.maximum(site.hold_ec - site.ec @ c, 0) / (site.ec @ site.proportions)
        dose += CONTROLLER_PER_D * litres * lacking * site.proportions[:, None]
    return dose


def solve(site: Site, y0: Array, days: float) -> Array:
    """Amounts (20,) after ``days`` by scipy's BDF, rtol 1e-6, vectorised right-hand side."""
    result = solve_ivp(
        right_hand_side(site, days), (0, days), y0, method="BDF", rtol=1e-6, atol=1e-7, vectorized=True
    )  # fmt: skip
    assert result.success, result.message
    return result.y[:, -1]


def ions(**mmol_l: float) -> Array:
    composition = np.zeros(10)
    for name, value in mmol_l.items():
        composition[INDEX[name]] = value
    return composition
