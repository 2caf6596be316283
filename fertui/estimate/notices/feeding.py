"""Stock tanks and injector: EC off its set point, unequal draw, EC the stock does not explain, stock running out."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import date, datetime, time, timedelta

import numpy as np

from fertui.chemistry.conductivity import conductivity
from fertui.chemistry.ions import IONS, Array
from fertui.estimate import compositions
from fertui.estimate.notices.look import Look
from fertui.estimate.notices.notice import ACT, POINT_WORDS, WATCH, Notice, plain
from fertui.estimate.notices.stocks import amounts, day_grid, drawn, stock_left
from fertui.site.model import StockTank

EC_NEAR = 0.2
"""EC this near its set point [mS/cm] is on it: 0.2-0.3 is usually sufficient (extension video on injector checks)."""
EC_OFF = 0.3
"""EC this far from its set point wants looking at (same source)."""
EC_FRESH_DAYS = 2.0

DRAW_LOOK, DRAW_STOP = 0.02, 0.05
"""Draw of the stock tanks differing by more: look; stop and check the injector (common practice, no source).
Injectors more than 5 % off want repair (Ontario floriculture extension 2017)."""
DRAW_DAYS, DRAW_SURE_DAYS = 7, 3
SURE = 2.0
"""A difference smaller than so many standard errors of its own daily scatter is reading of the dip stick."""

UNEXPLAINED = 0.10
"""EC at the drip this far from what stock and blend make, against the loop's own past (common practice, no source)."""
UNEXPLAINED_ALONE = 0.15
"""The same where there is no past to compare with: the blend's composition is an estimate."""
TOPPED_UP = 0.25
"""Stock per m3 of make-up water changed by more: light and stage move it by less (common practice, no source)."""
RECENT_DAYS, PAST_DAYS = 3, 14
LEAST_PAST_DAYS = 4

MORNING = time(8, 0)
"""When a staffed day begins (common practice, no source)."""
WARNING_DAYS = 1.0


def near_set_point(look: Look) -> str:
    """What EC shows beside a share that is out: '' where it was not read lately or has no set point."""
    read = look.last("EC", (look.fed_from,), EC_FRESH_DAYS)
    if read is None or look.set_ec is None:
        return ""
    if abs(read.value - look.set_ec) <= EC_NEAR:
        return "EC is on set point."
    return f"EC reads {read.value:.1f}, set {look.set_ec:.1f} mS/cm."


def off_set_point(look: Look) -> Iterator[Notice]:
    """EC of the feed away from its set point."""
    read = look.last("EC", (look.fed_from,), EC_FRESH_DAYS)
    if read is None or look.set_ec is None or abs(read.value - look.set_ec) <= EC_OFF:
        return
    text = f"EC {POINT_WORDS[look.fed_from]} reads {read.value:.1f} mS/cm, set point {look.set_ec:.1f}. Read again, then check dosing."
    yield Notice("ec_off_set", WATCH, text, "r")


def unequal_draw(look: Look) -> Iterator[Notice]:
    """Stock tanks that should draw alike and do not, beyond what their own daily scatter explains."""
    tanks = compositions.stock_tanks_of(look.site, look.loop)
    litres = _daily_draws(look, tanks)
    if litres is None:
        return
    strong = litres * np.array([tank.dilution for tank in tanks])
    totals = strong.sum(axis=0)
    most, least = int(totals.argmax()), int(totals.argmin())
    ratio = float(totals[most] / totals[least])
    days = len(strong)
    scatter = float(np.log(strong[:, most] / strong[:, least]).std(ddof=1) / np.sqrt(days)) if days > 1 else 0.0
    certain = days >= DRAW_SURE_DAYS and np.log(ratio) > SURE * scatter
    if ratio - 1.0 <= DRAW_LOOK or not (certain or ratio - 1.0 > DRAW_STOP):
        return
    names = f"{tanks[most].name} tank draws {100 * (ratio - 1):.0f} % more than {tanks[least].name}"
    amount = f"({plain(litres[:, most].sum())} against {plain(litres[:, least].sum())} L in {days} days)"
    stop = ratio - 1.0 > DRAW_STOP and certain
    advice = "Stop and check the injector." if stop else "Look at the injector."
    yield Notice("unequal_draw", ACT if stop else WATCH, f"{names} {amount}. {advice}", "8")


def _daily_draws(look: Look, tanks: tuple[StockTank, ...]) -> Array | None:
    """Litres (days, tanks) of the last days on which every tank was logged; None where there is none."""
    if len(tanks) < 2:
        return None
    grid = day_grid(look.at, look.zone, DRAW_DAYS)
    used = look.of("stock")
    flows = [drawn(used, tank.name, look.at, look.zone) for tank in tanks]
    logged = np.all([flow.covered(grid) > 0.99 for flow in flows], axis=0)
    litres = np.stack([flow.over(grid) for flow in flows], axis=1)
    kept = litres[logged & (litres > 0).all(axis=1)]
    return kept if len(kept) else None


def unexplained(look: Look) -> Iterator[Notice]:
    """EC that the litres of stock used do not explain: injector, stock mixed wrong, or meter."""
    yield from {"drain-blend": _blend, "shared-tank": _topped_up}.get(look.loop.layout, _nothing)(look)


def _nothing(look: Look) -> Iterator[Notice]:
    yield from ()


def _blend(look: Look) -> Iterator[Notice]:
    """Blend of drain and make-up plus stock, as logged, against EC read at the drip; day by day, then lately against past."""
    measured, expected = _blended_days(look)
    known = ~np.isnan(measured / expected)
    ratios = (measured / expected)[known]
    if not known[-RECENT_DAYS - 1 :].any():
        return
    lately, past = np.median(ratios[-RECENT_DAYS:]), ratios[:-RECENT_DAYS]
    usual = float(np.median(past)) if len(past) >= LEAST_PAST_DAYS else 1.0
    allowed = UNEXPLAINED if len(past) >= LEAST_PAST_DAYS else UNEXPLAINED_ALONE
    if abs(lately / usual - 1.0) <= allowed:
        return
    read = float(np.mean(measured[known][-RECENT_DAYS:]))
    yield Notice(
        "ec_unexplained", WATCH,
        f"EC at the drip reads {read:.1f} mS/cm; blend and stock used make {read * usual / lately:.1f}. "
        "Check injector, stock strength and EC meter.", "4",
    )  # fmt: skip


def _blended_days(look: Look) -> tuple[Array, Array]:
    """EC at the drip of every past day, measured and expected from the log; nan where something was not logged."""
    days = RECENT_DAYS + PAST_DAYS
    grid = day_grid(look.at, look.zone, days)
    water = look.of("water")
    flows = {name: amounts(water, name, look.at, look.zone) for name in ("irrigation", "make_up")}
    held = look.estimate.record.stock
    stock = held.over(grid + look.estimate.record.end)
    given = [flow.covered(grid) > 0.99 for flow in flows.values()]
    logged = np.all([*given, held.covered(grid + look.estimate.record.end) > 0.99], axis=0)
    irrigation = np.where(logged, flows["irrigation"].over(grid), np.nan)[:, None]
    fresh = np.clip(flows["make_up"].over(grid)[:, None] / irrigation, 0.0, 1.0)
    drain, source = _drain_of_days(look, days), compositions.of_water(look.site, look.loop.water)
    blend = (1.0 - fresh) * drain + fresh * source + stock / irrigation
    return _read_of_days(look, days), np.where(np.isnan(blend).any(axis=1), np.nan, conductivity(np.nan_to_num(blend)))


def _drain_of_days(look: Look, days: int) -> Array:
    """What the drain store held (days, 10) [mmol/L] on every past day, as estimated; nan before the estimate began."""
    by_day = {look.local(each.at).date(): each.points for each in look.estimate.trail}
    dates = list(look.days_back(days))[::-1]
    rows = [[by_day[day]["drain_store"].ions[ion].mmol_l.value for ion in IONS] if day in by_day else _UNKNOWN for day in dates]
    return np.array(rows)


_UNKNOWN = [np.nan] * len(IONS)


def _read_of_days(look: Look, days: int) -> Array:
    """Mean EC read at the drip on every past day (days,), oldest first; nan where none was."""
    by_day: dict[date, list[float]] = {}
    for each in look.measured("EC", ("feed",), days + 1.0):
        by_day.setdefault(look.local(each.at).date(), []).append(each.value)
    return np.array([np.mean(by_day[day]) if day in by_day else np.nan for day in list(look.days_back(days))[::-1]])


def _topped_up(look: Look) -> Iterator[Notice]:
    """Stock per m3 of make-up that a shared tank needs to hold its EC, lately against before."""
    lately, usual = _strength(look, -RECENT_DAYS, 0.0), _strength(look, -RECENT_DAYS - PAST_DAYS, -RECENT_DAYS)
    if lately is None or usual is None or usual <= 0 or abs(lately / usual - 1.0) <= TOPPED_UP:
        return
    change = 100.0 * (lately / usual - 1.0)
    yield Notice(
        "ec_unexplained", WATCH,
        f"Holding EC took {abs(change):.0f} % {'more' if change > 0 else 'less'} stock per m3 of make-up water than usual "
        f"({plain(1000 * lately)} against {plain(1000 * usual)} mS/cm x L). Check stock strength, leaks and meters.", "4",
    )  # fmt: skip


def _strength(look: Look, since: float, until: float) -> float | None:
    """EC [mS/cm] that stock added per litre of make-up, less what the tank rose by; None where the log has gaps."""
    window = np.array([since, until]) + (look.today_begins - 0.0)
    make_up = amounts(look.of("water"), "make_up", look.at, look.zone)
    record = look.estimate.record
    covered = [make_up.covered(window)[0], record.stock.covered(window + record.end)[0]]
    litres = float(make_up.over(window)[0])
    rise = _rise(look, window)
    if min(covered) < 0.9 or litres <= 0 or rise is None:
        return None
    tank = sum(look.estimate.volumes_l.values())
    added = conductivity(record.stock.over(window + record.end)[0] / litres)
    return float(added) - rise * tank / litres


def _rise(look: Look, window: Array) -> float | None:
    """Change of EC in the tank over a time [mS/cm]: mean of the readings about its end less those about its start."""
    read = [(-look.age_days(each.at), each.value) for each in look.measured("EC", ("tank",), -float(window[0]) + 2.0)]
    ends = [[value for when, value in read if abs(when - edge) <= 1.0] for edge in window]
    return float(np.mean(ends[1]) - np.mean(ends[0])) if all(ends) else None


def running_out(look: Look) -> Iterator[Notice]:
    """Stock that does not last until somebody is there to mix."""
    staffed = next_staffed(look)
    until = (staffed - look.at).total_seconds() / 86400.0
    for name, left in stock_left(look.site, look.loop, look.past, look.at).items():
        if left.days is None or left.days > until + WARNING_DAYS:
            continue
        act = left.days <= until
        text = f"{name} stock lasts {left.days:.1f} days ({plain(left.litres)} L); the next staffed day is {look.day(staffed)}."
        yield Notice("stock_low", ACT if act else WATCH, f"{text} Mix {'today' if act else 'on ' + look.day(staffed)}.", "m")


def next_staffed(look: Look) -> datetime:
    """The morning of the next staffed day after today."""
    for ahead in range(1, 8):
        day = look.today + timedelta(days=ahead)
        if f"{day:%a}" in look.site.staffed_days:
            return datetime.combine(day, MORNING, look.zone)
    return datetime.combine(look.today + timedelta(days=1), MORNING, look.zone)
