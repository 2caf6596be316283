"""What the screen shows: one frozen snapshot, replaced whole when something came or was chosen."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, NamedTuple

from fertui.tui.desk import Answer

UNITS = ("mmol/L", "meq/L", "mg/L")


class Ask(NamedTuple):
    """A use case of the workbench with its arguments; what an answer is filed under."""

    use_case: str
    loop: str | None = None
    options: tuple[tuple[str, Any], ...] = ()


class Snapshot(NamedTuple):
    """Answers so far, the loop and unit chosen, who is at the keyboard, what is still being worked out.

    ``looked``: number of the last entry the person at the keyboard has seen, 0 when not known.
    """

    loops: tuple[str, ...] = ()
    loop: str = ""
    site: Any = None
    unit: str = "mmol/L"
    initials: str = ""
    answers: Mapping[Ask, Answer] = {}
    stale: frozenset[Ask] = frozenset()
    waiting: tuple[str, ...] = ()
    looked: int = 0

    def get(self, ask: Ask) -> Any:
        """The value of an answer, or None while there is none."""
        answer = self.answers.get(ask)
        return None if answer is None else answer.value

    def trouble(self, ask: Ask) -> str:
        """Why an answer could not be had, or ''."""
        answer = self.answers.get(ask)
        return "" if answer is None else answer.trouble

    @property
    def news(self) -> Ask:
        """The question what others wrote since the person at the keyboard last wrote or looked."""
        return Ask("news", None, (("by", self.initials), ("after", self.looked)))

    def lacks(self, ask: Ask) -> bool:
        """Whether this has to be worked out: never asked, or the logbook has changed since."""
        return ask not in self.answers or ask in self.stale

    def with_answer(self, ask: Ask, answer: Answer) -> Snapshot:
        """The snapshot with one more answer."""
        return self._replace(answers={**self.answers, ask: answer}, stale=self.stale - {ask})

    def outdated(self) -> Snapshot:
        """The snapshot after the logbook changed: answers stay on screen until better ones come."""
        return self._replace(stale=frozenset(self.answers))

    def next_unit(self) -> Snapshot:
        """The same in the next unit."""
        return self._replace(unit=UNITS[(UNITS.index(self.unit) + 1) % len(UNITS)])

    def next_loop(self, step: int) -> Snapshot:
        """The same of another loop."""
        if len(self.loops) < 2:
            return self
        return self._replace(loop=self.loops[(self.loops.index(self.loop) + step) % len(self.loops)])
