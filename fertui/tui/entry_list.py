"""Entries of the logbook in one line each, with what was struck and why; the base of Logbook and of drill-downs."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from datetime import date, datetime
from typing import TYPE_CHECKING, Any, ClassVar, NamedTuple

from textual.binding import Binding

from fertui.site.points import point_name
from fertui.tui.ink import BLANK, Line, Span, barred, col, cut, inked, line, literal
from fertui.tui.snapshot import Ask, Snapshot
from fertui.tui.view import SCROLLING, View, waiting

if TYPE_CHECKING:
    from fertui.logbook.entries import Entry


class Wanted(NamedTuple):
    """Which entries to show; empty means all."""

    loop: str = ""
    kinds: tuple[str, ...] = ()
    by: str = ""
    text: str = ""
    start: datetime | None = None
    end: datetime | None = None
    numbers: tuple[int, ...] = ()

    def takes(self, entry: Entry) -> bool:
        """Whether an entry is wanted. Entries of no loop belong to every loop."""
        return (
            (not self.loop or entry.loop in ("", self.loop))
            and (not self.numbers or entry.number in self.numbers)
            and (not self.kinds or entry.kind in self.kinds)
            and (not self.by or entry.by.lower() == self.by.lower())
            and (self.start is None or entry.at >= self.start)
            and (self.end is None or entry.at <= self.end)
            and (not self.text or self.text.lower() in " ".join((said(entry), entry.note, entry.why)).lower())
        )


class EntryList(View):
    """Entries, newest first, with a bar to choose one."""

    TITLE = "Entries"
    HELP = (
        "Entries of the logbook, newest first. Nothing is ever overwritten: what was corrected or struck stays, "
        "crossed out, "
        "with who, when and why. Enter shows an entry whole, c corrects it, v strikes it."
    )
    BINDINGS: ClassVar[list[Any]] = [
        *SCROLLING,
        Binding("enter", "open", "whole entry", id="entry.open", tooltip="The entry under the bar with all it holds."),
        Binding("c", "correct", "correct", id="entry.correct", tooltip="Correct the entry: a new one supersedes it."),
        Binding("v", "strike", "strike", id="entry.strike", tooltip="Strike the entry; it stays, crossed out."),
        Binding("escape", "close", "back", id="page.close", tooltip="Back to where you were."),
    ]

    def __init__(
        self,
        title: str,
        loop: str = "",
        kinds: tuple[str, ...] = (),
        start: datetime | None = None,
        end: datetime | None = None,
    ) -> None:
        super().__init__()
        self.heading = title
        self.wanted = Wanted(loop, kinds, start=start, end=end)
        self.row = 0
        self._under_bar = (0, False)

    @classmethod
    def of_day(cls, day: date, loop: str) -> EntryList:
        """The entries of one local day."""
        page = cls(f"{day:%a %-d %b}", loop)
        page.day = day
        return page

    day: date | None = None

    def asks(self, snapshot: Snapshot) -> tuple[Ask, ...]:
        """The whole book: it is filtered here."""
        return (Ask("history"),)

    def entries(self, snapshot: Snapshot) -> list[Entry]:
        """The entries wanted, newest first."""
        found = [entry for entry in snapshot.get(Ask("history")) or () if self.wanted.takes(entry)]
        if self.day is not None:
            found = [entry for entry in found if self.fertui.local(entry.at).date() == self.day]
        return sorted(found, key=when_known, reverse=True)

    def draw(self, snapshot: Snapshot, width: int) -> list[Line]:
        """A heading and one line an entry; a struck one is followed by why."""
        if snapshot.get(Ask("history")) is None:
            return waiting(snapshot, Ask("history"), "the logbook", width)
        entries, struck = self.entries(snapshot), struck_by(snapshot.get(Ask("history")))
        self._keep_bar(entries, struck)
        rows = [
            line(Span(f" {literal(self.heading)}", "title"), Span(f"   {len(entries)} entries, newest first", "faint"))
        ]
        height = max(1, self.room.height - 1)
        first = max(0, min(self.row - height // 2, len(entries) - height))
        self.first_shown = first
        for index, entry in enumerate(entries[first : first + height], first):
            rows.append(self._row(entry, struck.get(entry.number or 0), index == self.row, width))
        return rows if entries else [*rows, BLANK, line(" ", Span("No entry fits.", "faint"))]

    def _row(self, entry: Entry, by: Entry | None, chosen: bool, width: int) -> Line:
        at = self.fertui.local(entry.at)
        when = f"{at:%-d %b}" if entry.whole_day else f"{at:%-d %b %H:%M}"
        words = cut(literal(self._where(entry) + said(entry, by)), width - 37)
        mark = "×" if by is not None else "▸" if chosen else "?" if entry.doubtful else " "
        row = line(
            col(f"{mark}{entry.number}", 7), col(when, 13), Span("  "), col(entry.kind, 9, "strong", right=False),
            col(literal(entry.by), 5, "faint", right=False), Span(words),
        )  # fmt: skip
        if chosen:
            return barred(row, width)
        return inked(row, "struck") if by is not None else row

    def _where(self, entry: Entry) -> str:
        """The loop of an entry in a list of several."""
        several = not self.wanted.loop and len(self.fertui.snapshot.loops) > 1
        return f"{entry.loop}: " if several and entry.loop else ""

    def _keep_bar(self, entries: Sequence[Entry], struck: Mapping[int, Entry]) -> None:
        """The bar stays on its entry when others come above it, and goes on to the one that corrects it; at the top it
        stays there, on the newest."""
        number, was_struck = self._under_bar
        if number in struck and not was_struck and not struck[number].void:
            number = struck[number].number or 0
        row = next((row for row, entry in enumerate(entries) if entry.number == number), self.row)
        self.row = max(0, min(row, len(entries) - 1))
        number = (entries[self.row].number or 0) if self.row else 0
        self._under_bar = number, number in struck

    def chosen(self) -> Entry | None:
        """The entry under the bar."""
        entries = self.entries(self.fertui.snapshot)
        return entries[self.row] if entries else None

    def _go(self, row: int) -> None:
        self.row, self._under_bar = max(0, row), (0, False)
        self.redraw()

    def action_up(self) -> None:
        """A newer entry."""
        self._go(self.row - 1)

    def action_down(self) -> None:
        """An older entry."""
        self._go(self.row + 1)

    def action_leaf(self, leaves: int) -> None:
        """A screenful on."""
        self._go(self.row + leaves * (self.room.height - 2))

    def action_top(self) -> None:
        """The newest."""
        self._go(0)

    def action_bottom(self) -> None:
        """The oldest."""
        self._go(len(self.entries(self.fertui.snapshot)) - 1)

    async def action_open(self) -> None:
        """The entry under the bar, whole."""
        from fertui.tui.entry_page import EntryPage

        if (entry := self.chosen()) is not None:
            await self.fertui.open_page(EntryPage(entry.number or 0))

    async def action_correct(self) -> None:
        """Correct the entry under the bar."""
        if (entry := self.chosen()) is not None:
            await self.fertui.correct(entry)

    def action_strike(self) -> None:
        """Strike the entry under the bar."""
        if (entry := self.chosen()) is not None:
            self.fertui.strike(entry)


def when_known(entry: Entry) -> tuple[datetime, int]:
    """By what an entry is put in order: when it happened; what is yet to come, when it was written down."""
    return min(entry.at, entry.entered), entry.number or 0


def struck_by(history: Sequence[Entry]) -> Mapping[int, Entry]:
    """For every entry that was corrected or struck, the last entry that did it."""
    return {entry.supersedes: entry for entry in history if entry.supersedes is not None}


CONCENTRATIONS = ("mmol/L", "meq/L", "umol/L")


def said(entry: Entry, by: Entry | None = None) -> str:
    """An entry in one line: point, values as written, note; for a struck one who did it and why."""
    words = [point_name(entry.point)] if entry.point else []
    if entry.kind == "site":
        words.append(entry.note or "site.toml changed")
    else:
        words += list(_values(entry))
    if entry.supersedes is not None:
        words.insert(0, f"{'strikes' if entry.void else 'corrects'} {entry.supersedes} ({entry.why})")
    if entry.note and entry.kind != "site":
        words.append(f"- {entry.note}")
    if entry.doubtful:
        words.append(f"doubtful: {entry.doubtful}")
    text = ", ".join(words)
    return (
        f"{'struck' if by.void else 'corrected'} by {by.by} in {by.number}: {by.why}. {text}"
        if by is not None
        else text
    )


def _values(entry: Entry) -> Iterator[str]:
    """Values as written, each with its unit; that of concentrations stands once, before the first of them."""
    from fertui.logbook.kinds import KINDS, unit_of

    told = ""
    for value in entry.values:
        name = value.name.removesuffix("_pct").replace("_", " ")
        unit = unit_of(KINDS[entry.kind], value.name) if entry.kind in KINDS else ""
        if value.number is None or value.unit or value.written != value.text:
            yield f"{value.label if value.species else name} {value.written}"
        elif unit in CONCENTRATIONS:
            yield f"{name} {value.text}" if told == unit or value.name == "HCO3" else f"{unit}: {name} {value.text}"
            told = unit if value.name != "HCO3" else told
        elif name in ("litres", "kg"):
            yield f"{value.text} {unit}"
        else:
            yield f"{name} {value.text} {unit}".rstrip()
