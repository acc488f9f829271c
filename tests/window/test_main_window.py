"""The window's frame: stations, menus, keys, dropping files, closing."""

from __future__ import annotations

from functools import partial
from pathlib import Path

import pytest
from PySide6.QtCore import QMimeData, QPoint, QPointF, QRect, Qt, QUrl
from PySide6.QtGui import QCloseEvent, QDragEnterEvent, QDropEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication, QWidget
from pytestqt.qtbot import QtBot

from desk.report.wording import CAUTION
from desk.window.dialogs import Choice
from desk.window.help_pages import HelpPage
from desk.window.parts.theme import ThemeSwitch
from desk.window.rail import RailButton
from desk.window.stations import all_stations
from tests.window.frame import GRAVE, MILD, Frame, PlainStation, a_book, a_reading


def _close(window: QWidget) -> bool:
    """Ask the window to close; whether it does."""
    event = QCloseEvent()
    QApplication.sendEvent(window, event)
    return event.isAccepted()


def _has_focus(qtbot: QtBot, part: QWidget) -> None:
    def check() -> None:
        focus = QApplication.focusWidget()
        assert focus is not None
        assert focus is part or part.isAncestorOf(focus)

    qtbot.waitUntil(lambda: QApplication.focusWidget() is not None)
    check()


def _is_told(button: RailButton, note: str) -> bool:
    return button.note == note


def _dropped(paths: list[Path]) -> QMimeData:
    data = QMimeData()
    data.setUrls([QUrl.fromLocalFile(str(path)) for path in paths])
    return data


def test_the_welcome_comes_first_and_the_headline_only_with_a_book(frame: Frame) -> None:
    assert frame.window.shown == ""
    assert frame.window.stack.currentWidget() is frame.window.welcome
    assert not frame.window.headline.isVisible()
    assert frame.window.foot.text == CAUTION
    assert frame.window.windowTitle() == "Gapwright[*]"
    assert not any(button.isChecked() for button in frame.window.rail.buttons)


def test_stations_are_made_when_they_are_first_shown(opened: Frame) -> None:
    assert set(opened.window._stations) == {"standing"}
    opened.window.rail.button("intake").click()
    assert opened.window.shown == "intake"
    assert opened.window.rail.button("intake").isChecked()
    assert not opened.window.rail.button("standing").isChecked()
    assert opened.settings.station == "intake"
    opened.window.show_station("projection")
    assert opened.window.shown == "intake"


def test_the_keys_of_the_stations_are_their_numbers_among_all(opened: Frame, qtbot: QtBot) -> None:
    with qtbot.waitActive(opened.window):
        opened.window.activateWindow()
    QTest.keyClick(opened.window, Qt.Key.Key_1, Qt.KeyboardModifier.AltModifier)
    assert opened.window.shown == "intake"
    QTest.keyClick(opened.window, Qt.Key.Key_3, Qt.KeyboardModifier.AltModifier)
    assert opened.window.shown == "standing"
    numbers = {entry.key: entry.number for entry in all_stations()}
    assert numbers == {"intake": 1, "curve": 2, "standing": 3, "shocks": 4, "scenarios": 5, "report": 8}


def test_f6_goes_round_rail_headline_station_and_foot(opened: Frame, qtbot: QtBot) -> None:
    window = opened.window
    with qtbot.waitActive(window):
        window.activateWindow()
    window.rail.take_focus()
    for part in (window.headline, window.stack, window.foot, window.rail):
        QTest.keyClick(window, Qt.Key.Key_F6)
        _has_focus(qtbot, part)
    QTest.keyClick(window, Qt.Key.Key_F6, Qt.KeyboardModifier.ShiftModifier)
    _has_focus(qtbot, window.foot)


def test_a_key_figure_opens_the_rows_that_make_it_up(opened: Frame) -> None:
    opened.window.show_station("intake")
    opened.window.headline.buttons[1].click()
    assert opened.window.shown == "standing"
    station = opened.window.station("standing")
    assert isinstance(station, PlainStation)
    assert station.rows_asked == ["liabilities"]


def test_undo_and_redo_by_menu_name_what_they_do(opened: Frame) -> None:
    menus = opened.window.menus
    assert not menus.undo.isEnabled()
    opened.edit(text="Change of the liability spread")
    assert menus.undo.text() == "&Undo change of the liability spread"
    assert opened.window.isWindowModified()
    assert opened.window.windowTitle() == "fund.xlsx[*] — Gapwright"
    menus.undo.trigger()
    assert opened.document.book is not None
    assert opened.document.book.basis.liability_spread == 0.0
    assert not opened.window.isWindowModified()
    assert menus.redo.text() == "&Redo change of the liability spread"
    menus.redo.trigger()
    assert opened.document.book.basis.liability_spread == 0.01


def test_menus_offer_what_can_be_done(frame: Frame, qtbot: QtBot) -> None:
    menus = frame.window.menus
    assert not any(action.isEnabled() for action in (menus.save, menus.save_as, menus.report, menus.again))
    frame.window.files.open(frame.file())
    qtbot.waitUntil(lambda: frame.document.standing is not None)
    assert all(action.isEnabled() for action in (menus.save, menus.save_as, menus.report, menus.again))
    assert menus.recent_paths() == [frame.folder / "fund.xlsx"]


# Qt 6.12 would have the event made from a QPointF, which Qt 6.11 does not take.
@pytest.mark.filterwarnings("ignore:.*QDragEnterEvent:DeprecationWarning")
def test_a_file_that_is_dropped_is_opened_and_a_folder_is_not(frame: Frame, qtbot: QtBot) -> None:
    path = frame.file("dropped.xlsx")
    data = _dropped([path, frame.file("second.xlsx")])
    left, none = Qt.MouseButton.LeftButton, Qt.KeyboardModifier.NoModifier
    enter = QDragEnterEvent(QPoint(5, 5), Qt.DropAction.CopyAction, data, left, none)
    QApplication.sendEvent(frame.window, enter)
    assert enter.isAccepted()
    drop = QDropEvent(QPointF(5, 5), Qt.DropAction.CopyAction, data, left, none)
    QApplication.sendEvent(frame.window, drop)
    qtbot.waitUntil(lambda: frame.document.path == path)
    folder = _dropped([frame.folder])
    refused = QDragEnterEvent(QPoint(5, 5), Qt.DropAction.CopyAction, folder, left, none)
    refused.ignore()
    QApplication.sendEvent(frame.window, refused)
    assert not refused.isAccepted()
    assert [one.name for one in frame.read.paths] == ["dropped.xlsx"]


def test_closing_without_changes_needs_no_question(opened: Frame) -> None:
    assert _close(opened.window)
    assert opened.dialogs.asked == []
    assert not opened.settings.geometry.isEmpty()


@pytest.mark.parametrize("choice", list(Choice))
def test_closing_with_changes_asks(opened: Frame, qtbot: QtBot, choice: Choice) -> None:
    opened.edit()
    opened.dialogs.choice = choice
    opened.dialogs.save_path = opened.folder / "kept.xlsx"
    assert not _close(opened.window)
    qtbot.waitUntil(lambda: not opened.jobs.running)
    assert opened.dialogs.asked[0] == "unsaved fund.xlsx before closing"
    qtbot.waitUntil(lambda: opened.window.isVisible() is (choice is Choice.CANCEL))
    assert len(opened.save.saved) == (1 if choice is Choice.SAVE else 0)


def test_quitting_goes_the_same_way(opened: Frame) -> None:
    opened.edit()
    opened.dialogs.choice = Choice.CANCEL
    opened.window.menus.quit.trigger()
    assert opened.dialogs.asked == ["unsaved fund.xlsx before closing"]
    assert opened.window.isVisible()


def test_closing_while_something_runs_stops_it_and_waits(opened: Frame) -> None:
    opened.read.let_go.clear()
    opened.window.files.open(opened.folder / "long.xlsx")
    assert opened.jobs.running
    assert _close(opened.window)
    assert not opened.jobs.running
    assert opened.document.path == opened.folder / "fund.xlsx"


def test_the_rail_tells_the_faults_and_what_is_out_of_date(opened: Frame, qtbot: QtBot) -> None:
    note = opened.window.rail.button("intake")
    assert note.note == "no faults"
    for name, faults, told in (
        ("mild.xlsx", [MILD], "1 mild fault"),
        ("grave.xlsx", [GRAVE, GRAVE], "2 grave faults"),
    ):
        path = opened.folder / name
        book = a_book() if faults == [MILD] else None
        opened.read.readings[name] = a_reading(book, path, faults=faults)
        opened.window.files.open(path)
        qtbot.waitUntil(partial(_is_told, note, told))
    assert "2 grave faults" in note.accessibleName()


def test_the_theme_is_remembered(frame: Frame, theme_switch: ThemeSwitch) -> None:
    frame.window.menus.themes["dark"].trigger()
    assert theme_switch.theme.dark
    assert frame.settings.theme_mode == "dark"
    frame.window.menus.themes["light"].trigger()
    assert not theme_switch.theme.dark


def test_a_window_remembered_on_no_screen_comes_back_onto_one(
    frame: Frame, qtbot: QtBot, theme_switch: ThemeSwitch, tmp_path: Path
) -> None:
    frame.window.setGeometry(QRect(40_000, 40_000, 1000, 700))
    frame.settings.geometry = frame.window.saveGeometry()
    frame.settings.flush()
    again = Frame(tmp_path, theme_switch)
    qtbot.addWidget(again.window)
    screen = again.window.screen().availableGeometry()
    assert screen.intersects(again.window.frameGeometry())
    again.jobs.shutdown()


def test_the_station_shown_last_is_shown_with_the_next_book(
    frame: Frame, qtbot: QtBot, tmp_path: Path, theme_switch: ThemeSwitch
) -> None:
    frame.settings.station = "intake"
    frame.window.files.open(frame.file())
    qtbot.waitUntil(lambda: frame.window.shown == "intake")


def test_help_says_what_the_keys_are(frame: Frame) -> None:
    menu = frame.window.menus.help
    for action in menu.actions():
        if action.text():
            action.trigger()
    pages = {page.windowTitle(): page.text.toPlainText() for page in frame.window.findChildren(HelpPage)}
    assert "Alt+3" in pages["Keyboard"]
    assert CAUTION in pages["What this program does"]
    assert "PySide6" in pages["About Gapwright"]


def test_everything_that_takes_the_keyboard_has_a_name(opened: Frame) -> None:
    window = opened.window
    for part in (window.rail, window.headline, window.foot, window.welcome):
        for widget in (part, *part.findChildren(QWidget)):
            if widget.focusPolicy() & Qt.FocusPolicy.TabFocus:
                text = getattr(widget, "text", None)
                name = widget.accessibleName() or (text() if callable(text) else "")
                assert name, f"{type(widget).__name__} in {type(part).__name__} has no name"


def test_the_stations_are_made_ready_in_the_background(frame: Frame, qtbot: QtBot) -> None:
    done: list[bool] = []
    frame.window.warm_up(lambda: done.append(True))
    assert "Getting the stations ready" in [job.title for job in frame.jobs.running]
    qtbot.waitUntil(lambda: done == [True])
    assert frame.window._stations == {}
    frame.window.make_ahead()
    qtbot.waitUntil(lambda: set(frame.window._stations) == {"intake", "standing"})
    assert frame.window.shown == "", "nothing is shown unasked"
