"""What drives the loop through every stretch of a record: water, feed, stock by litres or by holding EC."""

from __future__ import annotations

from collections.abc import Iterator
from typing import NamedTuple

import numpy as np

from fertui.chemistry.conductivity import Linearised, linearise
from fertui.chemistry.ions import INDEX, Array
from fertui.estimate import compositions
from fertui.estimate.record import Record
from fertui.estimate.setting import Setting
from fertui.estimate.unanalysed import filled_up
from fertui.estimate.waters import ASSUMED, DRAINED, LOGGED, MOST_TAKEN, Waters, waters
from fertui.loop import Drive, Hold, hold_ec
from fertui.site.model import StockTank

_HCO3 = INDEX["HCO3"]
BALANCED_SHARE, ASSUMED_SHARE = 0.5, 1.0
"""How much of the log water factor moves crop water that was balanced, or assumed, instead of drained."""


class Drives(NamedTuple):
    """Rates of every stretch of ``grid`` [d]; ``drive`` puts one together for an ensemble."""

    setting: Setting
    grid: Array
    water: Waters
    make_up: tuple[Array, ...]
    """What fills up (10,) in every stretch; nan where nobody analysed it: each member then has its own guess."""
    stock_mmol_d: Array
    feeds: Array
    holds: tuple[tuple[Hold, ...], ...]
    ec: Linearised | None
    assumed: tuple[str, ...]

    def drive(self, span: int, log_drain: Array, log_stock: Array) -> Drive:
        """The drive of one stretch for members whose drain (M,) and stock (M, 10) are off by these log factors."""
        water = self.water
        make_up = water.make_up[span]
        return Drive(
            irrigation_l_d=float(water.irrigation[span]),
            crop_l_d=crop_water(water, span, log_drain),
            make_up=filled_up(self.make_up[span], self.setting.loop.name, len(log_drain)),
            make_up_l_d=None if np.isnan(make_up) else float(make_up),
            condensate_l_d=float(water.condensate[span]),
            stock_mmol_d=self.stock_mmol_d[span] * np.exp(log_stock)
            if self.stock_mmol_d[span].any()
            else self.stock_mmol_d[span],
            holds=tuple(leaning(hold, log_stock) for hold in self.holds[span]),
            ec=self.ec,
            feed_from=self.feeds[span],
            feed_to=self.feeds[span + 1],
        )


def crop_water(water: Waters, span: int, log_drain: Array) -> Array:
    """Crop water (M,) [L/d] of a stretch: irrigation less a drain that is off by a factor, at least 3 % of it left."""
    if water.origin[span] == DRAINED:
        drain = np.minimum(water.drain[span] * np.exp(log_drain), MOST_TAKEN * water.irrigation[span])
        return water.irrigation[span] - drain
    share = ASSUMED_SHARE if water.origin[span] == ASSUMED else BALANCED_SHARE
    return water.crop[span] * np.exp(share * log_drain)


def leaning(hold: Hold, log_stock: Array) -> Hold:
    """A hold whose stock is off by factors (M, 10)."""
    return Hold(hold.cause, hold.proportions * np.exp(log_stock), hold.slope, hold.offset, hold.set_point)


def drives(record: Record, setting: Setting, grid: Array) -> Drives:
    """The drives of a record over the stretches of a grid [d]."""
    days = np.maximum(np.diff(grid), 1e-9)
    starts = grid[:-1]
    make_up = tuple(record.make_up_as_said(time) for time in starts)
    holding = Holding(record, setting)
    covered = record.stock.covered(grid) >= LOGGED
    holds = tuple(() if logged else holding.holds(time) for logged, time in zip(covered, starts, strict=True))
    return Drives(
        setting, grid, waters(record, setting, grid), make_up, record.stock.over(grid) / days[:, None],
        _feeds(record, setting, grid), holds, holding.ec, _assumptions(record, setting, holds),
    )  # fmt: skip


def _feeds(record: Record, setting: Setting, grid: Array) -> Array:
    """Known feed (times, 10) at every time of the grid; flat before the first and after the last that is known."""
    if not record.feed:
        return np.tile(compositions.array(compositions.target_feed(record.site, record.loop).ions), (len(grid), 1))
    times = np.array([when for when, _ in record.feed])
    knots = np.array([composition for _, composition in record.feed])
    place = np.clip(np.searchsorted(times, grid, side="right") - 1, 0, len(times) - 1)
    after = np.minimum(place + 1, len(times) - 1)
    width = np.maximum(times[after] - times[place], 1e-9)
    part = np.clip((grid - times[place]) / width, 0.0, 1.0)[:, None]
    return knots[place] + part * (knots[after] - knots[place])


def stock_proportions(record: Record, time: float) -> Array:
    """The feed (10,) [mmol/L] that the stocks make: recipe, else what was mixed and the water, else the target's."""
    return carried(record, time) + record.make_up_at(time)


def carried(record: Record, time: float) -> Array:
    """What the stocks themselves bring into that feed (10,) [mmol/L]: a recipe or target less what the water brings."""
    recipe, water = record.recipes.at(time), record.make_up_at(time)
    mixed = sum((held / tank.dilution for tank, held in _held(record, time)), np.zeros(len(INDEX)))
    if recipe is None and mixed.any():
        return mixed
    feed = compositions.array(compositions.target_feed(record.site, record.loop).ions)
    return beyond(feed if recipe is None else recipe, water)


def beyond(feed: Array, water: Array) -> Array:
    """A feed (10,) or (M, 10) less what the water brings; the feed itself where nothing would be left."""
    left = np.maximum(feed - water, 0.0)
    left[..., _HCO3] = 0.0
    return left if left.any() else np.maximum(feed, 0.0)


def _held(record: Record, time: float) -> Iterator[tuple[StockTank, Array]]:
    """The loop's stock tanks and what each holds at a time [mmol/L]."""
    moment = record.moment(time)
    for tank in compositions.stock_tanks_of(record.site, record.loop):
        batches = record.stock_held.get(tank.name, ())
        contents = [held for entry, held in batches if entry is None or entry.at <= moment]
        if contents:
            yield tank, contents[-1]


class Holding:
    """Stock dosed to hold EC: what it carries and the set point, each from its time on."""

    def __init__(self, record: Record, setting: Setting) -> None:
        self.record, self.setting = record, setting
        self.ec = linearise(self._feed(0.0)) if _is_dosed(record, setting) else None
        self.made: dict[tuple[float, bytes], tuple[Hold, ...]] = {}

    def _feed(self, time: float) -> Array:
        feed = stock_proportions(self.record, time).copy()
        feed[_HCO3] = 0.0
        return feed

    def set_point(self, time: float) -> float | None:
        """EC set point in force [mS/cm], by the light of the day where the grower set it so."""
        given = self.record.setpoints.at(time) or {}
        stated = {name: value for name, value in given.items() if isinstance(value, (int, float))}
        light = self.record.light.get(self.record.local_day(time))
        if light is not None and {"EC_dull", "EC_bright", "light_dull", "light_bright"} <= stated.keys():
            ends = (stated["light_dull"], stated["light_bright"]), (stated["EC_dull"], stated["EC_bright"])
            return float(np.interp(light, *ends))
        own = stated.get("EC") or self.setting.loop.feed_ec
        return own or compositions.target_feed(self.record.site, self.record.loop).ec

    def holds(self, time: float) -> tuple[Hold, ...]:
        """The one hold of a time, or none."""
        set_point = self.set_point(time)
        if self.ec is None or set_point is None:
            return ()
        stock = carried(self.record, time)
        key = (set_point, stock.tobytes())
        if key not in self.made:
            self.made[key] = self.made_for(set_point, stock)
        return self.made[key]

    def made_for(self, set_point: float, stock: Array) -> tuple[Hold, ...]:
        """Stock in these proportions (10,) or (M, 10), dosed to an EC; none where it would not raise the EC."""
        assert self.ec is not None
        return (hold_ec(set_point, stock, self.ec),) if np.all(stock @ self.ec.slope > 0) else ()


def _is_dosed(record: Record, setting: Setting) -> bool:
    """Whether stock is dosed by set point: always where stocks make the feed, in a tank only once anyone said so."""
    if setting.loop.layout == "known-feed" or not (setting.loop.stock_tanks or record.recipes.times):
        return False
    said = len(record.stock.start) or record.recipes.times or record.setpoints.times
    return setting.loop.layout == "drain-blend" or bool(said)


def _assumptions(record: Record, setting: Setting, holds: tuple[tuple[Hold, ...], ...]) -> tuple[str, ...]:
    words = []
    if setting.loop.layout == "known-feed" and not record.feed:
        words.append("no feed analysis or recipe: the feed of the target")
    if any(holds) and not len(record.stock.start):
        words.append("stock used was not logged: dosed to hold the EC set point")
    return tuple(words)
