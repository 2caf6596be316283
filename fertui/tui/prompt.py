"""One question in the bottom line, answered by typing."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, ClassVar

from textual import events
from textual.binding import Binding

from fertui.tui.ink import Line, Span, cells, cut_words, line, literal
from fertui.tui.page import Page
from fertui.tui.typing_line import Typed

PROMPT_KEYS = ("  Enter takes it, Esc leaves it ", "  Enter  Esc ")
"""What the two keys of a question do, as long as there is room for it."""
SHORTEST = 12
"""Columns there are for an answer, however long the question is."""
MEANT = ("prompt.answer", "prompt.drop", "leave.at_once")
"""Keys that mean something while a question stands, whatever keys the settings give them."""


class Prompt(Page, can_focus=True):
    """Takes the place of the key line while it asks; Enter answers, Esc takes the question back."""

    BINDINGS: ClassVar[list[Any]] = [
        Binding("enter", "answer", "take it", id="prompt.answer", tooltip="Answer with what is typed."),
        Binding("escape", "drop", "leave it", id="prompt.drop", tooltip="Take the question back; nothing happens."),
    ]

    def __init__(self) -> None:
        super().__init__()
        self.display = False
        self._question = ""
        self._typed = Typed()
        self._then: Callable[[str], object] = str

    def ask(self, question: str, then: Callable[[str], object], text: str = "") -> None:
        """Put a question; ``then`` gets the answer."""
        self._question, self._then, self._typed = question, then, Typed.standing(text)
        self.display = True
        self.screen.set_focus(self, scroll_visible=False)
        self.redraw()

    def redraw(self) -> None:
        """The question and the answer so far."""
        if self.size.width:
            self.show([question_line(self._question, self._typed, self.size.width)])

    def take_key(self, event: events.Key) -> bool:
        """Type and edit; no other key reaches the views while a question stands."""
        active = self.screen.active_bindings.get(event.key)
        if active is not None and active.binding.id in MEANT:
            return False
        if event.is_printable and event.character:
            self._typed = self._typed.insert(event.character)
        else:
            self._typed = self._typed.edit(event.key) or self._typed
        self.redraw()
        return True

    def take_paste(self, text: str) -> None:
        """Pasted text counts as typed."""
        self._typed = self._typed.insert(text)
        self.redraw()

    def action_answer(self) -> None:
        """Hand over the answer."""
        answer, then = self._typed.text.strip(), self._then
        self.fertui.end_prompt()
        then(answer)

    def action_drop(self) -> None:
        """Forget the question."""
        self.fertui.end_prompt()
        self.fertui.say("Left unanswered; nothing was saved or changed.", "watch")


def question_line(question: str, typed: Typed, width: int) -> Line:
    """The question, the answer so far, and the two keys."""
    question = f" {cut_words(literal(question), width - SHORTEST - 2)} "
    keys = next((keys for keys in PROMPT_KEYS if cells(question) + SHORTEST + len(keys) <= width), "")
    room = width - cells(question) - len(keys)
    return line(Span(question, "strong"), *typed.shown(room), Span(keys, "faint"))
