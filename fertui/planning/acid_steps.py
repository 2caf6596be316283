"""Acid inside a plan: when the alkalinity of a tank and of its coming make-up asks for it, and what it brings."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import timedelta
from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import INDEX, IONS, Array
from fertui.estimate.assimilation import Estimate
from fertui.logbook.entries import Entry
from fertui.planning.acid import LEAVE_MEQ_PER_L, AcidSheet, acid_sheet, source_water
from fertui.planning.request import Request
from fertui.planning.runs import Course, Situation
from fertui.planning.values import AcidStep
from fertui.site.model import Composition, Supply

FROM_MEQ_PER_L = 1.0
"""Alkalinity of a tank from which a plan doses acid: the upper end of what is left as buffer (ARSIA 5/2004, p. 179)."""
TOLD_MEQ_PER_L = 0.2
"""Difference between what the make-up brings and what the model finds that is worth a word: what a test kit shows."""
MOST_PORTIONS = 4
"""Portions that one person pours in a day, each with its wait and retest: three to four (field practice)."""
IN_PART = (
    f"no more than {MOST_PORTIONS} portions of acid are planned for a day: measure pH and alkalinity again before the "
    "next; the rest waits for another day"
)
NOT_MEASURED = "no acid is planned: the alkalinity of the make-up water was never measured, and pH alone tells no dose"
FORTNIGHT = 14.0
HABIT = 2
"""Acids logged within a fortnight from which they are a habit that goes on (common practice, no source)."""
_HCO3 = INDEX["HCO3"]


class TankAcid(NamedTuple):
    """The acid sheet of each step of a plan, None where a step needs none, and the sums behind them."""

    sheets: tuple[AcidSheet | None, ...]
    arithmetic: tuple[str, ...] = ()
    notices: tuple[str, ...] = ()

    @property
    def first(self) -> AcidSheet | None:
        """The sheet of the first step that takes acid."""
        return next((each for each in self.sheets if each is not None), None)

    @property
    def mmol(self) -> Array:
        """What the acid of each step brings [mmol], alkalinity it takes away included, shape (steps, 10)."""
        return np.array([_brought(each) for each in self.sheets])


def tank_acid(request: Request, days: Sequence[int], course: Course) -> TankAcid:
    """The acid for a tank on the days of a plan; none where its alkalinity is low, not known, or no acid is on the
    shelf.

    Between two steps the make-up adds litres a day x (HCO3 - what is left); acid that is dosed by habit is taken off.
    A step never counts on more than the model finds in the tank by then (``course``: without the plan), as roots that
    take up more cations than anions use alkalinity up.
    """
    situation = request.situation
    acid = next((each for each in situation.site.supplies if _is_acid(each)), None)
    held = situation.points["tank"].ions.get("HCO3")
    if acid is None or held is None:
        return TankAcid((None,) * len(days))
    if request.unknown_water:
        return TankAcid((None,) * len(days), notices=(NOT_MEASURED,))
    volume, daily = situation.volumes_l["tank"], _daily(situation)
    stands, taken, withheld = held.mmol_l.value, 0.0, False
    sheets: list[AcidSheet | None] = []
    lines: list[str] = []
    for before, day in zip((0, *days), days, strict=False):
        stands += daily * (day - before) / volume
        found = float(course.ions["tank"][day, 0, _HCO3]) - taken
        there = min(stands, found) if day > 0 else stands
        withheld |= stands > FROM_MEQ_PER_L and stands - there > TOLD_MEQ_PER_L
        if there <= FROM_MEQ_PER_L:
            sheets.append(None)
            continue
        sheets.append(_sheet(situation, acid, there, day == 0))
        if day > 0:
            lines.append(_sum(situation, day, there))
        taken += _planned_part(sheets[-1]) * (there - LEAVE_MEQ_PER_L)
        stands = there - _planned_part(sheets[-1]) * (there - LEAVE_MEQ_PER_L)
    short = any(each is not None and _planned_part(each) < 1.0 for each in sheets)
    notices = (*((_withheld(situation),) if withheld else ()), *((IN_PART,) if short else ()))
    return TankAcid(tuple(sheets), tuple(lines), notices)


def _daily(situation: Situation) -> float:
    """Alkalinity that a day of make-up brings into the tank beyond the buffer, less acid by habit [meq]."""
    beyond = _make_up_meq_l(situation) - LEAVE_MEQ_PER_L
    return max(_make_up_l(situation) * beyond + float(situation.usual_acid_mmol_d[_HCO3]), 0.0)


def _make_up_l(situation: Situation) -> float:
    return situation.crop_water_l_per_m2_d * situation.loop.area_m2


def _make_up_meq_l(situation: Situation) -> float:
    """Alkalinity of the make-up water; nothing is reckoned where nobody measured it."""
    water = source_water(situation.site, situation.loop) or Composition()
    return water.ions.get("HCO3", 0.0)


def _sheet(situation: Situation, acid: Supply, alkalinity: float, now: bool) -> AcidSheet:
    """The sheet for the tank at an alkalinity; its pH is known today alone."""
    ph = situation.points["tank"].ph if now else None
    water = Composition({"HCO3": alkalinity}, ph=None if ph is None else ph.value)
    whole = acid_sheet(situation.site, situation.loop, water=water, acid=acid, volume_l=situation.volumes_l["tank"])
    return whole._replace(splits=whole.splits[:MOST_PORTIONS])


def _planned_part(sheet: AcidSheet | None) -> float:
    """What part of the acid of a sheet is poured in the portions of its day."""
    if sheet is None or sheet.litres_total <= 0.0:
        return 0.0
    return min(sum(each.litres for each in sheet.splits) / sheet.litres_total, 1.0)


def _withheld(situation: Situation) -> str:
    return (
        f"the make-up brings {_daily(situation):.0f} meq of alkalinity a day beyond the {LEAVE_MEQ_PER_L:g} meq/L that "
        "is left; by the model roots use up part or all of it, and so much less acid is planned: measure alkalinity "
        "and pH of the tank before each step, and dose what is found by the acid sheet"
    )


def _sum(situation: Situation, day: int, alkalinity: float) -> str:
    habit = float(situation.usual_acid_mmol_d[_HCO3])
    less = f" - {-habit:.0f} meq of acid as usual" if habit < 0.0 else ""
    return (
        f"acid on day {day}: make-up {_make_up_l(situation):.0f} L x ({_make_up_meq_l(situation):.2f} - "
        f"{LEAVE_MEQ_PER_L:.2f} left) meq/L{less} = {_daily(situation):.0f} meq a day into "
        f"{situation.volumes_l['tank']:.0f} L; {alkalinity:.2f} meq/L by then, uptake counted"
    )


def _is_acid(supply: Supply) -> bool:
    from fertui.catalogue.acids import acid

    return supply.strength_pct is not None and acid(supply.kind).is_acid


def _brought(sheet: AcidSheet | None) -> Array:
    brought = np.zeros(len(IONS))
    if sheet is None or sheet.alkalinity_meq_l is None or not sheet.splits:
        return brought
    poured_l = _planned_part(sheet) * sheet.volume_l
    for ion, mmol in sheet.adds_mmol_l.items():
        brought[INDEX[ion]] = mmol * poured_l
    brought[_HCO3] = -(sheet.alkalinity_meq_l - LEAVE_MEQ_PER_L) * poured_l
    return brought


def acid_steps(acid: TankAcid, situation: Situation, days: Sequence[int], target: str) -> tuple[AcidStep, ...]:
    """The splits of every sheet as steps of a plan, one wait after the other from the day of the sheet on."""
    return tuple(
        AcidStep(
            situation.at + timedelta(days=day, minutes=each.wait_min * (each.number - 1)), sheet.acid,
            sheet.strength_pct, sheet.density_kg_per_l, each.litres, target, each.wait_min, each.retest_ph,
            each.stop_ph,
        )
        for day, sheet in zip(days, acid.sheets, strict=True)
        if sheet is not None
        for each in sheet.splits
    )  # fmt: skip


def usual_acid(estimate: Estimate, entries: Sequence[Entry]) -> Array:
    """What acid brings by habit [mmol/d], its alkalinity negative, shape (10,): by a pump, or before heating the drain.

    The mean of a fortnight's logged acid that carried out no plan; nothing where it was logged less than twice.
    """
    planned = {each.number for each in entries if each.kind == "acid" and each.number_of("plan") is not None}
    recent = [
        each.ions_mmol
        for each in estimate.record.events
        if each.cause == "acid" and each.at > estimate.record.end - FORTNIGHT and each.entry not in planned
    ]
    return np.sum(recent, axis=0) / FORTNIGHT if len(recent) >= HABIT else np.zeros(len(IONS))


def heated_words(situation: Situation, entries: Sequence[Entry]) -> tuple[str, ...]:
    """What is said of disinfection by acidified heating: its acid goes on, or was never logged."""
    since = situation.at - timedelta(days=FORTNIGHT)
    heated = any(
        each.kind == "disinfection" and each.loop == situation.loop.name and since < each.at <= situation.at
        and "heat" in each.text_of("treatment").lower()
        for each in entries
    )  # fmt: skip
    taken = -float(situation.usual_acid_mmol_d[_HCO3])
    if not heated:
        return ()
    if taken <= 0.0:
        return ("heat disinfection is logged without acid: log the acid it takes, or its alkalinity is not counted",)
    return (f"acid as in the last fortnight, heat disinfection included: {taken:.0f} meq of alkalinity a day taken",)
