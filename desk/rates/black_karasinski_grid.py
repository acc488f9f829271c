"""Functions of one Gaussian state: on a chain of points that carries them through time, and as fitted series.

References
----------
Trefethen, L.N. and Weideman, J.A.C. (2014), The exponentially convergent trapezoidal rule, SIAM Review 56.
Trefethen, L.N. (2013), Approximation Theory and Approximation Practice, chapters 3 (Chebyshev points) and 8
(convergence for functions that are analytic in a strip). Kress, R. (2014), Linear Integral Equations, chapter
12 (Nyström's interpolation). Chapters from memory.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["StateChain", "StateFunction", "fit_points", "fitted"]

FloatArray = NDArray[np.float64]

# Standard deviations of a step in the distance of two points, at least. By Poisson's summation the
# trapezoidal rule is out by exp(-2π² s²) for the normal density: 2e-16.
_PER_DEVIATION = 1.35
# The largest distance of two points: a value is a bounded function of exp(x), analytic in the strip |Im x| <
# π/2, and the rule is out by exp(-π²/distance) for it: 3e-18.
_MOST_DISTANCE = 0.25
# Standard deviations of a step beyond which its density is left out: less than 1e-19.
_BAND = 9.2
# Coefficients below this part of the largest value are left out of a series.
_TAIL = 1e-13
# Paths evaluated at a time: the arrays of a recurrence stay in a core's own cache.
_CHUNK = 12_000
# Where a fit is compared with the value itself.
_CHECKS = np.array([-0.9713, -0.6127, -0.2391, 0.0871, 0.4409, 0.7613, 0.9871])


class StateChain:
    """Evenly spaced points, 0 among them, and the mean of a function over a step.

    A step takes x to ``decay·x + shift + noise·z`` with z standard normal. The mean is the trapezoidal rule
    against the normal density of the step, which converges exponentially in the distance of the points; every
    row is scaled to add up to 1. What is cut off at the ends stays at the ends: it reaches a state only with
    the chance of going there and back.

    Parameters
    ----------
    low, high : float
        Range that the points cover.
    decay, noise : float
        Of a step; without noise the chain is the one point 0.
    most : int
        Points beyond which no chain is made.

    Raises
    ------
    ValueError
        If it would take more points.
    """

    def __init__(self, low: float, high: float, *, decay: float, noise: float, most: int) -> None:
        self._decay, self._noise = decay, noise
        self._distance = min(noise / _PER_DEVIATION, _MOST_DISTANCE)
        if noise > 0.0:
            below, above = math.ceil(-low / self._distance), math.ceil(high / self._distance)
        else:
            below = above = 0
        self.count = below + above + 1
        if self.count > most:
            raise ValueError(f"{self.count} points would be needed, more than {most}")
        self.start = below
        self.point: FloatArray = np.arange(-below, above + 1).astype(np.float64) * self._distance

    def rows(self, state: FloatArray, *, shift: float = 0.0) -> FloatArray:
        """The matrix from values at the points to means over a step from any states, shape (m, count)."""
        if self._noise == 0.0:
            return np.ones((state.size, 1))
        # States beyond the points count as those at the end.
        mean = np.clip(self._decay * state + shift, self.point[0], self.point[-1])
        density = np.exp(-0.5 * ((self.point - mean[:, None]) / self._noise) ** 2)
        return np.asarray(density / density.sum(axis=1, keepdims=True))

    def bands(self, *, shift: float = 0.0) -> tuple[FloatArray, NDArray[np.intp]]:
        """`rows` at the points without what is negligible: weights and their columns, shape (count, b)."""
        if self._noise == 0.0:
            return np.ones((1, 1)), np.zeros((1, 1), dtype=np.intp)
        mean = np.clip(self._decay * self.point + shift, self.point[0], self.point[-1])
        reach = math.ceil(_BAND * self._noise / self._distance)
        columns = np.rint(mean / self._distance).astype(np.intp)[:, None] + np.arange(-reach, reach + 1)
        columns += self.start
        inside = (columns >= 0) & (columns < self.count)
        columns = np.clip(columns, 0, self.count - 1)
        density = np.exp(-0.5 * ((self.point[columns] - mean[:, None]) / self._noise) ** 2) * inside
        return density / density.sum(axis=1, keepdims=True), columns


def fit_points(low: float, high: float) -> FloatArray:
    """Where a value is wanted for `fitted`: Chebyshev points, and after them those of the check.

    By the strip of `_MOST_DISTANCE` coefficients over a range of half-width X fall by exp(-1.57/X) each: a
    tail of 1e-13 takes 19 X of them.
    """
    half = 0.5 * (high - low)
    count = 24 + math.ceil(20.0 * half)
    places = np.concatenate([np.cos(math.pi * (np.arange(count) + 0.5) / count), _CHECKS])
    return np.asarray(0.5 * (low + high) + half * places)


def fitted(value: FloatArray, low: float, high: float, level: float) -> StateFunction:
    """A function given by its values at `fit_points`."""
    count = value.size - _CHECKS.size
    order = np.arange(count)
    coefficient = 2.0 / count * (np.cos(math.pi * np.outer(order, order + 0.5) / count) @ value[:count])
    coefficient[0] *= 0.5
    size = float(np.abs(value).max())
    tails = np.abs(coefficient)[::-1].cumsum()[::-1]
    kept = max(1, int(np.count_nonzero(tails > _TAIL * size)))
    coefficient = coefficient[:kept].copy()
    coefficient.flags.writeable = False
    difference = np.polynomial.chebyshev.chebval(_CHECKS, coefficient) - value[count:]
    error = float(np.abs(difference).max()) / size if size > 0.0 else 0.0
    return StateFunction(level, low, high, coefficient, error)


@dataclass(frozen=True, eq=False)
class StateFunction:
    """A value as a function of a short rate ``r = exp(level + x)``.

    Attributes
    ----------
    level : float
    low, high : float
        Range of x; beyond it the value at its end is taken.
    coefficient : ndarray, shape (d + 1,), read-only
        Of the Chebyshev series in x over the range.
    error : float
        Largest difference from the value itself at points between those of the fit, as a part of the largest
        value.
    """

    level: float
    low: float
    high: float
    coefficient: FloatArray
    error: float

    def __call__(self, state: FloatArray, out: FloatArray | None = None) -> FloatArray:
        """Values at short rates, shape (1, m) [1/year], as an array of shape (m,): `out` if it is given."""
        count = state.shape[1]
        result = np.empty(count) if out is None else out
        middle, half = self.level + 0.5 * (self.low + self.high), 0.5 * (self.high - self.low)
        for start in range(0, count, _CHUNK):
            part = slice(start, start + _CHUNK)
            place = np.log(state[0, part])
            place -= middle
            place /= half
            np.clip(place, -1.0, 1.0, out=place)
            result[part] = np.polynomial.chebyshev.chebval(place, self.coefficient)
        return result
