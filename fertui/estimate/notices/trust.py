"""What not to trust: meters found off, entries that look like slips, analyses held back or surprising."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from fertui.estimate.notices.look import Look
from fertui.estimate.notices.notice import NOTE, WATCH, Notice
from fertui.logbook.calibrations import deviation, doubted_by, is_good, last_good, was_off
from fertui.logbook.entries import Entry
from fertui.site.points import at_point

RECENT_DAYS = 14.0
"""Doubts older than this have left the solution, or have been settled."""
CHECK_DAYS = 14.0
"""A meter not checked for longer is mentioned; weekly is the advice (vendor practice, low trust)."""
WORDS = {
    "out_by_ten": "out by ten?", "other_unit": "another unit?", "meter_backwards": "meter ran backwards",
    "meter_jump": "meter jumped", "meter_amount": "meter and amount differ", "per_area": "litres per m2?",
    "drain_over_irrigation": "more drain than irrigation", "duplicate": "entered twice?", "clock": "clock wrong?",
    "over_full": "more than the tank holds", "instrument_off": "meter known to be off",
    "pair": "salts that precipitate in one stock tank",
}  # fmt: skip
"""Questions nobody answered that make an amount or reading doubtful."""


def meters(look: Look) -> Iterator[Notice]:
    """Meters found off with the readings that puts in doubt, readings the model could not believe, open questions."""
    yield from _found_off(look)
    yield from _checks_due(look)
    yield from _not_believed(look)
    yield from _unanswered(look)


def held_back(look: Look) -> Iterator[Notice]:
    """Analyses that fail their own checks: not used, to be asked about."""
    for each in look.estimate.held_back:
        if look.age_days(each.at) <= 60.0:
            text = f"Analysis {at_point(each.point)} of {look.day(each.at)} is held back: {each.why}."
            yield Notice("analysis_held_back", WATCH, text, "7")


def surprises(look: Look) -> Iterator[Notice]:
    """Analyses that were used but far from what was expected."""
    for each in look.estimate.surprises:
        if each.ions != ("EC",) and look.age_days(each.at) <= RECENT_DAYS:
            text = f"Analysis {at_point(each.point)} of {look.day(each.at)} surprises: {each.text}."
            yield Notice("surprise", WATCH, f"{text} It is used; sample again if in doubt.", "2")


def _calibrations(look: Look) -> list[Entry]:
    return [each for each in look.past if each.kind == "calibration" and each.loop in ("", look.loop.name)]


def _found_off(look: Look) -> Iterator[Notice]:
    """The last calibration of each instrument that found it off: what was read since the last good one is in doubt."""
    done = _calibrations(look)
    for bad in {_subject(each): each for each in done}.values():
        if not was_off(bad) or look.age_days(bad.at) > RECENT_DAYS:
            continue
        read = f"{bad.instrument or 'A meter'} read {bad.text_of('quantity')} {_off(bad)} on {look.day(bad.at)}"
        advice = "" if is_good(bad) else " Adjust it or use another."
        yield Notice("meter_doubt", WATCH, f"{read}: {_doubted(look, bad, done)}.{advice}", "7")


def _doubted(look: Look, bad: Entry, done: Sequence[Entry]) -> str:
    """How many readings of an instrument a bad calibration puts in doubt, since when, and what the last would be."""
    doubted, good = doubted_by(bad, [*done, *look.of("reading")]), last_good(bad, done)
    since = f" since the last good check on {look.day(good.at)}" if good else ""
    count = len(doubted)
    words = f"{count} reading{'' if count == 1 else 's'}{since} {'is' if count == 1 else 'are'} in doubt"
    last = f"; the last, {doubted[-1].read:.3g}, would be {doubted[-1].corrected:.3g}" if doubted else ""
    return words + last


def _subject(calibration: Entry) -> tuple[str, str]:
    return calibration.instrument, calibration.text_of("quantity")


def _off(calibration: Entry) -> str:
    off = deviation(calibration)
    return f"{off:+.2f} off" if calibration.text_of("quantity") == "pH" else f"{off:+.0f} % off"


def _checks_due(look: Look) -> Iterator[Notice]:
    """Meters that were checked once and have not been for two weeks."""
    last = {each.instrument: each.at for each in _calibrations(look)}
    late = {name: look.age_days(when) for name, when in last.items() if name and look.age_days(when) > CHECK_DAYS}
    due = [f"{name} {days:.0f} days ago" for name, days in late.items()]
    if due:
        yield Notice("meter_doubt", NOTE, f"Last check of {', of '.join(due)}; check meters every week.", "7")


def _not_believed(look: Look) -> Iterator[Notice]:
    for each in look.estimate.surprises:
        if each.ions == ("EC",) and look.age_days(each.at) <= 7.0:
            yield Notice(
                "meter_doubt", WATCH, f"{at_point(each.point).capitalize()}, {look.day(each.at)}: {each.text}.", "r"
            )


def _unanswered(look: Look) -> Iterator[Notice]:
    for each in look.of("reading", "water", "stock", "level", "acid", "dose", "batch", days=RECENT_DAYS):
        asked = [WORDS[code] for code in each.flags.split() if code in WORDS]
        if asked:
            text = f"Entry {each.number} ({each.kind}, {look.day(each.at)}) was never settled: {', '.join(asked)}"
            yield Notice("meter_doubt", WATCH, f"{text} Correct it, or strike it.", "7")
