"""The stock-tank sheet: one card a tank in the order of dissolving, and what then reaches the crop."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING

from fertui.paper.cautions import read_first
from fertui.paper.page import SIGN, WIDTH, Page, amount, columns, folded, heading, listed, page, section
from fertui.site.points import at_point

if TYPE_CHECKING:
    from fertui.planning.stock import StockSheet, TankSheet
    from fertui.planning.tanks import Fullest
    from fertui.planning.weighing import Weighing


def stock_page(sheet: StockSheet, loop: str, site: str, recipe: str = "", layout: str = "") -> Page:
    """Cards of a stock-tank sheet; ``recipe`` says which recipe they carry, ``layout`` where the feed is caught."""
    carries = f"carries {recipe}; " if recipe else ""
    fed = at_point("feed", layout)
    lines = heading(f"Stock tanks: {loop}", site, f"{carries}EC to expect {fed} {amount(sheet.ec)} mS/cm")
    lines += section("REFUSED", listed((f"{' with '.join(each.pair)}: {each.why}" for each in sheet.refused), "!! "))
    lines += read_first(sheet.cautions)
    lines += section("NOTE", listed(sheet.notices))
    for tank in sheet.tanks:
        lines += card(tank)
    lines += reached(sheet, fed.upper())
    lines += section("THE SUM, STEP BY STEP", listed(sheet.arithmetic, "  "))
    data = {"loop": loop, "feasible": sheet.feasible}
    return page(lines, data, table(sheet), advice=True)


def card(tank: TankSheet) -> list[str]:
    """One tank: its ratio in words, its salts in the order of dissolving, room for batch, date and initials."""
    letter = f"   letter {tank.letter}" if tank.letter else ""
    content = f"   {tank.content}" if tank.content != tank.name else ""
    lines = [f"TANK {tank.name}{content}{letter}   {tank.litres:g} L   1:{tank.dilution:g}", "-" * WIDTH]
    lines += folded(tank.ratio)
    lines += ["  old solution left in the tank ______ L, let out or counted in the batch"]
    lines += ["  water to two thirds first, then one by one, each dissolved before the next:"]
    for position, each in enumerate(tank.salts, start=1):
        lines += _weighing(position, each)
    lines += ["  fill up with water, stir until clear"]
    lines += listed(tank.notices, "  - ")
    if tank.fullest is not None:
        lines += folded(_fullest(tank.fullest), "  - ")
    if not tank.fits:
        lines += folded("DOES NOT FIT: more than dissolves in this volume at its coldest", "  !! ")
    return [*lines, "  batch no ______   mixed on ____________   EC at 1:100 ______ mS/cm", f"  {SIGN}", ""]


def table(sheet: StockSheet) -> list[tuple[str, ...]]:
    """The cards as a table."""
    rows: list[tuple[str, ...]] = [("tank", "content", "litres [L]", "order", "salt", "formula", "kg [kg]", "how")]
    for tank in sheet.tanks:
        for position, each in enumerate(tank.salts, start=1):
            weighed = (each.salt, each.formula, f"{each.kg:g}", each.words)
            rows.append((tank.name, tank.content, f"{tank.litres:g}", str(position), *weighed))
    return rows


def reached(sheet: StockSheet, where: str = "AT THE DRIP") -> list[str]:
    """What the recipe asks and what the weighed amounts make of it."""
    ions = _beside(sheet.asked_mmol_l, sheet.ions_mmol_l)
    micros = _beside(sheet.asked_micros_umol_l, sheet.micros_umol_l)
    lines = section(f"{where} [mmol/L; HCO3 meq/L]", ions)
    return [*lines, *section(f"{where}, MICRONUTRIENTS [umol/L]", micros)]


def _weighing(position: int, each: Weighing) -> list[str]:
    """One line to tick: what, how much in all; under it how it is weighed."""
    head = f"  [ ] {position}. {each.salt} "
    lines = [f"{head:.<60} {_quantity(each):>12}", *folded(f"{each.formula}: {each.words}", "         ")]
    if each.strength_pct is not None:
        lines.append(
            f"         counted on {each.strength_pct:g} %; read off the label ______ %; not the same: stop [ ]"
        )
    return lines


def _quantity(each: Weighing) -> str:
    """What is taken: litres of a liquid or pre-solution, kilograms or grams of a salt."""
    if each.pre_solution is not None:
        return f"{each.pre_solution.use_l:g} L of it"
    if each.litres is not None:
        return f"{each.litres:.2f} L"
    return f"{each.kg:.2f} kg" if each.kg >= 1.0 else f"{1000.0 * each.kg:.1f} g"


def _fullest(found: Fullest) -> str:
    part = f"{100.0 * found.degree:.0f} % of what dissolves at {found.temperature_c:g} C"
    return f"nearest to crystallising: {found.salt}, {part}"


def _beside(asked: Mapping[str, float], found: Mapping[str, float]) -> list[str]:
    names = [name for name in found if found[name] or asked.get(name)]
    if not names:
        return []
    rows = [("", *names), ("asked", *(amount(asked.get(name)) or "-" for name in names))]
    return columns([*rows, ("reached", *(amount(found[name]) for name in names))], range(1, len(names) + 1))
