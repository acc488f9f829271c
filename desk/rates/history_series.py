"""A history of short rates made ready for estimation: checked, its dates turned into years."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["RateHistory", "history_years", "rate_history", "scale_remarks"]

FloatArray = NDArray[np.float64]

_FEWEST_RATES = 12
_DAYS_A_YEAR = 365.0
_GAP = 5.0  # times the usual step
_SHORT_YEARS = 10.0
_LARGEST_RATE = 1000.0


@dataclass(frozen=True, eq=False)
class RateHistory:
    """A history of short rates; made by `rate_history`.

    Attributes
    ----------
    time : ndarray, shape (n,)
        Years from the first rate, rising.
    rate : ndarray, shape (n,)
        Continuously compounded [1/year].
    remarks : tuple of str
        What is unusual about it, each one sentence.
    """

    time: FloatArray
    rate: FloatArray
    remarks: tuple[str, ...] = ()

    @property
    def step(self) -> FloatArray:
        """Years from each rate to the next, shape (n - 1,)."""
        return np.diff(self.time)

    @property
    def before(self) -> FloatArray:
        """All rates but the last, shape (n - 1,)."""
        return self.rate[:-1]

    @property
    def after(self) -> FloatArray:
        """All rates but the first, shape (n - 1,)."""
        return self.rate[1:]

    @property
    def years(self) -> float:
        """Length of the history [years]."""
        return float(self.time[-1] - self.time[0])


def rate_history(times: ArrayLike, rates: ArrayLike) -> RateHistory:
    """A history of short rates, checked.

    Parameters
    ----------
    times : array_like, shape (n,)
        Dates (datetime64, taken as Act/365 Fixed) or years; rising strictly, steps of any length.
    rates : array_like, shape (n,)
        Continuously compounded [1/year].

    Returns
    -------
    RateHistory

    Raises
    ------
    ValueError
        If there are fewer than twelve rates, one is no number, two dates are equal or out of order, or the
        rate never moves.
    """
    rate = np.array(rates, dtype=np.float64)
    if rate.ndim != 1 or np.shape(times) != rate.shape:
        raise ValueError("`rates` must hold one rate a date, in one dimension")
    years, remarks = history_years(times)
    bad = np.flatnonzero(~np.isfinite(rate))
    if bad.size:
        raise ValueError(f"the rate in row {bad[0] + 1} of the history is missing or no number")
    if np.ptp(rate) == 0.0:
        raise ValueError("the rate never moves in the history: nothing can be estimated from it")
    remarks = (*remarks, *scale_remarks(rate))
    rate.flags.writeable = False
    return RateHistory(years, rate, remarks)


def scale_remarks(rate: FloatArray) -> tuple[str, ...]:
    """A remark where rates look like per cent; NaN is passed over.

    Raises
    ------
    ValueError
        If a rate is beyond 1000, a hundred thousand per cent.
    """
    size = np.abs(rate[np.isfinite(rate)])
    if float(size.max()) > _LARGEST_RATE:
        raise ValueError(f"a rate of {float(size.max()):.3g} in the history is beyond any sense")
    if float(np.median(size)) > 0.5:
        return (
            "The rates look like per cent: they are taken as fractions, 0.05 being five per cent a year.",
        )
    return ()


def history_years(times: ArrayLike) -> tuple[FloatArray, tuple[str, ...]]:
    """Years from the first date of a history, shape (n,), read-only, and remarks on gaps and length.

    Parameters
    ----------
    times : array_like, shape (n,)
        Dates (datetime64, taken as Act/365 Fixed) or years.

    Raises
    ------
    ValueError
        If there are fewer than twelve, one is missing, or two are equal or out of order.
    """
    given = np.asarray(times)
    if given.ndim != 1 or given.size < _FEWEST_RATES:
        raise ValueError(
            f"the history is too short: {given.size} dates; an estimate needs at least {_FEWEST_RATES}"
        )
    dated = np.issubdtype(given.dtype, np.datetime64)
    if dated:
        days = given.astype("datetime64[D]")
        years = np.where(np.isnat(days), np.nan, (days - days[0]).astype(np.float64) / _DAYS_A_YEAR)
    else:
        years = np.asarray(given, dtype=np.float64) - float(given[0])
    bad = np.flatnonzero(~np.isfinite(years))
    if bad.size:
        raise ValueError(f"the date in row {bad[0] + 1} of the history is missing or no number")
    step = np.diff(years)
    back = np.flatnonzero(step <= 0.0)
    if back.size:
        row = int(back[0]) + 1
        what = "has the same date as" if step[row - 1] == 0.0 else "comes before"
        raise ValueError(f"row {row + 1} of the history {what} row {row}: dates must rise, one rate a date")
    years.flags.writeable = False
    return years, _remarks(given, step, dated)


def _remarks(given: NDArray[np.generic], step: FloatArray, dated: bool) -> tuple[str, ...]:
    remarks = []
    usual = float(np.median(step))
    gaps = np.flatnonzero(step > _GAP * usual)
    if gaps.size:
        row = int(gaps[np.argmax(step[gaps])])
        where = f"{given[row]} to {given[row + 1]}" if dated else f"rows {row + 1} to {row + 2}"
        many = "one gap" if gaps.size == 1 else f"{gaps.size} gaps"
        remarks.append(
            f"The history has {many} of more than {_GAP:g} times its usual step of "
            f"{usual * _DAYS_A_YEAR:.0f} days, the longest from {where}: each is taken as one long step, "
            "which the model allows for, but what happened within it is lost."
        )
    length = float(step.sum())
    if length < _SHORT_YEARS:
        remarks.append(
            f"The history covers {length:.1f} years only: the speed of mean reversion cannot be told well "
            "from less than some decades, however often the rate was noted."
        )
    return tuple(remarks)
