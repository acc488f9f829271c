"""One line of the standing, opened into its flows."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from desk.book import Book, Inflation, PricedFlows, Side
from desk.book.arrays import FloatArray
from desk.valuation.indexing import IndexClasses, row_factors
from desk.valuation.measures import value_rows
from desk.valuation.priced import priced_flows
from desk.valuation.records import FlowDetail

__all__ = ["line_flows"]


def line_flows(book: Book, side: Side, line_number: int) -> FlowDetail:
    """The flows of one line with discount factors and present values.

    Parameters
    ----------
    book : Book
    side : Side
    line_number : int
        The line's place on its side, from 0, in the order of the standing.

    Returns
    -------
    FlowDetail
        In the order of the book; the present values add up to that of the line. A fund shows the one row
        that stands for it; floating interest as it is projected today.

    Raises
    ------
    IndexError
        If the side has no such line.
    ValueError
        If the basis gives no curve.
    """
    priced = priced_flows(book, side)
    flows = priced.flows
    if not 0 <= line_number < len(flows.line_names):
        raise IndexError(f"`line_number` must be from 0 to {len(flows.line_names) - 1}, not {line_number}")
    kept = (flows.line == line_number) & (flows.is_flow | (flows.paid != 0.0))
    real, factor = _indexed(flows, kept, book.basis.inflation)
    rows = value_rows(flows.time[kept], flows.paid[kept], curve=book.basis.curve, spread=flows.spread[kept])
    return FlowDetail(
        date=priced.date[kept],
        time=rows.time,
        amount=rows.amount,
        discount_factor=np.exp(-rows.exponent),
        present_value=rows.value,
        real_amount=real,
        index_factor=factor,
    )


def _indexed(
    flows: PricedFlows, kept: NDArray[np.bool_], inflation: Inflation | None
) -> tuple[FloatArray | None, FloatArray | None]:
    """Real amounts and growth of the rows of a line that grows; None where it does not."""
    if flows.real_amount is None or flows.index_class is None or not (flows.index_class[kept] >= 0).any():
        return None, None
    classes = IndexClasses.of(flows.indexations)
    factor = row_factors(classes, flows.index_class[kept], flows.time[kept], inflation=inflation)
    return flows.real_amount[kept], factor
