"""Records of a book: owned, checked, compared by value, told apart by their digest."""

from __future__ import annotations

from dataclasses import replace
from datetime import date

import numpy as np
import pytest

from desk.book import Basis, Book, FlowTable, Holding, HoldingKind, PricedFlows, Side
from desk.rates.compounding import Compounding
from desk.rates.curve import Curve, Interpolation


def _basis() -> Basis:
    return Basis(date(2026, 6, 30), "EUR", np.array([1.0, 10.0]), np.array([0.02, 0.03]))


def _book() -> Book:
    return Book(
        _basis(),
        FlowTable.build(["a", "b", "a"], [1.0, 2.0, 3.0], [10.0, 20.0, 30.0], beta=[0.0, 0.5, 0.0]),
        (Holding("bond", HoldingKind.BOND, 100.0, 0.03, 2, date(2030, 1, 31), market_value=99.0),),
    )


def test_equal_books_have_equal_digests() -> None:
    assert _book() == _book()
    assert _book().digest == _book().digest
    assert len(_book().digest) == 64


@pytest.mark.parametrize(
    "changed",
    [
        lambda book: replace(book, basis=replace(book.basis, liability_spread=1e-12)),
        lambda book: replace(book, basis=replace(book.basis, rates=[0.02, 0.030000001])),
        lambda book: replace(book, holdings=()),
        lambda book: replace(book, holdings=(replace(book.holdings[0], market_value=99.1),)),
        lambda book: replace(book, holdings=(replace(book.holdings[0], market_value=None),)),
        lambda book: replace(
            book, liabilities=FlowTable.build(["a", "b", "b"], [1.0, 2.0, 3.0], [10.0, 20.0, 30.0])
        ),
        lambda book: replace(book, asset_flows=FlowTable.build(["c"], [1.0], [1.0])),
    ],
)
def test_any_change_changes_the_digest(changed: object) -> None:
    assert callable(changed)
    other = changed(_book())
    assert other != _book()
    assert other.digest != _book().digest


def test_a_whole_number_and_the_same_float_give_one_digest() -> None:
    books = [
        replace(_book(), holdings=(Holding("Fund", HoldingKind.FUND, market_value=value, units=value),))
        for value in (5, 5.0)
    ]
    assert books[0] == books[1]
    assert books[0].digest == books[1].digest


def test_flows_are_lines_in_order_of_appearance() -> None:
    table = FlowTable.build(["b", "a", "b"], [0.0, -1.0, 2.0], [1.0, 2.0, 3.0])
    assert table.line_names == ("b", "a")
    assert table.line.tolist() == [0, 1, 0]
    assert table.future.tolist() == [False, False, True]
    assert len(table) == 3
    assert len(FlowTable.empty()) == 0


def test_flows_are_owned() -> None:
    time = np.array([1.0, 2.0])
    table = FlowTable.build(["a", "a"], time, [1.0, 2.0])
    time[0] = 50.0
    assert table.time[0] == 1.0
    with pytest.raises(ValueError, match="read-only"):
        table.amount[0] = 5.0


@pytest.mark.parametrize(
    ("column", "values", "message"),
    [
        ("time", [1.0], "must be of one length"),
        ("amount", [1.0, np.nan], "`time`, `amount` and `beta` must be finite"),
        ("time", [1.0, np.inf], "`time`, `amount` and `beta` must be finite"),
        ("beta", [np.nan, 0.0], "`time`, `amount` and `beta` must be finite"),
        ("line", [0, 1], "`line` must index `line_names`"),
        ("line", [-1, 0], "`line` must index `line_names`"),
    ],
)
def test_flows_that_do_not_go_together_are_refused(column: str, values: list[float], message: str) -> None:
    table = FlowTable.build(["a", "a"], [1.0, 2.0], [1.0, 2.0])
    with pytest.raises(ValueError, match=message):
        replace(table, **{column: np.array(values)})  # type: ignore[arg-type]  # one column of several types


def test_priced_flows_are_checked() -> None:
    one = np.ones(1)
    with pytest.raises(ValueError, match="must be of one length"):
        PricedFlows(Side.ASSETS, ("a",), np.zeros(1, np.int64), one, one, np.ones(2), np.ones(1, np.bool_))


def test_what_remains_to_be_discounted() -> None:
    flows = PricedFlows(
        Side.ASSETS,
        ("a",),
        np.zeros(2, np.int64),
        np.array([0.0, 2.0]),
        np.array([5.0, 100.0]),
        np.array([0.01, 0.01]),
        np.ones(2, np.bool_),
    )
    np.testing.assert_allclose(flows.spread_discounted, [5.0, 100.0 * np.exp(-0.02)], rtol=1e-15)
    assert len(flows) == 2


def test_the_basis_makes_its_curve() -> None:
    basis = replace(_basis(), compounding=Compounding.SEMI_ANNUAL, interpolation=Interpolation.LINEAR_ZERO)
    np.testing.assert_allclose(basis.curve.zero(1.0), 2.0 * np.log(1.01), rtol=1e-15)
    np.testing.assert_allclose(basis.curve.discount(10.0), 1.015**-20, rtol=1e-13)
    assert isinstance(basis.curve, Curve)
    assert basis.curve.interpolation is Interpolation.LINEAR_ZERO
    assert basis.curve is basis.curve


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"terms": [10.0, 1.0]}, "the quote at 1 years stands after the one at 10 years"),
        ({"rates": [0.02, -1.5]}, "not above -100 %, compounded annual"),
    ],
)
def test_a_basis_without_a_curve_says_why(change: dict[str, object], message: str) -> None:
    basis = replace(_basis(), **change)  # type: ignore[arg-type]  # one field of several types
    with pytest.raises(ValueError, match=message):
        _ = basis.curve


def test_payments_are_the_amounts_unless_they_are_stated() -> None:
    one = np.ones(2)
    flows = PricedFlows(Side.ASSETS, ("a",), np.zeros(2, np.int64), one, one, one, np.ones(2, np.bool_))
    assert flows.paid is flows.amount
    stated = replace(flows, payment=np.array([3.0, 4.0]))
    assert stated.paid.tolist() == [3.0, 4.0]
    with pytest.raises(ValueError, match="`payment` must be of the length of `amount`"):
        replace(flows, payment=np.ones(3))
