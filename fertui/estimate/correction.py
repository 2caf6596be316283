"""What one observation does to the members: an ensemble Kalman update on logarithms, clipped where it teaches uptake.

The vessels follow the whole innovation. Ion i teaches only the uptake and stock of ion i; what is common (uptake, drain,
EC factor, capacity) follows all ions. Everything but the vessels learns from an innovation that levels off at about one
and a half predicted standard deviations: one odd analysis moves the estimate, but does not ruin what was learned.
Evensen 1994, J. Geophys. Res. 99:10143 (ensemble Kalman filter; from memory); the clip is our own.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from fertui.chemistry.conductivity import Linearised, linearise
from fertui.chemistry.ions import INDEX, IONS, Array
from fertui.estimate.ensemble import Ensemble, compartment
from fertui.estimate.noise import normals
from fertui.estimate.observations import EC_ERROR, Observation
from fertui.estimate.setting import Setting
from fertui.loop import Drive, feed_composition
from fertui.loop.values import State

CLIP = 1.7
EC_MODEL_ERROR = 0.02
TRACE = 1e-3
"""Concentrations [mmol/L] below this are taken as this where a logarithm is needed."""
GROSS = 4.0
"""A reading so many predicted standard deviations off is set aside as a meter fault (analyses are not)."""
EC_CHANGED = 0.15

_HCO3 = INDEX["HCO3"]


@dataclass(frozen=True, slots=True)
class Innovation:
    """What an observation was against what was expected, as logarithms (n,), in standard deviations, and by ion."""

    columns: tuple[int, ...]
    expected: Array
    difference: Array
    sd: Array
    ec_off: float | None = None
    ec_sd: float | None = None

    def surprising(self, deviations: float) -> tuple[str, ...]:
        """Ions more than so many standard deviations off."""
        far = np.abs(self.difference) > deviations * self.sd
        return tuple(IONS[column] for column, odd in zip(self.columns, far, strict=True) if odd)


class ElectroMeter:
    """EC of many compositions by a straight line about their mean, drawn anew when the mean has moved."""

    def __init__(self) -> None:
        self.line: Linearised | None = None

    def __call__(self, mmol_l: Array) -> Array:
        """log EC (M,) [mS/cm] of compositions (M, 10)."""
        middle = mmol_l.mean(axis=0)
        if self.line is None or np.any(np.abs(middle - self.line.at) > EC_CHANGED * self.line.at + 0.3):
            self.line = linearise(middle)
        return np.log(np.maximum(self.line(mmol_l), 0.01))


def corrected(
    ensemble: Ensemble, setting: Setting, seen: Observation, drive: Drive | None, meter: ElectroMeter, seed: int
) -> tuple[Ensemble, Innovation | None]:
    """The members after an observation, and how far off it was; unchanged where it shows nothing they could learn from.

    ``drive``: the one in force, for a feed that is blended; None for a known feed.
    """
    if seen.point == "feed" and setting.circuit.layout == "known-feed":
        return ensemble, None
    shown = _shown(ensemble, setting, seen, drive)
    columns = seen.columns()
    predicted, measured, noise = _compared(seen, columns, shown, ensemble, meter)
    if measured.size == 0:
        return ensemble, None
    anomalies = predicted - predicted.mean(axis=0)
    within = _covariance(anomalies, anomalies)
    total = within + noise
    difference = measured - predicted.mean(axis=0)
    sd = np.sqrt(np.diag(total))
    found = _innovation(columns, predicted, difference, sd)
    if not seen.is_analysis and np.any(np.abs(difference) > GROSS * sd):
        return ensemble, found
    drawn = normals(seed, setting.loop.name, f"{seen.at.isoformat()} {seen.point} {seen.kind}", len(predicted), measured.size)
    scatter = drawn @ np.linalg.cholesky(noise).T - anomalies
    inverse = np.linalg.inv(total)
    full = (difference + scatter) @ inverse
    levelled = (CLIP * sd * np.tanh(difference / (CLIP * sd)) + scatter) @ inverse
    learned = _learned(ensemble, columns, anomalies, levelled)
    state = _moved(ensemble, anomalies, full)
    after = replace(learned, state=state, alkalinity=seen.ions.get("HCO3", ensemble.alkalinity))
    return replace(after, state=after.state.reloaded(after.medium(setting))), found


def _shown(ensemble: Ensemble, setting: Setting, seen: Observation, drive: Drive | None) -> Array:
    """What every member says the sample holds (M, 10) [mmol/L]."""
    where = compartment(setting, seen.point)
    if where is None:
        assert drive is not None
        return np.maximum(feed_composition(setting.circuit, drive, ensemble.state), 0.0)
    return ensemble.state.concentration(where)


def _compared(
    seen: Observation, columns: list[int], shown: Array, ensemble: Ensemble, meter: ElectroMeter
) -> tuple[Array, Array, Array]:
    """Predicted (M, n) and measured (n,) logarithms, and the covariance of the error (n, n): ions, then EC."""
    predicted = np.log(np.maximum(shown[:, columns], TRACE))
    measured = np.log(seen.values()) if columns else np.zeros(0)
    noise = seen.covariance() if columns else np.zeros((0, 0))
    if seen.ec is None:
        return predicted, measured, noise
    with_ec = np.column_stack([predicted, meter(shown) + ensemble.ec])
    wider = np.zeros((len(measured) + 1,) * 2)
    wider[:-1, :-1] = noise
    wider[-1, -1] = EC_ERROR**2 + EC_MODEL_ERROR**2
    return with_ec, np.append(measured, np.log(seen.ec)), wider


def _innovation(columns: list[int], predicted: Array, difference: Array, sd: Array) -> Innovation:
    count = len(columns)
    off, off_sd = (float(difference[count]), float(sd[count])) if len(difference) > count else (None, None)
    middle = np.median(predicted[:, :count], axis=0)
    return Innovation(tuple(columns), middle, difference[:count], sd[:count], off, off_sd)


def _covariance(left: Array, right: Array) -> Array:
    return left.T @ right / max(len(left) - 1, 1)


def _learned(ensemble: Ensemble, columns: list[int], anomalies: Array, weights: Array) -> Ensemble:
    """Unknowns after the update; ``weights`` (M, n): innovation over its covariance, levelled off."""

    def own(values: Array) -> Array:
        moved = values.copy()
        chosen = values[:, columns]
        covariance = ((chosen - chosen.mean(axis=0)) * anomalies[:, : len(columns)]).sum(axis=0) / max(len(values) - 1, 1)
        moved[:, columns] += weights[:, : len(columns)] * covariance
        return moved

    def all_ions(values: Array) -> Array:
        return values + weights @ _covariance(anomalies, (values - values.mean())[:, None])[:, 0]

    return replace(
        ensemble,
        fast=own(ensemble.fast), slow=own(ensemble.slow), stock=own(ensemble.stock),
        common=all_ions(ensemble.common), drain=all_ions(ensemble.drain), ec=all_ions(ensemble.ec),
        capacity=all_ions(ensemble.capacity),
    )  # fmt: skip


def _moved(ensemble: Ensemble, anomalies: Array, weights: Array) -> State:
    """Vessels after the update: the logarithm of every concentration follows in the measure it goes with the sample."""
    state = ensemble.state
    amounts = np.maximum(state.ions_mmol[:, :, :_HCO3], 0.0)
    water = np.maximum(state.water_l, 1e-9)[:, :, None]
    logs = np.log(np.maximum(amounts / water, TRACE)).reshape(len(amounts), -1)
    shift = weights @ _covariance(anomalies, logs - logs.mean(axis=0))
    ions = state.ions_mmol.copy()
    moved = np.exp(logs + shift).reshape(amounts.shape) * water
    ions[:, :, :_HCO3] = np.where(state.water_l[:, :, None] > 0, moved, 0.0)
    return replace(state, ions_mmol=ions)
