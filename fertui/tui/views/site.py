"""Site: every value of the site file with where it comes from; each can be changed, is checked, and written safely."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any, ClassVar, NamedTuple

from textual.binding import Binding

from fertui.tui.desk import Answer
from fertui.tui.ink import BLANK, Line, Span, barred, cells, col, cut, line, literal
from fertui.tui.snapshot import Ask, Snapshot
from fertui.tui.view import SCROLLING, View, waiting

if TYPE_CHECKING:
    from fertui.workbench import Bench
    from fertui.workbench.aims import Aim


IN_FORCE = "in force:"
"""How the name of a row begins that is not of the file."""
HOW_TO_ANALYSE = "It counts from that report on. Log the next one with a; strike a wrong one in the Logbook (7)."
HOW_TO_SET = (
    "To set your own, write it under bands or limits of the loop or of the site in site.toml, with its source; "
    "docs/files.md shows how."
)


class InForce(NamedTuple):
    """A band, limit or analysed water in force: its name, its range in words, where it comes from."""

    key: str
    text: str
    source: str


class SiteView(View):
    """Targets, bands, limits per point, waters, supplies, instruments: as rows."""

    TITLE = "Site"
    HELP = (
        "Everything the site file says: loops, waters, supplies, stock tanks, targets, bands and limits per "
        "point, instruments. "
        "On the right stands where a value comes from; 'unverified preset' means nobody has checked it for your crop. "
        "Enter changes the value under the bar: it is checked as a whole, the old file is kept beside the new one, "
        "and the change is logged with your initials. Below the values of the file stand the bands and limits in force "
        "for this loop, wherever they come from, and waters as last analysed; i shows these alone."
        " / shows only rows with a text in them."
    )
    BINDINGS: ClassVar[list[Any]] = [
        *SCROLLING,
        Binding("enter", "edit", "change", id="site.edit", tooltip="Change the value under the bar."),
        Binding("slash", "text", "search", id="site.text", tooltip="Show rows with a text in them."),
        Binding("i", "in_force", "in force", id="site.aims", tooltip="What is in force alone: bands, limits, waters."),
        Binding("backspace", "everything", "all", show=False, id="site.all", tooltip="Show every row again."),
        Binding("c", "check", "check", id="site.check", tooltip="Check site file, logbook and this machine."),
    ]

    def __init__(self) -> None:
        super().__init__()
        self.row, self.text = 0, ""

    def asks(self, snapshot: Snapshot) -> tuple[Ask, ...]:
        """The rows of the file, and what is in force for the loop."""
        return Ask("site_rows"), Ask("aims", snapshot.loop)

    def rows(self, snapshot: Snapshot) -> list[Any]:
        """Rows of the file, then what is in force, with the wanted text in them."""
        aims = snapshot.get(Ask("aims", snapshot.loop)) or ()
        found = [*(snapshot.get(Ask("site_rows")) or ()), *(in_force(aim) for aim in aims)]
        return [row for row in found if self.text.lower() in f"{row.key} {row.text} {row.source}".lower()]

    def draw(self, snapshot: Snapshot, width: int) -> list[Line]:
        """One row a value."""
        ask = Ask("site_rows")
        if snapshot.get(ask) is None:
            return waiting(snapshot, ask, "the site file", width)
        rows = self.rows(snapshot)
        self.row = max(0, min(self.row, len(rows) - 1))
        narrowed = f", with {self.text!r}" if self.text else ""
        place = f"{self.fertui.folder.name}/site.toml and in force for {snapshot.loop}"
        heading = f" {len(rows)} rows of {literal(place)}{literal(narrowed)}"
        height = max(1, self.room.height - 1)
        first = max(0, min(self.row - height // 2, len(rows) - height))
        lines = [line(Span(heading, "title"))]
        columns = columns_of(rows, width)
        lines += [
            site_row(row, index == self.row, columns, width)
            for index, row in enumerate(rows[first : first + height], first)
        ]
        return (
            lines if rows else [*lines, BLANK, line(" ", Span("No row has that in it; Backspace shows all.", "faint"))]
        )

    def _go(self, row: int) -> None:
        self.row = max(0, row)
        self.redraw()

    def action_up(self) -> None:
        """The row above."""
        self._go(self.row - 1)

    def action_down(self) -> None:
        """The row below."""
        self._go(self.row + 1)

    def action_leaf(self, leaves: int) -> None:
        """A screenful on."""
        self._go(self.row + leaves * (self.room.height - 2))

    def action_top(self) -> None:
        """The first row."""
        self._go(0)

    def action_bottom(self) -> None:
        """The last row."""
        self._go(len(self.rows(self.fertui.snapshot)) - 1)

    def action_text(self) -> None:
        """Ask for a text."""

        def only(text: str) -> None:
            self.text, self.row = text, 0
            self.redraw()

        self.fertui.ask("Rows with this in them:", only, self.text)

    def action_in_force(self) -> None:
        """Bands and limits in force alone."""
        self.text, self.row = IN_FORCE, 0
        self.redraw()

    def action_everything(self) -> None:
        """Every row."""
        self.text = ""
        self.redraw()

    def action_edit(self) -> None:
        """Ask for the new value and change it."""
        rows = self.rows(self.fertui.snapshot)
        if not rows:
            return
        row = rows[self.row]
        key: str = row.key
        if isinstance(row, InForce):
            how = HOW_TO_ANALYSE if key.endswith(" analysed") else HOW_TO_SET
            self.fertui.say_at_length(key, f"{row.text}. It comes from: {row.source}. {how}")
            return

        def change(text: str) -> None:
            if text != row.text:
                asked = f"{cut(row.text or 'nothing', 20)} -> {cut(text or 'nothing', 20)}: y writes it"
                self.fertui.ask(asked, lambda answer: self._write(key, text, answer))

        self.fertui.ask(f"{cut(key, 40)} =", change, row.text)

    def _write(self, key: str, text: str, answer: str) -> None:
        """Write a change once it was looked at: what is typed without looking must not change a site."""
        if answer.lower() not in ("y", "yes"):
            self.fertui.say("Nothing was changed.", "watch")
            return

        def signed(by: str) -> None:
            self.fertui.clerk(lambda bench: _change(bench, key, text, by), self._changed, "changing the site")

        self.fertui.with_initials(signed)

    def _changed(self, answer: Answer) -> None:
        if answer.value is None:
            self.fertui.say_at_length("Not changed", answer.trouble)
            return
        entry, site = answer.value
        self.fertui.site_changed(site)
        self.fertui.wrote(Answer(entry))

    def action_check(self) -> None:
        """Check everything."""
        self.fertui.clerk(
            lambda bench: [
                f"{row.sign:2} {row.what}: {row.found}. {row.remark}" for row in bench.check()
            ],
            self._checked,
            "the check",
        )

    def _checked(self, answer: Answer) -> None:
        self.fertui.show_text("Check of site, logbook and machine", answer)


def _change(bench: Bench, key: str, text: str, by: str) -> tuple[object, object]:
    return bench.change_site(key, text, by), bench.site


def in_force(aim: Aim) -> InForce:
    """A band or limit as a row."""
    return InForce(f"{IN_FORCE} {aim.point.replace('_', ' ')} {aim.what} {aim.kind}", aim.words, aim.source)


def columns_of(rows: Sequence[Any], width: int) -> tuple[int, int]:
    """Columns of name and value: no more than they need, so that the source has the rest."""
    key_width = min(max((cells(literal(row.key)) for row in rows), default=0), 40, width // 2)
    most = max(12, (width - key_width - 4) * 3 // 5)
    return key_width, min(max((cells(literal(row.text)) for row in rows), default=0), most)


def site_row(row: Any, chosen: bool, columns: tuple[int, int], width: int) -> Line:
    """Name, value, source."""
    key, text, source = literal(row.key), literal(row.text), literal(row.source)
    key_width, text_width = columns
    shown = line(
        Span("▸ " if chosen else "  ", "accent"),
        col(key, key_width, right=False),
        Span(" "),
        col(text, text_width, "strong", right=False),
        Span(" "),
        Span(cut(source, width - key_width - text_width - 4), "faint"),
    )
    return barred(shown, width) if chosen else shown
