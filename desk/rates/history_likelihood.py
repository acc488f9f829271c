"""Maximum likelihood for a handful of parameters: search, observed information, profile and interval.

The search works in units in which the log-likelihood bends alike in every direction, so that finite
differences of it are right to about eight digits.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = [
    "HALF_CHI_SQUARE_95",
    "Maximum",
    "delta_error",
    "maximise",
    "observed_covariance",
    "profile_interval",
]

FloatArray = NDArray[np.float64]
LogLikelihood = Callable[[FloatArray], float]

# Half the 95 % point of chi-square with one degree of freedom: by so much the profile falls at the ends of
# a 95 % interval.
HALF_CHI_SQUARE_95 = 1.9207294103470674

_GRADIENT_STEP = 1e-3  # in units of the standard error
_BEND_STEP = 0.05
_HESSIAN_STEP = 0.02
_MOST_TURNS, _MOST_TRIALS = 80, 14
_LONGEST_STEP = 30.0
_NEGLIGIBLE = 1e-9  # gain in log-likelihood that is not worth another turn
_AT_REST = 1e-4  # twice the gain that a whole further step promises
_WORST = 1e300  # stands for minus infinity, with which the search could not reckon


@dataclass(frozen=True, eq=False)
class Maximum:
    """Where a log-likelihood is greatest.

    Attributes
    ----------
    point : ndarray, shape (p,)
    value : float
    covariance : ndarray, shape (p, p)
        Inverse of the observed information; NaN for what lies at a bound and where there is no inverse.
    converged : bool
    at_bound : ndarray of bool, shape (p,)
    """

    point: FloatArray
    value: float
    covariance: FloatArray
    converged: bool
    at_bound: NDArray[np.bool_]


def maximise(
    function: LogLikelihood,
    start: ArrayLike,
    *,
    scale: ArrayLike,
    lower: ArrayLike,
    upper: ArrayLike,
    information: bool = True,
) -> Maximum:
    """Greatest value of a log-likelihood within bounds, by damped steps of Newton.

    Parameters
    ----------
    function : callable
        The log-likelihood of a point, shape (p,); defined a little past the bounds too. No number counts as
        minus infinity.
    start, scale, lower, upper : array_like, shape (p,)
        Where to begin, about how far from there the log-likelihood changes by one, and the bounds.
    information : bool
        Leave the covariance out (all NaN) when false.
    """
    low, high = np.asarray(lower, dtype=np.float64), np.asarray(upper, dtype=np.float64)
    point = np.clip(np.asarray(start, dtype=np.float64), low, high)
    unit = np.asarray(scale, dtype=np.float64)

    def safe(place: FloatArray) -> float:
        value = function(place)
        return value if math.isfinite(value) else -_WORST

    unit = _units(safe, point, unit, high - low)
    value, damping, converged = safe(point), 0.1, False
    for _ in range(_MOST_TURNS):
        slope, bend = _slopes(safe, point, unit, value)
        # What would leave the bounds stays where it is.
        free = np.flatnonzero(~(((point <= low) & (slope < 0.0)) | ((point >= high) & (slope > 0.0))))
        if free.size == 0:
            converged = True
            break
        root, turn = np.linalg.eigh(-bend[np.ix_(free, free)])
        along = turn.T @ slope[free]
        moved = False
        for _ in range(_MOST_TRIALS):
            step = np.zeros(point.size)
            step[free] = turn @ (along / (np.abs(root) + damping))
            trial = np.clip(point + unit * np.clip(step, -_LONGEST_STEP, _LONGEST_STEP), low, high)
            tried = safe(trial)
            if tried > value:
                moved, gained = True, tried - value
                point, value, damping = trial, tried, max(0.1 * damping, 1e-8)
                break
            damping = max(10.0 * damping, 1e-6)
        if not moved or gained < _NEGLIGIBLE:
            converged = float(np.max(along**2 / np.maximum(np.abs(root), 1e-3))) < _AT_REST
            break
        curved = -np.diag(bend)
        unit = unit / np.sqrt(np.clip(np.where(curved > 0.0, curved, 1.0), 1e-2, 1e4))
    at_bound = (point <= low + 1e-9 * (high - low)) | (point >= high - 1e-9 * (high - low))
    covariance = np.full((point.size, point.size), np.nan)
    if information:
        free = np.flatnonzero(~at_bound)
        covariance[np.ix_(free, free)] = observed_covariance(safe, point, scale=unit, free=free)
    return Maximum(point, value, covariance, converged, at_bound)


def observed_covariance(
    function: LogLikelihood, point: FloatArray, *, scale: FloatArray, free: NDArray[np.intp] | None = None
) -> FloatArray:
    """Inverse of minus the Hessian of a log-likelihood at its maximum, over the `free` parameters.

    Central differences at two step lengths, of which the error of second order is taken out (Richardson).
    All NaN where the Hessian is not negative definite.
    """
    chosen = np.arange(point.size) if free is None else free
    unit = _units(function, point, scale, np.full(point.size, np.inf))
    wide = _hessian(function, point, unit * _HESSIAN_STEP, chosen)
    near = _hessian(function, point, unit * _HESSIAN_STEP * 0.5, chosen)
    information = (wide - 4.0 * near) / 3.0
    size = chosen.size
    weighted = information * np.outer(unit[chosen], unit[chosen])
    if size == 0 or not np.isfinite(weighted).all() or np.linalg.eigvalsh(weighted)[0] <= 1e-10 * size:
        return np.full((size, size), np.nan)
    return np.asarray(np.linalg.inv(weighted) * np.outer(unit[chosen], unit[chosen]))


def delta_error(covariance: FloatArray, slope: ArrayLike) -> float:
    """Standard error of a function of the estimates by the delta method: ``√(g' C g)``; NaN where unknown."""
    gradient = np.asarray(slope, dtype=np.float64)
    used = np.flatnonzero(gradient)
    part = covariance[np.ix_(used, used)]
    return (
        math.sqrt(max(float(gradient[used] @ part @ gradient[used]), 0.0))
        if np.isfinite(part).all()
        else math.nan
    )


def profile_interval(
    profile: Callable[[float], float],
    best: float,
    *,
    highest: float,
    scale: float,
    lower: float,
    upper: float,
) -> tuple[float, float]:
    """Where a profile log-likelihood has fallen by half the 95 % point of chi-square on either side.

    Parameters
    ----------
    profile : callable
        The log-likelihood at one value of the parameter, greatest over all the others.
    best, highest : float
        Where the profile is greatest, and its value there.
    scale : float
        About the standard error, above 0.
    lower, upper : float
        Bounds of the parameter; where the profile never falls so far, the bound is given back.
    """
    from scipy.optimize import brentq

    def excess(place: float) -> float:
        # By definition at the best; a search that found a little less there must not upset the signs.
        return HALF_CHI_SQUARE_95 if place == best else profile(place) - highest + HALF_CHI_SQUARE_95

    ends = []
    for sign, bound in ((-1.0, lower), (1.0, upper)):
        inner, reach = best, scale
        end = bound
        while inner != bound:
            outer = min(max(best + sign * reach, lower), upper)
            if excess(outer) < 0.0:
                end = float(brentq(excess, inner, outer, xtol=1e-5 * scale))
                break
            inner, reach = outer, 2.0 * reach
        ends.append(end)
    return ends[0], ends[1]


def _units(function: LogLikelihood, point: FloatArray, guess: FloatArray, widest: FloatArray) -> FloatArray:
    """For each parameter the move that lowers the log-likelihood by about a half."""
    unit = np.minimum(np.where(guess > 0.0, guess, 1e-3), widest)
    here = function(point)
    for index in range(point.size):
        for _ in range(6):
            shift = np.zeros(point.size)
            shift[index] = 0.1 * unit[index]
            bend = (2.0 * here - function(point + shift) - function(point - shift)) / 0.01
            # A bend of one in these units is what is wanted.
            factor = 1.0 / math.sqrt(bend) if 1e-12 < bend < 1e100 else (10.0 if bend <= 1e-12 else 1e-3)
            factor = min(max(factor, 1e-3), 10.0)
            unit[index] = min(unit[index] * factor, widest[index])
            if 0.7 < factor < 1.4:
                break
    return unit


def _slopes(
    function: LogLikelihood, point: FloatArray, unit: FloatArray, here: float
) -> tuple[FloatArray, FloatArray]:
    """First and second derivatives in the units given: the second from one side, good enough for a search."""
    size = point.size
    slope, bend, aside = np.empty(size), np.empty((size, size)), np.empty(size)
    shifts = np.diag(unit)
    for index in range(size):
        near, far = _GRADIENT_STEP * shifts[index], _BEND_STEP * shifts[index]
        slope[index] = (function(point + near) - function(point - near)) / (2.0 * _GRADIENT_STEP)
        aside[index] = function(point + far)
        bend[index, index] = (aside[index] - 2.0 * here + function(point - far)) / _BEND_STEP**2
    for row in range(size):
        for column in range(row):
            both = function(point + _BEND_STEP * (shifts[row] + shifts[column]))
            crossed = (both - aside[row] - aside[column] + here) / _BEND_STEP**2
            bend[row, column] = bend[column, row] = crossed
    return np.clip(slope, -1e100, 1e100), np.clip(bend, -1e100, 1e100)


def _hessian(
    function: LogLikelihood, point: FloatArray, step: FloatArray, chosen: NDArray[np.intp]
) -> FloatArray:
    """Second derivatives over the chosen parameters by central differences."""
    here, size = function(point), chosen.size
    hessian = np.empty((size, size))
    for row, first in enumerate(chosen):
        one = np.zeros(point.size)
        one[first] = step[first]
        hessian[row, row] = (function(point + one) - 2.0 * here + function(point - one)) / step[first] ** 2
        for column, second in enumerate(chosen[:row]):
            two = np.zeros(point.size)
            two[second] = step[second]
            crossed = (
                function(point + one + two)
                - function(point + one - two)
                - function(point - one + two)
                + function(point - one - two)
            )
            hessian[row, column] = hessian[column, row] = crossed / (4.0 * step[first] * step[second])
    return hessian
