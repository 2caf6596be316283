"""Site -> the tables of site.toml, in the order a reader wants them; what is not set is left out."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from fertui.site.model import Composition, Instrument, Loop, Site, Sourced, StockTank, Supply, Water

Tables = dict[str, Any]


def tables_of(site: Site) -> Tables:
    """The tables that ``site_from`` reads back into the same site."""
    return _set(
        site={
            "name": site.name,
            "timezone": site.timezone,
            "units": site.units,
            "lab_turnaround_d": site.lab_turnaround_d,
            "staffed_days": list(site.staffed_days),
        },
        loops=[_loop(each) for each in site.loops],
        waters=[_water(each) for each in site.waters],
        supplies=[_supply(each) for each in site.supplies],
        stock_tanks=[_stock_tank(each) for each in site.stock_tanks],
        targets={
            name: {point: _composition(each) for point, each in points.items()} for name, points in site.targets.items()
        },
        bands=_ranges(site.bands),
        limits=_ranges(site.limits),
        scales={"step_kg": site.scale_step_kg},
        instruments=[_instrument(each) for each in site.instruments],
        budget=_set(N_kg_per_ha=site.budget_n_kg_per_ha, P_kg_per_ha=site.budget_p_kg_per_ha),
    )


def _loop(loop: Loop) -> Tables:
    return _set(
        name=loop.name,
        layout=loop.layout,
        area_m2=loop.area_m2,
        crop=loop.crop,
        stage=loop.stage,
        medium=loop.medium,
        target=loop.target,
        water=loop.water,
        stock_tanks=list(loop.stock_tanks),
        tank_l=loop.tank_l,
        drain_store=loop.drain_store,
        drain_store_l=loop.drain_store_l,
        medium_volume_l_per_m2=loop.medium_volume_l_per_m2,
        root_zone_water_l_per_m2=loop.root_zone_water_l_per_m2,
        capacity_meq_per_l=loop.capacity_meq_per_l,
        feed_EC=loop.feed_ec,
        feed_pH=loop.feed_ph,
        drain_share=loop.drain_share,
        premix_EC=loop.premix_ec,
        drain_fraction=loop.drain_fraction,
        crop_water_l_per_m2_d=loop.crop_water_l_per_m2_d,
        extract_factors=dict(loop.extract_factors),
        bands=_ranges(loop.bands),
        limits=_ranges(loop.limits),
        sources=dict(loop.sources),
    )


def _water(water: Water) -> Tables:
    return {"name": water.name, **_composition(water.composition)}


def _composition(composition: Composition) -> Tables:
    return _set(
        EC=composition.ec,
        pH=composition.ph,
        ions=dict(composition.ions),
        micronutrients=dict(composition.micronutrients),
        source=composition.source,
    )


def _supply(supply: Supply) -> Tables:
    return _set(
        name=supply.name,
        kind=supply.kind,
        strength_pct=supply.strength_pct,
        density_kg_per_l=supply.density_kg_per_l,
        label_pct=dict(supply.label_pct),
        amount_kg=supply.amount_kg,
        price_per_kg=supply.price_per_kg,
        bag_kg=supply.bag_kg,
    )


def _stock_tank(tank: StockTank) -> Tables:
    return _set(
        name=tank.name,
        letter=tank.letter,
        litres=tank.litres,
        dilution=tank.dilution,
        storage_temperature_c=tank.storage_temperature_c,
        salts_kg=dict(tank.salts_kg),
        source=tank.source,
    )


def _instrument(instrument: Instrument) -> Tables:
    return _set(
        name=instrument.name,
        kind=instrument.kind,
        compensated=instrument.compensated,
        step_kg=instrument.step_kg,
        capacity_kg=instrument.capacity_kg,
        digits=instrument.digits,
    )


def _ranges(points: Mapping[str, Mapping[str, Sourced]]) -> Tables:
    return {
        point: {
            what.replace(" ", "_"): _set(low=each.low, high=each.high, source=each.source)
            for what, each in ranges.items()
        }
        for point, ranges in points.items()
    }


def _set(**values: Any) -> Tables:
    """The values that are set: TOML has no word for "not given"."""
    return {key: value for key, value in values.items() if value not in (None, "", [], {})}
