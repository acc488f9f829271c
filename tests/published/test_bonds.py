"""Bond maths and immunisation: published figures, and 600 random bonds against QuantLib."""

from __future__ import annotations

from datetime import date, timedelta

import numpy as np
import pytest
import QuantLib as ql

from desk.book import Basis, Book, FlowTable, Holding, HoldingKind, Side
from desk.book.schedule import holding_flows
from desk.rates.compounding import Compounding, from_continuous, to_continuous
from desk.rates.curve import Curve, Interpolation
from desk.valuation.measures import key_rate_durations, measure, measure_groups, value_rows
from desk.valuation.priced import priced_flows
from desk.valuation.roots import solve_rates
from desk.valuation.standing import redington_conditions, stand

TODAY = date(2026, 6, 30)


def _flat(rate: float, compounding: Compounding = Compounding.CONTINUOUS) -> Curve:
    return Curve([1.0], to_continuous([rate], compounding))


def _internal_rate(times: list[float], amounts: list[float]) -> float:
    """Annual effective rate at which the amounts are worth nothing."""
    group = np.zeros(len(times), dtype=np.int64)
    found = solve_rates(group, np.array(times), np.array(amounts), target=np.zeros(1))
    return float(np.expm1(found[0]))


HALF_YEARS = [0.5, 1.0, 1.5, 2.0, 2.5, 3.0]
SEMI_ANNUAL_10 = [5.0, 5.0, 5.0, 5.0, 5.0, 105.0]


def test_three_year_bond_at_12_per_cent_continuous() -> None:
    """Hull, J.C., Options, Futures, and Other Derivatives, chapter 4, duration table, convexity section.

    The price after a rise of 0.1 % and the first-order change are recalled from memory.
    """
    found = measure(value_rows(HALF_YEARS, SEMI_ANNUAL_10, curve=_flat(0.12)))
    assert found.present_value == pytest.approx(94.213, abs=0.0006)
    assert found.effective_duration == pytest.approx(2.653, abs=0.0006)
    assert found.convexity == pytest.approx(7.57, abs=0.0006)
    first_order = -found.present_value * found.effective_duration * 0.001
    assert first_order == pytest.approx(-0.25, abs=0.0006)
    higher = measure(value_rows(HALF_YEARS, SEMI_ANNUAL_10, curve=_flat(0.121)))
    assert higher.present_value == pytest.approx(93.963, abs=0.0006)


def test_the_same_bond_with_its_yield_stated_semi_annually() -> None:
    """Hull, Options, Futures, and Other Derivatives, chapter 4, modified duration (from memory).

    The book multiplies rounded figures, hence the width on the slope.
    """
    stated = float(from_continuous(0.12, Compounding.SEMI_ANNUAL))
    assert stated == pytest.approx(0.123673, abs=5e-7)
    found = measure(value_rows(HALF_YEARS, SEMI_ANNUAL_10, curve=_flat(0.12)))
    modified = found.effective_duration / (1.0 + stated / 2.0)
    assert modified == pytest.approx(2.499, abs=0.0006)
    assert -modified * found.present_value == pytest.approx(-235.39, abs=0.03)


def test_bond_price_yield_and_par_yield_on_a_zero_curve() -> None:
    """Hull, Options, Futures, and Other Derivatives, chapter 4: bond pricing, bond yield, par yield.

    The yield and the par yield are recalled from memory.
    """
    times = [0.5, 1.0, 1.5, 2.0]
    curve = Curve(times, [0.05, 0.058, 0.064, 0.068])
    found = measure(value_rows(times, [3.0, 3.0, 3.0, 103.0], curve=curve))
    assert found.present_value == pytest.approx(98.39, abs=0.005)
    single = to_continuous(found.equivalent_rate, Compounding.ANNUAL)
    assert single == pytest.approx(0.0676, abs=5e-5)
    par = 2.0 * (1.0 - curve.discount(2.0)) / curve.discount(times).sum()
    assert par == pytest.approx(0.0687, abs=5e-5)


def test_three_year_bond_at_9_per_cent_annual() -> None:
    """Ødegaard, B.A., Financial Numerical Recipes in C++ (manuscript, 2003-2014), bond chapter.

    Its convexity is ``Σ t(t + 1) c (1 + y)^-t / (PV (1 + y)²)``.
    """
    found = measure(value_rows([1.0, 2.0, 3.0], [10.0, 10.0, 110.0], curve=_flat(0.09, Compounding.ANNUAL)))
    assert found.present_value == pytest.approx(102.531, abs=0.0005)
    assert found.macaulay_duration == pytest.approx(2.73895, abs=5e-6)
    assert found.modified_duration == pytest.approx(2.5128, abs=5e-5)
    assert found.equivalent_rate == pytest.approx(0.09, rel=1e-12)
    annual = (found.convexity + found.effective_duration) / 1.09**2
    assert annual == pytest.approx(8.93248, abs=5e-6)


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
    curve = _flat(0.06, Compounding.SEMI_ANNUAL)
    for coupon, years, price, modified in printed:
        times = np.arange(1, 2 * years + 1) / 2.0
        amounts = np.full(times.size, coupon / 2.0)
        amounts[-1] += 100.0
        found = measure(value_rows(times, amounts, curve=curve))
        assert found.present_value == pytest.approx(price, abs=5e-5)
        assert found.effective_duration / 1.03 == pytest.approx(modified, abs=0.0051)


def test_dated_flows() -> None:
    """Microsoft Excel function reference, examples of XNPV and XIRR (from memory).

    The documented digits of the rate stop at the tolerance of its solver.
    """
    days = np.array(["2008-01-01", "2008-03-01", "2008-10-30", "2009-02-15", "2009-04-01"], dtype="M8[D]")
    times = ((days - days[0]).astype(float) / 365.0).tolist()
    amounts = [-10000.0, 2750.0, 4250.0, 3250.0, 2750.0]
    value = measure(value_rows(times, amounts, curve=_flat(0.09, Compounding.ANNUAL))).present_value
    assert value == pytest.approx(2086.65, abs=0.005)
    assert _internal_rate(times, amounts) == pytest.approx(0.373362535, abs=2e-8)


def test_internal_rates_of_return() -> None:
    """Microsoft Excel function reference, examples of IRR and NPV (from memory).

    That NPV discounts its first flow by one period.
    """
    flows = [-70000.0, 12000.0, 15000.0, 18000.0, 21000.0, 26000.0]
    times = [0.0, 1.0, 2.0, 3.0, 4.0, 5.0]
    assert _internal_rate(times, flows) == pytest.approx(0.0866, abs=5e-5)
    assert _internal_rate(times[:5], flows[:5]) == pytest.approx(-0.0212, abs=5e-5)
    curve = _flat(0.1, Compounding.ANNUAL)
    later = measure(value_rows([1.0, 2.0, 3.0, 4.0], [-10000.0, 3000.0, 4200.0, 6800.0], curve=curve))
    assert later.present_value == pytest.approx(1188.44, abs=0.005)


def test_present_value_and_internal_rate() -> None:
    """Ødegaard, Financial Numerical Recipes in C++ (manuscript, 2003-2014), present value chapter."""
    times, flows = [0.0, 1.0, 2.0], [-100.0, 10.0, 110.0]
    found = measure(value_rows(times, flows, curve=_flat(0.05, Compounding.ANNUAL)))
    assert found.present_value == pytest.approx(9.29705, abs=5e-6)
    assert _internal_rate(times, flows) == pytest.approx(0.1, abs=1e-9)


def test_a_six_year_par_bond_meets_a_five_year_guarantee() -> None:
    """Bodie, Z., Kane, A. and Marcus, A.J., Investments, immunisation table of the chapter on managing
    bond portfolios (from memory).

    What the bond grows to in five years, coupons reinvested and the rest sold at the new rate, is its
    present value at that rate carried forward.
    """
    times = np.arange(1.0, 7.0)
    amounts = np.array([800.0] * 5 + [10800.0])
    at_par = measure(value_rows(times, amounts, curve=_flat(0.08, Compounding.ANNUAL)))
    assert at_par.macaulay_duration == pytest.approx(4.993, abs=0.0005)
    assert pytest.approx(14693.28, abs=0.005) == 10000.0 * 1.08**5
    for rate, grown in ((0.07, 14694.05), (0.08, 14693.28), (0.09, 14696.02)):
        found = measure(value_rows(times, amounts, curve=_flat(rate, Compounding.ANNUAL)))
        assert found.present_value * (1.0 + rate) ** 5 == pytest.approx(grown, abs=0.006)


def test_redington_immunisation_with_two_zeros() -> None:
    """Society of Actuaries, Exam FM, sample question on Redington immunisation.

    Convexity is the present-value-weighted mean of squared times. The liability of duration 3 and
    convexity 9 is a single payment.
    """
    curve = _flat(0.04)
    # Present values a, b with a + b = 2000 and 1 a + 4 b = 3 · 2000.
    worth = np.linalg.solve([[1.0, 1.0], [1.0, 4.0]], [2000.0, 6000.0])
    np.testing.assert_allclose(worth, [666.67, 1333.33], atol=0.005)
    assets = value_rows([1.0, 4.0], worth / curve.discount([1.0, 4.0]), curve=curve)
    liabilities = value_rows([3.0], [2000.0 / curve.discount(3.0)], curve=curve)
    assert measure(assets).convexity == pytest.approx(11.0, abs=1e-9)
    assert measure(liabilities).convexity == pytest.approx(9.0, abs=1e-9)
    # The first is met to the last digit or one below it.
    present, duration, convexity = redington_conditions(assets, liabilities)
    assert present.assets == pytest.approx(present.liabilities, rel=1e-15)
    assert duration.holds
    assert convexity.holds
    assert convexity.assets - convexity.liabilities == pytest.approx(2000.0 * (11.0 - 9.0), rel=1e-12)


def test_duration_gap_of_a_bank() -> None:
    """Saunders, A. and Cornett, M.M., Financial Institutions Management, duration chapter (from memory)."""
    basis = Basis(TODAY, "USD", np.array([1.0]), np.array([0.1]))
    book = Book(
        basis,
        FlowTable.build(["funding"], [3.0], [90.0 * 1.1**3]),
        (),
        FlowTable.build(["loans"], [5.0], [100.0 * 1.1**5]),
    )
    standing = stand(book)
    assert standing.assets.present_value == pytest.approx(100.0, abs=1e-9)
    assert standing.liabilities.present_value == pytest.approx(90.0, abs=1e-9)
    assert standing.duration_gap == pytest.approx(2.3, abs=1e-9)
    change = -standing.duration_gap * standing.assets.present_value * 0.01 / 1.1
    assert change == pytest.approx(-2.09, abs=0.005)


def test_key_rate_durations_of_a_15_year_zero() -> None:
    """Definition of Ho, T.S.Y., "Key Rate Durations: Measures of Interest Rate Risks", Journal of Fixed
    Income 2(2), 1992: triangular shifts of the continuous zero rates, here with keys 10 and 20."""
    rows = value_rows([15.0], [100.0], curve=_flat(0.05))
    durations, _ = key_rate_durations(rows, terms=[10.0, 20.0])
    np.testing.assert_allclose(durations, [7.5, 7.5], atol=1e-9)


# Random bonds against QuantLib, the general-purpose quantitative library.

COUNT = 600


def _random_bonds() -> list[Holding]:
    random = np.random.default_rng(20260630)
    bonds = []
    for number in range(COUNT):
        maturity = TODAY + timedelta(days=int(random.integers(1, 45 * 365)))
        if number % 4 == 0:  # month ends, where days are clipped
            maturity = maturity.replace(day=1) - timedelta(days=1)
            maturity = max(maturity, TODAY + timedelta(days=1))
        bonds.append(
            Holding(
                f"bond {number}",
                HoldingKind.BOND,
                float(random.uniform(1.0, 5000.0)),
                float(random.uniform(0.001, 0.09)),
                int(random.choice([1, 2, 4, 12])),
                maturity,
            )
        )
    return bonds


def _theirs(bond: Holding) -> ql.FixedRateBond:
    assert bond.maturity is not None
    step = 12 // bond.frequency
    end = ql.Date(bond.maturity.isoformat(), "%Y-%m-%d")
    periods = ((bond.maturity.year - TODAY.year) * 12 + 24) // step + 1
    start = end - ql.Period(periods * step, ql.Months)
    schedule = ql.Schedule(
        start,
        end,
        ql.Period(step, ql.Months),
        ql.NullCalendar(),
        ql.Unadjusted,
        ql.Unadjusted,
        ql.DateGeneration.Backward,
        False,
    )
    count = ql.ActualActual(ql.ActualActual.ISMA, schedule)
    return ql.FixedRateBond(0, bond.nominal, schedule, [bond.coupon], count)


def _their_flows(bond: ql.FixedRateBond) -> dict[str, float]:
    flows: dict[str, float] = {}
    for flow in bond.cashflows():
        if flow.date() > ql.Settings.instance().evaluationDate:
            day = flow.date().ISO()
            flows[day] = flows.get(day, 0.0) + flow.amount()
    return flows


DAYS = [92, 184, 365, 731, 1096, 1826, 2557, 3652, 5479, 7305, 9131, 10957, 18262]
PER_CENT = [2.1, 2.05, 2.0, 1.98, 2.04, 2.26, 2.48, 2.7, 2.91, 2.96, 2.9, 2.81, 2.6]
ZERO_RATES = [rate / 100.0 for rate in PER_CENT]


@pytest.mark.parametrize("interpolation", [Interpolation.LOG_LINEAR, Interpolation.LINEAR_ZERO])
def test_600_bonds_against_quantlib(interpolation: Interpolation) -> None:
    """Dates, amounts, present values, and duration and DV01 by moving QuantLib's own curve."""
    today = ql.Date(TODAY.isoformat(), "%Y-%m-%d")
    ql.Settings.instance().evaluationDate = today
    dates = [today, *(today + day for day in DAYS)]
    terms = np.array(DAYS) / 365.0
    curve = Curve(terms, ZERO_RATES, interpolation)
    if interpolation is Interpolation.LOG_LINEAR:
        theirs = ql.DiscountCurve(dates, [1.0, *curve.discount(terms)], ql.Actual365Fixed())
    else:
        theirs = ql.ZeroCurve(dates, [ZERO_RATES[0], *ZERO_RATES], ql.Actual365Fixed())
    theirs.enableExtrapolation()
    move = ql.SimpleQuote(0.0)
    moved = ql.ZeroSpreadedTermStructure(ql.YieldTermStructureHandle(theirs), ql.QuoteHandle(move))
    moved.enableExtrapolation()
    engine = ql.DiscountingBondEngine(ql.YieldTermStructureHandle(moved))

    bonds = _random_bonds()
    flows = holding_flows(bonds, valuation_date=TODAY)
    measures = measure_groups(value_rows(flows.time, flows.amount, curve=curve), flows.holding, COUNT)
    ends = np.searchsorted(flows.holding, np.arange(COUNT + 1))
    for number, bond in enumerate(bonds):
        other = _theirs(bond)
        other.setPricingEngine(engine)
        expected = _their_flows(other)
        own = slice(ends[number], ends[number + 1])
        assert flows.date[own].astype(str).tolist() == list(expected)
        np.testing.assert_allclose(flows.amount[own], list(expected.values()), rtol=1e-12)

        found = measures[number]
        values = {}
        for size in (0.0, 1e-4, 1e-5, -1e-5):
            move.setValue(size)
            values[size] = other.NPV()
        assert found.present_value == pytest.approx(values[0.0], rel=1e-12)
        assert found.dv01 == pytest.approx(values[0.0] - values[1e-4], rel=1e-9, abs=1e-10)
        slope = (values[-1e-5] - values[1e-5]) / 2e-5 / values[0.0]
        assert found.effective_duration == pytest.approx(slope, rel=1e-6)


def test_spreads_against_quantlib() -> None:
    """Spread over the zero curve from the market value, for 60 of the bonds."""
    today = ql.Date(TODAY.isoformat(), "%Y-%m-%d")
    ql.Settings.instance().evaluationDate = today
    terms = np.array(DAYS) / 365.0
    basis = Basis(TODAY, "EUR", terms, np.array(ZERO_RATES), compounding=Compounding.CONTINUOUS)
    dates = [today, *(today + day for day in DAYS)]
    theirs = ql.DiscountCurve(dates, [1.0, *basis.curve.discount(terms)], ql.Actual365Fixed())
    theirs.enableExtrapolation()
    random = np.random.default_rng(4)
    bonds = [bond for bond in _random_bonds() if bond.maturity and bond.maturity.year > 2027][:60]
    priced = [
        Holding(
            bond.name,
            bond.kind,
            bond.nominal,
            bond.coupon,
            bond.frequency,
            bond.maturity,
            market_value=bond.nominal * float(random.uniform(0.6, 1.3)),
        )
        for bond in bonds
    ]
    flows = priced_flows(Book(basis, FlowTable.empty(), tuple(priced)), Side.ASSETS).flows
    for number, bond in enumerate(priced):
        other = _theirs(bond)
        spread = ql.CashFlows.zSpread(
            other.cashflows(),
            bond.market_value,
            theirs,
            ql.Actual365Fixed(),
            ql.Continuous,
            ql.NoFrequency,
            False,
            today,
            today,
            1e-14,
            200,
            0.01,
        )
        own = flows.spread[flows.line == number]
        np.testing.assert_allclose(own, spread, atol=1e-10)
