"""What one observation does to the members: an ensemble Kalman update on logarithms, clipped where it teaches uptake.

The vessels follow the whole innovation. Everything else (uptake, drain, EC factor, capacity) learns from an innovation
that levels off at about two predicted standard deviations: one odd analysis moves the estimate, but does not
ruin what was learned. An EC teaches nothing about single ions.
Evensen 1994, J. Geophys. Res. 99:10143 (ensemble Kalman filter; from memory); the clip is our own.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, NamedTuple

import numpy as np

from fertui.chemistry.conductivity import Linearised, linearise
from fertui.chemistry.ions import INDEX, IONS, Array
from fertui.estimate.ensemble import Ensemble, compartment
from fertui.estimate.noise import normals
from fertui.estimate.observations import EC_ERROR, Observation
from fertui.estimate.setting import Setting
from fertui.loop import Drive, feed_composition
from fertui.loop.values import State

CLIP = 2.0
EC_MODEL_ERROR = 0.04
"""Error of EC from ions beyond the loop's own factor (0.23 mS/cm on the measured houses)."""
TRACE = 0.02
"""Concentrations [mmol/L] below this are taken as this where a logarithm is needed."""
GROSS = 4.0
"""A reading so many predicted standard deviations off is set aside as a meter fault (analyses are not)."""
EC_CHANGED = 0.15
FARTHEST = 3.0
"""A member that says something wild counts as this many predicted standard deviations off."""
MOST_LEARNED = {"fast": 1.0, "slow": 1.8, "common": 1.0, "drain": 1.0, "stock": 0.5}
"""Bounds (log) of what is learned: uptake between a sixth and six times the preset, and what a month brings."""
MOST_UNSEEN = 0.3
ENOUGH_IONS = 5
TEACHABLE = ("fast", "slow", "stock", "common", "drain", "ec", "capacity")

_HCO3 = INDEX["HCO3"]


class Innovation(NamedTuple):
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

    def meter_is_off(self, deviations: float) -> bool:
        """Whether the EC is more than so many standard deviations off."""
        return self.ec_off is not None and self.ec_sd is not None and abs(self.ec_off) > deviations * self.ec_sd


class ElectroMeter:
    """EC of many compositions by a straight line about their median, drawn anew when that has moved."""

    def __init__(self, line: Linearised | None = None) -> None:
        self.line = line

    def __call__(self, mmol_l: Array) -> Array:
        """log EC (M,) [mS/cm] of compositions (M, 10)."""
        middle = np.partition(mmol_l, len(mmol_l) // 2, axis=0)[len(mmol_l) // 2]
        if self.line is None or np.any(np.abs(middle - self.line.at) > EC_CHANGED * self.line.at + 0.3):
            self.line = linearise(middle)
        return np.log(np.maximum(self.line(mmol_l), 0.01))


def corrected(
    ensemble: Ensemble, setting: Setting, seen: Observation, drive: Drive | None, meter: ElectroMeter, seed: int
) -> tuple[Ensemble, Innovation | None]:
    """The members after an observation, and how far off it was; unchanged where it shows nothing they could learn from.

    Ions first, then EC: their errors are independent. ``drive``: the one in force, for a feed that is blended.
    """
    blended = compartment(setting, seen.point) is None
    if blended and (setting.circuit.layout == "known-feed" or not seen.is_analysis):
        return ensemble, None
    after, found = ensemble, None
    for look in (_Ions(setting, seen, drive), _EC(setting, seen, drive, meter)):
        if not look.given or (blended and isinstance(look, _EC)):
            continue
        after, off, sd, expected = _updated(after, setting, seen, look, seed)
        found = look.told(found, off, sd, expected)
    if found is None:
        return ensemble, None
    after = after._replace(alkalinity=seen.ions.get("HCO3", ensemble.alkalinity))
    return after._replace(state=after.state.reloaded(after.medium(setting))), found


class _Ions:
    """The ions of an observation: they teach everything; those of a blended feed teach what the stocks carry."""

    def __init__(self, setting: Setting, seen: Observation, drive: Drive | None) -> None:
        self.setting, self.seen, self.drive = setting, seen, drive
        self.teaches = ("stock",) if compartment(setting, seen.point) is None else TEACHABLE
        self.columns = seen.columns()
        self.given = bool(self.columns)
        self.measured = np.log(seen.values()) if self.given else np.zeros(0)
        self.noise = seen.covariance() if self.given else np.zeros((0, 0))

    def predicted(self, ensemble: Ensemble) -> Array:
        """Logarithms (M, n) of what every member says the sample holds."""
        return np.log(np.maximum(_shown(ensemble, self.setting, self.seen, self.drive)[:, self.columns], TRACE))

    def told(self, _: Innovation | None, off: Array, sd: Array, expected: Array) -> Innovation:
        """The innovation as it is reported."""
        return Innovation(tuple(self.columns), expected, off, sd)


class _EC:
    """The EC of an observation: how much there is, not of what. Beside measured ions it teaches its own factor."""

    def __init__(self, setting: Setting, seen: Observation, drive: Drive | None, meter: ElectroMeter) -> None:
        self.setting, self.seen, self.drive, self.meter = setting, seen, drive, meter
        self.beside_ions = len(seen.columns()) >= ENOUGH_IONS
        self.teaches = ("ec",) if self.beside_ions else ("common", "drain", "ec", "capacity")
        self.given = seen.ec is not None and seen.ec > 0
        self.measured = np.log([seen.ec or 1.0])
        self.noise = np.array([[EC_ERROR**2 + EC_MODEL_ERROR**2]])

    def predicted(self, ensemble: Ensemble) -> Array:
        """Logarithms (M, 1) of what every member says the meter shows."""
        return (self.meter(_shown(ensemble, self.setting, self.seen, self.drive)) + ensemble.ec)[:, None]

    def told(self, ions: Innovation | None, off: Array, sd: Array, _: Array) -> Innovation:
        """The innovation as it is reported, beside that of the ions."""
        known = ions or Innovation((), np.zeros(0), np.zeros(0), np.zeros(0))
        return known._replace(ec_off=float(off[0]), ec_sd=float(sd[0]))


def _updated(
    ensemble: Ensemble, setting: Setting, seen: Observation, look: _Ions | _EC, seed: int
) -> tuple[Ensemble, Array, Array, Array]:
    """Members after one look, the innovation (n,), its standard deviation (n,), and the mean expected (n,)."""
    predicted = look.predicted(ensemble)
    anomalies = predicted - predicted.mean(axis=0)
    total = _covariance(anomalies, anomalies) + look.noise
    off, sd = look.measured - predicted.mean(axis=0), np.sqrt(np.diag(total))
    expected = predicted.mean(axis=0)
    if not seen.is_analysis and np.any(np.abs(off) > GROSS * sd):
        return ensemble, off, sd, expected
    key = f"{seen.at.isoformat()} {seen.point} {seen.kind} {len(off)}"
    drawn = normals(seed, setting.loop.name, key, len(predicted), len(off), apart=True)
    scatter = np.clip(drawn @ np.linalg.cholesky(look.noise).T - anomalies, -FARTHEST * sd, FARTHEST * sd)
    inverse = np.linalg.inv(total)
    levelled = (CLIP * sd * np.tanh(off / (CLIP * sd)) + scatter) @ inverse
    learned = _learned(ensemble, setting, look.teaches, anomalies, levelled)
    where = compartment(setting, seen.point)
    if where is not None and not (isinstance(look, _EC) and look.beside_ions):
        learned = learned._replace(state=_moved(ensemble, anomalies, (off + scatter) @ inverse, where))
    return learned, off, sd, expected


def _shown(ensemble: Ensemble, setting: Setting, seen: Observation, drive: Drive | None) -> Array:
    """What every member says the sample holds (M, 10) [mmol/L]."""
    where = compartment(setting, seen.point)
    if where is None:
        assert drive is not None
        return np.maximum(feed_composition(setting.circuit, drive, ensemble.state), 0.0)
    return ensemble.holds(setting, where)


def _covariance(left: Array, right: Array) -> Array:
    """Covariance of columns; ``left`` has mean zero, so that ``right`` need not."""
    return left.T @ right / max(len(left) - 1, 1)


def _learned(ensemble: Ensemble, setting: Setting, names: Sequence[str], anomalies: Array, weights: Array) -> Ensemble:
    """Unknowns after an update; ``weights`` (M, n): innovation, levelled off, over its covariance."""
    moved: dict[str, Any] = {}
    for name in names:
        values = getattr(ensemble, name)
        if name == "stock" and setting.circuit.layout == "known-feed":
            continue
        flat = values.reshape(len(values), -1)
        shifted = flat + weights @ _covariance(anomalies, flat)
        bound = MOST_LEARNED.get(name, np.inf)
        moved[name] = np.asfortranarray(np.clip(shifted, -bound, bound).reshape(values.shape))
    return ensemble._replace(**moved)


def _moved(ensemble: Ensemble, anomalies: Array, weights: Array, where: int) -> State:
    """Vessels after the update: the logarithm of every concentration follows in the measure it goes with the sample.

    A vessel that was not sampled follows by ``MOST_UNSEEN`` at most: what links the two is only a model.
    """
    state = ensemble.state
    amounts = np.maximum(state.ions_mmol[:, :, :_HCO3], 0.0)
    water = np.maximum(state.water_l, 1e-9)[:, :, None]
    logs = np.log(np.maximum(amounts / water, TRACE)).reshape(len(amounts), -1)
    shift = (weights @ _covariance(anomalies, logs)).reshape(amounts.shape)
    shift[:, 1 - where] = np.clip(shift[:, 1 - where], -MOST_UNSEEN, MOST_UNSEEN)
    ions = state.ions_mmol.copy()
    ions[:, :, :_HCO3] = np.where(amounts > 0, amounts * np.exp(shift), 0.0)
    return state._replace(ions_mmol=ions)
