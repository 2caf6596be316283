"""Analysis: the laboratory's report against target, with the one before it and the feed beside it."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from fertui.chemistry.names import IONS
from fertui.site.points import point_name
from fertui.tui.figures import MARKS, age, amount, number, unit_and_species
from fertui.tui.ink import BLANK, Line, Span, beside, col, fit, line, literal, wrap
from fertui.tui.snapshot import Ask, Snapshot
from fertui.tui.view import View, waiting

if TYPE_CHECKING:
    from fertui.workbench.analysis import AnalysisRow
    from fertui.workbench.analysis import AnalysisView as Report
    from fertui.workbench.glance import Seen

WORD_INKS = {"on target": "good", "a little low": "plain", "a little high": "plain"}
"""Inks of the deviation in words; anything further off wants looking at."""
WIDE = 112
USUAL = 77
"""Columns from which every number of a row has room beside its words; below, the report before and the % give way."""
NUMBER_INKS = ("plain", "strong", "faint", "plain", "plain", "plain")


SHOWN_ALWAYS = ("charge balance", "EC calculated / EC measured")
"""Checks that show even when they are passed."""


class AnalysisView(View):
    """Thursday with the lab report."""

    TITLE = "Analysis"
    HELP = (
        "The last analysis of the managed point beside the feed's. 'normalised' is the value brought to the "
        "reference EC, "
        "so that a strong or weak solution is compared with the target fairly; Na, NH4 and HCO3 are never scaled. "
        "'off' is how far the normalised value is from the target. Below: shares of K, Ca and Mg, what the last "
        "change of recipe "
        "did, micronutrients, and whether the report holds together (charge balance, EC against the ions). "
        "a logs a new report, p shows the recipe that follows from where the loop is now."
    )

    def asks(self, snapshot: Snapshot) -> tuple[Ask, ...]:
        """The last report."""
        return (Ask("analysis", snapshot.loop),)

    def draw(self, snapshot: Snapshot, width: int) -> list[Line]:
        """The report, or how to log one."""
        ask = Ask("analysis", snapshot.loop)
        report: Report | None = snapshot.get(ask)
        if report is None:
            return waiting(snapshot, ask, "the last analysis", width)
        if report.managed is None and report.feed is None:
            none = [BLANK, line(" ", Span("No analysis of this loop's solution is logged.", "watch"), " a logs one.")]
            return [*none, BLANK, *_water(report, snapshot.unit, width)]
        room = min(width, 80)
        left = 79 if width >= WIDE else width
        table = [*_heading(report, snapshot.unit, room), *_rows(report.rows, snapshot.unit, room)]
        below = [*_shares(report, room), *_said(report, left), BLANK, *_checks(report, left)]
        below += [line(), *water] if (water := _water(report, snapshot.unit, left)) else []
        micros = _micronutrients(report.micronutrients, snapshot.unit, room)
        if width >= WIDE:
            return beside([*table, BLANK, *below], micros, 80, 3)
        return [*table, BLANK, *below, BLANK, *micros]


def _widths(room: int) -> tuple[int, ...]:
    """Columns of the five numbers and of what is off target; 0 leaves one out."""
    return (7, 10, 8, 11, 8, 8) if room >= USUAL else (7, 10, 0, 11, 7, 0)


def _heading(report: Report, unit: str, room: int) -> list[Line]:
    managed = point_name(report.managed_point)
    method = f" ({literal(report.method.replace('_', ' '))})" if report.method else ""
    feed = f"; drip of {_day(report.feed)}" if report.feed else "; no analysis of the drip"
    reference = "" if report.ec_reference is None else f", normalised to EC {number(report.ec_reference)} mS/cm"
    words = f"{managed} of {_day(report.managed)}{_old(report)}{method}{feed}{reference}"
    return [*(line(Span(f" {text}", "title")) for text in wrap(words, room - 2)), _heads(unit, managed, room)]


def _heads(first: str, managed: str, room: int, ink: str = "faint") -> Line:
    heads = zip(("drip", managed, "before", "normalised", "target", "off"), _widths(room), strict=True)
    return line(Span(f" {fit(first, 8)}", ink), *(col(head, size, "faint") for head, size in heads if size))


def _day(seen: Seen | None) -> str:
    return "no date" if seen is None else f"{seen.at:%a %-d %b}"


def _old(report: Report) -> str:
    """How old the report is, where that is more than two weeks."""
    if report.managed is None or (report.at - report.managed.at).days <= 14:
        return ""
    return f", {age(report.managed.at, report.at)} old"


def _rows(rows: Sequence[AnalysisRow], unit: str, room: int) -> list[Line]:
    return [_row(row, unit, room) for row in rows if row.feed is not None or row.managed is not None]


def _row(row: AnalysisRow, unit: str, room: int) -> Line:
    species, shown = _in_unit(row, unit)
    off = "" if row.deviation_pct is None else f"{row.deviation_pct:+.0f} %"
    ink = WORD_INKS.get(row.words, "watch" if row.words else "faint")
    mark = MARKS["good" if ink == "good" else "watch"] if row.words and ink != "plain" else " "
    inks = (*NUMBER_INKS[:-1], ink)
    cells = [col(text, size, its) for text, size, its in zip((*shown, off), _widths(room), inks, strict=True) if size]
    return line(Span(f" {fit(species, 8)}"), *cells, Span(f" {mark} {row.words}", ink))


def _in_unit(row: AnalysisRow, unit: str) -> tuple[str, tuple[str, ...]]:
    """Species and the five numbers of a row. HCO3, alkalinity, holds one charge: its mmol/L and meq/L are one."""
    from fertui.workbench.units import shown

    species = unit_and_species(shown(row.ion, 1.0, unit)[1], row.ion)[1]
    values = (row.feed, row.managed, row.previous, row.normalised, row.target)
    return species, tuple("-" if value is None else amount(shown(row.ion, value, unit)[0]) for value in values)


def _shares(report: Report, room: int) -> list[Line]:
    parts: list[str | Span] = [Span(" share of K+Ca+Mg  ", "title")]
    for ion, (now, before) in report.shares.items():
        if now is not None:
            was = "" if before is None or room < USUAL else f" (was {before:.0f})"
            parts += [f" {ion} ", Span(f"{now:.0f} %", "strong"), Span(was + " ", "faint")]
    return [line(*parts)] if len(parts) > 1 else []


def _said(report: Report, width: int) -> list[Line]:
    words = literal(report.last_change) or "No recipe change lies between the last two analyses."
    return [line(Span(f" {text}", "plain" if report.last_change else "faint")) for text in wrap(words, width - 2)]


def _checks(report: Report, width: int) -> list[Line]:
    rows: list[Line] = [line(Span(" does the report hold together", "title"))]
    for point, checks in report.checks.items():
        for check in (each for each in checks if not each.passed or each.what in SHOWN_ALWAYS):
            ink = "good" if check.passed else "act"
            mark = MARKS["good"] if check.passed else MARKS["act"]
            text = f"{point_name(point)}: {check.what} {check.found}; {check.remark}"
            first, *more = wrap(literal(text), width - 6)
            rows += [line(Span(f" {mark:2} ", ink), first), *(line("    ", text) for text in more)]
    return rows if len(rows) > 1 else []


def _water(report: Report, unit: str, width: int) -> list[Line]:
    """The make-up water as last analysed: what the model, the plan and the acid count with from then on."""
    if report.water is None:
        return []
    from fertui.workbench.units import shown

    values = report.water.values
    numbers = [f"EC {number(values['EC'], 2)} mS/cm"] if "EC" in values else []
    numbers += [f"pH {number(values['pH'])}"] if "pH" in values else []
    for ion in (each for each in IONS if each in values):
        value, label = shown(ion, values[ion], unit)
        numbers.append(f"{unit_and_species(label, ion)[1]} {amount(value)}")
    title = f" make-up water {literal(report.water_name)} of {_day(report.water)}, {unit}, used from then on"
    return [line(Span(title, "title")), *(line(f" {text}") for text in wrap(", ".join(numbers), width - 2))]


def _micronutrients(rows: Sequence[AnalysisRow], unit: str, room: int) -> list[Line]:
    given = [row for row in rows if row.feed is not None or row.managed is not None]
    if not given:
        return [line(Span(" micronutrients", "title"), Span("  none in this report", "faint"))]
    return [_heads("umol/L" if unit != "mg/L" else unit, "now", room, "title"), *_rows(given, unit, room)]
