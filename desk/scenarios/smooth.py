"""Smooth functions of one factor, and of the rates beside another quantity, fitted once."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from desk.book.arrays import FloatArray
from desk.scenarios.chebyshev import chebyshev_points, check_polynomials, fill_series, to_coefficients
from desk.scenarios.drawn_model import Worth

__all__ = ["JoinedWorth", "Series", "fit_function", "joined_worth"]

_COUNTS = (24, 72, 216)
_TOLERANCE = 1e-12


@dataclass(frozen=True, eq=False)
class Series:
    """A Chebyshev series over a range; beyond it the value at its end counts.

    Attributes
    ----------
    low, high : float
    coefficient : ndarray, shape (d + 1,)
    error : float
        Largest difference from the function at points between those of the fit, as a part of its largest
        value.
    """

    low: float
    high: float
    coefficient: FloatArray
    error: float

    def __call__(self, place: FloatArray) -> FloatArray:
        """Values at places, shape (m,)."""
        out = np.empty_like(place)
        fill_series(self.coefficient, self.scaled(place), out)
        return out

    def scaled(self, place: FloatArray) -> FloatArray:
        """Places as the argument of the polynomials."""
        scaled = place - 0.5 * (self.low + self.high)
        scaled *= 2.0 / (self.high - self.low)
        return np.clip(scaled, -1.0, 1.0, out=scaled)


def fit_function(function: Callable[[FloatArray], FloatArray], low: float, high: float) -> Series:
    """Fit a smooth function of one variable, with as many points as it takes.

    Parameters
    ----------
    function : callable
        Takes places, shape (m,), and gives values of that shape.
    low, high : float
        The range.
    """
    middle = 0.5 * (low + high)
    half = max(0.5 * (high - low), 1e-12 + 1e-9 * abs(middle))
    for count in _COUNTS:
        value = function(middle + half * chebyshev_points(count))
        size = float(np.abs(value).max())
        coefficient = to_coefficients(count) @ value[:count]
        tails = np.abs(coefficient)[::-1].cumsum()[::-1]
        limit = _TOLERANCE * size
        if size == 0.0 or tails[3 * count // 4] <= limit or count == _COUNTS[-1]:
            break
    kept = max(1, int(np.count_nonzero(tails > limit)))
    coefficient = coefficient[:kept]
    between = coefficient @ check_polynomials(kept)
    error = float(np.abs(between - value[count:]).max()) / size if size > 0.0 else 0.0
    return Series(middle - half, middle + half, coefficient, error)


@dataclass(frozen=True, eq=False)
class JoinedWorth:
    """A value as a function of the rates and of one factor more, which comes last in the state.

    Attributes
    ----------
    parts : tuple of Worth, length d + 1
        Functions of the rates.
    low, high : float
        Range of the last factor.
    coefficient : ndarray, shape (d + 1, d + 1)
        From the values of `parts`, which hold at the Chebyshev points of the range, to the coefficients of a
        series in the last factor.
    error : float
        Of the parts and of the series between its points, as a part of the value.
    tilt : float
        ``exp(-tilt · factor)`` is left out of the parts.
    """

    parts: tuple[Worth, ...]
    low: float
    high: float
    coefficient: FloatArray
    error: float
    tilt: float

    def __call__(self, state: FloatArray, out: FloatArray | None = None) -> FloatArray:
        """Values at states, shape (n + 1, m), as an array of shape (m,)."""
        result = np.zeros(state.shape[1]) if out is None else out
        result.fill(0.0)
        rates, place = state[:-1], state[-1] - 0.5 * (self.low + self.high)
        place *= 2.0 / (self.high - self.low)
        np.clip(place, -1.0, 1.0, out=place)
        weight = np.empty_like(place)
        for number, part in enumerate(self.parts):
            # The series that is 1 at this point of the fit and 0 at the others.
            fill_series(self.coefficient[:, number], place, weight)
            weight *= part(rates)
            result += weight
        if self.tilt != 0.0:
            result *= np.exp(-self.tilt * state[-1])
        return result


def joined_worth(
    worth: Callable[[FloatArray], Worth],
    amounts: Callable[[FloatArray], FloatArray],
    *,
    steepest: float,
    low: float,
    high: float,
    degree: Callable[[float, float], int],
    tilt: float = 0.0,
) -> Worth:
    """A value that is a function of the rates at every value of one factor more.

    Parameters
    ----------
    worth : callable
        From the amounts of some flows, shape (k,), to what they are worth as a function of the rates.
    amounts : callable
        From values of the last factor, shape (p,), to amounts, shape (p, k).
    steepest : float
        Largest exponent by which an amount grows over half the range.
    low, high : float
    degree : callable
        From a slope and a tolerance to the degree of the series of an exponential.
    tilt : float
        Of an exponential ``exp(-tilt · factor)`` that is common to all amounts and left out of them.
    """
    middle = 0.5 * (low + high)
    half = max(0.5 * (high - low), 1e-12 + 1e-9 * abs(middle))
    count = min(degree(steepest, _TOLERANCE) if steepest > 0.0 else 0, _COUNTS[-1]) + 1
    found = amounts(middle + half * chebyshev_points(count))
    rows: Sequence[FloatArray] = list(found[:count])
    parts = tuple(worth(row) for row in rows)
    # A value is linear in the amounts: that of the series is off by no more than its worst amount.
    between = check_polynomials(count).T @ (to_coefficients(count) @ found[:count])
    off = np.abs(between - found[count:])
    size = np.abs(found[count:])
    error = float(np.divide(off, size, out=np.zeros_like(off), where=size > 0.0).max(initial=0.0))
    error += max((part.error for part in parts), default=0.0)
    return JoinedWorth(parts, middle - half, middle + half, to_coefficients(count), error, tilt)
