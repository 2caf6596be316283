"""Where and when a plan is looked at, and what must hold there, as rows of a linear program.

A checkpoint is a point of the loop at a time. Its composition is a straight line in the plan's variables about a plan
that the full model has run, so every limit becomes a row: c(x) = now + slope (x - x0).
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from fertui.chemistry.conductivity import conductivity
from fertui.chemistry.ions import CHARGE, INDEX, IONS, Array
from fertui.chemistry.minerals import saturation
from fertui.planning.goal import LIMITED, SHARED, Goal
from fertui.planning.runs import Situation

SHARED_AT = np.array([INDEX[ion] for ion in SHARED])
LIMITED_AT = np.array([INDEX[ion] for ion in LIMITED])
GYPSUM_MOST, BRUSHITE_MOST = 0.0, 0.3
"""Saturation a plan may reach; brushite stays up to there in the solutions of practice, or where it already is."""
EXCESS = 0.25
"""An ion over its aim by more than this part is in excess: the first step of the published rule (25 %)."""
NUTRIENTS_THAT_STAY = ("Ca", "Mg", "SO4")
"""Nutrients that a crop takes up slower than water, so that they gather (field practice)."""
NO_SHARES = 1.5
"""Equivalents of K + Ca + Mg [meq/L] up to which a vessel is being filled: its aim is counted ion by ion, not by
shares."""
FAR_BELOW = -1.0
"""Saturation index below which no row is made of it: a logarithm is no straight line so far off; the full model
judges."""
DRY_INDEX = -5.0
"""Saturation index taken where an ion of the mineral is missing."""
STEP = 0.02
"""Half width of the numerical slopes of EC and saturation [mmol/L]."""


class Checkpoint(NamedTuple):
    """One point at one time; the share of its violations in the first aim is ``weight``, of its misfit ``aim_weight``.

    ``base`` and ``now`` (10,) [mmol/L]: without the plan, and with the plan that was last run. ``slope`` (10,
    variables). ``ec_factor``: what the loop's meter reads over what the ions make. ``before``: index of the
    checkpoint whose EC the step is counted from, just before a dose or, in a root zone, a day earlier; -1: none.
    """

    name: str
    point: str
    day: float
    goal: Goal
    base: Array
    now: Array
    slope: Array
    ph: float = 5.8
    temperature_c: float = 20.0
    ec_factor: float = 1.0
    weight: float = 0.0
    aim_weight: float = 0.0
    before: int = -1


def before_of(each: Checkpoint, checkpoints: Sequence[Checkpoint]) -> Checkpoint | None:
    """The checkpoint whose EC the step of another is counted from; None where it has no step."""
    return checkpoints[each.before] if each.before >= 0 else None


def step_name(each: Checkpoint, before: Checkpoint) -> str:
    """What the step is called: that of a dose, or that of a day."""
    return "EC step" if each.day == before.day else "EC step of a day"


def step_most(each: Checkpoint, before: Checkpoint) -> float:
    """Most that EC may rise between two checkpoints [mS/cm]: the limit, or what it rises without the plan."""
    return max(each.goal.ec_step, float(ec_of(each, each.base) - ec_of(before, before.base)))


class Rows(NamedTuple):
    """``matrix x <= high`` with what each row limits, its limit in its own unit, and what a unit of it is."""

    matrix: Array
    high: Array
    names: tuple[str, ...]
    limits: tuple[float, ...]
    units: tuple[str, ...]
    sources: tuple[str, ...]


def ec_of(checkpoint: Checkpoint, composition: Array) -> Array:
    """EC [mS/cm] as the loop's meter reads it, of compositions (..., 10)."""
    return checkpoint.ec_factor * conductivity(np.maximum(composition, 0.0))


def ec_factor(situation: Situation, point: str) -> float:
    """What the loop's meter reads over what the ions of a point make; 1 where there is hardly anything in it."""
    made = float(conductivity(np.maximum(situation.composition(point), 0.0)))
    return situation.points[point].ec.value / made if made > 0.1 else 1.0


def indices_of(checkpoint: Checkpoint, composition: Array) -> Array:
    """Saturation index of gypsum and brushite (..., 2) of compositions (..., 10)."""
    found = saturation(np.maximum(composition, 0.0), checkpoint.ph, checkpoint.temperature_c)
    return np.maximum(np.stack([found["gypsum"], found["brushite"]], axis=-1), DRY_INDEX)


def hard_rows(checkpoints: Sequence[Checkpoint], x0: Array) -> Rows:
    """Every limit of every checkpoint: EC and its step, NH4, Na, Cl, gypsum, brushite.

    What is over its limit without the plan may stay where it is and not rise: adding none of it is allowed, more is
    not.
    """
    parts = [part for each in checkpoints for part in _limits_of(each, checkpoints, x0)]
    matrix = np.array([part[0] for part in parts]).reshape(len(parts), len(x0))
    high = np.array([part[1] for part in parts])
    names, limits = tuple(part[2] for part in parts), tuple(part[3] for part in parts)
    return Rows(matrix, high, names, limits, tuple(part[4] for part in parts), tuple(part[5] for part in parts))


Part = tuple[Array, float, str, float, str, str]


def _limits_of(each: Checkpoint, checkpoints: Sequence[Checkpoint], x0: Array) -> list[Part]:
    parts = [*_ec_parts(each, checkpoints, x0), *_ion_parts(each, x0), *_mineral_parts(each, x0)]
    return [part for part in parts if np.isfinite(part[1])]


def _slopes(each: Checkpoint) -> tuple[Array, Array, Array, Array]:
    """EC and indices at ``now``, and their slopes in the ions: (), (2,), (10,), (10, 2)."""
    moved = np.maximum(each.now, 0.0) + STEP * np.vstack([np.zeros(len(IONS)), np.eye(len(IONS))])
    ec, index = ec_of(each, moved), indices_of(each, moved)
    return ec[0], index[0], (ec[1:] - ec[0]) / STEP, (index[1:] - index[0]) / STEP


def _ec_parts(each: Checkpoint, checkpoints: Sequence[Checkpoint], x0: Array) -> list[Part]:
    ec, _, slope, _ = _slopes(each)
    row = slope @ each.slope
    most = max(each.goal.ec_most - MARGIN["EC"], float(ec_of(each, each.base)))
    source = each.goal.sources.get("EC", "")
    parts: list[Part] = [(row, most - float(ec) + float(row @ x0), f"EC, {each.name}", most, "mS/cm", source)]
    earlier = before_of(each, checkpoints)
    if earlier is not None:
        ec_before, _, slope_before, _ = _slopes(earlier)
        rise = row - slope_before @ earlier.slope
        highest = step_most(each, earlier)
        room = highest - MARGIN["EC"] - float(ec - ec_before) + float(rise @ x0)
        words = f"{step_name(each, earlier)}, {each.name}"
        parts.append((rise, room, words, highest, "mS/cm", "common practice"))
    return parts


def _ion_parts(each: Checkpoint, x0: Array) -> list[Part]:
    most = np.maximum(each.goal.most, each.base)
    parts: list[Part] = []
    for i in LIMITED_AT:
        if np.isfinite(each.goal.most[i]):
            row = each.slope[i]
            high = float(most[i] - each.now[i] + row @ x0)
            parts.append(
                (row, high, f"{IONS[i]}, {each.name}", float(most[i]), "mmol/L", each.goal.sources.get(IONS[i], ""))
            )
    return parts


def _mineral_parts(each: Checkpoint, x0: Array) -> list[Part]:
    _, index, _, slope = _slopes(each)
    without = indices_of(each, each.base)
    most = np.maximum(np.array([GYPSUM_MOST, BRUSHITE_MOST]) - MARGIN["SI"], without)
    parts: list[Part] = []
    for i, mineral in enumerate(("gypsum", "brushite")):
        row = slope[:, i] @ each.slope
        if index[i] > FAR_BELOW:
            parts.append(
                (row, float(most[i] - index[i] + row @ x0), f"{mineral}, {each.name}", float(most[i]), "SI", "")
            )
    return parts


def exceeded(each: Checkpoint, composition: Array, before: Checkpoint | None = None) -> list[tuple[str, float, float]]:
    """Hard limits that a composition (10,) passes at a checkpoint: (what, value, limit), with the full chemistry."""
    found = [
        ("EC", float(ec_of(each, composition)), max(each.goal.ec_most, float(ec_of(each, each.base)))),
        *(
            (IONS[i], float(composition[i]), float(max(each.goal.most[i], each.base[i])))
            for i in LIMITED_AT
        ),
    ]  # fmt: skip
    most = np.maximum([GYPSUM_MOST, BRUSHITE_MOST], indices_of(each, each.base))
    found += [
        (name, float(i), float(m))
        for name, i, m in zip(("gypsum", "brushite"), indices_of(each, composition), most, strict=True)
    ]
    if before is not None:
        rise = float(ec_of(each, composition) - ec_of(before, before.now))
        found.append((step_name(each, before), rise, step_most(each, before)))
    return [each for each in found if each[1] > each[2] + TOLERANCE[each[0]]]


SHARE_WEIGHT = 5.0
"""What a share off by its whole counts beside an ion off by its whole: a point of share about as much as 5 % of an
ion."""
EC_WEIGHT = 10.0
"""What EC below its band by its whole counts beside a share off by its whole: alike, both are bands."""
COMES_ALONG = ("NO3", "SO4", "H2PO4")
OVERSHOT, OVERSHOT_WEIGHT = 0.5, 5.0
"""An anion lifted over its aim by more than half counts among the bands: its double as much as 50 points of share.
Half over is where the published rule takes its larger step (Nutrient Solutions for Greenhouse Crops 2016)."""
FAR_COST = 3.0
EC_SHOWN = 0.05
"""Half of the last digit of an EC as it is shown [mS/cm]."""
NEAR_SHARE = 0.05
"""Distance of a share over its aim from which it counts as far."""
MARGIN = {"EC": 4e-3, "SI": 1e-2}
"""Room the program keeps from a limit that is not straight, so that the full model does not find it passed."""
TOLERANCE = {
    "EC": 1e-3, "EC step": 1e-3, "EC step of a day": 1e-3, "gypsum": 2e-3, "brushite": 2e-3, "NH4": 2e-3, "Na": 1e-2,
    "Cl": 1e-2,
}  # fmt: skip
"""How far the full model may pass a limit before the plan is taken back: well under the last digit shown."""


def violation_rows(checkpoints: Sequence[Checkpoint], x0: Array) -> tuple[Array, Array, Array]:
    """Rows ``matrix x - slack <= high`` of bands and soft upper limits, and each slack's cost; one slack a row.

    Shares are counted in points of K + Ca + Mg as it is without the plan, limits in parts of themselves.
    """
    matrix, high, cost = [], [], []
    z = CHARGE[SHARED_AT]
    for each in checkpoints:
        if each.weight <= 0.0:
            continue
        now, slope = z * each.now[SHARED_AT], z[:, None] * each.slope[SHARED_AT]
        total, total_slope = now.sum(), slope.sum(axis=0)
        scale = max(float((z * each.base[SHARED_AT]).sum()), float(total), 1.0)
        for sign, bound in ((1.0, each.goal.share_high), (-1.0, each.goal.share_low)):
            rows = sign * (slope - bound[:, None] * total_slope) / scale
            matrix.append(rows)
            high.append(rows @ x0 - sign * (now - bound * total) / scale)
            cost.append(np.full(3, 10.0 * each.weight))
        for over, most, heavy in ((*_too_much(each), 1.0), (*_would_gather(each), OVERSHOT_WEIGHT)):
            matrix.append(each.slope[over] / most[:, None])
            high.append((most - each.now[over] + each.slope[over] @ x0) / most)
            cost.append(np.full(len(over), heavy * each.weight))
        if each.goal.ec_least > 0.0 and each.point != "feed":
            row, room = _too_weak(each)
            matrix.append(row[None])
            high.append(np.array([row @ x0 + room]))
            cost.append(np.array([EC_WEIGHT * each.weight]))
    n = len(x0)
    return (
        np.vstack([*matrix, np.zeros((0, n))]),
        np.concatenate([*high, np.zeros(0)]),
        np.concatenate([*cost, np.zeros(0)]),
    )


def _too_weak(each: Checkpoint) -> tuple[Array, float]:
    """Row (variables,) and room of EC above the foot of its band, both in parts of that foot."""
    ec, _, slope, _ = _slopes(each)
    least = each.goal.ec_least
    return -(slope @ each.slope) / least, (float(ec) - least - MARGIN["EC"]) / least


def _too_much(each: Checkpoint) -> tuple[list[int], Array]:
    """Ions over a limit, or over what an aim bears, without the plan; and what they should come down to."""
    aim = np.nan_to_num(each.goal.aim, nan=0.0)
    bears = np.where(np.isin(IONS, NUTRIENTS_THAT_STAY) & (aim > 0.0), (1.0 + EXCESS) * aim, np.inf)
    most = np.minimum(each.goal.most, bears)
    over = [i for i in range(len(IONS)) if each.base[i] > most[i]]
    return over, most[over]


def _would_gather(each: Checkpoint) -> tuple[list[int], Array]:
    """Anions that come with K, Ca and Mg, and how far over their aim, or over what there is, salts may lift them."""
    aim = np.nan_to_num(each.goal.aim, nan=0.0)
    at = [INDEX[ion] for ion in COMES_ALONG if aim[INDEX[ion]] > 0.0]
    return at, np.maximum((1.0 + OVERSHOT) * aim, each.base)[at]


def violation(each: Checkpoint, composition: Array) -> float:
    """By how many points [%] of K + Ca + Mg the shares of a composition (10,) leave their bands, summed."""
    shared = CHARGE[SHARED_AT] * composition[SHARED_AT]
    total = float(shared.sum())
    if total <= 0.0:
        return 100.0 if bool((each.goal.share_low > 0).any()) else 0.0
    shares = shared / total
    out = np.maximum(shares - each.goal.share_high, 0.0) + np.maximum(each.goal.share_low - shares, 0.0)
    return 100.0 * float(out.sum())


def too_weak(each: Checkpoint, composition: Array) -> float | None:
    """EC [mS/cm] of a composition (10,) that is below its band by more than the last digit shown; None where it is
    not."""
    ec = float(ec_of(each, composition))
    return ec if ec < each.goal.ec_least - EC_SHOWN else None


def misfit_rows(checkpoints: Sequence[Checkpoint], x0: Array) -> tuple[Array, Array, Array, Array]:
    """Rows ``matrix x + under - over - far = value`` of the distance to the aim, the cost of one unit off, and the
    most of ``over``.

    What lies over the aim by more than a quarter (``far``) costs ``FAR_COST`` times as much: many small misfits
    before a large one.

    K, Ca and Mg are counted by their shares, whatever the strength of the solution, unless the aim was named for this
    plan; every other ion in parts of its aim, sulfate and chloride half. Ions the target does not name count a
    little.
    """
    matrix, value, cost, near = [np.zeros((0, len(x0)))], [np.zeros(0)], [np.zeros(0)], [np.zeros(0)]
    for each in checkpoints:
        if each.aim_weight <= 0.0:
            continue
        weight = each.aim_weight * _weights(each)
        if _by_shares(each):
            weight[SHARED_AT] = 0.0
            rows, off = _share_rows(each)
            matrix.append(rows)
            value.append(rows @ x0 - off)
            cost.append(np.full(len(rows), each.aim_weight * SHARE_WEIGHT))
            near.append(np.full(len(rows), NEAR_SHARE))
        matrix.append(each.slope)
        value.append(_aim_of(each) - each.now + each.slope @ x0)
        cost.append(weight)
        near.append(EXCESS * np.maximum(_aim_of(each), 1.0))
    return np.vstack(matrix), np.concatenate(value), np.concatenate(cost), np.concatenate(near)


def _aim_of(each: Checkpoint) -> Array:
    return np.where(np.isnan(each.goal.aim), each.base, each.goal.aim)


def _weights(each: Checkpoint) -> Array:
    """What one mmol/L off the aim costs, shape (10,)."""
    weight = np.where(np.isnan(each.goal.aim), 0.1, 1.0) * np.where(np.isin(IONS, ("SO4", "Cl", "Na")), 0.5, 1.0)
    weight[INDEX["HCO3"]] = 0.0
    return weight / np.maximum(_aim_of(each), 1.0)


def _by_shares(each: Checkpoint) -> bool:
    aim, held = each.goal.aim[SHARED_AT], each.base[SHARED_AT] @ CHARGE[SHARED_AT]
    return not each.goal.named and each.point != "feed" and bool((aim > 0.0).all()) and held > NO_SHARES


def _share_rows(each: Checkpoint) -> tuple[Array, Array]:
    """Slopes (3, variables) and distances (3,) of the shares of K, Ca, Mg from those of the aim."""
    z = CHARGE[SHARED_AT]
    now, slope = z * each.now[SHARED_AT], z[:, None] * each.slope[SHARED_AT]
    wanted = z * each.goal.aim[SHARED_AT]
    wanted = wanted / wanted.sum()
    return (slope - wanted[:, None] * slope.sum(axis=0)) / now.sum(), (now - wanted * now.sum()) / now.sum()
