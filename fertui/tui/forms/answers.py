"""What a form has been told so far: texts, what was understood of them, what was asked about them. Immutable."""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

from fertui.tui.forms.spec import Asked, Spec
from fertui.tui.typing_line import Typed


class Answers(NamedTuple):
    """The state of a form being filled in.

    ``texts``: one a field. ``typed``: the field under the cursor as it is being typed. ``understood``: echo a field.
    ``doubts``: what is odd about a field, by number; ``settled``: doubts that were answered by keeping the value.
    """

    spec: Spec
    texts: tuple[str, ...]
    at: int = 0
    typed: Typed = Typed()
    understood: Mapping[int, str] = {}
    doubts: Mapping[int, str] = {}
    settled: frozenset[tuple[int, str]] = frozenset()

    @classmethod
    def blank(cls, spec: Spec) -> Answers:
        """Nothing typed yet, defaults in their fields."""
        texts = tuple(each.default for each in spec.fields)
        return cls(spec, texts, 0, Typed.standing(texts[0]))

    @property
    def current(self) -> Asked:
        """The field under the cursor."""
        return self.spec.fields[self.at]

    @property
    def changed(self) -> bool:
        """Whether anything was typed; a choice alone is made again in a moment."""
        pairs = zip(self.spec.fields, self.with_typed_kept().texts, strict=True)
        return any(text != each.default for each, text in pairs if not each.choices)

    @property
    def unread(self) -> int | None:
        """The first field whose text has not been understood yet, as those of a draft."""
        return next((number for number in range(len(self.texts)) if self.is_unread(number)), None)

    def is_unread(self, number: int) -> bool:
        """Whether a field holds a text that is to be read and was not yet; what stood there from the start was."""
        each, text = self.spec.fields[number], self.texts[number]
        known = number in self.understood or (number, text) in self.settled
        return bool(text) and each.is_read and text != each.default and not known

    @property
    def missing(self) -> int | None:
        """The first field that may not stay empty and is."""
        pairs = enumerate(zip(self.spec.fields, self.texts, strict=True))
        return next((number for number, (each, text) in pairs if each.required and not text), None)

    def with_typed_kept(self) -> Answers:
        """What is being typed counts as the text of its field."""
        text = self.typed.text.strip()
        if text == self.texts[self.at]:
            return self
        texts = (*self.texts[: self.at], text, *self.texts[self.at + 1 :])
        without = {number: echo for number, echo in self.understood.items() if number != self.at}
        return self._replace(texts=texts, understood=without)

    def in_form(self, spec: Spec) -> Answers:
        """The same texts in the form of another unit: what was understood or asked of the old one counts no more."""
        same = {number for number, each in enumerate(spec.fields) if each.unit == self.spec.fields[number].unit}
        return self._replace(
            spec=spec,
            understood={number: echo for number, echo in self.understood.items() if number in same},
            doubts={number: doubt for number, doubt in self.doubts.items() if number in same},
            settled=frozenset((number, text) for number, text in self.settled if number in same),
        )

    def moved(self, to: int) -> Answers:
        """The cursor in another field, what was typed kept."""
        kept = self.with_typed_kept()
        to = max(0, min(to, len(self.spec.fields) - 1))
        return kept._replace(at=to, typed=Typed.standing(kept.texts[to]))

    def next_group(self, step: int = 1) -> Answers:
        """The cursor in the first field of the next group, round about."""
        starts, number = [], 0
        for group in self.spec.groups:
            starts.append(number)
            number += len(group.fields)
        own = max(index for index, start in enumerate(starts) if start <= self.at)
        return self.moved(starts[(own + step) % len(starts)])

    def emptied(self) -> Answers:
        """The field under the cursor ready to be typed anew."""
        return self if self.current.choices else self._replace(typed=Typed())

    def type(self, characters: str) -> Answers:
        """Characters typed: into the text, or to pick a choice by its beginning."""
        if self.current.choices:
            return self._picked(characters)
        return self._replace(typed=self.typed.insert(characters))

    def edit(self, key: str) -> Answers | None:
        """An editing key, None when it is none here."""
        if self.current.choices:
            step = {"left": -1, "right": 1, "space": 1}.get(key)
            return None if step is None else self._stepped(step)
        typed = self.typed.edit(key)
        return None if typed is None else self._replace(typed=typed)

    def _picked(self, characters: str) -> Answers:
        """The next choice that begins with the character typed."""
        choices, character = self.current.choices, characters[:1].lower()
        if character == " ":
            return self._stepped(1)
        here = choices.index(self.typed.text) if self.typed.text in choices else -1
        for choice in (*choices[here + 1 :], *choices[: here + 1]):
            if any(word.lower().startswith(character) for word in (choice, self.current.shown(choice))):
                return self._replace(typed=Typed.at_end(choice))
        return self

    def _stepped(self, step: int) -> Answers:
        choices = self.current.choices
        here = choices.index(self.typed.text) if self.typed.text in choices else -1 if step > 0 else 0
        return self._replace(typed=Typed.at_end(choices[(here + step) % len(choices)]))

    def heard(self, number: int, echo: str, doubt: str) -> Answers:
        """What was understood of a field, and what is odd about it."""
        doubts = {**self.doubts, number: doubt} if doubt else {n: d for n, d in self.doubts.items() if n != number}
        return self._replace(understood={**self.understood, number: echo}, doubts=doubts)

    def settle(self, number: int) -> Answers:
        """The doubt about a field is answered: its value stays."""
        doubts = {n: d for n, d in self.doubts.items() if n != number}
        return self._replace(doubts=doubts, settled=self.settled | {(number, self.texts[number])})
