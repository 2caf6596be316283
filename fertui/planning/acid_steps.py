"""Acid inside a plan: when a tank's own alkalinity asks for it, and what it brings with it."""

from __future__ import annotations

from datetime import datetime, timedelta

import numpy as np

from fertui.chemistry.ions import INDEX, IONS, Array
from fertui.planning.acid import LEAVE_MEQ_PER_L, AcidSheet, acid_sheet
from fertui.planning.request import Request
from fertui.planning.values import AcidStep
from fertui.site.model import Composition, Supply

FROM_MEQ_PER_L = 1.0
"""Alkalinity of a tank from which a plan doses acid: the upper end of what is left as buffer (ARSIA 5/2004, p. 179)."""


def tank_acid(request: Request) -> AcidSheet | None:
    """The acid sheet of the tank as it stands; None where its alkalinity is low, not known, or no acid is on the shelf.

    A tank whose make-up keeps raising the alkalinity is better served by acid in the make-up: the sheet of the water.
    """
    situation = request.situation
    acid = next((each for each in situation.site.supplies if _is_acid(each)), None)
    held = situation.points["tank"].ions.get("HCO3")
    if acid is None or held is None or held.mmol_l.value <= FROM_MEQ_PER_L:
        return None
    water = Composition({"HCO3": held.mmol_l.value}, ph=situation.ph("tank"))
    volume = situation.volumes_l["tank"]
    return acid_sheet(situation.site, situation.loop, water=water, acid=acid, volume_l=volume)


def _is_acid(supply: Supply) -> bool:
    from fertui.catalogue.acids import acid

    return supply.strength_pct is not None and acid(supply.kind).is_acid


def acid_mmol(sheet: AcidSheet | None) -> Array:
    """What the acid of a sheet brings into its volume [mmol], alkalinity it takes away included, shape (10,)."""
    brought = np.zeros(len(IONS))
    if sheet is None or sheet.alkalinity_meq_l is None or not sheet.splits:
        return brought
    for ion, mmol in sheet.adds_mmol_l.items():
        brought[INDEX[ion]] = mmol * sheet.volume_l
    brought[INDEX["HCO3"]] = -(sheet.alkalinity_meq_l - LEAVE_MEQ_PER_L) * sheet.volume_l
    return brought


def acid_steps(sheet: AcidSheet | None, at: datetime, target: str) -> tuple[AcidStep, ...]:
    """The splits of a sheet as steps of a plan, one wait after the other."""
    if sheet is None:
        return ()
    return tuple(
        AcidStep(
            at + timedelta(minutes=each.wait_min * (each.number - 1)), sheet.acid, sheet.strength_pct,
            sheet.density_kg_per_l, each.litres, target, each.wait_min, each.retest_ph, each.stop_ph,
        )
        for each in sheet.splits
    )  # fmt: skip
