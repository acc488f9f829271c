"""Bootstrapped curves against QuantLib: 500 random curves of swap rates, 500 of bond prices.

QuantLib's log-linear discount factors with the valuation date as a node draw the same curve as ours. Each
curve is compared at its terms and between them.
"""

from __future__ import annotations

from datetime import date

import numpy as np
import QuantLib as ql
from numpy.typing import NDArray

from desk.rates.bootstrap import bootstrap
from desk.rates.curve import Curve
from desk.rates.day_count import DayCount, add_months
from desk.rates.quotes import bond_flows, par_flows, swap_flows

CASES = 500
DAY_COUNTS = {
    DayCount.ACT_360: ql.Actual360(),
    DayCount.ACT_365F: ql.Actual365Fixed(),
    DayCount.THIRTY_360: ql.Thirty360(ql.Thirty360.BondBasis),
    DayCount.THIRTY_E_360: ql.Thirty360(ql.Thirty360.EurobondBasis),
    DayCount.ACT_ACT_ISDA: ql.ActualActual(ql.ActualActual.ISDA),
}
FREQUENCIES = {1: ql.Annual, 2: ql.Semiannual, 4: ql.Quarterly, 12: ql.Monthly}
CALENDAR = ql.NullCalendar()


def _theirs(day: object) -> ql.Date:
    return ql.Date(str(day), "%Y-%m-%d")


def _piecewise(today: date, helpers: list[ql.RateHelper]) -> ql.YieldTermStructure:
    curve = ql.PiecewiseLogLinearDiscount(_theirs(today), helpers, ql.Actual365Fixed())
    curve.enableExtrapolation()
    return curve


def _compare(ours: Curve, theirs: ql.YieldTermStructure, random: np.random.Generator) -> float:
    """The largest relative difference of discount factors at the terms and between them."""
    times = np.concatenate((ours.terms, random.uniform(0.0, ours.last_term, 10)))
    # The last date as a time may differ from the last node by rounding.
    expected = np.array([theirs.discount(float(time)) for time in np.minimum(times, theirs.maxTime())])
    return float(np.max(np.abs(ours.discount(times) / expected - 1.0)))


def _valuation_day(random: np.random.Generator) -> date:
    year, month, day = random.integers((2005, 1, 1), (2035, 13, 29)).tolist()
    return date(year, month, day)


def _swap_quotes(
    random: np.random.Generator, most_years: int
) -> tuple[NDArray[np.int64], NDArray[np.float64]]:
    count = int(random.integers(1, 9))
    years = np.sort(random.choice(np.arange(1, most_years), count, replace=False))
    # A smooth curve with some roughness: QuantLib searches each node within bounds only.
    rise = random.uniform(-0.01, 0.015) * -np.expm1(-years / random.uniform(2.0, 12.0))
    rates = random.uniform(-0.004, 0.05) + rise + 0.0003 * random.standard_normal(count)
    return years, rates


def test_swap_rates() -> None:
    random = np.random.default_rng(11)
    largest = 0.0
    for _ in range(CASES):
        today = _valuation_day(random)
        ql.Settings.instance().evaluationDate = _theirs(today)
        years, rates = _swap_quotes(random, 31)
        per_year = int(random.choice([1, 2, 4]))
        day_count = list(DAY_COUNTS)[random.integers(len(DAY_COUNTS))]
        index = ql.IborIndex(
            "floating",
            ql.Period(6, ql.Months),
            0,
            ql.EURCurrency(),
            CALENDAR,
            ql.Unadjusted,
            False,
            ql.Actual360(),
        )
        helpers = [
            ql.SwapRateHelper(
                float(rate),
                ql.Period(int(year), ql.Years),
                CALENDAR,
                FREQUENCIES[per_year],
                ql.Unadjusted,
                DAY_COUNTS[day_count],
                index,
            )
            for year, rate in zip(years, rates, strict=True)
        ]
        flows = swap_flows(
            add_months(np.datetime64(today), 12 * years),
            rates,
            payments_per_year=per_year,
            day_count=day_count,
            valuation_date=today,
        )
        largest = max(largest, _compare(bootstrap(flows), _piecewise(today, helpers), random))
    # QuantLib stops its own search at 1e-12 of each quote.
    assert largest < 1e-10


def test_par_yields_are_coupons_of_bonds_at_par() -> None:
    random = np.random.default_rng(12)
    largest = 0.0
    # Thirty days a month makes the regular periods of both sides equal parts of a year.
    time_count = ql.Thirty360(ql.Thirty360.BondBasis)
    today = date(2026, 6, 15)
    ql.Settings.instance().evaluationDate = _theirs(today)
    for _ in range(CASES):
        years, rates = _swap_quotes(random, 41)
        per_year = int(random.choice([1, 2, 4, 12]))
        helpers = []
        for year, rate in zip(years, rates, strict=True):
            maturity = add_months(np.datetime64(today), int(12 * year))
            schedule = ql.Schedule(
                _theirs(today),
                _theirs(maturity),
                ql.Period(FREQUENCIES[per_year]),
                CALENDAR,
                ql.Unadjusted,
                ql.Unadjusted,
                ql.DateGeneration.Backward,
                False,
            )
            price = ql.QuoteHandle(ql.SimpleQuote(100.0))
            helpers.append(ql.FixedRateBondHelper(price, 0, 100.0, schedule, [float(rate)], time_count))
        theirs = ql.PiecewiseLogLinearDiscount(_theirs(today), helpers, time_count)
        ours = bootstrap(par_flows(years, rates, payments_per_year=per_year))
        largest = max(largest, _compare(ours, theirs, random))
    assert largest < 1e-10


def test_bond_prices() -> None:
    random = np.random.default_rng(13)
    largest = 0.0
    for _ in range(CASES):
        today = _valuation_day(random)
        ql.Settings.instance().evaluationDate = _theirs(today)
        count = int(random.integers(1, 9))
        # Bonds of neighbouring days would ask for forwards beyond the bounds of QuantLib's search.
        quarters = np.sort(random.choice(np.arange(120), count, replace=False))
        maturity = np.datetime64(today) + 90 * quarters + random.integers(10, 50, count)
        coupon = random.uniform(0.0, 0.08, count)
        frequency = random.choice([1, 2, 4], count)
        level = random.uniform(0.0, 0.06)
        years = (maturity - np.datetime64(today)).astype(float) / 365.0
        fair = bond_flows(
            maturity,
            coupon,
            frequency=frequency,
            yields=level + 0.0002 * years + 0.0002 * random.standard_normal(count),
            valuation_date=today,
        )
        is_clean = bool(random.random() < 0.7)
        helpers, prices = [], []
        for place in range(count):
            months = 12 // int(frequency[place])
            back = -(int((maturity[place] - np.datetime64(today)).astype(int)) // 28 // months + 2) * months
            begin = add_months(maturity[place], back)
            schedule = ql.Schedule(
                _theirs(begin),
                _theirs(maturity[place]),
                ql.Period(months, ql.Months),
                CALENDAR,
                ql.Unadjusted,
                ql.Unadjusted,
                ql.DateGeneration.Backward,
                False,
            )
            counter = ql.ActualActual(ql.ActualActual.ISMA, schedule)
            bond = ql.FixedRateBond(0, 100.0, schedule, [float(coupon[place])], counter, ql.Unadjusted)
            dirty = float(fair.target[place])
            prices.append(dirty - bond.accruedAmount(_theirs(today)) if is_clean else dirty)
            kind = ql.BondPrice.Clean if is_clean else ql.BondPrice.Dirty
            quote = ql.QuoteHandle(ql.SimpleQuote(prices[-1]))
            helpers.append(ql.BondHelper(quote, bond, kind))
        flows = bond_flows(
            maturity,
            coupon,
            frequency=frequency,
            prices=prices,
            is_clean=is_clean,
            valuation_date=today,
        )
        largest = max(largest, _compare(bootstrap(flows), _piecewise(today, helpers), random))
    assert largest < 1e-10


def test_bond_prices_from_yields() -> None:
    """500 random bonds priced from their yields, with the clean prices and accrued interest of QuantLib."""
    random = np.random.default_rng(14)
    today = date(2026, 6, 15)
    ql.Settings.instance().evaluationDate = _theirs(today)
    for _ in range(CASES):
        maturity = np.datetime64(today) + np.timedelta64(int(random.integers(20, 15_000)), "D")
        frequency, coupon = int(random.choice([1, 2, 4])), float(random.uniform(0.0, 0.1))
        stated = float(random.uniform(-0.01, 0.1))
        months = 12 // frequency
        back = -(int((maturity - np.datetime64(today)).astype(int)) // 28 // months + 2) * months
        begin = add_months(maturity, back)
        schedule = ql.Schedule(
            _theirs(begin),
            _theirs(maturity),
            ql.Period(months, ql.Months),
            CALENDAR,
            ql.Unadjusted,
            ql.Unadjusted,
            ql.DateGeneration.Backward,
            False,
        )
        counter = ql.ActualActual(ql.ActualActual.ISMA, schedule)
        bond = ql.FixedRateBond(0, 100.0, schedule, [coupon], counter, ql.Unadjusted)
        ours = bond_flows(
            np.array([maturity]),
            [coupon],
            frequency=frequency,
            yields=[stated],
            valuation_date=today,
        )
        clean = bond.cleanPrice(stated, counter, ql.Compounded, FREQUENCIES[frequency], _theirs(today))
        theirs = clean + bond.accruedAmount(_theirs(today))
        np.testing.assert_allclose(ours.target, theirs, rtol=1e-11)
