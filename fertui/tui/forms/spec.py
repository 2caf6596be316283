"""What a form asks and which entries come of it, as values. Drawing and typing are elsewhere."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import NamedTuple

from fertui.site.points import point_name

EVERY = -1
"""Number in place of an entry's for a field that belongs to all entries of a form, such as the time."""

Texts = dict[str, str]


class Asked(NamedTuple):
    """One field: which entry it goes into and under what name, how it is labelled, what may be typed.

    ``ion``: what a concentration is of, so that one written in another unit can be shown in the unit of the field.
    ``choices``: one of these, else anything; ``words``: letters are text, not units. ``default`` stands in the field
    from the start and alone makes no entry. ``unit`` is the unit a bare number is taken in.
    """

    name: str
    label: str
    unit: str = ""
    entry: int = 0
    choices: tuple[str, ...] = ()
    words: bool = False
    default: str = ""
    required: bool = False
    ion: str = ""

    @property
    def is_number(self) -> bool:
        """Whether a number is expected, so that + and * are keys and not text."""
        return not self.choices and not self.words

    @property
    def is_read(self) -> bool:
        """Whether what is typed is understood as something, a number or a time, and not kept as words."""
        return self.is_number or self.name == "at"

    def shown(self, choice: str) -> str:
        """A choice as the screen names it: points by the word of the trade."""
        return point_name(choice) if self.name == "point" else choice.replace("_", " ")


class Group(NamedTuple):
    """Fields that are walked together; Tab goes from group to group."""

    title: str
    fields: tuple[Asked, ...]


class Part(NamedTuple):
    """An entry that may come of a form: its kind and what is fixed in it."""

    kind: str
    fixed: Mapping[str, str] = {}


class Spec(NamedTuple):
    """A form: title, the entries it makes, its groups, columns of fields on a screen of 80, words of help."""

    title: str
    parts: tuple[Part, ...]
    groups: tuple[Group, ...]
    columns: int = 1
    help: str = ""
    unit: str = ""

    @property
    def fields(self) -> tuple[Asked, ...]:
        """All fields in the order of the walk."""
        return tuple(each for group in self.groups for each in group.fields)

    @property
    def kind(self) -> str:
        """Kind of its first entry: what drafts are filed under."""
        return self.parts[0].kind


def entries_of(spec: Spec, texts: Sequence[str]) -> list[tuple[str, Texts]]:
    """Kind and texts of every entry that something was typed for; a default alone makes none."""
    found = []
    for number, part in enumerate(spec.parts):
        own: Texts = dict(part.fixed)
        typed = False
        for each, text in zip(spec.fields, texts, strict=True):
            if text and each.entry in (number, EVERY):
                own[each.name] = _with_unit(each, text)
                typed = typed or (each.entry == number and text != each.default)
        if typed or (len(spec.parts) == 1 and _all_required(spec, texts)):
            found.append((part.kind, own))
    return found


def _all_required(spec: Spec, texts: Sequence[str]) -> bool:
    required = [text for each, text in zip(spec.fields, texts, strict=True) if each.required]
    return bool(required) and all(required)


def _with_unit(each: Asked, text: str) -> str:
    """The text with the unit the field shows, where none was typed and the field's is not the canonical one."""
    bare = text.replace(",", ".").lstrip("<").strip()
    plain = bare.replace(".", "", 1).isdigit()
    return f"{text} {each.unit}" if each.unit in ("mg/L", "meq/L") and plain else text
