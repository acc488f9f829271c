"""Changes under shocks against full revaluation by QuantLib, on random books.

Conventions of all cases: those of `tests.published.quantlib`. Their bonds and floating-rate notes are
rebuilt on a curve whose zero rates are moved, with the spread that priced them today and what the shock adds
to it; our book knows only the price they had today.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import date, timedelta

import numpy as np
import pytest
import QuantLib as ql

from desk.book import Book, FlowTable, Holding, HoldingKind
from desk.book.shock import Move, MoveKind, Shock
from desk.rates.day_count import DayCount
from desk.valuation.reverse import Goal, reverse_parallel
from desk.valuation.shock_base import shock_base
from desk.valuation.shocks import run_shock
from tests.published.quantlib import COUNTS, DAYS, TODAY, basis, day, random_date, schedule

BOOKS = 220
KNOTS = (1, 2, 5, 10, 20, 40)  # years of 365 days, at which rates are moved


class TheirCurves:
    """Their curve of `basis`, moved by lines between knots, and by a spread above that."""

    def __init__(self) -> None:
        today = day(TODAY)
        ql.Settings.instance().evaluationDate = today
        factors = basis().curve.discount(np.array(DAYS) / 365.0).tolist()
        dates = [today, *(today + number for number in DAYS)]
        base = ql.DiscountCurve(dates, [1.0, *factors], ql.Actual365Fixed())
        base.enableExtrapolation()
        self.moves = [ql.SimpleQuote(0.0) for _ in KNOTS]
        moved = ql.SpreadedLinearZeroInterpolatedTermStructure(
            ql.YieldTermStructureHandle(base),
            [ql.QuoteHandle(move) for move in self.moves],
            [today + 365 * knot for knot in KNOTS],
        )
        moved.enableExtrapolation()
        self.projecting = ql.YieldTermStructureHandle(moved)
        self.spread = ql.SimpleQuote(0.0)
        spread = ql.ZeroSpreadedTermStructure(self.projecting, ql.QuoteHandle(self.spread))
        spread.enableExtrapolation()
        self.discounting = ql.YieldTermStructureHandle(spread)
        self._kept = (base, moved, spread)

    def move(self, sizes: list[float]) -> None:
        """Move the rates at the knots [basis points]."""
        for quote, size in zip(self.moves, sizes, strict=True):
            quote.setValue(1e-4 * size)


@dataclass
class Held:
    """One of their instruments with the spread that prices it, and what is moved of it."""

    instrument: ql.Bond
    spread: float
    holding: Holding


def _bond(random: np.random.Generator, curves: TheirCurves, number: int) -> Held:
    months = int(random.choice([1, 3, 6, 12]))
    end = random_date(random, 60, 35 * 365)
    count = list(COUNTS)[int(random.integers(len(COUNTS)))]
    periods = ((end.year - TODAY.year + 2) * 12) // months
    start = day(end) - ql.Period(periods * months, ql.Months)
    begin = date(start.year(), start.month(), start.dayOfMonth())
    nominal, spread = float(random.uniform(10.0, 900.0)), float(random.uniform(-0.005, 0.04))
    dates = schedule(begin, end, months)
    if number % 3:
        coupon = float(random.uniform(0.0, 0.07))
        # Ours pays nominal · coupon / frequency, whatever the days; so does their simple day count.
        bond = ql.FixedRateBond(0, nominal, dates, [coupon], ql.SimpleDayCounter())
        holding = Holding(
            f"held {number}", HoldingKind.BOND, nominal, coupon, 12 // months, end, DayCount.THIRTY_360
        )
    else:
        current, margin = float(random.uniform(0.0, 0.05)), float(random.uniform(-0.005, 0.02))
        index = ql.IborIndex(
            f"rate {number}", ql.Period(months, ql.Months), 0, ql.EURCurrency(), ql.NullCalendar(),
            ql.Unadjusted, False, COUNTS[count], curves.projecting,
        )  # fmt: skip
        bond = ql.FloatingRateBond(0, nominal, dates, index, COUNTS[count], ql.Unadjusted, 0, [1.0], [margin])
        for when in list(dates)[:-1]:
            if when <= day(TODAY):
                index.addFixing(when, current - margin, True)
        holding = Holding(
            f"held {number}", HoldingKind.FLOATER, nominal, 0.0, 12 // months, end, count,
            start_date=begin, current_rate=current, margin=margin,
        )  # fmt: skip
    bond.setPricingEngine(ql.DiscountingBondEngine(curves.discounting))
    curves.spread.setValue(spread)
    holding = replace(holding, market_value=bond.NPV())
    return Held(bond, spread, holding)


def _regular(random: np.random.Generator) -> timedelta:
    return timedelta(days=int(random.integers(1, 45 * 365)))


def test_random_books_under_random_shocks() -> None:
    """220 books of three holdings and thirty liability flows, under shocks of rates, spreads and amounts.

    Both sides after the shock agree within 1e-10 of the side; QuantLib projects floating payments anew.
    """
    random = np.random.default_rng(20260630)
    curves = TheirCurves()
    checked = 0
    for number in range(BOOKS):
        curves.move([0.0] * len(KNOTS))
        held = [_bond(random, curves, 3 * number + place) for place in range(3)]
        dates = [TODAY + _regular(random) for _ in range(30)]
        amounts = random.uniform(-5.0, 60.0, 30)
        times = np.array([(when - TODAY).days / 365.0 for when in dates])
        liabilities = FlowTable.build(["a", "b"] * 15, times, amounts)
        book = Book(basis(), liabilities, tuple(own.holding for own in held))
        base = shock_base(book)

        sizes = random.uniform(-200.0, 200.0, len(KNOTS))
        if number % 4 == 0:
            sizes[:] = sizes[0]
        spread, amount = float(random.uniform(-50.0, 150.0)), float(random.uniform(-0.2, 0.2))
        moved_one = held[int(random.integers(3))].holding.name
        shock = Shock(
            "random",
            (
                *(
                    Move(MoveKind.RATE, float(size), float(term))
                    for size, term in zip(sizes, KNOTS, strict=True)
                ),
                Move(MoveKind.SPREAD, spread, target=moved_one),
                Move(MoveKind.AMOUNT, amount, target="b"),
            ),
        )
        result = run_shock(base, shock)

        curves.move([float(size) for size in sizes])
        theirs = 0.0
        for own in held:
            more = 1e-4 * spread if own.holding.name == moved_one else 0.0
            curves.spread.setValue(own.spread + more)
            theirs += own.instrument.NPV()
        owed = 0.0
        for place, (when, due) in enumerate(zip(dates, amounts, strict=True)):
            owed += due * (1.0 + amount * (place % 2)) * curves.projecting.discount(day(when))
        gross = sum(abs(due) for due in amounts)
        assert result.assets == pytest.approx(theirs, rel=1e-10)
        assert result.liabilities == pytest.approx(owed, abs=1e-10 * gross)
        checked += 1
    assert checked == BOOKS


def test_a_reverse_move_against_quantlib() -> None:
    """The parallel move found is one at which QuantLib gives the level: 40 books, ratios within 1e-9."""
    random = np.random.default_rng(7)
    curves = TheirCurves()
    for number in range(40):
        curves.move([0.0] * len(KNOTS))
        held = [_bond(random, curves, 10_000 + 3 * number + place) for place in range(3)]
        when = TODAY + timedelta(days=int(random.integers(20 * 365, 45 * 365)))
        time = (when - TODAY).days / 365.0
        assets = sum(own.holding.market_value or 0.0 for own in held)
        due = assets / float(basis().curve.discount(time)) / float(random.uniform(0.9, 1.2))
        book = Book(basis(), FlowTable.build(["a"], [time], [due]), tuple(own.holding for own in held))
        base = shock_base(book)
        level = base.position.funding_ratio * float(random.uniform(0.85, 1.15))
        found = reverse_parallel(base, goal=Goal.FUNDING_RATIO, level=level)
        assert found.scales
        curves.move([found.scales[0]] * len(KNOTS))
        theirs = 0.0
        for own in held:
            curves.spread.setValue(own.spread)
            theirs += own.instrument.NPV()
        assert theirs / (due * curves.projecting.discount(day(when))) == pytest.approx(level, rel=1e-9)
