"""Shares, ions, EC and pH against the band or limit of their point, now and in the days ahead."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import datetime
from typing import TYPE_CHECKING, NamedTuple

from fertui.chemistry.names import MICRONUTRIENTS
from fertui.estimate.notices.feeding import near_set_point
from fertui.estimate.notices.look import Look
from fertui.estimate.notices.notice import ACT, Notice, allowed, chance_out, is_out, ranged, severity_of
from fertui.estimate.points import Band, Estimated, PointState
from fertui.site.points import at_point
from fertui.site.presets import limits_of

if TYPE_CHECKING:
    from fertui.estimate.forecast import LeavesBand

SHARED = ("K", "Ca", "Mg")
TIDY_FROM = 0.05
"""Shortest time ahead that is worth a number [d]."""


class Standing(NamedTuple):
    """One number against its band: out now, or with what probability out within the days ahead."""

    what: str
    unit: str
    point: str
    known: Estimated
    band: Band
    leaving: LeavesBand | None

    @property
    def out(self) -> bool:
        """Whether it is out already."""
        return is_out(self.known, self.band)

    @property
    def chance(self) -> float:
        """Probability of being out within the days ahead; now, where no forecast is known."""
        return self.leaving.probability if self.leaving is not None else chance_out(self.known, self.band)

    @property
    def severity(self) -> str:
        """act, watch, or '' for nothing to say."""
        return severity_of(self.chance, self.out)

    @property
    def since(self) -> datetime | None:
        """Since when it is out, where that is known."""
        return self.leaving.since if self.leaving is not None else None

    @property
    def subject(self) -> str:
        """What it is about and where."""
        return f"{self.what} {at_point(self.point)}"


def shares(look: Look) -> Iterator[Notice]:
    """K, Ca and Mg shares of the point the loop is managed by: the headline, EC told beside it.

    Nothing before the first analysis: what stands there then is other growers' loops, and no alarm.
    """
    if not look.estimate.analyses:
        return
    state = look.points[look.estimate.managed]
    for ion in SHARED:
        known = state.ions[ion].share_pct
        stand = _standing(look, look.estimate.managed, f"{ion} share", "%", known)
        if stand is None or not stand.severity:
            continue
        if stand.out:
            yield Notice("share_out", ACT, f"{_out(look, stand)} {near_set_point(look)}".rstrip(), "p")
        else:
            yield Notice("share_leaving", stand.severity, _leaving(stand, look), "p")


def limits(look: Look) -> Iterator[Notice]:
    """Everything else that has a band or limit: Na and NH4 in their own words, then Cl, micronutrients, EC and pH.

    Before the first analysis only pH, which is measured.
    """
    for point, state in look.points.items():
        if point != look.estimate.managed and _same_water(look, point):
            continue
        for what, unit, known in _numbers(state):
            if what != "pH" and not look.estimate.analyses:
                continue
            stand = _standing(look, point, what, unit, known)
            if stand is not None and stand.severity and _is_meant(look, point, what):
                yield _limit(look, stand)


def _limit(look: Look, stand: Standing) -> Notice:
    text = _out(look, stand) if stand.out else _leaving(stand, look)
    severity = ACT if stand.out else stand.severity
    if stand.what == "Na":
        return Notice("sodium", severity, f"{text} {_na_advice(look, stand)}", "p" if stand.out else "5")
    if stand.what == "NH4" and stand.band[1] is not None and stand.known.value > 0.5 * stand.band[1]:
        return Notice("ammonium", severity, f"{text} Cut its source first (calcium nitrate holds some), look at air "
                                            "at the roots; no acid.", "p")  # fmt: skip
    code = "limit_over" if stand.out else "limit_leaving"
    return Notice(code, severity, text, "p" if stand.out else "5")


def _na_advice(look: Look, stand: Standing) -> str:
    """No salt takes sodium out; whose limit it is goes with it, for it is the grower's to set."""
    source = limits_of(look.site, look.loop, stand.point).get("Na")
    whose = f" Limit from: {source.source.split(';')[0].strip()}." if source is not None and source.source else ""
    return f"No salt takes it out, only better water or a bleed.{whose}"


def _numbers(state: PointState) -> Iterator[tuple[str, str, Estimated | None]]:
    yield "EC", "mS/cm", state.ec
    yield "pH", "", state.ph
    for name, ion in state.ions.items():
        yield name, "umol/L" if name in MICRONUTRIENTS else "mmol/L", ion.mmol_l


def _standing(look: Look, point: str, what: str, unit: str, known: Estimated | None) -> Standing | None:
    if known is None or known.band is None or known.band == (None, None):
        return None
    rows = look.ahead.leaves_band if look.ahead is not None else ()
    leaving = next((row for row in rows if row.point == point and row.what == what), None)
    return Standing(what, unit, point, known, known.band, leaving)


def _same_water(look: Look, point: str) -> bool:
    """Whether a point holds the water of the managed one, so that saying it twice would help nobody."""
    return point == "drain" or (point == "root_zone" and look.estimate.managed == "tank")


def _is_meant(look: Look, point: str, what: str) -> bool:
    """The managed point counts whole; of others a limit, or a band the grower wrote: presets are a recipe's aims."""
    own = {**look.site.bands.get(point, {}), **look.loop.bands.get(point, {})}
    return point == look.estimate.managed or what in own or what in limits_of(look.site, look.loop, point)


def _out(look: Look, stand: Standing) -> str:
    since = f", since {look.day(stand.since)}" if stand.since is not None else ""
    return f"{stand.subject} is {ranged(stand.known, stand.unit)}, {allowed(stand.band, stand.unit)}{since}."


def _leaving(stand: Standing, look: Look) -> str:
    chance = f"{100 * stand.chance:.0f} % chance"
    edge = allowed(stand.band, stand.unit)
    head = f"{stand.subject} is {ranged(stand.known, stand.unit)}"
    if stand.leaving is None or look.ahead is None:
        return f"{head}; {chance} that it is out already ({edge})."
    horizon = len(look.ahead.days)
    middle, low, high = stand.leaving.days.value, stand.leaving.days.low, stand.leaving.days.high
    if middle is None or middle < TIDY_FROM:
        return f"{head}; {chance} of leaving its {edge} within {horizon} days."
    latest = f"{high:.0f}" if high is not None else f"over {horizon}"
    return f"{head}; leaves its {edge} in {middle:.0f} ({low or 0:.0f}-{latest}) days, {chance}."
