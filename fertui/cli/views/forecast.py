"""How the days ahead and the record of past forecasts read."""

from __future__ import annotations

from typing import Any

from fertui.cli.views import as_json, words
from fertui.estimate.forecast import Forecast, LeavesBand
from fertui.estimate.hindcast import Hindcast
from fertui.estimate.sampling import SampleAdvice
from fertui.paper.page import columns, folded
from fertui.site.points import point_name
from fertui.workbench.today import in_words, reading_of, sample_words, unit_of

SHOWN = ("K share", "Ca share", "Mg share", "Na", "EC")
"""Columns of the days ahead, as many as 80 columns hold; the rest speaks under "leaves its band"."""


def text(ahead: Forecast, sample: SampleAdvice, loop: str, managed: str, timezone: str, unit: str) -> str:
    """Every second day of the managed point with its 80 % range, what leaves its band, the next sample, assumptions."""
    rows = [(point_name(managed), *(f"{what} {_unit(what, unit)}".rstrip() for what in SHOWN))]
    for day in ahead.days[1::2] if len(ahead.days) > 7 else ahead.days:
        cells = []
        for what in SHOWN:
            value = reading_of(day.points[managed], what)
            scale = words.factor(what, unit) if unit_of(what) == "mmol/L" else 1.0
            cells.append(words.ABSENT if value is None else words.ranged(value, scale, unit_of(what)))
        rows.append((words.local(day.at, timezone)[:10], *cells))
    lines = [f"{loop}, {len(ahead.days)} days ahead ({_inputs(ahead)}), 80 % ranges", "", *columns(rows), ""]
    lines += ["Leaves its band"]
    same = {"root_zone"} if managed == "tank" else {"drain"}
    shown = [each for each in ahead.leaves_band if each.point not in same]
    if ahead.analyses:
        lines += [f"  {_leaves(each, len(ahead.days), timezone)}" for each in shown] or ["  nothing within these days"]
    else:
        lines.append("  not known yet: no analysis stands behind these ranges; take a sample first")
    lines += ["", "Next sample", *folded(sample_words(sample, len(ahead.days), timezone), "  ")]
    lines += ["", "Assumed", *(line for each in ahead.assumed for line in folded(each, "  "))]
    return "\n".join(lines)


def _unit(what: str, unit: str) -> str:
    return unit if unit_of(what) == "mmol/L" else unit_of(what)


def _inputs(ahead: Forecast) -> str:
    return {"plan": "as planned", "routine": "routine carried on", "what-if": "what if"}[ahead.inputs]


def _leaves(each: LeavesBand, horizon: int, timezone: str) -> str:
    chance = "" if each.since is not None else f", chance {100 * each.probability:.0f} %"
    return f"{point_name(each.point)} {each.what}: {in_words(each, horizon, timezone)}{chance}"


def document(ahead: Forecast, sample: SampleAdvice, loop: str) -> dict[str, Any]:
    """The contract of ``forecast --json``."""
    return {
        "schema": "fertui.forecast/1",
        "loop": loop,
        "at": ahead.at,
        "inputs": ahead.inputs,
        "days": [{"at": day.at, "points": as_json.points(day.points)} for day in ahead.days],
        "leaves_band": [
            {
                "point": each.point,
                "what": each.what,
                "at": each.at,
                "days": {"value": each.days.value, "low": each.days.low, "high": each.days.high},
                "since": each.since,
                "probability": each.probability,
            }
            for each in ahead.leaves_band
        ],
        "next_sample": {
            "take_at": sample.take_at,
            "result_at": sample.result_at,
            "why": sample.why,
            "narrows": [
                {"point": point, "what": what, "by_pct": pct} for (point, what), pct in sample.narrows_pct.items()
            ],
        },
        "assumed": list(ahead.assumed),
    }


ROW_KEYS = {
    "measured_mmol_l": "measured_mmol_L",
    "predicted_mmol_l": "predicted_mmol_L",
    "no_change_mmol_l": "no_change_mmol_L",
}


def record_document(record: Hindcast, loop: str) -> dict[str, Any]:
    """The contract of ``hindcast --json``."""
    rows = [{ROW_KEYS.get(key, key): value for key, value in as_json.plain(row).items()} for row in record.rows]
    return {
        "schema": "fertui.hindcast/1",
        "loop": loop,
        "inputs": record.inputs,
        "rows": rows,
        "summary": as_json.plain(record.summary),
    }


def record_text(record: Hindcast, loop: str, timezone: str) -> str:
    """The record: what was forecast, what was found, and whether it beat 'no change'."""
    lines = [f"{loop}: past forecasts, inputs as {record.inputs}", "same: what no change at all would have said", ""]
    rows = [("taken", "point", "ion", "found", "forecast, 80 %", "same", "share", "foreseen")]
    for row in record.rows:
        if row.ion not in ("K", "Ca", "Mg", "Na", "NO3") or row.cold_start:
            continue
        share = "" if row.predicted_share_pct is None else f"{row.predicted_share_pct:.0f} %"
        found = "" if row.measured_share_pct is None else f"{row.measured_share_pct:.0f} %"
        forecast = f"{words.number(row.predicted_mmol_l)} ({words.number(row.low)}-{words.number(row.high)})"
        mark = "?" if row.doubtful else ""
        rows.append(
            (
                words.local(row.at, timezone)[:10] + mark,
                point_name(row.point),
                row.ion,
                words.number(row.measured_mmol_l),
                forecast,
                words.number(row.no_change_mmol_l),
                found,
                share,
            )
        )
    return "\n".join([*lines, *columns(rows), "", *folded(record.summary.words, "")])
