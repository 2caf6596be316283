"""Pages of a site: round, handover, report, sheets, and their release."""

from __future__ import annotations

from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING

from fertui.workbench.answers import Answers
from fertui.workbench.clock import now

if TYPE_CHECKING:
    from fertui.paper import Page
    from fertui.planning.values import AcidSheet, Plan, StockSheet


class Papers(Answers):
    """Every paper of the workbench."""

    def round_sheet(self, loop: str | None = None, at: datetime | None = None, known: datetime | None = None) -> Page:
        """Blank round sheet of a loop with its last values."""
        from fertui.paper.rounds import round_sheet

        chosen, at = self.loop(loop), at or now()
        return round_sheet(self.site, chosen, self.book.entries(loop=chosen.name, at=at, known=known), at)

    def handover(self, loop: str | None = None, at: datetime | None = None, known: datetime | None = None) -> Page:
        """The shift handover: all loops, or the one named."""
        from fertui.paper.rounds import handover
        from fertui.workbench.carrying_out import open_plans

        at = at or now()
        entries = self.entries(at, known)
        states = [self.today(name, at, known) for name in (self.loops if loop is None else (self.loop(loop).name,))]
        steps = [
            f"{each.what} {each.amount or 0:g} {each.unit}" for each in open_plans(entries) if not each.done_number
        ]
        watch = {state.loop: [notice.text for notice in state.watch] for state in states}
        return handover(self.site, at, entries, watch, steps, [each for state in states for each in state.awaited])

    def report(
        self,
        loop: str | None = None,
        start: datetime | None = None,
        end: datetime | None = None,
        known: datetime | None = None,
    ) -> Page:
        """The report of a loop for consultant or inspector."""
        from fertui.paper.report import report
        from fertui.workbench.reporting import crop_water_l, discharges

        chosen = self.loop(loop)
        account = self.balance(loop, start, end, known)
        estimate = self.estimate(loop, account.end, known)
        effective = self.book.entries(loop=chosen.name, at=account.end, known=known)
        history = self.book.history(loop=chosen.name, at=account.end, known=known)
        lost = discharges(estimate, account.start, account.end)
        water = crop_water_l(estimate, account.start, account.end)
        return report(self.site, chosen, history, effective, account, lost, water)

    def plan_page(self, plan: Plan) -> Page:
        """The sheet of a plan."""
        from fertui.paper.sheets import dose_sheet

        return dose_sheet(plan, self.site.name, self.site.timezone)

    def stock_page(self, sheet: StockSheet, loop: str | None = None) -> Page:
        """The stock-tank sheet as a page."""
        from fertui.paper.sheets import stock_page

        return stock_page(sheet, self.loop(loop).name)

    def acid_page(self, sheet: AcidSheet, loop: str | None = None) -> Page:
        """The acid sheet as a page."""
        from fertui.paper.sheets import acid_page

        return acid_page(sheet, self.loop(loop).name)

    def acknowledge(self, made: Plan | AcidSheet | StockSheet, strength_pct: float | None) -> None:
        """Refuse unless the strength read off the label is the one a plan or sheet with acid counts on."""
        from fertui.workbench.carrying_out import acids_of, check_strength

        check_strength(acids_of(made), strength_pct)

    def write(self, text: str, path: Path) -> Path:
        """Write a sheet to a file that is not there yet."""
        from fertui.workbench.keeping import write_new

        return write_new(path, text)
