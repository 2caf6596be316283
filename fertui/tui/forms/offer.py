"""What is asked when a half-filled form is found: take it up, or begin anew."""

from __future__ import annotations

from datetime import datetime
from typing import TYPE_CHECKING

from fertui.tui.chooser import Chooser, Option
from fertui.tui.figures import age
from fertui.tui.ink import literal

if TYPE_CHECKING:
    from fertui.tui.drafts import Draft
    from fertui.tui.forms.form import Form


def offer(draft: Draft, form: Form, now: datetime) -> Chooser:
    """The list with the two ways; leaving it leaves the form empty and the draft kept."""
    typed = [text for text, each in zip(draft.texts, form.spec.fields, strict=False) if text and text != each.default]
    who = f"by {draft.by}" if draft.by else "by someone who gave no initials"
    title = f"A half-filled form {who}, {age(draft.at, max(now, draft.at))} ago: {literal(', '.join(typed[:6]))}"
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
