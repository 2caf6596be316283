"""Exact solution of the linear exchange of water between two volumes, for every member and ion at once.

    x0' = -p x0 + q x1 + s0          x1' = r x0 - w x1 + s1

x0, x1 [mmol] in store and root zone; rates p >= r, w >= q [1/d]; sources s [mmol/d]. The matrix has two real
eigenvalues, so every function f of it is f(A) = a I + d A with a divided difference d: no iteration, and with
non-negative rates and sources no amount can become negative.
"""

from __future__ import annotations

import numpy as np

from fertui.chemistry.ions import Array

_SMALL = 0.02
_TWIN = 1e-7


def two_volumes(
    x0: Array, x1: Array, p: Array, q: Array, r: Array, w: Array, s0: Array, s1: Array, days: float
) -> tuple[Array, Array, Array, Array]:
    """Amounts after ``days`` and the time integrals of the amounts.

    All arrays broadcast to (M, ions): amounts [mmol], rates [1/d], sources [mmol/d].
    Returns (x0, x1) at the end [mmol] and (integral x0, integral x1) [mmol d].

    >>> one, zero = np.ones((1, 1)), np.zeros((1, 1))
    >>> end0, end1, _, _ = two_volumes(8 * one, zero, one, one, one, one, zero, zero, 50.0)
    >>> round(float(end0[0, 0]), 6), round(float(end1[0, 0]), 6)
    (4.0, 4.0)
    """
    half_sum, half_difference = 0.5 * (p + w), 0.5 * (p - w)
    root = np.maximum(np.sqrt(half_difference * half_difference + q * r), _TWIN * half_sum + 1e-30)
    fast = -(half_sum + root) * days
    slow = -(p * w - q * r) / np.maximum(half_sum + root, 1e-30) * days
    apart = 1.0 / (2.0 * root)
    lean0, lean1 = root - half_difference, root + half_difference
    grow_slow, grow_fast = np.exp(slow), np.exp(fast)
    mean_slow, mean_fast = _phi1(slow), _phi1(fast)
    ramp_slow, ramp_fast = _phi2(slow, mean_slow), _phi2(fast, mean_fast)

    def apply(f_slow: Array, f_fast: Array, y0: Array, y1: Array) -> tuple[Array, Array]:
        d = (f_slow - f_fast) * apart
        f00 = (f_slow * lean0 + f_fast * lean1) * apart
        f11 = (f_slow * lean1 + f_fast * lean0) * apart
        return f00 * y0 + d * q * y1, d * r * y0 + f11 * y1

    end0, end1 = apply(grow_slow, grow_fast, x0, x1)
    from0, from1 = apply(mean_slow, mean_fast, s0 * days, s1 * days)
    stay0, stay1 = apply(mean_slow * days, mean_fast * days, x0, x1)
    come0, come1 = apply(ramp_slow * days, ramp_fast * days, s0 * days, s1 * days)
    return end0 + from0, end1 + from1, stay0 + come0, stay1 + come1


def _phi1(z: Array) -> Array:
    """(e^z - 1) / z, 1 at 0."""
    safe = np.where(z == 0.0, 1.0, z)
    return np.where(z == 0.0, 1.0, np.expm1(safe) / safe)


def _phi2(z: Array, phi1: Array) -> Array:
    """(phi1(z) - 1) / z, by its series near 0 where the difference would cancel."""
    near = np.abs(z) < _SMALL
    series = 0.5 + z * (1 / 6 + z * (1 / 24 + z * (1 / 120 + z / 720)))
    return np.where(near, series, (phi1 - 1.0) / np.where(near, 1.0, z))
