"""Edits of the bases and of the terms of lines, without a window."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from desk.book import Indexation, IndexationKind, LiabilityMethod, LineTerms, Side
from desk.valuation.standing import stand
from desk.window.standing.edits import (
    NO_CORPORATE_BONDS,
    basis_fault,
    changed_curve,
    held_as_second,
    swapped,
    terms_of,
    with_method,
    with_terms,
    without_second,
)
from desk.window.standing.line_words import collar_fault, discount_words, indexation_words
from desk.window.standing.spreads import spreads_fault
from desk.window.standing.wording import basis_words
from tests.window.benches import a_fund
from tests.window.standing.books import some_bonds, two_bases


def test_a_basis_is_held_swapped_and_taken_away() -> None:
    fund = a_fund()
    held = held_as_second(fund)
    assert held.second_basis == fund.basis
    book = two_bases()
    assert swapped(swapped(book)) == book
    assert swapped(book).basis.liability_spread == 0.02
    assert without_second(book) == fund
    with pytest.raises(ValueError, match="second basis"):
        swapped(fund)


def test_an_expected_return_begins_where_the_liabilities_are_worth_what_they_were() -> None:
    fund = a_fund()
    standing = stand(fund)
    plain = replace(fund.basis, liability_spread=0.0)
    basis = with_method(plain, LiabilityMethod.EXPECTED_RETURN, standing)
    after = stand(replace(fund, basis=basis))
    assert after.liabilities.present_value == pytest.approx(standing.liabilities.present_value, rel=1e-3)
    again = with_method(replace(basis, expected_return=0.07), LiabilityMethod.EXPECTED_RETURN, standing)
    assert again.expected_return == 0.07
    assert with_method(plain, LiabilityMethod.EXPECTED_RETURN, None).expected_return == 0.0


def test_spreads_by_term_begin_at_nothing() -> None:
    fund = a_fund()
    basis = with_method(fund.basis, LiabilityMethod.TERM_SPREADS, None)
    assert stand(replace(fund, basis=basis)).liabilities.present_value == pytest.approx(
        stand(fund).liabilities.present_value, rel=1e-14
    )
    assert changed_curve(fund.basis, basis)
    assert not changed_curve(fund.basis, replace(fund.basis, liability_spread=0.1, title="x"))


def test_what_a_liability_basis_lacks_is_said() -> None:
    basis = a_fund().basis
    assert basis_fault(basis) == ""
    bonds = replace(basis, liability_method=LiabilityMethod.CORPORATE_BONDS)
    assert basis_fault(bonds) == NO_CORPORATE_BONDS
    assert basis_fault(replace(bonds, liability_bonds=some_bonds())) == ""
    none = replace(basis, liability_method=LiabilityMethod.EXPECTED_RETURN)
    assert "expected return" in basis_fault(none)


def test_terms_take_the_place_of_those_of_the_line() -> None:
    fund = a_fund()
    assert terms_of(fund, Side.LIABILITIES, "pensions") == LineTerms(Side.LIABILITIES, "pensions")
    first = LineTerms(Side.LIABILITIES, "pensions", Indexation(IndexationKind.RISING, rise=0.02))
    other = LineTerms(Side.ASSETS, "pensions", rate=0.03)
    book = with_terms(with_terms(fund, first), other)
    assert book.line_terms == (first, other)
    changed = replace(first, spread=0.01)
    assert with_terms(book, changed).line_terms == (changed, other)
    assert terms_of(book, Side.ASSETS, "pensions") == other
    # Terms that say nothing are none.
    assert with_terms(book, LineTerms(Side.LIABILITIES, "pensions")).line_terms == (other,)
    assert with_terms(fund, LineTerms(Side.LIABILITIES, "pensions")) == fund


def test_terms_in_words() -> None:
    kind = IndexationKind.COLLARED
    assert indexation_words(Indexation()) == ""
    assert indexation_words(Indexation(IndexationKind.LINKED)) == "prices"
    assert indexation_words(Indexation(IndexationKind.RISING, rise=0.025)) == "2.5\u202f% a year"
    assert indexation_words(Indexation(kind, floor=0.0, cap=0.05)) == "prices, 0\u202f% to 5\u202f%"
    assert indexation_words(Indexation(kind, floor=0.01)) == "prices, at least 1\u202f%"
    assert indexation_words(Indexation(kind, cap=0.03)) == "prices, at most 3\u202f%"
    assert discount_words(LineTerms(Side.ASSETS, "x")) == ""
    assert discount_words(LineTerms(Side.ASSETS, "x", spread=0.0)) == "curve + 0\u202f%"
    assert discount_words(LineTerms(Side.ASSETS, "x", spread=-0.002)) == "curve − 0.2\u202f%"
    assert discount_words(LineTerms(Side.ASSETS, "x", rate=0.04)) == "4\u202f%"
    assert collar_fault(0.02, None) == collar_fault(None, 0.02) == collar_fault(0.02, 0.02) == ""
    assert "cap of 1\u202f% is below the floor of 2\u202f%" in collar_fault(0.02, 0.01)


def test_bases_in_words() -> None:
    basis = replace(a_fund().basis, title="")
    assert basis_words(basis) == "liabilities on the curve, spread 0.50\u202f%"
    flat = replace(
        basis,
        title="Accounts",
        liability_method=LiabilityMethod.EXPECTED_RETURN,
        expected_return=0.04,
        liability_spread=0.0,
    )
    assert basis_words(flat) == "“Accounts”, liabilities on an expected return of 4.00\u202f%"


@pytest.mark.parametrize(
    ("terms", "spreads", "part"),
    [
        ([], [], "one term at least"),
        ([1.0, 2.0], [0.01, np.nan], "needs a term and a spread"),
        ([-1.0, 2.0], [0.01, 0.01], "at least 0 years"),
        ([0.0, 2.0], [0.01, 0.01], ""),
        ([2.0, 2.0], [0.01, 0.01], "rise: 2 years would come after 2 years"),
        ([1.0, 2.0], [0.01, 3.0], "out of all proportion"),
        ([1.0, 2.0], [0.01, 0.02], ""),
    ],
)
def test_spreads_that_are_none_are_named(terms: list[float], spreads: list[float], part: str) -> None:
    fault = spreads_fault(np.array(terms), np.array(spreads))
    assert part in fault
    assert bool(fault) == bool(part)
