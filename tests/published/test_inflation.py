"""Inflation: the collar's closed form, floors on the whole growth, and linked bonds against QuantLib."""

from __future__ import annotations

from datetime import date

import numpy as np
import pytest
import QuantLib as ql
from scipy.integrate import quad
from scipy.stats import norm

from desk.book import Basis, Book, FlowTable, Holding, HoldingKind, Inflation, PriceKind
from desk.rates.compounding import Compounding
from desk.rates.inflation import expected_increase, expected_increase_slope, floored_growth
from desk.valuation.prices import holding_prices
from desk.valuation.standing import stand
from tests.published.quantlib import day


def test_pension_increase_with_a_collar() -> None:
    """0 to 5 % about a mean of 2.5 %: by symmetry the mean (closed form, Bachelier's normal model)."""
    assert expected_increase(0.025, sd=0.015, floor=0.0, cap=0.05) == pytest.approx(0.025, abs=6e-11)


def test_collar_by_quadrature() -> None:
    """``E[min(max(X, floor), cap)]`` integrated numerically, 150 random cases, within 1e-10."""
    random = np.random.default_rng(9)
    for _ in range(150):
        mean, sd = random.normal(0.025, 0.03), random.uniform(0.002, 0.04)
        floor = random.normal(0.0, 0.02)
        cap = floor + random.uniform(0.0, 0.08)
        low, high = mean - 12.0 * sd, mean + 12.0 * sd
        kinks = [point for point in (floor, cap) if low < point < high]

        def held(
            x: float, floor: float = floor, cap: float = cap, mean: float = mean, sd: float = sd
        ) -> float:
            return float(min(max(x, floor), cap) * norm.pdf(x, mean, sd))

        expected = quad(held, low, high, points=kinks or None, epsabs=1e-13, limit=200)[0]
        assert expected_increase(mean, sd=sd, floor=floor, cap=cap) == pytest.approx(expected, abs=1e-10)


def test_collar_from_floorlet_and_caplet_of_the_library() -> None:
    """The mean, a floorlet more, a caplet less, by QuantLib's Bachelier formula: 500 random cases, 1e-14."""
    random = np.random.default_rng(10)
    for _ in range(500):
        mean, sd = random.normal(0.025, 0.02), random.uniform(0.001, 0.05)
        floor = random.normal(0.0, 0.02)
        cap = floor + random.uniform(0.0, 0.08)
        put = ql.bachelierBlackFormula(ql.Option.Put, floor, mean, sd, 1.0)
        call = ql.bachelierBlackFormula(ql.Option.Call, cap, mean, sd, 1.0)
        found = expected_increase(mean, sd=sd, floor=floor, cap=cap)
        assert found == pytest.approx(mean + put - call, abs=1e-14)
        inside = ql.CumulativeNormalDistribution(mean, sd)
        slope = expected_increase_slope(mean, sd=sd, floor=floor, cap=cap)
        assert slope == pytest.approx(inside(cap) - inside(floor), abs=1e-12)


def test_floor_on_the_whole_growth_against_the_library() -> None:
    """The growth and a put on it, by QuantLib's Black formula: 500 random cases, 1e-13."""
    random = np.random.default_rng(11)
    for _ in range(500):
        growth, least = random.uniform(0.5, 3.0, 2)
        deviation = random.uniform(0.001, 0.5)
        put = ql.blackFormula(ql.Option.Put, least, growth, deviation, 1.0)
        assert floored_growth(growth, log_sd=deviation, least=least) == pytest.approx(growth + put, rel=1e-13)


TODAY = date(2026, 6, 1)


def _library_value(holding: Holding, *, inflation: float, rate: float, past: float) -> float:
    """Value of a whole linked bond in money, by QuantLib.

    Where its conventions are ours: the valuation date and every coupon on the first of one month, so that
    the index is read on the first of a month and lags are equal; one rate of inflation, past and to come.
    """
    today = day(TODAY)
    ql.Settings.instance().evaluationDate = today
    lag = ql.Period(holding.index_lag_months, ql.Months)
    handle = ql.RelinkableZeroInflationTermStructureHandle()
    index = ql.ZeroInflationIndex(
        f"prices {inflation} {past}",
        ql.CustomRegion("Nowhere", "NW"),
        False,
        ql.Monthly,
        ql.Period(1, ql.Months),
        ql.EURCurrency(),
        handle,
    )
    base = today - lag
    index.addFixing(base, past)
    curve = ql.ZeroInflationCurve(
        today,
        [base, base + ql.Period(80, ql.Years)],
        [inflation, inflation],
        ql.Monthly,
        ql.Actual365Fixed(),
    )
    handle.linkTo(curve)
    assert holding.maturity is not None
    schedule = ql.Schedule(
        day(date(TODAY.year - 1, TODAY.month, 1)),
        day(holding.maturity),
        ql.Period(ql.Annual),
        ql.NullCalendar(),
        ql.Unadjusted,
        ql.Unadjusted,
        ql.DateGeneration.Backward,
        False,
    )
    bond = ql.CPIBond(
        0,
        holding.nominal,
        False,
        past / holding.index_ratio,
        lag,
        index,
        ql.CPI.Flat,
        schedule,
        [holding.coupon],
        ql.ActualActual(ql.ActualActual.ISMA),
        ql.Unadjusted,
    )
    nominal = ql.FlatForward(today, rate, ql.Actual365Fixed(), ql.Continuous)
    bond.setPricingEngine(ql.DiscountingBondEngine(ql.YieldTermStructureHandle(nominal)))
    return float(bond.NPV())


def test_linked_bonds_against_the_library() -> None:
    """200 random linked bonds on flat curves: present value within 1e-10 of QuantLib's.

    The lag is read in its months there and as a twelfth of years here; on one rate of inflation, with the
    days from the valuation date to each coupon equal to those between the two lagged days, they agree.
    """
    random = np.random.default_rng(12)
    for _ in range(200):
        inflation, rate = random.uniform(-0.01, 0.06), random.uniform(-0.005, 0.06)
        holding = Holding(
            "linker",
            HoldingKind.LINKED_BOND,
            float(random.uniform(10.0, 1e4)),
            float(random.uniform(0.0005, 0.04)),
            1,
            date(TODAY.year + int(random.integers(1, 40)), 6, 1),
            index_lag_months=int(random.choice([2, 3])),
            index_ratio=float(random.uniform(0.9, 2.0)),
        )
        basis = Basis(
            TODAY,
            "EUR",
            np.array([1.0]),
            np.array([rate]),
            compounding=Compounding.CONTINUOUS,
            inflation=Inflation(np.array([1.0]), np.array([inflation])),
        )
        price = holding_prices(Book(basis, FlowTable.empty(), (holding,)))[0]
        expected = _library_value(holding, inflation=inflation, rate=rate, past=100.0)
        assert price.present_value == pytest.approx(expected, rel=1e-10)


def test_price_in_real_terms() -> None:
    """Clean real price times the index ratio, and uplifted accrued interest (common practice).

    A bond of the UK style, United Kingdom Debt Management Office, Formulae for calculating gilt prices from
    yields (from memory): half-yearly coupons, three months of lag; settled 100 days into a period of 183.
    """
    today = date(2026, 7, 31)
    holding = Holding(
        "linker",
        HoldingKind.LINKED_BOND,
        1_000_000.0,
        0.0125,
        2,
        date(2036, 10, 22),
        index_ratio=1.32815,
        price=101.25,
        price_kind=PriceKind.CLEAN,
    )
    basis = Basis(
        today,
        "GBP",
        np.array([1.0]),
        np.array([0.04]),
        inflation=Inflation(np.array([1.0]), np.array([0.03])),
    )
    book = Book(basis, FlowTable.empty(), (holding,))
    days = (today - date(2026, 4, 22)).days
    assert (days, (date(2026, 10, 22) - date(2026, 4, 22)).days) == (100, 183)
    accrued = 1.32815 * 1_000_000.0 * 0.0125 / 2.0 * 100 / 183
    price = holding_prices(book)[0]
    assert price.accrued_interest == pytest.approx(accrued, rel=1e-12)
    assert price.present_value == pytest.approx(1.32815 * 10_000.0 * 101.25 + accrued, rel=1e-10)
    assert price.clean_price == pytest.approx(101.25, rel=1e-10)
    assert stand(book).lines[0].market_value == pytest.approx(price.present_value, rel=1e-10)

    # The real yield, by the formula for a bond with half-yearly coupons: the dirty real price is what the
    # real payments are worth at it, with r of s days to the next coupon.
    v = 1.0 / (1.0 + price.real_yield / 2.0)
    first, coupon, whole = 83 / 183, 100.0 * 0.0125 / 2.0, 20
    worth = v**first * (coupon * (1.0 - v ** (whole + 1)) / (1.0 - v) + 100.0 * v**whole)
    assert worth == pytest.approx(price.dirty_price, rel=1e-10)
    assert price.dirty_price == pytest.approx(101.25 + 100.0 * 0.0125 / 2.0 * 100 / 183, rel=1e-10)
