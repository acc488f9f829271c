"""Shocks where two things meet: moves of the same line, curves that are odd to begin with, two answers."""

from __future__ import annotations

from dataclasses import replace
from datetime import date

import numpy as np
import pytest

from desk.book import Book, FlowTable, Holding, HoldingKind
from desk.book.shock import Move, MoveKind, Shock
from desk.rates.compounding import Compounding
from desk.valuation.reverse import Goal, reverse_along
from desk.valuation.shock_base import shock_base
from desk.valuation.shock_effects import CannotShock
from desk.valuation.shock_grid import shock_grid
from desk.valuation.shock_profile import parallel_profile
from desk.valuation.shocks import band_of, run_shock
from desk.valuation.what_if import WhatIf
from tests.valuation.books import basis


def between_two_assets(first: float = 4.0, last: float = 16.3) -> Book:
    """A liability of ten years between two assets, worth a little less than they are."""
    curve = basis().curve
    owned = [36.0 / float(curve.discount(first)), 36.5 / float(curve.discount(last))]
    owed = [73.4 / float(curve.discount(10.0))]
    return Book(
        replace(basis(), liability_spread=0.0),
        FlowTable.build(["a"], [10.0], owed),
        asset_flows=FlowTable.build(["x", "y"], [first, last], owned),
    )


def test_the_nearer_of_two_answers_comes_first() -> None:
    """The surplus rises either way from its least, so a level above it is reached twice."""
    base = shock_base(between_two_assets())
    level = base.position.surplus + 0.6
    for size in (1.0, -1.0):
        shape = Shock("p", (Move(MoveKind.PARALLEL, size),))
        found = reverse_along(base, shape, goal=Goal.SURPLUS, level=level, least=-900.0, most=900.0)
        assert len(found.scales) == 2
        assert found.scales[0] * found.scales[1] < 0.0
        assert abs(found.scales[0]) < abs(found.scales[1])
        for scale in found.scales:
            assert run_shock(base, shape.scaled(scale)).surplus == pytest.approx(level, abs=1e-9)


def test_a_gap_that_is_nothing_at_a_move_of_the_profile_turns_there_once() -> None:
    """Both sides pay at the same times: at no move the sums are the same to the bit."""
    times = [2.0, 9.0]
    plain = replace(
        basis(), liability_spread=0.0, compounding=Compounding.CONTINUOUS, rates=basis().rates * 0
    )
    book = Book(
        plain,
        FlowTable.build(["a"], [5.0], [7.0]),
        asset_flows=FlowTable.build(["x", "y"], times, [4.0, 3.0]),
    )
    base = shock_base(book)
    assert base.position.duration_gap == 0.0
    assert parallel_profile(base).gap_turns == (0.0,)
    assert parallel_profile(base, (-10.0, -5.0, 5.0, 10.0)).gap_turns == pytest.approx((0.0,), abs=1e-8)


def test_two_moves_of_one_fund_follow_each_other() -> None:
    """A fall of a fifth of all funds, then of a tenth of this one."""
    book = Book(
        basis(),
        FlowTable.build(["a"], [1.0], [1.0]),
        (
            Holding("shares", HoldingKind.FUND, market_value=100.0),
            Holding("other", HoldingKind.FUND, market_value=1000.0),
        ),
    )
    moves = (Move(MoveKind.VALUE, -0.2), Move(MoveKind.VALUE, -0.1, target="shares"))
    assert run_shock(shock_base(book), Shock("x", moves)).assets == pytest.approx(872.0, rel=1e-14)


def test_growth_goes_by_the_time_before_a_payment_is_put_off() -> None:
    """A payment of year ten that is two years late has grown for ten."""
    base = shock_base(Book(basis(), FlowTable.build(["a"], [10.0], [50.0])))
    after = run_shock(base, Shock("x", (Move(MoveKind.DECLINE, 0.02), Move(MoveKind.TIME, 2.0))))
    discount = float(base.book.basis.curve.discount(12.0) * np.exp(-12.0 * base.liabilities.flows.spread[0]))
    assert after.liabilities == pytest.approx(50.0 * 1.02**10 * discount, rel=1e-13)


def test_a_curve_that_made_no_sense_before_is_not_held_against_a_shock() -> None:
    """Rates of -10 %: a factor of e⁶ at sixty years. Up they may go; further down they may not."""
    odd = replace(basis(), rates=np.full(basis().rates.size, -0.1), compounding=Compounding.CONTINUOUS)
    base = shock_base(Book(odd, FlowTable.build(["a"], [60.0], [1.0])))
    assert base.position.liabilities > 100.0
    up = run_shock(base, Shock("up", (Move(MoveKind.PARALLEL, 100.0),)))
    assert up.liabilities == pytest.approx(base.position.liabilities * np.exp(-0.6), rel=1e-12)
    with pytest.raises(CannotShock, match="a zero rate of -2"):
        run_shock(base, Shock("down", (Move(MoveKind.PARALLEL, -1000.0),)))


def test_two_spreads_on_a_floater_in_a_grid_are_each_cell_by_itself() -> None:
    """What a floater's payments stand for at a spread is no product of two factors."""
    note = Holding(
        "note", HoldingKind.FLOATER, 100.0, 0.0, 2, date(2033, 6, 30), margin=0.01, current_rate=0.03
    )
    base = shock_base(Book(basis(), FlowTable.build(["a"], [4.0], [90.0]), (note,)))
    first = Shock("s", (Move(MoveKind.SPREAD, 150.0),))
    second = Shock("t", (Move(MoveKind.SPREAD, 220.0, target="note"),))
    grid = shock_grid(base, first, second, first_scale=[0.0, 1.0, 2.0], second_scale=[-1.0, 1.0])
    for row, one in enumerate((0.0, 1.0, 2.0)):
        for column, two in enumerate((-1.0, 1.0)):
            both = Shock("x", (Move(MoveKind.SPREAD, 150.0 * one + 220.0 * two),))
            assert grid.assets[row, column] == pytest.approx(run_shock(base, both).assets, rel=1e-12)
    assert grid.before == base.position


def test_a_whole_year_is_a_whole_year_whatever_its_rounding() -> None:
    """Twelve twelfths may come to a little more than one."""
    base = shock_base(Book(basis(), FlowTable.build(["a"] * 3, [1.0 + 1e-13, 1.01, 2.0 - 1e-13], [1.0] * 3)))
    frame = WhatIf(base).frame(Shock("none", ()))
    worth = base.liabilities.value
    np.testing.assert_allclose(frame.liabilities, [worth[0], worth[1] + worth[2]], rtol=1e-14)


def test_a_ratio_that_is_the_threshold_has_not_fallen_short() -> None:
    """At it and above it is well; without a ratio nothing falls short."""
    thresholds = (1.05, 1.0)
    assert [band_of(ratio, thresholds) for ratio in (1.05, np.nextafter(1.05, 0.0), 1.0, 0.99)] == [
        0,
        1,
        1,
        2,
    ]
    assert band_of(np.nan, thresholds) == 0
