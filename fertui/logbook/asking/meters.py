"""Water meters: positions that run backwards, jump, or contradict the litres beside them."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from fertui.logbook.asking.question import Question, Setting, named
from fertui.logbook.entries import Entry

JUMP = 6.0
DISAGREE_PCT, DISAGREE_L = 10.0, 20.0
"""What makes a position odd (common practice, no source)."""


def backwards(setting: Setting) -> Iterator[Question]:
    """A position below the last one: rolled over, replaced, or a slip."""
    if setting.entry.text_of("meter"):
        return
    for field, value, number in setting.numbers:
        last = setting.last(field.name) if field.what == "meter" else None
        if last and number < last[1]:
            digits = setting.instrument.digits if setting.instrument else None
            rolled = _used_when_rolled_over(number, last[1], digits)
            text = f"{field.name} {value.text} is below the last position, {last[1]:.10g} L ({named(last[0])}). "
            rest = f"Rolled over ({rolled:.6g} L used), replaced" if rolled is not None else "Was the meter replaced"
            suggestion = "meter=rolled over" if rolled is not None else "meter=replaced"
            yield Question("meter_backwards", f"{text}{rest}, or a slip?", field.name, value.text, suggestion)


def jump(setting: Setting) -> Iterator[Question]:
    """Far more a day than lately: a misread digit, or m3 against litres."""
    for field, value, number in setting.numbers:
        last = setting.last(field.name) if field.what == "meter" else None
        if last is None or number <= last[1] or setting.entry.text_of("meter"):
            continue
        usual = _litres_a_day([entry for entry in setting.past if entry.number_of(field.name) is not None], field.name)
        if not usual:
            continue
        days = max((setting.entry.at - last[0].at).total_seconds() / 86400, 0.25)
        used = number - last[1]
        if used / days > JUMP * usual:
            lately = f"lately it was {usual:.4g} L a day"
            text = f"{field.name} {value.text} makes {used:.5g} L since {named(last[0])}; {lately}."
            yield Question("meter_jump", f"{text} Is a digit or the unit wrong?", field.name, value.text)


def against_amount(setting: Setting) -> Iterator[Question]:
    """Litres entered beside a position that has moved by another amount."""
    for field, _, number in setting.numbers:
        amount = setting.entry.number_of(field.name.removesuffix("_meter"))
        last = setting.last(field.name) if field.what == "meter" else None
        if last is None or amount is None or number < last[1] or setting.entry.text_of("meter"):
            continue
        moved = number - last[1]
        if abs(moved - amount) > DISAGREE_L + DISAGREE_PCT / 100 * max(moved, amount):
            name = field.name.removesuffix("_meter")
            text = f"{name} says {amount:.5g} L, but its meter moved by {moved:.5g} L since {named(last[0])}."
            yield Question("meter_amount", f"{text} Which is right?", name, setting.entry.text_of(name), f"{moved:.6g}")


def _used_when_rolled_over(number: float, last: float, digits: int | None) -> float | None:
    """Litres used if the meter passed its last digit; None when the last position was not near its end."""
    full = 10.0 ** (digits or len(f"{last:.0f}"))
    return full - last + number if 0.9 * full <= last < full and number <= 0.1 * full else None


def _litres_a_day(entries: Sequence[Entry], name: str) -> float | None:
    if len(entries) < 3:
        return None
    first, last = entries[0], entries[-1]
    days = (last.at - first.at).total_seconds() / 86400
    used = (last.number_of(name) or 0.0) - (first.number_of(name) or 0.0)
    return used / days if days >= 1 and used > 0 else None
