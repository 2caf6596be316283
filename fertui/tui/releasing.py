"""Plans and sheets with acid are released once their cautions were read and the strength on the label is the right
one."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from typing import TYPE_CHECKING, Any

from fertui.tui.desk import Answer
from fertui.tui.figures import CAUTION_INKS, MARKS
from fertui.tui.text_page import TextPage

if TYPE_CHECKING:
    from fertui.catalogue.cautions import Caution
    from fertui.tui.frame import FertuiApp

READ_THEM = "Enter: I have read these cautions. The strength on the label is asked for next. Esc: not now."


async def release(app: FertuiApp, made: Any, cautions: Iterable[Caution], then: Callable[[float], None]) -> None:
    """Show the cautions, ask for the strength, and go on only when it is the one that ``made`` counts on."""

    def strength() -> None:
        app.ask("Strength read off the label, %:", check)

    def check(text: str) -> None:
        number = _number(text)
        if number is None:
            app.ask("A number in percent, such as 38:", check)
            return

        def checked(answer: Answer) -> None:
            if answer.trouble:
                app.say_at_length("Not released", answer.trouble)
            else:
                app.acknowledged = True
                then(number)

        app.clerk(lambda bench: bench.acknowledge(made, number), checked, "the label")

    text = [f"{MARKS[CAUTION_INKS[each.severity]]} {each.text}  [{each.source}]" for each in cautions]
    await app.open_page(TextPage("Before any acid is handled", text, go_on=strength, asks=READ_THEM))


def _number(text: str) -> float | None:
    try:
        return float(text.replace(",", ".").replace("%", "").strip())
    except ValueError:
        return None
