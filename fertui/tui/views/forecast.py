"""Forecast: range and band of the days ahead, what-if beside it, and the record of past forecasts under it."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, ClassVar

from textual.binding import Binding

from fertui.site.points import point_name
from fertui.tui.chart import Curve, draw_chart
from fertui.tui.figures import LEAVING, MARKS, OUT, band_words, digits_for, estimated, short_leaving
from fertui.tui.ink import BLANK, Line, Span, beside, col, line, literal, wrap
from fertui.tui.snapshot import Ask, Snapshot
from fertui.tui.supposing import WHAT_IFS
from fertui.tui.view import View, waiting

if TYPE_CHECKING:
    from fertui.estimate.forecast import Forecast, LeavesBand
    from fertui.estimate.points import Estimated, PointState
    from fertui.estimate.sampling import SampleAdvice

HORIZONS = (7, 14, 28)
USUAL = 76
"""Columns from which the first day has room beside the last."""
WIDE = 112
CHART_ROWS = 14


class ForecastView(View):
    """The days ahead as a table and a chart; supposing something shows old and new side by side."""

    TITLE = "Forecast"
    HELP = (
        "What the ions of the managed point do in the days ahead if all goes on as logged, or as planned where a "
        "plan is entered. "
        "Every number has its 80 % range. 'leaves' is when a value leaves its band: middle and 80 % range of the "
        "forecasts; "
        "the percentage is how likely it is out at any time until the horizon. "
        "l c s f k o suppose other light, crop water, source water, feed EC, bleed or recipe: then old and new "
        "stand side by side, "
        "and Backspace takes the supposition back. Up and Down choose a row, Enter shows it in the chart, j "
        "changes the point. "
        "g shows the record: what past forecasts said and what the laboratory then found, beside 'no change'."
    )
    BINDINGS: ClassVar[list[Any]] = [
        Binding("up", "up", "row", id="forecast.up", tooltip="The row above, shown in the chart."),
        Binding(
            "down", "down", "next row", show=False, id="forecast.down", tooltip="The row below, shown in the chart."
        ),
        Binding("z", "horizon", "horizon", id="forecast.horizon", tooltip="7, 14 or 28 days ahead."),
        Binding(
            "j", "point", "point", show=False, id="forecast.point", tooltip="The next point: root zone, drip, drain."
        ),
        Binding("l", "suppose('light')", "light", id="forecast.light", tooltip="What if the light is ...?"),
        Binding("c", "suppose('crop')", "crop water", id="forecast.crop", tooltip="What if the crop takes ...?"),
        Binding(
            "s",
            "suppose('source')",
            "source",
            show=False,
            id="forecast.source",
            tooltip="What if the water is another?",
        ),
        Binding("f", "suppose('feed')", "feed EC", id="forecast.feed", tooltip="What if the feed EC is ...?"),
        Binding(
            "k",
            "suppose('bleed')",
            "bleed",
            show=False,
            id="forecast.bleed",
            tooltip="What if so much is let go a day?",
        ),
        Binding(
            "o", "suppose('recipe')", "recipe", show=False, id="forecast.recipe", tooltip="What if the recipe is ...?"
        ),
        Binding(
            "backspace", "forget", "as logged", show=False, id="forecast.forget", tooltip="Take all suppositions back."
        ),
        Binding("g", "record", "record", id="forecast.record", tooltip="Past forecasts against what was then found."),
    ]

    def __init__(self) -> None:
        super().__init__()
        self.horizon, self.row, self.charted = 14, 0, 0
        self.point, self.point_number = "", 0
        self.supposed: dict[str, str] = {}

    def _ask(self, snapshot: Snapshot, supposed: bool = False) -> Ask:
        scenario = tuple(sorted(self.supposed.items())) if supposed else ()
        return Ask(
            "forecast", snapshot.loop, (("days", self.horizon), *((("scenario", scenario),) if scenario else ()))
        )

    def asks(self, snapshot: Snapshot) -> tuple[Ask, ...]:
        """The forecast, the one supposed, and when to take the next sample."""
        base = self._ask(snapshot)
        supposed = (self._ask(snapshot, supposed=True),) if self.supposed else ()
        return base, *supposed, self._sample_ask(snapshot)

    def _sample_ask(self, snapshot: Snapshot) -> Ask:
        return Ask("next_sample", snapshot.loop, (("days", self.horizon),))

    def draw(self, snapshot: Snapshot, width: int) -> list[Line]:
        """Table, chart of the chosen row, what is assumed."""
        ahead: Forecast | None = snapshot.get(self._ask(snapshot))
        if ahead is None:
            return waiting(snapshot, self._ask(snapshot), "the days ahead", width)
        rows = self._of_point(ahead, snapshot)
        if not rows:
            return [BLANK, line(" ", Span("Nothing can be said of the days ahead yet: log an analysis (a).", "watch"))]
        self.row = max(0, min(self.row, len(rows) - 1))
        other_ask = self._ask(snapshot, supposed=True)
        other: Forecast | None = snapshot.get(other_ask) if self.supposed else None
        table = [*self._title(ahead, width), *self._table(rows, ahead, other, snapshot.unit, min(width, 80))]
        if self.supposed and other is None:
            table += waiting(snapshot, other_ask, "what was supposed", min(width, 80))[1:]
        chart = _chart(
            rows[min(self.charted, len(rows) - 1)], ahead, other, snapshot.unit, width - 80 if width >= WIDE else width
        )
        sample: SampleAdvice | None = snapshot.get(self._sample_ask(snapshot))
        rest = [*self._supposed_words(), *_assumed(ahead, min(width, 80))]
        rest += _next_sample(sample, snapshot, self.horizon, min(width, 80))  # last: it comes later, and moves nothing
        return beside([*table, BLANK, *rest], chart, 80, 1) if width >= WIDE else [*table, BLANK, *chart, *rest]

    def _of_point(self, ahead: Forecast, snapshot: Snapshot) -> list[LeavesBand]:
        """What may leave a band at the point shown, the managed point first."""
        from fertui.workbench.glance import managed_point

        points = list(dict.fromkeys(each.point for each in ahead.leaves_band))
        managed = managed_point(snapshot.site.loop(snapshot.loop))
        points.sort(key=lambda point: point != managed)
        self.point = points[self.point_number % len(points)] if points else ""
        return [each for each in ahead.leaves_band if each.point == self.point]

    def _title(self, ahead: Forecast, width: int) -> list[Line]:
        inputs = {"plan": "with the plan entered", "routine": "as logged lately"}.get(ahead.inputs, ahead.inputs)
        title = f" {point_name(self.point)}, {self.horizon} days ahead, {inputs}"
        note = "   80 % range in brackets"
        if len(title + note) > width:
            return [line(Span(title, "title")), line(Span(note[2:], "faint"))]
        return [line(Span(title, "title"), Span(note, "faint"))]

    def _table(
        self, rows: list[LeavesBand], ahead: Forecast, other: Forecast | None, unit: str, width: int
    ) -> list[Line]:
        heads = ("in 1 day", f"in {self.horizon} days")
        heads = heads if other is None else (f"in {self.horizon} d, as is", "as supposed")
        leaving_head = Span("  leaves its band, chance", "faint")
        shown = heads if width >= USUAL else heads[1:]
        head = line(col("", 15), *(col(text, 17, "faint") for text in shown), leaving_head)
        table = [head]
        supposed = {} if other is None else {(each.point, each.what): each for each in other.leaves_band}
        for index, each in enumerate(rows):
            last = ahead.days[-1].points[each.point]
            if other is None:
                left, right, leaving = (
                    _value(ahead.days[0].points[each.point], each.what),
                    _value(last, each.what),
                    each,
                )
            else:
                left, right = _value(last, each.what), _value(other.days[-1].points[each.point], each.what)
                leaving = supposed.get((each.point, each.what), each)
            table.append(_row(each, left, right, leaving, unit, self.horizon, index == self.row, width >= USUAL))
        return table

    def _supposed_words(self) -> list[Line]:
        if not self.supposed:
            return []
        words = [
            f"{WHAT_IFS[name].words} {literal(text)} {WHAT_IFS[name].unit}".rstrip()
            for name, text in self.supposed.items()
        ]
        return [
            line(
                Span(" supposed: ", "watch"),
                ", ".join(words),
                Span("   + in the chart; Backspace takes it back", "faint"),
            )
        ]

    def action_up(self) -> None:
        """The row above."""
        self._choose(-1)

    def action_down(self) -> None:
        """The row below."""
        self._choose(1)

    def _choose(self, step: int) -> None:
        self.row = max(0, self.row + step)
        self.redraw()

    def action_chart(self) -> None:
        """Show the chosen row in the chart."""
        self.charted = self.row
        self.redraw()

    def action_horizon(self) -> None:
        """The next horizon."""
        self.horizon = HORIZONS[(HORIZONS.index(self.horizon) + 1) % len(HORIZONS)]
        self._again()

    def _again(self) -> None:
        self.redraw()
        self.fertui.work_out()

    def action_point(self) -> None:
        """The next point."""
        self.point_number += 1
        self.redraw()

    async def action_suppose(self, name: str) -> None:
        """Ask for a supposition."""
        what = WHAT_IFS[name]

        def supposed(text: str) -> None:
            self.supposed.pop(name, None)
            if text:
                self.supposed[name] = text
            self._again()

        if name == "source":
            from fertui.tui.chooser import Chooser, Option

            waters = [Option(water.name) for water in self.fertui.snapshot.site.waters]
            await self.fertui.open_page(Chooser("What if the make-up water is ...", waters, supposed))
        elif name == "recipe":
            self.fertui.ask("What if the recipe is (K=8 Ca=5 ...), mmol/L:", supposed, self.supposed.get(name, ""))
        else:
            self.fertui.ask(f"What if {what.words} is, {what.unit}:", supposed, self.supposed.get(name, ""))

    def action_forget(self) -> None:
        """Take all suppositions back."""
        self.supposed = {}
        self._again()

    async def action_record(self) -> None:
        """Open the record."""
        from fertui.tui.record_page import RecordPage

        await self.fertui.open_page(RecordPage())


def _value(state: PointState, what: str) -> Estimated | None:
    from fertui.workbench.today import reading_of

    return reading_of(state, what)


def _in_unit(value: Estimated | None, what: str, unit: str) -> tuple[Estimated | None, str]:
    """A value in the unit chosen, with that unit."""

    from fertui.workbench.today import unit_of
    from fertui.workbench.units import shown

    own = unit_of(what)
    if value is None or own != "mmol/L":
        return value, own
    band = (
        None
        if value.band is None
        else tuple(None if edge is None else shown(what, edge, unit)[0] for edge in value.band)
    )
    numbers = {name: shown(what, getattr(value, name), unit)[0] for name in ("value", "low", "high")}
    return value._replace(band=band, **numbers), shown(what, 1.0, unit)[1]  # type: ignore[arg-type]


def _words(value: Estimated | None, unit: str) -> str:
    if value is None:
        return "-"
    middle, reach = estimated(value, unit)
    return f"{middle} ({reach})"


def _row(
    each: LeavesBand,
    left: Estimated | None,
    right: Estimated | None,
    leaving: LeavesBand,
    unit: str,
    days: int,
    chosen: bool,
    roomy: bool,
) -> Line:
    """What may leave its band, first and last day, when; without the first day and shorter where there is no room."""
    from fertui.workbench.today import in_words

    left, name = _in_unit(left, each.what, unit)
    right, _ = _in_unit(right, each.what, unit)
    out, probability = leaving.since is not None, leaving.probability
    ink = OUT if out else LEAVING if probability >= 0.1 else "good"
    likely = "" if out or probability <= 0 else f", {100 * probability:.0f} %"
    label = f" {each.what} {name}".replace(" share %", " share, %")
    words = short_leaving(in_words(leaving, days))
    return line(
        col(label, 15, "chosen" if chosen else "strong", right=False),
        *([col(_words(left, name), 17)] if roomy else []),
        col(_words(right, name), 17),
        Span(f"  {MARKS[ink]:2} {words}{likely}", ink if ink != "good" else "plain"),
    )  # fmt: skip


def _chart(each: LeavesBand, ahead: Forecast, other: Forecast | None, unit: str, width: int) -> list[Line]:
    """The chosen row over the days ahead; what was supposed as crosses."""
    found = [(day.at, _in_unit(_value(day.points[each.point], each.what), each.what, unit)[0]) for day in ahead.days]
    days = [(at, value) for at, value in found if value is not None]
    if not days:
        return []
    values = tuple((value.value, value.low, value.high) for _, value in days)
    supposed: tuple[float, ...] = ()
    if other is not None:
        again = [_in_unit(_value(day.points[each.point], each.what), each.what, unit)[0] for day in other.days]
        supposed = tuple(value.value for value in again if value is not None)
    band = days[0][1].band or (None, None)
    curve = Curve(
        "", tuple(at for at, _ in days), values, band=band, other=supposed if len(supposed) == len(days) else ()
    )
    name = _in_unit(days[0][1], each.what, unit)[1]
    title = line(
        Span(f" {each.what}", "strong"),
        Span(
            f" {name} in the {point_name(each.point)}, band {band_words(band, digits_for(days[-1][1].high))}", "faint"
        ),
    )
    chart = draw_chart(curve, 0.0, width, CHART_ROWS - 3)
    return [title, *chart[:-3], chart[-1]]


def _next_sample(sample: SampleAdvice | None, snapshot: Snapshot, horizon: int, width: int) -> list[Line]:
    """The best day for the next sample, once it is worked out."""
    if sample is None:
        return []
    from fertui.workbench.today import sample_words

    first, *more = wrap(sample_words(sample, horizon, snapshot.site.timezone), width - 16)
    return [line(Span(" next sample: ", "strong"), first), *(line(" " * 14, words) for words in more)]


def _assumed(ahead: Forecast, width: int) -> list[Line]:
    """What the record did not say and what was taken instead."""
    rows: list[Line] = []
    for text in ahead.assumed:
        first, *more = wrap(literal(text), width - 12)
        rows += [line(Span(" assumed: ", "faint"), first), *(line(" " * 10, words) for words in more)]
    return rows
