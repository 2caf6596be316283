"""Compositions as arrays: waters, recipes, salts by the kilogram, acids by the litre, stocks by what was mixed."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from fertui.catalogue.acids import acid
from fertui.catalogue.figures import CatalogueError
from fertui.catalogue.supplies import contents
from fertui.chemistry.ions import INDEX, IONS, Array
from fertui.logbook.entries import Entry
from fertui.logbook.kinds import KINDS
from fertui.site.model import Composition, Loop, Site, StockTank, Supply
from fertui.site.presets import target_of


def array(ions: Mapping[str, float | Array]) -> Array:
    """Composition (10,) or (M, 10) [mmol/L] of a mapping; names that are no macro-ion (micronutrients) are left out."""
    columns = np.broadcast_arrays(*(np.asarray(ions.get(ion, 0.0), dtype=float) for ion in IONS))
    return np.stack(columns, axis=-1)


def mapping_of(composition: Array) -> dict[str, float | Array]:
    """Ion name -> number of a composition (10,)."""
    return {ion: float(value) for ion, value in zip(IONS, composition, strict=True)}


def entry_ions(entry: Entry) -> dict[str, float]:
    """The macro-ions of a recipe, plan or analysis entry [mmol/L]."""
    return {value.name: value.number for value in entry.values if value.name in INDEX and value.number is not None}


def shelf(site: Site, name: str) -> Supply:
    """The supply of that name on the shelf, else the bare salt or acid of the catalogue."""
    for supply in site.supplies:
        if name.lower() in (supply.name.lower(), supply.kind.lower()):
            return supply
    return Supply(name=name, kind=name)


def per_kg(site: Site, name: str) -> Array:
    """Ions (10,) [mmol/kg] of a supply or salt; raises ``CatalogueError`` for an unknown one."""
    return array(contents(shelf(site, name)))


def of_acid(site: Site, entry: Entry) -> Array:
    """Ions (10,) [mmol] that an acid entry brought: litres, density and strength as entered."""
    name, strength = entry.text_of("acid"), entry.number_of("strength")
    supply = shelf(site, name)
    pct = strength if strength is not None else supply.strength_pct
    if pct is None:
        return np.zeros(len(IONS))
    found = acid(supply.kind)
    return array(found.mmol_per_kg(pct)) * found.density(pct) * (entry.number_of("litres") or 0.0)


def target_feed(site: Site, loop: Loop) -> Composition:
    """The feed the loop aims at: the aim of its target at the dripper, else in the tank."""
    aims = target_of(site, loop)
    return aims.get("feed") or aims.get("tank") or next(iter(aims.values()), Composition())


def batch_contents(site: Site, entry: Entry, before: Array) -> Array:
    """Ions (10,) [mmol per litre of stock] of a batch; old solution left in the tank counts with its share."""
    litres = entry.number_of("litres") or 0.0
    left = entry.number_of("left") or 0.0
    salts = [value for value in entry.values if value.name not in KINDS["batch"].names and value.number]
    if not salts or litres <= 0:
        return before
    mixed = sum(value.number * per_kg(site, value.name) for value in salts if value.number is not None)
    return (mixed + left * before) / litres


def tank_contents(site: Site, tank: StockTank) -> Array:
    """Ions (10,) [mmol per litre of stock] of a stock tank as the site file describes it; zero where it does not."""
    if not tank.salts_kg or tank.litres <= 0:
        return np.zeros(len(IONS))
    return sum((kg * per_kg(site, name) for name, kg in tank.salts_kg.items()), np.zeros(len(IONS))) / tank.litres


def stock_tanks_of(site: Site, loop: Loop) -> tuple[StockTank, ...]:
    """The stock tanks that feed a loop."""
    return tuple(tank for tank in site.stock_tanks if tank.name in loop.stock_tanks)


def stock_by_tank(site: Site, loop: Loop, batches: Sequence[Entry]) -> dict[str, list[tuple[Entry | None, Array]]]:
    """For each stock tank of the loop what it held from each batch on [mmol/L]; the first is the site file's word."""
    held: dict[str, list[tuple[Entry | None, Array]]] = {}
    for tank in stock_tanks_of(site, loop):
        try:
            held[tank.name] = [(None, tank_contents(site, tank))]
        except CatalogueError:
            held[tank.name] = [(None, np.zeros(len(IONS)))]
    for entry in sorted(batches, key=lambda each: each.at):
        name = entry.text_of("tank")
        if name in held:
            held[name].append((entry, batch_contents(site, entry, held[name][-1][1])))
    return held
