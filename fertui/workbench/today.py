"""Today: where a loop is, what to look at, how old what is known is."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from datetime import datetime, timedelta
from typing import TYPE_CHECKING, NamedTuple
from zoneinfo import ZoneInfo

from fertui.estimate.points import Estimated, PointState
from fertui.logbook.entries import Entry
from fertui.site.points import point_name
from fertui.workbench.carrying_out import in_words as plan_in_words
from fertui.workbench.carrying_out import open_plans
from fertui.workbench.glance import Glance, Seen, glance

if TYPE_CHECKING:
    from fertui.estimate.assimilation import Estimate
    from fertui.estimate.forecast import Forecast, LeavesBand
    from fertui.estimate.notices import Notice
    from fertui.estimate.sampling import SampleAdvice

SHARES = ("K share", "Ca share", "Mg share")
LIMITED = ("Na", "NH4", "Cl")
AWAITED, TAKEN_BEFORE = timedelta(days=21), timedelta(days=2)
"""A sample is waited for so long, and was taken at most so long before it was sent (common practice, no source)."""


class Gauge(NamedTuple):
    """One row of the managed point: its course of daily values and when it leaves its band.

    ``what`` is ``K share``, ``Ca share``, ``Mg share``, an ion with a limit (``Na``, ``NH4``, ``Cl``) or ``EC``.
    ``course`` holds one value a day, oldest first; the value of today stands at ``today_index``, the days ahead follow.
    """

    what: str
    unit: str
    now: Estimated
    course: tuple[float, ...]
    today_index: int
    leaves: str


class Today(NamedTuple):
    """State of one loop at a time."""

    loop: str
    layout: str
    crop: str
    stage: str
    medium: str
    at: datetime
    managed_point: str
    points: Mapping[str, PointState]
    last_analysis: Seen | None
    last_reading: Seen | None
    readings: Mapping[str, Seen]
    set_ec: float | None
    set_ph: float | None
    drain_pct: float | None
    light_sum_j_per_cm2: float | None
    stock_days_left: Mapping[str, float]
    gauges: tuple[Gauge, ...]
    watch: tuple[Notice, ...]
    analyses_behind: int
    unanalysed_water: str | None = None
    """Name of the water that fills up, where nobody has said what it holds."""
    awaited: tuple[str, ...] = ()
    half_done: tuple[str, ...] = ()


def today(estimate: Estimate, entries: Sequence[Entry], ahead: Forecast) -> Today:
    """Put together what the estimate, its forecast and the logbook say of today."""
    from fertui.estimate.notices import notices, stock_days_left

    loop, at = estimate.loop, estimate.at
    own = [entry for entry in entries if entry.loop == loop.name]
    last = glance(loop, own, at)
    return Today(
        loop=loop.name,
        layout=loop.layout,
        crop=last.crop,
        stage=last.stage,
        medium=loop.medium,
        at=at,
        managed_point=estimate.managed,
        points=estimate.points(),
        last_analysis=last.last_analysis,
        last_reading=_newest(last),
        readings=last.readings,
        set_ec=last.set_ec,
        set_ph=last.set_ph,
        drain_pct=_latest_number(own, "drain_pct"),
        light_sum_j_per_cm2=_latest_number(own, "light_sum"),
        stock_days_left=stock_days_left(estimate.site, loop, entries, at),
        gauges=gauges(estimate, ahead),
        watch=notices(estimate, entries, ahead),
        analyses_behind=estimate.analyses,
        unanalysed_water=estimate.unanalysed_water,
        awaited=_awaited(own, at, estimate.site.timezone),
        half_done=_half_done(own, at, estimate.site.timezone),
    )


PAST_DAYS = 14
NOT_KNOWN = "not known yet"
"""Where no analysis stands behind a number: a range of other growers' loops leaves no band of this one."""


def gauges(estimate: Estimate, ahead: Forecast) -> tuple[Gauge, ...]:
    """Shares and limited ions of the managed point: 14 days back, the days ahead, and when each leaves its band."""
    point = estimate.managed
    past = [day.state for day in estimate.course(point, PAST_DAYS + 1)][:-1]
    now = estimate.points()[point]
    course = [*past, now, *(day.points[point] for day in ahead.days)]
    leaving = {each.what: each for each in ahead.leaves_band if each.point == point}
    zone = estimate.site.timezone
    rows = []
    for what in (*SHARES, *LIMITED, "EC"):
        value = reading_of(now, what)
        if value is None or (what in LIMITED and value.band is None):
            continue
        numbers = tuple(each.value for state in course if (each := reading_of(state, what)) is not None)
        outside = _is_outside(value)
        leaves = in_words(leaving.get(what), len(ahead.days), zone, outside) if estimate.analyses else NOT_KNOWN
        rows.append(Gauge(what, unit_of(what), value, numbers, len(past), leaves))
    return tuple(rows)


def reading_of(state: PointState, what: str) -> Estimated | None:
    """The number called ``what`` at a point: a share, an ion, EC or pH."""
    if what == "EC":
        return state.ec
    if what == "pH":
        return state.ph
    if what.endswith(" share"):
        ion = state.ions.get(what.removesuffix(" share"))
        return None if ion is None else ion.share_pct
    ion = state.ions.get(what)
    return None if ion is None else ion.mmol_l


def unit_of(what: str) -> str:
    """Canonical unit of a number by its name."""
    if what == "pH":
        return ""
    if what == "EC":
        return "mS/cm"
    return "%" if what.endswith(" share") else "mmol/L"


def _is_outside(value: Estimated) -> bool:
    """Whether the number itself, as it is shown, is out of its band."""
    low, high = value.band or (None, None)
    return (low is not None and value.value < low) or (high is not None and value.value > high)


def in_words(leaving: LeavesBand | None, horizon: int, timezone: str = "UTC", outside: bool = False) -> str:
    """When something leaves its band, with its range, as an operator would say it; dates on the clock of the site.

    ``outside``: the number shown beside it is out. Where nothing says so, half of the members out is no certainty.

    >>> from fertui.estimate.passage import Days, LeavesBand
    >>> half_out = LeavesBand("drain", "K share", None, Days(0.0, 0.0, 3.0), None, 0.55)
    >>> in_words(half_out, 14), in_words(half_out, 14, outside=True)
    ('perhaps out now', 'out')
    """
    if leaving is None:
        return ""
    low, middle, high = leaving.days.low, leaving.days.value, leaving.days.high
    if middle == 0:
        if leaving.since is not None:
            return f"out since {_day(leaving.since, timezone)}"
        return "out" if outside else "perhaps out now"
    latest = f"over {horizon}" if high is None else f"{high:.0f}"
    if middle is None:
        return f"not in {horizon} days" if low is None else f"{low:.0f} to over {horizon} days"
    return f"in {middle:.0f} ({low or 0:.0f}-{latest}) days"


def sample_words(sample: SampleAdvice, horizon: int, timezone: str) -> str:
    """When to take the next sample, why, when its result can be there, and what one today would tell."""
    taken, known = (_day(each, timezone) for each in (sample.take_at, sample.result_at))
    shares = {what: pct for (_, what), pct in sample.narrows_pct.items() if what.endswith(" share")}
    what, most = max(shares.items(), key=lambda each: each[1], default=("", 0.0))
    tells = f"; one today would make the range of {what} in {horizon} days {most:.0f} % narrower" if most >= 1.0 else ""
    return f"{taken} ({sample.why}); its result can be there on {known}{tells}"


def _day(at: datetime, timezone: str) -> str:
    local = at.astimezone(ZoneInfo(timezone))
    return f"{local:%a} {local.day} {local:%b}"


def _newest(last: Glance) -> Seen | None:
    return max(last.readings.values(), key=lambda seen: seen.at, default=None)


def _latest_number(entries: Iterable[Entry], name: str) -> float | None:
    found = [number for entry in entries if (number := entry.number_of(name)) is not None]
    return found[-1] if found else None


def _awaited(entries: Sequence[Entry], at: datetime, timezone: str) -> tuple[str, ...]:
    """Samples sent lately whose analysis has not come; a sample is taken up to two days before it is sent."""
    recent = [entry for entry in entries if entry.kind == "sample" and entry.at >= at - AWAITED]
    sent = [entry for entry in recent if entry.text_of("status") in ("sent", "awaited")]
    came = [entry for entry in entries if entry.kind == "analysis"]
    came += [entry for entry in recent if entry.text_of("status") in ("arrived", "lost")]
    return tuple(
        f"sample of the {point_name(entry.point or 'loop')}, sent {_day(entry.at, timezone)}"
        for entry in sent
        if not any(result.point == entry.point and result.at >= entry.at - TAKEN_BEFORE for result in came)
    )


def _half_done(entries: Sequence[Entry], at: datetime, timezone: str) -> tuple[str, ...]:
    """Planned steps whose time has passed and that are not logged as done, or only partly."""
    steps = [step for step in open_plans(entries) if step.at <= at and step.state != "done"]
    return tuple(f"{step.state}: {plan_in_words(step, timezone)}" for step in steps)
