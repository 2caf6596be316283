"""Accepted steps that are still to do: when they are expected, and the words that say so."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import NamedTuple
from zoneinfo import ZoneInfo

import numpy as np

from fertui.estimate.record import Record
from fertui.logbook.entries import Entry
from fertui.logbook.intended import is_step, subject

GONE_BY_DAYS = 7.0
"""So long a step that was never marked is spoken of after its day."""


class Planned(NamedTuple):
    """A plan entry, from when until when it holds [d from the record's zero], and the part still to do [-]."""

    entry: Entry
    begin: float
    end: float
    left: float

    def amount(self, name: str) -> float:
        """What is still to do of an amount, in its own unit."""
        return self.left * (self.entry.number_of(name) or 0.0)


def plans_of(record: Record) -> list[Planned]:
    """Plan entries of a record that are not carried out."""
    return [
        Planned(entry, record.time(entry.at), _until(record, entry), left)
        for entry, left in record.plans
    ]  # fmt: skip


def _until(record: Record, entry: Entry) -> float:
    seconds = entry.number_of("until")
    return np.inf if seconds is None else (seconds - record.zero.timestamp()) / 86400.0


def is_coming(record: Record, plan: Planned) -> bool:
    """Whether a step still to do is expected: it lies ahead, or its hour has passed but not its day."""
    return plan.begin > record.end or record.local_day(plan.begin) == record.local_day(record.end)


def expected_words(record: Record, plans: Iterable[Planned]) -> tuple[str, ...]:
    """What of the accepted steps is expected, what is not because its day has gone by, and what of it is acid."""
    steps = [each for each in plans if is_step(each.entry)]
    acid = [each for each in steps if each.entry.text_of("acid")]
    others = [each for each in steps if each not in acid]
    lasting = [each for each in others if each.entry.text_of("recipe") or is_coming(record, each)]
    gone = [each for each in others if each not in lasting and each.begin > record.end - GONE_BY_DAYS]
    told = (
        ("accepted and not marked done, expected all the same", lasting),
        ("accepted for a day gone by and never marked done, not expected", gone),
        ("accepted acid, not counted until it is marked done", acid),
    )
    return tuple(f"{words}: {_named(record, those)}" for words, those in told if those)


def _named(record: Record, steps: Sequence[Planned]) -> str:
    return ", ".join(_step(record, each) for each in steps)


def _step(record: Record, step: Planned) -> str:
    what, name, unit = subject(step.entry)
    at = step.entry.at.astimezone(ZoneInfo(record.site.timezone))
    much = f"{step.amount(name):.4g} {unit} " if name else ""
    return f"{much}{what} {at.day} {at:%b %H:%M}"
