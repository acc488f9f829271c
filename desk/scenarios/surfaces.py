"""The value of later flows as a smooth function of the state, fitted once and evaluated for every path.

In an affine model a set of flows seen from a node is worth ``Σ wₖ exp(-exposureₖ · x)``. With one or two
factors this is fitted by Chebyshev polynomials over the range of the states, so that the cost of a path does
not grow with the number of flows; few flows, more factors, and states outside the range are summed directly.

References
----------
Trefethen, L.N. (2013), Approximation Theory and Approximation Practice, chapters 3 and 4 (interpolation at
Chebyshev points), 8 (geometric convergence) and 19 (Clenshaw's recurrence).
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike

from desk.book.arrays import FloatArray
from desk.rates.short_rate import ShortRateModel

__all__ = ["Surface", "fit_surface", "flow_surfaces"]

# Most columns worked on at a time: four arrays of them stay in a core's own cache.
_CHUNK = 12_000
# Flows that cost no more to sum than to fit.
_FEW = 3
# Where the exponents within the range are larger than this, a common exponential is taken out first.
_STEEP = 1.0
_MOST_DEGREE = 160
# Coefficients of a series that may be turned into powers.
_SHORT = 14
# Where a fit is compared with the sum: both ends and points that are no Chebyshev points of a usual degree.
_CHECKS = np.array([-1.0, -0.713, 0.127, 1.0])
_TOLERANCE = 1e-11


@dataclass(frozen=True, eq=False)
class Surface:
    """``V(x) = Σ wₖ exp(-exposureₖ · x)`` ready to be evaluated at many states.

    Attributes
    ----------
    weight : ndarray, shape (k,)
    exposure : ndarray, shape (k, n)
    low, high : ndarray, shape (n,)
        Range of the fit.
    tilt : ndarray, shape (n,)
        ``exp(-tilt · (x - middle))`` is taken out of the function before it is fitted.
    coefficient : ndarray, shape (d + 1,) or (d₁ + 1, d₂ + 1), or None
        Chebyshev coefficients over the range; None where the sum is taken directly.
    error : float
        Largest difference from the direct sum at points between those of the fit, relative to
        ``Σ |wₖ| exp(-exposureₖ · x)``; 0 where the sum is taken directly.
    """

    weight: FloatArray
    exposure: FloatArray
    low: FloatArray
    high: FloatArray
    tilt: FloatArray
    coefficient: FloatArray | None
    error: float

    def __call__(self, state: FloatArray) -> FloatArray:
        """Values at states, shape (n, m); shape (m,)."""
        count = state.shape[1]
        result = np.empty(count)
        chunk = -(-count // -(-count // _CHUNK)) if count else 1
        for start in range(0, count, chunk):
            part = slice(start, start + chunk)
            self._fill(state[:, part], result[part])
        return result

    def _fill(self, state: FloatArray, out: FloatArray) -> None:
        if self.coefficient is None:
            _direct(self.weight, self.exposure, state, out)
            return
        place = np.empty_like(state)
        for row, (lowest, highest) in enumerate(zip(self.low.tolist(), self.high.tolist(), strict=True)):
            np.subtract(state[row], 0.5 * (lowest + highest), out=place[row])
            place[row] *= 2.0 / (highest - lowest)
        if self.coefficient.ndim == 1:
            _series(self.coefficient, place[0], out)
        else:
            _series_2(self.coefficient, place, out)
        if self.tilt.any():
            exponent = np.zeros_like(out)
            for row, slope in enumerate((-0.5 * self.tilt * (self.high - self.low)).tolist()):
                exponent += place[row] * slope
            out *= np.exp(exponent, out=exponent)
        # A hair of slack lets the ends of the range count as inside.
        if place.max() > 1.0 + 1e-12 or place.min() < -1.0 - 1e-12:
            outside = np.flatnonzero(np.any(np.abs(place) > 1.0 + 1e-12, axis=0))
            summed = np.empty(outside.size)
            _direct(self.weight, self.exposure, state[:, outside], summed)
            out[outside] = summed


def flow_surfaces(
    model: ShortRateModel,
    time: ArrayLike,
    maturity: ArrayLike,
    amount: ArrayLike,
    low: ArrayLike,
    high: ArrayLike,
    *,
    tolerance: float = _TOLERANCE,
) -> list[Surface]:
    """The value, at each of several nodes, of the flows due at or after it as a function of the factors.

    Parameters
    ----------
    model : ShortRateModel
    time : array_like, shape (t,)
        The nodes [years].
    maturity, amount : array_like, shape (k,)
        When each flow is due [years] and what it pays.
    low, high : array_like, shape (t, n)
        Range of the factors to be covered at each node.
    tolerance : float
        Relative size at which the tail of the coefficients is cut.
    """
    order = np.argsort(maturity, kind="stable")
    maturities = np.asarray(maturity, dtype=np.float64)[order]
    amounts = np.asarray(amount, dtype=np.float64)[order]
    nodes = np.atleast_1d(np.asarray(time, dtype=np.float64))
    level, exposure = model.bond_terms(nodes[:, None], maturities, past=True)
    weight = amounts * np.exp(level)
    firsts = np.searchsorted(maturities, nodes, side="left").tolist()
    return [
        fit_surface(weight[row, first:], exposure[row, first:], lowest, highest, tolerance=tolerance)
        for row, (first, lowest, highest) in enumerate(
            zip(firsts, np.asarray(low, dtype=np.float64), np.asarray(high, dtype=np.float64), strict=True)
        )
    ]


def fit_surface(
    weight: ArrayLike, exposure: ArrayLike, low: ArrayLike, high: ArrayLike, *, tolerance: float = _TOLERANCE
) -> Surface:
    """Fit ``Σ wₖ exp(-exposureₖ · x)`` over a range of states.

    The degree is as high as it takes for the coefficients left out to be below `tolerance` times the smallest
    gross value ``Σ |wₖ| exp(-exposureₖ · x)`` in the range, so that the accuracy is relative everywhere.

    Parameters
    ----------
    weight : array_like, shape (k,)
    exposure : array_like, shape (k, n)
    low, high : array_like, shape (n,)
    tolerance : float
    """
    weights = np.asarray(weight, dtype=np.float64)
    exposures = np.asarray(exposure, dtype=np.float64)
    lowest, highest = np.asarray(low, dtype=np.float64), np.asarray(high, dtype=np.float64)
    middle = 0.5 * (lowest + highest)
    # A range of no width would divide by nothing.
    half = np.maximum(0.5 * (highest - lowest), 1e-12 + 1e-9 * np.abs(middle))
    low_end, high_end = middle - half, middle + half
    direct = Surface(weights, exposures, low_end, high_end, np.zeros(half.size), None, 0.0)
    if weights.size <= _FEW or half.size > 2:
        return direct
    with np.errstate(over="ignore", invalid="ignore", under="ignore"):
        scaled = weights * np.exp(-(exposures @ middle))
        gross = float(np.abs(scaled).sum())
    if not (0.0 < gross < math.inf and math.isfinite(half.sum())):
        return direct
    tilt = direct.tilt
    if float((exposures @ half).max()) > _STEEP:
        tilt = np.abs(scaled) @ exposures / gross
    slopes = (exposures - tilt) * half
    degrees = [_degree(float(steepest), tolerance) for steepest in np.abs(slopes).max(axis=0)]
    if max(degrees) > _MOST_DEGREE or math.prod(degree + 1 for degree in degrees) > 4 * weights.size:
        return direct
    coefficient, error = _fit(scaled, slopes, degrees, tolerance)
    return Surface(weights, exposures, low_end, high_end, tilt, coefficient, error)


def _degree(slope: float, tolerance: float) -> int:
    """Degree beyond which the Chebyshev series of ``exp(slope · y)`` is below `tolerance` of its least value.

    The coefficients are ``2 Iₙ(slope) <= 2 (slope/2)ⁿ e^slope/n!`` (NIST Digital Library of Mathematical
    Functions, 10.14.4 at an imaginary argument, and 10.35.1), and the least value is ``e^-slope``.
    """
    if slope > 50.0:
        return _MOST_DEGREE + 1
    degree, term = 0, 2.0 * math.exp(2.0 * slope)
    while term > 0.1 * tolerance and degree <= _MOST_DEGREE:
        degree += 1
        term *= 0.5 * slope / degree
    return degree


def _fit(
    scaled: FloatArray, slopes: FloatArray, degrees: list[int], tolerance: float
) -> tuple[FloatArray, float]:
    """Coefficients through the Chebyshev points, trimmed, and their error at some points between."""
    counts = [degree + 1 for degree in degrees]
    # dimensions: factor by (flows, points); the points of the fit first, then those of the check.
    powers = [
        np.exp(-column[:, None] * _points(count)) for column, count in zip(slopes.T, counts, strict=True)
    ]
    sizes = np.abs(scaled)
    if len(counts) == 1:
        values, gross = np.stack([scaled, sizes]) @ powers[0]
        coefficient = _cosines(counts[0]) @ values[: counts[0]]
        between = values[counts[0] :]
    else:
        left = powers[0].T
        values, gross = (left * scaled) @ powers[1], (left * sizes) @ powers[1]
        coefficient = _cosines(counts[0]) @ values[: counts[0], : counts[1]] @ _cosines(counts[1]).T
        between = values[counts[0] :, counts[1] :]
    limit = 0.1 * tolerance * float(gross.min())
    size = np.abs(coefficient)
    if len(counts) == 1:
        # The tail left out adds up to less than the limit.
        kept = max(1, int(np.count_nonzero(size[::-1].cumsum() >= limit)))
        coefficient = coefficient[:kept]
        error = (coefficient @ _polynomials(kept) - between) / gross[counts[0] :]
    else:
        coefficient = np.where(size < limit / size.size, 0.0, coefficient)
        evaluated = _polynomials(counts[0]).T @ coefficient @ _polynomials(counts[1])
        error = (evaluated - between) / gross[counts[0] :, counts[1] :]
    return coefficient, float(np.abs(error).max())


@lru_cache(maxsize=256)
def _points(count: int) -> FloatArray:
    """The `count` Chebyshev points, and after them the points of the check."""
    return np.concatenate([np.cos(np.pi * (np.arange(count) + 0.5) / count), _CHECKS])


@lru_cache(maxsize=256)
def _polynomials(count: int) -> FloatArray:
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
def _cosines(count: int) -> FloatArray:
    """The matrix from values at `_roots` to Chebyshev coefficients."""
    order = np.arange(count)
    matrix = 2.0 / count * np.cos(np.pi * np.outer(order, order + 0.5) / count)
    matrix[0] *= 0.5
    return np.asarray(matrix)


def _direct(weight: FloatArray, exposure: FloatArray, state: FloatArray, out: FloatArray) -> None:
    """``Σ wₖ exp(-exposureₖ · x)`` flow by flow."""
    out.fill(0.0)
    term, part = np.empty_like(out), np.empty_like(out)
    for one_weight, row in zip(weight.tolist(), exposure.tolist(), strict=True):
        if not any(row):
            out += one_weight
            continue
        np.multiply(state[0], -row[0], out=term)
        for factor in range(1, len(row)):
            np.multiply(state[factor], -row[factor], out=part)
            term += part
        np.exp(term, out=term)
        term *= one_weight
        out += term


def _series(coefficient: FloatArray, place: FloatArray, out: FloatArray) -> None:
    """A Chebyshev series at `place`.

    A short series is turned into powers and takes Horner's rule, two operations a degree: the turn costs a
    factor of ``2ᵈ⁻¹`` in rounding, which is small for it. A longer one takes Clenshaw's recurrence
    ``bₖ = cₖ + 2y bₖ₊₁ - bₖ₊₂``, three operations a degree.
    """
    if coefficient.size <= _SHORT:
        powers = (_to_powers(coefficient.size) @ coefficient).tolist()
        out.fill(powers[-1])
        for value in powers[-2::-1]:
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


def _series_2(coefficient: FloatArray, place: FloatArray, out: FloatArray) -> None:
    """A tensor Chebyshev series: Clenshaw's recurrence over rows, each row a series in the second factor."""
    doubled = 2.0 * place[0]
    now, last, row, product = np.zeros_like(out), np.zeros_like(out), np.empty_like(out), np.empty_like(out)
    for number in range(len(coefficient) - 1, -1, -1):
        used = np.flatnonzero(coefficient[number])
        np.multiply(doubled if number else place[0], now, out=product)
        np.subtract(product, last, out=last)
        if used.size:
            _series(coefficient[number, : used[-1] + 1], place[1], row)
            last += row
        now, last = last, now
    out[:] = now
