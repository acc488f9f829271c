"""The station by keyboard and by name, with all that a book can bring to it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QAbstractButton, QApplication, QLabel, QWidget
from pytestqt.qtbot import QtBot

from desk.book import LiabilityMethod
from desk.window.standing.station import StandingStation
from tests.window.benches import Bench
from tests.window.standing.books import show, some_bonds, with_inflation


def focusable(page: QWidget) -> list[QWidget]:
    """What can take the keyboard and is seen."""
    return [
        widget
        for widget in page.findChildren(QWidget)
        if widget.focusPolicy() is not Qt.FocusPolicy.NoFocus and widget.isVisible()
    ]


def name_of(widget: QWidget) -> str:
    """What a reader who listens is told."""
    return widget.accessibleName() or (widget.text() if isinstance(widget, QAbstractButton | QLabel) else "")


def stops(station: StandingStation) -> list[QWidget]:
    """Where Tab leads, in its order."""
    found: list[QWidget] = []
    widget = station.nextInFocusChain()
    while widget is not None and widget is not station:
        takes = bool(widget.focusPolicy() & Qt.FocusPolicy.TabFocus) and widget.focusProxy() is None
        if takes and widget.isVisible() and widget.isEnabled():
            found.append(widget)
        widget = widget.nextInFocusChain()
    return found


@pytest.mark.parametrize("method", list(LiabilityMethod))
def test_everything_has_a_name(
    station: StandingStation, bench: Bench, qtbot: QtBot, method: LiabilityMethod
) -> None:
    book = with_inflation()
    basis = replace(
        book.basis,
        liability_method=method,
        liability_bonds=some_bonds(),
        liability_terms=np.array([1.0, 9.0]),
        liability_spreads=np.array([0.01, 0.01]),
        expected_return=0.04,
    )
    show(bench, station, qtbot, replace(book, basis=basis, second_basis=book.basis))
    assert bench.document.standing_failure == ""
    for key in ("lines", "comparison", "periods", "key_rates", "inflation", "redington"):
        station.pages.show_page(key)
        seen = focusable(station)
        assert len(seen) > 10
        assert [widget for widget in seen if not name_of(widget)] == []


def test_tab_goes_from_heading_to_pictures_tables_and_form(
    station: StandingStation, bench: Bench, qtbot: QtBot
) -> None:
    book = with_inflation()
    show(bench, station, qtbot, replace(book, second_basis=book.basis))
    station.pages.show_page("inflation")
    picture = station.inflation_picture
    assert picture is not None
    parts = (station.money, station.key_rate_picture, picture, station.pages, station._panel)
    places = [
        next((place for place, part in enumerate(parts) if part is widget or part.isAncestorOf(widget)), -1)
        for widget in stops(station)
    ]
    inside = [place for place in places if place >= 0]
    assert inside == sorted(inside)
    assert set(inside) == {0, 1, 2, 3, 4}


def test_ctrl_tab_goes_round_the_pages_that_are_offered(
    station: StandingStation, bench: Bench, qtbot: QtBot
) -> None:
    show(bench, station, qtbot, with_inflation())
    station.activateWindow()
    station.lines.table.setFocus()
    qtbot.waitUntil(station.lines.table.hasFocus)
    seen = []
    for _ in range(5):
        focus = QApplication.focusWidget()
        assert focus is not None
        QTest.keyClick(focus, Qt.Key.Key_Tab, Qt.KeyboardModifier.ControlModifier)
        seen.append(station.pages.current)
    assert seen == ["periods", "key_rates", "inflation", "redington", "lines"]
    assert station.lines.table.hasFocus()
    QTest.keyClick(
        station.lines.table,
        Qt.Key.Key_Backtab,
        Qt.KeyboardModifier.ControlModifier | Qt.KeyboardModifier.ShiftModifier,
    )
    assert station.pages.current == "redington"
