"""The station, shown, on a document of its own."""

from __future__ import annotations

from collections.abc import Iterator

import pytest
from PySide6.QtWidgets import QApplication
from pytestqt.qtbot import QtBot

from desk.window.parts.theme import ThemeSwitch
from desk.window.shocks.station import ShocksStation
from tests.window.benches import Bench, dispose
from tests.window.shocks.books import a_shocked_fund, settled


@pytest.fixture
def bench() -> Iterator[Bench]:
    """A document that values on threads."""
    made = Bench()
    yield made
    made.close()


@pytest.fixture
def bare(bench: Bench, theme_switch: ThemeSwitch, qapp: QApplication) -> Iterator[ShocksStation]:
    """The station without a book."""
    made = ShocksStation(bench.document, bench.jobs, theme_switch)
    made.resize(1104, 598)
    made.show()
    yield made
    dispose(made)


@pytest.fixture
def station(bench: Bench, bare: ShocksStation, qtbot: QtBot) -> ShocksStation:
    """The station with the fund and its shocks."""
    settled(bench, bare, qtbot, a_shocked_fund())
    return bare
