"""How an analysis and the course of past days read."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from fertui.chemistry.names import IONS
from fertui.cli.views import as_json, words
from fertui.estimate.signs import SIGNS
from fertui.paper.page import columns, folded
from fertui.site.points import point_name
from fertui.workbench.analysis import AnalysisRow, AnalysisView
from fertui.workbench.drift import Drift, Series

FOLLOWED = ("K share", "Ca share", "Mg share", "Na", "EC")
"""Columns of the days past, as many as 80 columns hold; ``--json`` holds all."""


def text(view: AnalysisView, timezone: str, unit: str) -> str:
    """The report side by side: drip, managed point, previous, normalised, target, deviation."""
    water = _water(view, timezone, unit)
    if view.managed is None and view.feed is None:
        none = f"{view.loop}: no analysis of its solution is logged yet. "
        return "\n".join(
            [*folded(f"{none}Take one with 'fertui record SITE analysis point=... K=... Ca=...'.", ""), *water]
        )
    lines = [f"{view.loop}: last analysis"]
    for name, seen in ((point_name("feed"), view.feed), (point_name(view.managed_point), view.managed)):
        if seen is not None:
            numbers = "  ".join(f"{key} {words.number(seen.values[key])}" for key in ("EC", "pH") if key in seen.values)
            lines.append(f"  {name}, {words.local(seen.at, timezone)}, entry {seen.number}: {numbers}")
    if view.method not in ("", "pore"):
        lines.append(f"  sampled by {view.method}; shown as the pore water it stands for, by the site's factor")
    if view.ec_reference is not None:
        lines.append(f"  normalised to a nutrient EC of {view.ec_reference:.1f} mS/cm; Na, NH4, HCO3 not scaled")
    lines += ["", *columns(_rows(view.rows, view.managed_point, unit), range(1, 7))]
    if any(row.feed is not None or row.managed is not None for row in view.micronutrients):
        lines += ["", *columns(_rows(view.micronutrients, view.managed_point, "umol/L"), range(1, 7))]
    for point, checks in view.checks.items():
        lines += ["", f"Checks of the {point_name(point)} analysis"]
        for check in checks:
            lines += folded(f"{check.what}: {_check(check)}", f"  {'ok' if check.passed else SIGNS['act']} ")
    lines += water
    return "\n".join([*lines, "", *folded(view.last_change, "")] if view.last_change else lines)


def _water(view: AnalysisView, timezone: str, unit: str) -> list[str]:
    """The make-up water as last analysed."""
    if view.water is None:
        return []
    seen = view.water
    numbers = [f"{name} {words.number(seen.values[name])}" for name in ("EC", "pH") if name in seen.values]
    numbers += [
        f"{words.label(ion, unit)} {words.number(seen.values[ion] * words.factor(ion, unit))}"
        for ion in IONS
        if ion in seen.values
    ]
    head = f"Make-up water {view.water_name}, {words.local(seen.at, timezone)}, entry {seen.number}, used from then on"
    return ["", *folded(f"{head}: {'  '.join(numbers)}  ({unit})", "")]


def _check(check: Any) -> str:
    return f"{check.found}: {check.remark} ({check.source})"


def _rows(rows: Sequence[AnalysisRow], managed: str, unit: str) -> list[tuple[str, ...]]:
    shown: list[tuple[str, ...]] = [
        (unit, point_name("feed"), point_name(managed), "previous", "normalised", "target", "off %", "in words")
    ]
    for row in rows:
        if row.feed is None and row.managed is None:
            continue
        scale = words.factor(row.ion, unit)
        numbers = [
            words.ABSENT if value is None else words.number(value * scale)
            for value in (row.feed, row.managed, row.previous, row.normalised, row.target)
        ]
        off = "" if row.deviation_pct is None else f"{row.deviation_pct:+.0f}"
        shown.append((words.label(row.ion, unit), *numbers, off, row.words))
    return shown


def document(view: AnalysisView) -> dict[str, Any]:
    """``analysis --json``."""
    return {"schema": "fertui.analysis/1", **as_json.plain(view)}


def drift_text(course: Drift, timezone: str) -> str:
    """The past days of the managed point as a table of daily values, then what was done and measured."""
    shown = [each for each in course.series if each.what in FOLLOWED]
    rows: list[tuple[str, ...]] = [
        (point_name(course.point), *(f"{each.what} {each.unit}".rstrip() for each in shown))
    ]
    times = shown[0].times if shown else ()
    for index, at in enumerate(times):
        cells = [_value_of(each, index) for each in shown]
        rows.append((words.local(at, timezone)[:10], *cells))
    lines = [f"{course.loop}: the past days", "", *columns(rows), "", "Done and measured"]
    for mark in course.marks:
        lines += folded(f"{words.local(mark.at, timezone)} {mark.kind}: {mark.text}", "  ")
    return "\n".join(lines)


def _value_of(series: Series, index: int) -> str:
    return words.ranged(series.values[index], unit=series.unit) if index < len(series.values) else words.ABSENT


def drift_document(course: Drift) -> dict[str, Any]:
    """``drift --json``."""
    return {"schema": "fertui.drift/1", **as_json.plain(course)}
