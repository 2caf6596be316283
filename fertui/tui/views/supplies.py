"""Supplies: what stands on the shelf with label, amount left and hazards; stock tanks with litres and days left."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any, ClassVar

from textual.binding import Binding

from fertui.tui.figures import age, number
from fertui.tui.ink import BLANK, Line, Span, barred, cells, col, fit, line, literal
from fertui.tui.snapshot import Ask, Snapshot
from fertui.tui.text_page import TextPage
from fertui.tui.view import View, waiting

if TYPE_CHECKING:
    from fertui.workbench.shelf import StockRow, SupplyRow


USUAL = 76
"""Columns from which the sizes of stock tanks have room."""


class SuppliesView(View):
    """Shelf and stock tanks."""

    TITLE = "Supplies"
    HELP = (
        "Salts, acids and lyes on the shelf: the label's own analysis wins over the formula. Days left come from "
        "what was logged as used. "
        "Stock tanks are named by content; the letter is what is painted on them. Danger and warning are the "
        "signal words of a label; Enter shows the hazards of the chosen supply. "
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
        head, *supplies = shelf_table(shelf, width)
        rows = [*above, BLANK, line(Span(" Shelf", "title")), head]
        self.reveal(len(rows) + self.row)
        return [*rows, *(_chosen(row, width) if index == self.row else row for index, row in enumerate(supplies))]

    def _tanks(self, tanks: tuple[StockRow, ...], width: int) -> list[Line]:
        roomy = width >= USUAL
        sizes = [("size", 13)] if roomy else []
        heads = [*sizes, ("mixed", 14), ("left", 9), ("days left", 12)]
        names = [literal(f" {tank.name}{' (' + tank.letter + ')' if tank.letter else ''}") for tank in tanks]
        size = min(max((20, *(cells(name) + 1 for name in names))), width - sum(size for _, size in heads))
        title = col(" Stock tanks", size, "title", right=False)
        head = line(title, *(col(text, size, "faint") for text, size in heads))
        rows = [head]
        for name, tank in zip(names, tanks, strict=True):
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
            rows.append(
                line(
                    col(name, size, "strong", right=False),
                    *([col(f"{tank.litres:g} L {tank.dilution:g}x", 13)] if roomy else []),
                    col(mixed, 14),
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


SPARED = ("kg/L", "price", "formula")
"""Columns of the shelf that are left out where there is no room, the first one first; Enter tells them all."""
RIGHT = ("left", "price", "kg/L")
SIGNAL_INKS = {"danger": "act", "warning": "watch"}


def shelf_table(shelf: Sequence[SupplyRow], width: int) -> list[Line]:
    """A head and a row a supply. ``hazard`` is the signal word of the label."""
    table = {
        "name": [literal(each.name) for each in shelf], "formula": [literal(each.formula) for each in shelf],
        "hazard": [each.signal for each in shelf],
        "left": ["-" if each.amount_kg is None else f"{each.amount_kg:g} kg" for each in shelf],
        "price": ["-" if each.price_per_kg is None else f"{each.price_per_kg:g} a kg" for each in shelf],
        "kg/L": ["" if each.density_kg_per_l is None else f"{each.density_kg_per_l:.3g}" for each in shelf],
        "label": [literal(each.label) for each in shelf],
    }  # fmt: skip
    sizes = {head: max(map(cells, (head, *texts))) for head, texts in table.items()}
    for head in SPARED:
        if _needed(sizes) > width:
            del sizes[head]
    sizes["name"] -= max(0, _needed(sizes) - width)
    heads = line(*(Span(f"  {fit(head, size, head in RIGHT)}", "faint") for head, size in sizes.items()))
    return [heads, *(_supply({head: table[head][row] for head in sizes}, sizes) for row in range(len(shelf)))]


def _chosen(row: Line, width: int) -> Line:
    """The row under the bar, with the mark of it in the gap before its first cell."""
    first, *rest = row
    return barred(line(Span(f"▸{first.text[1:]}", first.ink), *rest), width)


def _needed(sizes: Mapping[str, int]) -> int:
    """Columns of a row: a gap of two before each of its cells."""
    return sum(sizes.values()) + 2 * len(sizes)


def _supply(texts: Mapping[str, str], sizes: Mapping[str, int]) -> Line:
    inks = {"name": "strong", "hazard": SIGNAL_INKS.get(texts["hazard"], "plain")}
    found = (
        Span(f"  {fit(text, sizes[head], head in RIGHT)}", inks.get(head, "plain")) for head, text in texts.items()
    )
    return line(*found)
