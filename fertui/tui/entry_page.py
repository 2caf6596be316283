"""One entry with all it holds: times of event and of entry, every value as written and as understood, its
corrections."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, ClassVar

from textual.binding import Binding

from fertui.site.points import point_name
from fertui.tui.entry_list import struck_by
from fertui.tui.ink import BLANK, Line, Span, fit, line, literal, wrap
from fertui.tui.snapshot import Ask, Snapshot
from fertui.tui.view import SCROLLING, View, waiting

if TYPE_CHECKING:
    from fertui.logbook.entries import Entry, Value


class EntryPage(View):
    """An entry by its number."""

    TITLE = "Entry"
    HELP = (
        "An entry as it stands in the logbook. The time of the event and the time it was written down are both kept. "
        "Each value is shown as written, then as understood in the program's own unit. c corrects it, v strikes it."
    )
    BINDINGS: ClassVar[list[Any]] = [
        *SCROLLING,
        Binding("c", "correct", "correct", id="entry.correct", tooltip="Correct the entry: a new one supersedes it."),
        Binding("v", "strike", "strike", id="entry.strike", tooltip="Strike the entry; it stays, crossed out."),
        Binding("escape", "close", "back", id="page.close", tooltip="Back to where you were."),
    ]

    def __init__(self, number: int) -> None:
        super().__init__()
        self.number = number

    def asks(self, snapshot: Snapshot) -> tuple[Ask, ...]:
        """The whole book."""
        return (Ask("history"),)

    def entry(self, snapshot: Snapshot) -> Entry | None:
        """The entry itself."""
        return next((entry for entry in snapshot.get(Ask("history")) or () if entry.number == self.number), None)

    def draw(self, snapshot: Snapshot, width: int) -> list[Line]:
        """Everything about the entry."""
        entry = self.entry(snapshot)
        if entry is None:
            return waiting(snapshot, Ask("history"), "the entry", width)
        by = struck_by(snapshot.get(Ask("history"))).get(self.number)
        rows = [
            line(
                Span(f" Entry {entry.number}, {entry.kind}", "title"),
                Span(f"   {literal(entry.loop) or 'whole site'}", "faint"),
            ),
            BLANK,
        ]
        if by is not None:
            how = "Struck" if by.void else "Corrected"
            words = (
                f"{how} by {by.by} on {self.fertui.local(by.entered):%a %-d %b %H:%M} in entry {by.number}: {by.why}"
            )
            rows += [
                line(Span(f" × {text}" if i == 0 else f"   {text}", "act"))
                for i, text in enumerate(wrap(literal(words), width - 4))
            ]
        for label, text in self._about(entry):
            if text:
                first, *more = wrap(literal(text), width - 18)
                rows += [
                    line(Span(fit(f" {label}", 16), "faint"), first),
                    *(line(" " * 16, more_text) for more_text in more),
                ]
        return [*rows, BLANK, *(row for value in entry.values for row in _value(value, width))]

    def _about(self, entry: Entry) -> list[tuple[str, str]]:
        at, entered = self.fertui.local(entry.at), self.fertui.local(entry.entered)
        return [
            ("happened", f"{at:%a %-d %b %Y}, the whole day" if entry.whole_day else f"{at:%a %-d %b %Y %H:%M}"),
            ("written down", f"{entered:%a %-d %b %Y %H:%M} by {entry.by}"), ("point",
            point_name(entry.point)), ("zone", entry.zone),
            ("method", entry.method.replace("_", " ")), ("instrument", entry.instrument), ("note", entry.note),
            ("doubtful", entry.doubtful),
            ("not answered", getattr(entry, "flags", "").replace("_", " ")),
            ("supersedes", f"{entry.supersedes}: {entry.why}" if entry.supersedes is not None else ""),
        ]  # fmt: skip

    async def action_correct(self) -> None:
        """Correct it."""
        if (entry := self.entry(self.fertui.snapshot)) is not None:
            await self.fertui.correct(entry)

    def action_strike(self) -> None:
        """Strike it."""
        if (entry := self.entry(self.fertui.snapshot)) is not None:
            self.fertui.strike(entry)


def _value(value: Value, width: int) -> list[Line]:
    """A value as written and, where it is a number, as understood."""
    if value.number is None:
        first, *more = wrap(literal(value.text), width - 18)
        return [
            line(Span(fit(f" {literal(value.name)}", 16), "strong"), first),
            *(line(" " * 16, text) for text in more),
        ]
    unit = _unit(value.name)
    kept = f"= {'below ' if value.below else ''}{value.number:.4g} {unit}".rstrip()
    written = f"{value.text} {value.unit}".strip() + (
        f" {value.species}" if value.species not in ("", value.name) else ""
    )
    return [line(Span(fit(f" {literal(value.name)}", 16), "strong"), fit(literal(written), 24), Span(kept, "faint"))]


def _unit(name: str) -> str:
    from fertui.logbook.kinds import KINDS

    field = next((found for kind in KINDS.values() if (found := kind.field(name)) is not None), None)
    return "kg" if field is None else field.unit
