"""The welcome: demo books, recent books, and what opens them."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest
from PySide6.QtCore import Qt
from PySide6.QtGui import QFontMetrics
from PySide6.QtTest import QTest
from pytestqt.qtbot import QtBot

from desk.window.jobs import Jobs
from desk.window.parts.theme import GAP, WIDE, ThemeSwitch
from desk.window.recent import RecentBooks
from desk.window.settings import Settings
from desk.window.welcome import DEMO_BOOKS, Welcome, demo_books_there


@pytest.fixture
def recent(tmp_path: Path, qtbot: QtBot) -> Iterator[RecentBooks]:
    jobs = Jobs(workers=1)
    yield RecentBooks(Settings(tmp_path / "s.ini"), jobs)
    jobs.shutdown()


def test_the_demo_books_come_with_the_program() -> None:
    there = demo_books_there()
    assert [book.file for book, _ in there] == [book.file for book in DEMO_BOOKS]
    assert demo_books_there(Path("nowhere")) == ()


def test_a_card_opens_its_book_by_mouse_and_key(
    recent: RecentBooks, theme_switch: ThemeSwitch, qtbot: QtBot
) -> None:
    welcome = Welcome(recent, theme_switch)
    qtbot.addWidget(welcome)
    welcome.show()
    assert len(welcome.cards) == 3
    with qtbot.waitSignal(welcome.chosen) as caught:
        QTest.mouseClick(welcome.cards[1], Qt.MouseButton.LeftButton)
    assert caught.args[0].name == "life_insurer.xlsx"
    with qtbot.waitSignal(welcome.chosen) as caught:
        QTest.keyClick(welcome.cards[0], Qt.Key.Key_Return)
    assert caught.args[0].name == "pension_fund.xlsx"


def test_recent_books_are_offered_and_follow(
    recent: RecentBooks, theme_switch: ThemeSwitch, qtbot: QtBot, tmp_path: Path
) -> None:
    welcome = Welcome(recent, theme_switch)
    qtbot.addWidget(welcome)
    assert [button.text() for button in welcome.recent_buttons] == []
    recent.add(tmp_path / "mine.xlsx")
    buttons = welcome.recent_buttons
    assert [button.text() for button in buttons] == ["mine.xlsx"]
    with qtbot.waitSignal(welcome.chosen) as caught:
        buttons[0].click()
    assert caught.args == [tmp_path / "mine.xlsx"]


def test_without_demo_books_the_own_book_is_what_to_begin_with(
    recent: RecentBooks, theme_switch: ThemeSwitch, qtbot: QtBot
) -> None:
    welcome = Welcome(recent, theme_switch, demos=())
    qtbot.addWidget(welcome)
    assert welcome.cards == ()
    with qtbot.waitSignal(welcome.open_asked):
        welcome.open_button.click()


def test_no_card_cuts_its_text(recent: RecentBooks, theme_switch: ThemeSwitch, qtbot: QtBot) -> None:
    welcome = Welcome(recent, theme_switch)
    qtbot.addWidget(welcome)
    welcome.resize(1280 - 176, 600)
    welcome.show()
    for card, book in zip(welcome.cards, DEMO_BOOKS, strict=True):
        metrics = QFontMetrics(card.font())
        room = card.rect().adjusted(WIDE, WIDE, -WIDE, -GAP)
        needed = metrics.boundingRect(room, int(Qt.TextFlag.TextWordWrap), book.shows)
        assert needed.height() + metrics.lineSpacing() + 4 <= room.height()
