"""Growing media by name: what they exchange, how much water they hold, what a new one is loaded with."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cache
from typing import TYPE_CHECKING, Any, NamedTuple

from fertui.catalogue.figures import CatalogueError, Provenance, nearest, table
from fertui.chemistry.names import CATIONS

if TYPE_CHECKING:
    from fertui.chemistry.ions import Array


class Figure(NamedTuple):
    """A number with its spread (standard deviation between lots) and its source."""

    mean: float
    sd: float
    source: Provenance


class Medium(NamedTuple):
    """One growing medium.

    ``capacity_meq_per_l`` of medium at working pH; ``log10_selectivity`` by cation in ``convention``;
    ``volume_l_per_m2`` of medium and ``water_fraction`` of it are defaults for a site that does not say;
    ``initial_load``: equivalent fractions of a new one, empty where the first feed is taken to load it.
    """

    name: str
    about: str
    aliases: tuple[str, ...]
    capacity_meq_per_l: Figure
    log10_selectivity: Mapping[str, Figure]
    convention: str
    volume_l_per_m2: Figure
    water_fraction: Figure
    initial_load: Mapping[str, float]
    load_source: Provenance
    warning: str = ""

    @property
    def exchanges(self) -> bool:
        """Whether exchange is worth computing."""
        return self.capacity_meq_per_l.mean > 0.0

    def selectivity(self) -> tuple[Array, Array]:
        """log10 k and its standard deviation, both (5,) in the order K, Ca, Mg, Na, NH4.

        >>> mean, sd = medium("coir").selectivity()
        >>> (10**mean).round(4)
        array([0.0355, 1.    , 0.631 , 0.0126, 0.0316])
        """
        import numpy as np

        figures = [self.log10_selectivity[ion] for ion in CATIONS]
        return np.array([each.mean for each in figures]), np.array([each.sd for each in figures])

    def load(self) -> Array | None:
        """Equivalent fractions (5,) on a new medium, None where the first feed is taken to load it.

        >>> medium("coir-new").load()
        array([0.6 , 0.1 , 0.05, 0.25, 0.  ])
        """
        import numpy as np

        if not self.initial_load:
            return None
        return np.array([self.initial_load.get(ion, 0.0) for ion in CATIONS])


def media() -> tuple[Medium, ...]:
    """All media of the catalogue.

    >>> [each.name for each in media()][:4]
    ['none', 'stone-wool', 'perlite', 'pumice']
    """
    return _media()


def medium(name: str) -> Medium:
    """The medium of that name or alias.

    Raises ``CatalogueError`` with the nearest known name.

    >>> medium("rockwool").name
    'stone-wool'
    """
    known = {each_name: each for each in _media() for each_name in (each.name, *each.aliases)}
    wanted = name.strip().casefold().replace("_", "-")
    for spelling in (wanted, wanted.replace("-", " "), wanted.replace(" ", "-")):
        if spelling in known:
            return known[spelling]
    near = nearest(wanted, {spelling: each.name for spelling, each in known.items()})
    meant = f"; nearest: {', '.join(near)}." if near else "."
    raise CatalogueError(f"{name[:60]!r} is not a medium{meant} Media: {', '.join(each.name for each in _media())}.")


@cache
def _media() -> tuple[Medium, ...]:
    read = table("media")
    sources = {key: Provenance(row["text"], row["status"]) for key, row in read["sources"].items()}

    def figure(row: Mapping[str, Any]) -> Figure:
        return Figure(float(row["mean"]), float(row["sd"]), sources[row["source"]])

    shared = {name: {ion: figure(row) for ion, row in rows.items()} for name, rows in read["selectivity"].items()}
    return tuple(
        Medium(
            name=row["name"],
            about=row["about"],
            aliases=tuple(row.get("aliases", ())),
            capacity_meq_per_l=figure(row["capacity_meq_per_l"]),
            log10_selectivity=shared[row["selectivity"]],
            convention=read["convention"],
            volume_l_per_m2=figure(row["volume_l_per_m2"]),
            water_fraction=figure(row["water_fraction"]),
            initial_load=dict(row.get("initial_load", {})),
            load_source=sources[row.get("load_source", "no-load")],
            warning=row.get("warning", ""),
        )
        for row in read["media"]
    )
