"""All shocks: the table, its pictures, sets and thresholds."""

from __future__ import annotations

import threading
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtTest import QTest
from pytestqt.qtbot import QtBot

from desk import tasks
from desk.book import Book, Move, MoveKind, Shock
from desk.book.shock import ShockSettings
from desk.intake.records import Reading
from desk.tasks import Cancelled
from desk.valuation.shock_records import ShockTable
from desk.window.document import Document
from desk.window.shocks.station import ShocksStation
from desk.window.shocks.table_mode import TableMode
from tests.window.benches import Bench
from tests.window.shocks.books import (
    FALL,
    a_shocked_fund,
    column,
    settled,
    without_anything,
    without_liabilities,
)


def _mode(station: ShocksStation) -> TableMode:
    mode = station.mode_of("table")
    assert isinstance(mode, TableMode)
    return mode


def test_the_table_shows_what_the_command_computes(bench: Bench, station: ShocksStation) -> None:
    mode, table = _mode(station), tasks.shock(bench.book)
    names = column(mode.results, "name")
    assert names == ["Before any shock", *(result.name for result in table.results)]
    scale = mode.results._scale.factor
    change = mode.results.table_model.column_values("change").astype(float)
    np.testing.assert_allclose(
        scale * change[1:], [result.change_in_surplus for result in table.results], rtol=1e-12
    )
    difference = mode.results.table_model.column_values("difference").astype(float)
    estimate = mode.results.table_model.column_values("estimate").astype(float)
    np.testing.assert_allclose(difference[1:], change[1:] - estimate[1:], rtol=1e-9, atol=1e-9)
    assert column(mode.results, "set")[1] == "own"
    assert column(mode.results, "source")[1] == "own view"
    assert {"EU 2024/856", "Parallel moves"} <= set(column(mode.results, "set"))
    assert station.words.text().startswith("Worst of ")


def test_verdicts_are_words_of_the_thresholds(bench: Bench, station: ShocksStation, qtbot: QtBot) -> None:
    ratio = tasks.shock(bench.book).base.funding_ratio
    settings = ShockSettings(sets=("Parallel moves",), thresholds=(1.01 * ratio, 0.97 * ratio))
    bench.document.edit("Thresholds", replace(bench.book, shock_settings=settings))
    settled(bench, station, qtbot)
    verdicts = column(_mode(station).results, "verdict")
    assert verdicts[0].startswith("fair: below ")
    assert {word.split(":")[0] for word in verdicts} == {"good", "fair", "poor"}


def test_the_picture_splits_the_change_by_side(bench: Bench, station: ShocksStation) -> None:
    picture, table = _mode(station).change, tasks.shock(bench.book)
    picture.show_row(0)
    result = table.results[0]
    assert picture.reading.startswith(f"{result.name}:")
    assert "From assets +" in picture.reading
    assert "From liabilities −" in picture.reading
    assert result.change_in_assets > 0.0
    assert result.change_in_liabilities > 0.0
    QTest.keyClick(picture.plot, Qt.Key.Key_Down)
    assert picture.reading.startswith(f"{table.results[1].name}:")
    QTest.keyClick(picture.plot, Qt.Key.Key_Escape)
    assert not picture.reading


def test_the_profile_has_its_tangent(bench: Bench, station: ShocksStation) -> None:
    picture, table = _mode(station).profile, tasks.shock(bench.book)
    assert {"Surplus", "Tangent"} <= set(picture.names)
    values = dict(picture.readings_at(0.0))
    assert values["Surplus"] == values["Tangent"]
    away = dict(picture.readings_at(-300.0))
    assert away["Surplus"] != away["Tangent"]
    assert table.profile.move[0] == -300.0


def test_a_row_is_read_in_the_picture_and_opens_its_moves(station: ShocksStation) -> None:
    mode = _mode(station)
    mode.results.go_to(2)
    assert mode.change.reading.startswith("Crash:")
    QTest.keyClick(mode.results, Qt.Key.Key_Return)
    assert station.mode is not None
    assert station.mode.key == "shock"
    assert station.selected is not None
    assert station.selected.name == "Crash"


def test_a_shock_is_added_copied_and_deleted_and_all_is_undone(
    bench: Bench, station: ShocksStation, qtbot: QtBot
) -> None:
    mode = _mode(station)
    first = bench.book
    mode.add()
    settled(bench, station, qtbot)
    assert bench.book.shocks[-1].name == "My shock"
    station.show_mode("table")
    place = column(mode.results, "set").index("EU 2024/856")
    mode.results.go_to(place)
    mode.copy()
    copied = bench.book.shocks[-1]
    assert copied.set_name == ""
    assert copied.source.startswith("after EU 2024/856")
    settled(bench, station, qtbot)
    station.show_mode("table")
    mode.select(copied.name, "")
    assert mode.remove_button.isEnabled()
    with qtbot.waitActive(station):
        station.activateWindow()
    mode.results.setFocus()
    QTest.keyClick(mode.results, Qt.Key.Key_Delete)
    assert copied not in bench.book.shocks
    for _ in range(3):
        bench.document.undo()
    assert bench.book.shocks == first.shocks


def test_a_prescribed_shock_is_not_deleted(bench: Bench, station: ShocksStation) -> None:
    mode = _mode(station)
    mode.results.go_to(column(mode.results, "set").index("Parallel moves"))
    before = bench.book
    mode.remove()
    assert bench.book is before
    assert "untick the set" in station.stale_text


def test_sets_are_ticked_and_the_usual_ones_come_back(
    bench: Bench, station: ShocksStation, qtbot: QtBot
) -> None:
    form = _mode(station).settings
    assert form.boxes["EU 2024/856"].isChecked()
    assert not form.boxes["Basel 2016"].isChecked()
    assert not form.boxes["Solvency II life"].isEnabled()
    assert not form.usual_button.isVisible()
    form.boxes["Basel 2016"].click()
    assert "Basel 2016" in bench.book.shock_settings.sets
    settled(bench, station, qtbot)
    assert "Basel 2016" in column(_mode(station).results, "set")
    assert form.usual_button.isVisible()
    form.use_usual()
    assert bench.book.shock_settings.sets == ()


def test_the_last_set_stays_ticked(bench: Bench, station: ShocksStation, qtbot: QtBot) -> None:
    settings = replace(bench.book.shock_settings, sets=("Parallel moves",))
    bench.document.edit("One set", replace(bench.book, shock_settings=settings))
    settled(bench, station, qtbot)
    box = _mode(station).settings.boxes["Parallel moves"]
    box.click()
    assert box.isChecked()
    assert bench.book.shock_settings.sets == ("Parallel moves",)
    assert "At least one set" in station.stale_text


def test_thresholds_are_entered_and_faults_told(bench: Bench, station: ShocksStation) -> None:
    field = _mode(station).settings.thresholds
    field.line.setText("95; 110")
    field.line.setModified(True)
    field.line.editingFinished.emit()
    assert bench.book.shock_settings.thresholds == (1.1, 0.95)
    assert field.line.text() == "110; 95"
    field.line.setText("many")
    field.line.setModified(True)
    field.line.editingFinished.emit()
    assert "not a number" in field.problem
    assert bench.book.shock_settings.thresholds == (1.1, 0.95)


def test_rows_of_a_sheet_are_pasted_as_one_step(bench: Bench, station: ShocksStation) -> None:
    mode = _mode(station)
    QGuiApplication.clipboard().setText("Rates fall\tparallel\t-120\nNew\tvalue\t-0.25\nNew\tspread\t80\n")
    mode.results.paste()
    names = [shock.name for shock in bench.book.shocks]
    assert names == ["Rates fall", "Crash", "Longer lives", "New"]
    assert bench.book.shocks[0].moves == (Move(MoveKind.PARALLEL, -120.0),)
    assert bench.book.shocks[3].moves == (Move(MoveKind.VALUE, -0.25), Move(MoveKind.SPREAD, 80.0))
    bench.document.undo()
    assert len(bench.book.shocks) == 3
    QGuiApplication.clipboard().setText("New\tsideways\t-0.25\n")
    mode.results.paste()
    assert "no kind of move" in station.stale_text
    assert len(bench.book.shocks) == 3


def test_the_table_is_copied_and_sorted(station: ShocksStation) -> None:
    results = _mode(station).results
    results.selectAll()
    results.copy()
    lines = QGuiApplication.clipboard().text().splitlines()
    assert lines[0].startswith("Shock\tChange in surplus (EUR")
    assert len(lines) == results.table_model.rowCount() + 1
    results.sortByColumn(results.table_model.column_of("change"), Qt.SortOrder.AscendingOrder)
    shown = results.table_model.column_values("change").astype(float)
    order = [results.table_model.source_row(row) for row in range(results.table_model.rowCount())]
    assert order[-1] == 0
    assert (np.diff(shown[order[:-1]]) >= 0.0).all()


def test_without_a_book_the_station_offers_to_open_one(bare: ShocksStation, qtbot: QtBot) -> None:
    bare.refresh_now()
    assert bare.is_empty
    with qtbot.waitSignal(bare.step_wanted) as asked:
        bare.empty.button.click()
    assert asked.args == ["open"]


@pytest.mark.parametrize("book", [without_liabilities(), without_anything()])
def test_a_book_that_lacks_a_side_is_shown(
    bench: Bench, bare: ShocksStation, qtbot: QtBot, book: Book
) -> None:
    settled(bench, bare, qtbot, book)
    assert not bare.is_empty
    results = _mode(bare).results
    assert column(results, "verdict")[1] == "no liabilities"
    assert column(results, "ratio")[1] == "–"
    for key in ("shock", "what_if", "reverse", "grid"):
        bare.show_mode(key)
        settled(bench, bare, qtbot)


def test_two_hundred_shocks_with_long_names_are_shown(
    bench: Bench, bare: ShocksStation, qtbot: QtBot
) -> None:
    shocks = tuple(
        Shock(
            f"A shock with a very long name indeed, {'so long that no place can hold it ' * 5}{number}",
            (Move(MoveKind.PARALLEL, float(number)),),
        )
        for number in range(200)
    )
    settled(bench, bare, qtbot, a_shocked_fund(*shocks))
    mode = _mode(bare)
    assert mode.results.table_model.rowCount() > 200
    assert len(bare.words.text()) < 300
    assert mode.change.rows_seen < 40
    mode.change.show_row(150)
    assert mode.change.reading.split(":")[0].endswith("150")
    assert mode.change._first <= 150 < mode.change._first + mode.change.rows_seen


def test_an_edit_is_followed_at_once_and_a_former_run_cancelled(
    bench: Bench, theme_switch: object, qtbot: QtBot
) -> None:
    hold, started, cancelled = threading.Event(), threading.Event(), []

    def slow(book: Book, **tools: object) -> ShockTable:
        started.set()
        while not hold.wait(0.005):
            try:
                tools["progress"](0.2)  # type: ignore[operator]  # as a job calls it
            except Cancelled:
                cancelled.append(book)
                raise
        return tasks.shock(book)

    document = Document(bench.jobs, shock=slow)
    document.open_reading(_reading(a_shocked_fund()))
    document.request_shocks()
    qtbot.waitUntil(started.is_set)
    first = document.book
    assert first is not None
    document.edit("Another", replace(first, shocks=(FALL,)))
    document.request_shocks()
    qtbot.waitUntil(lambda: cancelled == [first])
    hold.set()
    qtbot.waitUntil(lambda: document.shocks.result is not None)
    result = document.shocks.result
    assert result is not None
    assert [each.name for each in result.results if not each.set_name] == ["Rates fall"]
    assert not document.shocks.is_stale
    document.edit("Back", first)
    assert document.shocks.is_stale
    document.stop()


def test_what_an_edit_elsewhere_stopped_is_asked_for_again(
    bench: Bench, station: ShocksStation, qtbot: QtBot
) -> None:
    document = bench.document
    document.edit("First", replace(bench.book, shocks=(FALL,)))
    station.refresh_now()
    assert document.shocks.is_running
    station.hide()
    document.edit("Second", replace(bench.book, shocks=()))
    document.undo()
    assert not document.shocks.is_running
    station.show()
    assert document.shocks.is_running
    settled(bench, station, qtbot)
    assert not document.shocks.is_stale
    assert column(_mode(station).results, "set").count("own") == 1


def test_a_failure_is_told_with_a_way_to_try_again(bench: Bench, bare: ShocksStation, qtbot: QtBot) -> None:
    def failing(_book: Book, **_: object) -> ShockTable:
        raise ValueError("no such thing")

    bench.document._shock = failing
    settled(bench, bare, qtbot, a_shocked_fund())
    assert bare.is_empty
    assert "no such thing" in bare.empty.text.text()
    bench.document._shock = tasks.shock
    bare.empty.button.click()
    settled(bench, bare, qtbot)
    assert not bare.is_empty


def test_what_could_not_be_computed_is_told(bench: Bench, bare: ShocksStation, qtbot: QtBot) -> None:
    settled(
        bench, bare, qtbot, a_shocked_fund(FALL, Shock("Empty", (Move(MoveKind.VALUE, -0.1, target="none"),)))
    )
    assert "Empty" in bare.stale_text
    assert any("Empty" in str(fault) for fault in bench.document.faults)


def _reading(book: Book) -> Reading:
    return Reading(Path("fund.xlsx"), "ab" * 32, book, (), ())
