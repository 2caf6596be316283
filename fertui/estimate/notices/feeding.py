"""Stock tanks and injector: EC off its set point, tanks that draw unequally, stock running out."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import datetime, time, timedelta

import numpy as np

from fertui.chemistry.ions import Array
from fertui.estimate import compositions
from fertui.estimate.notices.look import Look
from fertui.estimate.notices.notice import ACT, WATCH, Notice, plain
from fertui.estimate.notices.stocks import day_grid, drawn, stock_left
from fertui.site.model import StockTank
from fertui.site.points import at_point

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

MORNING = time(8, 0)
"""When a staffed day begins (common practice, no source)."""
WARNING_DAYS = 1.0


def near_set_point(look: Look) -> str:
    """What EC shows beside a share that is out: '' where it was not read lately or has no set point."""
    read = look.last("EC", (look.fed_from,), EC_FRESH_DAYS)
    if read is None or look.set_ec is None:
        return ""
    known = look.points.get(look.fed_from)
    if known is not None and not known.ec.low - EC_NEAR <= read.value <= known.ec.high + EC_NEAR:
        return f"EC read {read.value:.1f} mS/cm; by what is logged it is {plain(known.ec.value)} now: read it again."
    if abs(read.value - look.set_ec) <= EC_NEAR:
        return "EC is on set point."
    return f"EC reads {read.value:.1f}, set {look.set_ec:.1f} mS/cm."


def off_set_point(look: Look) -> Iterator[Notice]:
    """EC of the feed away from its set point."""
    read = look.last("EC", (look.fed_from,), EC_FRESH_DAYS)
    if read is None or look.set_ec is None or abs(read.value - look.set_ec) <= EC_OFF:
        return
    text = f"EC {at_point(look.fed_from)} reads {read.value:.1f} mS/cm, set point {look.set_ec:.1f}."
    yield Notice("ec_off_set", WATCH, f"{text} Read again, then check dosing.", "r")


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


def running_out(look: Look) -> Iterator[Notice]:
    """Stock that does not last until somebody is there to mix."""
    staffed = next_staffed(look)
    until = (staffed - look.at).total_seconds() / 86400.0
    for name, left in stock_left(look.site, look.loop, look.past, look.at).items():
        if left.days is None or left.days > until + WARNING_DAYS:
            continue
        act = left.days <= until
        day = look.day(staffed)
        text = f"{name} stock lasts {left.days:.1f} days ({plain(left.litres)} L); the next staffed day is {day}."
        mix = "Mix today." if act else f"Mix on {day} at the latest."
        yield Notice("stock_low", ACT if act else WATCH, f"{text} {mix}", "m")


def next_staffed(look: Look) -> datetime:
    """The morning of the next staffed day after today."""
    for ahead in range(1, 8):
        day = look.today + timedelta(days=ahead)
        if f"{day:%a}" in look.site.staffed_days:
            return datetime.combine(day, MORNING, look.zone)
    return datetime.combine(look.today + timedelta(days=1), MORNING, look.zone)
