"""Supplies and stock tanks as rows: what stands where, how strong, how much is left, what to beware of."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import datetime
from typing import TYPE_CHECKING, NamedTuple

from fertui.logbook.entries import Entry
from fertui.site.model import Loop, Site, StockTank

if TYPE_CHECKING:
    from fertui.catalogue.cautions import Caution
    from fertui.estimate.notices import StockLeft
    from fertui.planning.last_mix import LastMix


class SupplyRow(NamedTuple):
    """One supply; ``label`` is its own analysis or strength where it differs from the formula, ``signal`` the gravest
    severity among its own cautions: danger, warning or ''."""

    name: str
    kind: str
    formula: str
    label: str
    density_kg_per_l: float | None
    price_per_kg: float | None
    amount_kg: float | None
    hazards: tuple[str, ...]
    signal: str = ""


class StockRow(NamedTuple):
    """One stock tank of a loop: since when, how many litres and days are left [None: not known]."""

    name: str
    letter: str
    litres: float
    dilution: float
    mixed_at: datetime | None
    recipe: str
    litres_left: float | None
    days_left: float | None


def supply_rows(site: Site) -> tuple[SupplyRow, ...]:
    """Every supply of a site with the cautions of its strength."""
    from fertui.catalogue.acids import Acid
    from fertui.catalogue.cautions import cautions_of, first
    from fertui.catalogue.supplies import of_supply

    rows = []
    for supply in site.supplies:
        found = of_supply(supply)
        label = ", ".join(f"{name} {percent:g} %" for name, percent in supply.label_pct.items())
        if supply.strength_pct is not None:
            label = f"{supply.strength_pct:g} %" + (f", {label}" if label else "")
        density = supply.density_kg_per_l
        if density is None and supply.strength_pct is not None and isinstance(found, Acid):
            density = found.density(supply.strength_pct)
        cautions = cautions_of([supply])
        hazards, own = tuple(each.text for each in cautions), {each.severity for each in cautions if each != first()}
        signal = next((word for word in ("danger", "warning") if word in own), "")
        rows.append(
            SupplyRow(
                supply.name,
                supply.kind,
                found.formula,
                label,
                density,
                supply.price_per_kg,
                supply.amount_kg,
                hazards,
                signal,
            )
        )
    return tuple(rows)


def stock_rows(site: Site, loop: Loop, entries: Sequence[Entry], at: datetime) -> tuple[StockRow, ...]:
    """Stock tanks of a loop: what they carry since when, and what is left by the litres logged."""
    from fertui.estimate.notices import stock_left

    left = stock_left(site, loop, entries, at)
    tanks = [tank for tank in site.stock_tanks if tank.name in loop.stock_tanks]
    return tuple(_stock_row(tank, entries, left.get(tank.name)) for tank in tanks)


def _stock_row(tank: StockTank, entries: Sequence[Entry], left: StockLeft | None) -> StockRow:
    batches = [entry for entry in entries if entry.kind == "batch" and entry.text_of("tank") == tank.name]
    batch = batches[-1] if batches else None
    recipe, mixed = (batch.text_of("recipe"), batch.at) if batch is not None else ("", None)
    litres, days = (left.litres, left.days) if left is not None else (None, None)
    return StockRow(tank.name, tank.letter, tank.litres, tank.dilution, mixed, recipe, litres, days)


def last_mixes(site: Site, rows: Sequence[StockRow], days_left: float, stop_days_before: float) -> tuple[LastMix, ...]:
    """What to mix of each stock tank until the crop's end; tanks whose use is not logged are left out."""
    from fertui.planning.last_mix import last_mix

    tanks = {tank.name: tank for tank in site.stock_tanks}
    found = []
    for row in rows:
        if row.litres_left is not None and row.days_left:
            feed = row.litres_left / row.days_left * row.dilution
            found.append(
                last_mix(
                    tanks[row.name],
                    days_left=days_left,
                    feed_l_per_d=feed,
                    left_l=row.litres_left,
                    stop_days_before=stop_days_before,
                )
            )
    return tuple(found)


def acid_cautions(site: Site, acid: str, strength_pct: float | None) -> tuple[Caution, ...]:
    """Cautions of an acid or lye at the strength read off its label."""
    from fertui.catalogue.cautions import cautions_of
    from fertui.site.model import Supply

    shelved = next((supply for supply in site.supplies if supply.name == acid), None)
    supply = shelved or Supply(acid, acid, strength_pct)
    return cautions_of([supply if strength_pct is None else supply._replace(strength_pct=strength_pct)])
