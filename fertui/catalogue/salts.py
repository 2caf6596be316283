"""Salts by name, formula or alias: what a kilogram gives, how much dissolves, which cautions go with it."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cache
from typing import Any, NamedTuple

from fertui.catalogue.figures import CatalogueError, Provenance, interpolated, nearest, table
from fertui.chemistry.formula import molar_mass
from fertui.chemistry.names import CHARGES

MICRONUTRIENT_CHARGE = {"Fe": 3, "Mn": 2, "Zn": 2, "B": 0, "Cu": 2, "Mo": -2, "Si": 0}
"""Charge of each micronutrient in solution where it is not chelated: boric and silicic acid, molybdate."""


class Salt(NamedTuple):
    """One salt of the catalogue.

    ``gives``: mol of each ion per mol of formula (HCO3: alkalinity). ``use``: nutrient, micronutrient, alkali or
    disinfectant. ``label_pct``: usual analysis [%] of a product without a fixed formula; ``needs_label``: no usual one.
    ``stable_ph``: range in which a chelate keeps its metal.
    ``dissolves``: (temperature [C], g of this form per kg of added water) in rising temperature, () where unknown.
    """

    name: str
    formula: str
    gives: Mapping[str, int]
    use: str = "nutrient"
    aliases: tuple[str, ...] = ()
    complex_charge: int | None = None
    label_pct: Mapping[str, float] = {}
    needs_label: bool = False
    dissolves: tuple[tuple[float, float], ...] = ()
    stable_ph: tuple[float, float] | None = None
    cautions: tuple[str, ...] = ()
    note: str = ""
    sources: Mapping[str, Provenance] = {}

    @property
    def molar_mass(self) -> float:
        """Molar mass [g/mol] of the trade form, water of crystallisation included."""
        return molar_mass(self.formula)

    @property
    def mmol_per_kg(self) -> dict[str, float]:
        """mmol of each ion and micronutrient per kg of the pure formula (HCO3: alkalinity [meq/kg]).

        >>> round(salt("KNO3").mmol_per_kg["K"])
        9891
        """
        if not self.formula:
            return {}
        return {ion: 1e6 * moles / self.molar_mass for ion, moles in self.gives.items()}

    def charge_of(self, ion: str) -> int:
        """Charge of an ion or micronutrient as this salt brings it into solution."""
        if ion in CHARGES:
            return CHARGES[ion]
        return MICRONUTRIENT_CHARGE[ion] if self.complex_charge is None else self.complex_charge

    def solubility(self, temperature_c: float) -> float | None:
        """Grams of this salt that dissolve in 1 kg of added water, alone; None where no figure is known.

        Linear between the tabulated temperatures and flat beyond them (0-30 C). Salts mixed in one tank dissolve less.

        >>> round(salt("K2SO4").solubility(10))
        92
        """
        return interpolated(self.dissolves, temperature_c) if self.dissolves else None


@cache
def salts() -> tuple[Salt, ...]:
    """Every salt of the catalogue, in the order of ``salts.toml``."""
    data = table("salts")
    sources = {name: Provenance(**entry) for name, entry in data["sources"].items()}
    return tuple(_salt(entry, sources) for entry in data["salts"])


def salt(name: str) -> Salt:
    """The salt of that name, formula or alias; case, spaces and the sign before the water do not matter.

    Raises ``CatalogueError``: ambiguous name (says what to ask the bag), or unknown (says the nearest names).

    >>> salt("MKP").formula
    'KH2PO4'
    """
    return _found(name, salts())


def question(name: str) -> tuple[str, tuple[str, ...]] | None:
    """Why that name alone does not say which salt it is, and the salts it may be; None for a name that does."""
    for entry in table("salts")["ambiguous"]:
        if spelling(name) in {spelling(each) for each in entry["names"]}:
            return entry["why"], tuple(entry["options"])
    return None


def _found(name: str, among: tuple[Salt, ...]) -> Salt:
    by_name = {spelling(each): entry for entry in among for each in (entry.name, entry.formula, *entry.aliases) if each}
    found = by_name.get(spelling(name))
    if found is not None and spelling(name) == spelling(found.name):
        return found
    asked = question(name)
    if asked is not None:
        raise CatalogueError(f"{name!r}: which one? {' or '.join(repr(each) for each in asked[1])}; {asked[0]}.")
    if found is None:
        near = nearest(spelling(name), {key: entry.name for key, entry in by_name.items()})
        hint = f"; nearest: {', '.join(map(repr, near))}" if near else ""
        raise CatalogueError(f"{name[:60]!r} is not a salt of the catalogue{hint}.")
    return found


def spelling(name: str) -> str:
    """One spelling for the many a name or formula has: case, spaces, sulph, the sign before the water.

    >>> spelling("Sulphate of Potash") == spelling("sulfate of potash")
    True
    """
    return "".join(name.lower().replace("·", ".").replace("*", ".").replace("sulph", "sulf").split())


def _salt(entry: Mapping[str, Any], sources: Mapping[str, Provenance]) -> Salt:
    composition = sources[entry.get("label_source", "formula")]
    known = {"composition": composition}
    if "solubility_source" in entry:
        known["solubility"] = sources[entry["solubility_source"]]
    plain = ("name", "formula", "gives", "use", "complex_charge", "label_pct", "needs_label", "note")
    return Salt(
        **{key: entry[key] for key in plain if key in entry},
        aliases=tuple(entry["aliases"]),
        dissolves=_dissolves(entry),
        stable_ph=tuple(entry["stable_ph"]) if "stable_ph" in entry else None,
        cautions=tuple(entry["cautions"]),
        sources=known,
    )


def _dissolves(entry: Mapping[str, Any]) -> tuple[tuple[float, float], ...]:
    """Grams of the trade form per kg of added water: its crystal water joins the solvent."""
    if "solubility_g_per_kg_water" in entry:
        return tuple((float(t), float(grams)) for t, grams in entry["solubility_g_per_kg_water"].items())
    if "saturated_mass_pct" not in entry:
        return ()
    anhydrous_part = molar_mass(entry["anhydrous"]) / molar_mass(entry["formula"])
    saturated = ((float(t), pct / 100.0) for t, pct in entry["saturated_mass_pct"].items())
    return tuple((t, 1000.0 * part / (anhydrous_part - part)) for t, part in saturated if part < anhydrous_part)
