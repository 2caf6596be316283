"""The tables of site.toml -> Site, every value checked against what is possible and against the catalogue."""

from __future__ import annotations

import zoneinfo
from collections.abc import Callable, Collection, Mapping
from typing import Any

from fertui.catalogue.crops import crop, crops
from fertui.catalogue.crops import targets as published_targets
from fertui.catalogue.figures import CatalogueError
from fertui.catalogue.media import medium
from fertui.catalogue.salts import salt
from fertui.catalogue.supplies import contents
from fertui.chemistry.names import IONS, MICRONUTRIENTS
from fertui.site.checks import SiteError, Table, nearest, shortened
from fertui.site.model import (
    LAYOUTS,
    POINTS,
    Composition,
    Instrument,
    Loop,
    Site,
    Sourced,
    StockTank,
    Supply,
    Water,
)

UNITS = ("mmol/L", "meq/L", "mg/L")
DAYS = ("Mon", "Tue", "Wed", "Thu", "Fri", "Sat", "Sun")
INSTRUMENTS = ("EC meter", "pH meter", "ion meter", "thermometer", "water meter", "scale", "other")
METHODS = ("pore", "extract_1_1.5", "paste", "pour_through")
SHARES = ("K share", "Ca share", "Mg share")
RANGED = (*SHARES, "EC", "pH", *IONS, *MICRONUTRIENTS)
"""What a band or limit may be set on: a share [%], EC, pH, an ion [mmol/L] or a micronutrient [umol/L]."""


def site_from(data: Mapping[str, Any], file: str = "site.toml") -> Site:
    """The site that the tables of site.toml describe.

    Raises ``SiteError`` at the first value that is missing, of the wrong type, impossible, unknown or unused; the
    message names file, table, key, value and what is allowed.
    """
    top = Table(data, "top level", file)
    head = top.table("site")
    scales, budget = top.table("scales"), top.table("budget")
    site = Site(
        name=head.name(),
        timezone=_timezone(head),
        units=head.text("units", "mmol/L", UNITS),
        lab_turnaround_d=round(head.number("lab_turnaround_d", 0, 60, "days", 2)),
        staffed_days=_staffed(head),
        waters=_named(top, "waters", _water),
        supplies=_named(top, "supplies", _supply),
        stock_tanks=_named(top, "stock_tanks", _stock_tank),
        targets={name: _target(each) for name, each in _subtables(top.table("targets"))},
        bands=_ranges(top.table("bands")),
        limits=_ranges(top.table("limits")),
        scale_step_kg=scales.number("step_kg", 1e-6, 100, "kg", 0.05),
        instruments=_named(top, "instruments", _instrument),
        budget_n_kg_per_ha=budget.maybe("N_kg_per_ha", 0, 1e5, "kg N per ha and year"),
        budget_p_kg_per_ha=budget.maybe("P_kg_per_ha", 0, 1e5, "kg P per ha and year"),
        loops=_named(top, "loops", _loop),
    )
    for each in (top, head, scales, budget):
        each.close()
    if not site.loops:
        raise SiteError(f"{file}: no loop; a site needs at least one table [[loops]].")
    for place, loop in zip(top.tables("loops"), site.loops, strict=True):
        _check_references(place, loop, site)
    for place, tank in zip(top.tables("stock_tanks"), site.stock_tanks, strict=True):
        _check_salts(place, tank, site)
    return site._replace(loops=tuple(_topped_up(loop, site) for loop in site.loops))


def _topped_up(loop: Loop, site: Site) -> Loop:
    """The loop with its make-up water by name: the first of the site where it names none."""
    return loop._replace(water=site.waters[0].name) if site.waters and not loop.water else loop


def _loop(table: Table) -> Loop:
    read = Loop(
        name=table.name(),
        layout=table.text("layout", among=LAYOUTS),
        area_m2=table.number("area_m2", 0.01, 1e7, "m2"),
        crop=_canonical(table, "crop", lambda each: crop(each).name),
        medium=_canonical(table, "medium", lambda each: medium(each).name),
        stage=table.text("stage", ""),
        target=table.text("target", ""),
        tank_l=table.maybe("tank_l", 0.1, 1e8, "L"),
        drain_store_l=table.maybe("drain_store_l", 0.1, 1e8, "L"),
        drain_store=table.text("drain_store", ""),
        medium_volume_l_per_m2=table.maybe("medium_volume_l_per_m2", 0, 1000, "L per m2"),
        root_zone_water_l_per_m2=table.maybe("root_zone_water_l_per_m2", 0, 1000, "L per m2"),
        capacity_meq_per_l=table.maybe("capacity_meq_per_l", 0, 5000, "meq per L of medium"),
        stock_tanks=table.texts("stock_tanks"),
        water=table.text("water", ""),
        feed_ec=table.maybe("feed_EC", 0, 20, "mS/cm"),
        feed_ph=table.maybe("feed_pH", 2, 10),
        drain_share=table.maybe("drain_share", 0, 1),
        premix_ec=table.maybe("premix_EC", 0, 20, "mS/cm"),
        drain_fraction=table.number("drain_fraction", 0, 0.99, "", 0.3),
        crop_water_l_per_m2_d=table.maybe("crop_water_l_per_m2_d", 0, 50, "L per m2 and day"),
        extract_factors=table.numbers("extract_factors", METHODS, 0.01, 100, ""),
        bands=_ranges(table.table("bands")),
        limits=_ranges(table.table("limits")),
        sources=_loop_sources(table.table("sources")),
    )
    table.close()
    return read


def _loop_sources(table: Table) -> dict[str, str]:
    return {table.checked_key(key): table.text(key) for key in table.data}


def _water(table: Table) -> Water:
    name = table.name()
    composition = _composition(table, table.text("source", ""))
    table.close()
    return Water(name, composition)


def _target(table: Table) -> dict[str, Composition]:
    table.only(POINTS)
    points = {}
    for point in table.data:
        inner = table.table(point)
        points[point] = _composition(inner, inner.said("source"))
        inner.close()
    return points


def _composition(table: Table, source: str) -> Composition:
    """Ions, micronutrients, EC and pH of a table, which the caller closes."""
    positive = tuple(ion for ion in IONS if ion != "HCO3")
    ions = table.table("ions")
    ions.only(IONS)
    return Composition(
        ions={ion: ions.number(ion, 0 if ion in positive else -100, 1000, "mmol/L") for ion in ions.data},
        micronutrients=table.numbers("micronutrients", MICRONUTRIENTS, 0, 1e5, "umol/L"),
        ec=table.maybe("EC", 0, 100, "mS/cm"),
        ph=table.maybe("pH", 0, 14),
        source=source,
    )


def _supply(table: Table) -> Supply:
    supply = Supply(
        name=table.name(),
        kind=table.text("kind"),
        strength_pct=table.maybe("strength_pct", 0.01, 100, "mass %"),
        density_kg_per_l=table.maybe("density_kg_per_l", 0.5, 3, "kg/L"),
        label_pct=table.numbers("label_pct", (), 0, 100, "% of the product"),
        amount_kg=table.maybe("amount_kg", 0, 1e7, "kg"),
        price_per_kg=table.maybe("price_per_kg", 0, 1e5),
        bag_kg=table.maybe("bag_kg", 1e-3, 1e5, "kg"),
    )
    table.close()
    try:
        contents(supply)
    except CatalogueError as trouble:
        raise SiteError(f"{table.file}, {table.place}: {trouble}") from trouble
    return supply


def _stock_tank(table: Table) -> StockTank:
    tank = StockTank(
        name=table.name(),
        litres=table.number("litres", 0.1, 1e6, "L"),
        dilution=table.number("dilution", 1, 10000, "(100 for a 100x stock)", 100.0),
        letter=table.text("letter", ""),
        salts_kg=table.numbers("salts_kg", (), 0, 1e6, "kg"),
        storage_temperature_c=table.number("storage_temperature_c", -10, 60, "C", 10.0),
        source=table.text("source", ""),
    )
    table.close()
    return tank


def _instrument(table: Table) -> Instrument:
    digits = table.maybe("digits", 1, 12)
    instrument = Instrument(
        name=table.name(),
        kind=table.text("kind", among=INSTRUMENTS),
        compensated=table.flag("compensated"),
        step_kg=table.maybe("step_kg", 1e-6, 100, "kg"),
        capacity_kg=table.maybe("capacity_kg", 1e-3, 1e5, "kg"),
        digits=None if digits is None else round(digits),
    )
    table.close()
    return instrument


def _ranges(table: Table) -> dict[str, dict[str, Sourced]]:
    """Point -> what -> range; "K_share" and "K share" are the same."""
    table.only(POINTS)
    return {point: _ranges_of_point(table.table(point)) for point in table.data}


def _ranges_of_point(table: Table) -> dict[str, Sourced]:
    read: dict[str, Sourced] = {}
    for key in table.data:
        what = key.replace("_share", " share")
        if what not in RANGED:
            allowed = tuple(each.replace(" ", "_") for each in RANGED)
            near = nearest(key, allowed)
            raise SiteError(
                f"{table.file}, {table.place}: unknown key {shortened(key)}{near}; allowed: {', '.join(allowed)}."
            )
        if what in read:
            raise SiteError(f"{table.file}, {table.place}: {what} is given twice.")
        read[what] = _range(table.table(key), what)
    return read


def _range(table: Table, what: str) -> Sourced:
    top = 100.0 if what in SHARES else 14.0 if what == "pH" else 1e5
    low, high = table.maybe("low", 0, top), table.maybe("high", 0, top)
    source = table.said("source")
    table.close()
    if low is None and high is None:
        raise SiteError(f"{table.file}, {table.place}: low, high or both are missing.")
    if low is not None and high is not None and low > high:
        raise table.refuse("low", f"larger than high = {high:g}.")
    return Sourced(low, high, source)


def _named(top: Table, key: str, read: Callable[[Table], Any]) -> tuple[Any, ...]:
    """What the tables [[key]] describe, their names all different."""
    found = tuple(read(each) for each in top.tables(key))
    names = [each.name for each in found]
    for name in names:
        if names.count(name) > 1:
            raise SiteError(f"{top.file}: two tables [[{key}]] have the name {shortened(name)}; names must differ.")
    return found


def _subtables(table: Table) -> list[tuple[str, Table]]:
    return [(table.checked_key(key), table.table(key)) for key in table.data]


def _timezone(head: Table) -> str:
    name = head.text("timezone")
    if why := timezone_trouble(name):
        raise head.refuse("timezone", why)
    return name


def timezone_trouble(name: str) -> str:
    """Why a name is not taken as a time zone, "" where it is one."""
    try:
        zoneinfo.ZoneInfo(name)
    except (zoneinfo.ZoneInfoNotFoundError, ValueError, OSError):
        return f"a zone like Europe/Amsterdam or UTC is allowed{nearest(name, zoneinfo.available_timezones())}."
    return ""


def _staffed(head: Table) -> tuple[str, ...]:
    days = head.texts("staffed_days", DAYS)
    if not days or any(day not in DAYS for day in days):
        raise head.refuse("staffed_days", f"a list of one or more of {', '.join(DAYS)} is allowed.")
    return days


def _canonical(table: Table, key: str, find: Callable[[str], str]) -> str:
    """The catalogue's name for what a key says."""
    try:
        return find(table.text(key))
    except CatalogueError as trouble:
        raise table.refuse(key, str(trouble)) from trouble


def _check_references(table: Table, loop: Loop, site: Site) -> None:
    """What a loop names must exist, and what its layout needs must be given."""
    preset = crop(loop.crop)
    waters = [each.name for each in site.waters]
    tanks = [each.name for each in site.stock_tanks]
    targets = (*site.targets, *published_targets(), *(each.name for each in crops()))
    if loop.water:
        table.text("water", among=waters or ("(no [[waters]] yet)",))
    if loop.stage:
        table.text("stage", among=tuple(preset.stages))
    if loop.target:
        table.text("target", among=targets)
    for name in loop.stock_tanks:
        if name not in tanks:
            raise table.refuse("stock_tanks", f"{shortened(name)} is no [[stock_tanks]]{_known(name, tanks)}.")
    if loop.layout == "shared-tank" and loop.tank_l is None:
        raise SiteError(
            f"{table.file}, {table.place}: tank_l is missing; layout shared-tank needs the litres of its tank."
        )
    if loop.layout == "drain-blend" and loop.drain_share is not None and loop.premix_ec is not None:
        raise table.refuse("premix_EC", "either drain_share or premix_EC is allowed, not both.")


def _check_salts(table: Table, tank: StockTank, site: Site) -> None:
    supplies = {each.name for each in site.supplies}
    for name in tank.salts_kg:
        if name in supplies:
            continue
        try:
            salt(name)
        except CatalogueError as trouble:
            raise SiteError(f"{table.file}, {table.place}: salts_kg: {trouble}") from trouble


def _known(name: str, names: Collection[str]) -> str:
    return f"{nearest(name, names)}; known: {', '.join(names)}" if names else "; there are none yet"
