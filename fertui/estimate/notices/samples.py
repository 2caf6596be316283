"""How much stands behind the estimate: analyses, their age, what another would tell, how often this loop needs them."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import datetime, timedelta

from fertui.estimate.notices.look import Look
from fertui.estimate.notices.notice import ACT, NOTE, WATCH, Notice
from fertui.estimate.sampling import due_in, narrows_now

FEW = 3
"""Analyses before ranges are the loop's own."""
OLD_DAYS = 14.0
"""Samples go every one to two weeks (Blok et al., literature study on ion-specific methods; extension practice)."""
WEEK_DAYS = 7.5
AWAITED_DAYS = 14.0
WORTH_PCT = 10.0
"""A range narrowed by less is not worth the words."""


def none(look: Look) -> Iterator[Notice]:
    """No analysis at all: everything else that could be said of the ions would be a guess."""
    if look.estimate.analyses > 0:
        return
    sent = awaited(look, last_analysis(look))
    known = "No analysis yet" if last_analysis(look) is None else "No analysis to begin from"
    text = f"{known}: what the solution holds is not known, ranges are those of other growers' loops."
    if sent is not None:
        yield Notice("few_analyses", WATCH, f"{text} A sample went out on {look.day(sent)}.", "a")
    else:
        yield Notice("few_analyses", ACT, f"Take a sample. {text}", "a")


def water(look: Look) -> Iterator[Notice]:
    """The water that fills up was never analysed: its ions gather unseen, and no acid can be reckoned."""
    name = look.estimate.unanalysed_water
    if name is not None:
        text = (
            f"The water {name!r} was never analysed: Na, Cl, Ca, Mg, SO4 and alkalinity of it are not known. "
            "No forecast of Na or Cl is sure before, and no acid is reckoned. Send a sample of it."
        )
        yield Notice("water_unknown", WATCH, text, "a")


def few(look: Look) -> Iterator[Notice]:
    """Fewer than three analyses: the ranges come from other growers' crops."""
    count = look.estimate.analyses
    if 0 < count < FEW:
        word = "analysis" if count == 1 else "analyses"
        text = f"Only {count} {word} so far: ranges are not this loop's own before {FEW}."
        yield Notice("few_analyses", NOTE, text, "a")


def age(look: Look) -> Iterator[Notice]:
    """The last analysis of the managed solution is old, or the next is due: with what one today would narrow."""
    last = last_analysis(look)
    if last is None:
        return
    days, sent = look.age_days(last), awaited(look, last)
    if days > OLD_DAYS and sent is not None:
        text = f"The last analysis is {days:.0f} days old; a sample went out on {look.day(sent)}."
        yield Notice("analysis_old", NOTE, text, "a")
    elif days > OLD_DAYS:
        yield Notice("analysis_old", WATCH, f"The last analysis is {days:.0f} days old.{_narrows(look)}", "a")
    elif sent is None:
        due, why = due_in(look.estimate)
        if due <= 0.0:
            yield Notice("sample_now", NOTE, f"A sample is due ({why}).{_narrows(look)}", "a")


def _narrows(look: Look) -> str:
    """What an analysis today would tell, computed."""
    found = narrows_now(look.estimate)
    what = max(found, key=lambda each: found[each])
    if found[what] < WORTH_PCT:
        return " Send a sample."
    return f" One today would make the range of {what} {found[what]:.0f} % narrower."


def volatile(look: Look) -> Iterator[Notice]:
    """A loop that moves more than the model foresees: only samples help."""
    if not look.estimate.spread.volatile or not _sampled_seldom(look):
        return
    text = "This loop moves faster than the model foresees, so ranges are wide. Sample every week."
    yield Notice("volatile", WATCH, text, "a")


def last_analysis(look: Look) -> datetime | None:
    """When the managed solution was last analysed, in any of the points that hold it."""
    points = (
        {look.estimate.managed, "drain"} if look.estimate.managed == "root_zone" else {"tank", "root_zone", "drain"}
    )
    times = [when for point, when in look.estimate.last_analysis.items() if point in points]
    return max(times, default=None)


def awaited(look: Look, last: datetime | None) -> datetime | None:
    """When a sample went out whose result has not come."""
    gone = [each for each in look.of("sample", days=AWAITED_DAYS) if each.text_of("status") in ("sent", "awaited")]
    open_ones = [each.at for each in gone if last is None or each.at > last + timedelta(days=1)]
    return open_ones[-1] if open_ones else None


def _sampled_seldom(look: Look) -> bool:
    times = sorted({each.at for each in look.of("analysis", days=60.0) if look.point(each) != "source"})
    gaps = [(later - earlier).total_seconds() / 86400.0 for earlier, later in zip(times, times[1:], strict=False)]
    return not gaps or max(gaps[-2:]) > WEEK_DAYS or look.age_days(times[-1]) > WEEK_DAYS
