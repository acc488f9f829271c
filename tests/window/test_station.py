"""A station keeps up with its document, and only while it can be seen."""

from __future__ import annotations

from collections.abc import Iterator

import pytest
from PySide6.QtWidgets import QLabel
from pytestqt.qtbot import QtBot

from desk.window.document import Document
from desk.window.jobs import Jobs
from desk.window.parts.theme import ThemeSwitch
from desk.window.station import STALE, Station


class Counting(Station):
    """Counts how often it is refreshed."""

    key = "counting"
    title = "Counting"
    purpose = "Counts."

    def __init__(self, document: Document, jobs: Jobs, theme_switch: ThemeSwitch) -> None:
        super().__init__(document, jobs, theme_switch)
        self.count = 0

    def refresh(self) -> None:
        """Count."""
        self.count += 1


@pytest.fixture
def station(qtbot: QtBot, theme_switch: ThemeSwitch) -> Iterator[Counting]:
    jobs = Jobs(workers=1)
    document = Document(jobs)
    station = Counting(document, jobs, theme_switch)
    qtbot.addWidget(station)
    yield station
    station.close()
    jobs.shutdown()


def test_a_hidden_station_waits_until_it_is_shown(qtbot: QtBot, station: Counting) -> None:
    station.document.book_changed.emit()
    station.document.standing_changed.emit()
    qtbot.wait(1)
    assert station.count == 0
    station.show()
    assert station.count == 1


def test_changes_of_one_turn_are_one_refresh(qtbot: QtBot, station: Counting) -> None:
    station.show()
    for signal in (
        station.document.reading_changed,
        station.document.book_changed,
        station.document.standing_changed,
        station.document.simulation_changed,
    ):
        signal.emit()
    qtbot.waitUntil(lambda: station.count == 2)
    station.hide()
    station.show()
    assert station.count == 2


def test_an_empty_station_offers_the_step_that_fills_it(station: Counting) -> None:
    station.set_pictures(QLabel("picture"))
    station.set_table(QLabel("table"))
    station.set_form_visible()
    station.show()
    assert not station.is_empty
    pressed: list[str] = []
    station.show_empty("It needs a book.", "Open a book…", lambda: pressed.append("open"))
    assert station.is_empty
    assert station.empty.text.text() == "It needs a book."
    station.empty.button.click()
    assert pressed == ["open"]
    station.show_empty("It needs patience.")
    assert not station.empty.button.isVisible()
    station.show_content()
    assert station.pictures.isVisible()
    assert station.form.isVisible()


def test_stale_figures_say_so(station: Counting) -> None:
    station.show()
    assert station.stale_text == ""
    pressed: list[str] = []
    station.show_stale("Run again", lambda: pressed.append("run"))
    assert station.stale_text == STALE
    station.strip.button.click()
    assert pressed == ["run"]
    station.hide_stale()
    assert station.stale_text == ""


def test_a_station_can_be_listened_to(station: Counting) -> None:
    assert station.accessibleName() == "Counting"
    assert station.accessibleDescription() == "Counts."
