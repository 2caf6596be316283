"""Intended steps in the logbook: what a plan entry is about, and what part of it is still to do."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from fertui.logbook.entries import Entry

ENOUGH = 0.97
"""Weighed to within 3 % counts as done: what a scale step and a spilled spoon make (common practice, no source)."""
DONE_NAME = {"bleed": "litres"}
"""What the amount of a plan entry is called in the entry that carries it out, where that differs."""


def is_step(entry: Entry) -> bool:
    """Whether an entry is a step to carry out; coming water, light or feed alone are expectations."""
    if entry.kind != "plan":
        return False
    return any(entry.text_of(name) for name in ("salt", "acid", "recipe")) or entry.number_of("bleed") is not None


def subject(step: Entry) -> tuple[str, str, str]:
    """What a step is about, the name of its amount, and the unit of that."""
    if step.text_of("salt"):
        return step.text_of("salt"), "kg", "kg"
    if step.text_of("acid"):
        return step.text_of("acid"), "litres", "L"
    if step.number_of("bleed") is not None:
        return "bleed", "bleed", "L"
    return "recipe", "", ""


def carried_out(entries: Iterable[Entry]) -> dict[int, list[Entry]]:
    """The entries that carry out plan entries, by the number of the plan entry."""
    done: dict[int, list[Entry]] = {}
    for entry in entries:
        if entry.kind != "plan" and (number := entry.number_of("plan")) is not None:
            done.setdefault(int(number), []).append(entry)
    return done


def given(step: Entry, done: Sequence[Entry]) -> float | None:
    """How much of a step was weighed, poured or let go, in the unit of the step; None where nothing says."""
    name = subject(step)[1]
    amounts = [amount for entry in done if (amount := entry.number_of(DONE_NAME.get(name, name))) is not None]
    return sum(amounts) if amounts else None


def part_left(wanted: float | None, so_far: float | None) -> float:
    """What part of a step that was begun is still to do [-]; nothing where no amount was planned or told.

    >>> part_left(2.0, 0.5), part_left(2.0, 1.96), part_left(None, None)
    (0.75, 0.0, 0.0)
    """
    if not wanted or so_far is None or so_far >= ENOUGH * wanted:
        return 0.0
    return 1.0 - so_far / wanted
