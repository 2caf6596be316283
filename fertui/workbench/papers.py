"""Pages of a site: round, handover, report, sheets, and their release."""

from __future__ import annotations

from datetime import datetime, time, timedelta
from pathlib import Path
from typing import TYPE_CHECKING
from zoneinfo import ZoneInfo

from fertui.refusals import Refusal
from fertui.workbench.answers import HORIZON_DAYS, Answers
from fertui.workbench.clock import now

if TYPE_CHECKING:
    from fertui.estimate.balance import Stretch
    from fertui.paper import Page
    from fertui.planning.values import AcidSheet, Plan, StockSheet
    from fertui.site.model import Loop

A_MOMENT = timedelta(milliseconds=1)
"""Between the end of one run of the estimate and the beginning of the next."""


class Papers(Answers):
    """Every paper of the workbench."""

    def round_sheet(self, loop: str | None = None, at: datetime | None = None, known: datetime | None = None) -> Page:
        """Blank round sheet of a loop with its last values and what is planned."""
        from fertui.paper.round_sheet import round_sheet
        from fertui.workbench.carrying_out import in_words, open_plans

        chosen, at = self.loop(loop), at or now()
        entries = self.book.entries(loop=chosen.name, at=at, known=known)
        steps = [in_words(each, self.site.timezone) for each in open_plans(entries) if each.state != "done"]
        return round_sheet(self.site, chosen, entries, at, steps)

    def handover(self, loop: str | None = None, at: datetime | None = None, known: datetime | None = None) -> Page:
        """The shift handover: all loops, or the one named."""
        from fertui.paper.handover import LoopShift, handover
        from fertui.workbench.carrying_out import in_words, open_plans

        at = at or now()
        names = self.loops if loop is None else (self.loop(loop).name,)
        entries = [entry for entry in self.entries(at, known) if entry.loop in (*names, "")]
        states = [self.today(name, at, known) for name in names]
        shifts = {
            each.loop: LoopShift(
                each.watch, each.stock_days_left, each.last_analysis.at if each.last_analysis else None, each.awaited
            )
            for each in states
        }
        steps = [
            f"{name}: {in_words(each, self.site.timezone)}"
            for name in names
            for each in open_plans([entry for entry in entries if entry.loop == name])
            if each.state != "done"
        ]
        return handover(self.site, at, entries, shifts, steps)

    def report(
        self,
        loop: str | None = None,
        start: datetime | None = None,
        end: datetime | None = None,
        known: datetime | None = None,
    ) -> Page:
        """The report of a loop for consultant or inspector: by default of the last 14 days and what there is of today.

        All that was logged in the period is in it, also where the estimate cannot follow.
        """
        from fertui.paper.report import Reported, report

        chosen, end = self.loop(loop), end or now()
        start = start or self._midnight(end - timedelta(days=HORIZON_DAYS))
        if end < start:
            raise Refusal(f"the report ends ({end:%Y-%m-%d %H:%M}) before it begins ({start:%Y-%m-%d %H:%M}).")
        effective = self.book.entries(loop=chosen.name, at=end, known=known)
        history = self.book.history(loop=chosen.name, known=known)
        stretches = self._stretches(chosen, start, end, known)
        return report(Reported(self.site, chosen, start, end, history, effective, stretches))

    def _midnight(self, at: datetime) -> datetime:
        """The beginning of a day on the clock of the site."""
        zone = ZoneInfo(self.site.timezone)
        return datetime.combine(at.astimezone(zone).date(), time(), zone)

    def _stretches(self, loop: Loop, start: datetime, end: datetime, known: datetime | None) -> tuple[Stretch, ...]:
        """The period as runs of the estimate that join, oldest first: one begins anew where the crop does."""
        from fertui.estimate.assimilation import assimilate
        from fertui.estimate.balance import since, stretch

        found: list[Stretch] = []
        until, entries = end, self.entries(end, known)
        while until >= start and any(each.loop == loop.name and each.at <= until for each in entries):
            run = self.estimate(loop.name, until, known) if not found else assimilate(self.site, loop, entries, until)
            found.append(stretch(run, start, until))
            until = since(run) - A_MOMENT
            entries = self.entries(until, known)
        return tuple(reversed(found))

    def plan_page(self, plan: Plan) -> Page:
        """The sheet of a plan."""
        from fertui.paper.dose_sheet import dose_sheet

        return dose_sheet(plan, self.site.name, self.site.timezone)

    def stock_page(self, sheet: StockSheet, loop: str | None = None) -> Page:
        """The stock-tank sheet as a page."""
        from fertui.paper.tank_cards import stock_page
        from fertui.workbench.carrying_out import running_recipe

        chosen = self.loop(loop)
        carried = running_recipe(self.site, chosen, self.entries()).source
        return stock_page(sheet, chosen.name, self.site.name, carried, chosen.layout)

    def acid_page(self, sheet: AcidSheet, loop: str | None = None, released: bool = True) -> Page:
        """The acid sheet as a page; its portions only where it is released."""
        from fertui.paper.acid_page import acid_page

        return acid_page(sheet, self.loop(loop).name, self.site.name, released)

    def acknowledge(self, made: Plan | AcidSheet | StockSheet, strength_pct: float | None) -> None:
        """Refuse unless the strength read off the label is the one a plan or sheet with acid counts on."""
        from fertui.workbench.carrying_out import acids_of, check_strength

        check_strength(acids_of(made), strength_pct)

    def write(self, text: str, path: Path) -> Path:
        """Write a sheet to a file that is not there yet."""
        from fertui.workbench.keeping import write_new

        return write_new(path, text)
