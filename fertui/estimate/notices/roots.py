"""At the roots: pH, drain against drip, zones, temperature, a new medium, blossom-end rot."""

from __future__ import annotations

import re
from collections.abc import Iterator

from fertui.catalogue.media import medium
from fertui.chemistry.ions import CHARGES
from fertui.estimate.notices.look import Look, Measured
from fertui.estimate.notices.notice import ACT, NOTE, WATCH, Notice, plain
from fertui.loop import temperature_notice
from fertui.site.points import at_point

PH_LOW, PH_STOP, PH_EMERGENCY = 5.0, 4.5, 3.5
"""Warning; stop dosing and irrigation; roots burn (common practice, no source; grower's handbook on acid by hand)."""
PH_POINTS = ("feed", "tank", "root_zone", "drain", "drain_store")
PH_FRESH_DAYS = 1.0

DRAIN_USUAL = (0.5, 1.0)
"""Drain EC less drip EC [mS/cm] in a healthy crop (common practice, no source)."""
DRAIN_HIGH = 1.5
"""Above this, more drain (common practice, no source)."""
DRAIN_DAYS = 3.0

ZONE_DAYS = 3.0
ZONES_APART = {"EC": (0.4, 0.15), "pH": (0.5, 0.0)}
"""Zones differ when apart by more than the number and the fraction of their mean (common practice, no source)."""

ROOT_POINTS = ("root_zone", "tank", "drain")
TEMPERATURE_DAYS = 3.0

NEW_DAYS, UNSETTLED_DAYS = 14.0, 42.0
"""A new exchanging medium trades for two to six weeks (from memory)."""

ROT = re.compile(r"blossom[- ]?end[- ]?rot", re.IGNORECASE)
ROT_SHORT = re.compile(r"\bBER\b")
ROT_DAYS = 21.0


def acidity(look: Look) -> Iterator[Notice]:
    """pH below 5.0, 4.5, 3.5 in the last reading of any point: the lowest speaks."""
    last = {each.point: each for each in look.measured("pH", PH_POINTS, PH_FRESH_DAYS)}
    lowest = min(last.values(), key=lambda each: each.value, default=None)
    if lowest is None or lowest.value >= PH_LOW:
        return
    head = f"pH {at_point(lowest.point)} read {lowest.value:.1f} at {look.local(lowest.at):%a %H:%M}."
    yield _emergency(head) if lowest.value < PH_EMERGENCY else _too_low(look, head, lowest)


def _emergency(head: str) -> Notice:
    return Notice(
        "ph_emergency", ACT,
        f"{head} Stop the pump to the crop, no more acid. Site procedure and safety data sheet come first. Then mix, "
        "retest, dilute with water or own drain; no base in one shot.", "r",
    )  # fmt: skip


def _too_low(look: Look, head: str, lowest: Measured) -> Notice:
    if lowest.value < PH_STOP:
        return Notice("ph_stop", ACT, f"{head} Stop acid and irrigation, mix, retest with a checked meter.", "r")
    ammonium = look.points[look.estimate.managed].ions["NH4"].mmol_l.value
    return Notice(
        "ph_low",
        ACT,
        f"{head} Retest; no acid now, and look at NH4 ({plain(ammonium)} mmol/L) before anything else.",
        "r",
    )


def drain_strength(look: Look) -> Iterator[Notice]:
    """Drain EC against drip EC, mean of the last days."""
    drip, drain = (_mean(look.measured("EC", (point,), DRAIN_DAYS)) for point in ("feed", "drain"))
    if drip is None or drain is None:
        return
    apart = round(drain - drip, 2)
    usual = f"usual +{DRAIN_USUAL[0]:.1f} to +{DRAIN_USUAL[1]:.1f}"
    words = f"Drain EC {drain:.1f} against drip {drip:.1f} mS/cm ({apart:+.1f}; {usual})"
    if apart > DRAIN_HIGH:
        yield Notice("drain_ec", WATCH, f"{words}: salts pile up, give more drain.", "3")
    elif apart > DRAIN_USUAL[1]:
        yield Notice("drain_ec", NOTE, f"{words}: on the high side.", "3")
    elif apart < DRAIN_USUAL[0]:
        advice = "below the drip, read both meters again" if apart < 0 else "a lot of drain, or a crop that takes much"
        yield Notice("drain_ec", WATCH if apart < 0 else NOTE, f"{words}: {advice}.", "3")


def zones(look: Look) -> Iterator[Notice]:
    """Valve sections whose last readings disagree."""
    for name, (apart, part) in ZONES_APART.items():
        for point in PH_POINTS:
            found = [each for each in look.measured(name, (point,), ZONE_DAYS) if each.entry.zone]
            last = {each.entry.zone: each.value for each in found}
            if len(last) < 2:
                continue
            high, low = max(last, key=lambda zone: last[zone]), min(last, key=lambda zone: last[zone])
            mean = sum(last.values()) / len(last)
            if last[high] - last[low] > max(apart, part * mean):
                unit = " mS/cm" if name == "EC" else ""
                both = f"{last[high]:.1f}{unit} in zone {high}, {last[low]:.1f}{unit} in zone {low}"
                text = f"{name} {at_point(point)} differs: {both}. Look at valves and drippers."
                yield Notice("zones_differ", WATCH, text, "r")


def root_temperature(look: Look) -> Iterator[Notice]:
    """Roots outside 15-26 C, where they were measured."""
    last = look.last("temperature", ROOT_POINTS, TEMPERATURE_DAYS)
    words = temperature_notice(last.value) if last is not None else ""
    if words:
        yield Notice("root_temperature", WATCH, words, "r")


def new_medium(look: Look) -> Iterator[Notice]:
    """A new medium that trades cations: what shows in the drain is buffering, not overfeeding."""
    grown = medium(look.loop.medium)
    laid = [each for each in look.of("crop") if each.text_of("event") == "new medium"]
    if not grown.exchanges or not laid or look.age_days(laid[-1].at) > UNSETTLED_DAYS:
        return
    days = look.age_days(laid[-1].at)
    head = f"New {grown.name.removesuffix('-new')}, {days:.0f} days: it binds Ca and Mg and gives off K and Na."
    if days <= NEW_DAYS:
        text = f"{head} Do not cut the feed: more Ca and Mg, less K for now; a sample within 7 days, first drain apart."
        yield Notice("coir_new", WATCH, text, "a")
    else:
        yield Notice(
            "coir_new", NOTE, f"{head} Judge by drain and slab together; ranges are wide until it settles.", "a"
        )


def blossom_end_rot(look: Look) -> Iterator[Notice]:
    """Blossom-end rot in the notes: what to look at first, with what is known of it."""
    written = [
        each
        for each in look.of("note", "reading", "crop", "analysis", days=ROT_DAYS)
        if _mentions_rot(f"{each.note} {each.text_of('text')}")
    ]
    if not written:
        return
    state = look.points[look.estimate.managed]
    ions = {name: state.ions[name].mmol_l.value for name in ("K", "Ca", "Mg", "NH4")}
    ratio = f"K:Ca {ions['K'] / (CHARGES['Ca'] * ions['Ca']):.1f} (meq), " if ions["Ca"] > 0 else ""
    roots = look.last("temperature", ROOT_POINTS, ROT_DAYS)
    warm = f" ({roots.value:.0f} C)" if roots is not None else ""
    text = (
        f"Blossom-end rot noted {look.day(written[-1].at)}. First look at EC {state.ec.value:.1f} mS/cm, {ratio}"
        f"NH4 {plain(ions['NH4'])} and Mg {plain(ions['Mg'])} mmol/L, humidity, root temperature{warm}: "
        "the fruit seldom lacks calcium in the feed."
    )
    yield Notice("blossom_end_rot", WATCH, text, "2")


def _mentions_rot(text: str) -> bool:
    return bool(ROT.search(text) or ROT_SHORT.search(text))


def _mean(found: list[Measured]) -> float | None:
    return sum(each.value for each in found) / len(found) if found else None
