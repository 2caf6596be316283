"""How a form looks: label, field, unit, last value, what was understood; one or two columns; a word below."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from datetime import datetime
from typing import TYPE_CHECKING

from fertui.tui.figures import age
from fertui.tui.forms.answers import Answers
from fertui.tui.forms.spec import EVERY, Asked, Group, Spec
from fertui.tui.ink import BLANK, Line, Span, cells, cut, filled, fit, line, literal, width_of, wrap

if TYPE_CHECKING:
    from fertui.workbench.entering import LastValue

Last = Mapping[tuple[str, str, str, str], "LastValue"]
BESIDE = 34
"""Column of the last value in a form of two columns."""
LABEL = 22
"""Columns of the labels of a form of one column whose names are short."""
NARROW = 76
"""Columns below which a form of two columns becomes one of one."""


def draw_form(answers: Answers, last: Last, now: datetime, width: int) -> tuple[list[Line], int]:
    """All lines of the fields, and the line of the field under the cursor."""
    if answers.spec.columns == 1 or width < NARROW:
        return _one_column(answers, last, now, width)
    return _two_columns(answers, last, now, width)


def _one_column(answers: Answers, last: Last, now: datetime, width: int) -> tuple[list[Line], int]:
    rows: list[Line] = []
    number = at = 0
    for group in answers.spec.groups:
        if group.title:
            rows.append(line(Span(f" {literal(group.title)}", "title")))
        for _ in group.fields:
            if number == answers.at:
                at = len(rows)
            rows.append(_row(answers, number, last, now, width))
            number += 1
    return rows, at


def _row(answers: Answers, number: int, last: Last, now: datetime, width: int) -> Line:
    each, echo = answers.spec.fields[number], answers.understood.get(number, "")
    label = _label_width(answers.spec, width)
    understood = f"= {echo}" if echo else ""
    free = width - label - 5 - (cells(understood) + 1 if echo else 0)
    size = free if each.words else 24 if each.choices else 10
    row = line(*_label(each, number == answers.at, label), *_field(answers, number, size))
    if each.words or each.choices:
        return line(*row, Span(f" {understood}", "good")) if echo else row
    row = line(*row, Span(f" {fit(each.unit, 6)} ", "faint"))
    return line(*row, *_beside(last_of(last, answers, each), each, understood, now, width - width_of(row)))


def _label_width(spec: Spec, width: int) -> int:
    """Columns of the labels: so many that no name is cut, as long as a number, its unit and its last value fit
    beside them."""
    longest = max(cells(each.label) for each in spec.fields) + 1
    return max(LABEL, min(longest, width - 48))


def _beside(before: LastValue | None, each: Asked, understood: str, now: datetime, room: int) -> Line:
    """The last value and what was understood of the one typed. Where there is no room for both, first the age of the
    last value goes, then itself."""
    value = f"last {_short(in_unit(before, each))}" if before else ""
    aged = f"{value} ({age(before.at, now)})" if before else ""
    column = min(24, room if not understood else min(room - 11, room - cells(understood) - 1))
    said = next((text for text in (aged, value) if cells(text) <= column), "")
    return line(
        Span(fit(said, max(column, 0)), "faint"), Span(cut(f" {understood}" if understood else "", room), "good")
    )


def _two_columns(answers: Answers, last: Last, now: datetime, width: int) -> tuple[list[Line], int]:
    """The first group on top, the second on the left, the others on the right."""
    first, left, *right = answers.spec.groups
    rows: list[Line] = []
    at = 0
    for number, _ in enumerate(first.fields):
        at = len(rows) if number == answers.at else at
        rows.append(_row(answers, number, last, now, width))
    half = (width - 1) // 2
    start = len(first.fields)
    one, one_at = _block(answers, [left], start, last, half)
    two, two_at = _block(answers, right, start + len(left.fields), last, half)
    at = at if answers.at < start else len(rows) + (one_at if answers.at < start + len(left.fields) else two_at)
    height = max(len(one), len(two))
    one, two = one + [BLANK] * (height - len(one)), two + [BLANK] * (height - len(two))
    rows += [line(*_padded(a, half), " ", *b) for a, b in zip(one, two, strict=True)]
    return rows, at


def _block(answers: Answers, groups: Sequence[Group], number: int, last: Last, width: int) -> tuple[list[Line], int]:
    rows: list[Line] = []
    at = 0
    for group in groups:
        if group.title:
            last_head = "last" if any(each.is_number for each in group.fields) else ""
            rows.append(line(Span(fit(f" {group.title}", BESIDE), "title"), Span(last_head, "faint")))
        for each in group.fields:
            at = len(rows) if number == answers.at else at
            rows.append(_cell(answers, each, number, last, width))
            number += 1
    return rows, at


def _cell(answers: Answers, each: Asked, number: int, last: Last, width: int) -> Line:
    here = number == answers.at
    wide = each.words or bool(each.choices)
    row = line(*_label(each, here, 14), *_field(answers, number, width - 17 if wide else 9))
    if wide:
        return row
    before = last_of(last, answers, each)
    mark = Span("✓" if number in answers.understood else " ", "good")
    said = Span(cut(_short(in_unit(before, each)) if before else "", width - BESIDE), "faint")
    return line(*row, Span(f" {fit(each.unit, 6)}", "faint"), mark, said)


def _label(each: Asked, here: bool, width: int) -> Line:
    return line(
        Span(" ▸ " if here else "   ", "accent"),
        Span(fit(literal(each.label), width - 1) + " ", "strong" if here else "plain"),
    )


def _field(answers: Answers, number: int, width: int) -> Line:
    each, here = answers.spec.fields[number], number == answers.at
    ink = "watch" if number in answers.doubts else "field"
    if each.choices:
        text = literal(each.shown(answers.typed.text if here else answers.texts[number]))
        return line(Span(fit(f"< {text} >" if here else f"  {text}", width), "chosen" if here else ink))
    if here:
        return answers.typed.shown(width)
    text = cut(literal(answers.texts[number]), width)
    return line(Span(text + "_" * (width - len(text)), ink))


def place_of(answers: Answers, each: Asked) -> tuple[str, str, str, str]:
    """Where the last value of a field is found: kind, point, name and tank."""
    part = answers.spec.parts[0 if each.entry == EVERY else each.entry]
    chosen = dict(zip((f.name for f in answers.spec.fields if f.entry == each.entry), answers.texts, strict=False))
    point = part.fixed.get("point") or chosen.get("point", "")
    return part.kind, point, each.ion or each.name, part.fixed.get("tank", chosen.get("tank", ""))


def last_of(last: Last, answers: Answers, each: Asked) -> LastValue | None:
    """The last value of a field; what belongs to the day and not to a point may have been logged with any."""
    place = place_of(answers, each)
    if each.name in ("light_sum", "drain_pct") and place not in last:
        return next(
            (found for (kind, _, name, _), found in last.items() if (kind, name) == (place[0], each.name)), None
        )
    return last.get(place)


def in_unit(last: LastValue, each: Asked) -> str:
    """A last value as it would be written into a field: in the unit of the field, whatever it was written in."""
    if last.number is None or (not each.ion and _is_bare(last.written)):
        return last.written
    below = "<" if last.below else ""
    if not each.ion:
        return f"{below}{last.number:.4g}"
    from fertui.workbench.units import shown

    return f"{below}{shown(each.ion, last.number, each.unit)[0]:.3g}"


def _is_bare(text: str) -> bool:
    """Whether a number was written without a unit: 2600, 2,6, <0.1."""
    return text[-1:].isdigit()


def _short(text: str) -> str:
    """A value as written, without its unit."""
    return literal(text.split(" ")[0])


def _padded(row: Line, width: int) -> Line:
    return filled(row, width)


def hint_of(each: Asked) -> str:
    """What can be typed into a field that takes no number.

    >>> hint_of(Asked("point", "point", choices=("feed", "drain")))
    'Space, Left and Right choose, or the first letter.'
    """
    if each.name == "at":
        return "Empty: now. Or 07:30 (today), yesterday 16:05, 2026-12-01 07:30; a date alone: that whole day."
    return "Space, Left and Right choose, or the first letter." if each.choices else ""


def messages(words: Sequence[tuple[str, str]], width: int, height: int) -> list[Line]:
    """Sentences in their ink, wrapped, at most ``height`` lines."""
    rows = [line(Span(f" {text}", ink)) for words, ink in words for text in wrap(literal(words), width - 2)]
    return rows[:height]
