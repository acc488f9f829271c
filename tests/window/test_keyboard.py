"""The whole window by keyboard and by name: what can be reached, in which order, and what it is called."""

from __future__ import annotations

from itertools import pairwise
from pathlib import Path

import pytest
from PySide6.QtCore import QPoint, Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QAbstractButton, QApplication, QLabel, QWidget
from pytestqt.qtbot import QtBot

from desk.places import demo_books
from desk.window.main_window import MainWindow
from desk.window.report.station import ReportStation
from desk.window.scenarios.station import ScenariosStation
from desk.window.standing.station import StandingStation
from desk.window.stations import StationEntry, all_stations

KEYS = [entry.key for entry in all_stations()]


@pytest.fixture
def opened(window: MainWindow, qtbot: QtBot) -> MainWindow:
    """With the smallest demo book open, valued and simulated."""
    window.files.open(demo_books() / "small_endowment.xlsx")
    qtbot.waitUntil(lambda: window.document.standing is not None, timeout=30_000)
    window.document.run_simulation()
    qtbot.waitUntil(lambda: window.document.simulation is not None, timeout=30_000)
    return window


def press(window: MainWindow, key: Qt.Key, *modifiers: Qt.KeyboardModifier) -> None:
    """Press a key where the keyboard is."""
    target = QApplication.focusWidget() or window
    held = Qt.KeyboardModifier.NoModifier
    for modifier in modifiers:
        held |= modifier
    QTest.keyClick(target, key, held)


def activate(window: MainWindow, qtbot: QtBot) -> None:
    """Have the keyboard in the window."""
    with qtbot.waitActive(window):
        window.activateWindow()


def focusable(page: QWidget) -> list[QWidget]:
    """What can take the keyboard by itself, seen or not."""
    return [
        widget
        for widget in [page, *page.findChildren(QWidget)]
        if widget.focusPolicy() is not Qt.FocusPolicy.NoFocus and widget.window() is page.window()
    ]


def name_of(widget: QWidget) -> str:
    """What a reader who listens is told it is called."""
    if widget.accessibleName():
        return widget.accessibleName()
    return widget.text() if isinstance(widget, QAbstractButton | QLabel) else ""


def stops(window: MainWindow) -> list[QWidget]:
    """Where Tab leads, in its order, once round."""
    found: list[QWidget] = []
    widget = window.nextInFocusChain()
    while widget is not None and widget is not window:
        takes = bool(widget.focusPolicy() & Qt.FocusPolicy.TabFocus) and widget.focusProxy() is None
        if takes and widget.isVisible() and widget.isEnabled():
            found.append(widget)
        widget = widget.nextInFocusChain()
    return found


@pytest.mark.parametrize("key", KEYS)
def test_everything_that_takes_the_keyboard_has_a_name(opened: MainWindow, qtbot: QtBot, key: str) -> None:
    opened.show_station(key)
    qtbot.waitUntil(lambda: not opened.jobs.running, timeout=30_000)
    station = opened.station(key)
    seen = [widget for widget in focusable(station) if widget.isVisible()]
    assert len(seen) > 4
    assert [widget for widget in seen if not name_of(widget)] == []


def test_the_frame_and_the_welcome_have_names(opened: MainWindow) -> None:
    opened.show_welcome()
    for part in (opened.rail, opened.headline, opened.foot, opened.welcome):
        seen = [widget for widget in focusable(part) if widget.isVisible()]
        assert seen
        assert [widget for widget in seen if not name_of(widget)] == []


def test_an_empty_station_has_names_too(window: MainWindow) -> None:
    for key in KEYS:
        window.show_station(key)
        seen = [widget for widget in focusable(window.station(key)) if widget.isVisible()]
        assert [widget for widget in seen if not name_of(widget)] == []
        assert not window.station(key).next_button.isVisible()
        assert window.station(key).empty.button in seen


@pytest.mark.parametrize("key", KEYS)
def test_tab_goes_through_rail_headline_station_and_foot(opened: MainWindow, qtbot: QtBot, key: str) -> None:
    for each in KEYS:
        opened.show_station(each)
    opened.show_station(key)
    qtbot.waitUntil(lambda: not opened.jobs.running, timeout=30_000)
    parts = (opened.rail, opened.headline, opened.station(key), opened.foot)
    places = [
        next(place for place, part in enumerate(parts) if part is widget or part.isAncestorOf(widget))
        for widget in stops(opened)
    ]
    assert places == sorted(places)
    assert set(places) == {0, 1, 2, 3}


@pytest.mark.parametrize("entry", all_stations(), ids=KEYS)
def test_the_key_of_a_station_takes_the_keyboard_there(
    opened: MainWindow, qtbot: QtBot, entry: StationEntry
) -> None:
    number, key = entry.number, entry.key
    activate(opened, qtbot)
    opened.rail.take_focus()
    press(opened, Qt.Key(Qt.Key.Key_0 + number), Qt.KeyboardModifier.AltModifier)
    station = opened.station(key)
    qtbot.waitUntil(lambda: station.isAncestorOf(QApplication.focusWidget() or opened))
    assert opened.shown == key


def test_a_pension_fund_is_run_by_keyboard_alone(window: MainWindow, qtbot: QtBot, tmp_path: Path) -> None:
    activate(window, qtbot)
    qtbot.waitUntil(lambda: isinstance(QApplication.focusWidget(), QAbstractButton))
    press(window, Qt.Key.Key_Return)
    qtbot.waitUntil(lambda: window.document.standing is not None, timeout=30_000)
    assert window.files.name == "pension_fund.xlsx"
    # The first line opens into its flows, and closes.
    standing = window.station("standing")
    assert isinstance(standing, StandingStation)
    lines = standing.lines
    qtbot.waitUntil(lambda: lines.table.hasFocus())
    press(window, Qt.Key.Key_Down)
    press(window, Qt.Key.Key_Return)
    assert lines.is_open
    press(window, Qt.Key.Key_Escape)
    assert not lines.is_open
    press(window, Qt.Key.Key_5, Qt.KeyboardModifier.AltModifier)
    press(window, Qt.Key.Key_R, Qt.KeyboardModifier.ControlModifier)
    assert window.document.is_simulating
    scenarios = window.station("scenarios")
    assert isinstance(scenarios, ScenariosStation)
    qtbot.waitUntil(lambda: scenarios.run_form.cancel_button.hasFocus())
    qtbot.waitUntil(lambda: window.document.simulation is not None, timeout=60_000)
    qtbot.waitUntil(lambda: scenarios.run_form.run_button.hasFocus())
    press(window, Qt.Key.Key_E, Qt.KeyboardModifier.ControlModifier)
    report = window.station("report")
    assert isinstance(report, ReportStation)
    report.target.set_value(str(tmp_path / "out.xlsx"))
    qtbot.waitUntil(lambda: report.write_button.hasFocus())
    press(window, Qt.Key.Key_Space)
    qtbot.waitUntil(lambda: bool(report.written), timeout=60_000)
    qtbot.waitUntil(lambda: report.write_button.hasFocus())
    assert (tmp_path / "out.xlsx").stat().st_size > 10_000


def test_each_station_offers_the_next(opened: MainWindow, qtbot: QtBot) -> None:
    activate(opened, qtbot)
    opened.show_station(KEYS[0])
    for key, after in pairwise(KEYS):
        button = opened.station(key).next_button
        # Shocks come a moment after the station is shown.
        qtbot.waitUntil(button.isVisible, timeout=20_000)
        button.click()
        assert opened.shown == after
    assert not opened.station(KEYS[-1]).next_button.isVisible()


def test_undo_is_the_books_where_the_field_has_nothing_to_undo(opened: MainWindow, qtbot: QtBot) -> None:
    activate(opened, qtbot)
    opened.show_station("standing")
    standing = opened.station("standing")
    assert isinstance(standing, StandingStation)
    field = standing.liability_spread
    book = opened.document.book
    field.line.setFocus()
    field.line.selectAll()
    QTest.keyClicks(field.line, "1.25")
    press(opened, Qt.Key.Key_Return)
    assert opened.document.book is not book
    assert field.line.hasFocus()
    press(opened, Qt.Key.Key_Z, Qt.KeyboardModifier.ControlModifier)
    assert opened.document.book is book
    press(opened, Qt.Key.Key_Z, Qt.KeyboardModifier.ControlModifier, Qt.KeyboardModifier.ShiftModifier)
    assert opened.document.book is not book
    # What is being typed is the field's own.
    QTest.keyClicks(field.line, "7")
    press(opened, Qt.Key.Key_Z, Qt.KeyboardModifier.ControlModifier)
    assert opened.document.can_undo


def test_the_room_given_to_a_picture_is_remembered(opened: MainWindow, qtbot: QtBot) -> None:
    opened.show_station("curve")
    station = opened.station("curve")
    handle = station.main.handle(1)
    begin = handle.rect().center()
    end = begin - QPoint(0, 40)
    QTest.mousePress(handle, Qt.MouseButton.LeftButton, pos=begin)
    QTest.mouseMove(handle, end)
    QTest.mouseRelease(handle, Qt.MouseButton.LeftButton, pos=end)
    chosen = station.chosen_sizes
    assert list(chosen) == ["main"]
    opened.discard_changes()
    opened.close()
    assert opened._settings.sizes("curve") == chosen
    assert opened._settings.sizes("standing") == {}
