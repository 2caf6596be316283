"""Names as people write them: of ions and the forms they are reported in."""

from __future__ import annotations

import re
from functools import cache
from typing import NamedTuple

from fertui.chemistry.species import SPECIES, Species
from fertui.quantities import units
from fertui.quantities.numbers import tidy
from fertui.quantities.refusal import QuantityError, quoted

ALIASES: dict[str, str] = {
    "potassium": "K", "calcium": "Ca", "magnesium": "Mg", "sodium": "Na", "chloride": "Cl", "iron": "Fe",
    "manganese": "Mn", "zinc": "Zn", "boron": "B", "copper": "Cu", "molybdenum": "Mo", "silicon": "Si",
    "silica": "SiO2", "N-NO3": "NO3-N", "N-NH4": "NH4-N", "NH3-N": "NH4-N", "NO3 as N": "NO3-N", "NH4 as N": "NH4-N",
    "nitrate-N": "NO3-N", "nitrate nitrogen": "NO3-N", "ammonium-N": "NH4-N", "ammonium nitrogen": "NH4-N",
    "SO4-S": "S", "S-SO4": "S", "SO4 as S": "S", "PO4-P": "P", "P-PO4": "P", "PO4 as P": "P", "phosphorus": "P",
    "sulfur": "S", "sulphur": "S", "bicarbonate": "HCO3", "carbonate": "CO3", "CaO as Ca": "CaO",
    "Ca CaCO3": "Ca as CaCO3", "Mg CaCO3": "Mg as CaCO3", "calcium as CaCO3": "Ca as CaCO3",
    "alkalinity as CaCO3": "CaCO3", "alkalinity CaCO3": "CaCO3", "alk as CaCO3": "CaCO3",
    "total alkalinity as CaCO3": "CaCO3", "alkalinity as HCO3": "HCO3", "HCO3 as CaCO3": "CaCO3",
    "bicarbonate as CaCO3": "CaCO3",
}  # fmt: skip
"""Other names of a form."""

WITHOUT_MASS: dict[str, str] = {
    "nitrate": "NO3", "ammonium": "NH4", "ammonia": "NH4", "sulfate": "SO4", "sulphate": "SO4", "phosphate": "H2PO4",
    "alkalinity": "HCO3", "total alkalinity": "HCO3", "alk": "HCO3", "acid capacity": "HCO3", "KS4.3": "HCO3",
    "acid capacity 4.3": "HCO3", "acid capacity to pH 4.3": "HCO3", "acid capacity to 4.3": "HCO3", "m-value": "HCO3",
    "carbonate hardness": "HCO3", "KH": "HCO3",
}  # fmt: skip
"""Names that say which ion is meant but not what its mg are the mg of: taken in mmol/L, meq/L and degrees only."""

_REFUSED = {
    "n": ("N does not say nitrate or ammonium", "NO3-N, NH4-N", "write which of the two was measured"),
    "totaln": ("total N does not say nitrate or ammonium", "NO3-N, NH4-N", "enter both as the laboratory split them"),
    "hardness": ("hardness is calcium and magnesium together", "Ca, Mg", "enter Ca and Mg apart"),
    "totalhardness": ("hardness is calcium and magnesium together", "Ca, Mg", "enter Ca and Mg apart"),
    "tds": ("TDS is made from EC by a factor that differs between meters", "EC", "enter the EC in mS/cm"),
}


_CHARGED = re.compile(r"(.*?)\s*\^?(\d?)[+-]+\d?")


class Named(NamedTuple):
    """A form as named; ``has_mass`` False: the name does not say what its mg are the mg of."""

    species: Species
    has_mass: bool


def named(text: str) -> Named | None:
    """The form of an ion that a text names, or None; charges, sub- and superscripts do not matter.

    Raises ``QuantityError`` for a name that stands for more than one ion.

    >>> named("SO4 2-").species.name, named("N-NO3").species.name
    ('SO4', 'NO3-N')
    """
    folded = fold(text)
    if folded in _REFUSED:
        raise QuantityError(*_REFUSED[folded])
    candidates = [folded]
    charged = _CHARGED.fullmatch(tidy(text))
    if charged:
        candidates += [fold(charged[1] + charged[2]), fold(charged[1])]
    return next((_known()[candidate] for candidate in candidates if candidate in _known()), None)


def form(text: str) -> Named:
    """The form of an ion that a text names.

    Raises ``QuantityError`` for an unknown name, with the nearest known.

    >>> form("P2O5").species.ion
    'H2PO4'
    """
    found = named(text)
    if found is not None:
        return found
    import difflib

    near = difflib.get_close_matches(text.casefold(), [name.casefold() for name in SPECIES], n=1)
    meant = next((name for name in SPECIES if near and name.casefold() == near[0]), "")
    own_names = [each.name for each in SPECIES.values() if each.name == each.ion]
    raise QuantityError(
        f"{quoted(text)} is not an ion this program knows",
        f"{', '.join(own_names)} and their usual forms (NO3-N, P2O5, K2O, CaCO3 ...)",
        f"perhaps {meant} is meant" if meant else "check the name",
    )


def qualified(base: Named, qualifier: str) -> Named:
    """The form a name and the species written behind the unit stand for together ("NO3" with "N": NO3-N).

    Raises ``QuantityError`` when the two contradict each other.

    >>> qualified(form("alkalinity"), "CaCO3").species.grams_per_mol_of_ion.__round__(2)
    50.04
    """
    ion = base.species.ion
    text = re.sub(r"^(as|als|of)\s+", "", qualifier.strip("() "), flags=re.IGNORECASE)
    joined = {"n": f"{ion}-N", "caco3": "CaCO3" if ion == "HCO3" else f"{ion} as CaCO3"}.get(fold(text), text)
    try:
        found = named(joined)
    except QuantityError:
        found = None
    if found is None or found.species.ion != ion or base.species.name not in (ion, found.species.name):
        raise QuantityError(
            f"{base.species.name} and {quoted(qualifier)} do not go together",
            f"a form of {ion}: {', '.join(each.name for each in SPECIES.values() if each.ion == ion)}",
            "name the form once",
        )
    return found


def unit_and_species(text: str) -> tuple[str, str]:
    """Unit and the species written with it: "ppm CaCO3", "mg N/L", "mg/L as P2O5".

    >>> unit_and_species("mg N/L"), unit_and_species("ppm CaCO3")
    (('mg/L', 'N'), ('ppm', 'CaCO3'))
    """
    if not text or units.is_unit(text):
        return text, ""
    inside = re.fullmatch(r"([a-zA-Z\u00b5\u03bc]+)\s+(\S+)\s*(/\s*\S+)", text)
    if inside and units.is_unit(inside[1] + inside[3]):
        return inside[1] + inside[3].replace(" ", ""), inside[2]
    words = text.split(" ")
    for cut in range(len(words) - 1, 0, -1):
        if units.is_unit(" ".join(words[:cut])):
            return " ".join(words[:cut]), " ".join(words[cut:]).strip()
    return text, ""


def fold(name: str) -> str:
    """One spelling for the many a name has: case, spaces, hyphens, underscores and dots do not matter."""
    return re.sub(r"[\s_\-.,()\u00b7]", "", tidy(name).casefold())


@cache
def _known() -> dict[str, Named]:
    known = {fold(name): Named(species, True) for name, species in SPECIES.items()}
    known |= {fold(name): Named(SPECIES[target], True) for name, target in ALIASES.items()}
    return known | {fold(name): Named(SPECIES[target], False) for name, target in WITHOUT_MASS.items()}
