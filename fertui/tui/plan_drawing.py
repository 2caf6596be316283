"""How a plan looks: steps, the table of before, with and without, what binds, cautions, words."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from datetime import datetime
from typing import TYPE_CHECKING

from fertui.site.points import point_name
from fertui.tui.figures import (
    CAUTION_INKS,
    MARKS,
    amount,
    band_words,
    estimated,
    number,
    standing,
    unit_and_species,
)
from fertui.tui.ink import BLANK, Line, Span, barred, col, cut, fit, line, literal, wrap
from fertui.tui.snapshot import Snapshot

if TYPE_CHECKING:
    from fertui.planning.values import Outlook, Plan
    from fertui.planning.weighing import Weighing
    from fertui.workbench.carrying_out import PlanItem

Local = Callable[[datetime], datetime]
USUAL = 76
"""Columns from which the days without the plan have room beside those with it."""
CELL = 19
"""Columns of a number with its sign and range."""
COMPARED = ("K share", "Ca share", "Mg share", "EC", "Na", "NH4", "NO3")


def draw_accepted(items: Sequence[PlanItem], chosen: int, local: Local, width: int) -> list[Line]:
    """Steps accepted before: what is to do, what is done."""
    if not items:
        return []
    rows = [line(Span(" Accepted", "title"), Span("   expected; done only once marked", "faint"))]
    for index, item in enumerate(items):
        how_much = "" if item.amount is None else f"{item.amount:g} {item.unit}"
        where = f" into {item.target}" if item.target else ""
        words = f"{local(item.at):%a %-d %b %H:%M}  {how_much} {item.what}{where}"
        row = line(
            Span(" ▸ " if index == chosen else "   ", "accent"), fit(literal(words), width - 24), _done_so_far(item)
        )
        rows.append(barred(row, width) if index == chosen else row)
    return rows


def _done_so_far(item: PlanItem) -> Span:
    if item.state == "partly done":
        return Span(f"{MARKS['watch']} {item.done_amount:g} of {item.amount:g} {item.unit} done", "watch")
    return Span(f"✓ done in {item.done_number}", "good") if item.state == "done" else Span("· to do", "watch")


def draw_plan(
    plan: Plan, held: bool, wishes: Sequence[str], snapshot: Snapshot, local: Local, width: int
) -> list[Line]:
    """The plan from its head to its cautions."""
    rows = [_head(plan, wishes, width)]
    if not plan.feasible:
        rows += _marked("act", f"No plan reaches it: {plan.reason}", width)
    if plan.sample_first:
        rows += _marked("watch", "The range is wider than the band: take a sample first, then plan.", width)
    rows += [*_recipe(plan, snapshot.unit, width), *_doses(plan, local, width), *_acid(plan, held, local, width), BLANK]
    rows += [
        *_outcome(_outlooks(plan, width), plan.point, snapshot.unit, width),
        BLANK,
        *_texts("notice", plan.notices, width),
    ]
    rows += [*_tanks(plan, held, width), *_renewal(plan, width)]
    for binding in plan.binding:
        source = f" ({literal(binding.source)})" if binding.source else ""
        rows += _marked(
            "watch",
            f"binds: {binding.limit} {amount(binding.value)} {binding.unit}, reached {amount(binding.reached)}{source}",
            width,
        )
    rows += _texts("rule of thumb", plan.rule_of_thumb, width)
    if plan.runner_up is not None:
        rows += _texts("next best", [plan.runner_up.difference], width)
    rows += _texts("if done otherwise", [each.text for each in plan.sensitivity], width)
    for caution in plan.cautions:
        rows += _marked(CAUTION_INKS[caution.severity], caution.text, width)
    return rows


def draw_standing(plan: Plan, unit: str, width: int) -> list[Line]:
    """In place of a plan that would tell accepted steps again: that they stand, and what comes of them."""
    from fertui.workbench.carrying_out import STANDS

    outlooks = [("now", plan.before), ("with these steps", plan.after_without)]
    return [*_marked("watch", STANDS, width), BLANK, *_outcome(outlooks, plan.point, unit, width)]


def draw_on_top(width: int) -> list[Line]:
    """What a plan beside accepted steps is to be read as."""
    from fertui.workbench.carrying_out import ON_TOP

    return _marked("faint", ON_TOP, width)


def draw_outdated(width: int) -> list[Line]:
    """That a plan is of before the last entry."""
    return _marked("watch", "Being worked out anew after what was logged; what stands below is of before that.", width)


def _head(plan: Plan, wishes: Sequence[str], width: int) -> Line:
    horizon = f"{plan.horizon_days} days" if plan.horizon_days else "right after mixing"
    words = f" Plan, {horizon}, for the {point_name(plan.point, plan.layout)}"
    return line(Span(words, "title"), Span(cut("  " + ", ".join(wishes), width - len(words)), "faint"))


def _recipe(plan: Plan, unit: str, width: int) -> list[Line]:
    """The next recipe with how far it departs from the running one, and the tanks that carry it."""
    if plan.recipe is None:
        return []
    from fertui.workbench.units import shown

    recipe = plan.recipe
    about = f"{unit}, EC {number(recipe.ec, 2)} mS/cm; change on the running one in %"
    first, *more = wrap(about, width - 15)
    rows = [line(Span(" next recipe", "strong"), Span(f"  {first}", "faint"))]
    rows += [line(Span(f" {text}", "faint")) for text in more]
    cells: list[str | Span] = []
    for ion, value in recipe.ions_mmol_l.items():
        shown_value, label = shown(ion, value, unit)
        name = unit_and_species(label, ion)[1]
        change = recipe.change_pct.get(ion)
        moved = "" if change is None or abs(change) < 0.5 else f" {change:+.0f} %"
        cells.append(Span(fit(f" {name} {amount(shown_value)}{moved}", 19), "strong" if moved else "plain"))
    per_row = max(1, (width - 1) // 19)
    rows += [line(*cells[start : start + per_row]) for start in range(0, len(cells), per_row)]
    return rows


def _tanks(plan: Plan, held: bool, width: int) -> list[Line]:
    """What the stock tanks of the next recipe are mixed from; acids only once they are released."""
    if plan.recipe is None or plan.recipe.sheet is None:
        return []
    from fertui.workbench.carrying_out import acids_of

    acids = {name for name, _ in acids_of(plan)} if held else set()
    rows: list[Line] = []
    for tank in plan.recipe.sheet.tanks:
        salts = [f"{each.salt} {'held back, k' if each.salt in acids else weighed(each)}" for each in tank.salts]
        letter = f" ({tank.letter})" if tank.letter else ""
        rows += _texts(f"{tank.name}{letter}, {tank.litres:g} L", [", ".join(salts)], width)
    return rows


def weighed(each: Weighing) -> str:
    """What goes in, by the measure it is taken with: litres of a liquid, kg of a salt, to what can be measured.

    >>> from types import SimpleNamespace
    >>> weighed(SimpleNamespace(litres=None, kg=45.6))
    '45.6 kg'
    """
    return f"{each.litres:.4g} L" if each.litres is not None else f"{each.kg:.5g} kg"


def _doses(plan: Plan, local: Local, width: int) -> list[Line]:
    rows: list[Line] = []
    for step in plan.steps:
        where = step.target.removeprefix("tank:")
        words = f"{local(step.at):%a %-d %b %H:%M}  {step.kg:g} kg {step.salt} ({step.formula}) into {where}"
        rows += _labelled("weigh", "accent", words, width)
    return rows


def _acid(plan: Plan, held: bool, local: Local, width: int) -> list[Line]:
    if held:
        return _marked("act", "What holds acid is held back; k shows its cautions and asks for the label.", width)
    rows: list[Line] = []
    for split in plan.acid:
        words = (
            f"{local(split.at):%a %-d %b %H:%M}  {number(split.litres, 2)} L {split.acid} of {split.strength_pct:g} %, "
            f"wait {split.wait_min:g} min, retest for pH {number(split.retest_ph)}, stop at {number(split.stop_ph)}"
        )
        rows += _labelled("acid", "act", words, width)
    return rows


def _labelled(label: str, ink: str, text: str, width: int) -> list[Line]:
    """What is to be done, never cut: what does not fit goes on below."""
    first, *more = wrap(literal(text), width - 8)
    below = [line(" " * 7, Span(words, "strong")) for words in more]
    return [line(Span(fit(f" {label}", 7), ink), Span(first, "strong")), *below]


def _renewal(plan: Plan, width: int) -> list[Line]:
    if plan.renewal is None:
        return []
    rows = _marked(
        "watch",
        f"renew {plan.renewal.litres:.0f} L: {amount(plan.renewal.kg_n)} kg N and {amount(plan.renewal.kg_p)} kg "
        f"P go; the year comes to {amount(plan.renewal.year_kg_n)} kg N",
        width,
    )
    return rows + [row for option in plan.renewal.options for row in _texts(option.name, [option.text], width)]


def _outlooks(plan: Plan, width: int) -> list[tuple[str, Outlook]]:
    """Now, at the horizon with the plan, at the horizon without."""
    outlooks = [("now", plan.before), ("with the plan", plan.after)]
    return [*outlooks, ("without", plan.after_without)] if width >= USUAL else outlooks


def _outcome(outlooks: Sequence[tuple[str, Outlook]], point: str, unit: str, width: int) -> list[Line]:
    """A table of states side by side."""
    from fertui.tui.views.forecast import _in_unit, _value

    heads = (*((head, CELL) for head, _ in outlooks), ("band", 10))
    rows = [line(col("", 13), *(col(head, size, "faint") for head, size in heads))]
    for what in COMPARED:
        cells, label, band = [], "", ""
        for _, outlook in outlooks:
            state = outlook.points.get(point)
            value, name = _in_unit(None if state is None else _value(state, what), what, unit)
            if value is None:
                cells.append(col("-", CELL))
                continue
            middle, reach = estimated(value, name)
            ink = standing(value)
            label, band = name, band_words(value.band)
            cells.append(
                Span(
                    fit(f"{MARKS.get(ink, ' ')} {middle} ({reach})", CELL, right=True),
                    ink if ink in ("act", "watch") else "plain",
                )
            )
        if label or what == "EC":
            rows.append(
                line(
                    col(f" {what} {label}".replace("share %", "share, %"), 13, right=False),
                    *cells,
                    col(band, 10, "faint"),
                )
            )
    return rows


def _marked(ink: str, text: str, width: int) -> list[Line]:
    first, *more = wrap(literal(text), width - 5)
    return [line(Span(f" {MARKS[ink]:2} ", ink), first), *(line("    ", words) for words in more)]


def _texts(label: str, texts: Iterable[str], width: int) -> list[Line]:
    rows: list[Line] = []
    for text in texts:
        first, *more = wrap(literal(f"{label}: {text}"), width - 2)
        rows += [line(" ", first), *(line("   ", words) for words in more)]
    return rows
