r"""Growth of amounts that follow a price index.

What is assumed:

- The index expected at t is today's over ``curve.discount(t)``, on a curve of expected inflation.
- An index with a lag of L years is taken as it stood L years before: from today to t it grows by
  ``I(t - L) / I(-L)``. Over the L years just passed it grew at one known rate, `recent_rate`.
- One year's increase is normal about the forward of that growth over the year, with standard deviation
  `sd`; the years are independent of one another, so that expected yearly factors multiply. The part of a
  year that is known already, because of the lag, has no deviation: the variance is that of the rest.
- A collar holds for each whole year from today; a part of a year grows at the root of the year's expected
  factor. No year takes more than everything: an increase is never below -100 %.
- A floor on the growth over the whole time takes that growth as lognormal about what the curve expects, its
  logarithm with the variance of the years ahead.
- Beyond `MOST_YEARS` the growth of the last year goes on.

What is left out: the steps of an index that is published by the month, any seasonal pattern in it, and any
correlation of inflation with nominal rates: the growth expected is taken as independent of discounting.

References
----------
Bachelier, L., Théorie de la spéculation (1900), for the normal model; its use for yearly inflation with a
floor and a cap is common practice, see Brigo, D. and Mercurio, F., Interest Rate Models: Theory and Practice
(2006), the part on inflation. Black, F., "The Pricing of Commodity Contracts", Journal of Financial Economics
3, 1976, for the floor on the whole growth. The references are from memory; the formulas are derived from the
normal law and checked by quadrature.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.rates.curve import DiscountCurve

__all__ = [
    "MOST_YEARS",
    "CollaredGrowth",
    "collared_growth",
    "expected_increase",
    "expected_increase_slope",
    "floored_growth",
    "floored_growth_slope",
    "growth_factors",
    "log_growth",
    "unknown_years",
]

FloatArray = NDArray[np.float64]

MOST_YEARS = 1000
"""Years whose increases are told apart."""

_LEAST_FACTOR = 1e-300  # of a year; its logarithm is finite
_MOST_LOG = 600.0  # amounts times the exponential of it stay finite


def expected_increase(
    mean: ArrayLike, *, sd: ArrayLike, floor: ArrayLike = -np.inf, cap: ArrayLike = np.inf
) -> FloatArray:
    r"""Expected value of a normal increase held between a floor and a cap.

    Parameters
    ----------
    mean : array_like
        Of the increase without floor and cap [1/year].
    sd : array_like
        Its standard deviation, at least 0 [1/year].
    floor, cap : array_like
        Least and greatest increase; infinite for none [1/year].

    Returns
    -------
    ndarray, the shape to which the arguments broadcast
        ``E[min(max(X, floor), cap)]`` for X normal: the mean, a floorlet more, a caplet less,
        with :math:`E[(f - X)^+] = (f - m) \Phi(u) + s \phi(u)`, :math:`u = (f - m) / s` [1/year].

    Raises
    ------
    ValueError
        If a deviation is negative or a cap is below its floor.
    """
    means, deviations, floors, caps = _checked(mean, sd, floor, cap)
    below, above = floors - means, means - caps
    # Said from the nearest of mean, floor and cap, so that nothing large cancels.
    with np.errstate(over="ignore", invalid="ignore"):  # branches that are not taken may have no floor or cap
        within = means + _normal_excess(below, deviations) - _normal_excess(above, deviations)
        from_floor = floors + _normal_excess(-below, deviations) - _normal_excess(above, deviations)
        from_cap = caps - _normal_excess(-above, deviations) + _normal_excess(below, deviations)
    held = np.where(below > 0.0, from_floor, np.where(above > 0.0, from_cap, within))
    return np.asarray(np.clip(held, floors, caps))


def expected_increase_slope(
    mean: ArrayLike, *, sd: ArrayLike, floor: ArrayLike = -np.inf, cap: ArrayLike = np.inf
) -> FloatArray:
    """Derivative of `expected_increase` by the mean: the probability to lie between floor and cap.

    Parameters
    ----------
    mean, sd, floor, cap
        As for `expected_increase`.

    Returns
    -------
    ndarray, the shape to which the arguments broadcast
        Without deviation 1 between floor and cap, 0 outside, one half where the mean is at one of them, 0
        where they are the same.
    """
    means, deviations, floors, caps = _checked(mean, sd, floor, cap)
    return np.asarray(_normal_below(caps - means, deviations) - _normal_below(floors - means, deviations))


def _checked(
    mean: ArrayLike, sd: ArrayLike, floor: ArrayLike, cap: ArrayLike
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """The arguments as arrays of one shape."""
    means, deviations, floors, caps = np.broadcast_arrays(
        *(np.asarray(each, dtype=np.float64) for each in (mean, sd, floor, cap))
    )
    if not (deviations >= 0.0).all():
        raise ValueError("`sd` must be at least 0")
    if not (floors <= caps).all():
        raise ValueError("`cap` must be at least `floor`")
    return means, deviations, floors, caps


def _scaled(distance: FloatArray, sd: FloatArray) -> FloatArray:
    """``distance / sd``, and its limit where there is no deviation."""
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        scaled = distance / sd
    return np.asarray(
        np.where(sd > 0.0, scaled, np.where(distance == 0.0, 0.0, np.copysign(np.inf, distance)))
    )


def _normal_below(distance: FloatArray, sd: FloatArray) -> FloatArray:
    """Probability that a centred normal lies below `distance`."""
    from scipy.special import ndtr

    return np.asarray(ndtr(_scaled(distance, sd)), dtype=np.float64)


def _normal_excess(distance: FloatArray, sd: FloatArray) -> FloatArray:
    """``E[(distance - Z)⁺]`` for a centred normal Z."""
    scaled = _scaled(distance, sd)
    with np.errstate(invalid="ignore", under="ignore", over="ignore"):
        density = np.exp(-0.5 * scaled * scaled) / np.sqrt(2.0 * np.pi)
        excess = distance * _normal_below(distance, sd) + sd * density
    # An infinite distance times a probability of 0 is nothing.
    return np.asarray(np.where(np.isneginf(distance), 0.0, excess))


def unknown_years(time: ArrayLike, *, lag: ArrayLike = 0.0) -> FloatArray:
    """How much of the growth of a lagged index to a time lies ahead, in years: ``max(time - lag, 0)``."""
    return np.asarray(np.maximum(np.asarray(time, dtype=np.float64) - np.asarray(lag), 0.0))


def log_growth(
    time: ArrayLike, *, curve: DiscountCurve, recent_rate: float, lag: ArrayLike = 0.0
) -> FloatArray:
    """Logarithm of the expected growth of an index from today to a time.

    Parameters
    ----------
    time : array_like, shape (n,)
        [years]
    curve : DiscountCurve
        Of expected inflation.
    recent_rate : float
        Of the time just passed, continuously compounded [1/year].
    lag : array_like, scalar or shape (n,)
        [years], at least 0.

    Returns
    -------
    ndarray, shape (n,)
        ``ln(I(time - lag) / I(-lag))``.
    """
    times = np.asarray(time, dtype=np.float64)
    ahead = unknown_years(times, lag=lag)
    with np.errstate(over="ignore"):
        return np.asarray(recent_rate * np.minimum(times, lag) + curve.zero(ahead) * ahead)


def growth_factors(log: FloatArray) -> FloatArray:
    """The exponential of a logarithm of growth, kept within what an amount can be multiplied by."""
    return np.asarray(np.exp(np.clip(log, -_MOST_LOG, _MOST_LOG)))


def floored_growth(growth: ArrayLike, *, log_sd: ArrayLike, least: ArrayLike) -> FloatArray:
    r"""Expected value of a lognormal growth that is no less than a floor.

    Parameters
    ----------
    growth : array_like, shape (n,)
        Expected growth G over the whole time.
    log_sd : array_like, shape (n,)
        Standard deviation s of its logarithm: independent years of deviation σ give ``σ · sqrt(years)``.
    least : array_like, shape (n,)
        The floor K, at least 0.

    Returns
    -------
    ndarray, shape (n,)
        :math:`G \Phi(d) + K \Phi(s - d)`, :math:`d = \ln(G / K) / s + s / 2` (Black's formula and the floor;
        the expectation of the index stays what the curve says).
    """
    growths, deviations, floors, d = _floored(growth, log_sd, least)
    from scipy.special import ndtr

    with np.errstate(over="ignore", under="ignore", invalid="ignore"):
        under = np.where(np.isinf(d), -d, deviations - d)
        return np.asarray(growths * ndtr(d) + floors * ndtr(under), dtype=np.float64)


def floored_growth_slope(growth: ArrayLike, *, log_sd: ArrayLike, least: ArrayLike) -> FloatArray:
    r"""Derivative of `floored_growth` by the expected growth: :math:`\Phi(d)`.

    Parameters
    ----------
    growth, log_sd, least
        As for `floored_growth`.

    Returns
    -------
    ndarray, shape (n,)
    """
    from scipy.special import ndtr

    return np.asarray(ndtr(_floored(growth, log_sd, least)[3]), dtype=np.float64)


def _floored(
    growth: ArrayLike, log_sd: ArrayLike, least: ArrayLike
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """The arguments as arrays of one shape, and d."""
    growths, deviations, floors = np.broadcast_arrays(
        *(np.asarray(each, dtype=np.float64) for each in (growth, log_sd, least))
    )
    with np.errstate(divide="ignore", over="ignore", under="ignore"):
        d = _scaled(np.log(growths) - np.log(floors), deviations) + 0.5 * deviations
    return growths, deviations, floors, d


@dataclass(frozen=True, eq=False)
class CollaredGrowth:
    """Expected growth of collared amounts to the end of each whole year.

    Attributes
    ----------
    log_factor : ndarray, shape (..., y + 1)
        Logarithm of the growth from today to the end of 0, 1, …, y years. Between the years it is straight.
    log_slope : ndarray, shape (..., y)
        Derivative of each year's part of it by the logarithm of that year's growth of the index.
    """

    log_factor: FloatArray
    log_slope: FloatArray


def collared_growth(
    log_index: FloatArray, *, sd: ArrayLike, floor: ArrayLike, cap: ArrayLike
) -> CollaredGrowth:
    """Growth by increases held between a floor and a cap year by year.

    Parameters
    ----------
    log_index : ndarray, shape (..., y + 1)
        Logarithm of the growth of the index to the end of 0, 1, …, y years.
    sd : array_like, broadcast to (..., y)
        Standard deviation of each year's increase [1/year].
    floor, cap : array_like, broadcast to (..., y)
        Infinite for none [1/year].

    Returns
    -------
    CollaredGrowth
    """
    with np.errstate(over="ignore", under="ignore", invalid="ignore"):
        step = np.clip(np.diff(log_index, axis=-1), -_MOST_LOG, _MOST_LOG)
        mean = np.expm1(step)
        lowest, highest = np.maximum(floor, -1.0), np.maximum(cap, -1.0)
        deviation = np.broadcast_to(np.asarray(sd, dtype=np.float64), mean.shape)
        factor = np.maximum(
            1.0 + expected_increase(mean, sd=deviation, floor=lowest, cap=highest), _LEAST_FACTOR
        )
        inside = expected_increase_slope(mean, sd=deviation, floor=lowest, cap=highest)
        slope = inside * (1.0 + mean) / factor
        log_factor = np.zeros(log_index.shape)
        np.cumsum(np.log(factor), axis=-1, out=log_factor[..., 1:])
    return CollaredGrowth(log_factor, np.asarray(slope))
