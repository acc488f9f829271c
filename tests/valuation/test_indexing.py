"""Amounts that follow an index: growth of every kind, and amounts on another curve."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from desk.book import Book, FlowTable, Indexation, IndexationKind, Inflation, LineTerms, PricedFlows, Side
from desk.rates.curve import Curve
from desk.valuation.indexing import CollarTables, IndexClasses, index_factors, reindexed, row_factors
from desk.valuation.priced import priced_flows
from tests.valuation.books import basis, small_book
from tests.valuation.plain_inflation import growth, index

LINKED, COLLARED, RISING = IndexationKind.LINKED, IndexationKind.COLLARED, IndexationKind.RISING
INFLATION = Inflation(
    np.array([1.0, 2.0, 5.0, 10.0, 30.0]),
    np.array([0.031, 0.027, 0.022, 0.024, 0.026]),
    volatility=0.013,
    recent=0.045,
)
KINDS = [
    Indexation(),
    Indexation(RISING, rise=0.03),
    Indexation(RISING, rise=-0.5),
    Indexation(LINKED),
    Indexation(LINKED, lag=0.25),
    Indexation(LINKED, lag=2.5),
    Indexation(LINKED, lag=0.25, least=0.8),
    Indexation(LINKED, least=1.3),
    Indexation(COLLARED, floor=0.0, cap=0.05),
    Indexation(COLLARED, floor=0.01, cap=0.025, lag=0.25),
    Indexation(COLLARED, cap=0.03, lag=1.5),
    Indexation(COLLARED, floor=0.02),
    Indexation(COLLARED, floor=0.03, cap=0.03),
]
TIMES = np.array([0.0, 0.1, 0.25, 0.7, 1.0, 1.25, 2.0, 3.4, 7.0, 9.99, 24.5, 40.0, 61.3])


@pytest.mark.parametrize("volatility", [0.0, 0.013, 0.05])
@pytest.mark.parametrize("recent", [None, 0.045, -0.02])
def test_growth_of_every_kind_against_the_plain_version(volatility: float, recent: float | None) -> None:
    inflation = replace(INFLATION, volatility=volatility, recent=recent)
    for kind in KINDS:
        expected = [growth(kind, float(time), index(inflation), volatility) for time in TIMES]
        found = index_factors(kind, TIMES, inflation=inflation)
        np.testing.assert_allclose(found, expected, rtol=2e-9, err_msg=repr(kind))
        assert found[0] == (kind.least if kind.least is not None and kind.least > 1.0 else 1.0)


def test_a_lag_given_goes_before_that_of_the_class() -> None:
    found = index_factors(Indexation(LINKED, lag=2.0), TIMES, inflation=INFLATION, lag=0.25)
    np.testing.assert_array_equal(
        found, index_factors(Indexation(LINKED, lag=0.25), TIMES, inflation=INFLATION)
    )


def test_another_curve_leaves_the_past_as_it_was() -> None:
    """Without a stated rate of the months just passed it is the start of the first curve."""
    other, lagged = Curve([1.0], [0.09]), Indexation(LINKED, lag=0.5)
    inflation = replace(INFLATION, recent=None)
    found = index_factors(lagged, [0.5, 1.5], inflation=inflation, curve=other)
    known = 1.031**0.5
    np.testing.assert_allclose(found, [known, known * np.exp(0.09)], rtol=1e-13)


def test_a_collar_lies_between_its_floor_its_cap_and_nothing_held() -> None:
    free = index_factors(Indexation(LINKED), TIMES, inflation=INFLATION)
    floored = index_factors(Indexation(COLLARED, floor=0.015), TIMES, inflation=INFLATION)
    capped = index_factors(Indexation(COLLARED, cap=0.035), TIMES, inflation=INFLATION)
    both = index_factors(Indexation(COLLARED, floor=0.015, cap=0.035), TIMES, inflation=INFLATION)
    ahead = TIMES > 0.0
    assert (floored[ahead] > free[ahead]).all()
    assert (capped[ahead] < free[ahead]).all()
    assert ((both > capped) & (both < floored))[ahead].all()
    assert (both >= 1.015**TIMES).all()
    assert (both <= 1.035**TIMES).all()


def test_a_wide_collar_is_fully_linked_and_a_collar_of_nothing_is_fixed() -> None:
    whole = np.arange(0.0, 50.0)
    free = index_factors(Indexation(LINKED), whole, inflation=INFLATION)
    wide = index_factors(Indexation(COLLARED, floor=-0.9, cap=5.0), whole, inflation=INFLATION)
    none = index_factors(Indexation(COLLARED), whole, inflation=INFLATION)
    shut = index_factors(Indexation(COLLARED, floor=0.0, cap=0.0), whole, inflation=INFLATION)
    np.testing.assert_allclose(wide, free, rtol=1e-13)
    np.testing.assert_allclose(none, free, rtol=1e-13)
    np.testing.assert_array_equal(shut, 1.0)


def test_an_index_needs_inflation_and_a_rising_line_none() -> None:
    for kind in (Indexation(LINKED), Indexation(COLLARED, cap=0.05)):
        with pytest.raises(ValueError, match="`inflation` must be given"):
            index_factors(kind, [1.0], inflation=None)
    np.testing.assert_allclose(
        index_factors(Indexation(RISING, rise=0.02), [[1.0], [2.5]], inflation=None),
        [[1.02], [1.02**2.5]],
        rtol=1e-14,
    )
    assert index_factors(Indexation(), 3.0, inflation=None) == 1.0


@pytest.mark.parametrize(
    ("terms", "match"),
    [
        ({"floor": 0.05, "cap": 0.04}, "`cap` must be at least `floor`"),
        ({"lag": -0.1}, "`lag` must be finite"),
        ({"lag": np.inf}, "`lag` must be finite"),
        ({"least": -1.0}, "`least` must be finite"),
        ({"rise": -1.0}, "`rise` must be above -1"),
    ],
)
def test_indexations_that_make_no_sense(terms: dict[str, Any], match: str) -> None:
    with pytest.raises(ValueError, match=match):
        Indexation(COLLARED, **terms)


@pytest.mark.parametrize(
    ("terms", "match"),
    [
        ({"volatility": -0.01}, "`volatility`"),
        ({"volatility": np.nan}, "`volatility`"),
        ({"recent": -1.0}, "`recent`"),
    ],
)
def test_inflation_that_makes_no_sense(terms: dict[str, Any], match: str) -> None:
    with pytest.raises(ValueError, match=match):
        replace(INFLATION, **terms)


def _book(*terms: LineTerms, inflation: Inflation | None = INFLATION) -> Book:
    return replace(small_book(), basis=replace(basis(), inflation=inflation), line_terms=terms)


def test_on_its_own_curve_reindexing_changes_nothing() -> None:
    flows = priced_flows(
        _book(
            LineTerms(Side.LIABILITIES, "In payment", Indexation(LINKED, lag=0.25)),
            LineTerms(Side.LIABILITIES, "With profits", Indexation(COLLARED, floor=0.0, cap=0.025)),
            LineTerms(Side.LIABILITIES, "Mixed", Indexation(RISING, rise=0.02)),
        ),
        Side.LIABILITIES,
    ).flows
    same = reindexed(flows, inflation=INFLATION, curve=INFLATION.curve)
    np.testing.assert_array_equal(same.amount, flows.amount)


def test_reindexed_on_a_moved_curve() -> None:
    """Real amounts, rising lines and lines without terms stay; the others are as if valued there anew."""
    terms = (
        LineTerms(Side.LIABILITIES, "In payment", Indexation(COLLARED, floor=0.0, cap=0.025)),
        LineTerms(Side.LIABILITIES, "Mixed", Indexation(RISING, rise=0.02)),
    )
    flows = priced_flows(_book(*terms), Side.LIABILITIES).flows
    moved = replace(INFLATION, rates=INFLATION.rates + 0.01)
    found = reindexed(flows, inflation=INFLATION, curve=moved.curve)
    expected = priced_flows(_book(*terms, inflation=moved), Side.LIABILITIES).flows
    np.testing.assert_allclose(found.amount, expected.amount, rtol=1e-14)
    assert found.real_amount is not None
    assert flows.real_amount is not None
    np.testing.assert_array_equal(found.real_amount, flows.real_amount)
    of_line = found.line == 0
    assert (found.amount[of_line & (found.time > 1)] > flows.amount[of_line & (flows.time > 1)]).all()
    np.testing.assert_array_equal(found.amount[~of_line], flows.amount[~of_line])


def test_payments_that_grow_move_with_their_amounts() -> None:
    flows = PricedFlows(
        Side.ASSETS,
        ("floats", "linked"),
        np.array([0, 0, 1]),
        np.array([1.0, 2.0, 2.0]),
        np.array([100.0, -1.0, 104.0]),
        np.zeros(3),
        np.ones(3, dtype=bool),
        payment=np.array([3.0, 103.0, 104.0]),
        real_amount=np.array([100.0, -1.0, 100.0]),
        index_class=np.array([-1, -1, 0]),
        indexations=(Indexation(LINKED),),
    )
    found = reindexed(flows, inflation=INFLATION, curve=Curve([1.0], [0.05]))
    np.testing.assert_allclose(found.amount, [100.0, -1.0, 100.0 * np.exp(0.1)])
    np.testing.assert_allclose(found.paid, [3.0, 103.0, 100.0 * np.exp(0.1)])


@pytest.mark.parametrize(
    ("changes", "match"),
    [
        ({"real_amount": None}, "together"),
        ({"index_class": None}, "together"),
        ({"index_class": np.array([1])}, "must index"),
        ({"index_class": np.array([-2])}, "must index"),
        ({"real_amount": np.zeros(2)}, "of the length"),
    ],
)
def test_flows_whose_indexation_does_not_fit(changes: dict[str, Any], match: str) -> None:
    flows = PricedFlows(
        Side.ASSETS,
        ("linked",),
        np.array([0]),
        np.array([1.0]),
        np.array([1.0]),
        np.zeros(1),
        np.ones(1, dtype=bool),
        real_amount=np.array([1.0]),
        index_class=np.array([0]),
        indexations=(Indexation(LINKED),),
    )
    with pytest.raises(ValueError, match=match):
        replace(flows, **changes)


def test_many_collars_are_tabulated_in_portions() -> None:
    """600 collars to 500 years go through more than one table, and come out as one by one."""
    random = np.random.default_rng(3)
    collars = [Indexation(COLLARED, floor=0.0, cap=0.01 + 1e-5 * number) for number in range(600)]
    classes = IndexClasses.of(collars)
    of_row, time = random.integers(0, 600, 2000), random.uniform(0.0, 500.0, 2000)
    tables = list(CollarTables.of(classes, of_row, time))
    assert len(tables) > 1
    assert sum(table.rows.size for table in tables) == 2000
    found = row_factors(classes, of_row, time, inflation=INFLATION)
    for row in range(0, 2000, 97):
        alone = index_factors(collars[of_row[row]], time[row : row + 1], inflation=INFLATION)
        assert found[row] == pytest.approx(alone[0], rel=1e-12)


@pytest.mark.parametrize("kind", [kind for kind in KINDS if kind.follows_index])
@pytest.mark.parametrize("rate", [-0.9, -0.02, 0.0, 9.0])
@pytest.mark.parametrize("volatility", [0.0, 10.0])
def test_hostile_inflation_gives_finite_growth(kind: Indexation, rate: float, volatility: float) -> None:
    inflation = Inflation(np.array([1.0]), np.array([rate]), volatility=volatility)
    time = np.array([0.0, 0.5, 10.0, 999.0, 5e3, 1e7])
    found = index_factors(kind, time, inflation=inflation)
    assert np.isfinite(found).all()
    assert (found >= 0.0).all()


def test_beyond_the_table_the_last_year_goes_on() -> None:
    kind = Indexation(COLLARED, floor=0.0, cap=0.0005)
    found = index_factors(kind, [1000.0, 1001.0, 1500.5], inflation=replace(INFLATION, volatility=0.0))
    np.testing.assert_allclose(found, 1.0005 ** np.array([1000.0, 1001.0, 1500.5]), rtol=1e-10)


def test_no_rows() -> None:
    assert index_factors(KINDS[8], [], inflation=INFLATION).shape == (0,)
    empty = priced_flows(Book(basis(), FlowTable.empty()), Side.LIABILITIES).flows
    assert reindexed(empty, inflation=INFLATION, curve=INFLATION.curve) is empty
