"""The stock-tank sheet: from a recipe and the water's own ions to kilograms per tank, in the order they are dissolved.

Recipe less what the water, the acid and the silicate bring = what the salts must bring. The sheet says what the rounded
amounts then really deliver at the dripper.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from typing import NamedTuple

import numpy as np

from fertui.catalogue.cautions import Caution, cautions_of
from fertui.chemistry.conductivity import conductivity
from fertui.chemistry.ions import IONS, MICRONUTRIENTS, Array
from fertui.planning.acid import LEAVE_MEQ_PER_L, unanalysed_words, water_of
from fertui.planning.composing import SPECIES, Composed, compose
from fertui.planning.programme import Solver
from fertui.planning.shelf import Material, PlanningError, material, salts_of, shelf
from fertui.planning.stock_needs import Needed, acid_words, misfits, needed_of, not_covered, per_kg, subtraction
from fertui.planning.tanks import (
    STRONGEST,
    Fullest,
    Refused,
    conflicts,
    content_of,
    dissolving_order,
    fullest,
    home_of,
    roles,
    shared_so_both_weigh_alike,
)  # fmt: skip
from fertui.planning.weighing import Weighing, amount, scales_of, weigh
from fertui.site.model import Composition, Loop, Site, StockTank, Supply

ASSUMED_TANKS = (StockTank("calcium", 1000.0), StockTank("sulfate and phosphate", 1000.0))
"""Taken where a loop names no stock tanks, and said so."""

ASSUMED_WORDS = "no stock tanks in site.toml: two of 1000 L at 100 times are assumed; add [[stock_tanks]]"


class TankSheet(NamedTuple):
    """One stock tank: its lines in the order of dissolving, whether it all dissolves, how it is injected."""

    name: str
    content: str
    letter: str
    litres: float
    dilution: float
    salts: tuple[Weighing, ...]
    fits: bool
    fullest: Fullest | None
    ratio: str
    notices: tuple[str, ...]


class StockSheet(NamedTuple):
    """What to weigh for each tank and what then comes out of the dripper; refused pairs make it not feasible."""

    feasible: bool
    tanks: tuple[TankSheet, ...]
    refused: tuple[Refused, ...]
    asked_mmol_l: Mapping[str, float]
    asked_micros_umol_l: Mapping[str, float]
    ions_mmol_l: Mapping[str, float]
    micros_umol_l: Mapping[str, float]
    ec: float
    not_covered: tuple[str, ...]
    notices: tuple[str, ...]
    arithmetic: tuple[str, ...]
    cautions: tuple[Caution, ...]
    solver_calls: int


def stock_sheet(
    site: Site,
    loop: Loop,
    *,
    recipe: Composition,
    water: Composition | None = None,
    acid: Supply | None = None,
    acid_in_water: Supply | None = None,
    supplies: Iterable[str] | None = None,
    without: Iterable[str] = (),
    leave_meq_l: float = LEAVE_MEQ_PER_L,
    remainder_l: Mapping[str, float] | None = None,
    solver: Solver | None = None,
) -> StockSheet:
    """Stock-tank sheet for a feed ``recipe`` on the loop's make-up ``water``; ``acid`` is fixed in the stock where
    given, and ``acid_in_water`` goes into the make-up water by the acid sheet.

    ``remainder_l``: litres of the old stock still in a tank by name; what they hold is taken off. Refused pairs,
    solids that do not dissolve and ions that no supply covers are said in the sheet. Raises ``PlanningError`` for an
    unknown name.
    """
    solver = solver or Solver()
    water = water_of(site, loop) if water is None else water
    materials = shelf(site.supplies, supplies, without)
    tanks = tanks_of(site, loop)
    needed = needed_of(recipe, water, acid, materials, leave_meq_l, acid_in_water)
    if acid is None:
        needed = needed._replace(notices=(*needed.notices, *acid_words(acid_in_water, water, leave_meq_l)))
    salts = salts_of([each for each in materials if not each.brings("Si")])
    composed = compose(salts, needed.wanted, solver)
    per_m3 = dict(needed.fixed) | {
        each: grams for each, grams in zip(salts, composed.grams_per_l, strict=True) if grams > 1e-7
    }
    placed = placed_in(per_m3, tanks)
    sheets, refused = [], [*standing_conflicts(tanks, materials)]
    for tank in (each for each in tanks if each.name in placed):
        sheet, bad = _tank_sheet(
            site, tank, placed[tank.name], (remainder_l or {}).get(tank.name, 0.0), materials, len(placed)
        )
        sheets.append(sheet)
        refused += bad
    if not water.ions:
        needed = needed._replace(notices=(*unanalysed_words(site, loop), *needed.notices))
    if not loop.stock_tanks:
        needed = needed._replace(notices=(*needed.notices, ASSUMED_WORDS))
    return _sheet(tuple(sheets), tuple(refused), needed, composed, placed, solver)


def tanks_of(site: Site, loop: Loop) -> tuple[StockTank, ...]:
    """The loop's stock tanks, or the assumed pair where it names none; raises ``PlanningError`` for an unknown name."""
    known = {tank.name: tank for tank in site.stock_tanks}
    for name in loop.stock_tanks:
        if name not in known:
            raise PlanningError(
                f"loop {loop.name}: stock tank {name!r} is not among [[stock_tanks]] ({', '.join(known) or 'none'})."
            )
    return tuple(known[name] for name in loop.stock_tanks) or ASSUMED_TANKS


def placed_in(per_m3: Mapping[Material, float], tanks: Sequence[StockTank]) -> dict[str, dict[Material, float]]:
    """kg of each material in each full tank by name, every material in the tank of its content, potassium nitrate
    parted.

    ``per_m3``: kg per m3 of feed. Where a site has no acid tank the acid goes with the sulfates, as in the Tuscan
    example.
    """
    by_role = roles(tanks)
    placed: dict[str, dict[Material, float]] = {tank.name: {} for tank in by_role.values()}
    free: dict[Material, float] = {}
    for each, grams in per_m3.items():
        home = home_of(each)
        if not home and by_role.get("calcium") != by_role.get("sulfate"):
            free[each] = grams
            continue
        tank = by_role.get(home or "calcium") or by_role["sulfate"]
        placed[tank.name][each] = grams * tank.litres * tank.dilution / 1000.0
    _part(free, placed, by_role)
    return {name: amounts for name, amounts in placed.items() if amounts}


def _part(
    free: Mapping[Material, float], placed: dict[str, dict[Material, float]], by_role: Mapping[str, StockTank]
) -> None:
    for each, grams in free.items():
        one, other = by_role["calcium"], by_role["sulfate"]
        strength = [sum(placed[tank.name].values()) / (tank.litres * tank.dilution) * 1000.0 for tank in (one, other)]
        for tank, part in zip((one, other), shared_so_both_weigh_alike(strength[0], strength[1], grams), strict=True):
            if part > 1e-9:
                placed[tank.name][each] = part * tank.litres * tank.dilution / 1000.0


def standing_conflicts(tanks: Sequence[StockTank], materials: Sequence[Material]) -> list[Refused]:
    """Pairs that the site's own description already puts into one tank."""
    found: list[Refused] = []
    for tank in tanks:
        found += conflicts(described(tank, materials), tank.litres, tank.name)
    return found


def described(tank: StockTank, materials: Sequence[Material]) -> dict[Material, float]:
    """What the site says is in a tank, by material; a name that is not on the shelf is looked up in the catalogue."""
    by_name = {each.name.lower(): each for each in materials} | {each.supply.kind.lower(): each for each in materials}
    return {
        by_name.get(name.lower()) or material(Supply(name, name)): kg for name, kg in tank.salts_kg.items() if kg > 0
    }


def _tank_sheet(
    site: Site,
    tank: StockTank,
    amounts: Mapping[Material, float],
    left_l: float,
    materials: Sequence[Material],
    tanks: int,
) -> tuple[TankSheet, tuple[Refused, ...]]:
    if not 0.0 <= left_l <= tank.litres:
        raise PlanningError(f"{tank.name}: {left_l:g} L cannot be left in a tank of {tank.litres:g} L.")
    bad = conflicts(amounts, tank.litres, tank.name)
    to_weigh, notices = _less_remainder(tank, amounts, left_l, materials)
    scales = scales_of(site)
    lines = tuple(
        weigh(each, kg, scales) for each, kg in sorted(to_weigh.items(), key=lambda pair: dissolving_order(pair[0]))
    )
    solid = fullest(amounts, tank.litres, tank.storage_temperature_c)
    fits = not bad and (solid is None or solid.degree <= 1.0) and tank.dilution <= STRONGEST
    notices += _tank_notices(tank, solid, left_l)
    content = content_of(tank) or ("calcium" if any(home_of(each) == "calcium" for each in amounts) else "sulfate")
    return TankSheet(
        tank.name,
        content,
        tank.letter,
        tank.litres,
        tank.dilution,
        lines,
        fits,
        solid,
        ratio(tank, tanks),
        tuple(notices),
    ), bad


def _less_remainder(
    tank: StockTank, amounts: Mapping[Material, float], left_l: float, materials: Sequence[Material]
) -> tuple[dict[Material, float], list[str]]:
    """Amounts to weigh now, with what the old stock still holds taken off; what it holds too much of is said."""
    old = {each: kg * left_l / tank.litres for each, kg in described(tank, materials).items()} if left_l else {}
    held = {each.kind: sum(kg for other, kg in old.items() if other.kind == each.kind) for each in (*amounts, *old)}
    notices = [
        f"the old stock holds {amount(held[each.kind] - amounts.get(each, 0.0))} of {each.name} more than the new "
        "batch takes: use it up first"
        for each in old
        if held[each.kind] > amounts.get(each, 0.0) + 1e-6
    ]
    return {
        each: kg - held.get(each.kind, 0.0) for each, kg in amounts.items() if kg - held.get(each.kind, 0.0) > 1e-7
    }, notices


def _tank_notices(tank: StockTank, solid: Fullest | None, left_l: float) -> list[str]:
    notices = []
    if solid is not None and solid.degree > 1.0:
        notices.append(
            f"{solid.salt} crystallises at {solid.temperature_c:g} C ({100 * solid.degree:.0f} % of saturation): "
            f"make it {tank.dilution / solid.degree:.0f} times instead of {tank.dilution:g}, or keep it warmer"
        )
    if tank.dilution > STRONGEST:
        notices.append(
            f"{tank.dilution:g} times is stronger than stocks are made: at most {STRONGEST:g} (ARSIA 2004, p. 181)"
        )
    if left_l:
        notices.append(f"{left_l:g} L of old stock stay in: fill up to {tank.litres:g} L")
    return notices


def ratio(tank: StockTank, tanks: int) -> str:
    """The injection ratio in words.

    >>> ratio(StockTank("calcium", 1000.0), 2)
    '1 litre of this stock in every 100 litres of feed (1:100), and as much of the other tank at the same time'
    """
    words = f"1 litre of this stock in every {tank.dilution:g} litres of feed (1:{tank.dilution:g})"
    if tanks > 1:
        words += f", and as much of the other tank{'s' if tanks > 2 else ''} at the same time"
    return words


def _sheet(
    sheets: tuple[TankSheet, ...], refused: tuple[Refused, ...], needed: Needed, composed: Composed,
    placed: Mapping[str, Mapping[Material, float]], solver: Solver,
) -> StockSheet:  # fmt: skip
    reached = (
        needed.own
        + needed.by_acid
        + sum((_given(sheet, placed[sheet.name]) for sheet in sheets), np.zeros(len(SPECIES)))
    )
    used = list({each.name: each for amounts in placed.values() for each in amounts}.values())
    ions, micros = reached[: len(IONS)], reached[len(IONS) :]
    return StockSheet(
        feasible=not refused and all(sheet.fits for sheet in sheets),
        tanks=sheets,
        refused=refused,
        asked_mmol_l=_named(IONS, needed.asked),
        asked_micros_umol_l=_named(MICRONUTRIENTS, needed.asked[len(IONS) :]),
        ions_mmol_l=_named(IONS, ions),
        micros_umol_l=_named(MICRONUTRIENTS, micros),
        ec=float(conductivity(np.maximum(ions, 0.0))),
        not_covered=not_covered(composed, needed),
        notices=(*needed.notices, *misfits(composed, needed)),
        arithmetic=(*subtraction(needed), *_weighed_out(sheets, placed)),
        cautions=cautions_of([each.supply for each in used]),
        solver_calls=solver.calls,
    )


def _given(sheet: TankSheet, amounts: Mapping[Material, float]) -> Array:
    """What one tank's rounded lines deliver; what an old remainder holds counts as the exact amount it replaces."""
    weighed = {line.salt: line.kg - line.exact_kg for line in sheet.salts}
    kg = {each: exact + weighed.get(each.name, 0.0) for each, exact in amounts.items()}
    return sum(
        (mass / (sheet.litres * sheet.dilution) * per_kg(each) for each, mass in kg.items()), np.zeros(len(SPECIES))
    )


def _named(names: Sequence[str], values: Array) -> dict[str, float]:
    return {name: float(value) for name, value in zip(names, values, strict=False)}


def _weighed_out(sheets: Sequence[TankSheet], placed: Mapping[str, Mapping[Material, float]]) -> list[str]:
    """kg x mmol/kg / litres of stock / dilution = mmol/L in the feed, for every line and ion."""
    lines = []
    for sheet in sheets:
        by_name = {each.name: each for each in placed[sheet.name]}
        for line in sheet.salts:
            for ion, content in zip(IONS, by_name[line.salt].ions_mmol_per_kg, strict=True):
                if abs(content) > 1.0:
                    fed = line.kg * content / sheet.litres / sheet.dilution
                    lines.append(
                        f"{sheet.name}, {line.salt}: {line.kg:.3f} kg x {content:.0f} mmol/kg {ion} / "
                        f"{sheet.litres:g} L / {sheet.dilution:g} = {fed:.3f} mmol/L in the feed"
                    )
    return lines
