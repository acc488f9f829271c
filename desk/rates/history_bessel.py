"""Logarithm of the modified Bessel function, as the density of a square-root model needs it."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["log_bessel_less_argument"]

FloatArray = NDArray[np.float64]

_TERMS = 8
# From this radius on the first term left out of the expansion is below 1e-13.
_LARGE_RADIUS = 40.0
_SMALL = 1e-7


def _expansion(terms: int) -> list[FloatArray]:
    """Polynomials ``U_k(t)/t^k`` in ``t²``, rising powers, k = 0 ... terms.

    ``U_{k+1}(t) = ½t²(1-t²) U_k'(t) + ⅛ ∫₀ᵗ (1-5s²) U_k(s) ds``: NIST Digital Library of Mathematical
    Functions, 10.41.9.
    """
    from numpy.polynomial import Polynomial

    found = [Polynomial([1.0])]
    for _ in range(terms):
        last = found[-1]
        found.append(
            Polynomial([0.0, 0.0, 0.5, 0.0, -0.5]) * last.deriv()
            + 0.125 * (Polynomial([1.0, 0.0, -5.0]) * last).integ()
        )
    return [np.ascontiguousarray(entry.coef[order::2]) for order, entry in enumerate(found)]


_POLYNOMIALS = _expansion(_TERMS)


def log_bessel_less_argument(order: float, argument: ArrayLike) -> FloatArray:
    """``ln I_ν(z) - z`` for z > 0 and ν > -1, also where the function itself would not fit a float.

    Parameters
    ----------
    order : float
        ν.
    argument : array_like, any shape
        z.

    Notes
    -----
    With ``ρ = √(ν² + z²)`` the expansion of Debye is a series in 1/ρ whatever ν is (NIST Digital Library of
    Mathematical Functions, 10.41.3), so one formula serves where ρ is large. Elsewhere it is scipy's scaled
    function, and its power series where that would be too small for a float. For ν below 0 what the
    expansion leaves out falls as ``e^{-2z}``.
    """
    from scipy.special import gammaln, ive

    z = np.asarray(argument, dtype=np.float64)
    flat = z.reshape(-1)
    radius = np.hypot(order, flat)
    large = radius >= _LARGE_RADIUS
    if large.all():
        return _by_expansion(order, flat, radius).reshape(z.shape)
    result = np.empty(flat.size)
    result[large] = _by_expansion(order, flat[large], radius[large])
    small = ~large & (flat**2 < 4.0 * _SMALL * (order + 1.0))
    near = flat[small]
    quarter = 0.25 * near**2 / (order + 1.0)
    result[small] = order * np.log(0.5 * near) - gammaln(order + 1.0) + np.log1p(quarter) - near
    middle = ~large & ~small
    result[middle] = np.log(ive(order, flat[middle]))
    return result.reshape(z.shape)


def _by_expansion(order: float, z: FloatArray, radius: FloatArray) -> FloatArray:
    inverse = 1.0 / radius
    square = (order * inverse) ** 2
    total = np.zeros(z.size)
    for coefficients in reversed(_POLYNOMIALS):
        value = np.full(z.size, coefficients[-1])
        for coefficient in coefficients[-2::-1]:
            value *= square
            value += coefficient
        total *= inverse
        total += value
    # ρ - z = ν²/(ρ + z), without cancellation; ln(z/(ν + ρ)) is -asinh(ν/z).
    return np.asarray(
        order**2 / (radius + z)
        - order * np.arcsinh(order / z)
        - 0.5 * np.log(2.0 * np.pi * radius)
        + np.log(total)
    )
