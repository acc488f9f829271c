"""Sides ready to be valued: spreads, lines, and what could not be done."""

from __future__ import annotations

from dataclasses import replace
from datetime import date

import numpy as np
import pytest

from desk.book import Book, FlowTable, Holding, HoldingKind, Severity, Side
from desk.valuation.measures import value_flows
from desk.valuation.priced import PricedSide, priced_flows
from tests.valuation.books import TODAY, basis, small_book

EMPTY = FlowTable.empty()


def _assets(*holdings: Holding, flows: FlowTable = EMPTY) -> PricedSide:
    return priced_flows(Book(basis(), EMPTY, holdings, flows), Side.ASSETS)


def _worth(side: PricedSide) -> list[float]:
    rows = value_flows(side.flows, basis().curve)
    total = np.bincount(side.flows.line, weights=rows.value, minlength=len(side.flows.line_names))
    return [float(worth) for worth in total]


def _bond(name: str = "bond", *, market_value: float | None = None, nominal: float = 100.0) -> Holding:
    return Holding(name, HoldingKind.BOND, nominal, 0.04, 2, date(2033, 3, 31), market_value=market_value)


def test_liabilities_carry_the_spread_and_beta_times_the_premium() -> None:
    table = FlowTable.build(
        ["b", "a", "b"], [1.0, -1.0, 3.0], [10.0, 20.0, 30.0], beta=[0.5, 1.0, 0.0], date=["2027-06-30"] * 3
    )
    side = priced_flows(Book(basis(spread=0.004, premium=0.03), table), Side.LIABILITIES)
    assert side.flows.line_names == ("b", "a")
    assert side.flows.line.tolist() == [0, 0]
    np.testing.assert_allclose(side.flows.spread, [0.004 + 0.5 * 0.03, 0.004], rtol=1e-15)
    assert side.flows.is_flow.tolist() == [True, True]
    assert side.date.tolist() == [date(2027, 6, 30)] * 2
    (fault,) = side.faults
    assert fault.severity is Severity.MILD
    assert fault.found == "1 flow falls on or before the valuation date"


def test_holdings_of_one_name_stay_apart() -> None:
    side = _assets(_bond("twin", market_value=101.0), _bond("twin", market_value=95.0), _bond("twin"))
    assert side.flows.line_names == ("twin", "twin", "twin")
    worth = _worth(side)
    np.testing.assert_allclose(worth[:2], [101.0, 95.0], rtol=1e-13)
    spreads = [side.flows.spread[side.flows.line == line] for line in range(3)]
    assert all(np.ptp(spread) == 0.0 for spread in spreads)
    assert spreads[0][0] < spreads[1][0]
    assert (spreads[2] == 0.0).all()


def test_lines_of_ready_made_flows_follow_the_holdings() -> None:
    flows = FlowTable.build(["bond", "rent"], [1.0, 2.0], [5.0, 6.0], beta=[3.0, 3.0])
    side = _assets(_bond("bond"), flows=flows)
    assert side.flows.line_names == ("bond", "bond", "rent")
    own = side.flows.line > 0
    assert side.flows.line[own].tolist() == [1, 2]
    assert side.flows.spread[own].tolist() == [0.0, 0.0]
    assert side.faults == ()


def test_rows_come_by_line_and_then_by_time() -> None:
    flows = priced_flows(small_book(), Side.ASSETS).flows
    order = np.lexsort((flows.time, flows.line))
    np.testing.assert_array_equal(order, np.arange(len(flows)))


def test_deposit_and_fund() -> None:
    side = _assets(
        Holding("fund", HoldingKind.FUND, market_value=70.0, duration=4.0),
        Holding("cash", HoldingKind.DEPOSIT, 30.0),
        Holding("quoted cash", HoldingKind.DEPOSIT, 30.0, market_value=29.5),
        Holding("equities", HoldingKind.FUND, market_value=12.0),
    )
    np.testing.assert_allclose(_worth(side), [70.0, 30.0, 29.5, 12.0], rtol=1e-15)
    assert side.flows.time.tolist() == [4.0, 0.0, 0.0, 0.0]
    assert side.flows.is_flow.tolist() == [False, True, True, False]
    assert side.flows.spread.tolist() == [0.0] * 4
    assert [None if np.isnat(day) else day.item() for day in side.date] == [None, TODAY, TODAY, None]


def test_short_positions_have_spreads_too() -> None:
    long_side = _assets(_bond(market_value=90.0))
    short_side = _assets(_bond(market_value=-90.0, nominal=-100.0))
    np.testing.assert_allclose(short_side.flows.spread, long_side.flows.spread, rtol=1e-12)
    np.testing.assert_allclose(_worth(short_side), [-90.0], rtol=1e-13)


@pytest.mark.parametrize("market_value", [0.001, 5.0, 99.0, 250.0, 1e9])
def test_any_positive_market_value_is_met(market_value: float) -> None:
    side = _assets(_bond(market_value=market_value))
    np.testing.assert_allclose(_worth(side), [market_value], rtol=1e-12)
    assert side.faults == ()


@pytest.mark.parametrize("market_value", [0.0, -5.0])
def test_a_market_value_that_no_spread_gives(market_value: float) -> None:
    side = _assets(_bond("sound", market_value=99.0), _bond("odd", market_value=market_value))
    unspread = _worth(_assets(_bond()))
    np.testing.assert_allclose(_worth(side), [99.0, *unspread], rtol=1e-13)
    (fault,) = side.faults
    assert fault.severity is Severity.MILD
    assert fault.sheet == "Holdings"
    assert f"holding 'odd' has a market value of {market_value:g} that no spread gives" in str(fault)


def test_faults_name_what_matured_and_what_has_no_value() -> None:
    side = _assets(
        replace(_bond("gone", market_value=3.0), maturity=TODAY),
        Holding("empty fund", HoldingKind.FUND),
        _bond("fine"),
    )
    assert [fault.found for fault in side.faults] == [
        f"holding 'gone' has maturity {TODAY}",
        "holding 'empty fund' has no market value",
    ]
    assert _worth(side)[:2] == [0.0, 0.0]


def test_units_are_information_only() -> None:
    plain, counted = _bond(market_value=99.0), replace(_bond(market_value=99.0), units=1000.0)
    np.testing.assert_array_equal(_assets(plain).flows.amount, _assets(counted).flows.amount)
    np.testing.assert_array_equal(_assets(plain).flows.spread, _assets(counted).flows.spread)


def test_no_assets() -> None:
    side = _assets()
    assert len(side.flows) == 0
    assert side.flows.line_names == ()
