"""Numbers that are unlike what there usually is: out of the usual range, out by ten, in another unit."""

from __future__ import annotations

from collections.abc import Iterator

from fertui import quantities
from fertui.logbook.asking.question import Question, Setting
from fertui.logbook.entries import Value
from fertui.logbook.kinds import Field, nearest
from fertui.refusals import Refusal

TEN = (7.0, 14.0)
"""A number this many times the last one, or as much smaller, looks out by ten (common practice, no source)."""

NEAR = 1.6
"""A number within this factor of the last one is believed without a question."""

_COMPARED = ("EC", "ion")
_MASS_FORMS = {"NO3": ("NO3-N", "NO3"), "NH4": ("NH4-N",), "H2PO4": ("P",), "SO4": ("S", "SO4"), "HCO3": ("CaCO3",)}


def unusual(setting: Setting) -> Iterator[Question]:
    """Outside the usual range and unlike the last one."""
    for field, value, number in setting.numbers:
        low, high = field.usual_low, field.usual_high
        last = setting.last(field.name, "source")
        inside = (low is None or number >= low) and (high is None or number <= high)
        if not inside and not (last and _near(number, last[1])):
            yield _unusual(field, value, number)


def out_by_ten(setting: Setting) -> Iterator[Question]:
    """About ten times the last value, or a tenth of it."""
    for field, value, number in setting.numbers:
        last = setting.last(field.name, "source")
        if field.what not in _COMPARED or last is None or last[1] <= 0 or number <= 0 or value.below:
            continue
        factor = max(number / last[1], last[1] / number)
        if TEN[0] <= factor <= TEN[1]:
            meant = number / 10 if number > last[1] else number * 10
            yield Question(
                "out_by_ten",
                f"{field.name} {value.text}? The last was {last[1]:.3g}. Out by ten?",
                field.name,
                value.text,
                f"{meant:.4g}",
            )


def other_unit(setting: Setting) -> Iterator[Question]:
    """An ion written without a unit whose number fits the last one when it is read as mg/L."""
    for field, value, number in setting.numbers:
        last = setting.last(field.name, "source")
        if field.what != "ion" or value.unit or last is None or last[1] <= 0 or _near(number, last[1]):
            continue
        for form in _MASS_FORMS.get(field.name, (field.name,)):
            meant = quantities.concentration(number, form, "mg/L")[1] if number >= 0 else 0.0
            if _near(meant, last[1]):
                mass = f"mg/L of {form} ({meant:.3g} {field.unit})"
                text = f"{field.name} {value.text}? The last was {last[1]:.3g}. Was this {mass}?"
                yield Question("other_unit", text, field.name, value.text, f"{form}={value.text} mg/L")
                break


def stage(setting: Setting) -> Iterator[Question]:
    """A stage the catalogue does not know for the loop's crop: allowed, but no uptake goes with it."""
    written = setting.entry.text_of("stage")
    if setting.entry.kind != "crop" or not written or setting.loop is None:
        return
    from fertui.catalogue.crops import crop

    try:
        known = tuple(crop(setting.entry.text_of("crop") or setting.loop.crop).stages)
    except Refusal:
        return
    if known and written not in known:
        text = f"{written!r} is no stage of the catalogue{nearest(written, known)}. Known: {', '.join(known)}."
        yield Question("stage", f"{text} With another name the uptake of the whole season is used.", "stage", written)


def _unusual(field: Field, value: Value, number: float) -> Question:
    unit = f" {field.unit}" if field.unit else ""
    low = "" if field.usual_low is None else f"{field.usual_low:g}"
    high = "and more" if field.usual_high is None else f"to {field.usual_high:g}"
    usual = f"usual are {low} {high}{unit}"
    text = f"{field.name} {value.text} is {number:.4g}{unit}; {usual}. Is it right?"
    return Question("unusual", text, field.name, value.text)


def _near(one: float, other: float) -> bool:
    return one > 0 and other > 0 and max(one / other, other / one) <= NEAR
