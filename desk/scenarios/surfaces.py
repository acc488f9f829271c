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

import numpy as np
from numpy.typing import ArrayLike

from desk.book.arrays import FloatArray
from desk.rates.short_rate import ShortRateModel
from desk.scenarios.chebyshev import (
    chebyshev_points,
    check_polynomials,
    fill_series,
    fill_tensor,
    to_coefficients,
)

__all__ = ["Surface", "fit_surface", "flow_surfaces", "series_degree"]

# Most columns worked on at a time: four arrays of them stay in a core's own cache.
_CHUNK = 12_000
# Flows that cost no more to sum than to fit.
_FEW = 3
# Where the exponents within the range are larger than this, a common exponential is taken out first.
_STEEP = 1.0
_MOST_DEGREE = 160
# Numbers of the table of exponentials that a fit works on at a time.
_TABLE = 32_768
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

    def __call__(self, state: FloatArray, out: FloatArray | None = None) -> FloatArray:
        """Values at states, shape (n, m), as an array of shape (m,): `out`, where it is given."""
        count = state.shape[1]
        result = np.empty(count) if out is None else out
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
            fill_series(self.coefficient, place[0], out)
        else:
            fill_tensor(self.coefficient, place, out)
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
    lowest, highest = np.asarray(low, dtype=np.float64), np.asarray(high, dtype=np.float64)
    if exposure.shape[-1] == 1 and maturities.size > _FEW:
        weight[maturities < nodes[:, None]] = 0.0
        return _fit_nodes(weight, exposure[:, :, 0], lowest[:, 0], highest[:, 0], firsts, tolerance)
    return [
        fit_surface(
            weight[row, first:], exposure[row, first:], lowest[row], highest[row], tolerance=tolerance
        )
        for row, first in enumerate(firsts)
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
    if weights.size > _FEW and lowest.size == 1:
        (surface,) = _fit_nodes(weights[None], exposures.T, lowest, highest, [0], tolerance)
        return surface
    if weights.size > _FEW and lowest.size == 2:
        return _fit_two_factors(weights, exposures, lowest, highest, tolerance)
    return _summed(weights, exposures, *_widened(lowest, highest))


def _summed(weight: FloatArray, exposure: FloatArray, low: FloatArray, high: FloatArray) -> Surface:
    """A surface that is not fitted."""
    return Surface(weight, exposure, low, high, np.zeros(low.size), None, 0.0)


def _widened(low: FloatArray, high: FloatArray) -> tuple[FloatArray, FloatArray]:
    """The range with no part of it too narrow to divide by."""
    middle = 0.5 * (low + high)
    half = np.maximum(0.5 * (high - low), 1e-12 + 1e-9 * np.abs(middle))
    return middle - half, middle + half


def _fit_nodes(
    weight: FloatArray,
    exposure: FloatArray,
    low: FloatArray,
    high: FloatArray,
    firsts: list[int],
    tolerance: float,
) -> list[Surface]:
    """One-factor surfaces of several nodes at once; arrays of shapes (t, k) and (t,).

    Node number row takes the flows from ``firsts[row]`` on; those before have no weight.
    """
    low, high = _widened(low, high)
    middle, half = 0.5 * (low + high), 0.5 * (high - low)
    with np.errstate(over="ignore", invalid="ignore", under="ignore", divide="ignore"):
        scaled = weight * np.exp(-exposure * middle[:, None])
        sizes = np.abs(scaled)
        gross = sizes.sum(axis=1)
        usable = np.isfinite(gross) & np.isfinite(half) & (gross > 0.0)
        steep = usable & (exposure.max(axis=1) * half > _STEEP)
        tilt = np.where(steep, (sizes * exposure).sum(axis=1) / gross, 0.0)
        slopes = (exposure - tilt[:, None]) * -half[:, None]
        steepest = np.abs(slopes).max(axis=1).tolist()
    degrees = []
    for row, slope in enumerate(steepest):
        degree = series_degree(slope, tolerance) if usable[row] else 0
        flows = weight.shape[1] - firsts[row]
        degrees.append(degree if flows > _FEW and degree < min(_MOST_DEGREE, 4 * flows) else 0)
    fitted = [row for row, degree in enumerate(degrees) if degree]
    coefficients: dict[int, tuple[FloatArray, float]] = {}
    if fitted:
        part = slice(None) if len(fitted) == len(degrees) else fitted
        found = _series_of(scaled[part], sizes[part], slopes[part], max(degrees), tolerance)
        coefficients = dict(zip(fitted, found, strict=True))
    surfaces = []
    for row, first in enumerate(firsts):
        coefficient, error = coefficients.get(row, (None, 0.0))
        one = slice(row, row + 1)
        surfaces.append(
            Surface(
                weight[row, first:],
                exposure[row, first:, None],
                low[one],
                high[one],
                tilt[one],
                coefficient,
                error,
            )
        )
    return surfaces


def _series_of(
    scaled: FloatArray, sizes: FloatArray, slopes: FloatArray, degree: int, tolerance: float
) -> list[tuple[FloatArray, float]]:
    """Coefficients of ``Σ scaledₖ exp(slopeₖ y)``, trimmed, and their error between the points of the fit."""
    count = degree + 1
    points = chebyshev_points(count)
    values = np.empty((len(scaled), points.size))
    # Where all flows have one sign there is no difference.
    gross = values if scaled.min() >= 0.0 else np.empty_like(values)
    group = max(1, _TABLE // slopes.size)
    for start in range(0, points.size, group):
        columns = slice(start, start + group)
        # dimensions: points by nodes by flows
        table = points[columns, None, None] * slopes
        np.exp(table, out=table)
        np.einsum("ptk,tk->tp", table, scaled, out=values[:, columns])
        if gross is not values:
            np.einsum("ptk,tk->tp", table, sizes, out=gross[:, columns])
    coefficients = values[:, :count] @ to_coefficients(count).T
    # The tail left out of a node's series adds up to less than its limit.
    limits = tolerance * gross.min(axis=1)
    tails = np.abs(coefficients)[:, ::-1].cumsum(axis=1)
    kept = np.maximum(np.count_nonzero(tails >= limits[:, None], axis=1), 1)
    coefficients[np.arange(count) >= kept[:, None]] = 0.0
    errors = np.abs(coefficients @ check_polynomials(count) - values[:, count:]) / gross[:, count:]
    worst = errors.max(axis=1).tolist()
    return [
        (row[:length], error) for row, length, error in zip(coefficients, kept.tolist(), worst, strict=True)
    ]


def _fit_two_factors(
    weight: FloatArray, exposure: FloatArray, low: FloatArray, high: FloatArray, tolerance: float
) -> Surface:
    """A surface of two factors, by a tensor of Chebyshev polynomials."""
    low, high = _widened(low, high)
    middle, half = 0.5 * (low + high), 0.5 * (high - low)
    direct = _summed(weight, exposure, low, high)
    with np.errstate(over="ignore", invalid="ignore", under="ignore"):
        scaled = weight * np.exp(-(exposure @ middle))
        sizes = np.abs(scaled)
        gross = float(sizes.sum())
    if not (0.0 < gross < math.inf and np.isfinite(half).all()):
        return direct
    tilt = np.zeros(2)
    if float((exposure @ half).max()) > _STEEP:
        tilt = sizes @ exposure / gross
    slopes = (exposure - tilt) * -half
    counts = [series_degree(float(steepest), tolerance) + 1 for steepest in np.abs(slopes).max(axis=0)]
    if max(counts) > _MOST_DEGREE or math.prod(counts) > 4 * weight.size:
        return direct
    # dimensions: flows by points, one a factor; the points of the fit first, then those of the check
    one, two = (
        np.exp(column[:, None] * chebyshev_points(count))
        for column, count in zip(slopes.T, counts, strict=True)
    )
    values, grosses = (one.T * scaled) @ two, (one.T * sizes) @ two
    coefficient = to_coefficients(counts[0]) @ values[: counts[0], : counts[1]] @ to_coefficients(counts[1]).T
    small = np.abs(coefficient) < tolerance * float(grosses.min()) / coefficient.size
    coefficient[small] = 0.0
    evaluated = check_polynomials(counts[0]).T @ coefficient @ check_polynomials(counts[1])
    between = values[counts[0] :, counts[1] :]
    error = np.abs(evaluated - between) / grosses[counts[0] :, counts[1] :]
    return Surface(weight, exposure, low, high, tilt, coefficient, float(error.max()))


def series_degree(slope: float, tolerance: float) -> int:
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
