"""Drift: shares, ions, EC, pH over the days past on one time axis, with what was measured and what was done."""

from __future__ import annotations

from collections import Counter
from datetime import datetime, timedelta
from typing import TYPE_CHECKING, Any, ClassVar

from textual.binding import Binding

from fertui.site.points import point_name
from fertui.tui.chart import AXIS, MARK_LETTERS, Curve, column_of, draw_chart, nearest
from fertui.tui.figures import band_words, digits_for, estimated, number
from fertui.tui.ink import BLANK, Line, Span, beside, col, cut, filled, line, literal
from fertui.tui.snapshot import Ask, Snapshot
from fertui.tui.view import View, waiting

if TYPE_CHECKING:
    from fertui.workbench.drift import Drift, Series

PERIODS = (14, 28, 90)
ROUTINE_SHARE = 0.3
"""Part of the days from which something done is routine and would hide the other letters under the chart."""
WIDE = 112


class DriftView(View):
    """One quantity at a time, with a cursor that reads values."""

    TITLE = "Drift"
    HELP = (
        "One quantity over time. The dots are the estimate, the shade its 80 % range, the diamonds what was measured, "
        "the dashed lines the band. Letters under the chart are what was done: A analysis, D dose, B batch, R recipe, "
        "S set point, L bleed (let go), H acid, C crop, X disinfection, * several; what is done every other day "
        "or more is left out. "
        "Tab chooses the quantity, Left and Right move the cursor by a day, Up and Down by a week, Home and End "
        "to its ends, z changes the period. "
        "The line under the chart reads the values where the cursor stands."
    )
    BINDINGS: ClassVar[list[Any]] = [
        Binding("tab", "choose(1)", "quantity", id="drift.next", tooltip="The next quantity."),
        Binding(
            "shift+tab", "choose(-1)", "quantity before", show=False, id="drift.before", tooltip="The quantity before."
        ),
        Binding("left", "cursor(-1)", "day back", id="drift.left", tooltip="The cursor a day back."),
        Binding("up", "cursor(-7)", "week back", show=False, id="drift.up", tooltip="The cursor a week back."),
        Binding("down", "cursor(7)", "week on", show=False, id="drift.down", tooltip="The cursor a week on."),
        Binding("right", "cursor(1)", "a day on", show=False, id="drift.right", tooltip="The cursor a day on."),
        Binding("z", "period", "period", id="drift.period", tooltip="14, 28 or 90 days."),
        Binding("enter", "entries", "entries", id="drift.entries", tooltip="The entries of the day under the cursor."),
    ]

    def __init__(self) -> None:
        super().__init__()
        self.period = 28
        self.chosen = 0
        self.days_back = 0.0

    def _ask(self, snapshot: Snapshot) -> Ask:
        return Ask("drift", snapshot.loop, (("days", self.period),))

    def asks(self, snapshot: Snapshot) -> tuple[Ask, ...]:
        """The course of the period."""
        return (self._ask(snapshot),)

    def draw(self, snapshot: Snapshot, width: int) -> list[Line]:
        """Names of the quantities, chart, what the cursor reads."""
        drift: Drift | None = snapshot.get(self._ask(snapshot))
        if drift is None:
            return waiting(snapshot, self._ask(snapshot), "the days past", width)
        if not drift.series:
            return [
                BLANK,
                line(" ", Span("Nothing is known of these days yet: log a reading (r) or an analysis (a).", "watch")),
            ]
        self.chosen %= len(drift.series)
        series = in_unit(drift.series[self.chosen], snapshot.unit)
        moment = self.fertui.moment - timedelta(days=self.days_back)
        height = max(8, self.room.height - 3)
        left_width = 78 if width >= WIDE else width
        curve = _curve(series, drift, self.fertui.moment, self.period)
        start, end = curve.span
        fraction = max(0.0, min(1.0, (moment - start) / (end - start)))
        where, band = point_name(drift.point), band_words(series.band) or "none"
        about = f" in the {where}, {series.unit or 'units'}  band {band}  last {self.period} days"
        chart = [
            _names(drift, self.chosen, left_width),
            line(Span(f" {series.what}", "strong"), Span(about, "faint")),
            *draw_chart(curve, fraction, left_width, height),
            _reading(series, drift, moment, left_width),
        ]  # fmt: skip
        return beside(chart, _table(drift, snapshot.unit, start), left_width, 2) if width >= WIDE else chart

    def action_choose(self, step: int) -> None:
        """Another quantity."""
        self.chosen += step
        self.redraw()

    def action_cursor(self, days: int) -> None:
        """Move the cursor by days."""
        self.days_back = max(0.0, min(float(self.period), self.days_back - days))
        self.redraw()

    def action_top(self) -> None:
        """The cursor to the first day."""
        self.action_cursor(-self.period)

    def action_bottom(self) -> None:
        """The cursor to the last day."""
        self.action_cursor(self.period)

    def action_period(self) -> None:
        """The next period."""
        self.period = PERIODS[(PERIODS.index(self.period) + 1) % len(PERIODS)]
        self.action_cursor(0)
        self.fertui.work_out()

    async def action_entries(self) -> None:
        """The entries of the day under the cursor."""
        from fertui.tui.entry_list import EntryList

        day = self.fertui.local(self.fertui.moment - timedelta(days=self.days_back)).date()
        await self.fertui.open_page(EntryList.of_day(day, self.fertui.snapshot.loop))


def in_unit(series: Series, unit: str) -> Series:
    """An ion's course in the unit chosen; shares, EC and pH stay as they are."""
    if series.unit != "mmol/L":
        return series

    from fertui.estimate.points import Estimated
    from fertui.workbench.units import shown

    def to(value: float) -> float:
        return shown(series.what, value, unit)[0]

    band = None if series.band is None else (
        None if series.band[0] is None else to(series.band[0]), None if series.band[1] is None else to(series.band[1])
    )  # fmt: skip
    values = tuple(Estimated(to(v.value), to(v.low), to(v.high), band) for v in series.values)
    return series._replace(unit=shown(series.what, 1.0, unit)[1], band=band, values=values, measured=tuple((at,
    to(v)) for at, v in series.measured))  # fmt: skip


def _curve(series: Series, drift: Drift, now: datetime, days: int) -> Curve:
    counted = Counter(mark.kind for mark in drift.marks)
    routine = {kind for kind, times in counted.items() if times > days * ROUTINE_SHARE}
    marks = tuple((mark.at, MARK_LETTERS.get(mark.kind, "?")) for mark in drift.marks if mark.kind not in routine)
    values = tuple((v.value, v.low, v.high) for v in series.values)
    band = series.band or (None, None)
    return Curve(
        series.unit, series.times, values, series.measured, band, marks, start=now - timedelta(days=days), end=now
    )


def _names(drift: Drift, chosen: int, width: int) -> Line:
    """The quantities in one line, the chosen one marked, rolled so that it is in sight."""
    names = [series.what for series in drift.series]
    spans: list[Span] = []
    for index, name in enumerate(names):
        spans += [Span(name, "chosen" if index == chosen else "plain"), Span("  ")]
    row = line(" ", *spans)
    return row if sum(len(span.text) for span in row) <= width else line(" ", *spans[max(0, 2 * chosen - 8) :])


def _reading(series: Series, drift: Drift, moment: datetime, width: int) -> Line:
    """What stands where the cursor is: estimate with range, the nearest measurement, what was done that day."""
    words: list[str | Span] = [Span(f" {moment:%a %-d %b}  ", "strong")]
    if series.times:
        index = nearest(series.times, moment)
        value, reach = estimated(series.values[index], series.unit)
        words += [Span(value, "strong"), f" ({reach}) {series.unit}"]
    close = [(at, value) for at, value in series.measured if abs(at - moment) <= timedelta(hours=18)]
    if close:
        at, measured = min(close, key=lambda pair: abs(pair[0] - moment))
        words.append(Span(f"  ◆ {number(measured, digits_for(measured / 10))} measured {at:%a %H:%M}", "plain"))
    done = [f"{mark.kind} {literal(mark.text)}" for mark in drift.marks if abs(mark.at - moment) <= timedelta(hours=12)]
    row = line(*words)
    room = width - sum(len(span.text) for span in row) - 2
    return line(*row, Span("  " + cut("; ".join(done), room), "accent")) if done and room > 8 else row


def _table(drift: Drift, unit: str, begin: datetime) -> list[Line]:
    """Every quantity when the period began and now. It does not follow the cursor, whose keys must stay cheap on a
    thin line; the reading under the chart does."""
    rows: list[Line] = [
        line(Span("All quantities", "title")),
        line(
            col("", 9),
            col(f"{begin:%-d %b}", 6, "faint"),
            col("now", 6, "strong"),
            Span(" 80 % range", "faint"),
        ),
    ]
    for series in (in_unit(each, unit) for each in drift.series):
        if series.times:
            rows.append(_table_row(series, begin))
    return rows


def _table_row(series: Series, begin: datetime) -> Line:
    first = nearest(series.times, begin)
    known = abs(series.times[first] - begin) < timedelta(days=1)
    before = estimated(series.values[first], series.unit)[0] if known else "-"
    now, reach = estimated(series.values[-1], series.unit)
    row = line(
        col(series.what, 9, "plain", right=False),
        col(before, 6, "faint"),
        col(now, 6, "strong"),
        Span(f" {f'({reach})':<11}", "faint"),
        f" {series.unit}",
    )
    return filled(row, 40)


__all__ = ["AXIS", "DriftView", "column_of"]
