"""A form being filled in: the walk from field to field, what is asked back, saving."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from typing import TYPE_CHECKING, Any, ClassVar

from textual import events
from textual.binding import Binding

from fertui.tui.desk import Answer
from fertui.tui.figures import MARKS
from fertui.tui.forms.answers import Answers
from fertui.tui.forms.clerking import doubts_of, look_over, record, saved_words
from fertui.tui.forms.drawing import Last, draw_form, hint_of, in_unit, last_of, messages
from fertui.tui.forms.spec import Spec, Texts, entries_of
from fertui.tui.ink import BLANK, Line, Span, cells, line, literal
from fertui.tui.snapshot import UNITS, Ask, Snapshot
from fertui.tui.typing_line import Typed
from fertui.tui.view import View

if TYPE_CHECKING:
    from fertui.tui.drafts import Draft
    from fertui.workbench import Bench

ROUND = "reading"
"""Kind of the form that is walked loop by loop."""
FEWEST_TO_CHECK = 8
"""Texts of an analysis from which its charge balance is worth showing."""
MESSAGE_ROWS = 4
"""Lines at the foot of a form for what is asked back and what does not fit together."""


class Form(View):
    """Asks the fields of a form, one after the other, and makes entries of them."""

    TITLE = "Entry"
    BINDINGS: ClassVar[list[Any]] = [
        Binding(
            "enter",
            "next",
            "next",
            id="form.next",
            tooltip="Keep the value, go to the next field; after the last: save; on a round then the next loop.",
        ),
        Binding("down", "step(1)", "down", show=False, id="form.down", tooltip="The field below."),
        Binding("up", "step(-1)", "up", show=False, id="form.up", tooltip="The field above."),
        Binding("tab", "group(1)", "group", id="form.group", tooltip="The first field of the next group."),
        Binding("shift+tab", "group(-1)", "group before", show=False, id="form.back", tooltip="The group before."),
        Binding("plus,f2", "save", "save", id="form.save", tooltip="Save (in a text field F2, as + is text there)."),
        Binding(
            "f4,u",
            "app.unit",
            "unit",
            show=False,
            id="form.unit",
            tooltip="Another unit for bare numbers (F4 from any field, u in an empty one).",
        ),
        Binding("asterisk,f3", "same", "last value", id="form.same", tooltip="Take the last value again."),
        Binding(
            "escape", "close", "leave", id="form.leave", tooltip="Leave; what was typed is kept and offered again."
        ),
        Binding("f1,question_mark", "app.help", "help", id="help", tooltip="What this form is for."),
    ]

    def __init__(self, spec_in: Callable[[str], Spec], unit: str, loop: str) -> None:
        super().__init__()
        self.spec_in, self.spec, self.loop = spec_in, spec_in(unit), loop
        self.TITLE, self.HELP = self.spec.title, self.spec.help  # type: ignore[misc]
        self.answers = Answers.blank(self.spec)
        self._words: list[tuple[str, str]] = []
        self._checked: list[tuple[str, str]] = []
        self._done = False
        self._asked_back = False
        self._stray = False
        self._walked_through = False
        self._doubted: dict[int, tuple[str, ...]] = {}
        self._confirmed: frozenset[str] = frozenset()

    # drawing

    def redraw(self) -> None:
        """Draw again, in the unit that is chosen now."""
        unit = self.fertui.snapshot.unit
        if self.spec.unit and self.spec.unit != unit:
            self.spec = self.spec_in(unit)
            self.answers = self.answers.in_form(self.spec)
            self._words, self._checked = [(f"Bare numbers are {unit} now, those already typed too.", "watch")], []
        super().redraw()

    def asks(self, snapshot: Snapshot) -> tuple[Ask, ...]:
        """The last values."""
        return (Ask("previous", self.loop),)

    def draw(self, snapshot: Snapshot, width: int) -> list[Line]:
        """Title, fields, and at the foot what is said back."""
        last: Last = snapshot.get(Ask("previous", self.loop)) or {}
        rows, at = draw_form(self.answers, last, self.fertui.moment, width)
        unit = f"in {self.spec.unit} (u)" if self.spec.unit else "empty: not measured"
        name, saves = f" {self.spec.title}, {literal(self.loop)}", f"   {how_to_save(snapshot.initials)}"
        both = f"   {unit}; {saves.strip()}"
        title = line(Span(name, "title"), Span(both if cells(name + both) <= width else saves, "faint"))
        height = max(1, self.room.height - 1 - self._foot)
        top = max(0, min(at - height + 2, len(rows) - height))
        shown = [*rows[top : top + height], *[BLANK] * (height - len(rows))]
        return [title, *shown, *messages(self._said(), width, self._foot)]

    def _said(self) -> list[tuple[str, str]]:
        """What is said at the foot: checks, what is asked back, else what the field takes."""
        return [*self._checked, *self._words] or [(hint_of(self.answers.current), "faint")]

    @property
    def _foot(self) -> int:
        return MESSAGE_ROWS

    def say(self, *words: tuple[str, str]) -> None:
        """Say sentences at the foot, each in its ink."""
        self._words = list(words)
        self.redraw()

    # keys

    def take_key(self, event: events.Key) -> bool:
        """Text and editing keys go into the field; anything else is left to the keys of the form."""
        current, character = self.answers.current, event.character
        if event.is_printable and character:
            if (current.is_number and character in "+*?") or (character == "u" and self._free_for_unit):
                return False
            self._type(character)
            return True
        edited = self.answers.edit(event.key)
        if edited is None:
            return False
        self._asked_back = self._stray = False
        self._set(edited)
        return True

    @property
    def _free_for_unit(self) -> bool:
        """Whether u is the key of the unit: in an empty or doubted number field, or where no choice begins with it."""
        current, text = self.answers.current, self.answers.typed.text
        unheard = bool(current.choices) and not any(current.shown(each).startswith("u") for each in current.choices)
        return bool(self.spec.unit) and (unheard or (current.is_number and (not text or self._asked_back)))

    def take_paste(self, text: str) -> None:
        """Pasted text counts as typed."""
        if text and not self.answers.current.choices:
            self._type(text)

    def _type(self, characters: str) -> None:
        """Put characters into the field: after a question in place of what was asked about; no letter begins a
        number."""
        answers = self.answers.emptied() if self._asked_back else self.answers
        begins = not answers.typed.text or answers.typed.found
        self._stray = answers.current.is_number and begins and characters[0].isalpha()
        if self._stray:
            self.say((f"A number goes here. {how_to_save(self.fertui.snapshot.initials)}.", "watch"))
            return
        self._asked_back = False
        self._set(answers.type(characters))

    def _set(self, answers: Answers) -> None:
        self.answers = answers
        self.redraw()

    def action_step(self, step: int) -> None:
        """The field above or below."""
        self._leave_field(lambda: self._set(self.answers.moved(self.answers.at + step)))

    def action_group(self, step: int) -> None:
        """The first field of another group."""
        self._leave_field(lambda: self._set(self.answers.next_group(step)))

    def action_next(self) -> None:
        """The next field; after the last one, save."""
        if self._stray:  # the Enter that ends letters typed where a number goes
            self._stray = False
            return
        at = self.answers.at
        if at in self.answers.doubts and self.answers.typed.text == self.answers.texts[at]:
            self._confirmed |= set(self._doubted.get(at, ()))
            self.answers = self.answers.settle(at)
        if at + 1 < len(self.spec.fields):
            self._leave_field(lambda: self._set(self.answers.moved(at + 1)))
        else:
            self._walked_through = True
            self.action_save()

    def action_same(self) -> None:
        """The last value again."""
        last: Last = self.fertui.snapshot.get(Ask("previous", self.loop)) or {}
        before = last_of(last, self.answers, self.answers.current)
        if before is None:
            self.say(("There is no last value of this in the logbook.", "watch"))
        else:
            self._set(self.answers._replace(typed=Typed.standing(in_unit(before, self.answers.current))))

    def action_close(self) -> None:
        """Leave; what was typed is kept."""
        self.keep()
        self.finish()

    def finish(self) -> None:
        """Take the form off the screen."""
        self._done = True
        self.fertui.close_page()

    # what a field holds

    def _leave_field(self, go_on: Callable[[], None]) -> None:
        """Have the field understood before the cursor leaves it; a refusal or a doubt keeps it there."""
        self._asked_back = self._stray = False
        self.answers = self.answers.with_typed_kept()
        number, each = self.answers.at, self.answers.current
        if not self.answers.is_unread(number):
            self._words = []
            go_on()
            return
        kind, texts = self._entry_with(number)
        loop = self.loop

        def look(bench: Bench) -> tuple[str, tuple[str, ...]]:
            return bench.echo(kind, each.name, texts[each.name], loop), doubts_of(bench, kind, texts, each.name, loop)

        self.fertui.clerk(look, lambda answer: self._heard(number, answer, go_on), "a field")

    def _heard(self, number: int, answer: Answer, go_on: Callable[[], None]) -> None:
        if answer.value is None:
            self._ask_back((answer.trouble, "act"), *self._unit_hint(number))
        else:
            echo, self._doubted[number] = answer.value
            doubts = self._doubted[number]
            self.answers = self.answers.heard(number, echo, " ".join(doubts))
            if doubts:
                self._ask_back(
                    *((doubt, "watch") for doubt in doubts),
                    ("Enter keeps it; or type it again.", "faint"),
                    *self._unit_hint(number),
                )
            else:
                label = self.spec.fields[number].label
                self._words = [(f"{label}: {echo}", "good")] if self.spec.columns > 1 else []
                go_on()
                self.keep()
                self._check()

    def _unit_hint(self, number: int) -> tuple[tuple[str, str], ...]:
        """The way out where a bare number may have been meant in another unit."""
        each = self.spec.fields[number]
        bare = self.answers.texts[number][-1:].isdigit()
        return (
            ((f"If the whole report is not in {each.unit}, u changes the unit.", "faint"),) if each.ion and bare else ()
        )

    def _ask_back(self, *words: tuple[str, str]) -> None:
        """Ask about the field; keys typed before the question was seen answer nothing and are left out."""
        self._asked_back = True
        left_out = self.fertui.drop_held_keys()
        self.say(*words, *([(f"{left_out} keys typed ahead were left out.", "watch")] if left_out else []))

    def _check(self) -> None:
        """For an analysis: whether what is typed so far holds together."""
        found = entries_of(self.spec, self.answers.texts)
        if self.spec.kind != "analysis" or not found or len(found[0][1]) < FEWEST_TO_CHECK:
            return
        texts, loop = {**found[0][1], "by": "?"}, self.loop
        self.fertui.quietly(lambda bench: bench.check_analysis(texts, loop), self._check_came, "the check")

    def _check_came(self, answer: Answer) -> None:
        rows = answer.value or ()
        self._checked = [
            (f"{MARKS['good' if row.passed else 'act']} {row.what}: {row.remark}", "good" if row.passed else "act")
            for row in rows[:1] + tuple(row for row in rows[1:] if row.unit == "-" or not row.passed)
        ]
        if not self._done:
            self.redraw()

    def _entry_with(self, number: int) -> tuple[str, Texts]:
        """Kind and texts of the entry a field belongs to, as far as it is filled in."""
        each = self.spec.fields[number]
        part = self.spec.parts[max(each.entry, 0)]
        for kind, texts in entries_of(self.spec, self.answers.texts):
            if kind == part.kind and part.fixed.items() <= texts.items() and each.name in texts:
                return kind, {**texts, "by": self.fertui.snapshot.initials or "?"}
        return part.kind, {**part.fixed, each.name: self.answers.texts[number], "by": "?"}

    # saving

    def action_save(self) -> None:
        """Look the whole form over, ask for initials where needed, write, and show what was read back."""
        self._leave_field(self._read_rest)

    def _read_rest(self) -> None:
        """Have what was not understood yet read field by field; the cursor stays in one that cannot be."""
        number = self.answers.unread
        if number is None:
            self._look_over()
        else:
            self.answers = self.answers.moved(number)
            self._leave_field(self._read_rest)

    def _look_over(self) -> None:
        """Look at the entries as wholes."""
        found, missing = entries_of(self.spec, self.answers.texts), self.answers.missing
        if not found:
            self.say(("Nothing is filled in yet. Esc leaves the form.", "watch"))
            return
        if missing is not None:
            self.answers = self.answers.moved(missing)
            self.say((f"{self.answers.current.label}: this cannot be left empty.", "act"))
            return
        by, loop = self.fertui.snapshot.initials or "?", self.loop
        self.fertui.clerk(lambda bench: look_over(bench, found, by, loop), self._looked, "the form")

    def _looked(self, answer: Answer) -> None:
        if answer.value is None:
            self.say((answer.trouble, "act"))
            return
        if not self._asks_again(answer.value):
            self.fertui.with_initials(self._write)

    def _asks_again(self, questions: Iterable[str]) -> bool:
        """Ask what has not been answered yet, the cursor in the field it is about; saving again is the answer."""
        still_open = [text for text in questions if text not in self._confirmed]
        if not still_open:
            return False
        self._confirmed |= set(still_open)
        about = (number for number, doubts in self._doubted.items() if set(doubts) & set(still_open))
        self.answers = self.answers.moved(next(about, self.answers.at))
        self.say(*((text, "watch") for text in still_open), ("Save again (+ or F2) to keep it as it is.", "faint"))
        return True

    def _write(self, initials: str) -> None:
        entries = [(kind, {**texts, "by": initials}) for kind, texts in entries_of(self.spec, self.answers.texts)]
        loop = self.loop
        self.fertui.clerk(lambda bench: record(bench, entries, loop), self._written, "saving")

    def _written(self, answer: Answer) -> None:
        if answer.value is None:
            kept = "the form is kept" if self.keep() else "no draft can be kept either: leave the form open or copy it"
            self.say((f"Nothing was saved; {kept}.", "watch"), (answer.trouble, "act"))
            return
        written, last_number = answer.value
        self.fertui.drop_draft(self.spec.kind, self.loop)
        self.finish()
        self.fertui.changed(last_number)
        if self._walked_through and self.spec.kind == ROUND:
            self.fertui.go_on_round(saved_words(written))
        else:
            self.fertui.say(saved_words(written), "good")

    # drafts

    def keep(self) -> bool:
        """Keep what is typed so far; False where that cannot be done."""
        if not self.answers.changed or self._done:
            return True
        return self.fertui.keep_draft(self.spec.kind, self.loop, self.answers.with_typed_kept().texts)

    def take_up(self, draft: Draft) -> None:
        """Go on with a draft of this form, in the unit it was typed in."""
        texts = draft.texts
        if self.spec.unit and draft.unit in UNITS:
            self.fertui.choose_unit(draft.unit)
        if len(texts) == len(self.spec.fields):
            first_empty = next((i for i, text in enumerate(texts) if not text), 0)
            self._set(self.answers._replace(texts=texts, typed=Typed.standing(texts[0]), at=0).moved(first_empty))


def how_to_save(initials: str) -> str:
    """The key that saves, and under whose initials.

    >>> how_to_save(""), how_to_save("MK")
    ('+ saves, then asks your initials', '+ saves as MK')
    """
    return f"+ saves as {literal(initials)}" if initials else "+ saves, then asks your initials"
