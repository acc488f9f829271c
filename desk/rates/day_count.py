"""Day counts: the time between two dates in years.

The names are those of the trade. Only conventions that need nothing but the two dates are here: a bond's
coupons are whole parts of its yearly coupon, so no convention enters its flows, only their times.
"""

from __future__ import annotations

from enum import StrEnum

import numpy as np
from numpy.typing import NDArray

__all__ = ["DateArray", "DayCount", "year_fraction"]

DateArray = NDArray[np.datetime64]


class DayCount(StrEnum):
    """Conventions for the fraction of a year between two dates."""

    ACT_365F = "Act/365F"
    ACT_360 = "Act/360"
    ACT_ACT_ISDA = "Act/Act ISDA"
    THIRTY_360 = "30/360"
    THIRTY_E_360 = "30E/360"


def year_fraction(
    start: np.datetime64 | DateArray, end: np.datetime64 | DateArray, day_count: DayCount
) -> NDArray[np.float64]:
    """Time from `start` to `end` [years].

    Parameters
    ----------
    start, end : datetime64[D] scalars or arrays that broadcast
        First and last day. Where `end` is before `start` the result is negative.
    day_count : DayCount
        The convention.

    Returns
    -------
    ndarray, the broadcast shape
        Years; NaN where a date is not a date.

    References
    ----------
    ISDA 2006 Definitions, section 4.16 (Act/365F, Act/360, Act/Act ISDA, 30/360 bond basis, 30E/360).
    """
    first = np.asarray(start, dtype="datetime64[D]")
    last = np.asarray(end, dtype="datetime64[D]")
    missing = np.isnat(first) | np.isnat(last)
    days = (last - first).astype(np.float64)
    if day_count is DayCount.ACT_365F:
        years = days / 365.0
    elif day_count is DayCount.ACT_360:
        years = days / 360.0
    elif day_count is DayCount.ACT_ACT_ISDA:
        whole_1, part_1 = _calendar_years(first)
        whole_2, part_2 = _calendar_years(last)
        years = (whole_2 - whole_1) + (part_2 - part_1)
    else:
        years = _thirty_day_months(first, last, european=day_count is DayCount.THIRTY_E_360) / 360.0
    return np.asarray(np.where(missing, np.nan, years), dtype=np.float64)


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
