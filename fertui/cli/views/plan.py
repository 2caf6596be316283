"""How a plan reads."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from fertui.catalogue.acids import with_strength
from fertui.cli.views import as_json, words
from fertui.estimate.signs import SIGNS
from fertui.paper.cautions import read_first
from fertui.paper.page import columns, folded
from fertui.planning.values import Outlook, Plan, RecipeChange, Renewal
from fertui.site.points import point_name
from fertui.workbench.carrying_out import ON_TOP, STANDS, PlanItem, in_words
from fertui.workbench.today import reading_of, unit_of

Held = tuple[tuple[str, float], ...]
"""Acids and lyes whose litres are held back, with the strength counted on."""


def text(plan: Plan, timezone: str, unit: str, held: Held = ()) -> str:
    """The plan: the answer, cautions, what to do in its order, before and after, then limits, reasons and sums."""
    lines = [f"{plan.loop}: plan over {plan.horizon_days} days, for the {point_name(plan.point)}"]
    if not plan.feasible:
        lines += folded(f"No: {plan.reason}", "")
    lines += [line for each in plan.notices for line in folded(each, f"{SIGNS['watch']} ")]
    lines += ["", *read_first(plan.cautions)[:-1]] if plan.acid or plan.steps or plan.recipe else []
    lines += _held_back(held) + _renewal(plan, timezone)
    lines += _recipe(plan, timezone, unit, held) + _steps(plan, timezone) + ([] if held else _acid(plan, timezone))
    lines += ["", *_outcome(plan)]
    lines += _section("Limits that bind", [_binding(each) for each in plan.binding])
    lines += _section("Rule of thumb beside it", plan.rule_of_thumb)
    lines += _section("Why", plan.reasons)
    lines += _section("Otherwise", [each.text for each in plan.sensitivity])
    if plan.runner_up is not None:
        lines += _section("Next best", [plan.runner_up.difference])
    lines += _section("Step by step", [each for each in plan.arithmetic if not _tells_litres(each, held)])
    return "\n".join(lines)


def accepted_text(plan: Plan, accepted: Sequence[PlanItem], stands: bool, timezone: str) -> str:
    """Accepted steps still to do; what comes of them where they stand in place of a plan, else that it adds to them."""
    lines = [f"{plan.loop}: accepted and still to do", *(f"  {in_words(each, timezone)}" for each in accepted), ""]
    if not stands:
        return "\n".join([*lines, *folded(ON_TOP, ""), "", ""])
    lines += [*folded(STANDS, f"{SIGNS['watch']} "), ""]
    outlooks = (("now", plan.before), (f"with these steps, {plan.horizon_days} days on", plan.after_without))
    return "\n".join([*lines, *_table(outlooks, plan.point)])


def _section(title: str, rows: Any) -> list[str]:
    return ["", title, *(line for row in rows for line in folded(row, "  "))] if rows else []


def _held_back(held: Held) -> list[str]:
    """What is not shown yet, and how it is."""
    if not held:
        return []
    named = " and ".join(with_strength(*each) for each in held)
    words = (
        f"{named}: amounts are held back. Read the cautions above and the label, then ask again with --cautions-read "
        "--label-strength PERCENT"
    )
    return ["", *folded(words, f"{SIGNS['act']} ")]


def _tells_litres(line: str, held: Held) -> bool:
    """Whether a sum gives away how much of what is held back."""
    return any(name in line for name, _ in held)


def _recipe(plan: Plan, timezone: str, unit: str, held: Held) -> list[str]:
    if plan.recipe is None:
        return []
    recipe = plan.recipe
    rows = [("feed", f"next {unit}", "change")]
    for ion, amount in recipe.ions_mmol_l.items():
        change = recipe.change_pct.get(ion)
        rows.append(
            (
                words.label(ion, unit),
                words.number(amount * words.factor(ion, unit)),
                "" if change is None else f"{change:+.0f} %",
            )
        )
    lines = ["", f"Next recipe, EC {words.number(recipe.ec)} mS/cm", *columns(rows, (1, 2))]
    if len(recipe.stages) > 1:
        lines += [f"  from {words.local(stage.at, timezone)}: EC {stage.ec:.1f} mS/cm" for stage in recipe.stages]
    if recipe.sheet is not None:
        for tank in recipe.sheet.tanks:
            lines += ["", f"{tank.name} ({tank.content}), {tank.litres:.0f} L, 1:{tank.dilution:.0f}"]
            names = {name for name, _ in held}
            for each in tank.salts:
                how_much = "held back, see above" if each.salt in names else each.words
                lines += folded(f"{each.salt}: {how_much}", "  ")
    return lines


def _steps(plan: Plan, timezone: str) -> list[str]:
    if not plan.steps:
        return []
    rows: list[tuple[str, ...]] = [("when", "salt", "", "kg", "into")]
    rows += [
        (words.local(each.at, timezone), each.salt, each.formula, f"{each.kg:g}", each.target.removeprefix("tank:"))
        for each in plan.steps
    ]
    return ["", "Weigh and dissolve", *columns(rows, (3,))]


def _acid(plan: Plan, timezone: str) -> list[str]:
    lines = []
    for each in plan.acid:
        into = f"into {each.target.removeprefix('tank:')}"
        acid = f"{with_strength(each.acid, each.strength_pct)} ({each.density_kg_per_l:.3f} kg/L)"
        lines += folded(
            f"{words.local(each.at, timezone)}: {each.litres:.3f} L {acid} {into}; wait "
            f"{each.wait_min:.0f} min, retest, go on only above pH {each.retest_ph:.1f}; stop at pH {each.stop_ph:.1f}",
            "  ",
        )
    return ["", "Acid, acid into water, with a second person", *lines] if lines else []


def _renewal(plan: Plan, timezone: str) -> list[str]:
    """The renewal in words: when, before what, with what; or as advice beside the plan."""
    if plan.renewal is None:
        return []
    renewal = plan.renewal
    lost = f"{renewal.kg_n:.2f} kg N and {renewal.kg_p:.2f} kg P leave with it"
    head = f"Renew {renewal.litres:.0f} L: {lost}"
    if renewal.at is not None:
        fresh = ", ".join(f"{ion} {words.number(mmol)}" for ion, mmol in renewal.refill.items() if mmol >= 0.05)
        water = f"make-up water ({fresh} mmol/L)" if fresh else "make-up water"
        head = (
            f"First, {words.local(renewal.at, timezone)}, before anything is weighed in: let go {renewal.litres:.0f} L "
            f"and fill up with {water}; {lost}"
        )
    return ["", *folded(head, ""), *(line for each in renewal.options for line in folded(each.text, "  "))]


def _outcome(plan: Plan) -> list[str]:
    outlooks = (("now", plan.before), ("with the plan", plan.after), ("without it", plan.after_without))
    return _table(outlooks, plan.point)


def _table(outlooks: Sequence[tuple[str, Outlook]], point: str) -> list[str]:
    """States side by side, each under its head."""
    rows: list[tuple[str, ...]] = [("", *(head for head, _ in outlooks))]
    for what in ("K share", "Ca share", "Mg share", "EC", "Na", "NH4"):
        cells = [_cell(outlook, point, what) for _, outlook in outlooks]
        rows.append((f"{what} {'%' if 'share' in what else 'mS/cm' if what == 'EC' else 'mmol/L'}", *cells))
    return columns(rows)


def _cell(outlook: Outlook, point: str, what: str) -> str:
    state = outlook.points.get(point)
    value = None if state is None else reading_of(state, what)
    return words.ABSENT if value is None else words.ranged(value, unit=unit_of(what))


def _binding(each: Any) -> str:
    source = f" ({each.source})" if each.source else ""
    reached = f"reached {words.number(each.reached)} {each.unit}"
    return f"{each.limit}: {words.number(each.value)} {each.unit}, {reached}{source}"


def document(plan: Plan, accepted: Sequence[PlanItem] = ()) -> dict[str, Any]:
    """The contract of ``plan --json``; ``accepted``: steps still to do, to which the new ones would come on top."""
    return {
        "schema": "fertui.plan/1",
        "loop": plan.loop,
        "layout": plan.layout,
        "at": plan.at,
        "accepted": [{**as_json.plain(each), "state": each.state} for each in accepted],
        "feasible": plan.feasible,
        "reason": plan.reason,
        "horizon_days": plan.horizon_days,
        "recipe": None if plan.recipe is None else _recipe_data(plan.recipe),
        "steps": [as_json.plain(step) for step in plan.steps],
        "acid": [_acid_step(step) for step in plan.acid],
        "renewal": None if plan.renewal is None else _renewal_data(plan.renewal),
        "before": {"points": as_json.points(plan.before.points)},
        "after": {"points": as_json.points(plan.after.points)},
        "after_without": {"points": as_json.points(plan.after_without.points)},
        "binding": [as_json.plain(each) for each in plan.binding],
        "rule_of_thumb": list(plan.rule_of_thumb),
        "reasons": list(plan.reasons),
        "arithmetic": list(plan.arithmetic),
        "sample_first": plan.sample_first,
        "model_runs": plan.model_runs,
        "solver_calls": plan.solver_calls,
        "cautions": [as_json.plain(each) for each in plan.cautions],
    }


def _recipe_data(recipe: RecipeChange) -> dict[str, Any]:
    return {
        "ions_mmol_L": recipe.ions_mmol_l,
        "change_pct": recipe.change_pct,
        "EC_mS_cm": recipe.ec,
        "tanks": [] if recipe.sheet is None else tanks(recipe.sheet),
    }


def _renewal_data(renewal: Renewal) -> dict[str, Any]:
    return {
        "litres": renewal.litres,
        "refill": renewal.refill,
        "kg_N": renewal.kg_n,
        "kg_P": renewal.kg_p,
        "year_kg_N": renewal.year_kg_n,
        "at": renewal.at,
    }


def tanks(sheet: Any) -> list[dict[str, Any]]:
    """Stock tanks in the shape of the contract."""
    return [
        {
            "name": tank.name,
            "content": tank.content,
            "litres": tank.litres,
            "dilution": tank.dilution,
            "salts": [{"salt": each.salt, "formula": each.formula, "kg": each.kg} for each in tank.salts],
            "fits": tank.fits,
        }
        for tank in sheet.tanks
    ]


def _acid_step(step: Any) -> dict[str, Any]:
    shown = as_json.plain(step)
    shown["retest_pH"] = shown.pop("retest_ph")
    shown["stop_pH"] = shown.pop("stop_ph")
    return dict(shown)
