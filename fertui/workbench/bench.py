"""The workbench of one site: every read and every write a front end may ask for, by name."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from datetime import UTC, datetime, timedelta
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any

from fertui.logbook.entries import Entry
from fertui.workbench.glance import Glance, glance

if TYPE_CHECKING:
    from fertui.catalogue.cautions import Caution
    from fertui.chemistry.verdicts import Check
    from fertui.estimate.assimilation import Estimate
    from fertui.estimate.balance import Balance
    from fertui.estimate.forecast import Forecast, Scenario
    from fertui.estimate.hindcast import Hindcast
    from fertui.logbook.importing import ImportResult
    from fertui.logbook.questions import Question
    from fertui.logbook.store import Logbook
    from fertui.paper import Page
    from fertui.planning.values import AcidSheet, Plan, StockSheet
    from fertui.site.edit import Row as SiteRow
    from fertui.site.model import Loop, Site
    from fertui.workbench.analysis import AnalysisView
    from fertui.workbench.carrying_out import PlanItem
    from fertui.workbench.checks import CheckRow
    from fertui.workbench.drift import Drift
    from fertui.workbench.entering import Place
    from fertui.workbench.shelf import StockRow, SupplyRow
    from fertui.workbench.today import Today

LOGBOOK = "logbook.sqlite3"
HORIZON_DAYS = 14


class Bench:
    """One site folder, opened. Nothing heavy is loaded before it is asked for."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self._estimates: dict[tuple[Any, ...], Estimate] = {}

    @cached_property
    def site(self) -> Site:
        """The site as its file says now."""
        from fertui.site.files import read_site

        return read_site(self.folder)

    @cached_property
    def book(self) -> Logbook:
        """The logbook, opened once."""
        from fertui.logbook.store import Logbook

        return Logbook.open(self.folder / LOGBOOK)

    @property
    def loops(self) -> tuple[str, ...]:
        """Names of the loops in the order of the file."""
        return tuple(loop.name for loop in self.site.loops)

    def loop(self, name: str | None = None) -> Loop:
        """A loop by name, the first when none is named."""
        from fertui.refusals import Refusal

        try:
            return self.site.loop(name)
        except KeyError as unknown:
            raise Refusal(str(unknown.args[0])) from None

    def entries(self, at: datetime | None = None, known: datetime | None = None) -> tuple[Entry, ...]:
        """Effective entries of all loops up to ``at``, as they were known at ``known``."""
        return self.book.entries(at=at or now(), known=known)

    def glance(self, loop: str | None = None, at: datetime | None = None) -> Glance:
        """Last known numbers of a loop, without running the model."""
        chosen, at = self.loop(loop), at or now()
        recent = self.book.entries(loop=chosen.name, since=at - timedelta(days=60), at=at)
        return glance(chosen, recent, at)

    def estimate(self, loop: str | None = None, at: datetime | None = None, known: datetime | None = None) -> Estimate:
        """Where the loop is; kept until the logbook or the minute changes."""
        from fertui.estimate.assimilation import assimilate

        chosen, at = self.loop(loop), at or now()
        key = (chosen.name, at, known, self.book.last_number())
        if key not in self._estimates:
            if len(self._estimates) > 8:
                self._estimates.clear()
            self._estimates[key] = assimilate(self.site, chosen, self.entries(at, known), at)
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
        return analysis(self.site, chosen, self.entries(at, known), at)

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

    def hindcast(
        self,
        loop: str | None = None,
        at: datetime | None = None,
        known: datetime | None = None,
        inputs: str = "logged",
        **seed: int,
    ) -> Hindcast:
        """Past forecasts against what the laboratory then found."""
        from fertui.estimate.hindcast import hindcast

        chosen, at = self.loop(loop), at or now()
        return hindcast(self.site, chosen, self.entries(at, known), at, inputs, **seed)

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
        return plan(self.estimate(loop, at, known), days=days, entries=self.entries(at, known), **wishes)

    def stock(self, loop: str | None = None) -> StockSheet:
        """The stock-tank sheet of the recipe a loop runs on, its target where none was logged."""
        from fertui.planning import stock_sheet
        from fertui.workbench.carrying_out import running_recipe

        chosen = self.loop(loop)
        return stock_sheet(self.site, chosen, recipe=running_recipe(self.site, chosen, self.entries()))

    def acid(self, loop: str | None = None) -> AcidSheet:
        """The acid sheet of a loop's make-up water."""
        from fertui.planning import acid_sheet

        return acid_sheet(self.site, self.loop(loop))

    def check(self) -> tuple[CheckRow, ...]:
        """Site file, logbook, watch list and this machine, as rows."""
        from fertui.workbench.checks import check

        return check(self)

    def time(self, written: str) -> datetime:
        """A time as people write it, on the clock of the site."""
        from fertui.logbook.times import read_moment

        return read_moment(written, self.site.timezone, now())[0]

    # papers

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

    # the shelf and the site

    def supplies_rows(self) -> tuple[SupplyRow, ...]:
        """Supplies with formula, label, amount left and hazards."""
        from fertui.workbench.shelf import supply_rows

        return supply_rows(self.site)

    def stock_rows(self, loop: str | None = None, at: datetime | None = None) -> tuple[StockRow, ...]:
        """Stock tanks of a loop with litres and days left."""
        from fertui.estimate.notices import stock_days_left
        from fertui.workbench.shelf import stock_rows

        chosen, at = self.loop(loop), at or now()
        entries = self.entries(at)
        return stock_rows(self.site, chosen, entries, stock_days_left(self.site, chosen, entries, at))

    def acid_cautions(self, acid: str, strength_pct: float | None = None) -> tuple[Caution, ...]:
        """Cautions of an acid or lye at the strength on its label."""
        from fertui.workbench.shelf import acid_cautions

        return acid_cautions(self.site, acid, strength_pct)

    def site_rows(self) -> tuple[SiteRow, ...]:
        """Every value of the site file by its dotted name, with where it comes from."""
        from fertui.site.edit import rows

        return rows(self.site)

    def change_site(self, key: str, text: str, by: str) -> Entry:
        """Change one value of the site file, keep the old file, and log the new one whole."""
        from fertui.site.edit import changed
        from fertui.site.files import write_site

        site = changed(self.site, key, text)
        path = write_site(site, self.folder, datetime.now(UTC))
        self.__dict__.pop("site", None)
        return self.record("site", {"text": path.read_text(encoding="utf-8"), "by": by})

    # the logbook

    def history(
        self, kind: str | None = None, loop: str | None = None, at: datetime | None = None
    ) -> tuple[Entry, ...]:
        """Every entry verbatim, struck ones too."""
        from fertui.logbook.kinds import kind_named

        kinds = None if kind is None else (kind_named(kind).name,)
        return self.book.history(loop=None if loop is None else self.loop(loop).name, kinds=kinds, at=at)

    def last_number(self) -> int:
        """Number of the last entry: what another session wrote shows here."""
        return self.book.last_number()

    def echo(self, kind: str, name: str, text: str, loop: str | None = None) -> str:
        """What was understood of one value; refuses what cannot be taken."""
        from fertui.workbench.entering import echo

        return echo(kind, name, text, self.site, self.loop(loop))

    def previous(self, loop: str | None = None) -> Mapping[Place, tuple[str, datetime]]:
        """The last value as written for every place a form asks for."""
        from fertui.workbench.entering import previous

        recent = self.book.entries(loop=self.loop(loop).name, since=now() - timedelta(days=60))
        return previous(recent)

    def questions(self, kind: str, fields: Mapping[str, str], loop: str | None = None) -> tuple[Question, ...]:
        """What a careful colleague would ask before this entry is written."""
        from fertui.logbook.questions import questions

        return questions(self._read(kind, fields, loop), self.book, self.site)

    def check_analysis(self, fields: Mapping[str, str], loop: str | None = None) -> tuple[Check, ...]:
        """Charge balance and EC check of an analysis before it is saved."""
        from fertui.workbench.entering import check_analysis

        return check_analysis(self._read("analysis", fields, loop))

    def record(self, kind: str, fields: Mapping[str, str], loop: str | None = None, asked: bool = True) -> Entry:
        """Append one entry, return it as read back; ``asked`` False: unanswered questions are kept with it as flags."""
        from fertui.logbook.questions import flagged, questions

        entry = self._read(kind, fields, loop)
        if not asked:
            entry = flagged(entry, questions(entry, self.book, self.site))
        return self._stored(self.book.append(entry))

    def supersede(self, number: int, fields: Mapping[str, str], why: str, by: str) -> Entry:
        """Correct an entry by a new one; the old one stays visible."""
        from fertui.logbook.parse import corrected

        old = self.book.entry(number)
        return self._stored(self.book.append(corrected(old, fields, self.site, datetime.now(UTC), why=why, by=by)))

    def void(self, number: int, why: str, by: str) -> Entry:
        """Strike an entry; it stays visible."""
        return self._stored((self.book.void(number, why, by),))

    def import_table(self, path: Path, kind: str, loop: str | None = None, **wishes: Any) -> ImportResult:
        """Take in a table; ``wishes`` as in ``keeping.import_table``."""
        from fertui.workbench.keeping import import_table

        return import_table(self, path, kind, loop, **wishes)

    def export(self, into: Path) -> tuple[Path, ...]:
        """Write the logbook as tables, one a kind."""
        from fertui.logbook.exporting import export

        return export(self.book, into, self.site.timezone)

    def backup(self, path: Path) -> int:
        """Write the whole book and the site file, verbatim; returns the number of entries."""
        from fertui.logbook.backup import backup

        return backup(self.book, path)

    # plans carried out

    def accept_plan(self, plan: Plan, by: str) -> tuple[Entry, ...]:
        """Log what is intended: one plan entry a step, all or none."""
        from fertui.workbench.carrying_out import steps_of

        entries = [self._read("plan", fields, plan.loop) for fields in steps_of(plan, by)]
        return tuple(self.book.entry(number) for number in self.book.append(entries))

    def open_plans(self, loop: str | None = None, at: datetime | None = None) -> tuple[PlanItem, ...]:
        """Intended steps of a loop, done or not."""
        from fertui.workbench.carrying_out import open_plans

        return open_plans(self.book.entries(loop=self.loop(loop).name, at=at))

    def mark_done(
        self, number: int, by: str, amount: str | None = None, strength_pct: float | None = None, read: bool = False
    ) -> Entry:
        """Log a planned step as carried out, wholly or by ``amount``; ``read``: its cautions were acknowledged."""
        from fertui.workbench.carrying_out import done_fields

        planned = self.book.entry(number)
        kind, fields = done_fields(planned, by, amount, strength_pct)
        if kind == "acid":
            fields["cautions"] = "acknowledged" if read else "not acknowledged"
        return self.record(kind, fields, planned.loop)

    def not_done(self, number: int, why: str, by: str) -> Entry:
        """Strike an intended step that will not be carried out."""
        return self.void(number, why, by)

    def _read(self, kind: str, fields: Mapping[str, str], loop: str | None) -> Entry:
        from fertui.logbook.parse import entry_from_text

        return entry_from_text(kind, fields, self.site, self.loop(loop), datetime.now(UTC))

    def _stored(self, numbers: Sequence[int]) -> Entry:
        return self.book.entry(numbers[-1])


def now() -> datetime:
    """End of the running minute, in UTC: answers within a minute are the same, nothing just logged is hidden."""
    return datetime.now(UTC).replace(second=59, microsecond=999999)


def open_site(folder: str | Path) -> Bench:
    """The workbench of a site folder. Raises ``Refusal`` where there is no site in it."""
    from fertui.refusals import Refusal

    path = Path(folder)
    if not (path / "site.toml").is_file():
        raise Refusal(
            f"{path} holds no site: no site.toml in it. Make one with 'fertui new {path}', or see 'fertui demo'."
        )
    return Bench(path)
