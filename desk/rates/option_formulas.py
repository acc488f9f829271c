"""Closed forms of options on a forward rate, and the volatility at which they give a price.

All are undiscounted and per unit of annuity; arrays broadcast.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["forward_option", "forward_option_slope", "implied_volatility"]

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

_ROOT_TWO_PI = 2.5066282746310002
_TURNS = 100
_CLOSE = 1e-12


def forward_option(
    forward: ArrayLike,
    strike: ArrayLike,
    volatility: ArrayLike,
    expiry: ArrayLike,
    *,
    call: ArrayLike = True,
    normal: ArrayLike = False,
    shift: ArrayLike = 0.0,
) -> FloatArray:
    """Expected payoff of an option on a forward.

    Parameters
    ----------
    forward, strike : array_like
        In one unit, for example rates [1/year].
    volatility : array_like
        At least 0: of the logarithm of forward plus `shift` [1/root year], or where `normal` of the forward
        itself [its unit/root year].
    expiry : array_like
        At least 0 [years].
    call : array_like of bool
        Call or put.
    normal : array_like of bool
        Normal law instead of the lognormal one.
    shift : array_like
        Added to forward and strike of the lognormal law.

    Returns
    -------
    ndarray, the broadcast shape
        NaN where the law is lognormal and the shifted forward or strike is not above 0.

    References
    ----------
    Black, F. (1976), The pricing of commodity contracts, J. Financial Economics 3. Bachelier, L. (1900),
    Théorie de la spéculation, Annales scientifiques de l'École Normale Supérieure 17.
    """
    from scipy.special import ndtr

    first, second, deviation, sign, plain, moved = _prepared(
        forward, strike, volatility, expiry, call, normal, shift
    )
    gap, ahead, limit = _distances(first, second, deviation, plain, moved)
    with np.errstate(invalid="ignore", over="ignore"):
        density = np.exp(-0.5 * ahead**2) / _ROOT_TWO_PI
        bachelier = sign * gap * ndtr(sign * ahead) + deviation * density
        black = sign * (
            (first + moved) * ndtr(sign * ahead) - (second + moved) * ndtr(sign * (ahead - deviation))
        )
    value = np.where(plain, bachelier, np.maximum(black, 0.0))
    value = np.where(deviation > 0.0, value, np.maximum(sign * gap, 0.0))
    return np.asarray(np.where(limit, value, np.nan))


def forward_option_slope(
    forward: ArrayLike,
    strike: ArrayLike,
    volatility: ArrayLike,
    expiry: ArrayLike,
    *,
    normal: ArrayLike = False,
    shift: ArrayLike = 0.0,
) -> FloatArray:
    """Derivative of `forward_option` with respect to the volatility; the same for calls and puts."""
    first, second, deviation, _, plain, moved = _prepared(
        forward, strike, volatility, expiry, True, normal, shift
    )
    gap, ahead, limit = _distances(first, second, deviation, plain, moved)
    with np.errstate(over="ignore"):
        density = np.exp(-0.5 * ahead**2) / _ROOT_TWO_PI
    density = np.where(deviation > 0.0, density, np.where(gap == 0.0, 1.0 / _ROOT_TWO_PI, 0.0))
    root = np.sqrt(np.asarray(expiry, dtype=np.float64))
    slope = root * density * np.where(plain, 1.0, first + moved)
    return np.asarray(np.where(limit, slope, np.nan))


def implied_volatility(
    price: ArrayLike,
    forward: FloatArray,
    strike: FloatArray,
    expiry: FloatArray,
    *,
    weight: FloatArray,
    call: ArrayLike = True,
    normal: ArrayLike = False,
    shift: ArrayLike = 0.0,
    guess: ArrayLike = 0.01,
) -> FloatArray:
    """One volatility for each row at which a weighted sum of options on that row has a price.

    Parameters
    ----------
    price : array_like, shape (m,)
    forward, strike, expiry, weight : ndarray, shape (m, k)
        The options of each row; those of no weight may hold anything finite.
    call, normal, shift, guess : array_like, shape (m,) or ()

    Returns
    -------
    ndarray, shape (m,)
        NaN where no volatility up to 10 gives the price. 0 where it is the value of exercise.

    Notes
    -----
    Newton's steps, each held within an interval known to hold the answer, else halved.
    """
    target = np.asarray(price, dtype=np.float64)
    rows = target.shape
    low, high = np.zeros(rows), np.full(rows, 10.0)
    calls, plain, moved = (
        np.broadcast_to(np.asarray(entry), rows)[:, None] for entry in (call, normal, shift)
    )
    volatility = np.array(np.broadcast_to(np.asarray(guess, dtype=np.float64), rows))
    used = weight > 0.0

    def total(level: FloatArray) -> FloatArray:
        each = forward_option(forward, strike, level[:, None], expiry, call=calls, normal=plain, shift=moved)
        return np.asarray(np.sum(np.where(used, weight * each, 0.0), axis=1))

    least, most = total(low), total(high)
    size = np.maximum(np.abs(target), 1e-300)
    possible = (target >= least - 1e-12 * size) & (target <= most)
    # The value of exercise up to rounding: any small volatility would do.
    at_least = target - least <= 1e-13 * size
    for _ in range(_TURNS):
        found = total(volatility)
        above = found > target
        high, low = np.where(above, volatility, high), np.where(above, low, volatility)
        slopes = forward_option_slope(forward, strike, volatility[:, None], expiry, normal=plain, shift=moved)
        slope = np.sum(np.where(used, weight * slopes, 0.0), axis=1)
        with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
            stepped = volatility - (found - target) / slope
        inside = (stepped >= low) & (stepped <= high)
        following = np.where(inside, stepped, 0.5 * (low + high))
        still = np.abs(following - volatility) > _CLOSE * volatility
        volatility = following
        if not np.any(still & possible & ~at_least):
            break
    return np.asarray(np.where(possible, np.where(at_least, 0.0, volatility), np.nan))


def _prepared(
    forward: ArrayLike,
    strike: ArrayLike,
    volatility: ArrayLike,
    expiry: ArrayLike,
    call: ArrayLike,
    normal: ArrayLike,
    shift: ArrayLike,
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray, BoolArray, FloatArray]:
    """Forward, strike, deviation at expiry, +1 or -1, whether normal, shift."""
    years = np.asarray(expiry, dtype=np.float64)
    deviation = np.asarray(volatility, dtype=np.float64) * np.sqrt(years)
    sign = np.where(np.asarray(call, dtype=bool), 1.0, -1.0)
    return (
        np.asarray(forward, dtype=np.float64),
        np.asarray(strike, dtype=np.float64),
        np.asarray(deviation),
        sign,
        np.asarray(normal, dtype=bool),
        np.asarray(shift, dtype=np.float64),
    )


def _distances(
    forward: FloatArray, strike: FloatArray, deviation: FloatArray, normal: BoolArray, shift: FloatArray
) -> tuple[FloatArray, FloatArray, BoolArray]:
    """``F - K``, the first argument of the normal law (0 without deviation), and where the law is defined."""
    gap = np.asarray(forward - strike)
    moved, limit = forward + shift, strike + shift
    defined = np.asarray(normal | ((moved > 0.0) & (limit > 0.0)))
    safe = np.where(deviation > 0.0, deviation, 1.0)
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        ratio = np.log(np.where(moved > 0.0, moved, 1.0) / np.where(limit > 0.0, limit, 1.0))
        ahead = np.where(normal, gap / safe, ratio / safe + 0.5 * deviation)
    return gap, np.asarray(np.where(deviation > 0.0, ahead, 0.0)), defined
