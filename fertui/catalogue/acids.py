"""Acids and liquid alkalis by name: density and content at the strength on the label."""

from __future__ import annotations

import math
from collections.abc import Mapping
from functools import cache
from typing import Any, NamedTuple

from fertui.catalogue.figures import STATUSES, CatalogueError, Provenance, interpolated, nearest, table
from fertui.chemistry.formula import molar_mass


class Acid(NamedTuple):
    """An acid or a liquid alkali.

    ``gives``: mol of each ion per mol (HCO3: alkalinity, negative for an acid). ``protons``: equivalents of alkalinity
    consumed per mol, negative for an alkali. ``densities``: (strength [mass %], density at 20 C [kg/m3]), rising.
    """

    name: str
    formula: str
    gives: Mapping[str, float]
    protons: float
    densities: tuple[tuple[float, float], ...]
    aliases: tuple[str, ...] = ()
    cautions: tuple[str, ...] = ()
    note: str = ""
    sources: Mapping[float, Provenance] = {}

    @property
    def molar_mass(self) -> float:
        """Molar mass [g/mol]."""
        return molar_mass(self.formula)

    @property
    def is_acid(self) -> bool:
        """Whether it consumes alkalinity."""
        return self.protons > 0

    @property
    def strongest_pct(self) -> float:
        """Highest strength [mass %] the density table reaches."""
        return self.densities[-1][0]

    def density(self, strength_pct: float) -> float:
        """Density at 20 C [kg/L] of that strength [mass %], linear between the tabulated strengths.

        Raises ``CatalogueError`` for a strength that is not above 0 and within the table.

        >>> round(acid("nitric").density(60), 3)
        1.367
        """
        self.check_strength(strength_pct)
        return interpolated(self.densities, strength_pct) / 1000.0

    def mol_per_l(self, strength_pct: float, density_kg_per_l: float | None = None) -> float:
        """Concentration [mol/L at 20 C] of that strength [mass %]; the label's density goes before the table's.

        >>> round(acid("HNO3").mol_per_l(60), 2)
        13.02
        """
        density = self.density(strength_pct) if density_kg_per_l is None else density_kg_per_l
        return strength_pct / 100.0 * density * 1000.0 / self.molar_mass

    def mmol_per_kg(self, strength_pct: float) -> dict[str, float]:
        """mmol of each ion per kg of product (HCO3: alkalinity [meq/kg], negative in an acid); strength [mass %]."""
        self.check_strength(strength_pct)
        moles = 1e4 * strength_pct / self.molar_mass
        return {ion: moles * count for ion, count in self.gives.items()}

    def source(self, strength_pct: float) -> Provenance:
        """Where the density at that strength comes from: the less certain of the two tabulated neighbours."""
        self.check_strength(strength_pct)
        below = max(strength for strength in self.sources if strength <= strength_pct)
        above = min(strength for strength in self.sources if strength >= strength_pct)
        return max(self.sources[below], self.sources[above], key=lambda each: STATUSES.index(each.status))

    def check_strength(self, strength_pct: float) -> None:
        """Refuse a strength [mass %] that is no number, not above 0, or beyond the density table."""
        if not math.isfinite(strength_pct) or not 0.0 < strength_pct <= self.strongest_pct:
            raise CatalogueError(
                f"{self.name}: strength {strength_pct:g} % is not possible here; give the mass % on the label, "
                f"above 0 and up to {self.strongest_pct:g} %."
            )


@cache
def acids() -> tuple[Acid, ...]:
    """Every acid and liquid alkali of the catalogue, in the order of ``acids.toml``."""
    data = table("acids")
    sources = {name: Provenance(**entry) for name, entry in data["sources"].items()}
    return tuple(_acid(entry, sources) for entry in data["acids"])


@cache
def _by_name() -> dict[str, Acid]:
    return {_key(each): entry for entry in acids() for each in (entry.name, entry.formula, *entry.aliases)}


def acid(name: str) -> Acid:
    """The acid or liquid alkali of that name, formula or alias.

    Raises ``CatalogueError`` with the nearest names for one that is not in the catalogue.

    >>> acid("sulphuric acid").formula
    'H2SO4'
    """
    by_name = _by_name()
    if _key(name) not in by_name:
        near = nearest(_key(name), {key: entry.name for key, entry in by_name.items()})
        which = f"nearest: {', '.join(near)}" if near else f"it has {', '.join(entry.name for entry in acids())}"
        raise CatalogueError(f"{name[:60]!r} is not an acid or lye of the catalogue; {which}.")
    return by_name[_key(name)]


def _key(name: str) -> str:
    return "".join(name.lower().split())


def with_strength(name: str, strength_pct: float) -> str:
    """A product on the shelf with its strength [mass %], said once however it is called.

    >>> [with_strength(name, 38.0) for name in ("nitric acid", "nitric acid 38", "nitric acid 38 %")]
    ['nitric acid 38 %', 'nitric acid 38 %', 'nitric acid 38 %']
    """
    strength = f"{strength_pct:g}"
    return f"{name.removesuffix('%').rstrip().removesuffix(f' {strength}')} {strength} %"


def _acid(entry: Mapping[str, Any], sources: Mapping[str, Provenance]) -> Acid:
    densities = tuple((float(strength), float(density)) for strength, density in entry["density"].items())
    remembered = entry.get("remembered", {"strengths": [], "source": entry["density_source"]})
    return Acid(
        name=entry["name"],
        formula=entry["formula"],
        gives=entry["gives"],
        protons=entry["protons"],
        densities=densities,
        aliases=tuple(entry["aliases"]),
        cautions=tuple(entry["cautions"]),
        note=entry.get("note", ""),
        sources={
            strength: sources[remembered["source"] if strength in remembered["strengths"] else entry["density_source"]]
            for strength, _ in densities
        },
    )
