"""The station, shown, on a document of its own."""

from __future__ import annotations

from collections.abc import Iterator

import pytest
from PySide6.QtWidgets import QApplication
from pytestqt.qtbot import QtBot

from desk.window.parts.theme import ThemeSwitch
from desk.window.standing.station import StandingStation
from tests.window.benches import Bench, a_fund, dispose
from tests.window.standing.books import show


@pytest.fixture
def bench() -> Iterator[Bench]:
    """A document that values on threads."""
    made = Bench()
    yield made
    made.close()


@pytest.fixture
def station(
    bench: Bench, qtbot: QtBot, theme_switch: ThemeSwitch, qapp: QApplication
) -> Iterator[StandingStation]:
    """The station with the small fund."""
    made = StandingStation(bench.document, bench.jobs, theme_switch)
    made.resize(1104, 598)
    made.show()
    show(bench, made, qtbot, a_fund())
    yield made
    dispose(made)
