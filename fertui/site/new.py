"""A new site from what its grower knows; every default is written out with where it comes from."""

from __future__ import annotations

import os
import re
from collections.abc import Sequence
from datetime import UTC, datetime
from pathlib import Path

from fertui.catalogue.acids import Acid
from fertui.catalogue.crops import crop as crop_preset
from fertui.catalogue.figures import CatalogueError
from fertui.catalogue.media import medium as medium_preset
from fertui.catalogue.salts import Salt
from fertui.catalogue.supplies import contents, is_acid, substance
from fertui.chemistry.names import IONS
from fertui.site.checks import SiteError
from fertui.site.files import NAME, write_site
from fertui.site.model import Composition, Loop, Site, StockTank, Supply, Water
from fertui.site.presets import bands_of, limits_of, root_zone_water, target_of
from fertui.site.reading import site_from
from fertui.site.writing import tables_of

COMMON_SALTS = (
    "calcium nitrate double salt",
    "potassium nitrate",
    "potassium sulfate",
    "monopotassium phosphate",
    "magnesium sulfate",
    "magnesium nitrate",
    "iron DTPA",
    "manganese sulfate",
    "zinc sulfate",
    "borax",
    "copper sulfate",
    "sodium molybdate",
)
"""What stands in most sheds that mix their own stock (common practice, no source)."""

STOCK_TANKS = (("calcium", "A"), ("sulfate and phosphate", "B"))
PURE_WATER = ("pure", "pure water", "rain", "rainwater")
DRAIN_STORE_L_PER_M2 = 2.5
DRAIN_STORE_SOURCE = "unverified preset: 20-30 m3 per ha (storage table of Flanders, 10 Oct 2008)"
STRENGTH = re.compile(r"(?P<name>.*\S)\s+(?P<pct>\d+(?:[.,]\d+)?)\s*(?P<sign>%?)")


def new_site(
    folder: Path | str,
    *,
    crop: str,
    medium: str,
    layout: str,
    area_m2: float,
    tank_l: float | None = None,
    drain_store_l: float | None = None,
    medium_volume_l_per_m2: float | None = None,
    root_zone_water_l_per_m2: float | None = None,
    target: str | None = None,
    supplies: Sequence[str] | None = None,
    timezone: str | None = None,
    name: str | None = None,
    loop: str | None = None,
    water: str | None = None,
    water_report: Composition | None = None,
    stage: str | None = None,
) -> Site:
    """Write the ``site.toml`` of a new site with one loop into a folder, made where it is absent; return the site.

    Volumes [L], per m2 where the name says so. ``supplies``: names or formulas, an acid with its strength ("nitric acid
    60 %"); None: ``COMMON_SALTS``. ``water``: a name, or "pure" for water without ions;
    ``water_report``: what it holds. ``stage``: of the crop.
    Raises ``SiteError``: a site there already, or a value that site.toml would refuse.
    """
    path = Path(folder)
    refuse_place(path)
    first = Loop(
        name=loop or _canonical_crop(crop), layout=layout, area_m2=area_m2, crop=_canonical_crop(crop),
        medium=_canonical_medium(medium), stage=stage or "", target=target or "", tank_l=tank_l,
        drain_store_l=drain_store_l, medium_volume_l_per_m2=medium_volume_l_per_m2,
        root_zone_water_l_per_m2=root_zone_water_l_per_m2,
    )  # fmt: skip
    site = Site(
        name=name or path.resolve().name or "site",
        timezone=timezone or machine_timezone(),
        loops=(first,),
        waters=(_water(water, water_report),),
        supplies=tuple(supply_from(each) for each in (COMMON_SALTS if supplies is None else supplies)),
    )
    site = site_from(tables_of(_with_defaults(site)), f"the new {NAME}")
    _make(path)
    write_site(site, path, datetime.now(UTC))
    return site


def refuse_place(folder: Path) -> None:
    """Raises ``SiteError`` where the folder holds a site already, or cannot be made or written."""
    if (folder / NAME).exists():
        raise SiteError(f"{folder}: there is a {NAME} already; nothing was changed. Add a loop to it with an editor.")
    there = next(each for each in (folder.absolute(), *folder.absolute().parents) if each.exists())
    if not there.is_dir() or not os.access(there, os.W_OK | os.X_OK):
        raise SiteError(f"{folder} cannot be made a site folder: {there} is no folder that you may write to.")


def supply_from(text: str) -> Supply:
    """A supply from a name or formula, with the strength of an acid or the content of a chelate behind it.

    Raises ``SiteError`` where the name is unknown or ambiguous, an acid comes without its strength or with one that
    cannot be, or a product needs its label.

    >>> supply_from("nitric acid 60 %")
    Supply(name='nitric acid 60 %', kind='nitric acid', strength_pct=60.0, density_kg_per_l=None, label_pct={}, \
amount_kg=None, price_per_kg=None, bag_kg=None)
    """
    said = STRENGTH.fullmatch(text.strip())
    if said and not said["sign"]:
        if is_acid(said["name"]):
            raise SiteError(f"{text.strip()[:60]!r}: per cent by weight? Then write '{text.strip()[:60]} %'.")
        said = None
    pct = float(said["pct"].replace(",", ".")) if said else None
    try:
        supply = _supply(substance(said["name"] if said else text.strip()), pct, text)
        contents(supply)
    except CatalogueError as trouble:
        raise SiteError(str(trouble)) from trouble
    return supply


def _supply(found: Salt | Acid, pct: float | None, text: str) -> Supply:
    if isinstance(found, Acid):
        if pct is None:
            raise SiteError(f"{text[:60]!r} needs the strength on its label in per cent, such as '{found.name} 60 %'.")
        return Supply(name=f"{found.name} {pct:g} %", kind=found.name, strength_pct=pct)
    if pct is None:
        return Supply(name=found.name, kind=found.name)
    if len(found.label_pct) != 1:
        raise SiteError(f"{text[:60]!r}: a percentage goes with an acid or chelate; a label goes in {NAME}.")
    return Supply(name=f"{found.name} {pct:g} %", kind=found.name, label_pct={next(iter(found.label_pct)): pct})


def machine_timezone() -> str:
    """Name of this machine's time zone, "UTC" where it does not say."""
    named = os.environ.get("TZ", "").removeprefix(":")
    if "/" in named and not named.startswith("/"):
        return named
    _, found, zone = os.path.realpath("/etc/localtime").partition("/zoneinfo/")
    return zone if found and not zone.startswith(("posix", "right")) else "UTC"


def first_steps(site: Site) -> tuple[str, ...]:
    """What to enter first at a new site, most useful first."""
    loop = site.loops[0]
    where = "the tank" if loop.layout == "shared-tank" else "feed and drain (or root zone)"
    steps = [f"An analysis of {where} (key a, or `fertui import`): without one no ion of yours is known."]
    if not site.waters[0].composition.ions:
        steps.append(
            f"The report of the water {site.waters[0].name!r} (key a, point source): acid and salts depend on it."
        )
    steps.append(
        "The daily round (key r): EC, pH, litres of make-up water and stock; two minutes, blank sheet: `fertui round`."
    )
    if medium_preset(loop.medium).warning:
        steps.append(f"About {loop.medium}: {medium_preset(loop.medium).warning}")
    unchecked = [key for key, source in loop.sources.items() if "unverified preset" in source]
    if unchecked:
        steps.append(f"Look over what is preset and unverified in site.toml: {', '.join(unchecked)}, bands and limits.")
    return tuple(steps)


def _with_defaults(site: Site) -> Site:
    """The site with what its grower did not say filled in, each default with its source."""
    tanks = _stock_tanks(site.loops[0])
    site = site._replace(stock_tanks=tanks)
    loop = site.loops[0]._replace(water=site.waters[0].name, stock_tanks=tuple(each.name for each in tanks))
    loop = _with_volumes(loop)
    loop = _with_routine(site, loop)
    points = _own_points(loop)
    loop = loop._replace(
        bands={point: bands_of(site, loop, point) for point in points},
        limits={point: limits_of(site, loop, point) for point in points},
    )
    return site._replace(loops=(loop,))


def _with_volumes(loop: Loop) -> Loop:
    sources = dict(loop.sources)
    if loop.root_zone_water_l_per_m2 is None:
        litres, why = root_zone_water(loop)
        loop = loop._replace(root_zone_water_l_per_m2=round(litres, 2))
        sources["root_zone_water_l_per_m2"] = why
    if loop.layout == "drain-blend" and loop.drain_store_l is None:
        loop = loop._replace(drain_store_l=round(DRAIN_STORE_L_PER_M2 * loop.area_m2, 1))
        sources["drain_store_l"] = DRAIN_STORE_SOURCE
    return loop._replace(sources=sources)


def _with_routine(site: Site, loop: Loop) -> Loop:
    """Set points and crop water of the target and crop."""
    aims = target_of(site, loop)
    aim = aims["tank" if loop.layout == "shared-tank" else "feed"] if "feed" in aims else Composition()
    water = crop_preset(loop.crop).water
    sources = {**loop.sources, "feed_EC": aim.source, "crop_water_l_per_m2_d": water.source.shown}
    if loop.layout != "shared-tank":
        sources["drain_fraction"] = "the usual checkpoint of slabs, 30 % (common practice, no source)"
    return loop._replace(feed_ec=aim.ec, feed_ph=aim.ph, crop_water_l_per_m2_d=water.value, sources=sources)


def _own_points(loop: Loop) -> tuple[str, ...]:
    """Points that get bands and limits of their own; the others follow them."""
    if loop.layout != "shared-tank":
        return "feed", "root_zone"
    return ("feed", "tank") if loop.medium == "none" else ("feed", "tank", "root_zone")


def _stock_tanks(loop: Loop) -> tuple[StockTank, ...]:
    """Two tanks by content for a loop that doses from stock; their size follows the area (common practice)."""
    if loop.layout == "known-feed":
        return ()
    litres = 100.0 if loop.area_m2 < 500 else 1000.0 if loop.area_m2 <= 10_000 else 3000.0
    source = "unverified preset: two tanks of a size usual for the area; enter your own"
    return tuple(StockTank(name, litres, letter=letter, source=source) for name, letter in STOCK_TANKS)


def _water(name: str | None, report: Composition | None) -> Water:
    if report is not None:
        return Water((name or "make-up water").strip(), report)
    if name is not None and name.strip().lower() in PURE_WATER:
        return Water(name.strip(), Composition(dict.fromkeys(IONS, 0.0), ec=0.0, source="taken as water without ions"))
    return Water((name or "make-up water").strip(), Composition(source="not analysed yet"))


def _canonical_crop(name: str) -> str:
    try:
        return crop_preset(name).name
    except CatalogueError as trouble:
        raise SiteError(f"crop: {trouble}") from trouble


def _canonical_medium(name: str) -> str:
    try:
        return medium_preset(name).name
    except CatalogueError as trouble:
        raise SiteError(f"medium: {trouble}") from trouble


def _make(folder: Path) -> None:
    try:
        folder.mkdir(mode=0o770, parents=True, exist_ok=True)
    except OSError as trouble:
        raise SiteError(f"{folder} cannot be made a site folder: {trouble.strerror}.") from trouble
