"""The sheet of a plan: what to weigh or change, by day, with a line to sign; what comes of it; why; the sum."""

from __future__ import annotations

from collections.abc import Iterable
from itertools import groupby
from typing import TYPE_CHECKING

from fertui.catalogue.acids import with_strength
from fertui.paper.acid_page import litres
from fertui.paper.cautions import read_first
from fertui.paper.page import SIGN, Page, amount, clock, columns, folded, heading, listed, page, section
from fertui.paper.tank_cards import card, reached

if TYPE_CHECKING:
    from fertui.estimate.points import Estimated
    from fertui.planning.values import AcidStep, Outlook, Plan, RecipeChange, Renewal, Step

OUTCOME = ("K share", "Ca share", "Mg share", "EC", "Na", "NH4")
UNIT = {"EC": "mS/cm"}
HOW = "dissolve each in a bucket of tank water, pour slowly while it circulates, then the next; read EC and pH after"


def dose_sheet(plan: Plan, site: str, timezone: str) -> Page:
    """The sheet of a plan. It is no record: doses count when they are logged as done."""
    lines = heading(f"Dose sheet: {plan.loop}", site, _rests_on(plan, timezone))
    if not plan.feasible:
        lines += section("THE ANSWER IS NO", folded(plan.reason or "", "!! "))
    lines += section("FIRST", _first(plan)) + read_first(plan.cautions)
    lines += _renewal(plan.renewal) if plan.renewal is not None else []
    lines += _weighings(plan.steps, timezone) + _acid(plan.acid, timezone)
    lines += _recipe(plan.recipe, timezone) if plan.recipe is not None else []
    lines += section(f"WHAT COMES OF IT ({plan.point.replace('_', ' ')}, 80 % ranges)", _outcome(plan))
    lines += section("IF IT GOES OTHERWISE", listed(f"{each.case}: {each.text}" for each in plan.sensitivity))
    lines += section("LIMITS THAT BIND", listed(_binding(plan)))
    lines += section("RULE OF THUMB BESIDE IT", listed(plan.rule_of_thumb))
    lines += section("WHY", listed(plan.reasons)) + section("THE SUM, STEP BY STEP", listed(plan.arithmetic, "  "))
    return page(lines, {"loop": plan.loop, "feasible": plan.feasible}, table(plan, timezone), advice=True)


def table(plan: Plan, timezone: str) -> list[tuple[str, ...]]:
    """Everything the sheet asks to be weighed or poured, as a table."""
    rows: list[tuple[str, ...]] = [("planned for", "what", "formula", "amount", "unit", "into")]
    for step in plan.steps:
        rows.append((clock(step.at, timezone), step.salt, step.formula, f"{step.kg:g}", "kg", _into(step.target)))
    for split in plan.acid:
        strength = f"{split.strength_pct:g} %"
        rows.append((clock(split.at, timezone), split.acid, strength, f"{split.litres:.3f}", "L", _into(split.target)))
    if plan.recipe is not None and plan.recipe.sheet is not None:
        for tank in plan.recipe.sheet.tanks:
            rows += [("", each.salt, each.formula, f"{each.kg:g}", "kg", tank.name) for each in tank.salts]
    if plan.renewal is not None:
        rows.append(("", "renewal", "", f"{plan.renewal.litres:.0f}", "L", "out of the loop"))
    return rows


def _rests_on(plan: Plan, timezone: str) -> str:
    days = "right after mixing" if plan.horizon_days == 0 else f"over {plan.horizon_days} days"
    state = f"from the state of {clock(plan.at, timezone)}, {days}"
    return f"{state}. A plan is no record: log each step as done, partly or not."


def _first(plan: Plan) -> list[str]:
    sample = ["Take a sample first: the range is wider than the band."] if plan.sample_first else []
    return listed([*sample, *plan.notices], "!  ")


def _weighings(steps: Iterable[Step], timezone: str) -> list[str]:
    """Salts by day and tank: one after the other, each dissolved before the next."""
    lines: list[str] = []
    for (when, target), group in groupby(steps, key=lambda step: (clock(step.at, timezone), step.target)):
        body = []
        for position, step in enumerate(group, start=1):
            head = f"[ ] {position}. {step.salt} "
            body += [f"{head:.<60} {step.kg:>9.2f} kg", f"       {step.formula}", f"       {SIGN}"]
        lines += section(f"{when} INTO {_into(target)}", [*folded(HOW), *body])
    return lines


def _acid(splits: Iterable[AcidStep], timezone: str) -> list[str]:
    lines = []
    for split in splits:
        acid = f"{with_strength(split.acid, split.strength_pct)} ({split.density_kg_per_l:.3f} kg/L)"
        go_on = f"wait {split.wait_min:.0f} min, retest; go on only above pH {split.retest_ph:.1f}"
        pour = f"{clock(split.at, timezone)}: {litres(split.litres)} {acid} into {_into(split.target)}"
        stop = f"stop everything at pH {split.stop_ph:.1f}"
        lines += [*folded(f"{pour}; {go_on}; {stop}", "[ ] "), "    pH before ______   pH after ______", f"    {SIGN}"]
    return section("ACID, acid into water, second person knows: ____________", lines)


def _recipe(recipe: RecipeChange, timezone: str) -> list[str]:
    rows: list[tuple[str, ...]] = [("ion", "next recipe", "change")]
    for ion, value in recipe.ions_mmol_l.items():
        change = recipe.change_pct.get(ion)
        unit = "meq/L" if ion == "HCO3" else "mmol/L"
        rows.append((ion, f"{amount(value)} {unit}", "" if change is None else f"{change:+.0f} %"))
    lines = columns(rows, (1, 2))
    if len(recipe.stages) > 1:
        stages = (f"from {clock(stage.at, timezone)}: EC {stage.ec:.1f} mS/cm" for stage in recipe.stages)
        lines += listed(stages)
    found = section(f"NEXT RECIPE, EC {amount(recipe.ec)} mS/cm, number ______", [*lines, SIGN])
    if recipe.sheet is None:
        return found
    return [*found, *(line for tank in recipe.sheet.tanks for line in card(tank)), *reached(recipe.sheet)]


def _renewal(renewal: Renewal) -> list[str]:
    refill = ", ".join(f"{ion} {amount(value)}" for ion, value in renewal.refill.items() if value)
    lines = folded(f"let go {renewal.litres:.0f} L and refill with {refill} mmol/L", "[ ] ") if refill else []
    lost = f"with it leave {renewal.kg_n:.2f} kg N and {renewal.kg_p:.2f} kg P"
    body = [*lines, *folded(lost), f"    {SIGN}", *listed((each.text for each in renewal.options), "  - ")]
    return section(f"RENEWAL of {renewal.litres:.0f} L", body)


def _outcome(plan: Plan) -> list[str]:
    outlooks = (plan.before, plan.after, plan.after_without)
    rows: list[tuple[str, ...]] = [("", "now", "with the plan", "without it", "band")]
    for what in OUTCOME:
        found = [_number(outlook, plan.point, what) for outlook in outlooks]
        if found[0] is not None:
            unit = "%" if what.endswith(" share") else UNIT.get(what, "mmol/L")
            rows.append((f"{what} {unit}", *(_ranged(each, unit) for each in found), _band(found[0])))
    return [*columns(rows, (1, 2, 3)), "pH is not foretold: measure it after every step."] if len(rows) > 1 else []


def _number(outlook: Outlook, point: str, what: str) -> Estimated | None:
    state = outlook.points.get(point)
    if state is None or what == "EC":
        return None if state is None else state.ec
    ion = state.ions.get(what.removesuffix(" share"))
    return None if ion is None else ion.share_pct if what.endswith(" share") else ion.mmol_l


def _ranged(found: Estimated | None, unit: str) -> str:
    if found is None:
        return "-"
    middle, low, high = (
        f"{each:.0f}" if unit == "%" else amount(each) for each in (found.value, found.low, found.high)
    )
    return middle if low == high else f"{middle} ({low}-{high})"


def _band(found: Estimated) -> str:
    if found.band is None:
        return ""
    low, high = (None if edge is None else f"{edge:g}" for edge in found.band)
    return f"up to {high}" if low is None else f"from {low}" if high is None else f"{low}-{high}"


def _binding(plan: Plan) -> Iterable[str]:
    for each in plan.binding:
        source = f" ({each.source})" if each.source else ""
        yield f"{each.limit}: {amount(each.value)} {each.unit}, reached {amount(each.reached)} {each.unit}{source}"


def _into(target: str) -> str:
    return target.removeprefix("tank:")
