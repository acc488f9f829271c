"""Holdings into flows: what each pays, and when."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date

import numpy as np
from numpy.typing import NDArray

from desk.book.arrays import FloatArray, IntArray
from desk.book.holding import Holding, HoldingKind
from desk.rates.day_count import DateArray, DayCount, year_fraction

__all__ = ["HoldingFlows", "add_months", "holding_flows"]


@dataclass(frozen=True, eq=False)
class HoldingFlows:
    """Flows of a list of holdings, by holding and then by date.

    Attributes
    ----------
    holding : ndarray of int, shape (n,)
        Each row's holding, as an index into the list.
    date : ndarray of datetime64[D], shape (n,)
    time : ndarray, shape (n,)
        Years from the valuation date.
    amount : ndarray, shape (n,)
        Amount received [currency].
    """

    holding: IntArray
    date: NDArray[np.datetime64]
    time: FloatArray
    amount: FloatArray


def holding_flows(
    holdings: Sequence[Holding], *, valuation_date: date, day_count: DayCount = DayCount.ACT_365F
) -> HoldingFlows:
    """What the holdings pay after the valuation date.

    Parameters
    ----------
    holdings : sequence of Holding, length m
    valuation_date : datetime.date
    day_count : DayCount
        Turns dates into years.

    Returns
    -------
    HoldingFlows
        A bond's coupons run back from its maturity by whole months, each on the day of the maturity or
        the last day of a shorter month; each pays ``nominal · coupon / frequency``, the next one whole,
        and the last comes with the nominal in one row. A zero pays its nominal at maturity, a deposit its
        nominal on the valuation date, a fund nothing.

    Notes
    -----
    The rule for the days is common practice for schedules without adjustment for business days: every
    coupon date is counted from the maturity itself, so that a bond of the 31st pays on the 30th in
    November and on the 31st again in May.
    """
    today = np.datetime64(valuation_date, "D")
    pays = np.array([holding.kind is not HoldingKind.FUND for holding in holdings], dtype=np.bool_)
    coupons = [_coupon_terms(holding) for holding in holdings]
    nominal = np.array([holding.nominal for holding in holdings], dtype=np.float64)
    last = np.array(
        [today if holding.maturity is None else holding.maturity for holding in holdings], "M8[D]"
    )
    is_deposit = np.array([holding.kind is HoldingKind.DEPOSIT for holding in holdings], dtype=np.bool_)
    last = np.where(is_deposit, today, last)
    step = np.array([months for months, _ in coupons], dtype=np.int64)
    coupon = np.array([amount for _, amount in coupons], dtype=np.float64)

    months_left = (last.astype("M8[M]") - today.astype("M8[M]")).astype(np.int64)
    count = np.where(step > 0, months_left // np.maximum(step, 1) + 1, 1)
    count[~pays | ((last <= today) & ~is_deposit)] = 0

    row = np.repeat(np.arange(len(holdings)), count)
    periods_before = np.repeat(np.cumsum(count), count) - 1 - np.arange(row.size)
    when = add_months(last[row], -periods_before * step[row])
    amount = coupon[row] + np.where(periods_before == 0, nominal[row], 0.0)
    # The earliest date counted may still fall in the month of the valuation date, before its day.
    kept = (when > today) | is_deposit[row]
    row, when, amount = row[kept], when[kept], amount[kept]
    return HoldingFlows(row, when, year_fraction(today, when, day_count), amount)


def _coupon_terms(holding: Holding) -> tuple[int, float]:
    """Months between coupons, and the amount of each; zeros where the holding pays none."""
    if holding.kind is not HoldingKind.BOND or holding.coupon == 0.0:
        return 0, 0.0
    return 12 // holding.frequency, holding.nominal * holding.coupon / holding.frequency


def add_months(start: DateArray, months: NDArray[np.int64]) -> DateArray:
    """Dates a number of months later, on the same day or the last day of a shorter month.

    Parameters
    ----------
    start : ndarray of datetime64[D], shape (n,)
    months : ndarray of int, shape (n,)
        May be negative.

    Returns
    -------
    ndarray of datetime64[D], shape (n,)
    """
    month = start.astype("M8[M]")
    day = start - month.astype("M8[D]")
    target = month + months
    first = target.astype("M8[D]")
    length = (target + 1).astype("M8[D]") - first
    return np.asarray(first + np.minimum(day, length - np.timedelta64(1, "D")), dtype="M8[D]")
