"""The coming days as drives: the last week's routine, changed by the plan that was entered, changed by a what-if."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import datetime
from functools import cached_property
from typing import NamedTuple

import numpy as np

from fertui.chemistry.conductivity import conductivity
from fertui.chemistry.ions import INDEX, Array
from fertui.estimate import compositions
from fertui.estimate.assimilation import Estimate
from fertui.estimate.drives import Holding, beyond, carried, leaning
from fertui.estimate.expected import Planned, expected_words, is_coming, plans_of
from fertui.estimate.noise import normals
from fertui.estimate.scenario import Scenario
from fertui.estimate.standing import begun_from, shared_store
from fertui.estimate.unanalysed import filled_up
from fertui.estimate.walk import grid_of
from fertui.estimate.waters import DRAINED, lately
from fertui.loop import Drive, Event, Hold

WEEK = 7
BLEED_DAYS = 14.0
WATER_SD, PLANNED_WATER_SD = (0.08, 0.35), 0.08
"""Bounds of the spread (log) of coming crop water, learned from the last fortnight; of planned water."""
FEED_SD, FEED_COMMON_SD, FEED_WEIGHT = 0.10, 0.06, 4.0
"""How far a feed wanders in a fortnight when nobody planned it (log): prior, and its weight in analyses."""
WATER_PER_LIGHT = 0.0025
"""Crop water [L/m2 per J/cm2] where light was never logged beside water: 2-3 mL, from memory."""
_HCO3 = INDEX["HCO3"]


class _Water(NamedTuple):
    reference: Array


class Routine(NamedTuple):
    """Drives of the coming stretches: ``grid`` [d from the record's zero], one drive for each, and the events."""

    grid: Array
    water: _Water
    drives: tuple[Drive, ...]
    events: tuple[Event, ...]
    assumed: tuple[str, ...]
    inputs: str

    def drive(self, span: int, log_drain: Array, log_stock: Array) -> Drive:
        """The drive of one stretch; drain factors are already in it, stock follows the members."""
        drive = self.drives[span]
        return _with_stock(drive, log_stock)


def _with_stock(drive: Drive, log_stock: Array) -> Drive:
    if not drive.holds and not np.any(drive.stock_mmol_d):
        return drive
    return drive._replace(
        holds=tuple(leaning(hold, log_stock) for hold in drive.holds),
        stock_mmol_d=drive.stock_mmol_d * np.exp(log_stock),
    )


def routine(estimate: Estimate, days: int, scenario: Scenario, settled: bool) -> Routine:
    """The coming days of an estimate under a scenario. ``settled``: every member gets the same water and feed."""
    return _Builder(estimate, days, scenario, settled).built()


class _Builder:
    """Puts the coming days together, the assumption beside each part."""

    def __init__(self, estimate: Estimate, days: int, scenario: Scenario, settled: bool) -> None:
        self.estimate, self.scenario, self.settled = estimate, scenario, settled
        self.record, self.setting, self.loop = estimate.record, estimate.setting, estimate.loop
        self.now, self.end = self.record.end, self.record.end + days
        self.plans = plans_of(self.record)
        self.assumed: list[str] = [*shared_store(self.record.site, self.loop), *begun_from(estimate)]
        self.assumed += expected_words(self.record, self.plans)
        self.holding = Holding(self.record, self.setting)
        self.past = lately(self.record, self.setting)
        self.draw = normals(estimate.seed, self.loop.name, f"ahead {estimate.at.date()}", estimate.members, 12)
        if settled:
            self.draw = np.zeros_like(self.draw)

    def built(self) -> Routine:
        """Grid, drives and events of the horizon."""
        events = self._events()
        steps = [each.begin for each in self.plans] + [each.end for each in self.plans]
        steps += [self.record.time(each.at) for each in self.scenario.recipes]
        marks = [self.now + day for day in range(1, int(round(self.end - self.now)))]
        grid = grid_of(self.now, self.end, marks, [event.at for event in events], [s for s in steps if np.isfinite(s)])
        reference = np.full(len(grid) - 1, self.estimate.drives.water.reference[-1])
        made = tuple(self._drive(float(begin), float(end)) for begin, end in zip(grid, grid[1:], strict=False))
        inputs = "what-if" if self.scenario != Scenario() else "plan" if self.plans else "routine"
        return Routine(grid, _Water(reference), made, tuple(events), tuple(dict.fromkeys(self.assumed)), inputs)

    def _planned(self, name: str, time: float) -> float | None:
        """The number a plan in force at a time gives for something."""
        found = None
        for plan in self.plans:
            if plan.begin <= time + 1e-6 < plan.end and plan.entry.number_of(name) is not None:
                found = plan.entry.number_of(name)
        return found

    def _drive(self, begin: float, end: float) -> Drive:
        crop, irrigation = self._water(begin)
        said = self._source(begin)
        if np.isnan(said).any() and self.loop.layout != "known-feed":
            self._assume("the make-up water was never analysed: what it holds is guessed, differently by each member")
        water = filled_up(said, self.loop.name, 1 if self.settled else self.estimate.members)
        feed_from, feed_to = self._known_feed(begin), self._known_feed(end)
        holds, stock = self._stock(begin, np.nan_to_num(said))
        return Drive(
            irrigation_l_d=irrigation, crop_l_d=crop, make_up=water, make_up_l_d=None, stock_mmol_d=stock, holds=holds,
            ec=self.holding.ec, feed_from=feed_from, feed_to=feed_to, bleed_l_d=self._bleed(),
        )  # fmt: skip

    def _water(self, time: float) -> tuple[Array, Array]:
        """Crop water and irrigation (M,) [L/d]: what-if, else plan, else light, else the last week's mean."""
        if not self.record.has_crop(self.now):
            self._assume("no crop stands: nothing is taken up")
            return np.zeros(self.estimate.members), np.zeros(self.estimate.members)
        usual_crop, usual_irrigation = (float(each[-WEEK:].mean()) for each in (self.past.crop, self.past.irrigation))
        area = self.loop.area_m2
        irrigation, drain = self._planned("irrigation", time), self._planned("drain", time)
        planned = self._planned("crop", time)
        if planned is None and irrigation is not None and drain is not None:
            planned = max(irrigation - drain, 0.03 * irrigation)
        light = self.scenario.light_j_per_cm2_d or self._planned("light_sum", time)
        if self.scenario.crop_water_l_per_m2_d is not None:
            crop, sd = self.scenario.crop_water_l_per_m2_d * area, PLANNED_WATER_SD
        elif planned is not None and self.scenario.light_j_per_cm2_d is None:
            crop, sd = planned, PLANNED_WATER_SD
        elif light is not None:
            crop, sd = light * self._per_light(usual_crop), PLANNED_WATER_SD
        else:
            crop, sd = usual_crop, self._water_sd()
            self._assume(f"crop water as in the last week: {usual_crop / area:.2g} L/m2 a day")
        running = irrigation if irrigation is not None else crop * max(usual_irrigation / max(usual_crop, 1e-9), 1.0)
        members = crop * np.exp(sd * self.draw[:, 0]) * self._drain_factor(crop, running)
        return np.minimum(
            members, max(running, crop) if self.loop.layout != "shared-tank" else np.inf
        ), running * np.exp(sd * self.draw[:, 0])

    def _drain_factor(self, crop: float, irrigation: float) -> Array:
        """What an error of the drain means for crop water (M,), as in the record."""
        drain = max(irrigation - crop, 0.0)
        if self.past.origin[-1] != DRAINED or crop <= 0:
            return np.exp(0.5 * self.estimate.ensemble.drain)
        wrong = np.minimum(drain * np.exp(self.estimate.ensemble.drain), 0.97 * irrigation)
        return np.maximum(irrigation - wrong, 0.0) / crop

    def _water_sd(self) -> float:
        recent = self.past.crop
        recent = recent[recent > 0]
        spread = float(np.std(np.log(recent))) / np.sqrt(3.0) if len(recent) > 3 else 0.15
        return float(np.clip(spread, *WATER_SD))

    def _per_light(self, usual_crop: float) -> float:
        """Crop water [L/d of the loop] per J/cm2: the last week's own, else a usual figure."""
        today = self.record.local_day(self.now)
        week = [light for day, light in self.record.light.items() if today - WEEK <= day <= today and light > 0]
        if week:
            return usual_crop / float(np.mean(week))
        self._assume("light was not logged beside water: 2.5 mL/m2 per J/cm2 taken")
        return WATER_PER_LIGHT * self.loop.area_m2

    def _source(self, time: float) -> Array:
        planned = [each.entry.text_of("source") for each in self.plans if each.begin <= time < each.end]
        named = self.scenario.source or next((name for name in reversed(planned) if name), "")
        logged = self.record.sources.at(self.now) or self.loop.water
        return self.record.as_said(named or logged, self.now)

    def _recipe(self, time: float) -> tuple[Mapping[str, float | Array] | None, bool]:
        """The recipe a what-if or a plan sets at a time, if any, and whether it was a what-if."""
        given = [each for each in self.scenario.recipes if self.record.time(each.at) <= time + 1e-6]
        if given:
            return max(given, key=lambda each: each.at).ions, True
        if self.scenario.recipe is not None:
            return self.scenario.recipe, True
        found: dict[str, float | Array] = {}
        for plan in self.plans:
            if plan.begin <= time + 1e-6 < plan.end:
                found |= compositions.entry_ions(plan.entry)
        return found or None, False

    def _known_feed(self, time: float) -> Array:
        """Known feed (M, 10) at a time: what-if or plan, else the last one, wandering as this feed has wandered."""
        last = self.estimate.drives.feeds[-1]
        recipe, _ = self._recipe(time)
        if recipe is not None:
            feed = compositions.array({**compositions.mapping_of(last), **recipe})
            return self._at_ec(np.broadcast_to(feed, (self.estimate.members, 10)).copy(), time)
        if self.loop.layout != "known-feed":
            return last
        self._assume("the feed stays as last known; a plan of the coming feed makes the forecast better")
        width = np.sqrt(max(time - self.now, 0.0) / 14.0)
        spread = np.zeros((self.estimate.members, 10))
        spread[:, :_HCO3] = self._feed_sd * self.draw[:, 1:10] + FEED_COMMON_SD * self.draw[:, 10, None]
        return self._at_ec(last * np.exp(width * spread), time)

    def _at_ec(self, feed: Array, time: float) -> Array:
        """The feed at the EC asked for; diluted or strengthened as a whole."""
        wanted = self.scenario.feed_ec or self._planned("EC", time)
        if wanted is None or self.loop.layout != "known-feed":
            return feed
        return feed * wanted / max(float(conductivity(feed.mean(axis=0))), 0.05)

    @cached_property
    def _feed_sd(self) -> Array:
        """How far each ion of the feed wanders in a fortnight (9,): from its own analyses, towards the prior."""
        knots = self.record.feed
        squares = np.full(9, FEED_WEIGHT * FEED_SD**2)
        for (before, old), (after, new) in zip(knots, knots[1:], strict=False):
            change = np.log(np.maximum(new[:9], 0.05) / np.maximum(old[:9], 0.05))
            squares += (change - change.mean()) ** 2 * np.clip(14.0 / max(after - before, 1.0), 0.25, 4.0)
        return np.sqrt(squares / (FEED_WEIGHT + max(len(knots) - 1, 0)))

    def _stock(self, time: float, water: Array) -> tuple[tuple[Hold, ...], Array]:
        """Stock held to the EC set point, in the proportions in force; else the last week's litres."""
        nothing = np.zeros(10)
        if self.loop.layout == "known-feed":
            return (), nothing
        if self.holding.ec is None:
            return (), self._fed_nothing()
        recipe, _ = self._recipe(time)
        set_point = self.scenario.feed_ec or self._planned("EC", time) or self.holding.set_point(self.now)
        if set_point is None:
            usual = self._usual_stock()
            return (), usual if usual.any() else self._fed_nothing()
        self._assume(f"stock is dosed to hold EC {set_point:.2g}")
        stock = carried(self.record, self.now) if recipe is None else beyond(compositions.array(recipe), water)
        return self.holding.made_for(set_point, stock), nothing

    def _fed_nothing(self) -> Array:
        """No stock (10,) [mmol/d], and the words for it: a loop that is fed all the same only lacks the entries."""
        self._assume(
            "nothing feeds the loop in these sums: no stock of the last week is logged; log stock, batch or recipe"
        )
        return np.zeros(10)

    def _usual_stock(self) -> Array:
        return self.record.stock.over(np.array([self.now - WEEK, self.now]))[0] / WEEK

    def _bleed(self) -> float:
        """Bleed [L/d]: what-if, else the mean of the last fortnight where it is a habit (two or more)."""
        if self.scenario.bleed_l_per_d is not None:
            return self.scenario.bleed_l_per_d
        recent = [each for each in self.record.events if each.cause == "bleed" and each.at > self.now - BLEED_DAYS]
        if len(recent) < 2 or self.loop.layout == "known-feed":
            return 0.0
        rate = sum(float(np.max(each.litres)) for each in recent) / BLEED_DAYS
        self._assume(f"bleed as in the last fortnight: {rate:.0f} L a day")
        return rate

    def _events(self) -> list[Event]:
        found = [self._dosed(each.at, each.salt, each.kg, each.adds_mmol) for each in self.scenario.doses]
        for renewal in self.scenario.renewals:
            at = self._soon(self.record.time(renewal.at))
            refill = compositions.array(renewal.refill)
            litres = np.asarray(renewal.litres, dtype=float)
            found.append(Event(at, "bleed", litres=litres, reason="renewal"))
            found.append(Event(at, "make_up", refill * litres[..., None], litres))
        for plan in self.plans:
            if is_coming(self.record, plan):
                found += self._planned_events(plan)
        return sorted((each for each in found if each.at < self.end), key=_in_order)

    def _planned_events(self, plan: Planned) -> list[Event]:
        """Doses and bleeds that are accepted and still to do."""
        entry, found = plan.entry, []
        if entry.text_of("salt") and (kg := plan.amount("kg")):
            found.append(self._dosed(entry.at, entry.text_of("salt"), kg, None))
        if litres := plan.amount("bleed"):
            found.append(Event(self._soon(plan.begin), "bleed", litres=litres, reason="planned"))
        return found

    def _dosed(self, at: datetime, salt: str, kg: float | Array, adds: Array | None) -> Event:
        ions = (
            adds
            if adds is not None
            else np.asarray(kg, dtype=float)[..., None] * compositions.per_kg(self.record.site, salt)
        )
        return Event(self._soon(self.record.time(at)), "dose", np.asarray(ions))

    def _soon(self, time: float) -> float:
        """Not before now: what is planned for a time gone by happens at once."""
        return max(time, self.now)

    def _assume(self, text: str) -> None:
        self.assumed.append(text)


def _in_order(event: Event) -> tuple[float, bool]:
    """Events by time; of one moment what is let go and refilled before what is weighed in, or it would go with it."""
    return event.at, event.cause == "dose"
