"""The report for a consultant or an inspector: measured, taken up, dosed, discharged, calibrated, corrected.

Every table says its unit; concentrations stand in mmol/L and in mg/L; corrected and struck entries stay visible.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from datetime import datetime
from typing import TYPE_CHECKING, Any, NamedTuple

from fertui.chemistry.names import IONS, MICRONUTRIENTS
from fertui.logbook.entries import Entry
from fertui.paper.handover import said
from fertui.paper.page import Page, amount, clock, columns, day, folded, heading, listed, page, section
from fertui.paper.round_sheet import POINT_WORDS
from fertui.quantities import in_unit, shown_in
from fertui.site.model import Loop, Site

if TYPE_CHECKING:
    from fertui.estimate.balance import Balance
    from fertui.loop import Discharge

WATERS = {"make_up": "make-up", "irrigation": "irrigation", "drain": "drain", "condensate": "condensate"}
ACTS = ("recipe", "setpoint", "batch", "dose", "disinfection", "crop")
"""Kinds listed one by one; acid and stock, used every day, are listed as sums."""

Row = tuple[str, ...]


class Reported(NamedTuple):
    """A loop over a period: ``history`` is verbatim, ``effective`` leaves out what was corrected or struck.

    ``crop_water_l`` [L] as the account has it, None where it is not known.
    """

    site: Site
    loop: Loop
    history: Sequence[Entry]
    effective: Sequence[Entry]
    account: Balance
    discharges: Sequence[Discharge]
    crop_water_l: float | None

    @property
    def start(self) -> datetime:
        """Begin of the period."""
        return self.account.start

    @property
    def end(self) -> datetime:
        """End of the period."""
        return self.account.end

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
    lines += section("UPTAKE BY THE ACCOUNT", _uptake(it))
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
        where = ", ".join(part for part in (POINT_WORDS.get(entry.point, entry.point), entry.method) if part)
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
    for ion, taken in _taken(it):
        per_m2 = taken / it.loop.area_m2
        grams, species = mg_l(ion, per_m2)
        per_litre = ("", "") if not known else (amount(taken / known), amount(mg_l(ion, taken / known)[0]))
        rows.append((ion, amount(per_m2), amount(grams / 1000), *per_litre, species))
    note = "mmol/L and mg/L per litre of crop water; means of the estimate, not measured."
    return [*folded(f"{water}; {note}"), *columns(rows, (1, 2, 3, 4))]


def _per_day(it: Reported, litres: float) -> str:
    days = max((it.end - it.start).total_seconds() / 86400.0, 1e-9)
    return f"{litres / it.loop.area_m2 / days:.1f}"


def _taken(it: Reported) -> Iterator[tuple[str, float]]:
    """Uptake of every ion [mmol] over the period; alkalinity is not taken up."""
    return ((ion, -row.uptake) for ion, row in it.account.ions.items() if ion != "HCO3")


def _used(it: Reported) -> Iterator[Row]:
    """Sums of what was used: water in m3, stock and acid in L."""
    for name, words in WATERS.items():
        by_source: dict[str, list[float]] = {}
        for entry in it.of("water"):
            if (litres := entry.number_of(name)) is not None:
                source = entry.text_of("source") if name == "make_up" else ""
                by_source.setdefault(source, []).append(litres)
        for source, amounts in by_source.items():
            label = f"{words} water, {source}" if source else words
            yield label, f"{sum(amounts) / 1000:.2f}", "m3", str(len(amounts))
    yield from _summed(it, "stock", "tank", "stock")
    yield from _summed(it, "acid", "acid", "acid")


def _summed(it: Reported, kind: str, by: str, words: str) -> Iterator[Row]:
    sums: dict[str, list[float]] = {}
    for entry in it.of(kind):
        strength = entry.number_of("strength")
        name = entry.text_of(by) + (f", {strength:g} %" if strength is not None else "")
        sums.setdefault(name, []).append(entry.number_of("litres") or 0.0)
    for name, litres in sums.items():
        yield f"{words} {name}", f"{sum(litres):.1f}", "L", str(len(litres))


def _discharged(it: Reported) -> list[str]:
    if not it.discharges:
        return ["  none"]
    rows: list[Row] = [("reason", "m3", "kg N", "kg P", "kg N/ha", "kg P/ha")]
    for each in it.discharges:
        numbers = (each.litres / 1000, each.kg_n, each.kg_p, each.kg_n_per_ha, each.kg_p_per_ha)
        rows.append((each.reason or "no reason given", *(f"{number:.2f}" for number in numbers)))
    sums = [sum(float(row[place]) for row in rows[1:]) for place in range(1, 6)]
    rows.append(("in all", *(f"{number:.2f}" for number in sums)))
    budget = it.site.budget_n_kg_per_ha
    limit = [f"budget of the year: {budget:g} kg N/ha"] if budget is not None else []
    return [*columns(rows, range(1, 6)), *limit]


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
    for ion, taken in _taken(it):
        yield "uptake", "", ion, f"{taken / it.loop.area_m2:.4g}", "mmol/m2", "", ""
    for each in it.discharges:
        for name, number, unit in (("water", each.litres / 1000, "m3"), ("N", each.kg_n, "kg"), ("P", each.kg_p, "kg")):
            yield "discharge", "", f"{name}, {each.reason}", f"{number:.4g}", unit, "", ""


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
            for ion, taken in _taken(it)
        },
        "used": [dict(zip(("what", "amount", "unit", "entries"), row, strict=True)) for row in _used(it)],
        "discharges": [
            {"reason": d.reason, "m3": d.litres / 1000, "kg_N": d.kg_n, "kg_P": d.kg_p} for d in it.discharges
        ],
        "corrections": list(_corrections(it)),
    }
