"""A curve on a grid of times, and what it says at its own terms: for pictures and tables."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from desk.rates.curve import Curve

__all__ = ["CurveSample", "QuoteDetail", "quote_details", "sample_curve"]

FloatArray = NDArray[np.float64]

_BESIDE = 1e-9
"""How far before a term its limit from the left is taken, as a part of the term."""


@dataclass(frozen=True, eq=False)
class CurveSample:
    """A curve at rising times, each array shape (n,).

    Attributes
    ----------
    time : ndarray
        [years]; each term of the curve stands twice, just before it and at it, so that a forward that jumps
        there is drawn as a jump.
    zero, forward : ndarray
        Continuously compounded zero rates and instantaneous forward rates [1/year].
    discount : ndarray
        Discount factors.
    """

    time: FloatArray
    zero: FloatArray
    forward: FloatArray
    discount: FloatArray


def sample_curve(curve: Curve, *, until: float, points: int = 400) -> CurveSample:
    """Sample a curve from today on.

    Parameters
    ----------
    curve : Curve
    until : float
        The last time [years].
    points : int
        Evenly spaced times, to which those at the terms are added.

    Returns
    -------
    CurveSample

    Raises
    ------
    ValueError
        If `until` is not above 0 or `points` below 2.
    """
    if not 0.0 < until < np.inf:
        raise ValueError("`until` must be above 0")
    if points < 2:
        raise ValueError("`points` must be at least 2")
    terms = curve.terms[curve.terms <= until]
    time = np.unique(np.concatenate((np.linspace(0.0, until, points), terms, terms * (1.0 - _BESIDE))))
    return CurveSample(time, curve.zero(time), curve.instantaneous_forward(time), curve.discount(time))


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
        Continuously compounded forward rate from the term to the next [1/year]; at the last term the
        forward that goes on beyond it.
    """

    term: FloatArray
    zero: FloatArray
    discount: FloatArray
    forward_to_next: FloatArray


def quote_details(curve: Curve, *, terms: FloatArray | None = None) -> QuoteDetail:
    """What a curve says at the terms of its quotes.

    Parameters
    ----------
    curve : Curve
    terms : ndarray, shape (q,), optional
        Rising [years]; those of the curve when left out. A curve that stops at a last liquid point has fewer
        terms than there are quotes.
    """
    at = curve.terms if terms is None else terms
    return QuoteDetail(at, curve.zero(at), curve.discount(at), curve.forward(at, np.append(at[1:], at[-1])))
