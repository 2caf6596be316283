"""Correcting an entry: its texts in a form, and the reason, which is never left out."""

from __future__ import annotations

from typing import TYPE_CHECKING

from fertui.tui.desk import Answer
from fertui.tui.forms.answers import Answers
from fertui.tui.forms.form import Form
from fertui.tui.forms.spec import Asked, Group, Part, Spec

if TYPE_CHECKING:
    from fertui.logbook.entries import Entry

ABOUT = ("point", "note", "doubtful")


class Correction(Form):
    """The form of one entry. What is changed goes into a new entry that supersedes the old one; the old one stays."""

    def __init__(self, entry: Entry) -> None:
        super().__init__(lambda _: spec_of(entry), "", entry.loop)
        self.entry = entry
        self.answers = Answers.blank(self.spec)

    def keep(self) -> bool:
        """A correction half typed is not kept: it belongs to this entry as it stood."""
        return True

    def _look_over(self) -> None:
        """Ask for the reason once every changed value is understood and its doubts are answered, then write."""
        pairs = zip(self.spec.fields, self.answers.texts, strict=True)
        changes = {each.name: text for each, text in pairs if text != each.default}
        if not changes:
            self.say(("Nothing is changed. Esc leaves the form.", "watch"))
            return
        if self._asks_again(text for number in self.answers.doubts for text in self._doubted[number]):
            return

        def because(why: str) -> None:
            if not why:
                self.say(("Nothing was corrected: a reason is needed.", "watch"))
                return
            number = self.entry.number or 0
            self.fertui.with_initials(
                lambda by: self.fertui.clerk(
                    lambda bench: bench.supersede(number, changes, why, by), self._corrected, "correcting"
                )
            )

        self.fertui.ask(f"Why is entry {self.entry.number} corrected?", because)

    def _corrected(self, answer: Answer) -> None:
        if answer.value is None:
            self.say((answer.trouble, "act"))
            return
        self.finish()
        self.fertui.wrote(answer)


def spec_of(entry: Entry) -> Spec:
    """A form with a field for every text the entry holds, as it was written, and for those it might have held."""
    from fertui.logbook.kinds import kind_named

    kind = kind_named(entry.kind)
    held = {value.name for value in entry.values}
    values = (
        *(_asked(value.species or value.name, kind.field(value.name), value.written) for value in entry.values),
        *(_asked(name, kind.field(name), "") for name in kind.names if name not in held),
    )
    about = tuple(Asked(name, name, words=True, default=getattr(entry, name)) for name in ABOUT)
    when = Asked("at", "when", words=True)
    help_text = (
        "Change what was wrong and save. The old entry stays, crossed out, with your initials, the time and the "
        "reason. "
        "An emptied field takes the value out. Leave 'when' empty to keep the time of the event."
    )
    return Spec(
        f"Correct {entry.number}, {entry.kind}",
        (Part(entry.kind),),
        (Group("values", values), Group("about", (*about, when))),
        help=help_text,
    )


def _asked(name: str, field: object, text: str) -> Asked:
    unit = getattr(field, "unit", "kg")
    words = not getattr(field, "is_number", True)
    return Asked(name, name, unit, words=words, default=text)
