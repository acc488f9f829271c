"""A curve on a grid of times, and what it says at its own terms: for pictures and tables."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.rates.curve import Curve, DiscountCurve

__all__ = [
    "CurveComparison",
    "CurveSample",
    "QuoteDetail",
    "compare_curves",
    "quote_details",
    "sample_curve",
]

FloatArray = NDArray[np.float64]

_BESIDE = 1e-9
"""How far before a term its limit from the left is taken, as a part of the term."""


@dataclass(frozen=True, eq=False)
class CurveSample:
    """A curve at rising times, each array shape (n,).

    Attributes
    ----------
    time : ndarray
        [years]; each term of a curve through terms stands twice, just before it and at it, so that a forward
        that jumps there is drawn as a jump.
    zero, forward : ndarray
        Continuously compounded zero rates and instantaneous forward rates [1/year].
    discount : ndarray
        Discount factors.
    """

    time: FloatArray
    zero: FloatArray
    forward: FloatArray
    discount: FloatArray


def sample_curve(curve: DiscountCurve, *, until: float, points: int = 400) -> CurveSample:
    """Sample a curve from today on.

    Parameters
    ----------
    curve : DiscountCurve
    until : float
        The last time [years].
    points : int
        Evenly spaced times, to which those at the terms are added; a formula has none.

    Returns
    -------
    CurveSample

    Raises
    ------
    ValueError
        If `until` is not above 0 or `points` below 2.
    """
    time = _grid((curve,), until, points)
    return CurveSample(time, curve.zero(time), curve.forward(time, time), curve.discount(time))


@dataclass(frozen=True, eq=False)
class CurveComparison:
    """Two curves at rising times, each array shape (n,).

    Attributes
    ----------
    time : ndarray
        [years]; the terms of both curves as in `CurveSample`.
    zero_difference, forward_difference : ndarray
        Zero rates and instantaneous forward rates of the second curve less those of the first, continuously
        compounded [1/year].
    discount_ratio : ndarray
        Discount factors of the second curve over those of the first.
    """

    time: FloatArray
    zero_difference: FloatArray
    forward_difference: FloatArray
    discount_ratio: FloatArray


def compare_curves(
    first: DiscountCurve, second: DiscountCurve, *, until: float, points: int = 400
) -> CurveComparison:
    """How the second of two curves differs from the first.

    Parameters
    ----------
    first, second : DiscountCurve
    until : float
        The last time [years].
    points : int
        Evenly spaced times, to which those at the terms of both are added.

    Raises
    ------
    ValueError
        If `until` is not above 0 or `points` below 2.
    """
    time = _grid((first, second), until, points)
    difference = second.zero(time) - first.zero(time)
    with np.errstate(over="ignore", under="ignore"):
        # Not the ratio of the factors themselves, which may both have become 0.
        ratio = np.exp(-difference * time)
    return CurveComparison(time, difference, second.forward(time, time) - first.forward(time, time), ratio)


def _grid(curves: tuple[DiscountCurve, ...], until: float, points: int) -> FloatArray:
    """Evenly spaced times and both sides of the terms of the curves."""
    if not 0.0 < until < np.inf:
        raise ValueError("`until` must be above 0")
    if points < 2:
        raise ValueError("`points` must be at least 2")
    parts = [np.linspace(0.0, until, points)]
    for curve in curves:
        if isinstance(curve, Curve):
            terms = curve.terms[curve.terms <= until]
            parts += [terms, terms * (1.0 - _BESIDE)]
    return np.unique(np.concatenate(parts))


@dataclass(frozen=True, eq=False)
class QuoteDetail:
    """What a curve says at the terms of its quotes, each array shape (q,).

    Attributes
    ----------
    term : ndarray
        [years]
    zero : ndarray
        Continuously compounded zero rates [1/year].
    discount : ndarray
        Discount factors.
    forward_to_next : ndarray
        Continuously compounded forward rate from the term to the next later one [1/year]; at the last term
        the forward that goes on beyond it.
    """

    term: FloatArray
    zero: FloatArray
    discount: FloatArray
    forward_to_next: FloatArray


def quote_details(curve: DiscountCurve, *, terms: ArrayLike | None = None) -> QuoteDetail:
    """What a curve says at the terms of its quotes.

    Parameters
    ----------
    curve : DiscountCurve
    terms : array_like, shape (q,), optional
        In any order [years]; those of the curve when left out. A curve that stops at a last liquid point has
        fewer terms than there are quotes, a formula has none.

    Raises
    ------
    ValueError
        If `terms` is left out for a curve that has none.
    """
    if terms is not None:
        at = np.asarray(terms, dtype=np.float64)
    elif isinstance(curve, Curve):
        at = curve.terms
    else:
        raise ValueError("`terms` must be given for a curve that is a formula")
    rising = np.unique(at)
    later = np.minimum(np.searchsorted(rising, at) + 1, rising.size - 1)
    return QuoteDetail(at, curve.zero(at), curve.discount(at), curve.forward(at, rising[later]))
