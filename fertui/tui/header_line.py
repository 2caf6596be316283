"""The top line: where this is, what grows, of when the shown state is, who is at the keyboard."""

from __future__ import annotations

from fertui.tui.ink import Line, Span, cut, fit, literal
from fertui.tui.page import Page


class HeaderLine(Page):
    """One line, redrawn only when what it says changes."""

    def say(self, place: str, moment: str, initials: str) -> None:
        """Put these words in the line."""
        self.show([header(place, moment, initials, self.size.width)])


def header(place: str, moment: str, initials: str, width: int) -> Line:
    """The line: place on the left, time and initials on the right, the place giving way.

    >>> header("North, loop 1: tomato", "as of Tue 1 Dec 07:42", "MK", 60)[0].text
    ' North, loop 1: tomato            as of Tue 1 Dec 07:42  MK '
    """
    right = f"{moment}  {literal(initials)} " if initials else f"{moment} "
    return (Span(fit(" " + cut(literal(place), width - len(right) - 2), width - len(right)) + right, "bar"),)
