"""What the entries of one loop say, in the form the loop engine takes: water, stock, events, feed, observations.

Times are days from ``zero``, a local midnight. Amounts without a time of day cover that local day; others the time
since the previous entry of their kind. Doubtful entries are kept among the observations, marked, and never used.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from datetime import UTC, datetime, time, timedelta
from typing import NamedTuple
from zoneinfo import ZoneInfo

import numpy as np

from fertui.catalogue.figures import CatalogueError
from fertui.chemistry.ions import IONS, Array
from fertui.estimate import compositions
from fertui.estimate.observations import Observation, observations
from fertui.estimate.reach import HISTORY_DAYS, WHOLE_DAYS
from fertui.estimate.source_waters import as_analysed, water_analyses
from fertui.estimate.spreads import Spread, Steps, spread
from fertui.logbook.entries import Entry
from fertui.logbook.growing import stands_after
from fertui.logbook.intended import carried_out, given, part_left, subject
from fertui.loop.values import Event
from fertui.site.model import Loop, Site

MOMENT_D = 1.2e-4
"""Ten seconds: what happens closer to the end of a record than the steps of a run is put before it."""

ANEW = ("planted", "replanted", "new medium", "emptied", "refilled")
WATER_AMOUNTS = ("make_up", "irrigation", "drain", "condensate", "crop")
METERED = ("make_up", "irrigation", "drain")
POINT_OF_BLEED = {"tank": "tank", "drain": "drain", "drain_store": "drain_store"}


class Record(NamedTuple):
    """One loop's entries up to ``at``, as the engine needs them.

    ``whole``: whether it goes back as far as there is any.
    ``first``: time of the first entry, None without any.
    ``water``: litres by name, spread over their time; ``bleed`` stands among ``events``. ``stock``: mmol (n, 10);
    ``stock_held``: what each stock tank held from which batch on [mmol/L].
    ``waters``: what each source water of the site holds (10,) [mmol/L], by its name in lower case: as the site file
    says, and from each analysis on. ``site_now``: the site with its waters as last analysed.
    ``standing``: whether a crop stands, from each time on at which that changed.
    ``plans``: what is intended or expected, each with the part of it still to do.
    ``feed``: knots (time, composition) of a known feed. ``anew``: times at which the estimate must start afresh.
    """

    site: Site
    loop: Loop
    at: datetime
    whole: bool
    zero: datetime
    end: float
    first: float | None
    water: Mapping[str, Spread]
    levels: tuple[tuple[float, float], ...]
    stock: Spread
    stock_held: Mapping[str, Sequence[tuple[Entry | None, Array]]]
    events: tuple[Event, ...]
    feed: tuple[tuple[float, Array], ...]
    recipes: Steps[Array]
    sources: Steps[str]
    waters: Mapping[str, Steps[Array]]
    site_now: Site
    setpoints: Steps[Mapping[str, float | str]]
    stages: Steps[Mapping[str, float | str]]
    standing: Steps[bool]
    light: Mapping[int, float]
    drain_pct: Steps[float]
    observations: tuple[Observation, ...]
    anew: tuple[float, ...]
    new_medium: float | None
    plans: tuple[tuple[Entry, float], ...]
    assumed: tuple[str, ...]

    def time(self, moment: datetime) -> float:
        """Days from ``zero`` to a moment."""
        return (moment - self.zero).total_seconds() / 86400.0

    def has_crop(self, time: float) -> bool:
        """Whether a crop stands at a time: so it is until one was removed."""
        return self.standing.at(time) is not False

    @property
    def bare_since(self) -> datetime | None:
        """Since when no crop stands at the end of the record; None where one does."""
        return None if self.has_crop(self.end) else self.moment(self.standing.times[-1])

    def water_at(self, name: str, time: float) -> Array:
        """What a source water holds (10,) [mmol/L] at a time; nothing where nobody analysed it."""
        return np.nan_to_num(self.as_said(name, time))

    def as_said(self, name: str, time: float) -> Array:
        """The same with nan for every ion where nobody has analysed the water by then."""
        known = self.waters.get(name.lower())
        return np.full(len(IONS), np.nan) if known is None else np.asarray(known.at(time))

    def make_up_as_said(self, time: float) -> Array:
        """What the water that tops up the loop at a time holds (10,) [mmol/L]; nan where nobody analysed it."""
        return self.as_said(self.sources.at(time) or self.loop.water, time)

    def make_up_at(self, time: float) -> Array:
        """The same, nothing in a water that nobody analysed."""
        return np.nan_to_num(self.make_up_as_said(time))

    def moment(self, days: float) -> datetime:
        """The moment so many days after ``zero``, in UTC."""
        return self.zero + timedelta(seconds=round(days * 86400.0, 3))

    def midnights(self, begin: float, end: float) -> tuple[float, ...]:
        """Local midnights within (begin, end) [d]."""
        zone = ZoneInfo(self.site.timezone)
        day = self.moment(begin).astimezone(zone).date()
        found: list[float] = []
        while True:
            day += timedelta(days=1)
            here = self.time(datetime.combine(day, time(), zone).astimezone(UTC))
            if here >= end - 1e-9:
                return tuple(found)
            if here > begin + 1e-9:
                found.append(here)

    def local_day(self, days: float) -> int:
        """Ordinal of the local date at a time: what daily random numbers are keyed by."""
        return self.moment(days + 1e-6).astimezone(ZoneInfo(self.site.timezone)).toordinal()


def read(site: Site, loop: Loop, entries: Iterable[Entry], at: datetime, whole: bool = False) -> Record:
    """The record of a loop from its effective entries; those of other loops and after ``at`` are left out."""
    known = [each for each in entries if _known(each, at)]
    own = sorted((each for each in known if each.loop == loop.name), key=lambda each: each.at)
    first = max(own[0].at, at - timedelta(days=WHOLE_DAYS if whole else HISTORY_DAYS + 7)) if own else at
    zone = ZoneInfo(site.timezone)
    zero = datetime.combine(first.astimezone(zone).date(), time(), zone).astimezone(UTC)
    by_kind: dict[str, list[Entry]] = {}
    for entry in own:
        by_kind.setdefault(entry.kind, []).append(entry)
    return _Reader(site, loop, zero, zone, by_kind, known).record(at, whole)


def _known(entry: Entry, at: datetime) -> bool:
    """Whether an entry counts at a time: it has happened, or it is a plan for later that was already entered."""
    return entry.at <= at or (entry.kind == "plan" and entry.entered <= at)


def _content(ions: Mapping[str, float]) -> Array:
    """What a water holds (10,) [mmol/L]; nan where nobody has said a word of it."""
    return compositions.array(ions) if ions else np.full(len(IONS), np.nan)


def _end(at: float, events: Sequence[Event]) -> float:
    """The end of a record [d]: what happened in its last moments lies before it, so that it counts."""
    last = max((event.at for event in events if event.at <= at + 1e-9), default=at - 1.0)
    return max(at, last + MOMENT_D)


class _Reader:
    """Builds a record; holds what its steps share."""

    def __init__(
        self,
        site: Site,
        loop: Loop,
        zero: datetime,
        zone: ZoneInfo,
        by_kind: Mapping[str, list[Entry]],
        of_all_loops: Sequence[Entry],
    ) -> None:
        self.site, self.loop, self.zero, self.zone, self.by_kind = site, loop, zero, zone, by_kind
        self.of_all_loops = of_all_loops
        self.assumed: list[str] = []

    def record(self, at: datetime, whole: bool) -> Record:
        """The whole record, piece by piece."""
        seen = self._observations()
        held = compositions.stock_by_tank(self.site, self.loop, self._certain("batch"))
        events = self._events(seen)
        return Record(
            site=self.site, loop=self.loop, at=at, whole=whole, zero=self.zero, end=_end(self.days(at), events),
            first=self._first(), water=self._water(), levels=self._levels(), stock=self._stock(held), stock_held=held,
            events=events, feed=self._feed(seen),
            recipes=self._recipes(), sources=self._sources(), waters=self._waters(),
            site_now=as_analysed(self.site, self.of_all_loops, at), setpoints=self._steps("setpoint"),
            stages=self._steps("crop"), standing=self._standing(), light=self._light(),
            drain_pct=self._drain_pct(), observations=seen,
            anew=self._anew(ANEW), new_medium=max(self._anew(("planted", "replanted", "new medium")), default=None),
            plans=tuple(self._plans()), assumed=tuple(self.assumed),
        )  # fmt: skip

    def _plans(self) -> Iterator[tuple[Entry, float]]:
        """Plan entries that are not carried out yet, wholly or in part."""
        done = carried_out(each for entries in self.by_kind.values() for each in entries)
        for plan in self._of("plan"):
            begun = done.get(plan.number or 0)
            name = subject(plan)[1]
            left = 1.0 if begun is None else part_left(plan.number_of(name) if name else None, given(plan, begun))
            if left > 0:
                yield plan, left

    def days(self, moment: datetime) -> float:
        """A moment as days from the record's zero [d]."""
        return (moment - self.zero).total_seconds() / 86400.0

    def _first(self) -> float | None:
        times = [entries[0].at for entries in self.by_kind.values() if entries]
        return max(self.days(min(times)), 0.0) if times else None

    def _of(self, kind: str) -> list[Entry]:
        return self.by_kind.get(kind, [])

    def _certain(self, kind: str) -> list[Entry]:
        return [entry for entry in self._of(kind) if not entry.doubtful]

    def _span(self, entry: Entry, before: datetime | None) -> tuple[float, float]:
        """The time an amount covers."""
        if entry.whole_day:
            day = entry.at.astimezone(self.zone).date()
            midnight = datetime.combine(day + timedelta(days=1), time(), self.zone)
            return self.days(entry.at), self.days(midnight.astimezone(UTC))
        return self.days(before if before is not None else entry.at - timedelta(days=1)), self.days(entry.at)

    def _spans(self, entries: Sequence[Entry]) -> list[tuple[Entry, tuple[float, float]]]:
        before: datetime | None = None
        spans = []
        for entry in entries:
            spans.append((entry, self._span(entry, before)))
            before = entry.at
        return spans

    def _water(self) -> dict[str, Spread]:
        return {name: spread([*self._amounts(name), *self._metered(name)]) for name in WATER_AMOUNTS}

    def _amounts(self, name: str) -> list[tuple[float, float, float]]:
        given = [entry for entry in self._certain("water") if entry.number_of(name) is not None]
        return [(*span, entry.number_of(name) or 0.0) for entry, span in self._spans(given)]

    def _metered(self, name: str) -> list[tuple[float, float, float]]:
        """Litres between two positions of a meter; a replaced or rolled-over meter starts afresh."""
        if name not in METERED:
            return []
        field = f"{name}_meter"
        given = [entry for entry in self._certain("water") if entry.number_of(field) is not None]
        found = []
        for before, entry in zip(given, given[1:], strict=False):
            litres = (entry.number_of(field) or 0.0) - (before.number_of(field) or 0.0)
            if entry.number_of(name) is None and not entry.text_of("meter") and litres >= 0:
                found.append((self.days(before.at), self.days(entry.at), litres))
        return found

    def _levels(self) -> tuple[tuple[float, float], ...]:
        vessels = ("tank", "drain_store", self.loop.drain_store, "")
        given = [entry for entry in self._certain("level") if entry.text_of("tank") in vessels]
        return tuple((self.days(entry.at), entry.number_of("litres") or 0.0) for entry in given)

    def _stock(self, held: Mapping[str, Sequence[tuple[Entry | None, Array]]]) -> Spread:
        """Ions from stock by logged litres, each batch by what it held."""
        rows: list[tuple[float, float, Array]] = []
        for name, contents in held.items():
            used = [entry for entry in self._certain("stock") if entry.text_of("tank") == name]
            for entry, span in self._spans(used):
                used_up = self.zero + timedelta(days=span[1])
                strength = [each for batch, each in contents if batch is None or batch.at <= used_up][-1]
                if not np.any(strength):
                    self._assume(f"what stock tank {name} holds is not known; its litres could not be counted")
                    continue
                rows.append((*span, strength * (entry.number_of("litres") or 0.0)))
        return spread(rows, (len(IONS),))

    def _events(self, seen: Sequence[Observation]) -> tuple[Event, ...]:
        found = [*self._doses(), *self._injected(self._acids(), seen), *self._bleeds()]
        vessel = "drain_store" if self.loop.layout == "drain-blend" else "tank"
        found += [Event(when, "level", litres=litres, point=vessel) for when, litres in self._levels()]
        return tuple(sorted(found, key=lambda event: event.at))

    def _doses(self) -> list[Event]:
        found = []
        for entry in self._certain("dose"):
            try:
                ions = (entry.number_of("kg") or 0.0) * compositions.per_kg(self.site, entry.text_of("salt"))
            except CatalogueError as error:
                self._assume(f"a dose could not be counted: {error}")
                continue
            found.append(Event(self._moment(entry), "dose", ions, entry=entry.number))
        return found

    def _acids(self) -> list[Event]:
        found = []
        for entry in self._certain("acid"):
            try:
                ions = compositions.of_acid(self.site, entry)
            except CatalogueError as error:
                self._assume(f"an acid could not be counted: {error}")
                continue
            found.append(Event(self._moment(entry), "acid", ions, entry=entry.number))
        return found

    def _injected(self, acids: Sequence[Event], seen: Sequence[Observation]) -> list[Event]:
        """Acid that an injector used over a day, at that day's round; a split into a tank stays at its moment."""
        if self.loop.layout == "shared-tank":
            return list(acids)
        rounds = {int(each.time): each.time for each in seen if not each.is_analysis and not each.doubtful}
        return [acid._replace(at=rounds.get(int(acid.at), acid.at)) for acid in acids]

    def _bleeds(self) -> list[Event]:
        return [
            Event(
                self._moment(entry), "bleed", litres=entry.number_of("litres") or 0.0,
                point=POINT_OF_BLEED.get(entry.text_of("from"), "tank"), reason=entry.text_of("reason"),
                entry=entry.number,
            )
            for entry in self._certain("bleed")
        ]  # fmt: skip

    def _moment(self, entry: Entry) -> float:
        """When an act happened: noon of its day where no time was written."""
        return self.days(entry.at) + (0.5 if entry.whole_day and entry.at.astimezone(self.zone).hour == 0 else 0.0)

    def _feed(self, seen: Sequence[Observation]) -> tuple[tuple[float, Array], ...]:
        """Knots of a known feed: analyses at the dripper, linear between; a recipe holds from its time on."""
        known = dict(compositions.target_feed(self.site, self.loop).ions)
        knots: list[tuple[float, Array]] = []
        for each in seen:
            if each.point == "feed" and each.is_analysis and not each.doubtful and len(each.columns()) >= 3:
                known = {**known, **each.ions}
                knots.append((each.time, compositions.array(known)))
        for when, recipe in zip(self._recipes().times, self._recipes().values, strict=True):
            before = [composition for knot, composition in knots if knot < when]
            if before:
                knots.append((when - 1e-6, before[-1]))
            knots.append((when, np.asarray(recipe)))
            knots.sort(key=lambda knot: knot[0])
        return tuple(sorted(knots, key=lambda knot: knot[0]))

    def _recipes(self) -> Steps[Array]:
        given = [entry for entry in self._certain("recipe") if compositions.entry_ions(entry)]
        times = tuple(self.days(entry.at) for entry in given)
        return Steps(times, tuple(compositions.array(compositions.entry_ions(entry)) for entry in given))

    def _sources(self) -> Steps[str]:
        given = [entry for entry in self._certain("water") if entry.text_of("source")]
        return Steps(tuple(self.days(each.at) - 1.0 for each in given), tuple(each.text_of("source") for each in given))

    def _waters(self) -> dict[str, Steps[Array]]:
        analyses = water_analyses(self.site, self.of_all_loops)
        found = {}
        for water in self.site.waters:
            later = analyses.get(water.name.lower(), ())
            held = [water.composition, *(composition for _, composition in later)]
            times = (-np.inf, *(self.days(when) for when, _ in later))
            found[water.name.lower()] = Steps(times, tuple(_content(each.ions) for each in held))
        return found

    def _steps(self, kind: str) -> Steps[Mapping[str, float | str]]:
        """Entries of a kind; later ones keep what they do not name from earlier ones."""
        times, values = [], []
        merged: dict[str, float | str] = {}
        for entry in self._certain(kind):
            merged = {
                **merged,
                **{each.name: each.text if each.number is None else each.number for each in entry.values},
            }
            times.append(self.days(entry.at))
            values.append(merged)
        return Steps(tuple(times), tuple(values))

    def _standing(self) -> Steps[bool]:
        changes: list[tuple[float, bool]] = []
        stands = True
        for entry in self._certain("crop"):
            before, stands = stands, stands_after(entry, stands)
            if stands != before:
                changes.append((self.days(entry.at), stands))
        return Steps(tuple(time for time, _ in changes), tuple(each for _, each in changes))

    def _light(self) -> dict[int, float]:
        given = [entry for entry in self._certain("reading") if entry.number_of("light_sum") is not None]
        return {entry.at.astimezone(self.zone).toordinal(): entry.number_of("light_sum") or 0.0 for entry in given}

    def _drain_pct(self) -> Steps[float]:
        given = [entry for entry in self._certain("reading") if entry.number_of("drain_pct") is not None]
        return Steps(
            tuple(self.days(each.at) for each in given), tuple((each.number_of("drain_pct") or 0.0) for each in given)
        )

    def _observations(self) -> tuple[Observation, ...]:
        entries = [*self._of("reading"), *self._of("analysis")]
        return observations(self.loop, entries, {id(entry): self.days(entry.at) for entry in entries})

    def _anew(self, events: Sequence[str]) -> tuple[float, ...]:
        return tuple(self.days(each.at) for each in self._certain("crop") if each.text_of("event") in events)

    def _assume(self, text: str) -> None:
        if text not in self.assumed:
            self.assumed.append(text)
