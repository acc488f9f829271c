"""Integrals of decaying exponentials, right to rounding at every speed of reversion, 0 included.

Short-rate models are written in these four integrals. Their textbook forms divide by the speed and lose
all digits as it goes to 0. Here small arguments take Gauss-Legendre quadrature of the integrand, which is
positive and entire, so nothing cancels, and large arguments take forms arranged so that nothing cancels.

With ``B(a, s) = (1 - exp(-a s)) / a``:

==================== =============================
`first_integral`     ``∫₀ᵗ exp(-a s) ds = B(a, t)``
`second_integral`    ``∫₀ᵗ B(a, s) ds``
`mixed_integral`     ``∫₀ᵗ exp(-a s) B(b, s) ds``
`product_integral`   ``∫₀ᵗ B(a, s) B(b, s) ds``
==================== =============================
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["first_integral", "mixed_integral", "product_integral", "second_integral"]

FloatArray = NDArray[np.float64]

# Eight points integrate exp(z u) over u in [0, 1] to rounding for |z| up to 2, which is all they are given.
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(8)
_NODES = 0.5 * (_NODES + 1.0)
_WEIGHTS = 0.5 * _WEIGHTS
_PART = 4096


def first_integral(speed: float, time: ArrayLike) -> FloatArray:
    """``∫₀ᵗ exp(-a s) ds``.

    Parameters
    ----------
    speed : float
        a [1/year], any sign.
    time : array_like, any shape
        t [years].

    Returns
    -------
    ndarray, the shape of `time`
        [years].
    """
    return _in_parts(lambda years: years * _phi_1(np.asarray(speed * years)), time)


def second_integral(speed: float, time: ArrayLike) -> FloatArray:
    """``∫₀ᵗ (1 - exp(-a s))/a ds``, which is ``(t - B(a, t))/a``.

    Parameters and shapes as in `first_integral`; the result is in years squared.
    """
    return _in_parts(lambda years: years**2 * _phi_2(np.asarray(speed * years)), time)


def mixed_integral(speed: float, other_speed: float, time: ArrayLike) -> FloatArray:
    """``∫₀ᵗ exp(-a s) (1 - exp(-b s))/b ds`` for speeds a and b, neither negative [years squared]."""
    return _in_parts(lambda years: _mixed(speed, other_speed, years), time)


def _mixed(speed: float, other_speed: float, years: FloatArray) -> FloatArray:
    p, q = np.asarray(speed * years), np.asarray(other_speed * years)
    near = p + q < 2.0
    with np.errstate(under="ignore"):
        # phi_1(p) - phi_1(p + q) over q, where q is not small ...
        far_q = (_phi_1(p) - _phi_1(np.asarray(p + q))) / np.where(q > 0.0, q, 1.0)
        # ... and the same arranged for a small q, where p is not small.
        total = np.where(near, 1.0, p * (p + q))
        far_p = (-np.expm1(-p) - p * np.exp(-p) * _phi_1(q)) / np.where(total > 0.0, total, 1.0)
    shape = np.asarray(np.where(p >= 1.0, far_p, far_q))
    close, others = p[near][:, None] * _NODES, q[near][:, None] * _NODES
    shape[near] = (np.exp(-close) * _phi_1(others) * _NODES) @ _WEIGHTS
    return np.asarray(years**2 * shape)


def product_integral(speed: float, other_speed: float, time: ArrayLike) -> FloatArray:
    """``∫₀ᵗ (1 - exp(-a s))/a · (1 - exp(-b s))/b ds`` for speeds a and b, neither negative [years cubed]."""
    return _in_parts(lambda years: _product(speed, other_speed, years), time)


def _product(speed: float, other_speed: float, years: FloatArray) -> FloatArray:
    if speed == other_speed == 0.0:
        return np.asarray(years**3 / 3.0)
    p = np.asarray(min(speed, other_speed) * years)
    q = np.asarray(max(speed, other_speed) * years)
    # Where no time has passed there is nothing to work out.
    near = (q < 0.5) & (years != 0.0)
    large = np.where(q < 0.5, 1.0, q)
    with np.errstate(under="ignore"):
        gone = 1.0 - np.exp(-large)
        if speed == other_speed:
            shape = np.asarray((large - gone - 0.5 * gone**2) / (large * large * large))
        else:
            taken = (gone - large * (1.0 - gone) * _phi_1(p)) / (large * (p + large))
            shape = np.asarray((_phi_2(p) - taken) / large)
    close = q[near][:, None] * _NODES
    grown = _phi_1(close)
    other = grown if speed == other_speed else _phi_1(p[near][:, None] * _NODES)
    shape[near] = (grown * other * _NODES**2) @ _WEIGHTS
    return np.asarray(shape * years * years * years)


def _in_parts(formula: Callable[[FloatArray], FloatArray], time: ArrayLike) -> FloatArray:
    """A formula applied to a few thousand times at a time: its intermediate arrays stay in the cache."""
    years = np.asarray(time, dtype=np.float64)
    if years.size <= _PART:
        return np.asarray(formula(years))
    flat, result = years.reshape(-1), np.empty(years.size)
    for start in range(0, flat.size, _PART):
        part = slice(start, start + _PART)
        result[part] = formula(flat[part])
    return result.reshape(years.shape)


def _phi_1(z: FloatArray) -> FloatArray:
    """``(1 - exp(-z))/z``, 1 at z = 0."""
    zero = z == 0.0
    if not np.any(zero):
        return np.asarray(np.expm1(-z) / -z)
    safe = np.where(zero, 1.0, z)
    return np.asarray(np.where(zero, 1.0, np.expm1(-safe) / -safe))


def _phi_2(z: FloatArray) -> FloatArray:
    """``(z - 1 + exp(-z))/z²``, 1/2 at z = 0."""
    near = np.abs(z) < 1.0
    large = np.where(near, 1.0, z)
    shape = np.asarray((1.0 + np.expm1(-large) / large) / large)
    shape[near] = (np.exp(-z[near][:, None] * _NODES) * (1.0 - _NODES)) @ _WEIGHTS
    return shape
