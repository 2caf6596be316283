"""Balance: the account of each ion by cause over a period, down to the entries behind a number."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import timedelta
from typing import TYPE_CHECKING, Any, ClassVar

from textual.binding import Binding

from fertui.tui.figures import amount
from fertui.tui.ink import BLANK, Line, Span, col, fit, line, wrap
from fertui.tui.snapshot import Ask, Snapshot
from fertui.tui.view import View, waiting

if TYPE_CHECKING:
    from fertui.estimate.balance import Balance, BalanceRow

PERIODS = (7, 14, 28, 90)
HEADS = {"start_mmol": "start", "make_up": "make-up", "unexplained": "unexpl.", "exchange": "medium", "end_mmol": "end"}
"""Short heads of the columns; the others are their own."""
WORDS = {
    "start_mmol": "in the water of the loop at the start", "make_up": "brought by make-up water",
    "stock": "brought by stock solution",
    "dose": "weighed in by hand", "acid": "brought by acid", "feed": "brought by the feed",
    "uptake": "taken up by the crop",
    "exchange": "released (+) or held (-) by the medium", "bleed": "lost with bleeds", "drain": "lost with drain",
    "unexplained": "not explained by anything logged", "end_mmol": "in the water of the loop at the end",
}  # fmt: skip
KINDS_BEHIND = {
    "start_mmol": ("analysis",), "make_up": ("water",), "stock": ("stock", "batch", "recipe"), "dose": ("dose",),
    "acid": ("acid",),
    "feed": ("analysis", "recipe", "water"), "uptake": ("water", "analysis"), "exchange": ("analysis", "crop"),
    "bleed": ("bleed",),
    "drain": ("water",), "unexplained": ("analysis",), "end_mmol": ("analysis", "reading"),
}  # fmt: skip
"""Kinds of entry a column comes from: what Enter shows."""
AMOUNT_UNITS = {"mmol/L": ("mol", 1e-3), "meq/L": ("eq", 1e-3), "mg/L": ("g", 1e-3)}
CELL = 8


class BalanceView(View):
    """Rows of ions, columns of causes, bars for the chosen ion."""

    TITLE = "Balance"
    HELP = (
        "Where every ion came from and went to in the period, in the water of the whole loop (what the medium "
        "holds is not counted). "
        "Gains are positive, losses negative; start and all flows make the end. The arrows choose a cell, g shows "
        "its ion "
        "in the bars below, Enter shows the entries the cell comes from, z changes the period, u changes mol, eq "
        "and g. "
        "'unexpl.' is what the last analysis found beyond everything logged: unlogged water or stock, a meter "
        "that is off, a wrong volume."
    )
    BINDINGS: ClassVar[list[Any]] = [
        Binding("up", "move(0,-1)", "ion above", show=False, id="balance.up", tooltip="The ion above."),
        Binding("down", "move(0,1)", "ion below", show=False, id="balance.down", tooltip="The ion below."),
        Binding("left", "move(-1,0)", "cause before", show=False, id="balance.left", tooltip="The cause before."),
        Binding("right", "move(1,0)", "next cause", show=False, id="balance.right", tooltip="The next cause."),
        Binding(
            "enter", "entries", "entries", id="balance.entries", tooltip="The entries the chosen number comes from."
        ),
        Binding("g", "bars", "bars", id="balance.bars", tooltip="Show the chosen ion in the bars."),
        Binding("z", "period", "period", id="balance.period", tooltip="7, 14, 28 or 90 days."),
    ]

    def __init__(self) -> None:
        super().__init__()
        self.period, self.x, self.y, self.barred = 14, 0, 0, 0

    def _ask(self, snapshot: Snapshot) -> Ask:
        return Ask("balance", snapshot.loop, (("days", self.period),))

    def asks(self, snapshot: Snapshot) -> tuple[Ask, ...]:
        """The account of the period."""
        return (self._ask(snapshot),)

    def draw(self, snapshot: Snapshot, width: int) -> list[Line]:
        """The table, then the chosen ion in bars."""
        account: Balance | None = snapshot.get(self._ask(snapshot))
        if account is None:
            return waiting(snapshot, self._ask(snapshot), "the account", width)
        ions, causes = list(account.ions), used(account, width)
        self.x, self.y = min(self.x, len(causes) - 1), min(self.y, len(ions) - 1)
        unit, factor = AMOUNT_UNITS[snapshot.unit]
        title = f" {account.start:%-d %b} to {account.end:%-d %b}, {unit} in the water of the loop"
        heads = [col(HEADS.get(cause, cause), CELL, "faint") for cause in causes]
        rows = [line(Span(title, "title")), *_cut(account, self.period, width), line(col("", 6), *heads)]
        for y, ion in enumerate(ions):
            numbers = [_shown(ion, account.ions[ion], cause, snapshot.unit, factor) for cause in causes]
            cells = [_cell(numbers[x], x == self.x and y == self.y) for x in range(len(causes))]
            rows.append(line(col(f" {ion}", 6, "strong" if y == self.y else "plain", right=False), *cells))
        ion, cause = ions[self.y], causes[self.x]
        value = amount(_shown(ion, account.ions[ion], cause, snapshot.unit, factor))
        words = line(Span(f" {ion}: {value} {unit} {WORDS[cause]}", "strong"), Span("   Enter: its entries", "faint"))
        barred = ions[min(self.barred, len(ions) - 1)]
        shown = bars(barred, account.ions[barred], snapshot.unit, factor, unit, width)
        return [*rows, BLANK, words, BLANK, line(Span(f" {barred} by size", "title")), *shown]

    def action_bars(self) -> None:
        """Show the chosen ion in the bars."""
        self.barred = self.y
        self.redraw()

    def action_move(self, x: int, y: int) -> None:
        """Choose another cell."""
        self.x, self.y = max(0, self.x + x), max(0, self.y + y)
        self.reveal(self.y + 2)
        self.redraw()

    def action_period(self) -> None:
        """The next period."""
        self.period = PERIODS[(PERIODS.index(self.period) + 1) % len(PERIODS)]
        self.redraw()
        self.fertui.work_out()

    async def action_entries(self) -> None:
        """The entries behind the chosen cell."""
        from fertui.tui.entry_list import EntryList

        account: Balance | None = self.fertui.snapshot.get(self._ask(self.fertui.snapshot))
        if account is None:
            return
        cause, ion = used(account, self.room.width)[self.x], list(account.ions)[self.y]
        title = f"{ion}, {WORDS[cause]}"
        await self.fertui.open_page(
            EntryList(
                title, self.fertui.snapshot.loop, KINDS_BEHIND[cause], account.start - timedelta(days=1), account.end
            )
        )


def _cut(account: Balance, days: int, width: int) -> list[Line]:
    """Why the account does not reach back as far as asked."""
    if not account.is_cut:
        return []
    words = f"not {days} days: the estimate begins {account.start:%-d %b}, {account.began}; the report holds all days"
    return [line(" ", Span(text, "watch")) for text in wrap(words, width - 2)]


def used(account: Balance, width: int) -> list[str]:
    """The causes that moved anything; where they are too many for the width, the smallest are left to the bars."""

    def size(cause: str) -> float:
        return max((abs(getattr(row, cause)) for row in account.ions.values()), default=0.0)

    moved = [cause for cause in account.columns if cause in ("start_mmol", "end_mmol") or size(cause) > 0]
    while 6 + CELL * len(moved) > width:
        moved.remove(min((cause for cause in moved if cause not in ("start_mmol", "end_mmol")), key=size))
    return moved


def _shown(ion: str, row: BalanceRow, cause: str, unit: str, factor: float) -> float:
    from fertui.workbench.units import shown

    return shown(ion, getattr(row, cause), unit)[0] * factor


def _cell(value: float, chosen: bool) -> Span:
    text = amount(value) if abs(value) >= 0.0005 else "0"
    return col(text, CELL, "chosen" if chosen else "faint" if text == "0" else "plain")


def bars(ion: str, row: BalanceRow, unit: str, factor: float, name: str, width: int) -> list[Line]:
    """Every cause of an ion that moved anything, as a bar to the right for a gain and to the left for a loss."""
    flows = [(cause, _shown(ion, row, cause, unit, factor)) for cause in row.flows]
    moved: Sequence[tuple[str, float]] = [(cause, value) for cause, value in flows if abs(value) > 1e-9]
    half = max(8, (width - 40) // 2)
    largest = max((abs(value) for _, value in moved), default=1.0)
    rows = []
    for cause, value in sorted(moved, key=lambda pair: -abs(pair[1])):
        size = max(1, round(abs(value) / largest * half))
        left = Span(fit("█" * size, half, right=True) if value < 0 else " " * half, "watch")
        right = Span("█" * size if value > 0 else "", "good")
        rows.append(
            line(
                col(f" {HEADS.get(cause, cause)}", 12, right=False),
                left,
                Span("│", "faint"),
                right,
                f" {amount(value)} {name}",
            )
        )
    return rows
