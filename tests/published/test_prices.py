"""Prices, yields, accrued interest and durations of published examples."""

from __future__ import annotations

from dataclasses import replace
from datetime import date
from itertools import pairwise

import numpy as np
import pytest

from desk.book import Basis, Book, FlowTable, Holding, HoldingKind, PriceKind
from desk.book.accrual import ICMA, accrual_fraction
from desk.rates.compounding import Compounding
from desk.rates.day_count import DayCount
from desk.valuation.prices import HoldingPrice, holding_prices
from desk.valuation.yields import price_at_yield, street_yields


def _quoted(holding: Holding, today: date, rate: float = 0.03) -> HoldingPrice:
    """The holding on a curve that is flat at an annual rate."""
    basis = Basis(today, "EUR", np.array([1.0]), np.array([rate]))
    (found,) = holding_prices(Book(basis, FlowTable.empty(), (holding,)))
    return found


def _bond(
    maturity: date,
    coupon: float,
    *,
    day_count: DayCount | None = None,
    nominal: float = 100.0,
    price: float | None = None,
    price_kind: PriceKind = PriceKind.CLEAN,
    ex_dividend_days: int = 0,
) -> Holding:
    return Holding(
        "bond",
        HoldingKind.BOND,
        nominal,
        coupon,
        2,
        maturity,
        day_count,
        price=price,
        price_kind=price_kind,
        ex_dividend_days=ex_dividend_days,
    )


def _at_yield(holding: Holding, today: date, street: float) -> HoldingPrice:
    """The holding at the clean price of which the yield found is the one given."""
    low, high = 1.0, 1000.0
    while high - low > 1e-13 * high:
        middle = 0.5 * (low + high)
        found = _quoted(replace(holding, price=middle), today)
        low, high = (middle, high) if found.street_yield > street else (low, middle)
    return found


def test_price_yield_and_par_yield_on_a_zero_curve() -> None:
    """Hull, J.C., Options, Futures, and Other Derivatives, chapter 4: bond pricing, bond yield, par yield.

    Yield and par yield are recalled from memory. Times there are half years, so the curve here counts days in
    30/360.
    """
    basis = Basis(
        date(2026, 6, 30),
        "USD",
        np.array([0.5, 1.0, 1.5, 2.0]),
        np.array([0.05, 0.058, 0.064, 0.068]),
        compounding=Compounding.CONTINUOUS,
        day_count=DayCount.THIRTY_360,
    )

    def price(coupon: float) -> HoldingPrice:
        book = Book(basis, FlowTable.empty(), (_bond(date(2028, 6, 30), coupon),))
        return holding_prices(book)[0]

    found = price(0.06)
    assert found.dirty_price == pytest.approx(98.39, abs=0.006)
    assert found.dirty_price == pytest.approx(98.3850627729, abs=1e-9)
    assert np.log1p(found.effective_yield) == pytest.approx(0.0676, abs=5e-5)
    assert np.log1p(found.effective_yield) == pytest.approx(0.0676243871603, abs=1e-11)
    # The price is a straight line in the coupon.
    one, two = price(0.01).dirty_price, price(0.02).dirty_price
    par = 0.01 + 0.01 * (100.0 - one) / (two - one)
    assert par == pytest.approx(0.0687, abs=5e-5)
    assert price(par).street_yield == pytest.approx(par, abs=1e-12)


def test_six_bonds_at_6_per_cent_semi_annual() -> None:
    """Fabozzi, F.J., Bond Markets, Analysis and Strategies, price-volatility chapter (from memory)."""
    printed = [
        (9.0, 5, 112.7953, 4.07),
        (9.0, 25, 138.5946, 11.93),
        (6.0, 5, 100.0, 4.27),
        (6.0, 25, 100.0, 12.86),
        (0.0, 5, 74.4094, 4.85),
        (0.0, 25, 22.8107, 24.27),
    ]
    group = np.repeat(np.arange(6), [2 * years for _, years, _, _ in printed])
    periods = np.concatenate([np.arange(1.0, 2 * years + 1) for _, years, _, _ in printed])
    amount = np.concatenate(
        [[coupon / 2.0] * (2 * years - 1) + [100.0 + coupon / 2.0] for coupon, years, _, _ in printed]
    )
    twice = np.full(6, 2.0)
    price = price_at_yield(group, periods, amount, street=np.full(6, 0.06), frequency=twice)
    np.testing.assert_allclose(price, [row[2] for row in printed], rtol=0.0, atol=5e-5)
    found = street_yields(group, periods, amount, price=price, frequency=twice)
    np.testing.assert_allclose(found.street, 0.06, rtol=1e-12)
    np.testing.assert_allclose(found.modified, [row[3] for row in printed], rtol=0.0, atol=0.0051)
    np.testing.assert_allclose(found.macaulay, found.modified * 1.03, rtol=1e-12)


def test_uk_gilt() -> None:
    """QuantLib test suite, bonds: 8 % 7 June 2021, clean 103, verified there with a market terminal.

    The terminal prints the convexity divided by 100. The source takes the gilt cum dividend.
    """
    found = _quoted(_bond(date(2021, 6, 7), 0.08, price=103.0), date(2013, 5, 29))
    assert found.accrued_interest == pytest.approx(3.8021978, abs=1e-6)
    assert found.dirty_price == pytest.approx(106.8021978, abs=1e-6)
    assert found.clean_price == pytest.approx(103.0, abs=1e-10)
    assert found.street_yield == pytest.approx(0.07495180593, abs=1e-9)
    assert found.modified_duration == pytest.approx(5.676044458, abs=2e-6)
    assert found.convexity == pytest.approx(42.15314859, abs=2e-5)


@pytest.mark.parametrize(
    ("today", "accrued", "dirty", "street", "modified", "convexity"),
    [
        (date(2014, 8, 7), 2.867, 105.867, 0.04723814867, 2.262763296, 6.54870275),
        (date(2014, 8, 11), -0.066, 102.934, 0.04719277687, 2.317320093, 6.684074058),
    ],
)
def test_australian_government_bond(
    today: date, accrued: float, dirty: float, street: float, modified: float, convexity: float
) -> None:
    """QuantLib test suite, bonds: 6 % 15 February 2017, clean 103, verified there with a market terminal.

    The market rounds accrued interest to three decimals, so the price is handed over with it. From seven days
    before the coupon a buyer does not get it, and the accrued interest is negative.
    """
    bond = _bond(date(2017, 2, 15), 0.06, price=dirty, price_kind=PriceKind.DIRTY, ex_dividend_days=7)
    found = _quoted(bond, today)
    assert round(found.accrued_interest, 3) == accrued
    assert round(dirty - found.accrued_interest, 3) == pytest.approx(103.0, abs=0.0011)
    assert found.is_ex_dividend == (accrued < 0.0)
    assert found.street_yield == pytest.approx(street, abs=1e-9)
    assert found.modified_duration == pytest.approx(modified, abs=2e-6)
    assert found.convexity == pytest.approx(convexity, abs=2e-5)


def test_price_and_yield_in_30_360() -> None:
    """Microsoft Excel function reference, examples of PRICE and YIELD (basis 0, semi-annual)."""
    today = date(2008, 2, 15)
    found = _at_yield(_bond(date(2017, 11, 15), 0.0575, day_count=DayCount.THIRTY_360), today, 0.065)
    assert found.clean_price == pytest.approx(94.63436, abs=5e-6)
    assert found.clean_price == pytest.approx(94.6343616213, abs=1e-8)
    quoted = _bond(date(2016, 11, 15), 0.0575, day_count=DayCount.THIRTY_360, price=95.04287)
    assert _quoted(quoted, today).street_yield == pytest.approx(0.065, abs=1e-7)


def test_duration_and_modified_duration() -> None:
    """Microsoft Excel function reference, examples of DURATION and MDURATION, basis 1 (from memory)."""
    found = _at_yield(_bond(date(2016, 1, 1), 0.08), date(2008, 1, 1), 0.09)
    assert found.macaulay_duration == pytest.approx(5.993775, abs=5e-7)
    assert found.modified_duration == pytest.approx(5.73567, abs=5e-6)


@pytest.mark.parametrize(
    ("day_count", "price"),
    [
        (DayCount.THIRTY_360, 231.3131368118),
        (None, 231.3159871374),
        (DayCount.ACT_360, 231.3047708031),
        (DayCount.ACT_365F, 231.3187532524),
        (DayCount.THIRTY_E_360, 231.3131368118),
    ],
)
def test_price_in_every_basis(day_count: DayCount | None, price: float) -> None:
    """ExcelFinancialFunctions test data, PRICE, values produced by Excel.

    Redemption at 130 is a nominal of 130 with the coupon on 100. For bases 2 and 3 (Act/360, Act/365F) the
    spreadsheet takes as days to the next coupon what the accrued days leave of the period, as is done here.
    """
    bond = _bond(date(2003, 5, 14), 0.1 / 1.3, day_count=day_count, nominal=130.0)
    found = _at_yield(bond, date(1980, 3, 15), 0.03)
    assert 1.3 * found.clean_price == pytest.approx(price, abs=5e-9)


def _fraction(days: list[str], maturity: str, months: int) -> list[float]:
    """Act/Act ICMA fractions between neighbouring days."""
    pairs = list(pairwise(np.array(days, dtype="M8[D]")))
    size = len(pairs)
    fractions = accrual_fraction(
        np.array([first for first, _ in pairs]),
        np.array([last for _, last in pairs]),
        code=np.full(size, ICMA),
        maturity=np.full(size, np.datetime64(maturity)),
        months=np.full(size, months),
    )
    return [float(fraction) for fraction in fractions]


def test_odd_first_periods_in_act_act_icma() -> None:
    """ISDA, The Actual/Actual Day Count Fraction (memorandum, 1999), worked examples."""
    # Short first period of a schedule of 1 July each year.
    short = _fraction(["1999-02-01", "1999-07-01", "2000-07-01"], "2000-07-01", 12)
    np.testing.assert_allclose(short, [0.41095890411, 1.0], rtol=0.0, atol=1e-11)
    # Penultimate period of a schedule of the 30th.
    assert _fraction(["1999-07-30", "2000-01-30"], "2000-07-30", 6) == [0.5]
    # Long first period of a semi-annual schedule.
    long = _fraction(["2002-08-15", "2003-07-15", "2004-01-15"], "2004-01-15", 6)
    np.testing.assert_allclose(long, [0.915760869565, 0.5], rtol=0.0, atol=1e-11)
