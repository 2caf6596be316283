"""From a plan to what was done: intended steps are entries of their own, expected until marked done, done only then."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from datetime import datetime
from typing import TYPE_CHECKING, Any, NamedTuple

from fertui.logbook.entries import Entry
from fertui.logbook.intended import carried_out, given, is_step, part_left, subject
from fertui.refusals import Refusal
from fertui.site.model import Composition, Loop, Site

if TYPE_CHECKING:
    from fertui.planning.values import AcidSheet, Plan, StockSheet

Fields = dict[str, str]


class PlanItem(NamedTuple):
    """One intended step: what, how much, into what; ``done_number`` is the last entry that carried it out.

    ``done_amount``: how much was really weighed, poured or let go so far; None where nothing was.
    """

    number: int
    at: datetime
    what: str
    amount: float | None
    unit: str
    target: str
    done_number: int | None
    done_amount: float | None = None

    @property
    def is_lasting(self) -> bool:
        """Whether it is acid or a recipe: a plan made before it is done does not count it."""
        return self.what == "recipe" or (self.unit == "L" and self.what != "bleed")

    @property
    def state(self) -> str:
        """planned, partly done, or done: never taken for done before somebody said so."""
        if self.done_number is None:
            return "planned"
        return "partly done" if part_left(self.amount, self.done_amount) > 0 else "done"


def steps_of(plan: Plan, by: str) -> tuple[Fields, ...]:
    """The texts of the plan entries a plan is accepted as: the bleed first, then each weighing, acid split, recipe."""
    rows: list[Fields] = []
    if plan.renewal is not None:
        rows.append({"at": plan.at.isoformat(), "bleed": f"{plan.renewal.litres:.0f}"})
    for step in plan.steps:
        rows.append({"at": step.at.isoformat(), "salt": step.salt, "kg": f"{step.kg:g}", "tank": _tank(step.target)})
    for split in plan.acid:
        litres = f"{split.litres:.3f}"
        rows.append({"at": split.at.isoformat(), "acid": split.acid, "litres": litres, "tank": _tank(split.target)})
    if plan.recipe is not None:
        ions = {ion: f"{amount:.3f}" for ion, amount in plan.recipe.ions_mmol_l.items()}
        named = {"recipe": f"planned {plan.at:%Y-%m-%d}", "EC": f"{plan.recipe.ec:.2f}"}
        rows.append({"at": plan.at.isoformat(), **named, **ions})
    if not rows:
        raise Refusal("This plan asks for nothing, so there is nothing to accept.")
    return tuple({**row, "by": by} for row in rows)


def _tank(target: str) -> str:
    return target.removeprefix("tank:")


def open_plans(entries: Sequence[Entry]) -> tuple[PlanItem, ...]:
    """Every intended step of a loop's effective entries, with what was done of it."""
    done = carried_out(entries)
    return tuple(_item(entry, done.get(entry.number or 0, [])) for entry in entries if is_step(entry))


STANDS = (
    "Already planned: these steps stand, and a plan made now would tell them a second time. Mark each done, or not "
    "done, when its time has come; a new plan is worked out from what was really given."
)
ON_TOP = "What follows is planned on top of the accepted steps, as if they were done in their time."


def nothing_new(plan: Plan) -> Plan:
    """A plan in place of which accepted steps stand: it asks for nothing, and what comes is what comes without it."""
    empty: dict[str, Any] = dict.fromkeys(("steps", "acid", "binding", "rule_of_thumb", "reasons", "arithmetic"), ())
    return plan._replace(
        **empty, recipe=None, renewal=None, sensitivity=(), runner_up=None, after=plan.after_without, notices=(STANDS,)
    )


def open_steps(items: Iterable[PlanItem], at: datetime, timezone: str) -> tuple[PlanItem, ...]:
    """Steps still to do on the day of a time or later."""
    from zoneinfo import ZoneInfo

    zone = ZoneInfo(timezone)
    today = at.astimezone(zone).date()
    return tuple(item for item in items if item.state != "done" and item.at.astimezone(zone).date() >= today)


def standing(items: Iterable[PlanItem], at: datetime, timezone: str) -> tuple[PlanItem, ...]:
    """Steps still to do which a plan made at a time would tell again: those of its day, acid and recipes to come.

    Other steps to come are in the forecast that a plan starts from; those of a day gone by are no longer expected.
    """
    from zoneinfo import ZoneInfo

    zone = ZoneInfo(timezone)
    today, still_open = at.astimezone(zone).date(), open_steps(items, at, timezone)
    return tuple(item for item in still_open if item.is_lasting or item.at.astimezone(zone).date() == today)


def in_words(item: PlanItem, timezone: str) -> str:
    """A step as it stands: when, how much, into what, and what was done of it."""
    from zoneinfo import ZoneInfo

    local = item.at.astimezone(ZoneInfo(timezone))
    much = "" if item.amount is None else f"{item.amount:g} {item.unit} "
    into = f" into {item.target}" if item.target else ""
    partly = f"; partly done: {item.done_amount:g} {item.unit}" if item.state == "partly done" else ""
    return f"{local:%a} {local.day} {local:%b %H:%M} {much}{item.what}{into} (plan {item.number}){partly}"


def _item(planned: Entry, done: Sequence[Entry]) -> PlanItem:
    what, name, unit = subject(planned)
    target = planned.text_of("tank") or ("feed" if what == "recipe" else "")
    last = max((entry.number or 0 for entry in done), default=None)
    amount = planned.number_of(name) if name else None
    return PlanItem(planned.number or 0, planned.at, what, amount, unit, target, last, given(planned, done))


def done_fields(planned: Entry, by: str, amount: str | None, strength_pct: float | None) -> tuple[str, Fields]:
    """Kind and texts of the entry that says a planned step was carried out, wholly or by ``amount``."""
    if planned.kind != "plan":
        raise Refusal(
            f"entry {planned.number} is a {planned.kind}, not a plan; mark the number of a plan entry as done."
        )
    what, name, _ = subject(planned)
    fields: Fields = {"by": by, "plan": str(planned.number)}
    if planned.text_of("tank"):
        fields["tank"] = planned.text_of("tank")
    number = amount or (planned.text_of(name) if name else "")
    if name == "kg":
        return "dose", {**fields, "salt": what, "kg": number}
    if name == "litres":
        strength = {} if strength_pct is None else {"strength": f"{strength_pct:g}"}
        return "acid", {**fields, **strength, "acid": what, "litres": number}
    if name == "bleed":
        return "bleed", {**fields, "litres": number, "reason": "renewal"}
    return "recipe", {**fields, "name": planned.text_of("recipe"), **_ions(planned)}


def _ions(planned: Entry) -> Fields:
    return {value.species or value.name: value.written for value in planned.values if value.number is not None}


def acids_of(made: Plan | AcidSheet | StockSheet) -> tuple[tuple[str, float], ...]:
    """Acids and lyes of a plan or sheet, those in its stock tanks included, with the strength each was counted at."""
    from fertui.planning.acid import AcidSheet
    from fertui.planning.stock import StockSheet

    if isinstance(made, AcidSheet):
        return ((made.acid, made.strength_pct),) if made.splits else ()
    if isinstance(made, StockSheet):
        return _in_tanks(made)
    sheet = made.recipe.sheet if made.recipe is not None else None
    dosed = [(each.acid, each.strength_pct) for each in made.acid]
    return tuple(dict.fromkeys([*dosed, *(_in_tanks(sheet) if sheet is not None else ())]))


def _in_tanks(sheet: StockSheet) -> tuple[tuple[str, float], ...]:
    weighed = [each for tank in sheet.tanks for each in tank.salts]
    return tuple(dict.fromkeys((each.salt, each.strength_pct) for each in weighed if each.strength_pct is not None))


def check_strength(acids: Iterable[tuple[str, float]], strength_pct: float | None) -> None:
    """Refuse unless the strength read off the label is that of every acid of a plan or sheet.

    >>> check_strength([("nitric acid", 38.0)], 38.0)
    """
    for name, planned in acids:
        if strength_pct is None:
            raise Refusal(
                f"The sheet holds {name}. Read the cautions and give the strength on its label in percent; "
                f"the plan counts on {planned:g} %."
            )
        if abs(strength_pct - planned) > 0.5:
            raise Refusal(
                f"The label says {strength_pct:g} %, the plan counts on {name} of {planned:g} %. "
                f"Correct the strength under supplies in site.toml and plan again; nothing is released."
            )


def running_recipe(site: Site, loop: Loop, entries: Sequence[Entry]) -> Composition:
    """The feed a loop runs on: the last recipe logged, else its target's feed."""
    from fertui.chemistry.names import IONS, MICRONUTRIENTS
    from fertui.site.presets import target_of

    logged = [entry for entry in entries if entry.kind == "recipe" and entry.loop == loop.name]
    if not logged:
        feed = target_of(site, loop)["feed"]
        return feed._replace(source=f"the feed of target {loop.target or loop.crop} ({feed.source})")
    last = logged[-1]
    amounts = {value.name: value.number for value in last.values if value.number is not None}
    return Composition(
        {ion: amounts[ion] for ion in IONS if ion in amounts},
        {name: amounts[name] for name in MICRONUTRIENTS if name in amounts},
        amounts.get("EC"),
        amounts.get("pH"),
        f"recipe logged as entry {last.number}",
    )
