"""Bonds with an odd first coupon and amortising bonds against QuantLib: amounts, values, accrued.

Conventions of all cases: dates counted back from the maturity by whole months without holidays or adjustment;
log-linear curve, times in Act/365F.
"""

from __future__ import annotations

from dataclasses import replace
from datetime import date, timedelta

import numpy as np
import pytest
import QuantLib as ql

from desk.book import Amortisation, Book, FlowTable, Holding, HoldingKind
from desk.book.schedule import holding_flows
from desk.rates.day_count import DayCount
from desk.valuation.prices import holding_prices
from tests.published.quantlib import COUNTS, TODAY, MovedCurve, basis, day, random_date, schedule

COUNT = 520
FREQUENCIES = (1, 2, 4, 12)


def _their_flows(bond: ql.Bond) -> dict[str, float]:
    flows: dict[str, float] = {}
    for flow in bond.cashflows():
        if flow.date() > day(TODAY):
            when = flow.date().ISO()
            flows[when] = flows.get(when, 0.0) + flow.amount()
    return flows


def _moved(when: date, months: int) -> date:
    later = day(when) + ql.Period(months, ql.Months)
    return date(later.year(), later.month(), later.dayOfMonth())


def _odd_bonds(random: np.random.Generator) -> list[Holding]:
    """Short and long first periods, most of them still running."""
    bonds: list[Holding] = []
    while len(bonds) < COUNT:
        frequency = int(random.choice(FREQUENCIES))
        months = 12 // frequency
        end = random_date(random, 400, 30 * 365)
        if end.day > 28:
            end = end.replace(day=28)  # theirs counts the period before the first from a clipped day
        periods = ((end.year - TODAY.year) * 12 + end.month - TODAY.month) // months
        first = _moved(end, -months * max(periods - int(random.integers(0, 3)), 0))
        long = bool(random.integers(2))
        start = _moved(first, -months * (2 if long else 1)) + timedelta(days=int(random.integers(1, 25)))
        if not start < first <= end:
            continue
        bonds.append(
            Holding(
                f"bond {len(bonds)}",
                HoldingKind.BOND,
                float(random.uniform(1.0, 5000.0)),
                float(random.uniform(0.001, 0.09)),
                frequency,
                end,
                start_date=start,
                first_coupon=first if long or random.integers(2) else None,
            )
        )
    return bonds


def test_520_bonds_with_an_odd_first_coupon_against_quantlib() -> None:
    """`FixedRateBond` in Act/Act ICMA: amounts within 1e-12, values within 1e-12, accrued within 1e-10."""
    curve = MovedCurve()
    engine = ql.DiscountingBondEngine(curve.discounting)
    bonds = _odd_bonds(np.random.default_rng(3))
    flows = holding_flows(bonds, valuation_date=TODAY)
    prices = holding_prices(Book(basis(), FlowTable.empty(), tuple(bonds)))
    ends = np.searchsorted(flows.holding, np.arange(COUNT + 1))
    odd = running = 0
    for number, (holding, price) in enumerate(zip(bonds, prices, strict=True)):
        assert holding.maturity is not None
        assert holding.start_date is not None
        dates = schedule(
            holding.start_date, holding.maturity, 12 // holding.frequency, first=holding.first_coupon
        )
        their = ql.FixedRateBond(
            0, holding.nominal, dates, [holding.coupon], ql.ActualActual(ql.ActualActual.ISMA, dates)
        )
        their.setPricingEngine(engine)
        expected = _their_flows(their)
        own = slice(ends[number], ends[number + 1])
        assert flows.date[own].astype(str).tolist() == list(expected)
        # Theirs is the difference of what the nominal has grown to and the nominal.
        tolerance = 1e-15 * holding.nominal
        np.testing.assert_allclose(flows.amount[own], list(expected.values()), rtol=1e-12, atol=tolerance)
        assert price.present_value == pytest.approx(their.NPV(), rel=1e-12)
        accrued = their.accruedAmount(day(TODAY)) * holding.nominal / 100.0
        assert price.accrued_interest == pytest.approx(accrued, rel=1e-10, abs=1e-10)
        regular = holding.nominal * holding.coupon / holding.frequency
        odd += abs(flows.amount[own][0] - regular) > 1e-9 * regular
        running += price.accrued_interest > 0.0
    assert odd > 200
    assert running > 200


@pytest.mark.parametrize("day_count", list(COUNTS))
def test_odd_first_coupons_by_other_day_counts(day_count: DayCount) -> None:
    """The first coupon is nominal · coupon · year fraction of QuantLib's day counter."""
    bonds = [
        replace(bond, day_count=day_count)
        for bond in _odd_bonds(np.random.default_rng(4))
        if bond.first_coupon and bond.maturity and TODAY < bond.first_coupon < bond.maturity
    ]
    assert len(bonds) > 100
    flows = holding_flows(bonds, valuation_date=TODAY)
    heads = np.searchsorted(flows.holding, np.arange(len(bonds)))
    counter = COUNTS[day_count]
    expected = [
        bond.nominal * bond.coupon * counter.yearFraction(day(bond.start_date), day(bond.first_coupon))
        for bond in bonds
        if bond.start_date and bond.first_coupon
    ]
    np.testing.assert_allclose(flows.amount[heads], expected, rtol=1e-12)


def _amortising(random: np.random.Generator) -> list[Holding]:
    bonds = []
    for number in range(COUNT):
        frequency = int(random.choice(FREQUENCIES))
        kind = Amortisation.ANNUITY if number % 2 else Amortisation.LEVEL
        bonds.append(
            Holding(
                f"loan {number}",
                HoldingKind.BOND,
                float(random.uniform(1.0, 5000.0)),
                float(random.uniform(0.001, 0.12)),
                frequency,
                random_date(random, 32, 30 * 365),
                amortisation=kind,
            )
        )
    return bonds


def test_520_amortising_bonds_against_quantlib() -> None:
    """`AmortizingFixedRateBond` with the notionals of its own annuity schedule, or of equal parts.

    Our nominal is what is outstanding on the valuation date, so theirs begins at the regular date before it.
    Amounts within 1e-10 of the nominal, values within 1e-11 of themselves.
    """
    curve = MovedCurve()
    engine = ql.DiscountingBondEngine(curve.discounting)
    bonds = _amortising(np.random.default_rng(5))
    flows = holding_flows(bonds, valuation_date=TODAY)
    prices = holding_prices(Book(basis(), FlowTable.empty(), tuple(bonds)))
    ends = np.searchsorted(flows.holding, np.arange(COUNT + 1))
    for number, (holding, price) in enumerate(zip(bonds, prices, strict=True)):
        assert holding.maturity is not None
        own = slice(ends[number], ends[number + 1])
        count = int(ends[number + 1] - ends[number])
        months = 12 // holding.frequency
        dates = schedule(_moved(holding.maturity, -months * count), holding.maturity, months)
        if holding.amortisation is Amortisation.ANNUITY:
            length = ql.Period(months * count, ql.Months)
            frequency = {1: ql.Annual, 2: ql.Semiannual, 4: ql.Quarterly, 12: ql.Monthly}[holding.frequency]
            notionals = list(ql.sinkingNotionals(length, frequency, holding.coupon, holding.nominal))[:count]
        else:
            notionals = [holding.nominal * (count - paid) / count for paid in range(count)]
        their = ql.AmortizingFixedRateBond(
            0, notionals, dates, [holding.coupon], ql.ActualActual(ql.ActualActual.ISMA, dates)
        )
        their.setPricingEngine(engine)
        expected = _their_flows(their)
        assert flows.date[own].astype(str).tolist() == list(expected)
        np.testing.assert_allclose(
            flows.amount[own], list(expected.values()), rtol=0.0, atol=1e-10 * holding.nominal
        )
        assert price.present_value == pytest.approx(their.NPV(), rel=1e-11)
        if holding.amortisation is Amortisation.ANNUITY:
            np.testing.assert_allclose(np.ptp(flows.amount[own]), 0.0, atol=1e-11 * holding.nominal)


def test_yields_and_durations_of_520_bonds_against_quantlib() -> None:
    """`BondFunctions` from the clean price: street yield within 1e-9, durations and convexity within 1e-8."""
    random = np.random.default_rng(6)
    MovedCurve()
    frequencies = {1: ql.Annual, 2: ql.Semiannual, 4: ql.Quarterly, 12: ql.Monthly}
    bonds = [
        Holding(
            f"bond {number}",
            HoldingKind.BOND,
            float(random.uniform(1.0, 5000.0)),
            float(random.uniform(0.001, 0.09)),
            int(random.choice(FREQUENCIES)),
            random_date(random, 32, 30 * 365),
            price=float(random.uniform(60.0, 140.0)),
        )
        for number in range(COUNT)
    ]
    bonds = [bond for bond in bonds if bond.maturity and bond.maturity > TODAY + timedelta(days=366)]
    prices = holding_prices(Book(basis(), FlowTable.empty(), tuple(bonds)))
    for holding, price in zip(bonds, prices, strict=True):
        assert holding.maturity is not None
        assert holding.price is not None
        months = 12 // holding.frequency
        count = ((holding.maturity.year - TODAY.year + 1) * 12) // months
        dates = schedule(_moved(holding.maturity, -months * count), holding.maturity, months)
        counter = ql.ActualActual(ql.ActualActual.ISMA, dates)
        their = ql.FixedRateBond(0, 100.0, dates, [holding.coupon], counter)
        quote = ql.BondPrice(holding.price, ql.BondPrice.Clean)
        terms = (counter, ql.Compounded, frequencies[holding.frequency])
        found = ql.BondFunctions.bondYield(their, quote, *terms, day(TODAY), 1e-13, 200, 0.05)
        rate = ql.InterestRate(found, *terms)
        assert price.clean_price == pytest.approx(holding.price, rel=1e-11)
        assert price.accrued_interest == pytest.approx(
            their.accruedAmount(day(TODAY)) * holding.nominal / 100.0, rel=1e-11, abs=1e-11
        )
        assert price.street_yield == pytest.approx(found, abs=1e-9)
        for ours, kind in (
            (price.macaulay_duration, ql.Duration.Macaulay),
            (price.modified_duration, ql.Duration.Modified),
        ):
            theirs = ql.BondFunctions.duration(their, rate, kind, day(TODAY))
            assert ours == pytest.approx(theirs, rel=1e-8)
        convexity = ql.BondFunctions.convexity(their, rate, day(TODAY))
        assert price.convexity == pytest.approx(convexity, rel=1e-8)
