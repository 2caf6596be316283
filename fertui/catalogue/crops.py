"""Crop presets: feeds, root-zone targets, uptake, bands and limits, each with its source."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cache
from typing import Any, NamedTuple

from fertui.catalogue.figures import CatalogueError, Figure, Provenance, Range, Recipe, nearest, table
from fertui.chemistry.names import CATIONS, CHARGES

Ranges = Mapping[str, Mapping[str, Range]]
"""Point -> what ("K share", "EC", "pH" or an ion) -> range."""

SHARED = ("K", "Ca", "Mg")
"""The ions whose share of K + Ca + Mg, in equivalents, is managed."""


class Crop(NamedTuple):
    """A crop preset. ``uptake`` [mmol per L of water] holds at the ``reference`` composition [mmol/L].

    ``feed``: at the dripper, drain not re-used; ``closed_feed``: top-up of a closed loop; ``stages``: changes of the
    feed [mmol/L] by stage; ``water``: season mean crop water [L/m2/d].
    """

    name: str
    aliases: tuple[str, ...]
    feed: Recipe
    closed_feed: Recipe
    root_zone: Recipe
    uptake: Recipe
    reference: Recipe
    water: Figure
    stages: Mapping[str, Mapping[str, float]]
    stages_source: Provenance
    bands: Ranges
    limits: Ranges

    def feed_at(self, stage: str = "", closed: bool = False) -> Recipe:
        """Feed of a stage ("" is the standard one); nitrate closes the charge of a change published without its anion.

        Raises ``CatalogueError`` with the stages of this crop for one it does not have.

        >>> crop("tomato").feed_at("fruit-set").ions["K"]
        11.0
        """
        return _changed(self.closed_feed if closed else self.feed, self._change(stage))

    def uptake_at(self, stage: str = "") -> Recipe:
        """Uptake concentrations of a stage: the feed's change in the measure of uptake to open feed (our inference)."""
        change = self._change(stage)
        part = _cations(self.uptake.ions) / _cations(self.feed.ions)
        changed = _changed(self.uptake, {ion: part * amount for ion, amount in change.items()})
        return changed._replace(unverified=tuple({*self.uptake.unverified, *change}))

    def _change(self, stage: str) -> Mapping[str, float]:
        if stage and stage not in self.stages:
            raise CatalogueError(f"{self.name} has no stage {stage[:60]!r}; known: {', '.join(self.stages)}.")
        return self.stages[stage] if stage else {}


@cache
def crops() -> tuple[Crop, ...]:
    """Every crop of the catalogue, in the order of ``crops.toml``."""
    data = table("crops")
    sources = _sources(data)
    return tuple(_crop(name, entry, data["every"], sources) for name, entry in data["crops"].items())


def crop(name: str) -> Crop:
    """The crop of that name or alias; raises ``CatalogueError`` with the nearest known names.

    >>> crop("Paprika").name
    'sweet-pepper'
    """
    by_name = {_key(each): entry for entry in crops() for each in (entry.name, *entry.aliases)}
    if _key(name) not in by_name:
        near = nearest(_key(name), {key: entry.name for key, entry in by_name.items()})
        hint = f"nearest: {', '.join(near)}; " if near else ""
        known = ", ".join(entry.name for entry in crops())
        raise CatalogueError(f"no crop {name[:60]!r}; {hint}known: {known} ('other' for one that is not listed).")
    return by_name[_key(name)]


@cache
def targets() -> Mapping[str, Recipe]:
    """Published solutions that belong to no crop, by name.

    >>> sorted(targets())
    ['hoagland-1', 'hoagland-2', 'steiner']
    """
    data = table("crops")
    sources = _sources(data)
    return {name: _recipe(entry, sources) for name, entry in data["targets"].items()}


def shares(ions: Mapping[str, float]) -> dict[str, float]:
    """Share [%] of K, Ca and Mg in their sum, in equivalents; empty where there is none of them.

    >>> {ion: round(share) for ion, share in shares({"K": 6, "Ca": 5, "Mg": 2}).items()}
    {'K': 30, 'Ca': 50, 'Mg': 20}
    """
    total = sum(CHARGES[ion] * ions.get(ion, 0.0) for ion in SHARED)
    return {ion: 100.0 * CHARGES[ion] * ions.get(ion, 0.0) / total for ion in SHARED} if total > 0 else {}


def bands_around(aim: Recipe, point: str) -> dict[str, Range]:
    """Bands of the shares and of EC around an aim at a point; the widths are those of ``crops.toml``."""
    data = table("crops")
    return _around(aim, point, data["every"]["share_width"], _sources(data))


def _around(
    aim: Recipe, point: str, widths: Mapping[str, float], sources: Mapping[str, Provenance]
) -> dict[str, Range]:
    source = sources["share-width"]
    found = {
        f"{ion} share": Range(round(max(share - widths[ion], 0.0), 1), round(share + widths[ion], 1), source)
        for ion, share in shares(aim.ions).items()
    }
    if aim.ec is not None:
        feed = point == "feed"
        spread = 0.3 if feed else 0.25 * aim.ec
        source = sources["ec-light" if feed else "ec-width"]
        found["EC"] = Range(round(aim.ec - spread, 2), round(aim.ec + spread, 2), source)
    return found


def _crop(name: str, entry: Mapping[str, Any], every: Mapping[str, Any], sources: Mapping[str, Provenance]) -> Crop:
    recipes = ("feed", "closed_feed", "root_zone", "uptake", "reference")
    read = {key: _recipe(entry[key], sources) for key in recipes}
    own_bands, own_limits = entry.get("bands", {}), entry.get("limits", {})
    bands = {
        point: {
            **_around(read[point], point, every["share_width"], sources),
            **_ranges({**every["bands"].get(point, {}), **own_bands.get(point, {})}, sources),
        }
        for point in ("feed", "root_zone")
    }
    limits = {
        point: _ranges({**every["limits"].get(point, {}), **own_limits.get(point, {})}, sources)
        for point in ("feed", "root_zone")
    }
    water = Figure(entry["water"]["l_per_m2_d"], sources[entry["water"]["source"]])
    return Crop(
        name=name,
        aliases=tuple(entry["aliases"]),
        **read,
        water=water,
        stages=entry["stages"],
        stages_source=sources[entry["stages_source"]],
        bands=bands,
        limits=limits,
    )


def _recipe(entry: Mapping[str, Any], sources: Mapping[str, Provenance]) -> Recipe:
    given = {key: entry[key] for key in ("ions", "micronutrients", "ec", "ph") if key in entry}
    return Recipe(source=sources[entry["source"]], unverified=tuple(entry.get("unverified", ())), **given)


def _ranges(entries: Mapping[str, Any], sources: Mapping[str, Provenance]) -> dict[str, Range]:
    return {what: Range(each.get("low"), each.get("high"), sources[each["source"]]) for what, each in entries.items()}


def _changed(recipe: Recipe, change: Mapping[str, float]) -> Recipe:
    """A recipe with ions changed, none below zero, and nitrate taking up what charge the change leaves open."""
    ions = dict(recipe.ions)
    for ion, amount in change.items():
        ions[ion] = max(ions.get(ion, 0.0) + amount, 0.0)
    opened = sum(CHARGES[ion] * (ions[ion] - recipe.ions.get(ion, 0.0)) for ion in ions)
    if change:
        ions["NO3"] = max(ions["NO3"] + opened, 0.0)
    return recipe._replace(ions=ions)


def _cations(ions: Mapping[str, float]) -> float:
    return sum(CHARGES[ion] * ions.get(ion, 0.0) for ion in CATIONS)


def _sources(data: Mapping[str, Any]) -> dict[str, Provenance]:
    return {name: Provenance(**entry) for name, entry in data["sources"].items()}


def _key(name: str) -> str:
    return name.strip().lower().replace(" ", "-").replace("_", "-")
