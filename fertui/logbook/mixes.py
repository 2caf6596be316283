"""Recipes and batches: what a stock tank held, and what the crop was given on any day, told from the entries alone."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from datetime import UTC, date, datetime, time, timedelta
from typing import NamedTuple

from fertui.logbook.entries import Entry
from fertui.logbook.kinds import KINDS
from fertui.logbook.times import zone
from fertui.site.model import Site, StockTank, Supply

LONGEST_SPAN = timedelta(days=3)
"""An amount without a day of its own reaches back to the entry before it, but no further than this."""


class Mix(NamedTuple):
    """What a stock tank held from a batch on: kg of each salt per litre, and which entries say so.

    ``blended``: old solution was left and counted in. ``assumed_empty``: the batch does not say what was left.
    """

    tank: str
    since: datetime
    kg_per_l: Mapping[str, float]
    batch: int | None
    recipe: str
    blended: bool
    assumed_empty: bool


class Given(NamedTuple):
    """What one loop was given on one local day: litres of each stock, kg of each salt, mmol of each ion.

    ``ions_mmol`` (micronutrients in it too, in mmol) leaves out what the catalogue does not know; ``unknown`` names it.
    """

    day: date
    recipe: str
    stock_l: Mapping[str, float]
    salts_kg: Mapping[str, float]
    acid_l: Mapping[str, float]
    ions_mmol: Mapping[str, float]
    unknown: tuple[str, ...] = ()
    entries: tuple[int, ...] = ()


def recipe_at(entries: Sequence[Entry], loop: str, at: datetime) -> Entry | None:
    """The recipe in force in a loop at a time: the last one that began before it."""
    begun = [entry for entry in entries if entry.kind == "recipe" and entry.loop == loop and entry.at <= at]
    return max(begun, key=lambda entry: (entry.at, entry.number or 0), default=None)


def mixes(entries: Sequence[Entry], tank: str) -> tuple[Mix, ...]:
    """What a stock tank held, batch after batch, oldest first.

    Left-over solution is blended: kg per litre = (kg weighed + litres left x kg per litre before) / litres in all.
    """
    batches = [entry for entry in entries if entry.kind == "batch" and entry.text_of("tank") == tank]
    held: list[Mix] = []
    for batch in sorted(batches, key=lambda entry: (entry.at, entry.number or 0)):
        before = held[-1].kg_per_l if held else {}
        left = batch.number_of("left")
        kg = _salts(batch)
        for salt, strength in before.items():
            kg[salt] = kg.get(salt, 0.0) + (left or 0.0) * strength
        litres = batch.number_of("litres") or 0.0
        held.append(
            Mix(
                tank=tank,
                since=batch.at,
                kg_per_l={salt: amount / litres for salt, amount in kg.items() if amount} if litres else {},
                batch=batch.number,
                recipe=batch.text_of("recipe"),
                blended=bool(left and before),
                assumed_empty=left is None and bool(before),
            )
        )
    return tuple(held)


def mix_at(entries: Sequence[Entry], tank: str, at: datetime) -> Mix | None:
    """What a stock tank held at a time, None before its first batch."""
    return next((mix for mix in reversed(mixes(entries, tank)) if mix.since <= at), None)


def as_mixed(tanks: Sequence[StockTank], entries: Sequence[Entry]) -> tuple[StockTank, ...]:
    """Stock tanks, full, with what their last batch put into them; one without a batch as the site file says."""
    mixed = []
    for tank in tanks:
        last = mixes(entries, tank.name)[-1:]
        held = {salt: kg * tank.litres for mix in last for salt, kg in mix.kg_per_l.items()}
        mixed.append(tank._replace(salts_kg=held) if last else tank)
    return tuple(mixed)


def given_on(entries: Sequence[Entry], site: Site, loop: str, day: date) -> Given:
    """What a loop was given on a local day, from its stock, dose and acid entries.

    Amounts that cover several days are shared out evenly over their time.
    """
    here = zone(site.timezone)
    start = datetime.combine(day, time(), here).astimezone(UTC)
    end = datetime.combine(day + timedelta(days=1), time(), here).astimezone(UTC)
    stock: dict[str, float] = {}
    acid: dict[str, float] = {}
    salts: dict[str, float] = {}
    told: list[int] = []
    for entry, share in _shares([each for each in entries if each.loop == loop], site, start, end):
        litres = share * (entry.number_of("litres") or 0.0)
        told.append(entry.number or 0)
        if entry.kind == "stock":
            _add(stock, entry.text_of("tank"), litres)
            mix = mix_at(entries, entry.text_of("tank"), entry.at)
            for salt, strength in (mix.kg_per_l if mix else {}).items():
                _add(salts, salt, litres * strength)
        elif entry.kind == "acid":
            _add(acid, entry.text_of("acid"), litres)
        else:
            _add(salts, entry.text_of("salt"), entry.number_of("kg") or 0.0)
    recipe = recipe_at(entries, loop, end - timedelta(microseconds=1))
    ions, unknown = _ions(salts, acid, site)
    name = (recipe.text_of("name") or f"recipe {recipe.number}") if recipe else ""
    return Given(day, name, stock, salts, acid, ions, unknown, tuple(told))


def _shares(entries: Sequence[Entry], site: Site, start: datetime, end: datetime) -> list[tuple[Entry, float]]:
    """Stock, dose and acid entries with the share of their time that falls between two times."""
    found: list[tuple[Entry, float]] = []
    before: dict[tuple[str, str], datetime] = {}
    chosen = (entry for entry in entries if entry.kind in ("stock", "dose", "acid"))
    for entry in sorted(chosen, key=lambda entry: (entry.at, entry.number or 0)):
        key = (entry.kind, entry.text_of("tank") or entry.text_of("acid"))
        first, last = span(entry, before.get(key), site)
        before[key] = last
        if first == last:
            share = float(start <= first < end)
        else:
            share = max((min(last, end) - max(first, start)) / (last - first), 0.0)
        if share > 0.0:
            found.append((entry, share))
    return found


def span(entry: Entry, previous: datetime | None, site: Site) -> tuple[datetime, datetime]:
    """Time an entry's amount covers: its local day, or from the entry before it; a moment for what is done at once."""
    if not KINDS[entry.kind].spans:
        return entry.at, entry.at
    if entry.whole_day:
        day = entry.at.astimezone(zone(site.timezone)).date() + timedelta(days=1)
        return entry.at, datetime.combine(day, time(), zone(site.timezone)).astimezone(UTC)
    if previous is None or previous >= entry.at:
        return entry.at, entry.at
    return max(previous, entry.at - LONGEST_SPAN), entry.at


def _salts(batch: Entry) -> dict[str, float]:
    own = KINDS["batch"].names
    return {value.name: value.number for value in batch.values if value.name not in own and value.number is not None}


def _ions(
    salts_kg: Mapping[str, float], acid_l: Mapping[str, float], site: Site
) -> tuple[Mapping[str, float], tuple[str, ...]]:
    from fertui.catalogue.supplies import contents
    from fertui.refusals import Refusal

    supplies = {supply.name: supply for supply in site.supplies}
    ions: dict[str, float] = {}
    unknown: list[str] = []
    for name, kg in (*salts_kg.items(), *_acid_kg(acid_l, supplies, unknown)):
        try:
            per_kg = contents(supplies.get(name) or Supply(name, name))
        except Refusal:
            unknown.append(name)
            continue
        for ion, mmol in per_kg.items():
            _add(ions, ion, kg * mmol)
    return ions, tuple(unknown)


def _acid_kg(
    acid_l: Mapping[str, float], supplies: Mapping[str, Supply], unknown: list[str]
) -> list[tuple[str, float]]:
    from fertui.catalogue.acids import acid

    weighed = []
    for name, litres in acid_l.items():
        supply = supplies.get(name)
        if supply is None or supply.strength_pct is None:
            unknown.append(name)
            continue
        density = supply.density_kg_per_l or acid(supply.kind).density(supply.strength_pct)
        weighed.append((name, litres * density))
    return weighed


def _add(sums: dict[str, float], name: str, amount: float) -> None:
    sums[name] = sums.get(name, 0.0) + amount
