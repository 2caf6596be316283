"""Today: is it all right, what is wrong, what to do next, how old is what is known."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any, ClassVar

from textual.binding import Binding

from fertui.site.points import point_name
from fertui.tui import charts
from fertui.tui.figures import (
    MARKS,
    age,
    digits_for,
    estimated,
    number,
    short_leaving,
    span,
    standing,
    unit_and_species,
)
from fertui.tui.ink import BLANK, Line, Span, beside, filled, fit, line, literal, wrap
from fertui.tui.snapshot import Ask, Snapshot
from fertui.tui.view import View, waiting

if TYPE_CHECKING:
    from fertui.estimate.points import PointState
    from fertui.workbench.glance import Glance
    from fertui.workbench.today import Gauge, Today

WIDE = 110
"""Columns from which the watch list stands beside the gauges."""
SEVERITY_INK = {"act": "act", "watch": "watch", "note": "faint"}


UNKNOWN = "Where the ions are is not known: {why}. Send a sample (e), log its report (a)."


class TodayView(View):
    """One loop, or all of them, worst first."""

    TITLE = "Today"
    HELP = (
        "One glance: is it all right, what is wrong, what do you do next, how old is what is known. "
        "Each gauge has its band shaded in the middle; the dot is the value, the line its 80 % range. "
        "The bars are 14 days back and, in the other colour, 14 days ahead. "
        "'in 4 (2-9) days' is when the value leaves its band: the middle of the forecast and its 80 % range. "
        "'To look at' lists what wants doing, worst first, with the key that does it. "
        "'since you looked' counts what others wrote since your last entry or look; l shows it. "
        "With several loops v shows all of them on one screen, worst first."
    )
    BINDINGS: ClassVar[list[Any]] = [
        Binding("v", "all_loops", "all loops", id="today.all", tooltip="All loops on one screen, worst first."),
        Binding("l", "app.news", "news", show=False, id="today.news", tooltip="What others wrote since you looked."),
        Binding("enter", "open_loop", "open loop", show=False, id="today.open", tooltip="Open the loop under the bar."),
    ]

    def __init__(self) -> None:
        super().__init__()
        self.all_loops: bool | None = None
        self.row = 0

    def _shows_all(self, snapshot: Snapshot) -> bool:
        return len(snapshot.loops) > 1 if self.all_loops is None else self.all_loops

    def asks(self, snapshot: Snapshot) -> tuple[Ask, ...]:
        """Last known numbers first, then the estimate."""
        if self._shows_all(snapshot):
            return (*(Ask("glance", loop) for loop in snapshot.loops), snapshot.news, Ask("overview"))
        return Ask("glance", snapshot.loop), snapshot.news, Ask("today", snapshot.loop)

    def draw(self, snapshot: Snapshot, width: int) -> list[Line]:
        """All loops, or the one chosen."""
        if not snapshot.loop:
            return [BLANK, line(" ", Span("Opening the logbook.", "faint"))]
        if self._shows_all(snapshot):
            return [*came_in(snapshot, width), *draw_overview(snapshot, self.row, width)]
        return [*came_in(snapshot, width), *draw_today(snapshot, width)]

    def action_all_loops(self) -> None:
        """Between all loops and one."""
        self.all_loops = not self._shows_all(self.fertui.snapshot)
        self.redraw()
        self.fertui.work_out()

    def action_open_loop(self) -> None:
        """Open the loop under the bar."""
        snapshot = self.fertui.snapshot
        if self._shows_all(snapshot):
            self.all_loops = False
            self.fertui.choose_loop(_order(snapshot)[self.row])
            self.redraw()
            self.fertui.work_out()

    def action_up(self) -> None:
        """The loop above, or a line up."""
        self._move(-1)

    def action_down(self) -> None:
        """The loop below, or a line down."""
        self._move(1)

    def _move(self, step: int) -> None:
        if self._shows_all(self.fertui.snapshot):
            self.row = max(0, min(len(self.fertui.snapshot.loops) - 1, self.row + step))
            self.redraw()
        else:
            self._scroll(self._top + step)


def came_in(snapshot: Snapshot, width: int) -> list[Line]:
    """What others wrote since the person at the keyboard last wrote or looked, in one line; nothing when nobody did."""
    entries = snapshot.get(snapshot.news) or ()
    if not entries:
        return []
    people = list(dict.fromkeys(literal(entry.by) for entry in reversed(entries)))
    who = ", ".join(people[:3]) + (f" and {len(people) - 3} more" if len(people) > 3 else "")
    words = f"since you looked: {len(entries)} {'entry' if len(entries) == 1 else 'entries'} by {who}"
    return [line(Span(" " + fit(words, width - 12), "accent"), Span("l shows it", "faint"))]


def draw_today(snapshot: Snapshot, width: int) -> list[Line]:
    """The whole view of one loop."""
    glance, state = snapshot.get(Ask("glance", snapshot.loop)), snapshot.get(Ask("today", snapshot.loop))
    if glance is None:
        return waiting(snapshot, Ask("glance", snapshot.loop), "the last known numbers", width)
    top = [*measured(glance, state, width), BLANK]
    if state is None:
        return [*top, *waiting(snapshot, Ask("today", snapshot.loop), "where the ions are", width)[1:]]
    if not state.analyses_behind or glance.last_analysis is None:
        words = [line(" ", Span(text, "watch")) for text in wrap(_unknown(glance), width - 2)]
        return [*top, *words, BLANK, *watch_list(state, width)]
    if width >= WIDE:
        left = gauges(state, snapshot, 80)
        return [*top, *beside(left, watch_list(state, width - 84), 80, 3)]
    return [*top, *gauges(state, snapshot, width), BLANK, *watch_list(state, width)]


def measured(glance: Glance, state: Today | None, width: int) -> list[Line]:
    """What meters and laboratory last said, and how old it is."""
    parts: list[Line] = []
    for point in ("feed", "tank", "root_zone", "drain", "drain_store"):
        if point in glance.readings:
            parts.append(_meter(point, glance))
    rows = _flow(parts, width) or [line(" ", Span("No reading logged yet.", "watch"), " Press r.")]
    if state is not None:
        rows += _flow(_circumstances(state), width)
    return [*rows, *_flow([_last(glance), _analysed(glance)], width)]


def _meter(point: str, glance: Glance) -> Line:
    seen = glance.readings[point].values
    words: list[str | Span] = [Span(point_name(point, glance.layout), "strong"), " "]
    if "EC" in seen:
        words += ["EC ", Span(number(seen["EC"]), "strong"), Span(" mS/cm", "faint")]
        if point in ("feed", "tank") and glance.set_ec is not None:
            words.append(Span(f" set {number(glance.set_ec)}", "faint"))
        feed = glance.readings.get("feed")
        if point == "drain" and feed is not None and "EC" in feed.values:
            words.append(Span(f" ({seen['EC'] - feed.values['EC']:+.1f})", "faint"))
    if "pH" in seen:
        words.append(f"  pH {number(seen['pH'])}")
    if "temperature" in seen:
        words.append(f"  {number(seen['temperature'])} C")
    return line(*words)


def _circumstances(state: Today) -> list[Line]:
    parts: list[Line] = []
    if state.drain_pct is not None:
        parts.append(line(f"drain {number(state.drain_pct, 0)} %"))
    if state.light_sum_j_per_cm2 is not None:
        parts.append(line(f"light {number(state.light_sum_j_per_cm2, 0)} J/cm2"))
    words: list[str | Span] = []
    for tank, days in state.stock_days_left.items():
        ink = "act" if days < 1 else "watch" if days < 3 else "plain"
        words += [
            ", " if words else "stock left: ",
            literal(tank) + " ",
            Span(f"{number(days, 0 if days >= 10 else 1)} days", ink),
        ]
    parts.append(line(*words))
    return parts


def _last(glance: Glance) -> Line:
    newest = max(glance.readings.values(), key=lambda seen: seen.at, default=None)
    if newest is None:
        return BLANK
    return line(Span(f"last reading {age(newest.at, glance.at)} ago by {literal(newest.by)}", "faint"))


def _unknown(glance: Glance) -> str:
    """Why nothing is drawn as known."""
    if glance.last_analysis is None:
        return UNKNOWN.format(why="no analysis is logged yet")
    return UNKNOWN.format(why="no analysis of it is recent enough to begin from")


def _analysed(glance: Glance) -> Line:
    if glance.last_analysis is None:
        return line(Span("no analysis yet: the estimate is a guess", "watch"))
    return line(Span(f"last analysis {age(glance.last_analysis.at, glance.at)} old", "faint"))


def _flow(parts: Sequence[Line], width: int) -> list[Line]:
    """Parts one after another, on as many lines as they need."""
    rows: list[Line] = []
    for part in parts:
        if not part:
            continue
        joined = line(*rows[-1], "   ", *part) if rows else ()
        if rows and sum(len(span.text) for span in joined) < width:
            rows[-1] = joined
        else:
            rows.append(line(" ", *part))
    return rows


def gauges(state: Today, snapshot: Snapshot, width: int) -> list[Line]:
    """One row an ion: amount, range, share or limit, gauge, course, and when it leaves its band."""
    point = state.points[state.managed_point]
    gauge_width, course_width = _room(width)
    heads = fit("band", gauge_width + 1) if gauge_width else ""
    heads += fit("28 days", course_width + 1) if course_width else ""
    title = fit(f" {point_name(state.managed_point, state.layout)}", 11)
    rows = [
        line(Span(title, "title"), Span(f"{snapshot.unit + ' (80 %)':>14} {'share':>7}  {heads}leaves band", "faint"))
    ]
    for each in state.gauges:
        label, value, limits = _amounts(each, point, snapshot.unit)
        ink = _gauge_ink(each)
        spark = (charts.course(each.course, each.today_index, course_width), " ") if course_width else ((), "")
        picture = charts.gauge(each.now, gauge_width, ink) if gauge_width else BLANK
        row = line(
            f" {fit(label, 6)}",
            Span(f"{value[0]:>6}", "strong"),
            Span(f"{f'({value[1]})':>12}", "faint"),
            f" {limits:>7}  ",
        )
        mark = Span(f"{MARKS[ink]:2} {short_leaving(each.leaves)}", ink if ink != "good" else "plain")
        rows.append(line(*row, *picture, " " if gauge_width else "", *spark[0], spark[1], mark))
    return rows


def _gauge_ink(each: Gauge) -> str:
    """Out, inside, or on its way out within the days looked ahead."""
    ink = standing(each.now) or "faint"
    leaving = bool(each.leaves) and not each.leaves.startswith("not in")
    return "watch" if ink == "good" and leaving else ink


def _room(width: int) -> tuple[int, int]:
    """Columns for gauge and course beside the numbers and the words."""
    room = width - 59
    if room >= 21:
        return min(31, room - 11), 9
    return (min(room - 1, 21), 0) if room >= 12 else (0, 0)


def _amounts(each: Gauge, point: PointState, unit: str) -> tuple[str, tuple[str, str], str]:
    """Label, value with range, and share or limit of a gauge, in the unit chosen."""
    from fertui.workbench.units import shown

    if each.what == "EC":
        return "EC", estimated(each.now), "mS/cm"
    ion = each.what.removesuffix(" share")
    state = point.ions[ion].mmol_l
    (value, label), (low, _), (high, _) = (shown(ion, amount, unit) for amount in (state.value, state.low, state.high))
    digits = digits_for(high - low)
    words = number(value, digits), span(low, high, digits)
    species = unit_and_species(label, ion)[1]
    if each.what.endswith(" share"):
        return species, words, f"{number(each.now.value, 0)} %"
    limit = each.now.band[1] if each.now.band else None
    return species, words, "" if limit is None else f"max {shown(ion, limit, unit)[0]:.3g}"


def watch_list(state: Today, width: int) -> list[Line]:
    """What wants doing, worst first, with its key; then what is half done or awaited."""
    rows = [line(Span(" To look at", "title"))]
    for notice in state.watch:
        rows += _notice(notice.severity, notice.text, notice.key, width)
    for text in state.half_done:
        rows += _notice("watch", text, "p", width)
    for text in state.awaited:
        rows += _notice("note", f"Awaited: {text}", "", width)
    return rows if len(rows) > 1 else [*rows, line(" ", Span("✓ Nothing. The next round will tell.", "good"))]


def _notice(severity: str, text: str, key: str, width: int) -> list[Line]:
    ink = SEVERITY_INK.get(severity, "faint")
    first, *more = wrap(literal(text), width - 7 - len(key))
    row = filled(line(Span(f" {MARKS[ink]:2} ", ink), first), width - len(key) - 1)
    return [line(*row, Span(key, "accent")), *(line("    ", text) for text in more)]


def draw_overview(snapshot: Snapshot, chosen: int, width: int) -> list[Line]:
    """One block a loop, worst first: what it is, how its shares stand, the first thing to look at."""
    states = {state.loop: state for state in snapshot.get(Ask("overview")) or ()}
    rows: list[Line] = [
        line(Span(fit(" All loops, worst first", width - 25), "title"), Span("Enter opens, v one loop", "faint"))
    ]
    for index, name in enumerate(_order(snapshot)):
        rows += [BLANK, *_loop_block(name, snapshot, states.get(name), index == chosen, width)]
    trouble = snapshot.trouble(Ask("overview"))
    return rows + (waiting(snapshot, Ask("overview"), "", width) if trouble else [])


def _loop_block(name: str, snapshot: Snapshot, state: Today | None, chosen: bool, width: int) -> list[Line]:
    glance: Glance | None = snapshot.get(Ask("glance", name))
    words = ", ".join(w for w in (glance.crop, glance.stage, glance.medium) if w and w != "none") if glance else ""
    head = fit(f" {literal(name)}: {literal(words)}", width)
    rows = [line(Span(head, "chosen" if chosen else "strong"))]
    if glance is not None:
        rows += _flow([_meter(point, glance) for point in ("feed", "tank", "drain") if point in glance.readings], width)
    if state is None:
        return [*rows, line(" ", Span("Working out where the ions are.", "faint"))]
    cells: list[Line] = []
    for each in state.gauges if state.analyses_behind else ():
        ink = _gauge_ink(each)
        cells.append(
            line(
                Span(f"{MARKS[ink]} ", ink),
                f"{each.what} ",
                Span(f"{estimated(each.now, each.unit)[0]} {each.unit}", ink),
            )
        )
    rows += _flow(cells, width)
    for notice in state.watch[:1]:
        rows += _notice(notice.severity, notice.text, notice.key, width)
    more = len(state.watch) - 1
    return [*rows, *([line(Span(f"   {more} more to look at", "faint"))] if more > 0 else [])]


def _order(snapshot: Snapshot) -> list[str]:
    """Names of the loops, worst first once that is known."""
    states = snapshot.get(Ask("overview"))
    return [state.loop for state in states] if states else list(snapshot.loops)
