"""Widgets are drawn without a screen; set before Qt is imported."""

from __future__ import annotations

import gc
import os

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

from collections.abc import Iterator
from pathlib import Path

import pytest
from PySide6.QtCore import QLocale
from PySide6.QtWidgets import QApplication
from pytestqt.qtbot import QtBot

from desk.window.document import Document
from desk.window.jobs import Jobs
from desk.window.main_window import MainWindow
from desk.window.parts.theme import ThemeSwitch
from desk.window.settings import Settings
from desk.window.stations import all_stations
from tests.window.frame import Frame


@pytest.fixture(autouse=True, scope="package")
def no_collection() -> Iterator[None]:
    """Pictures that are gone are not collected while others are made.

    WORKAROUND for a crash of PySide6 6.11 with pyqtgraph 0.14 (issue 1628 of pyqtgraph is of the same kind):
    a new item that gets the address of a collected one is taken for it.
    """
    gc.disable()
    yield
    gc.enable()


@pytest.fixture(autouse=True)
def english() -> Iterator[None]:
    """Every test starts from the same locale, whatever the machine's."""
    before = QLocale()
    QLocale.setDefault(QLocale(QLocale.Language.English, QLocale.Country.UnitedKingdom))
    yield
    QLocale.setDefault(before)


@pytest.fixture
def theme_switch(qapp: QApplication) -> Iterator[ThemeSwitch]:
    """The light theme, applied."""
    switch = ThemeSwitch(qapp, "light")
    yield switch
    switch.set_mode("light")
    switch.deleteLater()


@pytest.fixture
def window(qtbot: QtBot, tmp_path: Path, theme_switch: ThemeSwitch) -> Iterator[MainWindow]:
    """The window as it is, with settings of its own."""
    jobs = Jobs()
    document = Document(jobs)
    made = MainWindow(
        jobs=jobs,
        document=document,
        settings=Settings(tmp_path / "settings.ini"),
        theme_switch=theme_switch,
        stations=all_stations(),
    )
    qtbot.addWidget(made, before_close_func=lambda _: document.stop())
    made.resize(1280, 720)
    made.show()
    yield made
    made.discard_changes()
    made.close()
    jobs.shutdown()


@pytest.fixture
def frame(qtbot: QtBot, tmp_path: Path, theme_switch: ThemeSwitch) -> Iterator[Frame]:
    """A window with stand-ins for dialogs, tasks and stations."""
    made = Frame(tmp_path, theme_switch)
    qtbot.addWidget(made.window, before_close_func=lambda _: made.document.stop())
    made.window.show()
    yield made
    made.read.let_go.set()
    made.save.let_go.set()
    made.window.discard_changes()
    made.window.close()
    made.jobs.shutdown()


@pytest.fixture
def opened(frame: Frame, qtbot: QtBot) -> Frame:
    """With a book open and valued."""
    frame.window.files.open(frame.file())
    qtbot.waitUntil(lambda: frame.document.standing is not None and not frame.jobs.running)
    return frame
