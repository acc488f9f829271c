"""Chebyshev series: their points, their coefficients, and their values at many places.

References
----------
Trefethen, L.N. (2013), Approximation Theory and Approximation Practice, chapters 3, 4 and 19.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from desk.book.arrays import FloatArray

__all__ = ["chebyshev_points", "check_polynomials", "fill_series", "fill_tensor", "to_coefficients"]

# Coefficients of a series that may be turned into powers.
_SHORT = 14
# Where a fit is compared with the sum: both ends and points that are no Chebyshev points of a usual degree.
_CHECKS = np.array([-1.0, -0.713, 0.127, 1.0])


@lru_cache(maxsize=256)
def chebyshev_points(count: int) -> FloatArray:
    """The `count` Chebyshev points, and after them the points of the check."""
    return np.concatenate([np.cos(np.pi * (np.arange(count) + 0.5) / count), _CHECKS])


@lru_cache(maxsize=256)
def check_polynomials(count: int) -> FloatArray:
    """The first `count` Chebyshev polynomials at the points of the check, shape (count, points)."""
    return np.asarray(np.cos(np.outer(np.arange(count), np.arccos(_CHECKS))))


@lru_cache(maxsize=256)
def _to_powers(count: int) -> FloatArray:
    """The matrix from `count` Chebyshev coefficients to those of 1, y, y², ..."""
    matrix = np.zeros((count, count))
    for order in range(count):
        unit = np.zeros(order + 1)
        unit[order] = 1.0
        matrix[: order + 1, order] = np.polynomial.chebyshev.cheb2poly(unit)
    return matrix


@lru_cache(maxsize=256)
def to_coefficients(count: int) -> FloatArray:
    """The matrix from values at `chebyshev_points` to Chebyshev coefficients."""
    order = np.arange(count)
    matrix = 2.0 / count * np.cos(np.pi * np.outer(order, order + 0.5) / count)
    matrix[0] *= 0.5
    return np.asarray(matrix)


def fill_series(coefficient: FloatArray, place: FloatArray, out: FloatArray) -> None:
    """A Chebyshev series at `place`.

    A short series is turned into powers and takes Horner's rule, two operations a degree: the turn costs a
    factor of ``2ᵈ⁻¹`` in rounding, which is small for it. A longer one takes Clenshaw's recurrence
    ``bₖ = cₖ + 2y bₖ₊₁ - bₖ₊₂``, three operations a degree.
    """
    if coefficient.size <= _SHORT:
        powers = (_to_powers(coefficient.size) @ coefficient).tolist()
        if len(powers) == 1:
            out.fill(powers[0])
            return
        np.multiply(place, powers[-1], out=out)
        out += powers[-2]
        for value in powers[-3::-1]:
            out *= place
            out += value
        return
    values = coefficient.tolist()
    doubled = 2.0 * place
    last, product = np.empty_like(out), np.empty_like(out)
    now = doubled * values[-1]
    now += values[-2]
    last.fill(values[-1])
    for value in values[-3:0:-1]:
        np.multiply(doubled, now, out=product)
        np.subtract(product, last, out=last)
        last += value
        now, last = last, now
    np.multiply(place, now, out=product)
    product -= last
    np.add(product, values[0], out=out)


def fill_tensor(coefficient: FloatArray, place: FloatArray, out: FloatArray) -> None:
    """A tensor Chebyshev series: Clenshaw's recurrence over rows, each row a series in the second factor."""
    doubled = 2.0 * place[0]
    now, last, row, product = np.zeros_like(out), np.zeros_like(out), np.empty_like(out), np.empty_like(out)
    for number in range(len(coefficient) - 1, -1, -1):
        used = np.flatnonzero(coefficient[number])
        np.multiply(doubled if number else place[0], now, out=product)
        np.subtract(product, last, out=last)
        if used.size:
            fill_series(coefficient[number, : used[-1] + 1], place[1], row)
            last += row
        now, last = last, now
    out[:] = now
