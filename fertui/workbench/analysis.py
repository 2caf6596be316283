"""Analysis: the laboratory's report against target, previous report and feed, in numbers and in words."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from datetime import datetime
from typing import TYPE_CHECKING, NamedTuple

from fertui.chemistry.names import CHARGES, IONS, MICRONUTRIENTS
from fertui.estimate.source_waters import is_of_water, make_up_of, water_of
from fertui.logbook.entries import Entry
from fertui.site.model import Composition, Loop, Site
from fertui.workbench.entering import check_analysis
from fertui.workbench.glance import Seen, managed_point, seen

if TYPE_CHECKING:
    from fertui.chemistry.verdicts import Check

NEVER_SCALED = frozenset({"Na", "HCO3", "NH4"})
REFERENCE_EC_BELOW_TARGET = 0.3
"""EC_ref = target EC - 0.3 mS/cm, the Na part of a target EC (Dutch booklet 2016, second-hand)."""


class AnalysisRow(NamedTuple):
    """One ion: feed, managed point, previous analysis, normalised value, target, deviation of the normalised [%]."""

    ion: str
    unit: str
    feed: float | None
    managed: float | None
    previous: float | None
    normalised: float | None
    target: float | None
    deviation_pct: float | None
    words: str


class AnalysisView(NamedTuple):
    """The last analysis of a loop, side by side; ``water``: that of its make-up water, where the logbook has one."""

    loop: str
    at: datetime
    managed_point: str
    feed: Seen | None
    managed: Seen | None
    previous: Seen | None
    method: str
    ec_reference: float | None
    rows: tuple[AnalysisRow, ...]
    micronutrients: tuple[AnalysisRow, ...]
    shares: Mapping[str, tuple[float | None, float | None]]
    checks: Mapping[str, tuple[Check, ...]]
    last_change: str
    water: Seen | None = None
    water_name: str = ""


def analysis(site: Site, loop: Loop, entries: Sequence[Entry], at: datetime) -> AnalysisView:
    """The last analysis of the managed point (drain where the root zone itself was never sampled) beside the feed's."""
    own = [_as_solution(entry, loop) for entry in entries if entry.loop == loop.name and entry.kind == "analysis"]
    point = _measured_point(loop, own)
    there = [entry for entry in own if entry.point == point]
    feed = _last([entry for entry in own if entry.point == "feed"])
    managed, previous = _last(there), _last(there[:-1])
    water = _last([entry for entry in entries if _is_make_up(site, loop, entry)])
    target = _target(site, loop, point)
    reference = _reference_ec(target)
    return AnalysisView(
        loop=loop.name,
        at=at,
        managed_point=point,
        feed=None if feed is None else seen(feed),
        managed=None if managed is None else seen(managed),
        previous=None if previous is None else seen(previous),
        method=managed.method if managed is not None else "",
        ec_reference=reference,
        rows=tuple(_row(ion, "mmol/L", feed, managed, previous, target.ions, reference) for ion in IONS),
        micronutrients=tuple(
            _row(ion, "umol/L", feed, managed, previous, target.micronutrients, None) for ion in MICRONUTRIENTS
        ),
        shares={ion: (share_of(managed, ion), share_of(previous, ion)) for ion in ("K", "Ca", "Mg")},
        checks={entry.point: check_analysis(entry) for entry in (feed, managed) if entry is not None},
        last_change=_last_change(loop, entries, previous, managed),
        water=None if water is None else seen(water),
        water_name=make_up_of(site, loop),
    )


def _is_make_up(site: Site, loop: Loop, entry: Entry) -> bool:
    """Whether it is an analysis, in use, of the water that tops up the loop."""
    used = is_of_water(entry) and not entry.doubtful
    return used and water_of(site, entry).lower() == make_up_of(site, loop).lower()


def _as_solution(entry: Entry, loop: Loop) -> Entry:
    """An extract by the site's factor as the pore water it stands for; without a factor (doubtful) as it is."""
    from fertui.logbook.sampling import as_pore_water

    return as_pore_water(entry, loop) if entry.method in loop.extract_factors else entry


def _measured_point(loop: Loop, analyses: Sequence[Entry]) -> str:
    sampled = {entry.point for entry in analyses}
    wanted = (managed_point(loop), "drain", "tank", "drain_store")
    return next((point for point in wanted if point in sampled), wanted[0])


def _last(entries: Sequence[Entry]) -> Entry | None:
    return entries[-1] if entries else None


def _target(site: Site, loop: Loop, point: str) -> Composition:
    from fertui.site.presets import target_of

    targets = target_of(site, loop)
    return targets.get(point) or targets.get(managed_point(loop)) or Composition()


def _reference_ec(target: Composition) -> float | None:
    return None if target.ec is None else target.ec - REFERENCE_EC_BELOW_TARGET


def _number(entry: Entry | None, name: str) -> float | None:
    return None if entry is None else entry.number_of(name)


def _nutrient_ec(entry: Entry | None) -> float | None:
    ec = _number(entry, "EC")
    return None if ec is None else ec - 0.1 * (_number(entry, "Na") or 0.0)


def _row(
    ion: str,
    unit: str,
    feed: Entry | None,
    managed: Entry | None,
    previous: Entry | None,
    target: Mapping[str, float],
    reference_ec: float | None,
) -> AnalysisRow:
    value, wanted, nutrient_ec = _number(managed, ion), target.get(ion), _nutrient_ec(managed)
    scaled = value
    if value is not None and reference_ec and nutrient_ec and nutrient_ec > 0 and ion not in NEVER_SCALED:
        scaled = value * reference_ec / nutrient_ec
    off = None if scaled is None or not wanted else 100.0 * (scaled / wanted - 1.0)
    return AnalysisRow(
        ion, unit, _number(feed, ion), value, _number(previous, ion), scaled, wanted, off, _in_words(ion, off)
    )


def _in_words(ion: str, off_pct: float | None) -> str:
    """Deviation in words, in the 25 and 50 % steps of the correction rule (Dutch booklet 2016, second-hand)."""
    if off_pct is None:
        return ""
    size, side = abs(off_pct), "high" if off_pct > 0 else "low"
    if size < 10:
        return "on target"
    if size < 25:
        return f"a little {side}"
    return side if size < 50 else f"very {side}"


def share_of(entry: Entry | None, ion: str) -> float | None:
    amounts = {each: _number(entry, each) for each in ("K", "Ca", "Mg")}
    if any(amount is None for amount in amounts.values()):
        return None
    charges = {each: CHARGES[each] * (amount or 0.0) for each, amount in amounts.items()}
    total = sum(charges.values())
    return 100.0 * charges[ion] / total if total > 0 else None


def _last_change(loop: Loop, entries: Sequence[Entry], previous: Entry | None, managed: Entry | None) -> str:
    """What the last recipe change did to K, Ca and Mg between the two analyses around it."""
    changes = [entry for entry in entries if entry.loop == loop.name and entry.kind == "recipe"]
    if not changes or managed is None or previous is None:
        return ""
    change = changes[-1]
    if not previous.at <= change.at <= managed.at:
        return f"The recipe of {change.at:%d %b} came {'after' if change.at > managed.at else 'before'} both analyses."
    moved = [
        f"{ion} {before:.1f} to {after:.1f}"
        for ion in ("K", "Ca", "Mg")
        if (before := previous.number_of(ion)) is not None and (after := managed.number_of(ion)) is not None
    ]
    return f"Since the recipe of {change.at:%d %b}: {', '.join(moved)} mmol/L."
