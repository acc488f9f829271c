"""Samples summed up: moments, quantiles and bins, each with its sampling error. Pure functions on arrays."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from desk.book.arrays import FloatArray, owned_floats, owned_integers
from desk.scenarios.records import Histogram

__all__ = [
    "QUANTILE_RULE",
    "Moments",
    "histogram",
    "moments",
    "quantile_error",
    "quantile_interval",
    "rank_confidence",
    "rank_interval",
    "sorted_quantile",
    "tail_mean",
    "tail_mean_error",
]

QUANTILE_RULE = 7
"""The rule of Hyndman and Fan by which percentiles are reported."""

_CONFIDENCE = 0.95
_BINS = 80
# Share of the sample beyond each end of the bins of equal width.
_TAIL = 0.0005
# Plotting positions (α, β) of the continuous rules of Hyndman and Fan.
_RULES = {
    4: (0.0, 1.0),
    5: (0.5, 0.5),
    6: (0.0, 0.0),
    7: (1.0, 1.0),
    8: (1.0 / 3.0, 1.0 / 3.0),
    9: (0.375, 0.375),
}


@dataclass(frozen=True)
class Moments:
    """Mean and standard deviation of a sample with their standard errors.

    Attributes
    ----------
    mean, mean_se, sd, sd_se : float
        All but the mean are NaN for a sample of one.
    """

    mean: float
    mean_se: float
    sd: float
    sd_se: float


def moments(values: FloatArray) -> Moments:
    """Mean and standard deviation (divisor n - 1) with their standard errors.

    The variance of the sample variance is ``(μ₄ - μ₂² (n - 3)/(n - 1))/n``, and the standard error of the
    standard deviation is its root over twice the standard deviation.
    Cramér, H. (1946), Mathematical Methods of Statistics, sections 27.4 and 28.4.

    Parameters
    ----------
    values : ndarray, shape (n,)

    Raises
    ------
    ValueError
        If the sample is empty.
    """
    count = values.size
    if count == 0:
        raise ValueError("`values` must not be empty")
    mean = float(values.mean())
    if count == 1:
        return Moments(mean, math.nan, math.nan, math.nan)
    parts = values - mean
    reach = max(float(parts.max()), -float(parts.min()))
    if reach == 0.0:
        return Moments(mean, 0.0, 0.0, 0.0)
    if not math.isfinite(reach):
        return Moments(mean, math.nan, math.nan, math.nan)
    # In units of the largest part fourth powers of any sample fit a float.
    parts /= reach
    parts *= parts
    second = float(parts.mean())
    parts *= parts
    fourth = float(parts.mean())
    deviation = math.sqrt(second * count / (count - 1))
    spread = max(fourth - second**2 * (count - 3) / (count - 1), 0.0) / count
    return Moments(
        mean,
        reach * deviation / math.sqrt(count),
        reach * deviation,
        reach * 0.5 * math.sqrt(spread) / deviation,
    )


def sorted_quantile(
    ordered: FloatArray,
    share: float | Sequence[float] | FloatArray,
    *,
    rule: int = QUANTILE_RULE,
    transform: Callable[[FloatArray], FloatArray] | None = None,
) -> FloatArray:
    """Quantiles of sorted samples.

    Parameters
    ----------
    ordered : ndarray, shape (..., n)
        Sorted along the last axis, n at least 1.
    share : array_like, shape (m,)
        Between 0 and 1.
    transform : callable, optional
        A rising function; the quantiles are those of the sample it makes of `ordered`.
    rule : int
        4 to 9 of Hyndman, R.J. and Fan, Y. (1996), Sample quantiles in statistical packages, American
        Statistician 50: the straight line between the order statistics on either side of ``n p + m``. Rule 7,
        which we report, puts the k-th of n at ``(k - 1)/(n - 1)``.

    Returns
    -------
    ndarray, shape (..., m)
    """
    count = ordered.shape[-1]
    if count == 0:
        raise ValueError("`ordered` must not be empty")
    alpha, beta = _RULES[rule]
    shares = np.asarray(share, dtype=np.float64)
    place = np.clip(count * shares + alpha + shares * (1.0 - alpha - beta), 1.0, count)
    # A share that is a round decimal must hit its order statistic although its float does not.
    nearest = np.rint(place)
    place = np.where(np.abs(place - nearest) <= 4.0 * np.finfo(float).eps * count, nearest, place)
    below = np.minimum(place.astype(np.int64), count)
    part = place - below
    low = ordered[..., below - 1]
    high = ordered[..., np.minimum(below, count - 1)]
    if transform is not None:
        low, high = transform(low), transform(high)
    return np.asarray(np.where(part > 0.0, low + part * (high - low), low))


def rank_confidence(count: int, share: float, lower: int, upper: int) -> float:
    """Chance that the quantile at `share` lies between two order statistics of a sample of `count`.

    ``P(lower <= Y <= upper - 1)`` with Y binomial; ranks run from 1, and 0 and ``count + 1`` stand for no
    bound. David, H.A. and Nagaraja, H.N. (2003), Order Statistics, section 7.1.
    """
    from scipy.special import bdtr

    above = float(bdtr(upper - 1, count, share)) if upper <= count else 1.0
    below = float(bdtr(lower - 1, count, share)) if lower >= 1 else 0.0
    return above - below


def rank_interval(count: int, share: float, *, confidence: float = _CONFIDENCE) -> tuple[int, int]:
    """Ranks of the order statistics that hold the quantile at `share` with at least `confidence`.

    Each side is left out with a chance of at most half the rest; rank 0 or ``count + 1`` says that the
    sample is too small for a bound on that side.
    """
    from scipy.stats import binom

    rest = 0.5 * (1.0 - confidence)
    lower = int(binom.ppf(rest, count, share))
    upper = int(binom.isf(rest, count, share)) + 1
    return max(lower, 0), min(upper, count + 1)


def quantile_interval(ordered: FloatArray, ranks: tuple[int, int]) -> tuple[float, float]:
    """The order statistics at two ranks; NaN where the rank stands for no bound."""
    lower, upper = ranks
    low = float(ordered[lower - 1]) if lower >= 1 else math.nan
    high = float(ordered[upper - 1]) if upper <= ordered.size else math.nan
    return low, high


def quantile_error(ordered: FloatArray, share: Sequence[float] | FloatArray) -> FloatArray:
    """Standard errors of the quantiles of a sorted sample of independent values.

    Half the way between the quantiles at ``p ± √(p(1 - p)/n)``; NaN where one of them is beyond the sample.
    Woodruff, R.S. (1952), Confidence intervals for medians and other position measures, J. American
    Statistical Association 47.

    Parameters
    ----------
    ordered : ndarray, shape (n,)
    share : array_like, shape (m,)

    Returns
    -------
    ndarray, shape (m,)
    """
    shares, count = np.asarray(share, dtype=np.float64), ordered.shape[-1]
    reach = np.sqrt(shares * (1.0 - shares) / count)
    low, high = shares - reach, shares + reach
    inside = (low * count >= 1.0) & ((1.0 - high) * count >= 1.0)
    ends = sorted_quantile(ordered, np.clip(np.concatenate([low, high]), 0.0, 1.0))
    half = 0.5 * (ends[..., shares.size :] - ends[..., : shares.size])
    return np.asarray(np.where(inside, half, np.nan))


def tail_mean(ordered: FloatArray, share: float) -> FloatArray:
    """Mean of the share of a sorted sample at and beyond a quantile, also called expected shortfall.

    At and below the quantile where `share` is under a half, at and above it otherwise. With ``k`` the whole
    part of ``n p`` the lower one is ``(x₁ + … + x_k + (np - k) x_{k+1})/(np)``. Acerbi, C. and Tasche, D.
    (2002), On the coherence of expected shortfall, J. Banking and Finance 26, definition 2.6 and section 4.

    Parameters
    ----------
    ordered : ndarray, shape (..., n)
        Sorted along the last axis, n at least 1.
    share : float
        Between 0 and 1.

    Returns
    -------
    ndarray, shape (...)
    """
    tail, weight = _tail(ordered, share)
    return np.asarray(np.sum(tail * weight, axis=-1))


def tail_mean_error(ordered: FloatArray, share: float) -> float:
    """Standard error of `tail_mean` of independent values; NaN where fewer than two are in the tail.

    ``√([v + (1 - p)(m - q)²]/(n p))`` with p the share in the tail, v its variance, m its mean and q the
    quantile. Manistre, B.J. and Hancock, G.H. (2005), Variance of the CTE estimator, North American Actuarial
    Journal 9(2).

    Parameters
    ----------
    ordered : ndarray, shape (n,)
        Sorted.
    share : float
        Between 0 and 1.
    """
    part = min(share, 1.0 - share)
    inside = part * ordered.size
    if inside < 2.0:
        return math.nan
    tail, weight = _tail(ordered, share)
    parts = tail - float(sorted_quantile(ordered, share))
    reach = float(np.abs(parts).max())
    if reach == 0.0 or not math.isfinite(reach):
        return 0.0 if reach == 0.0 else math.nan
    # In units of the largest part squares of any sample fit a float.
    parts /= reach
    mean = float(np.sum(parts * weight))
    parts -= mean
    parts *= parts
    spread = float(np.sum(parts * weight)) + (1.0 - part) * mean**2
    return reach * math.sqrt(spread / inside)


def _tail(ordered: FloatArray, share: float) -> tuple[FloatArray, FloatArray]:
    """The values of a tail, the one it holds a part of last, and their weights, which sum to 1."""
    count, lower = ordered.shape[-1], share < 0.5
    inside = count * (share if lower else 1.0 - share)
    # A share that is a round decimal must hold whole values although its float does not.
    nearest = round(inside)
    whole = nearest if abs(inside - nearest) <= 4.0 * np.finfo(float).eps * count else math.floor(inside)
    size = min(whole + 1, count)
    tail = ordered[..., :size] if lower else ordered[..., count - size :][..., ::-1]
    weight = np.full(size, 1.0)
    if size > whole:
        weight[-1] = max(inside - whole, 0.0)
    return tail, weight / weight.sum()


def histogram(ordered: FloatArray) -> Histogram:
    """Bins of a sorted sample.

    Bins of equal width between the quantiles at 0.05 % and 99.95 %, and one wider bin at either end out to
    the extremes, so that a long tail does not squeeze all else into a few bins: divide counts by widths to
    draw them. A sample of one value gives one narrow bin around it. Infinite values count in the last bin.
    """
    finite = ordered[np.isfinite(ordered)]
    if finite.size == 0:
        return Histogram(owned_floats([0.0, 1.0]), owned_integers([ordered.size]))
    least, most = float(finite[0]), float(finite[-1])
    width = 1e-9 * max(abs(least), abs(most), 1e-9)
    if most - least <= width:
        return Histogram(owned_floats([least - width, most + width]), owned_integers([ordered.size]))
    low, high = (float(value) for value in sorted_quantile(finite, (_TAIL, 1.0 - _TAIL)))
    if high - low <= width:
        low, high = least, most
    edges = np.linspace(low, high, _BINS - 1)
    # Where the tail is empty its bin would have no width.
    edges = np.concatenate([[least] if least < low else [], edges, [most] if most > high else []])
    places = np.searchsorted(ordered, edges, side="left")
    places[0], places[-1] = 0, ordered.size
    return Histogram(owned_floats(edges), owned_integers(np.diff(places)))
