"""A book on another day count."""

from __future__ import annotations

from dataclasses import replace
from datetime import date

import numpy as np
import pytest

from desk.book import Basis, Book, FlowTable
from desk.rates.day_count import DayCount
from desk.valuation.restating import with_day_count


def a_book() -> Book:
    dates = np.array(["2032-03-31", "NaT"], dtype="datetime64[D]")
    return Book(
        Basis(date(2031, 3, 31), "EUR", np.array([1.0]), np.array([0.02])),
        FlowTable.build(["a", "a"], [366 / 365, 7.5], [1.0, 2.0], date=dates),
        asset_flows=FlowTable.build(["b"], [2.0], [1.0]),
    )


def test_dates_come_to_lie_at_other_times_and_years_stay() -> None:
    # From 31 March 2031 to 31 March 2032 there are 366 days: Act/360 gives 366/360.
    book = with_day_count(a_book(), DayCount.ACT_360)
    assert book.basis.day_count is DayCount.ACT_360
    assert book.liabilities.time == pytest.approx([366 / 360, 7.5])
    assert book.asset_flows == a_book().asset_flows


def test_there_and_back_is_where_it_was() -> None:
    book = a_book()
    there = with_day_count(book, DayCount.THIRTY_360)
    assert with_day_count(there, DayCount.ACT_365F).digest == book.digest


def test_the_second_basis_keeps_the_day_count_of_the_first() -> None:
    first = a_book().basis
    book = replace(a_book(), second_basis=replace(first, liability_spread=0.01))
    restated = with_day_count(book, DayCount.ACT_360)
    assert restated.second_basis == replace(first, liability_spread=0.01, day_count=DayCount.ACT_360)
    assert restated.basis.day_count is DayCount.ACT_360
    assert with_day_count(restated, first.day_count) == book
