"""Intake: sheets and faults, and that a workbook with grave faults leaves the open book."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from pytestqt.qtbot import QtBot

from desk.book import Fault, Severity
from desk.window.document import Document
from desk.window.intake.station import IntakeStation, marks_of
from desk.window.jobs import Jobs
from desk.window.parts.columns import Mark
from desk.window.parts.theme import ThemeSwitch
from tests.window.frame import GRAVE, MILD, MISSING, a_book, a_reading


@pytest.fixture
def station(qtbot: QtBot, theme_switch: ThemeSwitch) -> Iterator[IntakeStation]:
    jobs = Jobs(workers=2)
    document = Document(jobs)
    made = IntakeStation(document, jobs, theme_switch)
    qtbot.addWidget(made)
    made.show()
    yield made
    document.stop()
    jobs.shutdown()


def _tabs(station: IntakeStation) -> list[str]:
    return [station.tabs.tabText(place) for place in range(station.tabs.count())]


def test_without_a_book_it_offers_to_open_one(station: IntakeStation, qtbot: QtBot) -> None:
    assert station.is_empty
    with qtbot.waitSignal(station.step_wanted) as caught:
        station.empty.button.click()
    assert caught.args == ["open"]


def test_sheets_count_their_faults(station: IntakeStation) -> None:
    station.document.open_reading(a_reading(a_book(), faults=[MILD]))
    station.refresh_now()
    assert _tabs(station) == ["Basis", "Liabilities  (1)"]
    assert not station.stale_text
    assert station.faults.table_model.rowCount() == 1


def test_a_fault_leads_to_its_cell(station: IntakeStation, qtbot: QtBot) -> None:
    station.document.open_reading(a_reading(None, faults=[MISSING, MILD, GRAVE]))
    station.refresh_now()
    QTest.keyClick(station.faults, Qt.Key.Key_Down)
    station.faults.go_to(2)
    QTest.keyClick(station.faults, Qt.Key.Key_Return)
    index = station.sheet.currentIndex()
    assert station.tabs.currentIndex() == 1
    assert (index.row(), index.column()) == (2, 2)
    assert station.whole_fault.text() == str(GRAVE)
    assert "the text “many”" in station.sheet.sheet_model.data(index, Qt.ItemDataRole.ToolTipRole)


def test_a_fault_without_a_cell_says_what_it_is_about(station: IntakeStation, qtbot: QtBot) -> None:
    station.document.open_reading(a_reading(None, faults=[MISSING]))
    station.refresh_now()
    with qtbot.waitSignal(station.message) as caught:
        station.go_to_fault(0)
    assert "a sheet named Curve" in caught.args[0]


def test_grave_faults_beside_an_open_book_say_that_it_is_unchanged(station: IntakeStation) -> None:
    station.document.open_reading(a_reading(a_book(), Path("fund.xlsx")))
    station.refresh_now()
    station.document.open_reading(a_reading(None, Path("bad.xlsx"), faults=[GRAVE]))
    station.refresh_now()
    assert "bad.xlsx has 1 grave fault and was not opened." in station.stale_text
    assert "The open book, fund.xlsx, is unchanged." in station.stale_text
    facts = dict(station._book.rows)
    assert facts["Valuation date"] == "31/03/2031"
    assert facts["Amounts in"] == "EUR"
    assert facts["Liability flows"] == "10"


def test_reading_again_is_a_button_away(station: IntakeStation, qtbot: QtBot) -> None:
    station.document.open_reading(a_reading(None, faults=[GRAVE]))
    station.refresh_now()
    with qtbot.waitSignal(station.step_wanted) as caught:
        station.strip.button.click()
    assert caught.args == ["read_again"]


def test_several_faults_of_one_cell_are_one_mark() -> None:
    mild = Fault("late", "early", "Hurry.", "Liabilities", "C3", Severity.MILD)
    marks = marks_of([mild, GRAVE, MISSING], "Liabilities")
    assert set(marks) == {(2, 2)}
    assert marks[(2, 2)].grave
    assert marks[(2, 2)].text.count("\n") == 1
    assert marks_of([mild], "Liabilities") == {(2, 2): Mark("late; expected early. Hurry.", grave=False)}


def test_the_sheet_shown_stays_over_a_second_reading(station: IntakeStation) -> None:
    station.document.open_reading(a_reading(a_book(), faults=[MILD]))
    station.refresh_now()
    station.tabs.setCurrentIndex(1)
    station.document.open_reading(a_reading(a_book(spread=0.01)))
    station.refresh_now()
    assert station.tabs.currentIndex() == 1
    assert station.sheet.sheet_model.grid.name == "Liabilities"
