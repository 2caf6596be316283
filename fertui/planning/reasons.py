"""Why a plan is as it is: the limits that bind, why this salt and not that one, and every sum for a pocket
calculator."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence

import numpy as np

from fertui.chemistry.ions import CHARGE, INDEX, IONS, Array
from fertui.planning.checkpoints import (
    COMES_ALONG,
    OVERSHOT,
    Checkpoint,
    before_of,
    ec_of,
    indices_of,
    step_most,
    step_name,
)
from fertui.planning.goal import LIMITED, SHARED, Goal
from fertui.planning.runs import share_pct
from fertui.planning.shelf import Material
from fertui.planning.values import Binding, Step

NEAR = 0.02
"""A limit binds where less than this part of it is left."""
NEAR_INDEX = 0.05
"""The same for a saturation index."""
ENOUGH = 1.1
"""An ion over its aim by more than a tenth is said to be there already."""
OVER = "already over, none added"
SPOKEN_MMOL = 0.005
"""Change of an ion [mmol/L] from which the arithmetic speaks of it."""
MAJOR = ("K", "Ca", "Mg", "NO3", "SO4", "H2PO4")


def binding(points: Sequence[Checkpoint]) -> tuple[Binding, ...]:
    """The limits a plan comes up against, each once, at the checkpoint where least is left."""
    found: dict[str, tuple[float, Binding]] = {}
    for each in points:
        before = before_of(each, points)
        for what, value, limit, unit, near in _reached(each, before):
            room = limit - value
            if room <= near and (what not in found or room < found[what][0]):
                source = each.goal.sources.get(what, "common practice" if what.startswith("EC step") else "")
                words = OVER if room < -near else each.name
                found[what] = (room, Binding(f"{what}, {words}", limit, unit, value, source))
    return tuple(each for _, each in found.values())


def _reached(each: Checkpoint, before: Checkpoint | None) -> Iterable[tuple[str, float, float, str, float]]:
    ec = float(ec_of(each, each.now))
    if np.isfinite(each.goal.ec_most):
        yield "EC", ec, each.goal.ec_most, "mS/cm", NEAR * each.goal.ec_most
    if before is not None:
        rise, most = ec - float(ec_of(before, before.now)), step_most(each, before)
        yield step_name(each, before), rise, most, "mS/cm", 0.1 * most
    for ion in LIMITED:
        most = float(each.goal.most[INDEX[ion]])
        if np.isfinite(most):
            yield ion, float(each.now[INDEX[ion]]), most, "mmol/L", NEAR * most
    if before is not None and before.day == each.day:
        for name, index, most in zip(("gypsum", "brushite"), indices_of(each, each.now), (0.0, 0.3), strict=True):
            yield name, float(index), most, "SI", NEAR_INDEX


def why_salts(used: Iterable[Material], shelf: Sequence[Material], end: Array, goal: Goal) -> tuple[str, ...]:
    """One line for each salt weighed in and one for each left standing."""
    chosen = {each.name for each in used}
    lines = [f"{each.name}: brings {_named(_short(each, end, goal)) or 'what the aim still asks for'}" for each in used]
    for each in shelf:
        if each.name not in chosen and each.use == "nutrient":
            bad = _excess(each, end, goal)
            why = f"brings {_named(bad)}, enough there already" if bad else "would be one salt more for nothing gained"
            lines.append(f"not {each.name}: {why}")
    return tuple(lines)


def _short(each: Material, end: Array, goal: Goal) -> list[str]:
    wanted = [ion for ion in MAJOR if each.brings(ion) and goal.wants[INDEX[ion]]]
    return [f"{ion}" for ion in wanted]


def _excess(each: Material, end: Array, goal: Goal) -> list[str]:
    over = []
    for ion in (*MAJOR, *LIMITED):
        i = INDEX[ion]
        aim = goal.aim[i] if not np.isnan(goal.aim[i]) else 0.0
        if each.brings(ion) and end[i] > max(aim, 0.05) * ENOUGH:
            over.append(f"{ion} ({end[i]:.1f} of {aim:.1f} mmol/L)")
    return over


def _named(words: Sequence[str]) -> str:
    return " and ".join([", ".join(words[:-1]), words[-1]] if len(words) > 1 else words)


def arithmetic(
    steps: Sequence[Step], materials: Mapping[str, Material], before: Mapping[object, Array], volume_l: float
) -> tuple[str, ...]:
    """kg -> mmol -> mmol/L -> before + dose = after, one line an ion, for every step.

    ``before``: composition of the tank (10,) just before the doses of a time.
    """
    lines: list[str] = []
    for at in dict.fromkeys(each.at for each in steps):
        total = np.zeros(len(IONS))
        lines.append(f"{at:%a %d %b}: {volume_l:.0f} L")
        for step in (each for each in steps if each.at == at):
            material = materials[step.salt]
            for ion, mmol in step.adds_mmol.items():
                per_kg = material.ions_mmol_per_kg[INDEX[ion]]
                lines.append(
                    f"  {step.salt}: {step.kg:g} kg x {per_kg:.0f} mmol/kg {ion} = {mmol:.0f} mmol"
                    f" / {volume_l:.0f} L = {mmol / volume_l:.2f} mmol/L"
                )
                total[INDEX[ion]] += mmol / volume_l
        for ion, added, was in zip(IONS, total, before[at], strict=True):
            if abs(added) > SPOKEN_MMOL:
                lines.append(f"  {ion}: {was:.2f} before + {added:.2f} = {was + added:.2f} mmol/L after mixing")
        lines.append(f"  {_share_line(before[at] + total)}")
    return tuple(lines)


def _share_line(composition: Array) -> str:
    meq = [float(CHARGE[INDEX[ion]] * composition[INDEX[ion]]) for ion in SHARED]
    total = sum(meq)
    if total <= 0:
        return "no K, Ca, Mg"
    sums = " + ".join(f"{each:.2f}" for each in meq)
    shares = ", ".join(f"{ion} {100 * each / total:.0f} %" for ion, each in zip(SHARED, meq, strict=True))
    return f"K + 2 Ca + 2 Mg = {sums} = {total:.2f} meq/L: {shares}"


def rule_of_thumb(now: Array, goal: Goal, change_pct: Mapping[str, float] | None = None) -> tuple[str, ...]:
    """The published step for each ion that is off, beside what the plan does with the feed where it is a recipe.

    Normalised analysis off by 25 %: change the feed by 10-15 %; by 50 %: 15-25 %; then wait 7-10 days (Nutrient
    Solutions for Greenhouse Crops 2016, second-hand).
    """
    lines = []
    for ion in MAJOR:
        aim = goal.aim[INDEX[ion]]
        if not goal.wants[INDEX[ion]]:
            continue
        off = 100.0 * (now[INDEX[ion]] / aim - 1.0)
        if abs(off) < 25.0:
            continue
        low, high = (10, 15) if abs(off) < 50.0 else (15, 25)
        side = "over" if off > 0 else "under"
        words = f"{ion} is {abs(off):.0f} % {side} its target: practice changes the feed by {low}-{high} %"
        lines.append(words + _beside(ion, -np.sign(off), low, high, change_pct))
    if lines:
        lines.append(
            "then waits 7-10 days and samples again (Nutrient Solutions for Greenhouse Crops 2016, second-hand)"
        )
    return tuple(lines)


def _beside(ion: str, sign: float, low: int, high: int, change_pct: Mapping[str, float] | None) -> str:
    if change_pct is None:
        return "; a tank takes its salts at once, so this plan weighs what is missing"
    change = change_pct.get(ion, 0.0)
    words = f", this plan by {change:+.0f} %"
    if change * sign < low - 0.5:
        return words + ": less, because uptake, drain and exchange bring it back part of the way, or a limit binds"
    if change * sign > high + 0.5:
        return words + ": more, because the horizon is short for what root zone and medium must take up"
    return words


def over_limit_words(end: Array, goal: Goal) -> tuple[str, ...]:
    """Ions over their limit at the end: salts and recipes add none, and take none out.

    Na itself is seldom the limit: what counts is that K, Ca and Mg stay above their least and EC below the crop's
    stress.
    """
    lines = []
    for ion in LIMITED:
        most = goal.most[INDEX[ion]]
        if end[INDEX[ion]] > most + 1e-6:
            source = goal.sources.get(ion, "")
            lines.append(
                f"{ion} {end[INDEX[ion]]:.1f} mmol/L is over its limit of {most:g} ({source}); none is added, only "
                "renewal or better water lowers it"
            )
    return tuple(lines)


def overshot_words(points: Sequence[Checkpoint]) -> tuple[str, ...]:
    """Anions that a plan lifts far over their aim, with their highest point: what K, Ca or Mg bring along."""
    highest: dict[str, tuple[float, float, str]] = {}
    for each in points:
        for ion in COMES_ALONG:
            aim, now = float(np.nan_to_num(each.goal.aim[INDEX[ion]])), float(each.now[INDEX[ion]])
            lifted = now > each.base[INDEX[ion]] + SPOKEN_MMOL and now > (1.0 + OVERSHOT) * aim > 0.0
            if lifted and now > highest.get(ion, (0.0,))[0]:
                highest[ion] = (now, aim, each.name)
    return tuple(
        f"{ion} comes to {now:.1f} mmol/L ({where}), {now / aim:.1f} times its aim of {aim:.1f}: it comes along with "
        "what is missing; a salt without it would be better"
        for ion, (now, aim, where) in highest.items()
    )


def share_words(composition: Array) -> str:
    """Shares of a composition (10,) in words."""
    return ", ".join(f"{ion} share {part:.1f} %" for ion, part in share_pct(composition).items())


def outside_words(end: Array, shown: Mapping[str, float], goal: Goal) -> str:
    """The shares outside their bands and no others, by the numbers the tables show.

    ``end``: composition (10,) the plan is judged by; ``shown``: share [%] of each ion as the tables have it. Where the
    two differ by a hair, the share is said to be at the edge.
    """
    found = []
    for ion, low, high in zip(SHARED, 100 * goal.share_low, 100 * goal.share_high, strict=True):
        if ion not in shown:
            return "hardly any K, Ca and Mg is left"
        band = f"band {round(float(low), 1):g}-{round(float(high), 1):g} %"
        if not low <= round(shown[ion]) <= high:
            found.append(f"{ion} share {shown[ion]:.0f} %, {band}")
        elif not low <= share_pct(end)[ion] <= high:
            found.append(f"{ion} share at the edge of its {band}")
    return "; ".join(found) or "shares at the edge of their bands"


def points_out(missed_pct: float) -> str:
    """How far shares are out of their bands, summed.

    >>> points_out(0.8), points_out(2.3)
    ('shares 1 % of K + Ca + Mg out of their bands', 'shares 2 % of K + Ca + Mg out of their bands')
    """
    return f"shares {missed_pct:.0f} % of K + Ca + Mg out of their bands"


def held_by(limits: Sequence[Binding]) -> str:
    """What keeps a plan from going further."""
    held = [each.limit for each in limits if not each.limit.endswith(OVER)]
    return "held by " + ", ".join(held) if held else "no single limit holds it: it takes more steps or more days"
