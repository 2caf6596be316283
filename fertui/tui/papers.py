"""Sheets on the screen as they will be printed: round, handover, stock tanks, acid, report, plan."""

from __future__ import annotations

from functools import partial

from fertui.tui.desk import Answer
from fertui.tui.entering import Entering

PAPERS = {
    "round_sheet": "blank round sheet with the last values", "handover": "one page for the next shift",
    "stock": "stock-tank sheet", "acid": "acid sheet for the make-up water",
    "report": "report for consultant or inspector, last 14 days",
}  # fmt: skip
"""Sheets by the workbench's name for them."""


class Papers(Entering):
    """Shows sheets; those with acid only after their cautions and the label."""

    async def action_papers(self) -> None:
        """List the sheets."""
        from fertui.tui.chooser import Chooser, Option

        options = [Option(name.replace("_", " "), about, value=name) for name, about in PAPERS.items()]
        await self.open_page(Chooser("Which sheet?", options, self.paper))

    def paper(self, name: str) -> None:
        """Have a sheet made and show it."""
        loop, moment = self.snapshot.loop, self.moment
        show = partial(self.show_paper, name)
        if name in ("stock", "acid"):
            self.clerk(lambda bench: getattr(bench, name)(loop), partial(self._sheet_made, name), f"the {name} sheet")
        elif name == "report":
            self.quietly(lambda bench: bench.report(loop), show, "the report")
        elif name == "handover":
            self.quietly(lambda bench: bench.handover(None, moment), show, "the handover")
        else:
            self.clerk(lambda bench: getattr(bench, name)(loop, moment), show, name)

    def _sheet_made(self, name: str, answer: Answer) -> None:
        if answer.value is None:
            self.say_at_length(f"No {name} sheet", answer.trouble)
            return
        from fertui.tui.releasing import release
        from fertui.workbench.carrying_out import acids_of

        sheet, loop = answer.value, self.snapshot.loop

        def show(_: float = 0.0) -> None:
            self.clerk(
                lambda bench: getattr(bench, f"{name}_page")(sheet, loop),
                partial(self.show_paper, name),
                f"the {name} sheet",
            )

        if acids_of(sheet):
            self.call_next(release, self, sheet, sheet.cautions, show)
        else:
            show()

    def show_paper(self, name: str, answer: Answer, file_name: str = "") -> None:
        """Show a sheet as it will be printed."""
        text = answer if answer.value is None else Answer(answer.value.text.splitlines())
        self.show_text(name.replace("_", " "), text, file_name or f"{name}-{self.moment:%Y-%m-%d}.txt", printed=True)

    def show_text(self, title: str, answer: Answer, file_name: str = "", printed: bool = False) -> None:
        """Show lines of text, ``printed`` without a margin, or the sentence why there are none."""
        from fertui.tui.text_page import TextPage

        lines = answer.value if answer.value is not None else [answer.trouble]
        self.call_next(self.open_page, TextPage(title, lines, file_name, printed=printed and answer.value is not None))
