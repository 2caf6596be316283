"""How today reads."""

from __future__ import annotations

from typing import Any

from fertui.chemistry.names import IONS, MICRONUTRIENTS
from fertui.cli.views import as_json, words
from fertui.estimate.signs import SIGNS
from fertui.paper.page import columns, folded
from fertui.site.points import point_name
from fertui.workbench.glance import Seen
from fertui.workbench.today import NOT_KNOWN, Gauge, Today


def text(state: Today, timezone: str, unit: str) -> str:
    """State, gauges and what to look at, in plain lines of at most 80 characters where the words allow it."""
    lines = [_heading(state, timezone), ""]
    lines += _readings(state)
    if state.analyses_behind:
        lines += ["", *_gauges(state, unit)]
    else:
        lines += ["", *_wanted(state, unit)]
    if state.analyses_behind or state.layout == "known-feed":
        lines += ["", *_concentrations(state, unit)]
    lines.append("")
    lines += ["To look at"]
    lines += [line for each in state.watch for line in folded(each.text, f" {SIGNS[each.severity]:2} ")]
    lines += [line for each in state.half_done for line in folded(each, " !  ")]
    lines += [line for each in state.awaited for line in folded(f"awaited: {each}", " -  ")]
    lines += [] if state.watch or state.half_done or state.awaited else ["    nothing"]
    return "\n".join(lines)


def _heading(state: Today, timezone: str) -> str:
    crop = ", ".join(part for part in (state.crop, state.stage, state.medium) if part and part != "none")
    return f"{state.loop}: {crop}   as of {words.local(state.at, timezone)}"


def _readings(state: Today) -> list[str]:
    lines = []
    for point, seen in state.readings.items():
        numbers = [f"{name} {words.number(seen.values[name])}" for name in ("EC", "pH") if name in seen.values]
        if numbers:
            lines.append(f"{point_name(point, state.layout)}: {'  '.join(numbers)}  ({words.age(seen.at, state.at)})")
    if state.set_ec is not None:
        lines.append(
            f"set: EC {words.number(state.set_ec)} mS/cm" + (f"  pH {state.set_ph:.1f}" if state.set_ph else "")
        )
    if state.stock_days_left:
        left = "  ".join(f"{tank} {days:.1f} days" for tank, days in state.stock_days_left.items())
        lines.append(f"stock left: {left}")
    if state.last_analysis is not None:
        analyses = "analysis" if state.analyses_behind == 1 else "analyses"
        behind = f"{state.analyses_behind} {analyses} behind the estimate"
        lines.append(f"last analysis: {words.age(state.last_analysis.at, state.at)}; {behind}")
    return lines


def _gauges(state: Today, unit: str) -> list[str]:
    where = point_name(state.managed_point)
    rows = [(where, "now, 80 % range", "band", "leaves its band")]
    for gauge in state.gauges:
        name, scale, shown = _in_unit(gauge, unit)
        now = f"{words.ranged(gauge.now, scale, gauge.unit)} {shown}"
        rows.append((name, now, words.band(gauge.now.band, scale), gauge.leaves))
    return columns(rows)


def _in_unit(gauge: Gauge, unit: str) -> tuple[str, float, str]:
    """What a gauge is called in the unit shown, what its number is multiplied by, and its unit."""
    if gauge.unit != "mmol/L":
        return gauge.what, 1.0, gauge.unit
    return words.label(gauge.what, unit), words.factor(gauge.what, unit), unit


def _wanted(state: Today, unit: str) -> list[str]:
    """The bands alone, before an analysis says where the loop stands in them."""
    water = f"not known: the water {state.unanalysed_water!r} was never analysed"
    rows = [(point_name(state.managed_point), "now", "band")]
    for gauge in state.gauges:
        name, scale, shown = _in_unit(gauge, unit)
        of_water = gauge.what in ("Na", "Cl") and state.unanalysed_water is not None
        rows.append((name, water if of_water else NOT_KNOWN, f"{words.band(gauge.now.band, scale)} {shown}"))
    return columns(rows)


def _concentrations(state: Today, unit: str) -> list[str]:
    """Macro-ions and EC at every point; micronutrients below where an analysis brought them."""
    names = [name for name in state.points if not (name == "root_zone" and state.managed_point == "tank")]
    heads = [point_name(name) for name in names]
    rows = [(unit, *heads), *(_row(state, ion, unit, names) for ion in IONS)]
    rows.append(("EC mS/cm", *(words.ranged(state.points[name].ec) for name in names)))
    traces = [ion for ion in MICRONUTRIENTS if any(ion in point.ions for point in state.points.values())]
    if not traces:
        return columns(rows)
    trace_unit = unit if unit == "mg/L" else "umol/L"
    return [
        *columns(rows),
        "",
        *columns([(trace_unit, *heads), *(_row(state, ion, unit, names) for ion in traces)]),
    ]


def _row(state: Today, ion: str, unit: str, names: list[str]) -> tuple[str, ...]:
    scale = words.factor(ion, unit)
    found = [state.points[name].ions.get(ion) for name in names]
    cells = (words.ABSENT if each is None else words.ranged(each.mmol_l, scale) for each in found)
    return words.label(ion, unit), *cells


def document(state: Today) -> dict[str, Any]:
    """The contract of ``today --json``."""
    return {
        "schema": "fertui.today/1",
        "loop": state.loop,
        "layout": state.layout,
        "crop": state.crop,
        "stage": state.stage,
        "medium": state.medium,
        "at": state.at,
        "points": as_json.points(state.points),
        "last_analysis": _seen(state.last_analysis),
        "last_reading": _seen(state.last_reading),
        "analyses_behind": state.analyses_behind,
        "stock_days_left": state.stock_days_left,
        "watch": [{"code": each.code, "severity": each.severity, "text": each.text} for each in state.watch],
    }


def _seen(seen: Seen | None) -> dict[str, Any] | None:
    if seen is None:
        return None
    return {"number": seen.number, "at": seen.at, "point": seen.point, "by": seen.by, "values": seen.values}
