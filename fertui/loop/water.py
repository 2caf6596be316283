"""Where the water goes within one step, for every member: nothing runs below empty, nothing above full."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from fertui.chemistry.ions import Array
from fertui.loop.values import ROOT, STORE, Circuit, Drive


class Flows(NamedTuple):
    """Mean flows over a step [L/d], each (M,).

    ``to_root``: store into root zone; ``back``: drain into the store; ``lost_root``: out of the root zone and the loop
    (drain of known-feed, bleed of a mixed volume); ``lost_store``: bleed and overflow; ``fresh_store``, ``fresh_root``:
    make-up water (with the feed in drain-blend); ``feed``: known feed; ``crop``: what the crop could take;
    ``overflow``: the part of the losses that ran over; ``change`` (M, 2): of the water held.
    """

    to_root: Array
    back: Array
    lost_root: Array
    lost_store: Array
    fresh_store: Array
    fresh_root: Array
    feed: Array
    crop: Array
    overflow: Array
    change: Array


def flows(circuit: Circuit, drive: Drive, water_l: Array, days: float, share: Array | None = None) -> Flows:
    """Flows of one step from the water held (M, 2) [L]; ``share`` (M,): store water in the feed of a drain-blend loop.

    Irrigation first refills a root zone that fell dry, then runs off as drain. The crop takes nothing below
    ``driest``; a tank that is dry gives nothing; what does not fit runs over.
    """
    if circuit.mixed:
        return _mixed(circuit, drive, water_l, days)
    if circuit.layout == "shared-tank":
        return _shared_tank(circuit, drive, water_l, days)
    if circuit.layout == "drain-blend":
        return _drain_blend(circuit, drive, water_l, days, share)
    return _known_feed(circuit, drive, water_l, days)


def _each(value: npt.ArrayLike, like: Array) -> Array:
    """A flow of every member, none below zero."""
    if isinstance(value, float):
        return np.full(like.shape, max(value, 0.0))
    return np.maximum(np.broadcast_to(np.asarray(value, dtype=float), like.shape), 0.0)


def _root_zone(circuit: Circuit, drive: Drive, root: Array, kept: Array, days: float) -> tuple[Array, Array]:
    """Crop water that can be had and the change of root-zone water, from the irrigation that stays there."""
    spare = np.maximum(root - circuit.driest * circuit.root_zone_l, 0.0) / days
    crop = np.minimum(_each(drive.crop_l_d, root), kept + spare)
    return crop, kept - crop


def _wanted(circuit: Circuit, drive: Drive, root: Array, days: float) -> Array:
    """Irrigation the root zone can hold back: what the crop takes and what is missing to full."""
    return np.maximum(_each(drive.crop_l_d, root) + (circuit.root_zone_l - root) / days, 0.0)


def _shared_tank(circuit: Circuit, drive: Drive, water_l: Array, days: float) -> Flows:
    store, root = water_l[:, STORE], water_l[:, ROOT]
    bleed = np.minimum(_each(drive.bleed_l_d, store), store / days)
    condensate = _each(drive.condensate_l_d, store)
    irrigation = _each(drive.irrigation_l_d, store)
    wanted = np.minimum(irrigation, _wanted(circuit, drive, root, days))
    if drive.make_up_l_d is None:
        fresh = np.maximum((circuit.store_l - store) / days + wanted + bleed - condensate, 0.0)
    else:
        fresh = _each(drive.make_up_l_d, store)
    kept = np.minimum(wanted, np.maximum(store / days + fresh + condensate - bleed, 0.0))
    crop, root_change = _root_zone(circuit, drive, root, kept, days)
    change = fresh + condensate - bleed - kept
    overflow = np.maximum(store / days + change - circuit.store_max_l / days, 0.0)
    nothing = np.zeros_like(store)
    running = np.maximum(irrigation, kept)
    return Flows(
        to_root=running, back=running - kept, lost_root=nothing, lost_store=bleed + overflow, fresh_store=fresh,
        fresh_root=nothing, feed=nothing, crop=crop, overflow=overflow,
        change=np.stack([change - overflow, root_change], axis=1),
    )  # fmt: skip


def _mixed(circuit: Circuit, drive: Drive, water_l: Array, days: float) -> Flows:
    held = water_l[:, ROOT]
    bleed = np.minimum(_each(drive.bleed_l_d, held), held / days)
    condensate = _each(drive.condensate_l_d, held)
    crop_wanted = _each(drive.crop_l_d, held)
    if drive.make_up_l_d is None:
        fresh = np.maximum((circuit.root_zone_l - held) / days + crop_wanted + bleed - condensate, 0.0)
    else:
        fresh = _each(drive.make_up_l_d, held)
    spare = np.maximum(held - circuit.driest * circuit.root_zone_l, 0.0) / days
    crop = np.minimum(crop_wanted, np.maximum(spare + fresh + condensate - bleed, 0.0))
    change = fresh + condensate - bleed - crop
    most = max(circuit.store_max_l, circuit.root_zone_l)
    overflow = np.maximum(held / days + change - most / days, 0.0)
    nothing = np.zeros_like(held)
    return Flows(
        to_root=nothing, back=nothing, lost_root=bleed + overflow, lost_store=nothing, fresh_store=nothing,
        fresh_root=fresh, feed=nothing, crop=crop, overflow=overflow,
        change=np.stack([nothing, change - overflow], axis=1),
    )  # fmt: skip


def _drain_blend(circuit: Circuit, drive: Drive, water_l: Array, days: float, share: Array | None) -> Flows:
    store, root = water_l[:, STORE], water_l[:, ROOT]
    irrigation = _each(drive.irrigation_l_d, store)
    kept = np.minimum(irrigation, _wanted(circuit, drive, root, days))
    crop, root_change = _root_zone(circuit, drive, root, kept, days)
    drain = irrigation - kept
    bleed = np.minimum(_each(drive.bleed_l_d, store), store / days + drain)
    there = np.maximum(store / days + drain - bleed, 0.0)
    reuse = there - circuit.store_l / days if share is None else share * irrigation
    to_root = np.clip(reuse, 0.0, np.minimum(there, irrigation))
    overflow = np.maximum(there - to_root - circuit.store_max_l / days, 0.0)
    nothing = np.zeros_like(store)
    change = drain - bleed - to_root - overflow
    return Flows(
        to_root=to_root, back=drain, lost_root=nothing, lost_store=bleed + overflow, fresh_store=nothing,
        fresh_root=irrigation - to_root, feed=nothing, crop=crop, overflow=overflow,
        change=np.stack([change, root_change], axis=1),
    )  # fmt: skip


def _known_feed(circuit: Circuit, drive: Drive, water_l: Array, days: float) -> Flows:
    root = water_l[:, ROOT]
    feed = _each(drive.irrigation_l_d, root)
    kept = np.minimum(feed, _wanted(circuit, drive, root, days))
    crop, root_change = _root_zone(circuit, drive, root, kept, days)
    nothing = np.zeros_like(root)
    return Flows(
        to_root=nothing, back=nothing, lost_root=feed - kept, lost_store=nothing, fresh_store=nothing,
        fresh_root=nothing, feed=feed, crop=crop, overflow=nothing, change=np.stack([nothing, root_change], axis=1),
    )  # fmt: skip
