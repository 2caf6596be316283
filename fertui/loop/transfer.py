"""Exact solution of two volumes that exchange water and lose some of it, for every member and ion at once.

    x0' = -p x0 + q x1 + s0          x1' = r x0 - w x1 + s1

x0, x1 [mmol] in store and root zone; rates p >= r, w >= q [1/d]; sources s [mmol/d]. The matrix has two real
eigenvalues, so any function of it is a combination of its values at both: no iteration, and with non-negative rates
and sources no amount can become negative.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from fertui.chemistry.ions import Array

_SMALL = 0.02
_TWIN = 1e-7
_FAR = 0.9999
"""Rates further apart than that, in units of the root, lose digits in their difference to it."""
_TINY = 1e-30
_NONE: Array = np.zeros((1, 10))

Pair = tuple[Array, Array]


class Response(NamedTuple):
    """A function of the matrix: what store and root zone gain (first index) from store and root zone (second)."""

    f00: Array
    f01: Array
    f10: Array
    f11: Array
    alone: bool = False
    """There is no store: only ``f11`` acts."""

    def __call__(self, x: Pair) -> Pair:
        if self.alone:
            return x[0], self.f11 * x[1]
        return self.f00 * x[0] + self.f01 * x[1], self.f10 * x[0] + self.f11 * x[1]


class Transfer(NamedTuple):
    """A stretch of time: ``kept`` of amounts at its start [-], ``gained`` per source rate [d], ``ramp`` [d2].

    Amounts at the end are kept(x) + gained(s); their integrals over the stretch [mmol d] gained(x) + ramp(s).
    """

    days: float
    kept: Response
    gained: Response
    ramp: Response

    def end(self, x: Pair, s: Pair) -> Pair:
        """Amounts [mmol] at the end of the stretch."""
        return _sum(self.kept(x), self.gained(s))

    def integral(self, x: Pair, s: Pair) -> Pair:
        """Integrals of the amounts over the stretch [mmol d]."""
        return _sum(self.gained(x), self.ramp(s))


def transfer(p: Array, q: Array, r: Array, w: Array, days: float) -> Transfer:
    """Exact transfer over ``days`` [d] for rates [1/d] that broadcast to (M, ions).

    >>> one = np.ones((1, 1))
    >>> end = transfer(one, one, one, one, 50.0).end((8 * one, 0 * one), (0 * one, 0 * one))
    >>> round(float(end[0][0, 0]), 6), round(float(end[1][0, 0]), 6)
    (4.0, 4.0)
    """
    half_sum, half_difference = 0.5 * (p + w), 0.5 * (p - w)
    product = q * r
    root = np.maximum(np.sqrt(half_difference * half_difference + product), _TWIN * half_sum + _TINY)
    fast = -(half_sum + root) * days
    slow = (q * r - p * w) / (half_sum + root) * days
    twist = (*_weights(half_difference, root, product), 0.5 / root, q, r)
    kept = _response(np.exp(slow), np.exp(fast), *twist)
    mean_slow, mean_fast = _phi1(slow), _phi1(fast)
    gained = _response(days * mean_slow, days * mean_fast, *twist)
    square = days * days
    ramp = _response(square * _phi2(slow, mean_slow), square * _phi2(fast, mean_fast), *twist)
    return Transfer(days, kept, gained, ramp)


def alone(w: Array, days: float) -> Transfer:
    """Exact transfer where all water is one volume: losses at rates ``w`` (M, ions) [1/d] over ``days`` [d]."""
    z = -w * days
    mean = _phi1(z)
    return Transfer(days, _single(np.exp(z)), _single(days * mean), _single(days * days * _phi2(z, mean)))


def half_implicit(p: Array, q: Array, r: Array, w: Array, days: float) -> Response:
    """Implicit Euler step [d] at rates [1/d]: first order, positive, cheap; end = response(x + days s)."""
    a, b = 1.0 + days * p, 1.0 + days * w
    scale = 1.0 / (a * b - days * days * q * r)
    return Response(b * scale, days * q * scale, days * r * scale, a * scale)


def implicit_alone(w: Array, days: float) -> Response:
    """``half_implicit`` where all water is one volume."""
    return _single(1.0 / (1.0 + days * w))


def _single(f11: Array) -> Response:
    return Response(_NONE, _NONE, _NONE, f11, alone=True)


def _response(at_slow: Array, at_fast: Array, slow0: Array, slow1: Array, apart: Array, q: Array, r: Array) -> Response:
    between = at_slow - at_fast
    cross = between * apart
    return Response(at_fast + between * slow0, cross * q, cross * r, at_fast + between * slow1)


def _weights(half_difference: Array, root: Array, product: Array) -> Pair:
    """Part of store and of root zone that moves with the slow eigenvalue; they add up to 1.

    The smaller, (root - apart) / (2 root), loses its digits where a dry volume, which passes on within seconds what
    enters it, sets the two rates a million times apart; there it is written without that difference.
    """
    shift = half_difference * (0.5 / root)
    store, root_zone = 0.5 - shift, 0.5 + shift
    apart = np.abs(half_difference)
    far = apart > _FAR * root
    if far.any():
        smaller = 0.5 * product / (root * (root + apart))
        store = np.where(far & (half_difference > 0.0), smaller, store)
        root_zone = np.where(far & (half_difference < 0.0), smaller, root_zone)
    return store, root_zone


def _sum(a: Pair, b: Pair) -> Pair:
    return a[0] + b[0], a[1] + b[1]


def _phi1(z: Array) -> Array:
    """(e^z - 1) / z for z <= 0, 1 at 0."""
    away = np.minimum(z, -_TINY)
    return np.expm1(away) / away


def _phi2(z: Array, phi1: Array) -> Array:
    """(phi1(z) - 1) / z, by its series near 0 where the difference would cancel."""
    near = z > -_SMALL
    series = 0.5 + z * (1 / 6 + z * (1 / 24 + z * (1 / 120 + z / 720)))
    return np.where(near, series, (phi1 - 1.0) / np.where(near, 1.0, z))
