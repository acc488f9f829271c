"""Moved curves: every kind of move, floors, and any curve beneath."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from desk.book.shock import Move, MoveKind, Shock
from desk.rates.compounding import Compounding, from_continuous
from desk.rates.curve import Curve, DiscountCurve, Interpolation
from desk.rates.flat import flat_curve
from desk.rates.parametric import Svensson
from desk.valuation.moved_curve import CurveMove, Knots, MovedCurve
from tests.valuation.books import basis

TIMES = np.array([0.0, 0.1, 0.5, 1.0, 3.3, 7.0, 10.0, 19.9, 30.0, 55.0, 120.0])


def curves() -> list[DiscountCurve]:
    """Curves of different kinds."""
    terms, rates = np.array([0.5, 2.0, 10.0, 30.0]), np.array([0.01, -0.004, 0.02, 0.03])
    return [
        *(Curve(terms, rates, interpolation) for interpolation in Interpolation),
        Svensson(0.03, -0.01, 0.02, 0.01, 2.0, 8.0),
    ]


def moved(
    curve: DiscountCurve, *moves: Move, compounding: Compounding = Compounding.CONTINUOUS
) -> MovedCurve:
    """The curve after some moves."""
    return MovedCurve(curve, CurveMove(moves, compounding))


SHAPES: list[tuple[Move, Callable[[float], float]]] = [
    (Move(MoveKind.PARALLEL, 100.0), lambda t: 0.01),
    (Move(MoveKind.SHORT, 250.0), lambda t: 0.025 * np.exp(-t / 4.0)),
    (Move(MoveKind.LONG, -100.0), lambda t: -0.01 * (1.0 - np.exp(-t / 4.0))),
    (Move(MoveKind.TWIST, 50.0, 10.0), lambda t: 0.005 * min(t / 10.0 - 1.0, 1.0)),
    (Move(MoveKind.RATE, 30.0, 5.0), lambda t: 0.003),
]


@pytest.mark.parametrize(("move", "size"), SHAPES, ids=[move.kind for move, _ in SHAPES])
@pytest.mark.parametrize("number", range(5))
def test_plain_moves_are_added_to_the_zero_rates(
    move: Move, size: Callable[[float], float], number: int
) -> None:
    """At every time, on every kind of curve."""
    curve = curves()[number]
    after = moved(curve, move)
    wanted = curve.zero(TIMES) + [size(float(time)) for time in TIMES]
    np.testing.assert_allclose(after.zero(TIMES), wanted, rtol=0.0, atol=1e-15)
    np.testing.assert_allclose(after.discount(TIMES), np.exp(-wanted * TIMES), rtol=1e-14)
    assert after.discount(0.0) == 1.0


def test_rates_at_terms_are_joined_by_lines() -> None:
    """And stay flat outside them, whatever the order stated."""
    curve = flat_curve(0.02)
    stated = [Move(MoveKind.RATE, size, term) for term, size in ((2.0, 10.0), (10.0, 50.0), (5.0, -20.0))]
    move = CurveMove(stated)
    assert not move.in_order
    change = move.change(np.array([0.0, 2.0, 3.5, 5.0, 7.5, 10.0, 40.0]), np.zeros(7))
    np.testing.assert_allclose(
        change, np.array([10.0, 10.0, -5.0, -20.0, 15.0, 50.0, 50.0]) * 1e-4, atol=1e-18
    )
    assert moved(curve, *stated).zero(5.0) == pytest.approx(float(curve.zero(5.0)) - 0.002, abs=1e-15)


def test_relative_moves_are_of_the_rate_stated_in_its_compounding() -> None:
    """A rate below 0 is left; a least size counts for those too."""
    curve = curves()[1]
    annual = from_continuous(curve.zero(TIMES), Compounding.ANNUAL)
    down = moved(curve, Move(MoveKind.RELATIVE, -0.5), compounding=Compounding.ANNUAL)
    wanted = np.where(annual > 0.0, 0.5 * annual, annual)
    np.testing.assert_allclose(from_continuous(down.zero(TIMES), Compounding.ANNUAL), wanted, atol=1e-15)
    assert (annual < 0.0).any()
    up = moved(
        curve, Move(MoveKind.RELATIVE, 0.5), Move(MoveKind.LEAST, 100.0), compounding=Compounding.ANNUAL
    )
    wanted = annual + np.maximum(0.5 * np.maximum(annual, 0.0), 0.01)
    np.testing.assert_allclose(from_continuous(up.zero(TIMES), Compounding.ANNUAL), wanted, atol=1e-15)


def test_a_least_size_goes_the_way_of_its_sign() -> None:
    """A fall is at least so deep, whatever the rate; one that is deeper stays."""
    flat = flat_curve(float(np.expm1(0.02)))
    shallow = moved(flat, Move(MoveKind.RELATIVE, -0.1), Move(MoveKind.LEAST, -100.0))
    deep = moved(flat, Move(MoveKind.RELATIVE, -0.75), Move(MoveKind.LEAST, -100.0))
    negative = moved(
        flat_curve(float(np.expm1(-0.01))), Move(MoveKind.RELATIVE, -0.75), Move(MoveKind.LEAST, -100.0)
    )
    rise = moved(flat, Move(MoveKind.RELATIVE, 0.1), Move(MoveKind.LEAST, 100.0))
    np.testing.assert_allclose(shallow.zero(TIMES), 0.01, atol=1e-15)
    np.testing.assert_allclose(deep.zero(TIMES), 0.005, atol=1e-15)
    np.testing.assert_allclose(negative.zero(TIMES), -0.02, atol=1e-15)
    np.testing.assert_allclose(rise.zero(TIMES), 0.03, atol=1e-15)


@given(
    st.lists(st.floats(-0.03, 0.08), min_size=4, max_size=4),
    st.floats(-600.0, 600.0),
)
def test_a_floor_holds_and_leaves_what_is_lower(rates: list[float], size: float) -> None:
    """No moved rate lies below both the floor and the rate before; nothing is raised above what it was."""
    curve = Curve([0.5, 2.0, 10.0, 30.0], rates, Interpolation.LINEAR_ZERO)
    moves = (
        Move(MoveKind.PARALLEL, size),
        Move(MoveKind.FLOOR, -150.0, 0.0),
        Move(MoveKind.FLOOR, 0.0, 50.0),
    )
    before, after = curve.zero(TIMES), moved(curve, *moves).zero(TIMES)
    floor = np.interp(TIMES, [0.0, 50.0], [-0.015, 0.0])
    assert (after >= np.minimum(before, floor) - 1e-15).all()
    free = before + size * 1e-4
    np.testing.assert_allclose(after, np.maximum(free, np.minimum(before, floor)), atol=1e-15)


@pytest.mark.parametrize("number", range(5))
def test_forward_rates_go_with_discount_factors(number: int) -> None:
    """``P(s) = P(t) exp(f (t - s))``; the instantaneous one is the limit."""
    after = moved(curves()[number], Move(MoveKind.SHORT, 100.0), Move(MoveKind.TWIST, 20.0, 7.0))
    start, end = np.array([0.0, 1.0, 4.0]), np.array([2.0, 1.5, 30.0])
    forward = after.forward(start, end)
    np.testing.assert_allclose(
        after.discount(start), after.discount(end) * np.exp(forward * (end - start)), rtol=1e-12
    )
    time = np.array([0.3, 3.0, 12.0])
    step = 1e-4
    central = np.log(after.discount(time - step) / after.discount(time + step)) / (2.0 * step)
    np.testing.assert_allclose(after.forward(time, time), central, atol=2e-7)


@pytest.mark.parametrize(
    ("moves", "message"),
    [
        ((Move(MoveKind.RATE, 1.0, 5.0), Move(MoveKind.RATE, 2.0, 5.0)), "the term 5 stands twice"),
        ((Move(MoveKind.RATE, 1.0),), "no term"),
        ((Move(MoveKind.TWIST, 1.0),), "no term above 0"),
        ((Move(MoveKind.TWIST, 1.0, 0.0),), "no term above 0"),
        ((Move(MoveKind.LEAST, 1.0),), "no relative move"),
        ((Move(MoveKind.FLOOR, 1.0), Move(MoveKind.FLOOR, 1.0, 3.0)), "without a term stands beside"),
    ],
)
def test_moves_that_do_not_go_together(moves: tuple[Move, ...], message: str) -> None:
    """Said in one clause."""
    with pytest.raises(ValueError, match=message):
        CurveMove(moves)


def test_a_rate_that_would_take_all_is_not_a_number() -> None:
    """An annual rate of -100 % leaves nothing to discount with."""
    change = CurveMove([Move(MoveKind.PARALLEL, -11_000.0)], Compounding.ANNUAL).change(
        np.array([1.0]), np.array([0.02])
    )
    assert np.isnan(change).all()


def test_scaling_leaves_floors_and_names() -> None:
    """Every other size is multiplied."""
    shock = Shock("a", (Move(MoveKind.PARALLEL, 10.0), Move(MoveKind.FLOOR, -150.0)), "rule")
    twice = shock.scaled(-2.0)
    assert [move.size for move in twice.moves] == [-20.0, -150.0]
    assert (twice.name, twice.source) == ("a", "rule")
    assert shock.scaled(2.0, name="b").name == "b"


def test_no_moves_of_rates() -> None:
    """Give no move of the curve."""
    assert CurveMove.of_shock(Shock("a", (Move(MoveKind.VALUE, -0.1),))) is None
    found = CurveMove.of_shock(Shock("a", (Move(MoveKind.PARALLEL, 10.0),)))
    assert found is not None
    assert found.is_additive
    np.testing.assert_array_equal(Knots([Move(MoveKind.RELATIVE, 2.0)]).at(TIMES), np.full(TIMES.size, 2.0))
    assert basis().curve.zero(0.0) == moved(basis().curve, Move(MoveKind.LONG, 50.0)).zero(0.0)
