"""Coupon dates counted back from a maturity, and the part of a year over which interest accrues."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from desk.book.arrays import FloatArray, IntArray
from desk.rates.day_count import DateArray, DayCount, add_months, year_fraction

__all__ = ["ICMA", "accrual_fraction", "day_count_codes", "period_around", "periods_left"]

_COUNTS = tuple(DayCount)
_CODES: dict[DayCount | None, int] = {count: number for number, count in enumerate(_COUNTS)}

ICMA = _CODES[DayCount.ACT_ACT_ICMA]
"""Number of Act/Act ICMA among the day counts."""


def day_count_codes(day_counts: Sequence[DayCount | None]) -> IntArray:
    """Day counts as numbers, shape (n,); None is Act/Act ICMA."""
    codes = _CODES | {None: ICMA}
    return np.array([codes[count] for count in day_counts], dtype=np.int64)


def period_around(
    day: DateArray, *, maturity: DateArray, months: IntArray
) -> tuple[IntArray, DateArray, DateArray]:
    """The regular period in which a day lies.

    Parameters
    ----------
    day, maturity : ndarray of datetime64[D], shape (n,)
    months : ndarray of int, shape (n,)
        Length of a period, at least 1.

    Returns
    -------
    number : ndarray of int, shape (n,)
        Periods from the first day of this one to the maturity.
    first, last : ndarray of datetime64[D], shape (n,)
        ``first <= day < last``.
    """
    apart = (maturity.astype("M8[M]") - day.astype("M8[M]")).astype(np.int64)
    number = -(-apart // months)
    first = add_months(maturity, -number * months)
    number = number + (first > day)
    return (
        number,
        add_months(maturity, -number * months),
        add_months(maturity, -(number - 1) * months),
    )


def periods_left(day: DateArray, *, maturity: DateArray, months: IntArray) -> FloatArray:
    """Regular periods from a day to the maturity, parts of a period by days, shape (n,)."""
    number, first, last = period_around(day, maturity=maturity, months=months)
    return np.asarray(number - (day - first).astype(np.float64) / (last - first).astype(np.float64))


def accrual_fraction(
    start: DateArray, end: DateArray, *, code: IntArray, maturity: DateArray, months: IntArray
) -> FloatArray:
    """Years over which interest accrues from `start` to `end`.

    Parameters
    ----------
    start, end, maturity : ndarray of datetime64[D], shape (n,)
    code : ndarray of int, shape (n,)
        Day counts, as `day_count_codes` gives them.
    months : ndarray of int, shape (n,)
        Length of a regular period, at least 1.

    Returns
    -------
    ndarray, shape (n,)

    Notes
    -----
    Act/Act ICMA splits an odd period at the regular dates counted back from the maturity; each part counts
    its days over those of its regular period and the periods a year. With x(d) the regular periods left
    after day d, fractions included, that sum is ``(x(start) - x(end)) / frequency``.

    References
    ----------
    ICMA Rule 251; ISDA, EMU and Market Conventions: Recent Developments (1998), section 4.
    """
    years = np.empty(start.shape)
    for number in np.unique(code).tolist():
        own = code == number
        if number == ICMA:
            terms = maturity[own], months[own]
            left = [periods_left(day[own], maturity=terms[0], months=terms[1]) for day in (start, end)]
            years[own] = (left[0] - left[1]) * terms[1] / 12.0
        else:
            years[own] = year_fraction(start[own], end[own], _COUNTS[number], termination=maturity[own])
    return years
