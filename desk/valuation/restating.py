"""A book restated on another convention."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from desk.book import Book, FlowTable
from desk.rates.day_count import DayCount, year_fraction

__all__ = ["with_day_count"]


def with_day_count(book: Book, day_count: DayCount) -> Book:
    """The book with another day count: its dates come to lie at other times.

    Flows stated by year keep their times. Dates of holdings are turned into times when they are valued. A
    second basis is restated with the first: the two are compared on the same flows.
    """
    today = np.datetime64(book.basis.valuation_date, "D")

    def restated(flows: FlowTable) -> FlowTable:
        dated = ~np.isnat(flows.date)
        if not dated.any():
            return flows
        return replace(flows, time=np.where(dated, year_fraction(today, flows.date, day_count), flows.time))

    second = book.second_basis
    return replace(
        book,
        basis=replace(book.basis, day_count=day_count),
        second_basis=None if second is None else replace(second, day_count=day_count),
        liabilities=restated(book.liabilities),
        asset_flows=restated(book.asset_flows),
    )
