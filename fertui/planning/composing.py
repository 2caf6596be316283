"""Which salts, and how much of each per litre, make a wanted composition.

Three aims one after the other: the least misfit to what is wanted, then few salts, then few kilograms (or little
money). Every vector here has ``IONS`` first and ``MICRONUTRIENTS`` after them, in mmol/L and umol/L.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import IONS, MICRONUTRIENTS, Array
from fertui.planning.programme import Aim, Region, Solver, lexicographic
from fertui.planning.shelf import Material

SPECIES = IONS + MICRONUTRIENTS
FLOOR: Array = np.array([1.0, 1.0, 0.5, 2.0, 1.5, 1.0, 2.0, 1.0, 0.5, 0.5, 5.0, 5.0, 2.0, 5.0, 0.5, 0.5, 500.0])
"""Misfit is counted in parts of what is wanted, but never of less than this [mmol/L, umol/L].

NH4 by the 1.5 that a feed may have (Nutrient Solutions for Greenhouse Crops 2016, second-hand): what a calcium nitrate
brings of it is no reason to leave out the calcium.
"""

IMPORTANCE: Array = np.where(np.isin(SPECIES, ("SO4", "Cl", "Na")), 0.5, 1.0)
"""Sulfate, chloride and sodium give way first: a crop bears the widest range of them (common practice, no source)."""

MISFIT_GIVEN_AWAY = 2e-3
"""Misfit that may be given away to do with one salt less: 0.2 % of one ion."""

TIE = 1e-5
"""Weight of the kilograms once the salts are chosen: it decides between equals alone."""


class Composed(NamedTuple):
    """Grams of each material per litre, what they bring, and what is then missing (-) or too much (+)."""

    grams_per_l: Array
    brought: Array
    misfit: Array


def importance(wanted: Array) -> Array:
    """Weight of one unit of misfit of each species, shape (17,): parts of what is wanted.

    >>> float(importance(np.full(17, 4.0))[0])
    0.25
    """
    return IMPORTANCE / np.maximum(np.abs(wanted), FLOOR)


def contents(materials: Sequence[Material]) -> Array:
    """What one gram of each material brings, shape (17, materials) [mmol, umol]."""
    columns = [np.concatenate([each.ions_mmol_per_kg, each.micros_umol_per_kg]) / 1000.0 for each in materials]
    return np.array(columns).T.reshape(len(SPECIES), len(materials))


def compose(materials: Sequence[Material], wanted: Array, solver: Solver) -> Composed:
    """Grams per litre of each material that come nearest to ``wanted`` (17,), with as few materials as that takes.

    A wanted amount below zero (the water has more than the recipe) counts as nothing wanted: no salt can take an ion
    out.
    """
    content = contents(materials)
    weight = importance(wanted)
    enough = _enough(content, np.maximum(wanted, 0.0))
    region = _region(content * enough, wanted)
    misfit, few = _aims(materials, enough, weight)
    solution = lexicographic(solver, region, [misfit, few])
    if solution is not None:
        used = np.round(solution[-len(materials) :])
        solution = solver.minimise(misfit.cost + TIE * few.cost, region.without(np.flatnonzero(used < 0.5)))
    grams = np.zeros(len(materials)) if solution is None else solution[: len(materials)] * enough
    brought = content @ grams
    return Composed(grams, brought, brought - wanted)


def _enough(content: Array, wanted: Array) -> Array:
    """Grams per litre of each material beyond which even the ion wanted most is overshot: the physical maximum."""
    with np.errstate(divide="ignore", invalid="ignore"):
        grams = np.where(content > 0.0, wanted[:, None] / content, 0.0)
    return np.maximum(grams.max(axis=0, initial=0.0), 1e-9)


def _region(content: Array, wanted: Array) -> Region:
    """Variables: parts of enough (n), too much (17), too little (17), switches (n)."""
    species, n = content.shape
    eye = np.eye(species)
    balance = np.hstack([content, -eye, eye, np.zeros((species, n))])
    switched = np.hstack([np.eye(n), np.zeros((n, 2 * species)), -np.eye(n)])
    return Region(
        np.vstack([balance, switched]),
        np.concatenate([wanted, np.full(n, -np.inf)]),
        np.concatenate([wanted, np.zeros(n)]),
        np.zeros(2 * (n + species)),
        np.concatenate([np.ones(n), np.full(2 * species, np.inf), np.ones(n)]),
        np.concatenate([np.zeros(n + 2 * species, int), np.ones(n, int)]),
    )


def _aims(materials: Sequence[Material], enough: Array, weight: Array) -> list[Aim]:
    n = len(materials)
    misfit = np.concatenate([np.zeros(n), weight, weight, np.zeros(n)])
    spent = enough * np.array([each.cost_per_kg for each in materials])
    spent = 0.5 * spent / max(float(spent.sum()), 1e-12)
    few = np.concatenate([spent, np.zeros(2 * len(weight)), np.ones(n)])
    return [Aim(misfit, MISFIT_GIVEN_AWAY), Aim(few)]
