"""What a kilogram off the grower's shelf brings: formula, or the label's own analysis, or an acid's strength."""

from __future__ import annotations

import math
from collections.abc import Mapping
from functools import cache
from typing import Protocol

from fertui.catalogue.acids import Acid, acid, acids
from fertui.catalogue.figures import CatalogueError, nearest
from fertui.catalogue.salts import Salt, question, salt, salts, spelling
from fertui.chemistry.formula import molar_mass

NEUTRAL_WITHIN_PCT = 5.0
"""Largest 100 (cations - anions)/(cations + anions) [%] a label may show. Labels round to whole percents and guarantee
minima: 13 % N and 38 % K of potassium nitrate are 2.4 % off (common practice, no source for the limit)."""

LABEL_SPECIES = {
    "K": ("K", "K", 1), "K2O": ("K", "K2O", 2), "Ca": ("Ca", "Ca", 1), "CaO": ("Ca", "CaO", 1),
    "Mg": ("Mg", "Mg", 1), "MgO": ("Mg", "MgO", 1), "Na": ("Na", "Na", 1), "Na2O": ("Na", "Na2O", 2),
    "NH4-N": ("NH4", "N", 1), "NO3-N": ("NO3", "N", 1), "NH4": ("NH4", "NH4", 1), "NO3": ("NO3", "NO3", 1),
    "P": ("H2PO4", "P", 1), "P2O5": ("H2PO4", "P2O5", 2), "S": ("SO4", "S", 1), "SO3": ("SO4", "SO3", 1),
    "SO4": ("SO4", "SO4", 1), "Cl": ("Cl", "Cl", 1), "Fe": ("Fe", "Fe", 1), "Mn": ("Mn", "Mn", 1),
    "Zn": ("Zn", "Zn", 1), "B": ("B", "B", 1), "Cu": ("Cu", "Cu", 1), "Mo": ("Mo", "Mo", 1), "Si": ("Si", "Si", 1),
    "SiO2": ("Si", "SiO2", 1),
}  # fmt: skip
"""Species of a label -> (ion, the formula whose mass the percentage counts, ions in one of it)."""


class Shelved(Protocol):
    """A supply as the site describes it."""

    @property
    def name(self) -> str: ...
    @property
    def kind(self) -> str: ...
    @property
    def strength_pct(self) -> float | None: ...
    @property
    def label_pct(self) -> Mapping[str, float]: ...


def substance(kind: str) -> Salt | Acid:
    """The acid of that name where it is an acid, else the salt (solid alkalis are both; the salt is given).

    Raises ``CatalogueError`` for an unknown or ambiguous name.

    >>> substance("nitric acid").formula
    'HNO3'
    """
    known = _known()
    if spelling(kind) not in known and question(kind) is None:
        near = nearest(spelling(kind), known)
        which = f"nearest: {', '.join(near)}" if near else f"it has {', '.join(substances())}"
        raise CatalogueError(f"{kind[:60]!r} is no salt or acid of the catalogue; {which}.")
    return acid(kind) if is_acid(kind) else salt(kind)


def of_supply(supply: Shelved) -> Salt | Acid:
    """What a supply is: with a strength an acid or liquid alkali, without one a salt.

    Raises ``CatalogueError`` for an unknown kind, or an acid without the strength of its label.
    """
    if supply.strength_pct is not None:
        found = acid(supply.kind)
        found.check_strength(supply.strength_pct)
        return found
    if is_acid(supply.kind):
        raise CatalogueError(
            f"{supply.name}: an acid needs strength_pct, the mass % on its label; without it no dose is safe."
        )
    return salt(supply.kind)


def contents(supply: Shelved) -> dict[str, float]:
    """mmol of each ion and micronutrient that 1 kg of a supply brings (HCO3: alkalinity [meq/kg], negative in an acid).

    An acid or liquid alkali counts by its strength. A label analysis [% of the product] goes before the formula; ions
    it leaves out follow from the formula in the measure that closes the charges.
    Raises ``CatalogueError``: unknown kind or species, impossible percentage, a label that is not neutral within
    ``NEUTRAL_WITHIN_PCT``, or a product that only its label describes and has none.

    >>> from types import SimpleNamespace
    >>> bag = SimpleNamespace(name="MKP", kind="KH2PO4", strength_pct=None, label_pct={"P2O5": 52, "K2O": 34})
    >>> {ion: round(mmol) for ion, mmol in contents(bag).items()}
    {'H2PO4': 7327, 'K': 7219}
    """
    found = of_supply(supply)
    if isinstance(found, Acid):
        assert supply.strength_pct is not None
        return found.mmol_per_kg(supply.strength_pct)
    label = supply.label_pct or found.label_pct
    if label:
        return _completed(supply.name, found, _labelled(supply.name, found, label))
    if found.needs_label:
        raise CatalogueError(f"{supply.name}: {found.name} is known by its label only; give label_pct, e.g. K2O = 12.")
    return found.mmol_per_kg


def substances() -> tuple[str, ...]:
    """Names of all salts and acids, each once."""
    return tuple(dict.fromkeys(_known().values()))


@cache
def _known() -> Mapping[str, str]:
    """Spelling -> name of every salt and acid."""
    entries: list[Salt | Acid] = [*salts(), *acids()]
    return {
        spelling(each): entry.name for entry in entries for each in (entry.name, entry.formula, *entry.aliases) if each
    }


def is_acid(kind: str) -> bool:
    """Whether that is the name of an acid."""
    names = (each for entry in acids() if entry.is_acid for each in (entry.name, entry.formula, *entry.aliases))
    return spelling(kind) in map(spelling, names)


def _labelled(name: str, found: Salt, label: Mapping[str, float]) -> dict[str, float]:
    """mmol/kg of what the label says, one ion named once."""
    amounts: dict[str, float] = {}
    for species, pct in label.items():
        ion, counted, number = _species(name, found, species)
        if not math.isfinite(pct) or not 0.0 <= pct <= 100.0:
            raise CatalogueError(
                f"{name}: label {species} = {pct:g} % is not possible; give 0 to 100 % of the product."
            )
        if ion in amounts:
            raise CatalogueError(f"{name}: the label names {ion} twice (last as {species}); keep one of them.")
        amounts[ion] = 1e4 * pct * number / molar_mass(counted)
    if sum(pct for species, pct in label.items()) > 100.0:
        raise CatalogueError(f"{name}: the label adds up to more than 100 % of the product.")
    return amounts


def _species(name: str, found: Salt, species: str) -> tuple[str, str, int]:
    if species == "N":
        forms = [ion for ion in ("NO3", "NH4") if ion in found.gives]
        if len(forms) == 1:
            return forms[0], "N", 1
        raise CatalogueError(f"{name}: label N alone does not say how much is nitrate; give NO3-N and NH4-N.")
    if species not in LABEL_SPECIES:
        raise CatalogueError(f"{name}: label {species[:30]!r} is not known; allowed: {', '.join(LABEL_SPECIES)}.")
    return LABEL_SPECIES[species]


def _completed(name: str, found: Salt, amounts: dict[str, float]) -> dict[str, float]:
    """The labelled amounts, with what the label leaves out of the formula filled up until the charges close."""
    charge = sum(found.charge_of(ion) * mmol for ion, mmol in amounts.items())
    total = sum(abs(found.charge_of(ion)) * mmol for ion, mmol in amounts.items())
    missing = {ion: count for ion, count in found.gives.items() if ion not in amounts}
    filled = _filled(found, amounts, missing, charge)
    if filled is not None:
        return filled
    if total and abs(100.0 * charge / total) > NEUTRAL_WITHIN_PCT:
        raise CatalogueError(
            f"{name}: the label does not balance: {(total + charge) / 2:.0f} meq of cations against "
            f"{(total - charge) / 2:.0f} meq of anions per kg ({100.0 * charge / total:+.0f} %, allowed "
            f"{NEUTRAL_WITHIN_PCT:g} %); look whether N is nitrate or ammonium, and oxides or elements."
        )
    return amounts


def _filled(
    found: Salt, amounts: dict[str, float], missing: Mapping[str, int], charge: float
) -> dict[str, float] | None:
    """Amounts with the missing ions added in formula proportion so that charges close; None where they cannot."""
    closing = sum(found.charge_of(ion) * count for ion, count in missing.items())
    if closing == 0 or -charge / closing <= 0.0:
        return None
    units = -charge / closing
    return {**amounts, **{ion: units * count for ion, count in missing.items()}}
