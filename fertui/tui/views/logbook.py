"""Logbook: every entry, filtered by kind, loop, person and text; correct, strike, export."""

from __future__ import annotations

from pathlib import Path
from typing import Any, ClassVar

from textual.binding import Binding

from fertui.tui.desk import Answer
from fertui.tui.entry_list import EntryList, Wanted
from fertui.tui.snapshot import Ask


class LogbookView(EntryList, inherit_bindings=False):
    """The whole book."""

    TITLE = "Logbook"
    HELP = (
        f"{EntryList.HELP} f shows one kind only, l one loop or all, i one person, / entries with a text in them, "
        f"Backspace shows all again. "
        "o writes the book as tables (CSV, one file a kind), y keeps a backup of book and site in one file."
    )
    BINDINGS: ClassVar[list[Any]] = [
        *(binding for binding in EntryList.BINDINGS if isinstance(binding, Binding) and binding.id != "page.close"),
        Binding("f", "kind", "kind", id="logbook.kind", tooltip="Show one kind only."),
        Binding("l", "one_loop", "loop", show=False, id="logbook.loop", tooltip="Show this loop only, or all."),
        Binding("i", "person", "person", show=False, id="logbook.person", tooltip="Show what one person wrote."),
        Binding("slash", "text", "search", id="logbook.text", tooltip="Show entries with a text in them."),
        Binding("backspace", "everything", "all", show=False, id="logbook.all", tooltip="Show every entry again."),
        Binding("o", "export", "export", show=False, id="logbook.export", tooltip="Write the book as tables (CSV)."),
        Binding("y", "backup", "backup", show=False, id="logbook.backup", tooltip="Keep book and site in one file."),
    ]

    def __init__(self) -> None:
        super().__init__("All entries")

    def _filter(self, wanted: Wanted) -> None:
        self.wanted, self.row, self._under_bar = wanted, 0, (0, False)
        words = [
            "since you looked" if wanted.numbers else "",
            *wanted.kinds,
            wanted.loop,
            f"by {wanted.by}" if wanted.by else "",
            f"with {wanted.text!r}" if wanted.text else "",
        ]
        self.heading = ", ".join(filter(None, words)) or "All entries"
        self.redraw()

    def show_news(self, numbers: tuple[int, ...]) -> None:
        """Show these entries alone, of every loop."""
        self._filter(Wanted(numbers=numbers))

    async def action_kind(self) -> None:
        """Choose a kind."""
        from fertui.logbook.kinds import KINDS
        from fertui.tui.chooser import Chooser, Option

        options = [Option("all kinds", value="all kinds"), *(Option(kind.name, kind.about) for kind in KINDS.values())]
        await self.fertui.open_page(
            Chooser(
                "Show which kind?",
                options,
                lambda kind: self._filter(self.wanted._replace(kinds=() if kind == "all kinds" else (kind,))),
            )
        )

    def action_one_loop(self) -> None:
        """This loop, or all."""
        self._filter(self.wanted._replace(loop="" if self.wanted.loop else self.fertui.snapshot.loop))

    async def action_person(self) -> None:
        """Choose a person."""
        from fertui.tui.chooser import Chooser, Option

        people = sorted({entry.by for entry in self.fertui.snapshot.get(Ask("history")) or ()})
        options = [Option("everybody", value=" "), *(Option(person) for person in people)]
        await self.fertui.open_page(
            Chooser("Whose entries?", options, lambda person: self._filter(self.wanted._replace(by=person.strip())))
        )

    def action_text(self) -> None:
        """Ask for a text."""
        self.fertui.ask(
            "Entries with this in them:", lambda text: self._filter(self.wanted._replace(text=text)), self.wanted.text
        )

    def action_everything(self) -> None:
        """No filter."""
        self._filter(Wanted())

    def action_export(self) -> None:
        """Ask where to, and write the tables."""

        def into(folder: str) -> None:
            if folder:
                self.fertui.clerk(lambda bench: bench.export(Path(folder).expanduser()), self._exported, "the export")

        self.fertui.ask("Write tables into folder:", into, "tables")

    def _exported(self, answer: Answer) -> None:
        if answer.value is None:
            self.fertui.say(answer.trouble, "act")
        else:
            self.fertui.say(
                f"wrote {len(answer.value)} tables, first {answer.value[0] if answer.value else 'none'}", "good"
            )

    def action_backup(self) -> None:
        """Ask where to, and keep everything."""

        def into(path: str) -> None:
            if path:
                self.fertui.clerk(lambda bench: bench.backup(Path(path).expanduser()), self._kept, "the backup")

        self.fertui.ask("Backup file:", into, f"{self.fertui.folder.name}-{self.fertui.moment:%Y-%m-%d}.jsonl")

    def _kept(self, answer: Answer) -> None:
        self.fertui.say(answer.trouble or f"backup in {answer.value}", "act" if answer.trouble else "good")
