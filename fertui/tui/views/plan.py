"""Plan: what to do in weighable amounts, what comes of it, why; accepted steps and whether they were done."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, ClassVar

from textual.binding import Binding

from fertui.tui.desk import Answer
from fertui.tui.ink import BLANK, Line
from fertui.tui.plan_drawing import draw_accepted, draw_on_top, draw_outdated, draw_plan, draw_standing
from fertui.tui.releasing import release
from fertui.tui.snapshot import Ask, Snapshot
from fertui.tui.text_page import TextPage
from fertui.tui.view import View, waiting

if TYPE_CHECKING:
    from fertui.planning.values import Plan
    from fertui.workbench.carrying_out import PlanItem

HORIZONS = (7, 14, 21, 0)
SALTS = (None, 1, 2, 3, 4)
STEPS = (None, 1, 2, 3, 4)
EC_STEPS = (None, 0.1, 0.2, 0.3, 0.5)


def asks_for_something(plan: Plan) -> bool:
    """Whether there is anything in a plan to accept."""
    return bool(plan.steps or plan.acid or plan.recipe is not None or plan.renewal is not None)


class PlanView(View):
    """The plan of the loop, and what was accepted of plans before."""

    TITLE = "Plan"
    HELP = (
        "What brings K : Ca : Mg back without breaking EC, NH4, Na, Cl or solubility limits: the next recipe for "
        "a loop fed from stock "
        "tanks, hand doses for a tank. It advises, you decide. y accepts it: its steps then stand on top, the forecast "
        "expects them, and they are done only once marked "
        "done. Enter marks the chosen step done and asks what was really weighed; v says it was not done. "
        "l leaves a salt out, h sets the horizon (0: right after mixing), g the number of steps, s the number of "
        "salts, c how much EC may change in one step. "
        "i shows the arithmetic for a pocket calculator, o the sheet. Steps with acid are held back until k: read "
        "the cautions and give "
        "the strength on the label."
    )
    BINDINGS: ClassVar[list[Any]] = [
        Binding("y", "accept", "accept", id="plan.accept", tooltip="Accept the plan: log its steps as intended."),
        Binding("enter", "done", "done", id="plan.done",
        tooltip="Mark the chosen step done; asks for the real amount."),
        Binding("v", "not_done", "not done", id="plan.not_done", tooltip="The chosen step was not done; asks why."),
        Binding("up", "up", "step above", show=False, id="plan.up", tooltip="The accepted step above."),
        Binding("down", "down", "step below", show=False, id="plan.down", tooltip="The accepted step below."),
        Binding("l", "without", "leave out", id="plan.without", tooltip="Leave a salt out, or take it in again."),
        Binding("h", "horizon", "horizon", id="plan.horizon", tooltip="7, 14, 21 days, or right after mixing."),
        Binding("s", "salts", "salts", show=False, id="plan.salts", tooltip="At most so many different salts."),
        Binding("g", "steps", "steps", show=False, id="plan.steps", tooltip="At most so many dosing steps."),
        Binding("c", "ec_step", "EC step", show=False, id="plan.ec_step",
        tooltip="How much EC may change in one step: usual, 0.1, 0.2, 0.3 or 0.5 mS/cm."),
        Binding("i", "arithmetic", "sums", id="plan.arithmetic", tooltip="The arithmetic, step by step."),
        Binding("k", "acknowledge", "cautions", show=False, id="plan.cautions",
        tooltip="Read the cautions of the acid steps."),
        Binding("o", "sheet", "sheet", id="plan.sheet", tooltip="The sheet to weigh and mix from."),
    ]  # fmt: skip

    def __init__(self) -> None:
        super().__init__()
        self.horizon, self.salts, self.steps, self.ec_step, self.row = 14, 0, 0, 0, 0
        self.without: tuple[str, ...] = ()
        self.released: Plan | None = None
        self.accepted: Plan | None = None

    def _ask(self, snapshot: Snapshot) -> Ask:
        options: list[tuple[str, Any]] = [("days", self.horizon)]
        wishes = {
            "without": self.without,
            "salts": SALTS[self.salts],
            "steps": STEPS[self.steps],
            "ec_step": EC_STEPS[self.ec_step],
        }
        options += [(name, wish) for name, wish in wishes.items() if wish]
        return Ask("plan", snapshot.loop, tuple(options))

    def asks(self, snapshot: Snapshot) -> tuple[Ask, ...]:
        """Accepted steps first, then the plan."""
        return Ask("open_plans", snapshot.loop), self._ask(snapshot)

    def plan(self) -> Plan | None:
        """The plan on screen."""
        found: Plan | None = self.fertui.snapshot.get(self._ask(self.fertui.snapshot))
        return found

    def _made(self) -> Plan | None:
        """The plan on screen, the accepted one where its steps stand in place of it; says so where there is none."""
        if self._standing():
            return self._accepted()
        plan = self.plan()
        if plan is None:
            trouble = self.fertui.snapshot.trouble(self._ask(self.fertui.snapshot))
            self.fertui.say("There is no plan." if trouble else "The plan is still being worked out.", "watch")
        return plan

    def _accepted(self) -> Plan | None:
        """The plan whose steps stand, if it was accepted here; says so where it was not."""
        plan = self.accepted
        if plan is not None and plan.loop == self.fertui.snapshot.loop:
            return plan
        self.fertui.say("Accepted steps stand: Enter marks one done, v not done.", "watch")
        return None

    def _standing(self) -> bool:
        """Whether accepted steps stand in place of a plan."""
        from fertui.workbench.carrying_out import standing

        snapshot = self.fertui.snapshot
        items = self.items(snapshot)
        return bool(items and standing(items, self.fertui.moment, snapshot.site.timezone))

    def offers(self, action: str) -> bool:
        """Accepting only what asks for something and is not accepted yet; done and not done only of a step."""
        if action in ("done", "not_done"):
            return any(item.state != "done" for item in self.items(self.fertui.snapshot))
        if action == "accept":
            plan = self.plan()
            return plan is not None and not self._standing() and asks_for_something(plan)
        return True

    def _holds_acid(self, plan: Plan) -> bool:
        from fertui.workbench.carrying_out import acids_of

        return bool(acids_of(plan))

    def items(self, snapshot: Snapshot) -> list[PlanItem]:
        """Accepted steps, those still to do first."""
        found = snapshot.get(Ask("open_plans", snapshot.loop)) or ()
        return sorted(found, key=lambda item: (item.state == "done", item.at, item.number))[:12]

    def draw(self, snapshot: Snapshot, width: int) -> list[Line]:
        """Accepted steps, then the plan."""
        from fertui.workbench.carrying_out import open_steps

        items = self.items(snapshot)
        self.row = max(0, min(self.row, len(items) - 1))
        rows = draw_accepted(items, self.row, self.fertui.local, width)
        plan, ask = self.plan(), self._ask(snapshot)
        if plan is None:
            return [*rows, *waiting(snapshot, ask, "the plan", width)]
        if self._standing():
            return [*rows, BLANK, *draw_standing(plan, snapshot.unit, width)]
        if open_steps(items, self.fertui.moment, snapshot.site.timezone):
            rows += [BLANK, *draw_on_top(width)]
        if snapshot.lacks(ask):
            rows += [BLANK, *draw_outdated(width)]
        held = self._holds_acid(plan) and self.released is not plan
        wishes = [f"without {', '.join(self.without)}"] if self.without else []
        wishes += [f"at most {SALTS[self.salts]} salts"] if self.salts else []
        wishes += [f"at most {STEPS[self.steps]} steps"] if self.steps else []
        wishes += [f"EC step {EC_STEPS[self.ec_step]} mS/cm"] if self.ec_step else []
        return [*rows, *([BLANK] if rows else []), *draw_plan(plan, held, wishes, snapshot, self.fertui.local, width)]

    def action_up(self) -> None:
        """The step above, or a line up."""
        self._move(-1)

    def action_down(self) -> None:
        """The step below, or a line down."""
        self._move(1)

    def _move(self, step: int) -> None:
        if 0 <= self.row + step < len(self.items(self.fertui.snapshot)):
            self.row += step
            self.redraw()
        else:
            self._scroll(self._top + step)

    def _again(self) -> None:
        self.redraw()
        self.fertui.work_out()

    def action_horizon(self) -> None:
        """The next horizon."""
        self.horizon = HORIZONS[(HORIZONS.index(self.horizon) + 1) % len(HORIZONS)]
        self._again()

    def action_salts(self) -> None:
        """The next number of salts."""
        self.salts = (self.salts + 1) % len(SALTS)
        self._again()

    def action_steps(self) -> None:
        """The next number of steps."""
        self.steps = (self.steps + 1) % len(STEPS)
        self._again()

    def action_ec_step(self) -> None:
        """The next EC step."""
        self.ec_step = (self.ec_step + 1) % len(EC_STEPS)
        self._again()

    async def action_without(self) -> None:
        """Leave a salt out, or take it in again."""
        from fertui.tui.chooser import Chooser, Option

        names = [supply.name for supply in self.fertui.snapshot.site.supplies if supply.strength_pct is None]
        options = [Option(name, "left out" if name in self.without else "") for name in names]

        def toggle(name: str) -> None:
            self.without = (
                tuple(n for n in self.without if n != name) if name in self.without else (*self.without, name)
            )
            self._again()

        await self.fertui.open_page(Chooser("Leave which salt out? (again: take it in)", options, toggle))

    async def action_acknowledge(self) -> None:
        """Read the cautions of the acid steps."""
        plan = self._made()
        if plan is None:
            return
        if self._holds_acid(plan) and self.released is not plan:
            await self._released(lambda: self.fertui.say("The acid steps are released.", "good"))
        else:
            await self.fertui.open_page(
                TextPage("Cautions", [f"- {each.text}  [{each.source}]" for each in plan.cautions])
            )

    async def _released(self, then: Any) -> None:
        """Go on with the plan, after cautions and label where it holds acid."""
        plan = self._made()
        if plan is None:
            return
        if not self._holds_acid(plan) or self.released is plan:
            then()
            return

        def release_it(strength: float) -> None:
            self.released = plan
            self.redraw()
            then()

        await release(self.fertui, plan, plan.cautions, release_it)

    async def action_accept(self) -> None:
        """Log the steps as intended."""
        if self._standing():
            self.fertui.say("Accepted steps stand: Enter marks one done, v not done.", "watch")
        else:
            await self._released(lambda: self.fertui.with_initials(self._accept))

    def _accept(self, by: str) -> None:
        plan = self.plan()
        if plan is not None:
            self.row, self.accepted = 0, plan
            self.fertui.clerk(lambda bench: bench.accept_plan(plan, by), self.fertui.wrote, "accepting the plan")

    def _chosen(self) -> PlanItem | None:
        items = self.items(self.fertui.snapshot)
        item = items[self.row] if items else None
        if item is None:
            self.fertui.say("No step is accepted yet: y accepts the plan.", "watch")
        elif item.state == "done":
            self.fertui.say(f"Done already, in entry {item.done_number}.", "watch")
            return None
        return item

    def action_done(self) -> None:
        """Ask what was really done, and log it."""
        item = self._chosen()
        if item is None:
            return

        def done(text: str) -> None:
            amount = text or None
            self.fertui.with_initials(
                lambda by: self.fertui.clerk(
                    lambda bench: bench.mark_done(item.number, by, amount, read=self.fertui.acknowledged),
                    self.fertui.wrote,
                    "marking it done",
                )
            )

        if item.amount is None:
            done("")
        else:
            more = " more" if item.done_amount else ""
            left = item.amount - (item.done_amount or 0.0)
            self.fertui.ask(f"{item.what}: done with how much{more}, {item.unit}?", done, f"{left:.4g}")

    def action_not_done(self) -> None:
        """Ask why it was not done."""
        item = self._chosen()
        if item is None:
            return

        def because(why: str) -> None:
            if why:
                self.fertui.with_initials(
                    lambda by: self.fertui.clerk(
                        lambda bench: bench.not_done(item.number, why, by), self.fertui.wrote, "striking the step"
                    )
                )

        self.fertui.ask(f"{item.what}: why was it not done?", because)

    async def action_arithmetic(self) -> None:
        """The arithmetic."""
        plan = self._made()
        if plan is not None:
            text = [*plan.arithmetic, *(["", "Why these and not others", *plan.reasons] if plan.reasons else [])]
            await self.fertui.open_page(TextPage("The sums of this plan, for a pocket calculator", text, "sums.txt"))

    async def action_sheet(self) -> None:
        """The sheet."""
        await self._released(self._sheet)

    def _sheet(self) -> None:
        plan = self._made()
        if plan is None:
            return

        def show(answer: Answer) -> None:
            self.fertui.show_paper("The sheet", answer, f"plan-{plan.loop.replace(' ', '-')}-{plan.at:%Y-%m-%d}.txt")

        self.fertui.clerk(lambda bench: bench.plan_page(plan), show, "the sheet")
