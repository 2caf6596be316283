"""Renewal of part of the water: when salts cannot do it, how little does, and what the discharge costs the year's
account."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from datetime import datetime
from zoneinfo import ZoneInfo

from fertui.chemistry.ions import ATOMIC_WEIGHT, INDEX, IONS, Array
from fertui.estimate.assimilation import Estimate
from fertui.estimate.balance import discharged
from fertui.logbook.entries import Entry
from fertui.planning.checkpoints import EXCESS, NUTRIENTS_THAT_STAY
from fertui.planning.goal import LIMITED, Goal
from fertui.planning.runs import Situation
from fertui.planning.values import Renewal, RenewalOption

LEFT_N_MMOL = 1.0
"""Nitrate a crop can drink a solution down to before it is let go: Massa et al. 2010 flushed at NO3-N below 1.0
mmol/L."""


def excess_of(composition: Array, goal: Goal) -> dict[str, float]:
    """Ions in excess [mmol/L over aim or limit]: Ca, Mg, SO4 against the aim, Na, Cl, NH4 against their limits.

    >>> import numpy as np
    >>> from fertui.planning.goal import Goal
    >>> aim = np.full(10, np.nan); aim[1] = 4.0
    >>> goal = Goal("tank", "", aim, np.zeros(3), np.ones(3), np.full(10, np.inf), np.inf, 0.3, {}, False)
    >>> excess_of(np.full(10, 6.0), goal)
    {'Ca': 2.0}
    """
    over = {ion: float(composition[INDEX[ion]] - goal.most[INDEX[ion]]) for ion in LIMITED}
    found = {ion: amount for ion, amount in over.items() if amount > 1e-6}
    for ion in NUTRIENTS_THAT_STAY:
        aim = float(goal.aim[INDEX[ion]])
        if aim > 0 and composition[INDEX[ion]] > (1.0 + EXCESS) * aim:
            found[ion] = float(composition[INDEX[ion]] - aim)
    return found


def lost_kg(composition: Array, litres: float) -> tuple[float, float]:
    """kg N and kg P in litres of a solution (10,) [mmol/L].

    >>> import numpy as np
    >>> [round(each, 2) for each in lost_kg(np.array([0, 0, 0, 0, 0, 12.0, 0, 0, 0, 0]), 2500.0)]
    [0.42, 0.0]
    """
    nitrogen = (composition[INDEX["NO3"]] + composition[INDEX["NH4"]]) * litres * ATOMIC_WEIGHT["N"] * 1e-6
    phosphorus = composition[INDEX["H2PO4"]] * litres * ATOMIC_WEIGHT["P"] * 1e-6
    return float(nitrogen), float(phosphorus)


def year_kg_n(estimate: Estimate, entries: Iterable[Entry]) -> float:
    """kg N the loop has discharged this calendar year: what the estimate booked, each litre with the nitrogen it held
    then.

    A bleed of this year from before the estimate began counts with today's nitrogen of the managed point.
    """
    zone = ZoneInfo(estimate.site.timezone)
    year = datetime(estimate.at.astimezone(zone).year, 1, 1, tzinfo=zone)
    booked = sum(each.kg_n for each in discharged(estimate, max(year, estimate.since), estimate.at))
    ions = estimate.points()[estimate.managed].ions
    nitrogen = sum(ions[ion].mmol_l.value for ion in ("NO3", "NH4") if ion in ions)
    earlier = sum(
        each.number_of("litres") or 0.0
        for each in entries
        if each.kind == "bleed" and each.loop == estimate.loop.name and year <= each.at < estimate.since
    )
    return float(booked + earlier * nitrogen * ATOMIC_WEIGHT["N"] * 1e-6)


def smallest_fraction(composition: Array, refill: Array, goal: Goal) -> float | None:
    """Least part of a tank to renew so that no ion is over its limit or more than the band over its aim; None if none
    will.

    Na: c (1 - f) + f w = limit gives f = (c - limit)/(c - w).

    >>> import numpy as np
    >>> from fertui.planning.goal import Goal
    >>> most = np.full(10, np.inf); most[3] = 6.0
    >>> goal = Goal("tank", "", np.full(10, np.nan), np.zeros(3), np.ones(3), most, np.inf, 0.3, {}, False)
    >>> water = np.zeros(10); water[3] = 1.0
    >>> round(smallest_fraction(np.full(10, 8.0), water, goal), 3)
    0.286
    """
    worst = 0.0
    for ion in excess_of(composition, goal):
        i = INDEX[ion]
        most = goal.most[i] if ion in LIMITED else (1.0 + EXCESS) * goal.aim[i]
        if refill[i] >= most:
            return None
        worst = max(worst, float((composition[i] - most) / (composition[i] - refill[i])))
    return worst


def options(
    situation: Situation,
    tank: str,
    litres: float | None,
    year_so_far_kg_n: float,
    days_to_drink_n: float | None,
    reaches: bool,
) -> tuple[RenewalOption, ...]:
    """Top-up, part renewal, full renewal and drinking the N down first, with what each discharges."""
    composition = situation.composition(tank)
    volume = situation.volumes_l[tank]
    rows = [("top-up with salts", 0.0, False, "nothing let go; what is in excess stays")]
    if litres is not None:
        rows.append(("part renewal", litres, reaches, f"{100 * litres / volume:.0f} % of the water"))
    rows.append(("full renewal", volume, True, "everything let go and made anew"))
    found = [
        _option(situation, name, amount, composition, year_so_far_kg_n, fits, text) for name, amount, fits, text in rows
    ]
    if days_to_drink_n is not None and litres is not None:
        left = composition.copy()
        left[INDEX["NO3"]] = min(left[INDEX["NO3"]], LEFT_N_MMOL)
        left[INDEX["NH4"]] = 0.0
        words = (
            f"stop the nitrogen, let the crop drink it down to {LEFT_N_MMOL:g} mmol/L in about {days_to_drink_n:.1f} "
            "days, "
            "then let go (Massa et al. 2010); watch the crop: it starves by the end"
        )
        found.append(_option(situation, "drink the N down first", litres, left, year_so_far_kg_n, reaches, words))
    return tuple(found)


def _option(
    situation: Situation,
    name: str,
    litres: float,
    composition: Array,
    year_so_far_kg_n: float,
    reaches: bool,
    text: str,
) -> RenewalOption:
    kg_n, kg_p = lost_kg(composition, litres)
    year = year_so_far_kg_n + kg_n
    per_ha = 1e4 / situation.loop.area_m2
    budget = situation.site.budget_n_kg_per_ha
    words = text
    if litres:
        so_far = f"{year * per_ha:.{0 if year * per_ha >= 10 else 1}f} kg N/ha"
        words += f"; {kg_n:.2f} kg N, {kg_p:.2f} kg P; the year comes to {so_far}"
        words += "" if budget is None else f" of {budget:g}"
    return RenewalOption(name, litres, kg_n, kg_p, year, year * per_ha, budget, reaches, words)


def renewal_of(
    situation: Situation, tank: str, litres: float, refill: Array, goal: Goal, year_so_far_kg_n: float, end: Array,
    days_to_drink_n: float | None, reaches: bool,
) -> Renewal:  # fmt: skip
    """A renewal of so many litres with its losses and the options beside it; ``end``: the point without any renewal."""
    found = options(situation, tank, litres, year_so_far_kg_n, days_to_drink_n, reaches)
    part = next(each for each in found if each.name == "part renewal")
    carries: Mapping[str, float] = {ion: float(value) for ion, value in zip(IONS, refill, strict=True)}
    return Renewal(litres, carries, part.kg_n, part.kg_p, part.year_kg_n, excess_of(end, goal), found)
