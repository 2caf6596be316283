"""What a form has the clerk do: doubt a value, look the entries over, write them, tell what was read back."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING

from fertui.tui.forms.spec import Texts

if TYPE_CHECKING:
    from fertui.logbook.entries import Entry
    from fertui.workbench import Bench


def doubts_of(bench: Bench, kind: str, texts: Texts, name: str, loop: str) -> tuple[str, ...]:
    """What is odd about one field of an entry that may not be complete yet."""
    from fertui.refusals import Refusal

    try:
        asked = bench.questions(kind, texts, loop)
    except Refusal:  # an incomplete entry cannot be asked about as a whole; the value itself was understood
        return ()
    return tuple(question.text for question in asked if question.field and question.field.lower() == name.lower())


def look_over(bench: Bench, found: list[tuple[str, Texts]], by: str, loop: str) -> list[str]:
    """Everything odd about the entries of a form, each text once."""
    asked: list[str] = []
    for kind, texts in found:
        asked += [question.text for question in bench.questions(kind, {**texts, "by": by}, loop)]
    return list(dict.fromkeys(asked))


def record(bench: Bench, entries: list[tuple[str, Texts]], loop: str) -> tuple[tuple[Entry, ...], int]:
    """Write all entries of a form or none; returns them as read back and the number of the last entry there is."""
    return bench.record_all(entries, loop), bench.last_number()


def saved_words(entries: Iterable[Entry]) -> str:
    """What was read back from the logbook, in one line."""
    from fertui.tui.entry_list import said

    return "saved " + "; ".join(f"{entry.number} {entry.kind} {said(entry)}" for entry in entries)
