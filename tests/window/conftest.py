"""Widgets are drawn without a screen; set before Qt is imported."""

from __future__ import annotations

import os

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

from collections.abc import Iterator

import pytest
from PySide6.QtCore import QLocale
from PySide6.QtWidgets import QApplication

from desk.window.theme import ThemeSwitch


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
