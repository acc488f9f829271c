"""Day counts: the time between two dates in years.

The names are those of the trade. Two conventions look beyond the two dates: Act/Act ICMA at the coupon period
they lie in (`coupon_fraction`), 30E/360 ISDA at the day on which the contract ends.
"""

from __future__ import annotations

from enum import StrEnum

import numpy as np
from numpy.typing import NDArray

__all__ = ["TIME_COUNTS", "DateArray", "DayCount", "add_months", "coupon_fraction", "year_fraction"]

DateArray = NDArray[np.datetime64]


class DayCount(StrEnum):
    """Conventions for the fraction of a year between two dates."""

    ACT_365F = "Act/365F"
    ACT_360 = "Act/360"
    ACT_ACT_ISDA = "Act/Act ISDA"
    THIRTY_360 = "30/360"
    THIRTY_E_360 = "30E/360"
    ACT_ACT_ICMA = "Act/Act ICMA"
    THIRTY_E_360_ISDA = "30E/360 ISDA"


TIME_COUNTS = (
    DayCount.ACT_365F,
    DayCount.ACT_360,
    DayCount.ACT_ACT_ISDA,
    DayCount.THIRTY_360,
    DayCount.THIRTY_E_360,
)
"""Those that two dates alone determine: what a basis may count its years by."""


def year_fraction(
    start: np.datetime64 | DateArray,
    end: np.datetime64 | DateArray,
    day_count: DayCount,
    *,
    termination: np.datetime64 | DateArray | None = None,
) -> NDArray[np.float64]:
    """Time from `start` to `end` [years].

    Parameters
    ----------
    start, end : datetime64[D] scalars or arrays that broadcast
        First and last day. Where `end` is before `start` the result is negative.
    day_count : DayCount
        The convention.
    termination : datetime64[D] scalar or array that broadcasts, optional
        The day on which the contract ends. 30E/360 ISDA alone asks for it: it counts the end of February as
        the 30th, save as the last day of all. Without it no `end` is taken for that day.

    Returns
    -------
    ndarray, the broadcast shape
        Years; NaN where a date is not a date.

    Notes
    -----
    Act/Act ICMA depends on the coupon period, which only `coupon_fraction` knows. Here it is that of one
    coupon a year, paid on the anniversaries of the later of the two dates.

    References
    ----------
    ISDA 2006 Definitions, section 4.16 (Act/365F, Act/360, Act/Act ISDA, 30/360 bond basis, 30E/360, 30E/360
    ISDA; Act/Act ICMA in its paragraph c, from ICMA Rule 251).
    """
    first = np.asarray(start, dtype="datetime64[D]")
    last = np.asarray(end, dtype="datetime64[D]")
    missing = np.isnat(first) | np.isnat(last)
    if day_count is DayCount.ACT_365F:
        years = (last - first).astype(np.float64) / 365.0
    elif day_count is DayCount.ACT_360:
        years = (last - first).astype(np.float64) / 360.0
    elif day_count is DayCount.ACT_ACT_ISDA:
        whole_1, part_1 = _calendar_years(first)
        whole_2, part_2 = _calendar_years(last)
        years = (whole_2 - whole_1) + (part_2 - part_1)
    elif day_count is DayCount.ACT_ACT_ICMA:
        years = _with_yearly_coupons(first, last, missing)
    elif day_count is DayCount.THIRTY_E_360_ISDA:
        years = _thirty_to_month_ends(first, last, termination) / 360.0
    else:
        years = _thirty_day_months(first, last, european=day_count is DayCount.THIRTY_E_360) / 360.0
    return np.asarray(np.where(missing, np.nan, years), dtype=np.float64)


def coupon_fraction(
    start: np.datetime64 | DateArray,
    end: np.datetime64 | DateArray,
    *,
    period_start: np.datetime64 | DateArray,
    period_end: np.datetime64 | DateArray,
    frequency: int | NDArray[np.int64],
) -> NDArray[np.float64]:
    """Time from `start` to `end` by Act/Act ICMA [years].

    Parameters
    ----------
    start, end : datetime64[D] scalars or arrays that broadcast
        First and last day on which interest accrues.
    period_start, period_end : datetime64[D] scalars or arrays that broadcast
        The regular coupon period in or beside which they lie. For a short first coupon it begins before
        `start`; for a long one it is any of the regular periods that would have been.
    frequency : int or ndarray of int
        Coupons a year: 1, 2, 3, 4, 6 or 12.

    Returns
    -------
    ndarray, the broadcast shape
        Years; NaN where a date is not a date.

    Raises
    ------
    ValueError
        If a frequency is none of these, or a period does not end after it starts.

    Notes
    -----
    The regular dates go on by whole months on both sides of the given period. The time is cut at them, and
    each part counts its days over those of its regular period and the coupons a year.

    References
    ----------
    ICMA Rule 251; ISDA, The Actual/Actual Day Count Fraction (memorandum, 1999).
    """
    per_year = np.asarray(frequency)
    if not np.isin(per_year, (1, 2, 3, 4, 6, 12)).all():
        raise ValueError("`frequency` must be 1, 2, 3, 4, 6 or 12")
    arrays = np.broadcast_arrays(
        *(np.asarray(day, dtype="datetime64[D]") for day in (start, end, period_start, period_end)), per_year
    )
    first, last, opening, closing = (array.astype("datetime64[D]") for array in arrays[:4])
    missing = np.isnat(first) | np.isnat(last) | np.isnat(opening) | np.isnat(closing)
    if np.any(closing <= opening):
        raise ValueError("`period_end` must be after `period_start`")
    some, one_day = np.datetime64("2001-01-01", "D"), np.timedelta64(1, "D")
    first, last = np.where(missing, some, first), np.where(missing, some, last)
    opening, closing = np.where(missing, some, opening), np.where(missing, some + one_day, closing)
    months = 12 // arrays[4].astype(np.int64)
    periods = _periods_passed(last, opening, closing, months) - _periods_passed(
        first, opening, closing, months
    )
    return np.asarray(np.where(missing, np.nan, periods * months / 12.0), dtype=np.float64)


def add_months(start: np.datetime64 | DateArray, months: int | NDArray[np.int64]) -> DateArray:
    """Dates a number of months later, on the same day or the last day of a shorter month.

    Parameters
    ----------
    start : datetime64[D] scalar or array, any shape
    months : int or ndarray of int, a shape that broadcasts
        May be negative.

    Returns
    -------
    ndarray of datetime64[D], the broadcast shape
    """
    days = np.asarray(start, dtype="datetime64[D]")
    month = days.astype("datetime64[M]")
    day = days - month.astype("datetime64[D]")
    first = (month + np.asarray(months).astype("timedelta64[M]")).astype("datetime64[D]")
    length = (first.astype("datetime64[M]") + np.timedelta64(1, "M")).astype("datetime64[D]") - first
    return np.asarray(first + np.minimum(day, length - np.timedelta64(1, "D")), dtype="datetime64[D]")


def _with_yearly_coupons(
    first: DateArray, last: DateArray, missing: NDArray[np.bool_]
) -> NDArray[np.float64]:
    """Act/Act ICMA with one coupon a year, on the anniversaries of the later date."""
    some = np.datetime64("2001-01-01", "D")
    from_day, to_day = np.where(missing, some, first), np.where(missing, some, last)
    closing = np.maximum(from_day, to_day)
    years = coupon_fraction(
        from_day, to_day, period_start=add_months(closing, -12), period_end=closing, frequency=1
    )
    return np.asarray(years)


def _periods_passed(
    day: DateArray, opening: DateArray, closing: DateArray, months: NDArray[np.int64]
) -> NDArray[np.float64]:
    """Regular periods from `opening` to a day, parts of a period by days."""
    # The regular dates before `opening` are counted from it, those after `closing` from there.
    after = day >= closing
    anchor = np.where(after, closing, opening)
    apart = (day.astype("datetime64[M]") - anchor.astype("datetime64[M]")).astype(np.int64)
    number = apart // months
    number = number - (add_months(anchor, number * months) > day)
    low, high = add_months(anchor, number * months), add_months(anchor, (number + 1) * months)
    # Months of different lengths may bring a counted date a few days past the given period.
    inside = ~after & (day >= opening)
    low, high = np.where(inside, opening, low), np.where(inside, closing, high)
    whole = np.where(after, number + 1, np.where(inside, 0, number))
    part = (day - low).astype(np.float64) / (high - low).astype(np.float64)
    return np.asarray(whole + part)


def _parts(date: DateArray) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.int64]]:
    """Year, month (1-12) and day (1-31) of each date."""
    months = date.astype("datetime64[M]")
    year = date.astype("datetime64[Y]").astype(np.int64) + 1970
    month = months.astype(np.int64) % 12 + 1
    day = (date - months.astype("datetime64[D]")).astype(np.int64) + 1
    return year, month, day


def _calendar_years(date: DateArray) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Calendar year, and the part of it that has passed: their differences add up to Act/Act ISDA."""
    years = date.astype("datetime64[Y]")
    first = years.astype("datetime64[D]")
    length = ((years + np.timedelta64(1, "Y")).astype("datetime64[D]") - first).astype(np.float64)
    passed = (date - first).astype(np.float64)
    return years.astype(np.int64).astype(np.float64), passed / length


def _thirty_day_months(first: DateArray, last: DateArray, *, european: bool) -> NDArray[np.float64]:
    """Days of 30/360 (bond basis) or 30E/360 (`european`)."""
    year_1, month_1, day_1 = _parts(first)
    year_2, month_2, day_2 = _parts(last)
    day_1 = np.minimum(day_1, 30)
    day_2 = np.where((day_2 == 31) & (european | (day_1 == 30)), 30, day_2)
    days = 360 * (year_2 - year_1) + 30 * (month_2 - month_1) + (day_2 - day_1)
    return np.asarray(days, dtype=np.float64)


def _thirty_to_month_ends(
    first: DateArray, last: DateArray, termination: np.datetime64 | DateArray | None
) -> NDArray[np.float64]:
    """Days of 30E/360 ISDA: the last day of any month is the 30th, February's only before the end."""
    year_1, month_1, day_1 = _parts(first)
    year_2, month_2, day_2 = _parts(last)
    next_day = np.timedelta64(1, "D")
    ends_1, ends_2 = _parts(first + next_day)[2] == 1, _parts(last + next_day)[2] == 1
    if termination is not None:
        ends_2 = ends_2 & ~((month_2 == 2) & (last == np.asarray(termination, dtype="datetime64[D]")))
    day_1, day_2 = np.where(ends_1, 30, day_1), np.where(ends_2, 30, day_2)
    days = 360 * (year_2 - year_1) + 30 * (month_2 - month_1) + (day_2 - day_1)
    return np.asarray(days, dtype=np.float64)
