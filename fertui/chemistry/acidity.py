"""Alkalinity, pH, and the acid or base that moves them.

Alkalinity [meq/L] is the state. Its zero level is CO2, H2PO4-, NH4+, SO4-- and water, so that it equals the charge left
over by the other ions. pH is -log10 of the activity of H+.

A buffer is followed by one number: the protons that a mole of it has given off at a pH, counted from its most acid
form. Since alkalinity is linear in the amount of every buffer, each dose below is a quotient, not a search.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np

from fertui.chemistry.activity import davies, speciate
from fertui.chemistry.equilibria import constant
from fertui.chemistry.formula import molar_mass
from fertui.chemistry.ions import INDEX, Array, composition
from fertui.refusals import Refusal

AIR_CO2_PPM = 420.0
"""Carbon dioxide of outside air [ppm by volume], about 2023 (from memory)."""


class Water(NamedTuple):
    """What decides the pH of a water beside alkalinity and carbonate; amounts in mmol/L, any shapes that broadcast."""

    temperature_c: float | Array = 20.0
    ionic_strength: float | Array = 0.0
    """[mol/L]"""
    calcium: float | Array = 0.0
    """Free calcium [mmol/L]: it pairs with phosphate, bicarbonate and sulfate, and so does magnesium."""
    magnesium: float | Array = 0.0
    phosphate: float | Array = 0.0
    ammonium: float | Array = 0.0
    sulfate: float | Array = 0.0

    @classmethod
    def of(
        cls,
        ions_mmol_per_l: Mapping[str, float | Array] | Array,
        ph: float | Array,
        temperature_c: float | Array = 20.0,
        ionic_strength: float | Array | None = None,
    ) -> Water:
        """Water with these ions [mmol/L; HCO3 meq/L] at a pH and temperature [C].

        Ionic strength [mol/L] and free calcium, magnesium by ``activity.speciate`` where not given.
        """
        ions = composition(ions_mmol_per_l)
        solution = speciate(ions, ph, temperature_c)
        return cls(
            temperature_c=temperature_c,
            ionic_strength=solution.ionic_strength if ionic_strength is None else ionic_strength,
            calcium=solution.free[..., INDEX["Ca"]],
            magnesium=solution.free[..., INDEX["Mg"]],
            phosphate=ions[..., INDEX["H2PO4"]],
            ammonium=ions[..., INDEX["NH4"]],
            sulfate=ions[..., INDEX["SO4"]],
        )

    @classmethod
    def hard(
        cls,
        alkalinity_meq_per_l: float | Array,
        temperature_c: float | Array = 20.0,
        ionic_strength: float | Array | None = None,
    ) -> Water:
        """Water known by its alkalinity alone: calcium bicarbonate, magnesium sulfate and common salt.

        Calcium bicarbonate makes 1.5 times the alkalinity of ionic strength [mol/L]; the two others share the rest of
        ``ionic_strength``, which is 2.5 times the alkalinity where it is not given (common practice, no source).
        """
        alkalinity = np.maximum(alkalinity_meq_per_l, 0.0)
        strength = 2.5e-3 * alkalinity if ionic_strength is None else np.asarray(ionic_strength, dtype=float)
        magnesium_sulfate = 1e3 * np.maximum(strength - 1.5e-3 * alkalinity, 0.0) / 2.0 / 4.0
        return cls(
            temperature_c=temperature_c,
            ionic_strength=strength,
            calcium=0.5 * alkalinity,
            magnesium=magnesium_sulfate,
            sulfate=magnesium_sulfate,
        )


class Buffer(NamedTuple):
    """An acid that gives off protons one by one: constants by name, charge of its most acid form, pairs by form."""

    steps: tuple[str, ...]
    charge: int = 0
    pairs: tuple[tuple[int, str, str], ...] = ()
    """(protons given off, name of the constant with Ca, with Mg)."""

    def protons_given(self, ph: float | Array, water: Water) -> Array:
        """Protons given off [mol/mol] at a pH, from the most acid form."""
        forms = self._forms(np.asarray(ph, dtype=float), water)
        given = np.sum([number * form for number, form in enumerate(forms)], axis=0)
        return given / np.sum(forms, axis=0)

    def _forms(self, ph: Array, water: Water) -> list[Array]:
        """Amount of each form over that of the most acid one, ion pairs counted with their form."""
        gamma = davies(water.ionic_strength, water.temperature_c)
        ratio, charge, forms = np.ones_like(ph * gamma), self.charge, [np.ones_like(ph * gamma)]
        for step in self.steps:
            ratio = ratio * constant(step, water.temperature_c) * 10.0**ph * gamma ** (2 * charge - 1)
            charge -= 1
            forms.append(ratio)
        for number, with_calcium, with_magnesium in self.pairs:
            bound = gamma ** (4 * (number - self.charge)) * 1e-3
            forms[number] = forms[number] * (
                1.0
                + bound * constant(with_calcium, water.temperature_c) * water.calcium
                + bound * constant(with_magnesium, water.temperature_c) * water.magnesium
            )
        return forms


CARBONATE = Buffer(("carbonic_1", "carbonic_2"), pairs=((1, "CaHCO3", "MgHCO3"), (2, "CaCO3", "MgCO3")))
PHOSPHATE = Buffer(
    ("phosphoric_1", "phosphoric_2", "phosphoric_3"),
    pairs=((1, "CaH2PO4", "MgH2PO4"), (2, "CaHPO4", "MgHPO4"), (3, "CaPO4", "MgPO4")),
)
AMMONIUM = Buffer(("ammonium",), charge=1)
SULFATE = Buffer(("hydrogen_sulfate",), charge=-1)
CITRATE = Buffer(("citric_1", "citric_2", "citric_3"))


class Acid(NamedTuple):
    """An acid to dose: protons it always gives, and the buffer that gives the rest."""

    formula: str
    always: int = 0
    rest: Buffer | None = None

    def protons(self, ph: float | Array, water: Water) -> Array:
        """Protons [mol] that one mole gives off on the way to a pH.

        >>> round(float(ACIDS["phosphoric"].protons(5.8, Water.hard(3.0))), 2)
        1.07
        """
        rest = np.zeros(np.shape(ph)) if self.rest is None else self.rest.protons_given(ph, water)
        return self.always + rest


ACIDS = {
    "nitric": Acid("HNO3", always=1),
    "hydrochloric": Acid("HCl", always=1),
    "sulfuric": Acid("H2SO4", always=1, rest=SULFATE),
    "phosphoric": Acid("H3PO4", rest=PHOSPHATE),
    "citric": Acid("C6H8O7", rest=CITRATE),
}
"""Acids by name."""


class Base(NamedTuple):
    """A base to dose: alkalinity [eq] and carbonate [mol] that one mole brings."""

    name: str
    alkalinity: int
    carbonate: int


BASES = {
    "KOH": Base("potassium hydroxide", 1, 0),
    "KHCO3": Base("potassium bicarbonate", 1, 1),
    "K2CO3": Base("potassium carbonate", 2, 1),
}
"""Bases by formula."""


def acid_demand(
    alkalinity_meq_per_l: float | Array,
    ph_start: float | Array,
    ph_target: float | Array,
    open_to_air: bool,
    temperature_c: float | Array = 20.0,
    acid: str = "nitric",
    ionic_strength: float | Array | None = None,
    ions_mmol_per_l: Mapping[str, float | Array] | Array | None = None,
    co2_ppm: float = AIR_CO2_PPM,
) -> Array:
    """Acid [mmol per L of water] that takes a water from one pH down to another.

    ``alkalinity_meq_per_l`` [meq/L] as measured; ``open_to_air``: False where the CO2 set free stays dissolved (acid
    injected into a closed line), True where it leaves until ``co2_ppm`` of the air holds it (an aerated tank, in time).
    ``acid``: one of ``ACIDS``. ``ionic_strength`` [mol/L] and ``ions_mmol_per_l`` make it exact; without them the water
    is taken as ``Water.hard``.
    Raises ``Refusal`` for an unknown acid, an alkalinity that is not a number, a target above the start, or a pH and
    alkalinity that no carbonate can reconcile.
    Range: 5-35 degrees C, ionic strength to 0.5 mol/L, pH 3-9. Constants: ``equilibria``.

    >>> round(float(acid_demand(3.0, 7.72, 5.8, open_to_air=False)), 2)
    2.31
    >>> round(float(acid_demand(3.0, 7.72, 5.8, open_to_air=True)), 2)
    3.0
    """
    if acid not in ACIDS:
        raise Refusal(f"{acid!r} is not one of the acids {', '.join(ACIDS)}")
    alkalinity = _measured(alkalinity_meq_per_l)
    if np.any(np.asarray(ph_target) > ph_start):
        raise Refusal(f"acid only lowers pH, and the target {ph_target} lies above the start {ph_start}: use a base")
    water = _water(alkalinity, ph_start, temperature_c, ionic_strength, ions_mmol_per_l)
    carbonate = _carbonate_alkalinity(alkalinity, ph_start, ph_target, open_to_air, water, co2_ppm)
    surplus = alkalinity - carbonate - _other_alkalinity(ph_target, water)
    return (np.maximum(surplus, 0.0) / ACIDS[acid].protons(ph_target, water))[()]


def base_demand(
    alkalinity_meq_per_l: float | Array,
    ph_start: float | Array,
    ph_target: float | Array,
    open_to_air: bool,
    temperature_c: float | Array = 20.0,
    base: str = "KOH",
    ionic_strength: float | Array | None = None,
    ions_mmol_per_l: Mapping[str, float | Array] | Array | None = None,
    co2_ppm: float = AIR_CO2_PPM,
) -> Array:
    """Base [mmol per L of water] that takes a water from one pH up to another: ``acid_demand`` the other way.

    Raises ``Refusal`` as ``acid_demand`` does, and where this base cannot reach the target (bicarbonate alone stops
    near pH 8.3).

    >>> round(float(base_demand(0.5, 5.0, 5.8, open_to_air=True)), 2)
    0.0
    """
    if base not in BASES:
        raise Refusal(f"{base!r} is not one of the bases {', '.join(BASES)}")
    alkalinity = _measured(alkalinity_meq_per_l)
    if np.any(np.asarray(ph_target) < ph_start):
        raise Refusal(f"a base only raises pH, and the target {ph_target} lies below the start {ph_start}: use an acid")
    water = _water(alkalinity, ph_start, temperature_c, ionic_strength, ions_mmol_per_l)
    carbonate = _carbonate_alkalinity(alkalinity, ph_start, ph_target, open_to_air, water, co2_ppm)
    lacking = carbonate + _other_alkalinity(ph_target, water) - alkalinity
    carbonate_brought = 0 if open_to_air else BASES[base].carbonate
    brought = BASES[base].alkalinity - carbonate_brought * CARBONATE.protons_given(ph_target, water)
    if np.any(brought <= 0.0):
        raise Refusal(f"{base} cannot raise a closed water to pH {ph_target}: it brings as much CO2 as it binds")
    return (np.maximum(lacking, 0.0) / brought)[()]


def total_carbonate(alkalinity_meq_per_l: float | Array, ph: float | Array, water: Water) -> Array:
    """CO2, bicarbonate and carbonate together [mmol/L] that reconcile an alkalinity [meq/L] with a pH.

    Raises ``Refusal`` where it would have to be negative.

    >>> round(float(total_carbonate(3.0, 7.72, Water.hard(3.0))), 2)
    3.1
    """
    total = (alkalinity_meq_per_l - _other_alkalinity(ph, water)) / CARBONATE.protons_given(ph, water)
    if np.any(total < -1e-3):
        raise Refusal(
            f"pH {ph} and alkalinity {alkalinity_meq_per_l} meq/L do not fit together, as phosphate, ammonium "
            "and water alone hold more: measure both again on the same sample"
        )
    return np.maximum(total, 0.0)


def alkalinity(
    ph: float | Array,
    water: Water,
    total_carbonate_mmol_per_l: float | Array | None = None,
    co2_ppm: float | Array = AIR_CO2_PPM,
) -> Array:
    """Alkalinity [meq/L] of a water at a pH: closed with its total carbonate, else open to air with ``co2_ppm``.

    >>> round(float(alkalinity(5.8, Water.hard(3.0), total_carbonate_mmol_per_l=3.1)), 2)
    0.69
    """
    if total_carbonate_mmol_per_l is None:
        return _open_carbonate(ph, water, co2_ppm) + _other_alkalinity(ph, water)
    return total_carbonate_mmol_per_l * CARBONATE.protons_given(ph, water) + _other_alkalinity(ph, water)


def ph(
    alkalinity_meq_per_l: float | Array,
    water: Water,
    total_carbonate_mmol_per_l: float | Array | None = None,
    co2_ppm: float | Array = AIR_CO2_PPM,
) -> Array:
    """pH of a water of known alkalinity [meq/L]: closed with its total carbonate, else open to air with ``co2_ppm``.

    Bisection over pH 0-14 to 1e-9, all shapes at once; alkalinity rises with pH, so there is one answer.

    >>> round(float(ph(3.0, Water.hard(3.0), total_carbonate_mmol_per_l=3.1)), 2)
    7.73
    """
    wanted = np.asarray(alkalinity_meq_per_l, dtype=float)
    shape = np.shape(wanted + alkalinity(7.0, water, total_carbonate_mmol_per_l, co2_ppm))
    low, high = np.zeros(shape), np.full(shape, 14.0)
    for _ in range(34):
        middle = 0.5 * (low + high)
        below = alkalinity(middle, water, total_carbonate_mmol_per_l, co2_ppm) < wanted
        low, high = np.where(below, middle, low), np.where(below, high, middle)
    return (0.5 * (low + high))[()]


def solution_ml_per_m3(
    demand_mmol_per_l: float | Array, acid: str, strength_pct: float, density_kg_per_m3: float
) -> Array:
    """Trade acid [mL per m3 of water] for a demand [mmol/L], from its strength [% by mass] and density [kg/m3].

    >>> round(float(solution_ml_per_m3(1.0, "nitric", 67, 1399.3)), 1)
    67.2
    """
    mol_per_l = density_kg_per_m3 * strength_pct / 100.0 / molar_mass(ACIDS[acid].formula)
    return np.asarray(demand_mmol_per_l) / mol_per_l * 1e3


def _measured(alkalinity_meq_per_l: float | Array) -> Array:
    alkalinity = np.asarray(alkalinity_meq_per_l, dtype=float)
    if not np.all(np.isfinite(alkalinity)):
        raise Refusal("a dose needs the alkalinity of the water: measure it (titration or test kit) and enter it")
    return alkalinity


def _water(
    alkalinity_meq_per_l: Array,
    ph_start: float | Array,
    temperature_c: float | Array,
    ionic_strength: float | Array | None,
    ions_mmol_per_l: Mapping[str, float | Array] | Array | None,
) -> Water:
    if ions_mmol_per_l is None:
        return Water.hard(alkalinity_meq_per_l, temperature_c, ionic_strength)
    return Water.of(ions_mmol_per_l, ph_start, temperature_c, ionic_strength)


def _carbonate_alkalinity(
    alkalinity_meq_per_l: Array,
    ph_start: float | Array,
    ph_target: float | Array,
    open_to_air: bool,
    water: Water,
    co2_ppm: float,
) -> Array:
    """Alkalinity [meq/L] that carbonate still holds at the target."""
    if open_to_air:
        return _open_carbonate(ph_target, water, co2_ppm)
    return total_carbonate(alkalinity_meq_per_l, ph_start, water) * CARBONATE.protons_given(ph_target, water)


def _open_carbonate(ph: float | Array, water: Water, co2_ppm: float | Array) -> Array:
    _, bicarbonate, carbonate = CARBONATE._forms(np.asarray(ph, dtype=float), water)
    dissolved = 1e3 * constant("carbon_dioxide", water.temperature_c) * 1e-6 * np.asarray(co2_ppm)
    return dissolved * (bicarbonate + 2.0 * carbonate)


def _other_alkalinity(ph: float | Array, water: Water) -> Array:
    """Alkalinity [meq/L] of phosphate, ammonia, sulfate and water themselves."""
    ph = np.asarray(ph, dtype=float)
    gamma = davies(water.ionic_strength, water.temperature_c)
    water_itself = 1e3 * (constant("water", water.temperature_c) * 10.0**ph - 10.0**-ph) / gamma
    return (
        water.phosphate * (PHOSPHATE.protons_given(ph, water) - 1.0)
        + water.ammonium * AMMONIUM.protons_given(ph, water)
        + water.sulfate * (SULFATE.protons_given(ph, water) - 1.0)
        + water_itself
    )
