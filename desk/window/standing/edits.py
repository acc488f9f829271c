"""Edits that the station Standing makes: the liability basis, the two bases, the terms of a line."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from desk.book import Basis, Book, LiabilityMethod, LineTerms, Side
from desk.valuation.records import Standing

__all__ = [
    "NO_CORPORATE_BONDS",
    "basis_fault",
    "changed_curve",
    "held_as_second",
    "swapped",
    "terms_of",
    "with_method",
    "with_terms",
    "without_second",
]

NO_CORPORATE_BONDS = (
    "This book has no corporate bonds: put them in a sheet Liability bonds of the workbook, or paste them in "
    "Curve as the liability curve."
)
_FIRST_TERMS = (1.0, 5.0, 10.0, 20.0, 30.0)
"""Of spreads by term that begin at nothing [years]."""


def changed_curve(former: Basis, basis: Basis) -> bool:
    """Whether two bases differ in what the curve of the liabilities is drawn from, their spread apart."""
    if (
        former.liability_method is not basis.liability_method
        or former.liability_fit is not basis.liability_fit
    ):
        return True
    if former.expected_return != basis.expected_return or former.liability_bonds != basis.liability_bonds:
        return True
    return not (
        np.array_equal(former.liability_terms, basis.liability_terms)
        and np.array_equal(former.liability_spreads, basis.liability_spreads)
    )


def basis_fault(basis: Basis) -> str:
    """Why liabilities cannot be valued on a basis, in a sentence or two; empty where they can be."""
    if basis.liability_method is LiabilityMethod.CORPORATE_BONDS and not basis.liability_bonds:
        return NO_CORPORATE_BONDS
    try:
        _ = basis.liability_curve
        basis.liability_spread_at(np.array([1.0]))
    except (ValueError, OverflowError) as error:
        text = str(error).strip().rstrip(".")
        return f"{text[:1].upper()}{text[1:]}."
    return ""


def with_method(basis: Basis, method: LiabilityMethod, standing: Standing | None) -> Basis:
    """A basis with another liability method.

    What the method needs and the basis does not state begins where the liabilities are worth about what they
    were: an expected return at their equivalent rate, spreads by term at nothing.
    """
    changes: dict[str, Any] = {"liability_method": method}
    if method is LiabilityMethod.EXPECTED_RETURN and basis.expected_return is None:
        start = standing.liabilities.equivalent_rate if standing is not None else np.nan
        changes["expected_return"] = round(float(start), 4) if np.isfinite(start) else 0.0
    if method is LiabilityMethod.TERM_SPREADS and not basis.liability_terms.size:
        changes["liability_terms"] = np.array(_FIRST_TERMS)
        changes["liability_spreads"] = np.zeros(len(_FIRST_TERMS))
    return replace(basis, **changes)


def held_as_second(book: Book) -> Book:
    """The book with its basis held as the second one too."""
    return replace(book, second_basis=book.basis)


def swapped(book: Book) -> Book:
    """The book with its two bases in each other's place.

    Raises
    ------
    ValueError
        If it has no second basis.
    """
    if book.second_basis is None:
        raise ValueError("`book` must have a second basis")
    return replace(book, basis=book.second_basis, second_basis=book.basis)


def without_second(book: Book) -> Book:
    """The book with its first basis alone."""
    return replace(book, second_basis=None)


def terms_of(book: Book, side: Side, line: str) -> LineTerms:
    """The terms of a line of flows: those stated, or those of a line that states none."""
    for terms in book.line_terms:
        if terms.side is side and terms.line == line:
            return terms
    return LineTerms(side, line)


def with_terms(book: Book, terms: LineTerms) -> Book:
    """The book with other terms for one of its lines; terms that say nothing are left out."""
    plain = terms == LineTerms(terms.side, terms.line)
    kept: list[LineTerms] = []
    is_placed = plain
    for each in book.line_terms:
        if (each.side, each.line) != (terms.side, terms.line):
            kept.append(each)
        elif not is_placed:
            kept.append(terms)
            is_placed = True
    if not is_placed:
        kept.append(terms)
    return replace(book, line_terms=tuple(kept))
