"""Discount curves.

Whatever is drawn between the terms, ``-ln P(0, t)`` is a polynomial on each of a few pieces of the time
axis. A curve is therefore kept as breakpoints and coefficients, so that discount factors, zero rates,
forwards and the continuation beyond the last term are one evaluation, whatever the interpolation.
"""

from __future__ import annotations

from enum import StrEnum
from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.rates.interpolation import Pieces, cubic_zero, linear_zero, log_linear, monotone_convex

__all__ = ["Curve", "DiscountCurve", "Interpolation"]

FloatArray = NDArray[np.float64]


class Interpolation(StrEnum):
    """What is drawn between the terms of a curve."""

    LOG_LINEAR = "log-linear"
    LINEAR_ZERO = "linear-zero"
    CUBIC_ZERO = "cubic-zero"
    MONOTONE_CONVEX = "monotone-convex"


_PIECES = {
    Interpolation.LOG_LINEAR: log_linear,
    Interpolation.LINEAR_ZERO: linear_zero,
    Interpolation.CUBIC_ZERO: cubic_zero,
    Interpolation.MONOTONE_CONVEX: monotone_convex,
}


class DiscountCurve(Protocol):
    """Anything that discounts: a book's curve or the curve a model makes for itself."""

    def discount(self, time: ArrayLike) -> FloatArray:
        """``P(0, time)``; times in years, any shape; ``P(0, 0) = 1``."""
        ...

    def zero(self, time: ArrayLike) -> FloatArray:
        """Continuously compounded zero rates [1/year]; at time 0 their limit."""
        ...

    def forward(self, start: ArrayLike, end: ArrayLike) -> FloatArray:
        """Continuously compounded forward rates from `start` to `end` [1/year].

        Where the two are equal, the instantaneous forward rate.
        """
        ...


class Curve:
    """A curve through zero rates.

    Parameters
    ----------
    terms : array_like, shape (q,)
        Terms [years], positive and strictly rising.
    zero_rates : array_like, shape (q,)
        Continuously compounded zero rates at the terms [1/year]; they may be negative.
    interpolation : Interpolation
        What is drawn between the terms.

    Raises
    ------
    ValueError
        If the terms or the rates make no curve.

    Notes
    -----
    Before the first term the zero rate is that of the first term; monotone convex alone follows its own
    rule there. Beyond the last term the instantaneous forward rate stays at the last forward, which is

    - log-linear: the flat forward between the last two terms;
    - linear-zero and cubic-zero: ``z + t dz/dt`` at the last term, the slope taken from the left;
    - monotone-convex: the method's own forward at the last term.

    With one term the curve is flat. Where the forward jumps, `instantaneous_forward` is that of the right.
    """

    __slots__ = ("_interpolation", "_pieces", "_terms", "_zero_rates")

    def __init__(
        self, terms: ArrayLike, zero_rates: ArrayLike, interpolation: Interpolation = Interpolation.LOG_LINEAR
    ) -> None:
        self._terms, self._zero_rates = _checked(terms, zero_rates)
        self._interpolation = Interpolation(interpolation)
        self._pieces: Pieces = _PIECES[self._interpolation](self._terms, self._zero_rates)

    def __repr__(self) -> str:
        """Terms, rates and interpolation."""
        return f"Curve({self._terms.tolist()}, {self._zero_rates.tolist()}, {self._interpolation.value!r})"

    @property
    def terms(self) -> FloatArray:
        """Terms [years], shape (q,), read-only."""
        return self._terms

    @property
    def zero_rates(self) -> FloatArray:
        """Continuously compounded zero rates at the terms [1/year], shape (q,), read-only."""
        return self._zero_rates

    @property
    def interpolation(self) -> Interpolation:
        """What is drawn between the terms."""
        return self._interpolation

    @property
    def last_term(self) -> float:
        """The last term [years]; beyond it the curve is extrapolated."""
        return float(self._terms[-1])

    def discount(self, time: ArrayLike) -> FloatArray:
        """Discount factors ``P(0, time)``.

        Parameters
        ----------
        time : array_like, any shape
            Years from the valuation date, at least 0.

        Returns
        -------
        ndarray, the shape of `time`
            1 at time 0.

        Raises
        ------
        ValueError
            If a time is negative or not finite.
        """
        with np.errstate(over="ignore", under="ignore"):
            return np.asarray(np.exp(-self._pieces.value(_times("time", time))))

    def zero(self, time: ArrayLike) -> FloatArray:
        """Continuously compounded zero rates.

        Parameters
        ----------
        time : array_like, any shape
            Years from the valuation date, at least 0.

        Returns
        -------
        ndarray, the shape of `time`
            ``-ln P(0, time) / time`` [1/year], and its limit at time 0.

        Raises
        ------
        ValueError
            If a time is negative or not finite.
        """
        times = _times("time", time)
        at_limit = times == 0.0
        rate = self._pieces.value(times) / np.where(at_limit, 1.0, times)
        return np.asarray(np.where(at_limit, self._pieces.slope(np.zeros(())), rate))

    def forward(self, start: ArrayLike, end: ArrayLike) -> FloatArray:
        """Continuously compounded forward rates.

        Parameters
        ----------
        start, end : array_like, shapes that broadcast
            Years from the valuation date, at least 0.

        Returns
        -------
        ndarray, the broadcast shape
            ``ln(P(0, start) / P(0, end)) / (end - start)`` [1/year]; where the two are equal, the
            instantaneous forward rate.

        Raises
        ------
        ValueError
            If a time is negative or not finite.
        """
        first, last = np.broadcast_arrays(_times("start", start), _times("end", end))
        return self._pieces.mean_slope(first, last)

    def instantaneous_forward(self, time: ArrayLike) -> FloatArray:
        """Instantaneous forward rates ``-d ln P(0, t)/dt``.

        Parameters
        ----------
        time : array_like, any shape
            Years from the valuation date, at least 0.

        Returns
        -------
        ndarray, the shape of `time`
            [1/year]; the limit from the right where the forward jumps.

        Raises
        ------
        ValueError
            If a time is negative or not finite.
        """
        return self._pieces.slope(_times("time", time))


def _checked(terms: ArrayLike, zero_rates: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Read-only copies of the terms and rates, once they are found to make a curve."""
    term = np.array(terms, dtype=np.float64)
    rate = np.array(zero_rates, dtype=np.float64)
    if term.ndim != 1 or term.size == 0:
        raise ValueError("`terms` must hold at least one term, in one dimension")
    if rate.shape != term.shape:
        raise ValueError(f"`zero_rates` must hold one rate for each of the {term.size} terms")
    if not np.isfinite(term).all() or term[0] <= 0.0:
        raise ValueError("`terms` must be finite and positive")
    falls = np.flatnonzero(np.diff(term) <= 0.0)
    if falls.size:
        before, after = term[falls[0]], term[falls[0] + 1]
        raise ValueError(f"`terms` must rise strictly, but {after:g} comes after {before:g}")
    if not np.isfinite(rate).all():
        raise ValueError("`zero_rates` must be finite")
    term.flags.writeable = False
    rate.flags.writeable = False
    return term, rate


def _times(name: str, time: ArrayLike) -> FloatArray:
    """Times as an array, once they are found to be finite and not negative."""
    times = np.asarray(time, dtype=np.float64)
    # Written so that a NaN fails too.
    if times.size and not (times.min() >= 0.0 and times.max() < np.inf):
        raise ValueError(f"`{name}` must be finite and at least 0")
    return times
