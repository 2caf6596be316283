"""Salts given with the fresh water: what a tank takes that the crop drinks before the horizon.

Such a tank is what is put into it day by day, and no few weighings hold it. Where nothing feeds it, the salts for each
100 L of fresh water are told; where its stocks do, the later weighings may go in with the water.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from fertui.chemistry.ions import INDEX, IONS, MICRONUTRIENTS, Array
from fertui.planning.acid import LEAVE_MEQ_PER_L, source_water
from fertui.planning.composing import compose
from fertui.planning.request import Request
from fertui.planning.runs import Course, Situation
from fertui.planning.shelf import Material
from fertui.planning.values import Step

PER_L = 100.0
"""Litres of fresh water that an amount is told for: a drum, or what a small meter shows."""
LEAST_G = 0.5
NOT_FED = ("Na", "Cl", "HCO3")


def fresh_l_d(situation: Situation) -> float:
    """Fresh water a day [L]: what the crop takes."""
    return situation.crop_water_l_per_m2_d * situation.loop.area_m2


def drinks_it(request: Request) -> bool:
    """Whether the crop takes the tank's whole water within the horizon."""
    return fresh_l_d(request.situation) * request.wishes.days >= request.situation.volumes_l["tank"]


def holding_words(request: Request, salts: Sequence[Material], course: Course) -> tuple[str, ...]:
    """Grams of each salt for 100 L of fresh water that hold an unfed tank; nothing where no salt fits. Three solver
    calls."""
    if not salts:
        return ()
    wanted = missing_mmol_l(request.situation, course)
    composed = compose(salts, np.concatenate([wanted, np.zeros(len(MICRONUTRIENTS))]), request.solver)
    grams = [
        f"{each * PER_L:.0f} g {salt.name}"
        for salt, each in zip(salts, composed.grams_per_l, strict=True)
        if each * PER_L >= LEAST_G
    ]
    if not grams:
        return ()
    first = _acid_first(request)
    brings = ", ".join(f"{ion} {composed.brought[INDEX[ion]]:.1f}" for ion in IONS if wanted[INDEX[ion]] > 0.05)
    return (
        f"to hold the tank meanwhile, dissolve for each {PER_L:.0f} L of make-up water: {', '.join(grams)} ({brings} "
        f"mmol/L: what the crop takes of each litre, by the model, less what the water brings){first}; log each as a "
        "dose",
    )


def _acid_first(request: Request) -> str:
    """That hard make-up water meets acid before these salts; nothing where it is soft or was never analysed."""
    water = source_water(request.situation.site, request.situation.loop)
    alkalinity = 0.0 if water is None else water.ions.get("HCO3", 0.0)
    if alkalinity <= LEAVE_MEQ_PER_L:
        return ""
    return (
        f"; its HCO3, {alkalinity:.1f} meq/L, first: by the acid sheet, else pH climbs over 7 and phosphate and iron "
        "fall out"
    )


def missing_mmol_l(situation: Situation, course: Course) -> Array:
    """What the loop loses on its first day without any plan, per litre of fresh water (10,) [mmol/L].

    The water's own ions are in it already, so this is what the salts have to bring.
    """
    held = sum(
        (litres[:2, 0, None] * course.ions[vessel][:2, 0] for vessel, litres in course.volumes_l.items()),
        np.zeros((2, len(IONS))),
    )
    missing = np.maximum((held[0] - held[1]) / max(fresh_l_d(situation), 1e-9), 0.0)
    missing[[INDEX[ion] for ion in NOT_FED]] = 0.0
    return missing


def spread_words(request: Request, steps: Sequence[Step]) -> tuple[str, ...]:
    """The weighings after the first day as grams for 100 L of fresh water from their day on.

    Given so, the tank holds at no time more salt than the plan was checked for.
    """
    situation, per_day = request.situation, fresh_l_d(request.situation)
    if not drinks_it(request):
        return ()
    days = sorted({(each.at - situation.at).days for each in steps})
    if not days:
        return ()
    until = dict(zip(days, [*days[1:], request.wishes.days], strict=True))
    parts = []
    for day in days:
        litres = per_day * (until[day] - day)
        own = [each for each in steps if (each.at - situation.at).days == day and day > 0]
        grams = [f"{1000.0 * each.kg / litres * PER_L:.0f} g {each.salt}" for each in own]
        if grams:
            parts.append(f"from day {day} on {' and '.join(grams)}")
    if not parts:
        return ()
    return (
        f"the crop drinks the {situation.volumes_l['tank']:.0f} L of this tank in "
        f"{situation.volumes_l['tank'] / per_day:.1f} days: the later weighings may go in with the make-up water "
        f"instead, for each {PER_L:.0f} L of it {'; '.join(parts)}",
    )
