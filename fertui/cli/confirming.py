"""Odd values on the command line: asked about where somebody can answer, else kept with their question."""

from __future__ import annotations

import sys
from collections.abc import Sequence
from typing import TYPE_CHECKING

from fertui.refusals import Refusal

if TYPE_CHECKING:
    from fertui.logbook.entries import Entry
    from fertui.logbook.questions import Question


def confirmed(questions: Sequence[Question]) -> bool:
    """Print what is odd; True where somebody at a terminal wants it logged all the same, False where nobody is asked.

    Raises ``Refusal`` where the answer is no.
    """
    for question in questions:
        print(f"? {question.text}", file=sys.stderr)
    if not questions or not sys.stdin.isatty():
        return False
    print("Log it all the same? y or n: ", end="", file=sys.stderr, flush=True)
    if _typed().lower() not in ("y", "yes"):
        raise Refusal("nothing was logged. Give it again with the right values.")
    return True


def say_how_to_undo(entry: Entry, site: str) -> None:
    """Nobody answered: which question stays with the entry, and how it is corrected or struck."""
    if entry.flags:
        number, flags = entry.number, ", ".join(entry.flags.split())
        print(
            f"Logged as {number} with its open question ({flags}). If it is wrong:",
            f'  fertui supersede {site} {number} name=value why="..." by=...   corrects it',
            f'  fertui void {site} {number} why="..." by=...   strikes it',
            sep="\n",
            file=sys.stderr,
        )


def _typed() -> str:
    try:
        return input().strip()
    except EOFError:
        return ""
