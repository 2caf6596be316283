"""What holds for a loop: its own bands, limits and targets over the site's over the crop's presets."""

from __future__ import annotations

from collections.abc import Mapping

from fertui.catalogue.crops import bands_around, crop, crops
from fertui.catalogue.crops import targets as published_targets
from fertui.catalogue.figures import Provenance, Range, Recipe
from fertui.catalogue.media import medium
from fertui.site.checks import SiteError
from fertui.site.model import Composition, Loop, Site, Sourced

Ranges = Mapping[str, Mapping[str, Sourced]]

ROOT_ZONE_LIKE = ("tank", "root_zone", "drain")
"""Points whose presets are those of the root zone: its solution drains, and a shared tank is all of it."""


def target_of(site: Site, loop: Loop, name: str | None = None) -> dict[str, Composition]:
    """Point -> aim of a loop: the site's target of that name, a published one, or a crop's preset.

    ``name`` None: the loop's own ``target``, else its crop. A published solution is the aim at the feed and at the
    roots alike. Raises ``SiteError`` with the known names for an unknown one.
    """
    wanted = name or loop.target or loop.crop
    if wanted in site.targets:
        return dict(site.targets[wanted])
    if wanted in published_targets():
        aim = _composition(published_targets()[wanted])
        return dict.fromkeys(("feed", *_root_points(loop)), aim)
    if wanted in {each.name for each in crops()}:
        return _crop_target(wanted, loop)
    known = ", ".join((*site.targets, *published_targets(), *(each.name for each in crops())))
    raise SiteError(f"no target {wanted[:60]!r}; known: {known}.")


def bands_of(site: Site, loop: Loop, point: str) -> dict[str, Sourced]:
    """What -> allowed range at a point: "K share" [%], "EC" [mS/cm], "pH" or an ion [mmol/L], each with its source.

    The loop's band goes before the site's, the site's before the crop's preset. Where the loop follows another target
    than its crop's, the presets of shares and EC lie around that target.
    """
    return _laid_over(_preset_bands(site, loop, point), site.bands, loop.bands, _standing_for(loop, point))


def limits_of(site: Site, loop: Loop, point: str) -> dict[str, Sourced]:
    """What -> limit at a point: an ion [mmol/L], micronutrient [umol/L] or EC, each with its source.

    A shared tank is what feeds the crop: its preset for NH4 is the feed's, all others are those of the root zone.
    """
    presets = crop(loop.crop).limits
    found = {**presets.get(_preset_point(point), {})}
    if _standing_for(loop, point)[0] == "tank":
        found["NH4"] = presets["feed"]["NH4"]
    preset = {what: _sourced(each) for what, each in found.items()}
    return _laid_over(preset, site.limits, loop.limits, _standing_for(loop, point))


def root_zone_water(loop: Loop) -> tuple[float, str]:
    """Solution in the root zone [L/m2] and where that number comes from.

    As given; else medium volume (given, or usual) times the water the medium holds; 0 without a medium.
    """
    if loop.root_zone_water_l_per_m2 is not None:
        return loop.root_zone_water_l_per_m2, loop.sources.get("root_zone_water_l_per_m2", "site.toml")
    held = medium(loop.medium).water_fraction
    given = loop.medium_volume_l_per_m2
    volume = medium(loop.medium).volume_l_per_m2.mean if given is None else given
    if not volume:
        return 0.0, held.source.shown
    which = "of the usual" if given is None else "of"
    return volume * held.mean, f"{100 * held.mean:.0f} % {which} {volume:g} L of medium per m2; {held.source.shown}"


def _crop_target(name: str, loop: Loop) -> dict[str, Composition]:
    preset = crop(name)
    closed = loop.layout == "shared-tank"
    stage = loop.stage if loop.stage in preset.stages else ""
    aim = _composition(preset.root_zone)
    return {"feed": _composition(preset.feed_at(stage, closed)), **dict.fromkeys(_root_points(loop), aim)}


def _root_points(loop: Loop) -> tuple[str, ...]:
    return ("tank", "root_zone") if loop.layout == "shared-tank" else ("root_zone", "drain")


def _preset_bands(site: Site, loop: Loop, point: str) -> dict[str, Sourced]:
    ranges: Mapping[str, Range] = crop(loop.crop).bands.get(_preset_point(point), {})
    followed = loop.target or loop.crop
    if followed != loop.crop and ranges:
        aim = target_of(site, loop).get(point)
        if aim is not None:
            own = Recipe(Provenance(aim.source, "common practice"), aim.ions, ec=aim.ec)
            ranges = {**ranges, **bands_around(own, _preset_point(point))}
    return {what: _sourced(each) for what, each in ranges.items()}


def _standing_for(loop: Loop, point: str) -> tuple[str, ...]:
    """The point whose own ranges hold unless this one has its own, then the point itself."""
    if loop.layout == "shared-tank" and loop.medium == "none" and point == "root_zone":
        return "tank", point
    return ("root_zone", point) if point == "drain" else (point,)


def _laid_over(preset: dict[str, Sourced], site: Ranges, loop: Ranges, points: tuple[str, ...]) -> dict[str, Sourced]:
    found = dict(preset)
    for point in points:
        found |= {**site.get(point, {}), **loop.get(point, {})}
    return found


def _preset_point(point: str) -> str:
    return "root_zone" if point in ROOT_ZONE_LIKE else point


def _composition(recipe: Recipe) -> Composition:
    return Composition(recipe.ions, recipe.micronutrients, recipe.ec, recipe.ph, recipe.shown_source)


def _sourced(found: Range) -> Sourced:
    return Sourced(found.low, found.high, found.source.shown)
