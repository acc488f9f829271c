"""Holdings into flows against a plain version, day by day."""

from __future__ import annotations

import calendar
from dataclasses import replace
from datetime import date, timedelta

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from desk.book import Holding, HoldingKind
from desk.book.schedule import add_months, holding_flows
from desk.rates.day_count import DayCount

TODAY = date(2026, 6, 30)


def _bond(maturity: date, *, coupon: float = 0.04, frequency: int = 2, nominal: float = 100.0) -> Holding:
    return Holding("bond", HoldingKind.BOND, nominal, coupon, frequency, maturity)


def _plain(bond: Holding, today: date) -> list[tuple[date, float]]:
    """The flows of a bond one by one."""
    assert bond.maturity is not None
    rows: list[tuple[date, float]] = []
    back = 0
    while True:
        month = bond.maturity.year * 12 + bond.maturity.month - 1 - back
        year, month = month // 12, month % 12 + 1
        when = date(year, month, min(bond.maturity.day, calendar.monthrange(year, month)[1]))
        if when <= today:
            return rows[::-1]
        amount = bond.nominal * bond.coupon / bond.frequency + (bond.nominal if back == 0 else 0.0)
        rows.append((when, amount))
        back += 12 // bond.frequency


BONDS = st.builds(
    _bond,
    st.dates(TODAY - timedelta(days=50), date(2090, 12, 31)),
    coupon=st.floats(0.0001, 0.2),
    frequency=st.sampled_from([1, 2, 4, 12]),
    nominal=st.floats(-1e6, 1e6).filter(bool),
)


@settings(max_examples=60, deadline=None)
@given(st.lists(BONDS, max_size=6), st.dates(TODAY - timedelta(days=800), TODAY))
def test_bonds_against_the_plain_version(bonds: list[Holding], today: date) -> None:
    flows = holding_flows(bonds, valuation_date=today)
    expected = [(number, *row) for number, bond in enumerate(bonds) for row in _plain(bond, today)]
    assert flows.holding.tolist() == [row[0] for row in expected]
    assert flows.date.tolist() == [row[1] for row in expected]
    np.testing.assert_allclose(flows.amount, [row[2] for row in expected], rtol=1e-15)
    np.testing.assert_array_equal(flows.time, [(row[1] - today).days / 365.0 for row in expected])


def test_coupon_on_the_valuation_date_has_gone_and_the_next_comes_whole() -> None:
    flows = holding_flows([_bond(date(2027, 6, 30))], valuation_date=TODAY)
    assert flows.date.tolist() == [date(2026, 12, 30), date(2027, 6, 30)]
    assert flows.amount.tolist() == [2.0, 102.0]
    day_before = holding_flows([_bond(date(2027, 6, 30))], valuation_date=TODAY - timedelta(days=1))
    assert day_before.date.tolist() == [TODAY, date(2026, 12, 30), date(2027, 6, 30)]
    assert day_before.amount.tolist() == [2.0, 2.0, 102.0]


def test_month_ends_come_back_to_the_day_of_the_maturity() -> None:
    flows = holding_flows([_bond(date(2028, 8, 31))], valuation_date=TODAY)
    assert flows.date.tolist() == [
        date(2026, 8, 31),
        date(2027, 2, 28),
        date(2027, 8, 31),
        date(2028, 2, 29),
        date(2028, 8, 31),
    ]
    monthly = holding_flows([_bond(date(2027, 3, 30), frequency=12)], valuation_date=date(2027, 1, 15))
    assert monthly.date.tolist() == [date(2027, 1, 30), date(2027, 2, 28), date(2027, 3, 30)]


def test_the_other_kinds() -> None:
    holdings = [
        Holding("zero", HoldingKind.ZERO, 50.0, maturity=date(2031, 6, 30)),
        Holding("fund", HoldingKind.FUND, market_value=70.0),
        Holding("deposit", HoldingKind.DEPOSIT, 30.0),
        _bond(date(2029, 1, 31), coupon=0.0, frequency=12),
    ]
    flows = holding_flows(holdings, valuation_date=TODAY)
    assert flows.holding.tolist() == [0, 2, 3]
    assert flows.date.tolist() == [date(2031, 6, 30), TODAY, date(2029, 1, 31)]
    assert flows.amount.tolist() == [50.0, 30.0, 100.0]
    assert flows.time[1] == 0.0


def test_the_principal_of_a_linked_bond_is_a_row_of_its_own_where_it_has_a_floor() -> None:
    """Before indexation it pays what a bond does; coupons and principal grow in different ways."""
    bond = _bond(date(2027, 12, 31))
    free = replace(bond, kind=HoldingKind.LINKED_BOND)
    floored = replace(free, has_principal_floor=True)
    zero = replace(floored, coupon=0.0)
    flows = holding_flows([bond, free, floored, zero, bond], valuation_date=TODAY)
    assert flows.holding.tolist() == [0, 0, 0, 1, 1, 1, 2, 2, 2, 2, 3, 4, 4, 4]
    assert flows.amount.tolist() == [2.0, 2.0, 102.0] * 2 + [2.0, 2.0, 2.0, 100.0, 100.0, 2.0, 2.0, 102.0]
    assert np.flatnonzero(flows.is_principal).tolist() == [9, 10]
    assert flows.date[8] == flows.date[9] == np.datetime64("2027-12-31")
    assert flows.outstanding.tolist() == [100.0] * 14
    assert flows.running.rate.tolist() == [0.04, 0.04, 0.04, 0.0, 0.0, 0.04]
    assert flows.running.row.tolist() == [0, 3, 6, 9, 10, 11]


def test_what_has_matured_pays_nothing() -> None:
    matured = [
        _bond(TODAY),
        _bond(TODAY - timedelta(days=1)),
        Holding("zero", HoldingKind.ZERO, 1.0, maturity=TODAY),
    ]
    assert holding_flows(matured, valuation_date=TODAY).amount.size == 0


def test_no_holdings() -> None:
    flows = holding_flows([], valuation_date=TODAY)
    assert flows.holding.size == flows.date.size == flows.time.size == flows.amount.size == 0


def test_day_count_makes_the_times() -> None:
    flows = holding_flows([_bond(date(2028, 6, 30))], valuation_date=TODAY, day_count=DayCount.THIRTY_360)
    np.testing.assert_allclose(flows.time, [0.5, 1.0, 1.5, 2.0], rtol=1e-15)


def test_the_far_end_of_the_calendar() -> None:
    flows = holding_flows([_bond(date(9999, 12, 31), frequency=12)], valuation_date=TODAY)
    assert flows.date[0] == np.datetime64("2026-07-31")
    assert flows.date[-1] == np.datetime64("9999-12-31")
    assert flows.amount.size == (9999 - 2026) * 12 + 6


def test_add_months_clips_the_day() -> None:
    start = np.array(["2024-01-31", "2024-02-29", "2024-05-31", "1970-01-01"], dtype="M8[D]")
    moved = add_months(start, np.array([1, 12, -3, -1]))
    assert moved.astype(str).tolist() == ["2024-02-29", "2025-02-28", "2024-02-29", "1969-12-01"]


@pytest.mark.parametrize(
    ("fields", "message"),
    [
        ({"kind": HoldingKind.BOND}, "`maturity` must be given for the bond 'x'"),
        ({"kind": HoldingKind.ZERO}, "`maturity` must be given for the zero 'x'"),
        ({"kind": HoldingKind.BOND, "maturity": TODAY, "frequency": 3}, "`frequency` must be 1, 2, 4 or 12"),
        ({"kind": HoldingKind.DEPOSIT, "nominal": float("nan")}, "`nominal` must be finite for 'x'"),
        ({"kind": HoldingKind.FUND, "market_value": float("inf")}, "`market_value` must be finite"),
        ({"kind": HoldingKind.FUND, "duration": -1.0}, "`duration` must be at least 0 for 'x'"),
    ],
)
def test_a_holding_has_what_its_kind_needs(fields: dict[str, object], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        Holding(name="x", **fields)  # type: ignore[arg-type]  # the fields are wrong on purpose
