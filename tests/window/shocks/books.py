"""What the tests of the station share: books with something to shock, and waiting for what is shown."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from pytestqt.qtbot import QtBot

from desk.book import Book, FlowTable, Holding, HoldingKind, Inflation, Move, MoveKind, Shock
from desk.window.parts.tables import Table
from desk.window.shocks.station import ShocksStation
from tests.window.benches import Bench, a_fund

FALL = Shock("Rates fall", (Move(MoveKind.PARALLEL, -80.0),), source="own view")
CRASH = Shock(
    "Crash",
    (Move(MoveKind.PARALLEL, -50.0), Move(MoveKind.VALUE, -0.3), Move(MoveKind.SPREAD, 100.0)),
)
LONGER = Shock("Longer lives", (Move(MoveKind.DECLINE, 0.01, target="pensions"),))


def a_shocked_fund(*shocks: Shock) -> Book:
    """The small fund with a holding of a fund, expected inflation, and shocks of its own."""
    fund = a_fund()
    basis = replace(
        fund.basis, inflation=Inflation(np.array([1.0, 10.0]), np.array([0.025, 0.02]), volatility=0.01)
    )
    return replace(
        fund,
        basis=basis,
        holdings=(*fund.holdings, Holding("shares", HoldingKind.FUND, 1.0, market_value=300_000.0)),
        shocks=shocks or (FALL, CRASH, LONGER),
    )


def without_liabilities() -> Book:
    """Assets alone."""
    return replace(a_shocked_fund(FALL), liabilities=FlowTable.build([], [], []))


def without_anything() -> Book:
    """A basis alone."""
    return replace(
        a_shocked_fund(FALL),
        liabilities=FlowTable.build([], [], []),
        holdings=(),
        asset_flows=FlowTable.build([], [], []),
    )


def settled(bench: Bench, station: ShocksStation, qtbot: QtBot, book: Book | None = None) -> None:
    """Open a book, if one is given, wait for all work, and show what came of it."""
    if book is not None:
        bench.open(book)
    for _ in range(3):
        station.refresh_now()
        qtbot.waitUntil(lambda: not bench.jobs.running, timeout=20_000)
    station.refresh_now()


def column(table: Table, key: str) -> list[str]:
    """One column as shown."""
    model = table.table_model
    place = model.column_of(key)
    return [str(model.data(model.index(row, place))) for row in range(model.rowCount())]
