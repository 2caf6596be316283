"""Supplies: what stands on the shelf with label, amount left and hazards; stock tanks with litres and days left."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, ClassVar

from textual.binding import Binding

from fertui.tui.figures import age, number
from fertui.tui.ink import BLANK, Line, Span, barred, col, cut, line, literal
from fertui.tui.snapshot import Ask, Snapshot
from fertui.tui.text_page import TextPage
from fertui.tui.view import View, waiting

if TYPE_CHECKING:
    from fertui.workbench.shelf import StockRow, SupplyRow


WIDE = 112
USUAL = 76
"""Columns from which formulas and tank sizes have room."""


class SuppliesView(View):
    """Shelf and stock tanks."""

    TITLE = "Supplies"
    HELP = (
        "Salts, acids and lyes on the shelf: the label's own analysis wins over the formula. Days left come from "
        "what was logged as used. "
        "Stock tanks are named by content; the letter is what is painted on them. Enter shows the hazards of the "
        "chosen supply. "
        "s is the stock-tank sheet, one card a tank in the order of dissolving, h the acid sheet for the make-up water."
    )
    BINDINGS: ClassVar[list[Any]] = [
        Binding("up", "up", "above", show=False, id="supplies.up", tooltip="The supply above."),
        Binding("down", "down", "below", show=False, id="supplies.down", tooltip="The supply below."),
        Binding(
            "enter", "hazards", "hazards", id="supplies.hazards", tooltip="Hazards and handling of the chosen supply."
        ),
        Binding(
            "s", "stock_sheet", "stock sheet", id="supplies.stock", tooltip="The sheet for mixing the stock tanks."
        ),
        Binding(
            "h", "acid_sheet", "acid sheet", id="supplies.acid", tooltip="The sheet for acid in the make-up water."
        ),
    ]

    def __init__(self) -> None:
        super().__init__()
        self.row = 0

    def asks(self, snapshot: Snapshot) -> tuple[Ask, ...]:
        """Shelf and tanks."""
        return Ask("supplies_rows"), Ask("stock_rows", snapshot.loop)

    def draw(self, snapshot: Snapshot, width: int) -> list[Line]:
        """Tanks first: they run out in days; then the shelf."""
        shelf: tuple[SupplyRow, ...] | None = snapshot.get(Ask("supplies_rows"))
        if shelf is None:
            return waiting(snapshot, Ask("supplies_rows"), "the shelf", width)
        self.row = max(0, min(self.row, len(shelf) - 1))
        tanks: tuple[StockRow, ...] = snapshot.get(Ask("stock_rows", snapshot.loop)) or ()
        trouble = snapshot.trouble(Ask("stock_rows", snapshot.loop))
        above = waiting(snapshot, Ask("stock_rows", snapshot.loop), "", width) if trouble else self._tanks(tanks, width)
        rows = [*above, BLANK, line(Span(" Shelf", "title")), _shelf_head(width)]
        for index, supply in enumerate(shelf):
            if index == self.row:
                self.reveal(len(rows))
            rows.append(_supply(supply, index == self.row, width))
        return rows

    def _tanks(self, tanks: tuple[StockRow, ...], width: int) -> list[Line]:
        roomy = width >= USUAL
        sizes = [("size", 13)] if roomy else []
        heads = [*sizes, ("mixed", 13), ("left", 9), ("days left", 12)]
        title = col(" Stock tanks", 20, "title", right=False)
        head = line(title, *(col(text, size, "faint") for text, size in heads))
        rows = [head]
        for tank in tanks:
            mixed = "never logged" if tank.mixed_at is None else f"{age(tank.mixed_at, self.fertui.moment)} ago"
            left = "-" if tank.litres_left is None else f"{tank.litres_left:.0f} L"
            days = "-" if tank.days_left is None else f"{number(tank.days_left)} days"
            ink = (
                "plain"
                if tank.days_left is None
                else "act"
                if tank.days_left < 1
                else "watch"
                if tank.days_left < 3
                else "plain"
            )
            name = literal(f" {tank.name}{' (' + tank.letter + ')' if tank.letter else ''}")
            rows.append(
                line(
                    col(name, 20, "strong", right=False),
                    *([col(f"{tank.litres:g} L {tank.dilution:g}x", 13)] if roomy else []),
                    col(mixed, 13),
                    col(left, 9),
                    col(days, 12, ink),
                )
            )
        return rows if tanks else [*rows, line(" ", Span("This loop has no stock tanks.", "faint"))]

    def _move(self, row: int) -> None:
        self.row = row
        self.redraw()

    def action_up(self) -> None:
        """The supply above."""
        self._move(self.row - 1)

    def action_down(self) -> None:
        """The supply below."""
        self._move(self.row + 1)

    async def action_hazards(self) -> None:
        """Hazards of the chosen supply."""
        shelf = self.fertui.snapshot.get(Ask("supplies_rows"))
        if shelf:
            supply = shelf[self.row]
            text = supply.hazards or (
                "No caution is on record. The safety data sheet and the label come first all the same.",
            )
            facts = [f"label: {supply.label or 'by formula'}"]
            facts += [f"density: {supply.density_kg_per_l:.3g} kg/L"] if supply.density_kg_per_l is not None else []
            facts += [f"price: {supply.price_per_kg:g} a kg"] if supply.price_per_kg is not None else []
            await self.fertui.open_page(
                TextPage(f"{supply.name} ({supply.formula})", [*facts, "", *(f"- {each}" for each in text)])
            )

    def action_stock_sheet(self) -> None:
        """The stock-tank sheet."""
        self.fertui.paper("stock")

    def action_acid_sheet(self) -> None:
        """The acid sheet."""
        self.fertui.paper("acid")


def _shelf_head(width: int) -> Line:
    dear = [col("price", 12, "faint")] if width >= WIDE else []
    heads = [
        col("name", 31, "faint", False),
        *([col("formula", 23, "faint", False)] if width >= USUAL else []),
        col("left", 9, "faint"),
        *dear,
        Span("  label", "faint"),
    ]
    return line(col("", 2), *heads)


def _supply(supply: SupplyRow, chosen: bool, width: int) -> Line:
    left = "-" if supply.amount_kg is None else f"{supply.amount_kg:g} kg"
    price = "-" if supply.price_per_kg is None else f"{supply.price_per_kg:g} a kg"
    dear = [col(price, 12)] if width >= WIDE else []
    density = f", {supply.density_kg_per_l:.3g} kg/L" if supply.density_kg_per_l is not None and width >= WIDE else ""
    formula = [col(literal(supply.formula), 23, right=False)] if width >= USUAL else []
    mark = "!" if len(supply.hazards) > 1 else " "
    row = line(
        Span(f"▸{mark}" if chosen else f" {mark}", "watch"), col(literal(supply.name), 31, "strong", right=False),
        *formula, col(left, 9), *dear,
        Span("  " + cut(literal(supply.label + density), max(width - (67 if formula else 44), 8))),
    )  # fmt: skip
    return barred(row, width) if chosen else row
