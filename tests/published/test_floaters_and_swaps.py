"""Floating-rate notes and swaps against QuantLib: values, and durations by moving its curves.

Conventions of all cases: dates counted back from the maturity by whole months without holidays or adjustment;
one log-linear curve discounts and projects, times in Act/365F; the floating rate of a period is that of the
curve over the period itself.
"""

from __future__ import annotations

from dataclasses import replace
from datetime import date, timedelta

import numpy as np
import pytest
import QuantLib as ql

from desk.book import Book, FlowTable, Holding, HoldingKind
from desk.rates.day_count import DayCount
from desk.valuation.records import LineStanding
from desk.valuation.standing import stand
from tests.published.quantlib import COUNTS, TODAY, MovedCurve, basis, day, random_date, schedule

COUNT = 520
FREQUENCIES = (1, 2, 4, 12)


def _lines(holdings: list[Holding]) -> tuple[LineStanding, ...]:
    return stand(Book(basis(), FlowTable.empty(), tuple(holdings))).lines


def _count(random: np.random.Generator) -> DayCount:
    return list(COUNTS)[int(random.integers(len(COUNTS)))]


def _before(end: date, months: int) -> date:
    """A start on a regular date, long before the valuation date."""
    periods = ((end.year - TODAY.year + 3) * 12) // months
    moved = day(end) - ql.Period(periods * months, ql.Months)
    return date(moved.year(), moved.month(), moved.dayOfMonth())


def _slope(values: dict[float, float], size: float) -> float:
    return (values[-size] - values[size]) / (2.0 * size)


def _floaters(random: np.random.Generator) -> list[Holding]:
    holdings = []
    for number in range(COUNT):
        frequency = int(random.choice(FREQUENCIES))
        end = random_date(random, 40, 30 * 365)
        start = _before(end, 12 // frequency)
        if number % 5 == 0:  # not yet issued, or issued off the regular dates
            start = min(random_date(random, -400, 1500), end - timedelta(days=5))
        holdings.append(
            Holding(
                f"note {number}",
                HoldingKind.FLOATER,
                float(random.uniform(1.0, 5000.0)),
                0.0,
                frequency,
                end,
                _count(random),
                start_date=start,
                current_rate=float(random.uniform(-0.002, 0.06)),
                margin=float(random.choice([0.0, random.uniform(-0.01, 0.03)])),
            )
        )
    return holdings


def _their_note(holding: Holding, curve: MovedCurve) -> ql.FloatingRateBond:
    assert holding.maturity is not None
    assert holding.start_date is not None
    assert holding.day_count is not None
    assert holding.current_rate is not None
    months = 12 // holding.frequency
    count = COUNTS[holding.day_count]
    index = curve.index(holding.name, months, count)
    dates = schedule(holding.start_date, holding.maturity, months)
    note = ql.FloatingRateBond(
        0, holding.nominal, dates, index, count, ql.Unadjusted, 0, [1.0], [holding.margin]
    )
    for when in list(dates)[:-1]:
        if when <= day(TODAY):
            index.addFixing(when, holding.current_rate - holding.margin, True)
    note.setPricingEngine(ql.DiscountingBondEngine(curve.discounting))
    return note


def test_520_floaters_against_quantlib() -> None:
    """`FloatingRateBond` off an `IborIndex` of the same curve, at spreads from -1 % to 5 %.

    Values agree within 1e-11 of the value. The rate duration is that of their value with both curves moved,
    so with the payments projected anew, and the spread duration that with the discounting curve moved alone,
    each by central differences of 0.1 basis points: within 1e-7 years and 1e-6 of itself.
    """
    random = np.random.default_rng(1)
    curve = MovedCurve()
    notes = _floaters(random)
    spreads = random.uniform(-0.01, 0.05, COUNT)
    theirs = []
    for holding, spread in zip(notes, spreads, strict=True):
        note = _their_note(holding, curve)
        curve.spread.setValue(float(spread))
        theirs.append((note, note.NPV()))
    worth = [replace(note, market_value=value) for note, (_, value) in zip(notes, theirs, strict=True)]
    size = 1e-5
    found, unspread = _lines(worth), _lines(notes)
    for line, plain, (note, value), spread in zip(found, unspread, theirs, spreads, strict=True):
        assert line.spread == pytest.approx(spread, abs=1e-10)
        assert line.measures.present_value == pytest.approx(value, rel=1e-11)
        curve.spread.setValue(0.0)
        assert plain.measures.present_value == pytest.approx(note.NPV(), rel=1e-11)
        by_rate, by_spread = {}, {}
        for move in (-size, size):
            curve.spread.setValue(float(spread))
            curve.move.setValue(move)
            by_rate[move] = note.NPV()
            curve.move.setValue(0.0)
            curve.spread.setValue(float(spread) + move)
            by_spread[move] = note.NPV()
        duration = _slope(by_rate, size) / value
        assert line.measures.effective_duration == pytest.approx(duration, rel=1e-6, abs=1e-7)
        assert line.spread_duration == pytest.approx(_slope(by_spread, size) / value, rel=1e-6, abs=1e-7)


def _swaps(random: np.random.Generator) -> list[Holding]:
    holdings = []
    for number in range(COUNT):
        frequency, floating = (int(random.choice(FREQUENCIES)) for _ in range(2))
        end = random_date(random, 400, 30 * 365)
        start = _before(end, 12)
        if number % 3 == 0:  # forward start
            start = min(random_date(random, 31, 5 * 365), end - timedelta(days=40))
        elif number % 7 == 0:  # begun off the regular dates
            start = random_date(random, -300, 0)
        holdings.append(
            Holding(
                f"swap {number}",
                HoldingKind.PAYER_SWAP if number % 2 else HoldingKind.RECEIVER_SWAP,
                float(random.uniform(1.0, 5000.0)),
                float(random.uniform(0.0, 0.06)),
                frequency,
                end,
                _count(random),
                start_date=start,
                current_rate=float(random.uniform(0.0, 0.05)),
                margin=float(random.choice([0.0, random.uniform(-0.01, 0.01)])),
                floating_frequency=floating,
                floating_day_count=_count(random),
            )
        )
    return holdings


def _their_swap(holding: Holding, curve: MovedCurve) -> ql.VanillaSwap:
    assert holding.maturity is not None
    assert holding.start_date is not None
    assert holding.day_count is not None
    assert holding.current_rate is not None
    assert holding.floating_day_count is not None
    assert holding.floating_frequency is not None
    months = 12 // holding.floating_frequency
    count = COUNTS[holding.floating_day_count]
    index = curve.index(holding.name, months, count)
    dates = schedule(holding.start_date, holding.maturity, months)
    for when in list(dates)[:-1]:
        if when <= day(TODAY):
            index.addFixing(when, holding.current_rate - holding.margin, True)
    swap = ql.VanillaSwap(
        ql.Swap.Payer if holding.kind is HoldingKind.PAYER_SWAP else ql.Swap.Receiver,
        holding.nominal,
        schedule(holding.start_date, holding.maturity, 12 // holding.frequency),
        holding.coupon,
        COUNTS[holding.day_count],
        dates,
        index,
        holding.margin,
        count,
    )
    swap.setPricingEngine(ql.DiscountingSwapEngine(curve.discounting))
    return swap


def test_520_swaps_against_quantlib() -> None:
    """`VanillaSwap`, payer and receiver, running and starting later.

    Values agree within 1e-12 of the notional, DV01 and the derivative by central differences of 0.1 basis
    points within 1e-9 and 1e-6 of the notional.
    """
    curve = MovedCurve()
    swaps = _swaps(np.random.default_rng(2))
    size = 1e-5
    for holding, line in zip(swaps, _lines(swaps), strict=True):
        their = _their_swap(holding, curve)
        value = their.NPV()
        assert line.measures.present_value == pytest.approx(value, abs=1e-12 * holding.nominal)
        moved = {}
        for move in (-size, size, 1e-4):
            curve.move.setValue(move)
            moved[move] = their.NPV()
        curve.move.setValue(0.0)
        assert line.measures.dv01 == pytest.approx(value - moved[1e-4], abs=1e-9 * holding.nominal)
        slope = line.measures.effective_duration * line.measures.present_value
        assert slope == pytest.approx(_slope(moved, size), abs=1e-6 * holding.nominal)
        assert line.spread == 0.0
        assert line.spread_duration is None
