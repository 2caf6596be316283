"""What is asked when a half-filled form is found: take it up, or begin anew."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from datetime import datetime
from typing import TYPE_CHECKING

from fertui.tui.chooser import Chooser, Option
from fertui.tui.figures import age
from fertui.tui.forms.spec import Spec
from fertui.tui.ink import cut, literal
from fertui.tui.snapshot import UNITS

if TYPE_CHECKING:
    from fertui.tui.drafts import Draft
    from fertui.tui.forms.form import Form

MOST_SHOWN = 100
"""Columns of what was typed: enough to know it again, with room for the two ways below it."""


def offer(draft: Draft, form: Form, now: datetime) -> Chooser:
    """The list with the two ways; leaving it leaves the form empty and the draft kept."""
    who = f"by {cut(literal(draft.by), 16)}" if draft.by else "by someone who gave no initials"
    when = age(draft.at, max(now, draft.at))
    spec = form.spec_in(draft.unit) if form.spec.unit and draft.unit in UNITS else form.spec
    said = cut(literal(typed(spec, draft.texts)), MOST_SHOWN)
    title = f"A half-filled form {who}, {when} ago: {spec.title}, {said}"
    options = [
        Option("take it up", "go on where it was left", value="take"),
        Option("begin anew", "and forget it", value="drop"),
    ]

    def chosen(value: str) -> None:
        if value == "take":
            form.take_up(draft)
        else:
            form.fertui.drop_draft(form.spec.kind, form.loop)

    return Chooser(title, options, chosen, narrows=False)


def typed(spec: Spec, texts: Sequence[str], most: int = 6) -> str:
    """What was typed, each with the name of its field, that of its group where two fields have the same, and unit."""
    labels = Counter(each.label for each in spec.fields)
    named = [
        (f"{group.title} " if labels[each.label] > 1 else "", each) for group in spec.groups for each in group.fields
    ]
    said = [
        f"{where}{each.label} {text} {each.unit if text[-1:].isdigit() else ''}".rstrip()
        for (where, each), text in zip(named, texts, strict=False)
        if text and text != each.default
    ]
    return ", ".join(said[:most]) + (f" and {len(said) - most} more" if len(said) > most else "")
