"""Sheets to weigh, mix and dose from: what, how much, in which order, what to wear, what to write down."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING

from fertui.paper.page import ADVICE, Page, amount, clock, columns, folded, heading, section

if TYPE_CHECKING:
    from fertui.planning.acid import AcidSheet
    from fertui.planning.stock import StockSheet, TankSheet
    from fertui.planning.values import Caution, Plan

SIGN = "done [ ]  partly [ ]: ________  not done [ ]   initials ____  time ______"


def dose_sheet(plan: Plan, site_name: str, timezone: str) -> Page:
    """The sheet of a plan: doses by day with a line to sign, recipe and tanks, acid, renewal, outcome expected."""
    lines = heading(f"{site_name}: {plan.loop}, dose sheet", f"from the state of {clock(plan.at, timezone)}")
    lines += _cautions(plan.cautions)
    if not plan.feasible:
        lines += folded(f"No plan: {plan.reason}")
    rows: list[tuple[str, ...]] = [("when", "salt", "formula", "kg", "into")]
    for step in plan.steps:
        into = step.target.removeprefix("tank:")
        rows.append((clock(step.at, timezone), step.salt, step.formula, f"{step.kg:g}", into))
        lines += folded(f"{clock(step.at, timezone)}: {step.kg:g} kg {step.salt} ({step.formula}) into {into}", "* ")
        lines += ["  dissolve in a bucket of tank water first, pour slowly while it circulates", f"  {SIGN}", ""]
    for split in plan.acid:
        lines += folded(
            f"{clock(split.at, timezone)}: {split.litres:.2f} L {split.acid} {split.strength_pct:g} % "
            f"({split.density_kg_per_l:.3f} kg/L); wait {split.wait_min:.0f} min, retest; go on only above pH "
            f"{split.retest_ph:.1f}, stop everything at pH {split.stop_ph:.1f}",
            "* ",
        )
        lines += [f"  pH found ______   {SIGN}", ""]
    if plan.renewal is not None:
        lines += folded(f"Let go {plan.renewal.litres:.0f} L and refill ({plan.renewal.kg_n:.2f} kg N leaves)", "* ")
        lines += [f"  {SIGN}", ""]
    if plan.recipe is not None and plan.recipe.sheet is not None:
        lines += [line for tank in plan.recipe.sheet.tanks for line in _card(tank)]
    lines += section("Why", [line for reason in plan.reasons for line in folded(reason, "- ")])
    lines += section("The sum", [line for step in plan.arithmetic for line in folded(step)])
    return Page("\n".join([*lines, ADVICE]), {"loop": plan.loop, "feasible": plan.feasible}, tuple(rows))


def stock_page(sheet: StockSheet, loop: str) -> Page:
    """One card a tank, in the order of dissolving."""
    lines = heading(f"{loop}: stock-tank sheet", f"EC to expect at the dripper {amount(sheet.ec)} mS/cm")
    for refused in sheet.refused:
        lines += folded(f"Refused, {' with '.join(refused.pair)}: {refused.why}", "! ")
    for notice in sheet.notices:
        lines += folded(notice, "- ")
    lines += [""] + _cautions(sheet.cautions)
    rows: list[tuple[str, ...]] = [("tank", "content", "salt", "formula", "kg")]
    for tank in sheet.tanks:
        lines += _card(tank)
        rows += [(tank.name, tank.content, each.salt, each.formula, f"{each.kg:g}") for each in tank.salts]
    lines += section("What reaches the dripper [mmol/L]", _reached(sheet))
    lines += section("The sum", [line for step in sheet.arithmetic for line in folded(step)])
    return Page("\n".join([*lines, ADVICE]), {"loop": loop, "feasible": sheet.feasible}, tuple(rows))


def _card(tank: TankSheet) -> list[str]:
    letter = f", letter {tank.letter}" if tank.letter else ""
    lines = [f"{tank.name}: {tank.content}{letter}, {tank.litres:g} L", *folded(tank.ratio)]
    lines.append("  fill to two thirds with water, then dissolve one after the other:")
    for position, each in enumerate(tank.salts, start=1):
        lines += folded(f"{each.salt} {each.formula}: {each.words}", f"  {position}. ")
    lines += [line for notice in tank.notices for line in folded(notice, "  - ")]
    if not tank.fits:
        lines.append("  ! does not fit: too much for this volume at its coldest")
    return [*lines, "  fill up, stir until clear.  batch no ______  date ______  initials ____", ""]


def _reached(sheet: StockSheet) -> list[str]:
    names = [ion for ion in sheet.ions_mmol_l if sheet.ions_mmol_l[ion] or sheet.asked_mmol_l.get(ion)]
    rows = [("", *names), ("asked", *(amount(sheet.asked_mmol_l.get(ion)) for ion in names))]
    return columns([*rows, ("reached", *(amount(sheet.ions_mmol_l[ion]) for ion in names))], range(1, len(names) + 1))


def acid_page(sheet: AcidSheet, loop: str) -> Page:
    """Acid in splits with wait, retest and stop, cautions first."""
    lines = heading(f"{loop}: acid sheet") + _cautions(sheet.cautions)
    if not sheet.feasible:
        lines += folded(f"No dose: {sheet.reason}", "! ")
    lines += [line for each in sheet.words for line in folded(each)]
    for split in sheet.splits:
        lines += folded(
            f"{split.number}. {split.litres:.2f} L, acid into water, slowly; wait {split.wait_min:.0f} min, retest; "
            f"go on only above pH {split.retest_ph:.1f}, stop everything at pH {split.stop_ph:.1f}",
            "* ",
        )
        lines.append(f"  pH found ______   {SIGN}")
    lines += ["", *section("The sum", [line for step in sheet.arithmetic for line in folded(step)])]
    rows = (
        ("split", "litres", "wait min"),
        *((str(s.number), f"{s.litres:.3f}", f"{s.wait_min:g}") for s in sheet.splits),
    )
    return Page("\n".join([*lines, ADVICE]), {"loop": loop, "feasible": sheet.feasible}, rows)


def _cautions(cautions: Iterable[Caution]) -> list[str]:
    return section("Read before you start", [line for each in cautions for line in folded(each.text, "! ")])
