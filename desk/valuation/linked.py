"""What follows a price index in a book: linked bonds, and lines with terms of their own."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from desk.book import (
    Book,
    Fault,
    FlowTable,
    Holding,
    HoldingKind,
    Indexation,
    IndexationKind,
    Inflation,
    Severity,
    Side,
)
from desk.book.arrays import FloatArray, IntArray
from desk.book.schedule import HoldingFlows
from desk.valuation.indexing import IndexClasses, row_factors

__all__ = ["LinkedRows", "TermsOfRows", "is_linked", "linked_rows", "no_inflation", "terms_of_rows"]

_NAMED = 3  # lines a fault names before it counts the others


@dataclass(frozen=True, eq=False)
class LinkedRows:
    """How rows of holdings grow: n rows of m holdings.

    Attributes
    ----------
    is_any : bool
        Whether there is a linked bond.
    ratio : ndarray, shape (m,)
        Index ratio; 1 for what is not linked.
    factor : ndarray, shape (n,)
        Growth from today.
    index_class : ndarray of int, shape (n,), or None
        Into `indexations`; -1 where a row follows no index. None where none does.
    indexations : tuple of Indexation
    """

    is_any: bool
    ratio: FloatArray
    factor: FloatArray
    index_class: IntArray | None = None
    indexations: tuple[Indexation, ...] = ()


def is_linked(holding: Holding) -> bool:
    """Whether a holding follows a price index."""
    return holding.kind is HoldingKind.LINKED_BOND


def linked_rows(holdings: Sequence[Holding], flows: HoldingFlows, inflation: Inflation | None) -> LinkedRows:
    """How the rows of holdings grow.

    Parameters
    ----------
    holdings : sequence of Holding, length m
    flows : HoldingFlows
    inflation : Inflation or None
        Without it nothing grows.

    Returns
    -------
    LinkedRows
        A class for each lag, and one for each least growth ``1 / index_ratio`` of a principal with a floor.
    """
    ratio = np.ones(len(holdings))
    numbers: dict[tuple[int, float | None], int] = {}
    # dimensions: holding; class of its coupons, class of its principal
    of_holding = np.full((len(holdings), 2), -1)
    linked = [number for number, holding in enumerate(holdings) if is_linked(holding)]
    for number in linked:
        holding = holdings[number]
        ratio[number] = holding.index_ratio
        plain = numbers.setdefault((holding.index_lag_months, None), len(numbers))
        of_holding[number] = plain
        if holding.has_principal_floor:
            key = (holding.index_lag_months, 1.0 / holding.index_ratio)
            of_holding[number, 1] = numbers.setdefault(key, len(numbers))
    factor = np.ones(flows.time.size)
    if not linked or inflation is None:
        return LinkedRows(bool(linked), ratio, factor)
    indexations = tuple(
        Indexation(IndexationKind.LINKED, lag=months / 12.0, least=least) for months, least in numbers
    )
    index_class = of_holding[flows.holding, flows.is_principal.astype(np.int64)]
    factor = row_factors(IndexClasses.of(indexations), index_class, flows.time, inflation=inflation)
    return LinkedRows(True, ratio, factor, index_class, indexations)


def no_inflation(names: Sequence[str], *, sheet: str) -> tuple[Fault, ...]:
    """A fault for what follows an index on a basis that expects none; none where `names` is empty."""
    if not names:
        return ()
    named = ", ".join(repr(name) for name in names[:_NAMED])
    more = f" and {len(names) - _NAMED:,} more" if len(names) > _NAMED else ""
    return (
        Fault(
            found=f"{named}{more} following a price index, and no expected inflation",
            expected="a curve of expected inflation",
            mend="The amounts are counted as they stand today; state expected inflation.",
            sheet=sheet,
            severity=Severity.MILD,
        ),
    )


@dataclass(frozen=True, eq=False)
class TermsOfRows:
    """What the terms of lines say of n rows.

    Attributes
    ----------
    index_class : ndarray of int, shape (n,), or None
        Into `indexations`; -1 where a row does not grow. None where none does.
    indexations : tuple of Indexation
    factor : ndarray, shape (n,), or None
        Growth from today; None where no row grows.
    spread : ndarray, shape (n,), or None
        Over the curve, beta apart; NaN where the basis says it. None where it says all [1/year].
    faults : tuple of Fault
        What could not be done as asked, all of the mild kind.
    """

    index_class: IntArray | None = None
    indexations: tuple[Indexation, ...] = ()
    factor: FloatArray | None = None
    spread: FloatArray | None = None
    faults: tuple[Fault, ...] = ()


def terms_of_rows(book: Book, side: Side) -> TermsOfRows:
    """What the terms of lines say of the future rows of one side's ready-made flows.

    Parameters
    ----------
    book : Book
    side : Side

    Returns
    -------
    TermsOfRows
        Where a line has a flat rate, the spread of each row is what leads from the curve of the basis to it,
        ``ln(1 + rate) - z(t)``.

    Raises
    ------
    ValueError
        If the basis gives no curve.
    """
    table = book.liabilities if side is Side.LIABILITIES else book.asset_flows
    own = [terms for terms in book.line_terms if terms.side is side]
    if not own:
        return TermsOfRows()
    numbers = {name: number for number, name in enumerate(table.line_names)}
    sheet = "Liabilities" if side is Side.LIABILITIES else "Asset flows"
    faults = []
    class_of, spread_of, rate_of = (np.full(len(numbers), np.nan) for _ in range(3))
    classes: dict[Indexation, int] = {}
    unindexed = []
    told: set[str] = set()
    for terms in own:
        if terms.line not in numbers or terms.line in told:
            faults.append(_not_used(terms.line, sheet, is_there=terms.line in numbers))
            continue
        told.add(terms.line)
        number = numbers[terms.line]
        spread_of[number] = np.nan if terms.spread is None else terms.spread
        rate_of[number] = np.nan if terms.rate is None else np.log1p(terms.rate)
        if terms.indexation.follows_index and book.basis.inflation is None:
            unindexed.append(terms.line)
        elif terms.indexation.kind is not IndexationKind.FIXED:
            class_of[number] = classes.setdefault(terms.indexation, len(classes))
    return _of_rows(
        book,
        table,
        tuple(classes),
        np.where(np.isnan(class_of), -1, class_of).astype(np.int64),
        spread_of,
        rate_of,
        (*faults, *no_inflation(unindexed, sheet=sheet)),
    )


def _of_rows(
    book: Book,
    table: FlowTable,
    indexations: tuple[Indexation, ...],
    class_of: IntArray,
    spread_of: FloatArray,
    rate_of: FloatArray,
    faults: tuple[Fault, ...],
) -> TermsOfRows:
    """The terms of lines, row by row."""
    kept = table.future
    line, time = table.line[kept], table.time[kept]
    index_class = factor = spread = None
    if indexations:
        index_class = class_of[line]
        factor = row_factors(IndexClasses.of(indexations), index_class, time, inflation=book.basis.inflation)
    has_rate = ~np.isnan(rate_of)
    if has_rate.any() or not np.isnan(spread_of).all():
        spread = spread_of[line]
        rows = np.flatnonzero(has_rate[line])
        spread[rows] = rate_of[line[rows]] - book.basis.curve.zero(time[rows])
    return TermsOfRows(index_class, indexations, factor, spread, faults)


def _not_used(line: str, sheet: str, *, is_there: bool) -> Fault:
    """A fault for terms that are left out."""
    return Fault(
        found=f"more than one row for the line {line!r}" if is_there else f"terms for a line {line!r}",
        expected="one row a line" if is_there else f"a line of the sheet {sheet}",
        mend="The first row counts; remove the others." if is_there else "They are left out; mend the name.",
        sheet="Line terms",
        severity=Severity.MILD,
    )
