"""A fault of the program: shown once, with the book kept and a copy of it offered."""

from __future__ import annotations

import logging
import sys
import threading
from collections.abc import Iterator
from pathlib import Path

import pytest
from PySide6.QtGui import QGuiApplication
from pytestqt.qtbot import QtBot

from desk.window.errors import ErrorKeeper, start_log


@pytest.fixture
def keeper(qtbot: QtBot) -> Iterator[ErrorKeeper]:
    """Takes the exceptions of this test, which pytest-qt would otherwise take."""
    before = sys.excepthook, threading.excepthook
    made = ErrorKeeper()
    made.install()
    yield made
    made.uninstall()
    if made.dialog is not None:
        made.dialog.close()
    sys.excepthook, threading.excepthook = before


def _raised(text: str) -> BaseException:
    try:
        raise RuntimeError(text)
    except RuntimeError as error:
        return error


def _caught(error: BaseException) -> None:
    sys.excepthook(type(error), error, error.__traceback__)


def test_the_same_fault_is_shown_once(keeper: ErrorKeeper, qtbot: QtBot) -> None:
    for _ in range(28):
        _caught(_raised("the same place"))
    qtbot.waitUntil(lambda: keeper.dialog is not None)
    dialog = keeper.dialog
    assert dialog is not None
    assert dialog.details.count("RuntimeError: the same place") == 1
    dialog.close_button.click()
    qtbot.waitUntil(lambda: keeper.dialog is None)
    _caught(_raised("the same place"))
    qtbot.wait(20)
    assert keeper.dialog is None


def test_another_fault_joins_the_dialog_that_is_open(keeper: ErrorKeeper, qtbot: QtBot) -> None:
    _caught(_raised("one"))
    qtbot.waitUntil(lambda: keeper.dialog is not None)
    dialog = keeper.dialog
    try:
        raise KeyError("another")
    except KeyError as error:
        _caught(error)
    assert dialog is not None
    qtbot.waitUntil(lambda: "KeyError: 'another'" in dialog.details)
    assert keeper.dialog is dialog


def test_a_fault_in_a_thread_reaches_the_window(keeper: ErrorKeeper, qtbot: QtBot) -> None:
    def work() -> None:
        raise ValueError("in a thread")

    thread = threading.Thread(target=work)
    thread.start()
    thread.join()
    qtbot.waitUntil(lambda: keeper.dialog is not None)
    assert keeper.dialog is not None
    assert "ValueError: in a thread" in keeper.dialog.details


@pytest.mark.parametrize("is_open", [True, False])
def test_a_copy_of_the_book_is_offered_where_one_is_open(
    keeper: ErrorKeeper, qtbot: QtBot, is_open: bool
) -> None:
    saved: list[str] = []
    keeper.book_is_open = lambda: is_open
    keeper.save_copy = lambda: saved.append("copy")
    _caught(_raised("with a book"))
    qtbot.waitUntil(lambda: keeper.dialog is not None)
    dialog = keeper.dialog
    assert dialog is not None
    assert dialog.save_button.isVisible() is is_open
    if is_open:
        dialog.save_button.click()
    assert saved == (["copy"] if is_open else [])
    assert dialog.isVisible(), "the details can still be copied"


def test_the_details_can_be_copied(keeper: ErrorKeeper, qtbot: QtBot) -> None:
    _caught(_raised("to be copied"))
    qtbot.waitUntil(lambda: keeper.dialog is not None)
    assert keeper.dialog is not None
    keeper.dialog.copy_button.click()
    text = QGuiApplication.clipboard().text()
    assert "RuntimeError: to be copied" in text
    assert "PySide6" in text


def test_the_log_says_what_happened(tmp_path: Path) -> None:
    root = logging.getLogger()
    before = list(root.handlers)
    path = start_log(tmp_path / "state")
    try:
        assert path is not None
        logging.getLogger("desk.test").warning("something to keep")
        assert "desk.test: something to keep" in path.read_text(encoding="utf-8")
    finally:
        for handler in [one for one in root.handlers if one not in before]:
            root.removeHandler(handler)
            handler.close()


def test_without_a_place_for_a_log_the_program_goes_on(tmp_path: Path) -> None:
    blocked = tmp_path / "file"
    blocked.write_text("in the way", encoding="utf-8")
    assert start_log(blocked / "state") is None
