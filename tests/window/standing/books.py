"""What the tests of the station share: waiting, reading a column, and books with two bases."""

from __future__ import annotations

from dataclasses import replace
from datetime import date
from typing import Any

import numpy as np
from pytestqt.qtbot import QtBot

from desk.book import Book, CurveBonds, Indexation, IndexationKind, Inflation, LineTerms, Side
from desk.window.parts.tables import Table
from desk.window.standing.station import StandingStation
from tests.window.benches import Bench, a_fund

INFLATION = Inflation(np.array([1.0, 5.0, 10.0]), np.array([0.025, 0.022, 0.02]), volatility=0.012)
LINKED = (LineTerms(Side.LIABILITIES, "pensions", Indexation(IndexationKind.LINKED)),)


def column(table: Table, key: str) -> list[str]:
    """One column as shown."""
    model = table.table_model
    place = model.column_of(key)
    return [str(model.data(model.index(row, place))) for row in range(model.rowCount())]


def two_bases(**second: Any) -> Book:
    """The small fund, with a second basis that differs in these items."""
    fund = a_fund()
    return replace(fund, second_basis=replace(fund.basis, **(second or {"liability_spread": 0.02})))


def with_inflation() -> Book:
    """The small fund, its pensions following prices."""
    fund = a_fund()
    return replace(fund, basis=replace(fund.basis, inflation=INFLATION), line_terms=LINKED)


def some_bonds() -> CurveBonds:
    """Eight corporate bonds of 2 to 16 years."""
    years = np.arange(2, 18, 2)
    return CurveBonds(
        names=tuple(f"Corporate {year}" for year in years),
        maturity=np.array([date(2031 + int(year), 3, 31) for year in years], dtype="datetime64[D]"),
        coupon=np.linspace(0.022, 0.036, years.size),
        frequency=np.ones(years.size, dtype=int),
        price=np.full(years.size, 98.0),
        bond_yield=np.full(years.size, np.nan),
        is_clean=np.ones(years.size, dtype=bool),
    )


def show(bench: Bench, station: StandingStation, qtbot: QtBot, book: Book | None = None) -> None:
    """Open a book, if one is given, wait until it is valued on every basis, and show that."""
    document = bench.document
    if book is not None:
        bench.open(book)
    qtbot.waitUntil(
        lambda: not (document.is_valuing or document.is_valuing_second or bench.jobs.running), timeout=20_000
    )
    station.refresh_now()
