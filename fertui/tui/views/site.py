"""Site: every value of the site file with where it comes from; each can be changed, is checked, and written safely."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, ClassVar

from textual.binding import Binding

from fertui.tui.desk import Answer
from fertui.tui.ink import BLANK, Line, Span, col, cut, filled, inked, line, literal
from fertui.tui.snapshot import Ask, Snapshot
from fertui.tui.view import SCROLLING, View, waiting

if TYPE_CHECKING:
    from fertui.workbench import Bench


class SiteView(View):
    """Targets, bands, limits per point, waters, supplies, instruments: as rows."""

    TITLE = "Site"
    HELP = (
        "Everything the site file says: loops, waters, supplies, stock tanks, targets, bands and limits per "
        "point, instruments. "
        "On the right stands where a value comes from; 'unverified preset' means nobody has checked it for your crop. "
        "Enter changes the value under the bar: it is checked as a whole, the old file is kept beside the new one, "
        "and the change is logged with your initials. / shows only rows with a text in them."
    )
    BINDINGS: ClassVar[list[Any]] = [
        *SCROLLING,
        Binding("enter", "edit", "change", id="site.edit", tooltip="Change the value under the bar."),
        Binding("slash", "text", "search", id="site.text", tooltip="Show rows with a text in them."),
        Binding("backspace", "everything", "all", show=False, id="site.all", tooltip="Show every row again."),
        Binding("c", "check", "check", id="site.check", tooltip="Check site file, logbook and this machine."),
    ]

    def __init__(self) -> None:
        super().__init__()
        self.row, self.text = 0, ""

    def asks(self, snapshot: Snapshot) -> tuple[Ask, ...]:
        """The rows."""
        return (Ask("site_rows"),)

    def rows(self, snapshot: Snapshot) -> list[object]:
        """Rows with the wanted text in them."""
        found = snapshot.get(Ask("site_rows")) or ()
        return [row for row in found if self.text.lower() in f"{row.key} {row.text} {row.source}".lower()]

    def draw(self, snapshot: Snapshot, width: int) -> list[Line]:
        """One row a value."""
        ask = Ask("site_rows")
        if snapshot.get(ask) is None:
            return waiting(snapshot, ask, "the site file", width)
        rows = self.rows(snapshot)
        self.row = max(0, min(self.row, len(rows) - 1))
        narrowed = f", with {self.text!r}" if self.text else ""
        heading = f" {len(rows)} values of {self.fertui.folder.name}/site.toml{literal(narrowed)}"
        height = max(1, (self.size.height or self.fertui.stage_size.height) - 1)
        first = max(0, min(self.row - height // 2, len(rows) - height))
        lines = [line(Span(heading, "title"))]
        lines += [
            site_row(row, index == self.row, width) for index, row in enumerate(rows[first : first + height], first)
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
        self._go(self.row + leaves * (self.size.height - 2))

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
        key: str = row.key  # type: ignore[attr-defined]

        def change(text: str) -> None:
            if text != row.text:  # type: ignore[attr-defined]
                self.fertui.with_initials(
                    lambda by: self.fertui.clerk(
                        lambda bench: _change(bench, key, text, by), self._changed, "changing the site"
                    )
                )

        self.fertui.ask(f"{cut(key, 40)} =", change, row.text)  # type: ignore[attr-defined]

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
                f"{'ok ' if row.passed else '!! '} {row.what}: {row.found}. {row.remark}" for row in bench.check()
            ],
            self._checked,
            "the check",
        )

    def _checked(self, answer: Answer) -> None:
        self.fertui.show_text("Check of site, logbook and machine", answer)


def _change(bench: Bench, key: str, text: str, by: str) -> tuple[object, object]:
    return bench.change_site(key, text, by), bench.site


def site_row(row: object, chosen: bool, width: int) -> Line:
    """Name, value, source."""
    key, text, source = literal(row.key), literal(row.text), literal(row.source)  # type: ignore[attr-defined]
    key_width = min(40, width // 2)
    text_width = max(12, (width - key_width - 4) * 3 // 5)
    shown = line(
        Span("▸ " if chosen else "  ", "accent"),
        col(key, key_width, right=False),
        Span(" "),
        col(text, text_width, "strong", right=False),
        Span(" "),
        Span(cut(source, width - key_width - text_width - 4), "faint"),
    )
    return inked(filled(shown, width), "chosen") if chosen else shown
