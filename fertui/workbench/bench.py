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
    from fertui.estimate.assimilation import Estimate
    from fertui.estimate.balance import Balance
    from fertui.estimate.forecast import Forecast, Scenario
    from fertui.estimate.hindcast import Hindcast
    from fertui.logbook.questions import Question
    from fertui.logbook.store import Logbook
    from fertui.planning.values import AcidSheet, Plan, StockSheet
    from fertui.site.model import Loop, Site
    from fertui.workbench.aims import Aims
    from fertui.workbench.analysis import AnalysisView
    from fertui.workbench.checks import CheckRow
    from fertui.workbench.drift import Drift
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

    def estimate(
        self, loop: str | None = None, at: datetime | None = None, known: datetime | None = None
    ) -> Estimate:
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

    def analysis(self, loop: str | None = None, at: datetime | None = None, known: datetime | None = None) -> AnalysisView:
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
        """The stock-tank sheet of a loop's recipe."""
        from fertui.planning import stock_sheet

        return stock_sheet(self.site, self.loop(loop))

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

    def history(
        self, kind: str | None = None, loop: str | None = None, at: datetime | None = None
    ) -> tuple[Entry, ...]:
        """Every entry verbatim, struck ones too."""
        from fertui.logbook.kinds import kind_named

        kinds = None if kind is None else (kind_named(kind).name,)
        return self.book.history(loop=None if loop is None else self.loop(loop).name, kinds=kinds, at=at)

    def aims(self, loop: str | None = None) -> Aims:
        """Targets, bands and limits of a loop, each with where it comes from."""
        from fertui.workbench.aims import aims

        return aims(self.site, self.loop(loop))

    def questions(self, kind: str, fields: Mapping[str, str], loop: str | None = None) -> tuple[Question, ...]:
        """What a careful colleague would ask before this entry is written."""
        from fertui.logbook.questions import questions

        return questions(self._read(kind, fields, loop), self.book, self.site)

    def record(self, kind: str, fields: Mapping[str, str], loop: str | None = None) -> Entry:
        """Append one entry and return it as read back from the logbook."""
        return self._stored(self.book.append(self._read(kind, fields, loop)))

    def supersede(self, number: int, fields: Mapping[str, str], why: str, by: str) -> Entry:
        """Correct an entry by a new one; the old one stays visible."""
        from fertui.logbook.parse import corrected

        old = self.book.entry(number)
        return self._stored(self.book.append(corrected(old, fields, self.site, datetime.now(UTC), why=why, by=by)))

    def void(self, number: int, why: str, by: str) -> Entry:
        """Strike an entry; it stays visible."""
        return self._stored((self.book.void(number, why, by),))

    def last_number(self) -> int:
        """Number of the last entry: what another session wrote shows here."""
        return self.book.last_number()

    def _read(self, kind: str, fields: Mapping[str, str], loop: str | None) -> Entry:
        from fertui.logbook.parse import entry_from_text

        return entry_from_text(kind, fields, self.site, self.loop(loop), datetime.now(UTC))

    def _stored(self, numbers: Sequence[int]) -> Entry:
        return self.book.entry(numbers[-1])


def now() -> datetime:
    """The running minute, in UTC: answers within one minute are the same."""
    return datetime.now(UTC).replace(second=0, microsecond=0)


def open_site(folder: str | Path) -> Bench:
    """The workbench of a site folder. Raises ``Refusal`` where there is no site in it."""
    from fertui.refusals import Refusal

    path = Path(folder)
    if not (path / "site.toml").is_file():
        raise Refusal(f"{path} holds no site: no site.toml in it. Make one with 'fertui new {path}', or see 'fertui demo'.")
    return Bench(path)
