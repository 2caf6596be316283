"""The acid sheet: how much acid a water takes, in splits that cannot overshoot, and what the acid feeds.

The dose follows from alkalinity and never from pH alone: two waters of pH 7.5 can differ tenfold in what they take.
A lye is dosed by the same sheet where alkalinity is short.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import NamedTuple

from fertui.catalogue.acids import Acid
from fertui.catalogue.acids import acid as named_acid
from fertui.catalogue.cautions import Caution, cautions_of
from fertui.chemistry.acidity import ACIDS, acid_demand
from fertui.chemistry.acidity import Water as CarbonateWater
from fertui.chemistry.ions import ATOMIC_WEIGHT
from fertui.planning.shelf import PlanningError
from fertui.site.model import Composition, Loop, Site, Supply

LEAVE_MEQ_PER_L = 0.5
"""Alkalinity left as buffer [meq/L]; 0.3-1.0 is usual. Upper end 1.0: Quaderno ARSIA 5/2004 p. 179; default common
practice."""
PH_TARGET = 5.8
PH_START = 7.0
"""Taken where the pH of the water is not known: a low guess, which makes the closed figure and so each split small."""
WARN_PH, STOP_PH, BURN_PH = 5.0, 4.5, 3.5
"""No more acid below the first, dosing and irrigation stop below the second, roots burn below the third (common
practice, no source)."""
WAIT_MIN = 15.0
"""Minutes of circulation before a retest: one turnover of a small tank (common practice, no source)."""
PART_OF_CLOSED = 3
"""A split is at most a third of what a closed water takes to the target pH (model, section 10)."""
MEASURE_IT = (
    "The alkalinity of this water is not known, so there is no dose: measure it (titration, test kit, or HCO3 or CaCO3 "
    "of a laboratory) and enter it. pH alone never tells the acid."
)


class Split(NamedTuple):
    """One portion [L]: mix, wait [min], retest; go on only above ``retest_ph``, stop everything at ``stop_ph``."""

    number: int
    litres: float
    wait_min: float
    retest_ph: float
    stop_ph: float


class AcidSheet(NamedTuple):
    """What to dose into one volume of water, in which portions, and what it brings.

    ``litres_total`` leaves ``leave_meq_l`` of alkalinity once the CO2 has gone: only the running sum after retests.
    ``litres_closed`` takes the water to ``ph_target`` while all CO2 stays dissolved.
    """

    feasible: bool
    reason: str | None
    acid: str
    strength_pct: float
    density_kg_per_l: float
    mol_per_l: float
    volume_l: float
    alkalinity_meq_l: float | None
    leave_meq_l: float
    ph_target: float
    demand_mmol_l: float
    demand_closed_mmol_l: float
    demand_open_mmol_l: float
    litres_total: float
    litres_closed: float
    splits: tuple[Split, ...]
    adds_mmol_l: Mapping[str, float]
    adds_mg_l: Mapping[str, float]
    arithmetic: tuple[str, ...]
    words: tuple[str, ...]
    cautions: tuple[Caution, ...]
    alkalinity_from: str = ""
    """Which analysis the alkalinity was taken from."""


class Demand(NamedTuple):
    """Acid per litre of water [mmol/L]: to leave the buffer, to the target pH closed, to the target pH open to air."""

    to_leave: float
    closed: float
    open: float


def acid_sheet(
    site: Site,
    loop: Loop,
    *,
    water: Composition | None = None,
    acid: Supply | None = None,
    volume_l: float | None = None,
    leave_meq_l: float = LEAVE_MEQ_PER_L,
    ph_target: float = PH_TARGET,
    ph_start: float | None = None,
    temperature_c: float = 20.0,
) -> AcidSheet:
    """Acid sheet for ``volume_l`` [L] of a water (default: the loop's tank, its make-up water, the first acid on the
    shelf).

    A lye given as ``acid`` serves where ``leave_meq_l`` [meq/L] lies above the alkalinity. Not feasible, with the
    reason, where the alkalinity is not known. Raises ``PlanningError`` for no acid, no volume, or a target that is
    none.
    """
    unknown = unanalysed_words(site, loop) if water is None else ()
    water = water_of(site, loop) if water is None else water
    volume = volume_l if volume_l is not None else loop.tank_l
    if volume is None or not (math.isfinite(volume) and volume > 0):
        raise PlanningError(
            f"the acid sheet needs litres of water above 0; loop {loop.name} has no tank, so give the volume."
        )
    if not 0.0 <= leave_meq_l <= 5.0 or not STOP_PH < ph_target < 8.0:
        raise PlanningError(
            f"leave 0 to 5 meq/L (found {leave_meq_l:g}) and aim at pH {STOP_PH} to 8 (found {ph_target:g})."
        )
    alkalinity = water.ions.get("HCO3")
    if acid is None and alkalinity is not None and alkalinity <= leave_meq_l:
        return _none_needed(volume, alkalinity, leave_meq_l, ph_target)
    supply = acid or acid_on_shelf(site)
    start = ph_start or water.ph or PH_START
    if alkalinity is None:
        return _refused(supply, volume, leave_meq_l, ph_target, " ".join((*unknown, MEASURE_IT)))
    found, strength = named_acid(supply.kind), _strength(supply)
    demand = demanded(found, water, leave_meq_l, ph_target, start, temperature_c)
    return _sheet(supply, found, strength, volume, alkalinity, leave_meq_l, ph_target, start, demand)


def source_water(site: Site, loop: Loop) -> Composition | None:
    """Make-up water of the loop, None where the site describes none."""
    return next((each.composition for each in site.waters if each.name == loop.water or not loop.water), None)


def unanalysed_words(site: Site, loop: Loop) -> tuple[str, ...]:
    """What is said where nobody has analysed the make-up water, in site.toml or in the logbook; nothing where it is
    known."""
    water = source_water(site, loop)
    if water is not None and water.ions:
        return ()
    name = loop.water or next((each.name for each in site.waters), "make-up")
    return (
        f"the water {name!r} was never analysed: Na, Cl, Ca, Mg, SO4 and alkalinity of it are not known and are taken "
        "as none here; what it brings comes on top, of hard water a lot of Ca. Send a sample of it first.",
    )


def water_of(site: Site, loop: Loop) -> Composition:
    """Make-up water of the loop; raises ``PlanningError`` where the site describes none."""
    water = source_water(site, loop)
    if water is None:
        raise PlanningError(f"loop {loop.name} names no make-up water of site.toml; add [[waters]] with its analysis.")
    return water


def first_acid(site: Site) -> Supply | None:
    """The first acid among the supplies; None where there is none."""
    found = (each for each in site.supplies if each.strength_pct is not None and named_acid(each.kind).is_acid)
    return next(found, None)


def acid_on_shelf(site: Site) -> Supply:
    """The first acid among the supplies; raises ``PlanningError`` where there is none."""
    found = first_acid(site)
    if found is not None:
        return found
    raise PlanningError("there is no acid among the supplies; add one with its kind and the strength_pct on its label.")


def demanded(
    acid: Acid, water: Composition, leave_meq_l: float, ph_target: float, ph_start: float, temperature_c: float = 20.0
) -> Demand:
    """Acid per litre [mmol/L] that a water of known alkalinity takes; of a lye: what it is short of ``leave_meq_l``.

    Phosphoric acid counts with the part of its second proton that is given off at the target pH.

    >>> from fertui.catalogue.acids import acid
    >>> round(demanded(acid("nitric"), Composition({"HCO3": 3.5}), 0.5, 5.8, 7.5).to_leave, 2)
    3.0
    """
    alkalinity = water.ions["HCO3"]
    if not acid.is_acid:
        short = max(leave_meq_l - alkalinity, 0.0) / -acid.protons
        return Demand(short, short, short)
    name = acid.name.split()[0]
    protons = float(ACIDS[name].protons(ph_target, CarbonateWater.hard(max(alkalinity, 0.0), temperature_c)))
    to_leave = max(alkalinity - leave_meq_l, 0.0) / protons
    if ph_start <= ph_target:
        return Demand(to_leave, to_leave, to_leave)
    closed, open_ = (
        float(acid_demand(max(alkalinity, 0.0), ph_start, ph_target, open_to_air, temperature_c, acid=name))
        for open_to_air in (False, True)
    )
    return Demand(to_leave, min(closed, to_leave), open_)


def _strength(supply: Supply) -> float:
    if supply.strength_pct is None:
        raise PlanningError(
            f"{supply.name}: an acid needs strength_pct, the mass % on its label; without it no dose is safe."
        )
    return supply.strength_pct


def _refused(supply: Supply, volume: float, leave: float, ph_target: float, why: str) -> AcidSheet:
    strength = _strength(supply)
    found = named_acid(supply.kind)
    density = supply.density_kg_per_l or found.density(strength)
    return AcidSheet(
        False, why, supply.name, strength, density, found.mol_per_l(strength, density), volume, None, leave,
        ph_target, 0.0, 0.0, 0.0, 0.0, 0.0, (), {}, {}, (), (), cautions_of([supply]),
    )  # fmt: skip


def _none_needed(volume: float, alkalinity: float, leave: float, ph_target: float) -> AcidSheet:
    words = (
        f"no acid needed: {alkalinity:.1f} meq/L of alkalinity is not above the {leave:.1f} that is left as buffer",
    )
    return AcidSheet(
        True, None, "", 0.0, 0.0, 0.0, volume, alkalinity, leave, ph_target, 0.0, 0.0, 0.0, 0.0, 0.0, (), {}, {}, (),
        words, (),
    )  # fmt: skip


def _sheet(
    supply: Supply, found: Acid, strength: float, volume: float, alkalinity: float, leave: float, ph_target: float,
    ph_start: float, demand: Demand,
) -> AcidSheet:  # fmt: skip
    density = supply.density_kg_per_l or found.density(strength)
    mol_per_l = found.mol_per_l(strength, density)
    litres = demand.to_leave * volume / 1000.0 / mol_per_l
    closed = demand.closed * volume / 1000.0 / mol_per_l
    splits = split(litres, closed, ph_target)
    adds = {ion: demand.to_leave * moles for ion, moles in found.gives.items() if ion != "HCO3"}
    return AcidSheet(
        True, None, supply.name, strength, density, mol_per_l, volume, alkalinity, leave, ph_target,
        demand.to_leave, demand.closed, demand.open, litres, closed, splits, adds, element_mg(adds),
        _arithmetic(found, strength, density, mol_per_l, volume, alkalinity, leave, demand, litres, adds),
        _words(supply, found, litres, ph_start, ph_target, splits, demand), cautions_of([supply]),
    )  # fmt: skip


def split(litres: float, litres_closed: float, ph_target: float = PH_TARGET) -> tuple[Split, ...]:
    """Equal portions of at most a third of the closed figure; none for nothing.

    >>> [round(each.litres, 3) for each in split(1.15, 0.9)]
    [0.287, 0.287, 0.287, 0.287]
    """
    if litres <= 0.0:
        return ()
    number = max(math.ceil(PART_OF_CLOSED * litres / max(min(litres, litres_closed), 1e-9) - 1e-9), PART_OF_CLOSED)
    return tuple(Split(each + 1, litres / number, WAIT_MIN, ph_target, STOP_PH) for each in range(number))


def element_mg(adds_mmol_l: Mapping[str, float]) -> dict[str, float]:
    """N, P, S, Cl and K in mg/L that amounts in mmol/L bring.

    >>> {name: round(mg, 1) for name, mg in element_mg({"NO3": 3.0}).items()}
    {'N': 42.0}
    """
    of = {"NO3": "N", "NH4": "N", "H2PO4": "P", "SO4": "S", "Cl": "Cl", "K": "K"}
    mg: dict[str, float] = {}
    for ion, mmol in adds_mmol_l.items():
        if ion in of:
            mg[of[ion]] = mg.get(of[ion], 0.0) + mmol * ATOMIC_WEIGHT[of[ion]]
    return mg


def counted_words(is_acid: bool) -> str:
    """Who takes off the salts what an acid or a lye feeds: stock sheets count with acid alone."""
    return "the stock sheet takes it off the salts" if is_acid else "take it off the salts"


def _arithmetic(
    found: Acid, strength: float, density: float, mol_per_l: float, volume: float, alkalinity: float, leave: float,
    demand: Demand, litres: float, adds: Mapping[str, float],
) -> tuple[str, ...]:  # fmt: skip
    protons = abs(alkalinity - leave) / demand.to_leave if demand.to_leave else abs(found.protons)
    lines = [
        f"alkalinity {alkalinity:.2f} - {leave:.2f} to leave = {alkalinity - leave:.2f} meq/L",
        f"/ {protons:.3f} per mol of {found.formula} = {demand.to_leave:.3f} mmol/L",
        f"x {volume:.0f} L / 1000 = {demand.to_leave * volume / 1000:.2f} mol",
        f"{strength:g} % of {density:.3f} kg/L: {density:.3f} x 1000 x {strength / 100:g} / {found.molar_mass:.2f} = "
        f"{mol_per_l:.2f} mol/L",
        f"{demand.to_leave * volume / 1000:.2f} mol / {mol_per_l:.2f} mol/L = {litres:.2f} L",
    ]
    taken = counted_words(found.is_acid)
    brought = [f"adds {mmol:.2f} mmol/L {ion}: {taken}" for ion, mmol in adds.items()]
    return tuple(lines + brought)


def _words(
    supply: Supply,
    found: Acid,
    litres: float,
    ph_start: float,
    ph_target: float,
    splits: tuple[Split, ...],
    demand: Demand,
) -> tuple[str, ...]:
    if not splits:
        return ("nothing to dose: the alkalinity is already at or beyond what is to be left",)
    each = splits[0].litres
    lines = [
        f"{litres:.2f} L of {supply.name} in all, in {len(splits)} portions of {each:.3f} L: fill the water first, "
        f"then {'acid' if found.is_acid else 'lye'} slowly into it, with the pump mixing.",
        f"After each portion mix {WAIT_MIN:.0f} min and measure pH. "
        + (
            f"Next portion only above pH {ph_target:g}."
            if found.is_acid
            else f"Next portion only below pH {ph_target:g}."
        ),
    ]
    if found.is_acid:
        lines += [
            f"Below pH {WARN_PH:g} no more acid. Below {STOP_PH:g} stop dosing and stop irrigation. "
            f"Below {BURN_PH:g} roots burn: no solution to the crop, and the site's own procedure comes first.",
            f"pH reads {ph_target:g} after about {demand.closed:.2f} mmol/L while CO2 is dissolved and creeps up as it "
            f"leaves; {demand.to_leave:.2f} mmol/L is the sum that may be reached over the retests, never one dose. "
            f"Reckoned from pH {ph_start:g}.",
        ]
    return tuple(lines)
