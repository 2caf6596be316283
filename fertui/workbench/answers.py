"""What a site is asked: state, account, forecast, plan, sheets, shelf, checks."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from datetime import UTC, date, datetime, time, timedelta
from pathlib import Path
from typing import TYPE_CHECKING, Any
from zoneinfo import ZoneInfo

from fertui.workbench.clock import now
from fertui.workbench.folder import RECENT, SiteFolder
from fertui.workbench.glance import Glance, glance

if TYPE_CHECKING:
    from fertui.catalogue.cautions import Caution
    from fertui.estimate.assimilation import Estimate
    from fertui.estimate.balance import Balance
    from fertui.estimate.forecast import Forecast, Scenario
    from fertui.estimate.hindcast import Hindcast
    from fertui.estimate.sampling import SampleAdvice
    from fertui.logbook.entries import Entry
    from fertui.logbook.mixes import Given, Mix
    from fertui.planning.last_mix import LastMix
    from fertui.planning.values import AcidSheet, Plan, StockSheet
    from fertui.site.edit import Row as SiteRow
    from fertui.site.model import Site
    from fertui.workbench.aims import Aim
    from fertui.workbench.analysis import AnalysisView
    from fertui.workbench.checks import CheckRow
    from fertui.workbench.drift import Drift
    from fertui.workbench.shelf import StockRow, SupplyRow
    from fertui.workbench.today import Today


HORIZON_DAYS = 14
GLANCED = timedelta(days=60)
"""So far back every entry is looked at for last numbers."""
A_CUBIC_METRE = 1000.0
GIVING = ("stock", "dose", "acid", "batch", "recipe")
"""Kinds of entry that tell what a crop was given."""


Progress = Callable[[str, float], None]
"""Hears what is being done and what part of it is."""


def _unheard(doing: str, part: float) -> None:
    """Nobody is waiting."""


class Answers(SiteFolder):
    """Every read of the workbench."""

    def __init__(self, folder: Path) -> None:
        super().__init__(folder)
        self._estimates: dict[tuple[Any, ...], Estimate] = {}
        self._latest: dict[str, Estimate] = {}
        self.progress: Progress = _unheard

    def _told(self, doing: str) -> Callable[[float], None]:
        """Hears what part of one thing is done."""
        return lambda part: self.progress(doing, part)

    def glance(self, loop: str | None = None, at: datetime | None = None) -> Glance:
        """Last known numbers of a loop, without running the model."""
        chosen, at = self.loop(loop), at or now()
        since = at - GLANCED
        recent = self.book.entries(loop=chosen.name, since=since, at=at)
        old = (entry for entry in self._in_force(recent, since) if entry.loop == chosen.name)
        return glance(chosen, (*old, *recent), at)

    def estimate(self, loop: str | None = None, at: datetime | None = None, known: datetime | None = None) -> Estimate:
        """Where the loop is; kept until the logbook or the minute changes."""
        from fertui.estimate.assimilation import assimilate

        chosen, at = self.loop(loop), at or now()
        key = (chosen.name, at, known, self.book.last_number())
        if key not in self._estimates:
            if len(self._estimates) > 8:
                self._estimates.clear()
            before = self._latest.get(chosen.name)
            found = assimilate(
                self.site,
                chosen,
                self.entries(at, known),
                at,
                before=before,
                progress=self._told("following the logbook of " + chosen.name),
            )
            self._estimates[key] = self._latest[chosen.name] = found
        return self._estimates[key]

    def today(self, loop: str | None = None, at: datetime | None = None, known: datetime | None = None) -> Today:
        """State of a loop and what to look at."""
        from fertui.workbench.today import today

        at = at or now()
        estimate = self.estimate(loop, at, known)
        return today(estimate, self.entries(at, known), self.forecast(loop, HORIZON_DAYS, at, known))

    def overview(self, at: datetime | None = None, known: datetime | None = None) -> tuple[Today, ...]:
        """All loops, worst first."""
        at = at or now()
        severity = {"act": 100, "watch": 10, "note": 1}
        states = [self.today(name, at, known) for name in self.loops]
        return tuple(sorted(states, key=lambda state: -sum(severity[each.severity] for each in state.watch)))

    def analysis(
        self, loop: str | None = None, at: datetime | None = None, known: datetime | None = None
    ) -> AnalysisView:
        """The last analysis against target."""
        from fertui.workbench.analysis import analysis

        chosen, at = self.loop(loop), at or now()
        entries = self.entries(at, known)
        last = max((each.at for each in entries if each.loop == chosen.name and each.kind == "analysis"), default=at)
        if last < at - RECENT:  # the one before it is older still
            entries = self.entries(last, known)
        return analysis(self.site, chosen, entries, at)

    def drift(
        self, loop: str | None = None, days: int = 28, at: datetime | None = None, known: datetime | None = None
    ) -> Drift:
        """Shares, ions, EC and pH over the days past, with what was measured and done."""
        from fertui.workbench.drift import drift

        at = at or now()
        return drift(self.estimate(loop, at, known), self.entries(at, known), days)

    def balance(
        self,
        loop: str | None = None,
        start: datetime | None = None,
        end: datetime | None = None,
        known: datetime | None = None,
    ) -> Balance:
        """The account of each ion by cause over a period."""
        from fertui.estimate.balance import balance

        end = end or now()
        return balance(self.estimate(loop, end, known), start or end - timedelta(days=HORIZON_DAYS), end)

    def forecast(
        self,
        loop: str | None = None,
        days: int = HORIZON_DAYS,
        at: datetime | None = None,
        known: datetime | None = None,
        scenario: Scenario | None = None,
    ) -> Forecast:
        """The days ahead under the logged routine, the plan entered, or a what-if."""
        from fertui.estimate.forecast import ROUTINE, forecast

        return forecast(self.estimate(loop, at or now(), known), days, scenario or ROUTINE)

    def next_sample(self, ahead: Forecast, loop: str | None = None, known: datetime | None = None) -> SampleAdvice:
        """The best day for the next sample of a loop and what an analysis now would tell, by a forecast of it."""
        from fertui.estimate.sampling import next_sample

        return next_sample(self.estimate(loop, ahead.at, known), ahead)

    def hindcast(
        self,
        loop: str | None = None,
        at: datetime | None = None,
        known: datetime | None = None,
        inputs: str = "logged",
        seed: int | None = None,
    ) -> Hindcast:
        """Past forecasts against what the laboratory then found."""
        from fertui.estimate.hindcast import hindcast

        chosen, at = self.loop(loop), at or now()
        chance: dict[str, Any] = {} if seed is None else {"seed": seed}
        own = self.book.entries(loop=chosen.name, at=at, known=known)
        analyses = self.book.entries(kinds=("analysis",), at=at, known=known)
        waters = (each for each in analyses if each.point == "source" and each.loop not in (chosen.name, ""))
        return hindcast(
            self.site, chosen, (*own, *waters), at, inputs, progress=self._told("forecasting the past"), **chance
        )

    def plan(
        self,
        loop: str | None = None,
        days: int = HORIZON_DAYS,
        at: datetime | None = None,
        known: datetime | None = None,
        **wishes: Any,
    ) -> Plan:
        """What brings the ions back. ``wishes``: target, supplies, without, steps, salts of ``planning.plan``."""
        from fertui.planning import plan

        at = at or now()
        estimate, entries = self.estimate(loop, at, known), self.entries(at, known)
        return plan(estimate, days=days, entries=entries, progress=self._told("trying plans"), **wishes)

    def stock(
        self,
        loop: str | None = None,
        at: datetime | None = None,
        known: datetime | None = None,
        left_l: Mapping[str, float] | None = None,
    ) -> StockSheet:
        """The stock-tank sheet of the recipe a loop runs on, its target where none was logged.

        The acid of the acid sheet is counted as poured into the make-up water.
        ``left_l``: litres of old stock left in a tank by name; what they hold is taken off.
        """
        from fertui.logbook.mixes import as_mixed
        from fertui.planning import first_acid, stock_sheet
        from fertui.workbench.carrying_out import running_recipe

        chosen, entries = self.loop(loop), self.entries(at, known)
        site = self.site_as_analysed(entries)
        if left_l:
            site = site._replace(stock_tanks=as_mixed(site.stock_tanks, entries))
        recipe = running_recipe(site, chosen, entries)
        return stock_sheet(site, chosen, recipe=recipe, acid_in_water=first_acid(site), remainder_l=left_l)

    def acid(self, loop: str | None = None, at: datetime | None = None, known: datetime | None = None) -> AcidSheet:
        """The acid sheet of a loop's make-up water: for its tank, or for a m3 where the water is treated on its way."""
        from fertui.estimate.source_waters import alkalinity_from
        from fertui.planning import acid_sheet

        chosen, entries = self.loop(loop), self.entries(at, known)
        sheet = acid_sheet(self.site_as_analysed(entries), chosen, volume_l=chosen.tank_l or A_CUBIC_METRE)
        return sheet._replace(alkalinity_from=alkalinity_from(self.site, chosen, entries, at or now()))

    def site_as_analysed(self, entries: Sequence[Entry], at: datetime | None = None) -> Site:
        """The site with its source waters as the logbook's last analyses of them say."""
        from fertui.estimate.source_waters import as_analysed

        return as_analysed(self.site, entries, at or now())

    def check(self) -> tuple[CheckRow, ...]:
        """Site file, logbook, watch list and this machine, as rows."""
        from fertui.workbench.checks import check

        logged = self.loops if self.book.last_number() else ()
        return check(self, {name: self.today(name).watch for name in logged})

    def supplies_rows(self) -> tuple[SupplyRow, ...]:
        """Supplies with formula, label, amount left and hazards."""
        from fertui.workbench.shelf import supply_rows

        return supply_rows(self.site)

    def stock_rows(self, loop: str | None = None, at: datetime | None = None) -> tuple[StockRow, ...]:
        """Stock tanks of a loop with litres and days left."""
        from fertui.workbench.shelf import stock_rows

        at = at or now()
        return stock_rows(self.site, self.loop(loop), self.entries(at), at)

    def last_mixes(
        self, days_left: float, loop: str | None = None, stop_days_before: float = 0.0, at: datetime | None = None
    ) -> tuple[LastMix, ...]:
        """What to mix of each stock tank until the crop ends in ``days_left``, at the use of the last days."""
        from fertui.workbench.shelf import last_mixes

        rows = self.stock_rows(loop, at)
        return last_mixes(self.site, rows, days_left, stop_days_before)

    def given(self, day: date, loop: str | None = None, known: datetime | None = None) -> Given:
        """What a loop was given on a local day: stock, salts, acid, ions."""
        from fertui.logbook.mixes import LONGEST_SPAN, given_on

        after = datetime.combine(day, time.max, UTC) + LONGEST_SPAN
        return given_on(self.book.entries(kinds=GIVING, at=after, known=known), self.site, self.loop(loop).name, day)

    def mixes_on(self, day: date, loop: str | None = None, known: datetime | None = None) -> tuple[Mix, ...]:
        """What each stock tank of a loop held at the end of a local day, as far as its batches say."""
        from fertui.logbook.mixes import mix_at

        end = datetime.combine(day, time.max, ZoneInfo(self.site.timezone))
        batches = self.book.entries(kinds=("batch",), at=end, known=known)
        held = (mix_at(batches, tank, end) for tank in self.loop(loop).stock_tanks)
        return tuple(mix for mix in held if mix is not None)

    def acid_cautions(self, acid: str, strength_pct: float | None = None) -> tuple[Caution, ...]:
        """Cautions of an acid or lye at the strength on its label."""
        from fertui.workbench.shelf import acid_cautions

        return acid_cautions(self.site, acid, strength_pct)

    def site_rows(self) -> tuple[SiteRow, ...]:
        """Every value of the site file by its dotted name, with where it comes from."""
        from fertui.site.edit import rows

        return rows(self.site)

    def aims(self, loop: str | None = None) -> tuple[Aim, ...]:
        """Bands and limits in force for a loop and waters as last analysed, each with where it comes from."""
        from fertui.workbench.aims import aims, analysed_waters

        waters = analysed_waters(self.site, self.site_as_analysed(self.entries()))
        return (*aims(self.site, self.loop(loop)), *waters)
