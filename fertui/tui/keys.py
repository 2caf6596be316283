"""The keys that work from every view. Each has an id, by which the settings file can give it another key."""

from __future__ import annotations

from textual.binding import Binding

VIEW_NAMES = ("Today", "Analysis", "Drift", "Balance", "Forecast", "Plan", "Logbook", "Supplies", "Site")

GLOBAL_KEYS = [
    *(
        Binding(str(n), f"view({n})", name, show=False, id=f"view.{name.lower()}", tooltip=f"Open {name}.")
        for n, name in enumerate(VIEW_NAMES, 1)
    ),
    Binding("r", "enter('reading')", "reading", id="enter.reading", tooltip="Log a reading: EC, pH, meters, stock."),
    Binding("a", "enter('analysis')", "analysis", id="enter.analysis", tooltip="Log a laboratory's report."),
    Binding("w", "enter('water')", "water", id="enter.water", tooltip="Log water: make-up, irrigation, drain."),
    Binding("d", "enter('dose')", "dose", id="enter.dose", tooltip="Log a dose weighed in by hand."),
    Binding("m", "enter('batch')", "batch", id="enter.batch", tooltip="Log a stock tank mixed."),
    Binding("e", "entries", "other entry", show=False, id="enter.other",
    tooltip="Log anything else: stock, acid, bleed ..."),
    Binding("p", "view(6)", "plan", show=False, id="plan.open", tooltip="Open the plan."),
    Binding("n", "loop(1)", "next loop", id="loop.next", tooltip="Show the next loop."),
    Binding("b", "loop(-1)", "loop before", show=False, id="loop.back", tooltip="Show the loop before."),
    Binding("u", "unit", "unit", show=False, id="unit.next", tooltip="mmol/L, meq/L and mg/L in turn, everywhere."),
    Binding("o", "papers", "sheets", show=False, id="papers", tooltip="Sheets: round, handover, stock, acid, report."),
    Binding("t", "theme", "colours", show=False, id="theme.next",
    tooltip="The next of the four looks; it is remembered."),
    Binding("f5", "again", "work out again", show=False, id="again",
    tooltip="As of now, worked out again, drawn again."),
    Binding("q", "leave", "leave", show=False, id="leave", tooltip="Leave. A half-filled form is kept."),
    Binding("f10,ctrl+q", "leave", "leave at once", show=False, id="leave.at_once",
    tooltip="Leave from anywhere, a form too."),
    Binding("x", "actions", "actions", id="actions", tooltip="Every action, with its key."),
    Binding("question_mark,f1", "help", "help", id="help", tooltip="What this place is for and how to use it."),
]  # fmt: skip
