"""Quotes as the market states them, turned into payments and their value.

Terms are years from the valuation date, or dates, of which the payments then run back by whole months. Where
a term is no whole number of periods the first payment stands for the part of a period before it.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.rates.curve_error import CurveError
from desk.rates.day_count import DateArray, DayCount, add_months, coupon_fraction, year_fraction
from desk.rates.quoted_flows import QuotedFlows

__all__ = ["bond_flows", "par_flows", "swap_flows", "zero_flows"]

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

_FREQUENCIES = (1, 2, 3, 4, 6, 12)
_LONGEST_TERM = 1000.0  # years; a slip of the pen must not make millions of payments
_WHOLE = 1e-9  # of a period: a term this close to a whole number of periods is one


def zero_flows(terms: ArrayLike, rates: ArrayLike) -> QuotedFlows:
    """Zero rates as bonds that pay 1 at their term.

    Parameters
    ----------
    terms : array_like, shape (m,)
        [years]
    rates : array_like, shape (m,)
        Continuously compounded [1/year].

    Raises
    ------
    CurveError
        If a term or a rate is not one; `rows` names the quotes.
    """
    years, stated = _checked_terms(terms), _checked_rates(rates, terms)
    with np.errstate(over="ignore", under="ignore"):
        worth = np.exp(-stated * years)
    return QuotedFlows(np.arange(years.size), years, np.ones(years.size), worth)


def par_flows(terms: ArrayLike, rates: ArrayLike, *, payments_per_year: int = 1) -> QuotedFlows:
    """Par yields: the coupon rates at which bonds are worth their principal of 1.

    Parameters
    ----------
    terms : array_like, shape (m,)
        [years]
    rates : array_like, shape (m,)
        Yearly coupon rates, which are the yields compounded `payments_per_year` times [1/year].
    payments_per_year : int
        1, 2, 3, 4, 6 or 12.

    Raises
    ------
    CurveError
        If a term or a rate is not one; `rows` names the quotes.
    """
    return swap_flows(terms, rates, payments_per_year=payments_per_year)


def swap_flows(
    maturities: ArrayLike,
    rates: ArrayLike,
    *,
    payments_per_year: int = 1,
    day_count: DayCount | None = None,
    valuation_date: date | None = None,
    time_count: DayCount = DayCount.ACT_365F,
) -> QuotedFlows:
    """Swap rates against a floating leg that is worth its principal of 1.

    Parameters
    ----------
    maturities : array_like, shape (m,)
        Years, or dates (datetime64).
    rates : array_like, shape (m,)
        Fixed rates [1/year].
    payments_per_year : int
        Of the fixed leg: 1, 2, 3, 4, 6 or 12.
    day_count : DayCount, optional
        Of the fixed leg; with dates alone. By default Act/Act ICMA.
    valuation_date : datetime.date, optional
        With dates alone, and then needed.
    time_count : DayCount
        Turns dates into years.

    Returns
    -------
    QuotedFlows
        ``rate · fraction`` at each payment and 1 at the end, worth 1. The fraction is that of the day count
        from one payment to the next, from the valuation date to the first; without dates it is the time
        between them.

    Raises
    ------
    CurveError
        If a maturity is past or a rate is not one; `rows` names the quotes.

    References
    ----------
    Hull, J.C., Options, Futures, and Other Derivatives, chapters 4 (par yields) and 7 (swaps as bonds). One
    curve serves for both legs: the floating leg is worth its principal at the start.
    """
    per_year = _checked_frequency(payments_per_year, np.ones(np.shape(rates), dtype=np.int64))
    if _are_dates(maturities):
        schedule = _schedule_of_dates(maturities, per_year, valuation_date, time_count)
        stated = _checked_rates(rates, maturities)
        start, end = schedule.start, schedule.end
        ahead = np.maximum(start, np.datetime64(valuation_date, "D"))
        own = schedule.instrument
        if day_count is None or day_count is DayCount.ACT_ACT_ICMA:
            fraction = coupon_fraction(
                ahead, end, period_start=start, period_end=end, frequency=per_year[own]
            )
        else:
            last_day = end[schedule.last_row][own]
            fraction = year_fraction(ahead, end, day_count, termination=last_day)
    else:
        if day_count is not None or valuation_date is not None:
            raise ValueError("`day_count` and `valuation_date` go with maturities that are dates")
        schedule = _schedule_of_years(maturities, per_year)
        stated = _checked_rates(rates, maturities)
        own = schedule.instrument
        fraction = (schedule.periods - np.maximum(schedule.periods - 1.0, 0.0)) / per_year[own]
    amount = stated[own] * fraction
    amount[schedule.last_row] += 1.0
    return _paying(schedule, amount, np.ones(stated.size))


def bond_flows(
    maturities: ArrayLike,
    coupons: ArrayLike,
    *,
    frequency: ArrayLike = 2,
    prices: ArrayLike | None = None,
    yields: ArrayLike | None = None,
    is_clean: ArrayLike = False,
    day_count: DayCount | None = None,
    valuation_date: date | None = None,
    time_count: DayCount = DayCount.ACT_365F,
) -> QuotedFlows:
    """Bonds of a nominal of 100 with their prices or yields.

    Parameters
    ----------
    maturities : array_like, shape (m,)
        Years, or dates (datetime64).
    coupons : array_like, shape (m,)
        Coupon rates [1/year]; 0 for a bond without coupons.
    frequency : array_like of int, shape () or (m,)
        Coupons a year: 1, 2, 3, 4, 6 or 12; for a bond without coupons, that of its yield.
    prices : array_like, shape (m,), optional
        Per 100 of nominal.
    yields : array_like, shape (m,), optional
        Compounded `frequency` times a year [1/year]. A bond has a price or a yield, the other being NaN.
    is_clean : array_like of bool, shape () or (m,)
        Whether the prices are without accrued interest.
    day_count : DayCount, optional
        Of the accrued interest, with dates alone. By default Act/Act ICMA.
    valuation_date : datetime.date, optional
        With dates alone, and then needed.
    time_count : DayCount
        Turns dates into years.

    Raises
    ------
    CurveError
        If a bond is past its maturity, or has neither or both of price and yield, or one that no bond can
        have; `rows` names the bonds.

    References
    ----------
    Price from yield over coupon periods, the first counted by its days: common practice; Stigum, M. and
    Robinson, F.L., Money Market and Bond Calculations (1996).
    """
    coupon = _checked_rates(coupons, maturities)
    per_year = _checked_frequency(frequency, np.ones(coupon.shape, dtype=np.int64))
    if _are_dates(maturities):
        schedule = _schedule_of_dates(maturities, per_year, valuation_date, time_count)
    elif day_count is not None or valuation_date is not None:
        raise ValueError("`day_count` and `valuation_date` go with maturities that are dates")
    else:
        schedule = _schedule_of_years(maturities, per_year)
    own = schedule.instrument
    amount = 100.0 * coupon[own] / per_year[own]
    amount[schedule.last_row] += 100.0
    price, bond_yield = (_optional(values, coupon.shape) for values in (prices, yields))
    given = np.isfinite(price).astype(int) + np.isfinite(bond_yield)
    _refuse(given == 0, "the bond has neither a price nor a yield", "Give one of them.")
    _refuse(given == 2, "the bond has both a price and a yield", "Leave one of them out.")
    _refuse(price <= 0.0, "the price is not above 0", "Give the price per 100 of nominal.")
    _refuse(bond_yield <= -per_year, "the yield leaves nothing of the principal", "Give a higher yield.")

    part_left = schedule.periods[schedule.first_row]
    clean = np.broadcast_to(np.asarray(is_clean, dtype=np.bool_), coupon.shape)
    if clean.any():
        accrued = 100.0 * coupon * _accrued_years(schedule, part_left, per_year, day_count)
        price = np.where(clean, price + accrued, price)
    with np.errstate(over="ignore", under="ignore"):
        growth = np.log1p(np.where(np.isfinite(bond_yield), bond_yield, 0.0) / per_year)
        of_yield = np.add.reduceat(amount * np.exp(-growth[own] * schedule.periods), schedule.first_row)
    return _paying(schedule, amount, np.where(np.isfinite(bond_yield), of_yield, price))


@dataclass(frozen=True, eq=False)
class _Schedule:
    """Payments by instrument and time, each array of shape (n,)."""

    instrument: IntArray
    time: FloatArray
    periods: FloatArray  # coupon periods from the valuation date, the first by its days
    start: DateArray  # of the period that each payment ends; with dates alone
    end: DateArray
    valuation_date: np.datetime64

    @property
    def first_row(self) -> NDArray[np.intp]:
        return np.flatnonzero(np.diff(self.instrument, prepend=-1))

    @property
    def last_row(self) -> NDArray[np.intp]:
        return np.append(self.first_row[1:], self.instrument.size) - 1


def _schedule_of_years(terms: ArrayLike, per_year: IntArray) -> _Schedule:
    years = _checked_terms(terms)
    periods = years * per_year
    periods = np.where(np.abs(periods - np.round(periods)) <= _WHOLE, np.round(periods), periods)
    count = np.maximum(np.ceil(periods), 1.0).astype(np.int64)
    own, after = _rows(count)
    passed = periods[own] - after
    time = passed / per_year[own]
    none = np.empty(0, dtype="datetime64[D]")
    last = after == 0
    time[last] = years
    return _Schedule(own, time, passed, none, none, np.datetime64("NaT", "D"))


def _schedule_of_dates(
    maturities: ArrayLike, per_year: IntArray, valuation_date: date | None, time_count: DayCount
) -> _Schedule:
    if valuation_date is None:
        raise ValueError("`valuation_date` is needed where the maturities are dates")
    today = np.datetime64(valuation_date, "D")
    maturity = np.asarray(maturities).astype("datetime64[D]")
    _refuse(np.isnat(maturity), "the maturity is no date", "Give the day of the last payment.")
    _refuse(
        maturity <= today,
        f"the instrument has matured by the valuation date, {valuation_date}",
        "Leave it out, or correct its maturity.",
    )
    too_long = maturity.astype("datetime64[Y]") - today.astype("datetime64[Y]") > np.timedelta64(1000, "Y")
    _refuse(too_long, "the maturity is more than 1000 years away", "Correct it.")
    months = 12 // per_year
    left = (maturity.astype("datetime64[M]") - today.astype("datetime64[M]")).astype(np.int64)
    count = left // months + 1
    own, after = _rows(count)
    end = add_months(maturity[own], -after * months[own])
    # The earliest date counted may still fall in the month of the valuation date, before its day.
    kept = end > today
    own, after, end = own[kept], after[kept], end[kept]
    start = add_months(maturity[own], -(after + 1) * months[own])
    first = np.flatnonzero(np.diff(own, prepend=-1))
    running = (end[first] - today).astype(np.float64) / (end[first] - start[first]).astype(np.float64)
    number = np.arange(own.size) - np.repeat(first, np.diff(first, append=own.size))
    time = year_fraction(today, end, time_count, termination=maturity[own])
    return _Schedule(own, time, running[own] + number, start, end, today)


def _rows(count: IntArray) -> tuple[IntArray, IntArray]:
    """Each payment's instrument, and how many of its payments come after."""
    own = np.repeat(np.arange(count.size), count)
    return own, np.repeat(np.cumsum(count), count) - 1 - np.arange(own.size)


def _accrued_years(
    schedule: _Schedule, part_left: FloatArray, per_year: IntArray, day_count: DayCount | None
) -> FloatArray:
    """Years of interest accrued by the valuation date, shape (m,)."""
    if day_count is None or day_count is DayCount.ACT_ACT_ICMA:
        return np.asarray((1.0 - part_left) / per_year)
    rows = schedule.first_row
    last_day = schedule.end[schedule.last_row]
    return year_fraction(schedule.start[rows], schedule.valuation_date, day_count, termination=last_day)


def _paying(schedule: _Schedule, amount: FloatArray, target: FloatArray) -> QuotedFlows:
    """The flows without payments of nothing."""
    paid = amount != 0.0
    return QuotedFlows(schedule.instrument[paid], schedule.time[paid], amount[paid], target)


def _are_dates(maturities: ArrayLike) -> bool:
    return np.asarray(maturities).dtype.kind == "M"


def _checked_terms(terms: ArrayLike) -> FloatArray:
    years = np.asarray(terms, dtype=np.float64)
    if years.ndim != 1 or not years.size:
        raise CurveError("there is no quote", "Give at least one.")
    _refuse(~(years > 0.0), "the term is not above 0 years", "Correct it or leave it out.")
    _refuse(years > _LONGEST_TERM, f"the term is more than {_LONGEST_TERM:g} years", "Correct it.")
    return years


def _checked_rates(rates: ArrayLike, terms: ArrayLike) -> FloatArray:
    stated = np.asarray(rates, dtype=np.float64)
    if stated.ndim != 1 or stated.shape != np.shape(terms):
        raise ValueError("there must be one rate for each term")
    _refuse(~np.isfinite(stated), "the rate is not a number", "Correct it or leave it out.")
    return stated


def _checked_frequency(frequency: ArrayLike, ones: IntArray) -> IntArray:
    per_year = np.asarray(frequency) * ones
    wrong = ~np.isin(per_year, _FREQUENCIES)
    _refuse(wrong, "the number of payments a year is not 1, 2, 3, 4, 6 or 12", "Give one of these.")
    return per_year.astype(np.int64)


def _optional(values: ArrayLike | None, shape: tuple[int, ...]) -> FloatArray:
    found = np.full(shape, np.nan) if values is None else np.asarray(values, dtype=np.float64)
    if found.shape != shape:
        raise ValueError("`prices` and `yields` must hold one number for each bond")
    return found


def _refuse(wrong: NDArray[np.bool_], found: str, mend: str) -> None:
    if np.any(wrong):
        raise CurveError(found, mend, rows=np.flatnonzero(wrong).tolist())
