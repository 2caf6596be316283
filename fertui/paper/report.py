"""The report for a consultant or an inspector: measured, taken up, dosed, discharged, calibrated, corrected.

Every table says its unit; concentrations stand in mmol/L and in mg/L; corrected and struck entries stay visible. What
was logged in the period stands in it whether or not the estimate can follow; what is estimated says since when.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from datetime import datetime, timedelta
from itertools import pairwise
from typing import TYPE_CHECKING, Any, NamedTuple

from fertui.chemistry.names import IONS, MICRONUTRIENTS
from fertui.logbook.entries import Entry
from fertui.paper.discharges import LetGo, let_go, rows_of
from fertui.paper.handover import said
from fertui.paper.page import Page, amount, clock, columns, day, folded, heading, listed, page, section
from fertui.quantities import in_unit, shown_in
from fertui.site.model import Loop, Site
from fertui.site.points import point_name

if TYPE_CHECKING:
    from fertui.estimate.balance import Stretch

WATERS = {
    "make_up": "make-up water", "irrigation": "irrigation", "drain": "drain", "condensate": "condensate",
    "crop": "crop water",
}  # fmt: skip
ACTS = ("recipe", "setpoint", "batch", "dose", "disinfection", "crop")
"""Kinds listed one by one; acid and stock, used every day, are listed as sums."""

A_MINUTE = timedelta(minutes=1)

Row = tuple[str, ...]


class Reported(NamedTuple):
    """A loop over a period: ``history`` is verbatim, ``effective`` leaves out what was corrected or struck.

    ``stretches``: the parts of the period that runs of the estimate cover, in order of time.
    """

    site: Site
    loop: Loop
    start: datetime
    end: datetime
    history: Sequence[Entry]
    effective: Sequence[Entry]
    stretches: Sequence[Stretch]

    @property
    def crop_water_l(self) -> float | None:
        """Crop water [L] as the estimate has it, None where it is not known."""
        known = [each.crop_water_l for each in self.stretches if each.crop_water_l is not None]
        return sum(known) if known else None

    @property
    def days(self) -> float:
        """Days of the period that the estimate covers."""
        return sum((each.account.end - each.account.start).total_seconds() for each in self.stretches) / 86400.0

    def of(self, *kinds: str) -> list[Entry]:
        """Effective entries of some kinds within the period."""
        return [each for each in self.effective if each.kind in kinds and self.start <= each.at <= self.end]

    def day(self, at: datetime) -> str:
        """A date on the site's clock."""
        return day(at, self.site.timezone)


def report(it: Reported) -> Page:
    """Everything of a loop between two times, on one page; the same as one long table for CSV."""
    period = f"{clock(it.start, it.site.timezone)} to {clock(it.end, it.site.timezone)}"
    about = f"{it.loop.crop} on {it.loop.medium}, {it.loop.area_m2:g} m2, {it.loop.layout}"
    lines = heading(f"Report: {it.loop.name}", it.site.name, period, about)
    lines += section("ANALYSES", _analyses(it))
    lines += section("UPTAKE BY THE ACCOUNT", [*_uptake(it), *_rests_on(it)])
    lines += section("WATER, STOCK AND ACID USED", columns([("what", "used", "unit", "entries"), *_used(it)], (1, 3)))
    lines += section("RECIPES, BATCHES, DOSES AND OTHER ACTS", listed(_said(it, *ACTS)))
    lines += section("DISCHARGES BY REASON", _discharged(it))
    lines += section("CALIBRATIONS", listed(_said(it, "calibration")))
    lines += section("CORRECTED AND STRUCK", listed(_corrections(it)))
    lines += folded("Entries are numbered and never overwritten; 'fertui logbook' shows all of them.", "")
    return page(lines, _data(it), [("table", "at", "what", "value", "unit", "entry", "by"), *_rows(it)], advice=True)


def mg_l(ion: str, canonical: float) -> tuple[float, str]:
    """A concentration in mg/L with the species it is expressed as.

    >>> number, species = mg_l("NO3", 15.0)
    >>> round(number), species
    (210, 'NO3-N')
    """
    unit, species = shown_in(ion, "mg/L")
    return float(in_unit(canonical, ion, unit, species)), species


def _analyses(it: Reported) -> list[str]:
    lines: list[str] = []
    for entry in it.of("analysis"):
        measured = [f"{name} {amount(n)}{unit}" for name, unit in (("EC", " mS/cm"), ("pH", ""))
                    if (n := entry.number_of(name)) is not None]  # fmt: skip
        where = ", ".join(part for part in (point_name(entry.point), entry.method.replace("_", " ")) if part)
        lines += folded(f"{it.day(entry.at)} {where}, entry {entry.number}: {'  '.join(measured)}{_doubt(entry)}", "")
        lines += _composition(entry, IONS, "mmol/L") + _composition(entry, MICRONUTRIENTS, "umol/L")
    return lines


def _doubt(entry: Entry) -> str:
    return f"; doubtful: {entry.doubtful}" if entry.doubtful else ""


def _composition(entry: Entry, names: Sequence[str], unit: str) -> list[str]:
    """Two lines of numbers, canonical and mg/L, under the names each goes by."""
    given = [(name, value) for name in names if (value := entry.value(name)) is not None and value.number is not None]
    if not given:
        return []
    below = ["<" if value.below else "" for _, value in given]
    numbers = [value.number or 0.0 for _, value in given]
    masses = [mg_l(name, number) for (name, _), number in zip(given, numbers, strict=True)]
    rows = [("", *(name for name, _ in given)), (unit, *map(str.__add__, below, map(amount, numbers))),
            ("mg/L", *map(str.__add__, below, (amount(mass) for mass, _ in masses))),
            ("as", *(species for _, species in masses))]  # fmt: skip
    return ["  " + line for line in columns(rows, range(1, len(given) + 1))]


def _uptake(it: Reported) -> list[str]:
    known = it.crop_water_l
    water = (
        "crop water is not known"
        if not known
        else f"crop water {known / 1000:.1f} m3, {_per_day(it, known)} L/m2 a day"
    )
    rows: list[Row] = [("ion", "mmol/m2", "g/m2", "mmol/L", "mg/L", "mg of")]
    for ion, taken in _taken(it).items():
        per_m2 = taken / it.loop.area_m2
        grams, species = mg_l(ion, per_m2)
        per_litre = ("", "") if not known else (amount(taken / known), amount(mg_l(ion, taken / known)[0]))
        rows.append((ion, amount(per_m2), amount(grams / 1000), *per_litre, species))
    note = "mmol/L and mg/L per litre of crop water; means of the estimate, not measured."
    return [*folded(f"{water}; {note}"), *columns(rows, (1, 2, 3, 4))]


def _per_day(it: Reported, litres: float) -> str:
    return f"{litres / it.loop.area_m2 / max(it.days, 1e-9):.1f}"


def _taken(it: Reported) -> dict[str, float]:
    """Uptake of every ion [mmol] over what is estimated of the period; alkalinity is not taken up."""
    taken: dict[str, float] = {}
    for each in it.stretches:
        for ion, row in each.account.ions.items():
            if ion != "HCO3":
                taken[ion] = taken.get(ion, 0.0) - row.uptake
    return taken


def _rests_on(it: Reported) -> list[str]:
    """Since when the estimate behind uptake, N and P runs; nothing where one run covers the period."""
    if not it.stretches:
        return folded("Nothing is estimated: the logbook of this loop begins later.", "")
    first = it.stretches[0]
    if len(it.stretches) == 1 and not first.account.is_cut and first.analyses:
        return []
    return [*folded("What the estimate behind uptake, N and P rests on:", ""), *listed(_runs(it))]


def _runs(it: Reported) -> Iterator[str]:
    for each in it.stretches:
        account = each.account
        if account.end - account.start < A_MINUTE:
            continue
        period = f"{clock(account.start, it.site.timezone)} to {clock(account.end, it.site.timezone)}"
        began = f", begun {account.began}" if account.is_cut else ""
        known = f"{each.analyses} {'analysis' if each.analyses == 1 else 'analyses'} behind it"
        yield f"{period}{began}: {known if each.analyses else 'no analysis behind it, a guess'}"


def _used(it: Reported) -> Iterator[Row]:
    """Sums of what was used: water in m3, stock and acid in L."""
    for name, words in WATERS.items():
        by_label: dict[str, list[float]] = {}
        for entry, litres in (*_amounts(it, name), *_metered(it, name)):
            source = entry.text_of("source") if name == "make_up" else ""
            label = f"{words}, {source}" if source else words
            by_label.setdefault(_labelled(label, entry), []).append(litres)
        for label, amounts in by_label.items():
            yield label, f"{sum(amounts) / 1000:.2f}", "m3", str(len(amounts))
    yield from _summed(it, "stock", "tank", "stock")
    yield from _summed(it, "acid", "acid", "acid")


def _amounts(it: Reported, name: str) -> Iterator[tuple[Entry, float]]:
    for entry in it.of("water"):
        if (litres := entry.number_of(name)) is not None:
            yield entry, litres


def _metered(it: Reported, name: str) -> Iterator[tuple[Entry, float]]:
    """Litres [L] by the positions of a meter where no litres were written: each since the position before it."""
    meter = f"{name}_meter"
    read = [each for each in it.effective if each.kind == "water" and each.number_of(meter) is not None]
    certain = sorted((each for each in read if not each.doubtful), key=lambda each: each.at)
    for before, entry in pairwise(certain):
        litres = (entry.number_of(meter) or 0.0) - (before.number_of(meter) or 0.0)
        written = entry.number_of(name) is not None or entry.text_of("meter")
        if it.start <= entry.at <= it.end and not written and litres >= 0:
            yield entry, litres


def _summed(it: Reported, kind: str, by: str, words: str) -> Iterator[Row]:
    sums: dict[str, list[float]] = {}
    for entry in it.of(kind):
        strength = entry.number_of("strength")
        name = entry.text_of(by) + (f", {strength:g} %" if strength is not None else "")
        sums.setdefault(_labelled(name, entry), []).append(entry.number_of("litres") or 0.0)
    for name, litres in sums.items():
        yield f"{words} {name}", f"{sum(litres):.1f}", "L", str(len(litres))


def _labelled(label: str, entry: Entry) -> str:
    """Doubtful amounts are kept apart: they stand in the report and in no other sum."""
    return f"{label}, doubtful" if entry.doubtful else label


def _let_go(it: Reported) -> tuple[LetGo, ...]:
    booked = [each for stretch in it.stretches for each in stretch.discharges]
    return let_go(it.of("bleed", "water"), booked, it.loop.layout == "known-feed")


def _discharged(it: Reported) -> list[str]:
    lost = _let_go(it)
    if not lost:
        return ["  none"]
    budget = it.site.budget_n_kg_per_ha
    lines = columns(rows_of(lost, it.loop.area_m2), range(1, 6))
    lines += listed(each.unknown_words for each in lost if not each.is_known)
    return [*lines, *([f"budget of the year: {budget:g} kg N/ha"] if budget is not None else [])]


def _said(it: Reported, *kinds: str) -> Iterator[str]:
    """Entries in words, with number and author."""
    for entry in it.of(*kinds):
        cautions = entry.text_of("cautions")
        told = said(entry) + (f"; cautions {cautions}" if cautions else "")
        who = f"{entry.instrument} " if entry.instrument else ""
        yield f"{it.day(entry.at)}, entry {entry.number}, {entry.kind} {who}by {entry.by}: {told}"


def _corrections(it: Reported) -> Iterator[str]:
    """Every correction written within the period: what stood there, what stands there, who, when, why."""
    by_number: Mapping[int | None, Entry] = {entry.number: entry for entry in it.history}
    for entry in it.history:
        old = by_number.get(entry.supersedes) if entry.supersedes is not None else None
        if old is None or not it.start <= entry.entered <= it.end and not it.start <= old.at <= it.end:
            continue
        now = "struck" if entry.void else f"now {said(entry)}"
        about = f"entry {old.number}, {old.kind} of {it.day(old.at)} by {old.by}"
        when = f"{entry.by}, {clock(entry.entered, it.site.timezone)}, entry {entry.number}"
        yield f"{about}: was {said(old)}; {now}; {when}; why: {entry.why}"


def _rows(it: Reported) -> Iterator[Row]:
    """The report as one long table: a line a number."""
    for entry in it.of("analysis", "calibration", *ACTS, "acid", "stock", "water", "bleed"):
        yield from _entry_rows(it, entry)
    for ion, taken in _taken(it).items():
        yield "uptake", "", ion, f"{taken / it.loop.area_m2:.4g}", "mmol/m2", "", ""
    for each in _let_go(it):
        yield "discharge", "", f"water, {each.reason}", f"{each.litres / 1000:.4g}", "m3", "", ""
        for name, kg in (("N", each.kg_n), ("P", each.kg_p)):
            of = "" if each.is_known else f", of {each.followed_l / 1000:.4g} m3"
            yield "discharge", "", f"{name}, {each.reason}{of}", f"{kg:.4g}", "kg", "", ""


def _entry_rows(it: Reported, entry: Entry) -> Iterator[Row]:
    from fertui.logbook.kinds import KINDS, unit_of

    about = (clock(entry.at, it.site.timezone),)
    for value in entry.values:
        unit = "" if value.number is None else unit_of(KINDS[entry.kind], value.name)
        written = value.text if value.number is None else f"{'<' if value.below else ''}{value.number:.6g}"
        point = f"{entry.point} " if entry.point else ""
        yield entry.kind, *about, f"{point}{value.name}", written, unit, str(entry.number or ""), entry.by


def _data(it: Reported) -> dict[str, Any]:
    water = it.crop_water_l
    return {
        "loop": it.loop.name,
        "from": it.start,
        "to": it.end,
        "crop_water_m3": None if water is None else water / 1000,
        "uptake": {
            ion: {"mmol_m2": taken / it.loop.area_m2, "mmol_L": taken / water if water else None}
            for ion, taken in _taken(it).items()
        },
        "used": [dict(zip(("what", "amount", "unit", "entries"), row, strict=True)) for row in _used(it)],
        "discharges": [
            {
                "reason": d.reason,
                "m3": d.litres / 1000,
                "followed_m3": d.followed_l / 1000,
                "kg_N": d.kg_n,
                "kg_P": d.kg_p,
            }
            for d in _let_go(it)
        ],
        "estimate": [
            {"from": each.account.start, "to": each.account.end, "began": each.account.began, "analyses": each.analyses}
            for each in it.stretches
        ],
        "corrections": list(_corrections(it)),
    }
