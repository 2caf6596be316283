"""How it reads what a crop was given on a day."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from fertui.chemistry.names import IONS
from fertui.cli.views import as_json, words
from fertui.logbook.mixes import Given, Mix
from fertui.paper.page import folded
from fertui.site.model import Loop

PER_KG = 1000.0


def text(given: Given, held: Sequence[Mix], loop: Loop, timezone: str) -> str:
    """Stock, salts and acid of the day, the ions they brought, what the stock tanks held, and which entries say so."""
    rows = [
        ("recipe", given.recipe or "none logged"),
        ("stock", _amounts(given.stock_l, "L")),
        ("salts", _amounts(given.salts_kg, "kg")),
        ("acid", _amounts(given.acid_l, "L")),
        ("brought", _per_m2(given.ions_mmol, loop.area_m2)),
        *((f"{mix.tank} held", _mix(mix, timezone)) for mix in held),
        ("entries", ", ".join(map(str, given.entries)) or "none"),
    ]
    if given.unknown:
        rows.append(("not counted", f"{', '.join(given.unknown)}: no contents known"))
    width = max(len(name) for name, _ in rows)
    lines = [line for name, said in rows for line in folded(said, f"{name:{width}}  ")]
    return "\n".join([f"{loop.name}, {given.day:%a %d %b %Y}: what the crop was given", "", *lines])


def document(given: Given, held: Sequence[Mix], loop: Loop) -> dict[str, Any]:
    """``given --json``."""
    return {
        "schema": "fertui.given/1",
        "loop": loop.name,
        **as_json.plain(given),
        "tanks": [as_json.plain(mix) for mix in held],
    }


def _amounts(amounts: Mapping[str, float], unit: str) -> str:
    return ", ".join(f"{amount:.4g} {unit} {name}" for name, amount in amounts.items()) or "none"


def _per_m2(ions_mmol: Mapping[str, float], area_m2: float) -> str:
    """Ions in the order of compositions, then micronutrients, as mmol per m2."""
    order = [*(ion for ion in IONS if ion in ions_mmol), *(ion for ion in ions_mmol if ion not in IONS)]
    brought = ", ".join(f"{ion} {ions_mmol[ion] / area_m2:.3g}" for ion in order)
    return f"{brought} mmol/m2" if brought else "nothing"


def _mix(mix: Mix, timezone: str) -> str:
    salts = ", ".join(f"{PER_KG * kg:.3g} g/L {salt}" for salt, kg in mix.kg_per_l.items()) or "no salts named"
    left = "; old solution counted in" if mix.blended else "; taken as empty before" if mix.assumed_empty else ""
    return f"{salts} (since {words.local(mix.since, timezone)}, entry {mix.batch}{left})"
