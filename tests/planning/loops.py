"""Invented loops and a plain mixing tank for planning to work on; the tank is the independent balance of the tests."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import UTC, datetime

import numpy as np

from fertui.chemistry.conductivity import conductivity
from fertui.chemistry.ions import INDEX, IONS, Array, vector
from fertui.estimate.points import Estimated, IonState, PointState
from fertui.planning.goal import goal_of
from fertui.planning.programme import Solver
from fertui.planning.request import Request, Wishes, goals_of, materials_of
from fertui.planning.runs import Course, Doing, Runs, Situation, StillRuns
from fertui.site.model import Composition, Loop, Site, Sourced, Supply, Water

AT = datetime(2026, 3, 2, 8, 0, tzinfo=UTC)  # a Monday


def point_of(composition: Array, ph: float | None = 5.8, spread: float = 0.05) -> PointState:
    def around(value: float) -> Estimated:
        return Estimated(float(value), float(value * (1 - spread)), float(value * (1 + spread)))

    shares = {}
    total = composition[0] + 2 * composition[1] + 2 * composition[2]
    for ion, meq in zip(("K", "Ca", "Mg"), (composition[0], 2 * composition[1], 2 * composition[2]), strict=True):
        shares[ion] = around(100 * meq / total) if total > 0 else None
    ions = {ion: IonState(around(value), shares.get(ion)) for ion, value in zip(IONS, composition, strict=True)}
    ec = float(conductivity(np.maximum(composition, 0.0)))
    return PointState(around(ec), None if ph is None else around(ph), ions)


def situation(
    composition: Mapping[str, float],
    *,
    supplies: tuple[Supply, ...] = (),
    litres: float = 1000.0,
    target: str = "",
    crop: str = "lettuce",
    ph: float = 5.8,
    limits: Mapping[str, Sourced] | None = None,
    water: Composition | None = None,
    step_kg: float = 0.001,
    spread: float = 0.05,
    **site: object,
) -> Situation:
    """A shared tank without medium."""
    loop = Loop(
        "nft", "shared-tank", 500.0, crop, "none", target=target, tank_l=litres, water="well",
        limits={"tank": dict(limits or {})},
    )  # fmt: skip
    place = Site(
        "test", "UTC", (loop,), supplies=supplies, scale_step_kg=step_kg,
        waters=(Water("well", water or Composition(dict.fromkeys(IONS, 0.0))),), **site,
    )  # fmt: skip
    state = point_of(vector(dict(composition)), ph, spread)
    return Situation(place, loop, AT, "tank", {"tank": state, "root_zone": state}, {"tank": litres}, 3.0)


@dataclass
class MixingTank:
    """A tank of constant volume from which a crop takes so many mmol of each ion a day: no exchange, no stock."""

    situation: Situation
    days: int
    uptake_mmol_d: Array = field(default_factory=lambda: np.zeros(len(IONS)))
    count: int = 0

    def settled(self, doing: Doing, members: int) -> Course:
        self.count += 1
        volume = self.situation.volumes_l["tank"]
        now = np.tile(self.situation.composition("tank"), (members, 1))
        path = [now.copy()]
        for day in range(self.days):
            for each in doing.renewals:
                if day <= each.day < day + 1:
                    part = np.broadcast_to(np.asarray(each.litres, float), (members,))[:, None] / volume
                    now = now + part * (each.refill - now)
            for each in doing.additions:
                if day <= each.day < day + 1:
                    now = now + each.mmol / volume
            now = np.maximum(now - self.uptake_mmol_d / volume, 0.0)
            path.append(now.copy())
        return Course({"tank": np.array(path)}, {"tank": np.full((self.days + 1, members), volume)})

    def shown(self, doing: Doing) -> Mapping[str, PointState]:
        self.count += 1
        end = self.settled(doing, 1).ions["tank"][-1, 0]
        self.count -= 1
        return {"tank": point_of(end)}


def request(place: Situation, runs: Runs | None = None, **wishes: object) -> Request:
    asked = Wishes(**wishes).checked()
    model = runs or (StillRuns(place, "tank") if asked.days == 0 else MixingTank(place, asked.days))
    return Request(
        place, goals_of(place, asked, ("tank",)), asked, materials_of(place, asked), model, Solver(), (),
        place.points,
    )  # fmt: skip


def shelf_of(*names: str, **more: Mapping[str, float]) -> tuple[Supply, ...]:
    return tuple(Supply(name, name, **more.get(name, {})) for name in names)


__all__ = ["AT", "INDEX", "MixingTank", "goal_of", "point_of", "request", "shelf_of", "situation"]
