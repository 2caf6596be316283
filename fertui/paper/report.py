"""The report for a consultant or an inspector: what was measured, taken up, dosed and discharged, with corrections."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from datetime import datetime
from typing import TYPE_CHECKING

from fertui.chemistry.names import ATOMIC_WEIGHT, IONS
from fertui.logbook.entries import Entry
from fertui.paper.page import Page, amount, clock, columns, heading, section
from fertui.site.model import Loop, Site

if TYPE_CHECKING:
    from fertui.estimate.balance import Balance
    from fertui.loop import Discharge


def report(
    site: Site,
    loop: Loop,
    history: Sequence[Entry],
    effective: Sequence[Entry],
    account: Balance,
    discharges: Sequence[Discharge],
    crop_water_l: float | None,
) -> Page:
    """Everything of a loop between two times: ``history`` is verbatim, ``effective`` leaves out what was corrected."""
    start, end = account.start, account.end
    span = [entry for entry in effective if start <= entry.at <= end]
    period = f"{clock(start, site.timezone)} to {clock(end, site.timezone)}"
    lines = heading(f"{site.name}: {loop.name}, report", f"{period}; {loop.crop} on {loop.medium}, {loop.area_m2:g} m2")
    lines += section("Analyses", _analyses(span, site.timezone))
    lines += section("Uptake by the account", columns(_uptake(account, loop, crop_water_l), (1, 2, 3)))
    lines += section("Doses, batches, acid", _done(span, site.timezone))
    lines += section("Discharges by reason", columns(_discharged(discharges), (1, 2, 3, 4, 5)))
    lines += section("Calibrations", _said(span, "calibration", site.timezone))
    lines += section("Corrected and struck entries", _corrections(history, start, end, site.timezone))
    data = {
        "loop": loop.name,
        "from": start,
        "to": end,
        "uptake": [list(row) for row in _uptake(account, loop, crop_water_l)[1:]],
        "discharges": [{"reason": d.reason, "m3": d.litres / 1000, "kg_N": d.kg_n, "kg_P": d.kg_p} for d in discharges],
    }
    return Page("\n".join(lines), data, tuple(_uptake(account, loop, crop_water_l)))


def _analyses(entries: Sequence[Entry], timezone: str) -> list[str]:
    rows: list[tuple[str, ...]] = [("taken", "point", "unit", *IONS)]
    for entry in entries:
        if entry.kind == "analysis":
            head = (clock(entry.at, timezone)[4:15], entry.point)
            rows.append((*head, "mmol/L", *(amount(entry.number_of(ion)) for ion in IONS)))
            rows.append(("", "", "mg/L", *(amount(_mg(ion, entry.number_of(ion))) for ion in IONS)))
    return columns(rows, range(3, 13)) if len(rows) > 1 else []


ELEMENT = {
    "NO3": "N", "NH4": "N", "H2PO4": "P", "SO4": "S", "K": "K", "Ca": "Ca", "Mg": "Mg", "Na": "Na", "Cl": "Cl",
}  # fmt: skip
"""What mg/L counts of an ion in this report: N, P and S as element; HCO3 as the ion."""


def _mg(ion: str, mmol_l: float | None) -> float | None:
    if mmol_l is None:
        return None
    weight = ATOMIC_WEIGHT[ELEMENT[ion]] if ion in ELEMENT else 61.016
    return mmol_l * weight


def _uptake(account: Balance, loop: Loop, crop_water_l: float | None) -> list[tuple[str, ...]]:
    rows: list[tuple[str, ...]] = [("ion", "mol", "mmol/m2", "mmol per L of crop water")]
    for ion, row in account.ions.items():
        if ion != "HCO3":
            taken = -row.uptake
            per_litre = amount(taken / crop_water_l) if crop_water_l else ""
            rows.append((ion, amount(taken / 1000), amount(taken / loop.area_m2), per_litre))
    return rows


def _discharged(discharges: Sequence[Discharge]) -> list[tuple[str, ...]]:
    if not discharges:
        return []
    rows: list[tuple[str, ...]] = [("reason", "m3", "kg N", "kg P", "kg N/ha", "kg P/ha")]
    for each in discharges:
        numbers = (each.litres / 1000, each.kg_n, each.kg_p, each.kg_n_per_ha, each.kg_p_per_ha)
        rows.append((each.reason, *(f"{number:.2f}" for number in numbers)))
    return rows


def _done(entries: Sequence[Entry], timezone: str) -> list[str]:
    kinds = ("dose", "batch", "acid", "disinfection", "recipe", "setpoint")
    return [line for kind in kinds for line in _said(entries, kind, timezone)]


def _said(entries: Sequence[Entry], kind: str, timezone: str) -> list[str]:
    return [
        f"{clock(entry.at, timezone)} {kind} {words(entry)} by {entry.by}" for entry in entries if entry.kind == kind
    ]


def words(entry: Entry) -> str:
    """The values of an entry as written."""
    return ", ".join(f"{value.name} {value.written}" for value in entry.values)


def _corrections(history: Sequence[Entry], start: datetime, end: datetime, timezone: str) -> list[str]:
    by_number: Mapping[int | None, Entry] = {entry.number: entry for entry in history}
    lines = []
    for entry in history:
        old = by_number.get(entry.supersedes) if entry.supersedes is not None else None
        if old is not None and start <= entry.at <= end:
            now = "struck" if entry.void else words(entry)
            lines.append(
                f"{entry.number} for {old.number} ({old.kind} of {clock(old.at, timezone)}): {words(old)} -> {now}; "
                f"by {entry.by}, {clock(entry.entered, timezone)}: {entry.why}"
            )
    return lines
