"""Tables: shown, sorted, copied, edited and pasted."""

from __future__ import annotations

import subprocess
import sys
from datetime import date
from typing import Any

import numpy as np
import pytest
from PySide6.QtCore import QLocale, QModelIndex, Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtTest import QAbstractItemModelTester, QTest
from PySide6.QtWidgets import QApplication, QLineEdit, QPushButton, QVBoxLayout, QWidget
from pytestqt.qtbot import QtBot

from desk.window.parts.tables import Column, Mark, Table, TableModel, parse_grid
from desk.window.parts.theme import DARK, ThemeSwitch

COLUMNS = (
    Column("line", "Line", tooltip="The name of the line."),
    Column("amount", "Amount", "EUR", "money", editable=True),
    Column("rate", "Rate", kind="rate", editable=True),
    Column("due", "Due", kind="date", editable=True),
    Column("count", "Flows", kind="integer", editable=True),
)
DATA: dict[str, list[Any]] = {
    "line": ["Pensions", "annuities", "=1+1", "Bonds"],
    "amount": [1234567.891, -250.4, float("nan"), 12.0],
    "rate": [0.0375, -0.0025, None, 0.1 + 0.2],
    "due": [date(2031, 3, 31), None, date(2029, 1, 1), date(2040, 12, 31)],
    "count": [3, 10, 2, None],
}


@pytest.fixture
def table(qtbot: QtBot, theme_switch: ThemeSwitch) -> Table:
    table = Table(COLUMNS, theme_switch, name="Lines", description="One row a line.", empty_text="No lines.")
    qtbot.addWidget(table)
    table.resize(700, 300)
    table.set_rows(DATA)
    table.show()
    return table


def shown(table: Table, key: str) -> list[str]:
    model = table.table_model
    place = model.column_of(key)
    return [str(model.data(model.index(row, place))) for row in range(model.rowCount())]


def clipboard() -> str:
    return QGuiApplication.clipboard().text()


def test_cells_show_figures_without_units(table: Table) -> None:
    assert shown(table, "amount") == ["1,234,568", "−250", "–", "12"]
    assert shown(table, "rate") == ["3.75", "−0.25", "–", "30.00"]
    assert shown(table, "due") == ["31/03/2031", "–", "01/01/2029", "31/12/2040"]
    assert shown(table, "count") == ["3", "10", "2", "–"]
    model = table.table_model
    head = [
        model.headerData(place, Qt.Orientation.Horizontal, Qt.ItemDataRole.AccessibleTextRole)
        for place in range(5)
    ]
    assert head == ["Line", "Amount, EUR", "Rate, %", "Due", "Flows"]


@pytest.mark.parametrize(
    ("key", "rising", "falling"),
    [
        ("amount", [1, 3, 0, 2], [0, 3, 1, 2]),
        ("rate", [1, 0, 3, 2], [3, 0, 1, 2]),
        ("due", [2, 0, 3, 1], [3, 0, 2, 1]),
        ("count", [2, 0, 1, 3], [1, 0, 2, 3]),
        ("line", [2, 1, 3, 0], [0, 3, 1, 2]),
    ],
)
def test_sorting_puts_what_is_missing_last_either_way(
    table: Table, key: str, rising: list[int], falling: list[int]
) -> None:
    model = table.table_model
    for order, expected in ((Qt.SortOrder.AscendingOrder, rising), (Qt.SortOrder.DescendingOrder, falling)):
        table.sortByColumn(model.column_of(key), order)
        assert [model.source_row(row) for row in range(4)] == expected
    table.sortByColumn(-1, Qt.SortOrder.AscendingOrder)
    assert [model.source_row(row) for row in range(4)] == [0, 1, 2, 3]


def test_sorting_is_stable_both_ways_and_keeps_the_current_row(table: Table) -> None:
    model = table.table_model
    table.set_rows({**DATA, "amount": [1.0, 0.0, 1.0, 0.0]})
    table.go_to(2)
    table.sortByColumn(1, Qt.SortOrder.DescendingOrder)
    assert [model.source_row(row) for row in range(4)] == [0, 2, 1, 3]
    assert table.current_source_row() == 2
    assert model.row_of(3) == 3
    table.set_rows(DATA)
    assert table.current_source_row() == 2


def test_rows_can_be_left_out(table: Table) -> None:
    model = table.table_model
    model.show_only(np.array([True, False, False, True]))
    assert shown(table, "line") == ["Pensions", "Bonds"]
    assert model.row_of(1) == -1
    assert not table.go_to(1)
    table.sortByColumn(1, Qt.SortOrder.AscendingOrder)
    assert shown(table, "line") == ["Bonds", "Pensions"]
    model.show_only(None)
    assert model.rowCount() == 4
    with pytest.raises(ValueError, match="one flag"):
        model.show_only(np.array([True]))


def test_the_whole_table_is_copied_with_its_headings(table: Table) -> None:
    table.selectAll()
    table.copy()
    assert clipboard().splitlines() == [
        "Line\tAmount (EUR)\tRate (%)\tDue\tFlows",
        "Pensions\t1234568\t3.75%\t2031-03-31\t3",
        "annuities\t-250\t-0.25%\t\t10",
        "'=1+1\t\t\t2029-01-01\t2",
        "Bonds\t12\t30.00%\t2040-12-31\t",
    ]
    markup = QGuiApplication.clipboard().mimeData().html()
    assert "<th>Amount (EUR)</th>" in markup
    assert '<td align="right">1234568</td>' in markup


def test_a_part_is_copied_without_headings_and_in_the_order_shown(table: Table) -> None:
    table.sortByColumn(1, Qt.SortOrder.AscendingOrder)
    model, selection = table.table_model, table.selectionModel()
    for row, place in ((0, 0), (2, 1)):
        selection.select(model.index(row, place), selection.SelectionFlag.Select)
    table.copy()
    assert clipboard() == "annuities\t\n\t1234568\n"


def test_full_precision_is_copied_and_read_back(table: Table) -> None:
    table.selectAll()
    table.copy(exactly=True)
    rows = parse_grid(clipboard())[1:]
    assert rows[0][1] == "1234567.891"
    assert COLUMNS[2].parsed(rows[3][2]) == 0.1 + 0.2
    assert COLUMNS[0].parsed(rows[2][0]) == "=1+1"


def test_what_is_copied_in_one_locale_is_read_in_it(table: Table) -> None:
    QLocale.setDefault(QLocale("de_DE"))
    table.selectAll()
    table.copy(exactly=True)
    rows = parse_grid(clipboard())[1:]
    assert rows[0][1] == "1234567,891"
    assert [COLUMNS[1].parsed(row[1]) for row in rows] == [1234567.891, -250.4, None, 12.0]


def test_the_keyboard_copies_pastes_and_opens(qtbot: QtBot, table: Table) -> None:
    opened: list[int] = []
    pasted: list[tuple[int, str, list[list[str]]]] = []
    table.activated_row.connect(opened.append)
    table.paste_callback = lambda row, key, grid: pasted.append((row, key, grid))
    table.activateWindow()
    table.setFocus()
    qtbot.waitActive(table)
    QTest.keyClick(table, Qt.Key.Key_A, Qt.KeyboardModifier.ControlModifier)
    QTest.keyClick(table, Qt.Key.Key_C, Qt.KeyboardModifier.ControlModifier)
    assert clipboard().startswith("Line\t")
    control_shift = Qt.KeyboardModifier.ControlModifier | Qt.KeyboardModifier.ShiftModifier
    QTest.keyClick(table, Qt.Key.Key_C, control_shift)
    assert "1234567.891" in clipboard()
    table.go_to(1, 2)
    QGuiApplication.clipboard().setText("3,5\t4\r\n5\t6\r\n\r\n")
    QTest.keyClick(table, Qt.Key.Key_V, Qt.KeyboardModifier.ControlModifier)
    assert pasted == [(1, "rate", [["3,5", "4"], ["5", "6"]])]
    QTest.keyClick(table, Qt.Key.Key_Return)
    assert opened == [1]


def test_nothing_to_paste_is_said(qtbot: QtBot, table: Table) -> None:
    QGuiApplication.clipboard().clear()
    table.paste_callback = lambda row, key, grid: "refused"
    with qtbot.waitSignal(table.message) as said:
        table.paste()
    assert "nothing to paste" in said.args[0]
    QGuiApplication.clipboard().setText("1")
    with qtbot.waitSignal(table.message) as said:
        table.paste()
    assert said.args == ["refused"]


@pytest.mark.parametrize(
    ("text", "grid"),
    [
        ("", []),
        ("\n\n", []),
        ("a\tb\r\nc", [["a", "b"], ["c"]]),
        ('"one\ntwo"\t3', [["one\ntwo", "3"]]),
        ("a\x00b", [["ab"]]),
        ("\t\n1", [["", ""], ["1"]]),
    ],
)
def test_clipboard_text_becomes_cells(text: str, grid: list[list[str]]) -> None:
    assert parse_grid(text) == grid


def test_a_quotation_mark_left_open_swallows_nothing() -> None:
    grid = parse_grid('"open\t1\n' + "x\t2\n" * 100_000)
    assert len(grid) == 100_001
    assert grid[1] == ["x", "2"]


def test_an_edit_is_parsed_and_handed_on(table: Table) -> None:
    taken: list[tuple[int, str, object]] = []

    def commit(row: int, key: str, value: object) -> str | None:
        taken.append((row, key, value))
        return "No: too large." if value == 99 else None

    model = table.table_model
    refused: list[str] = []
    table.message.connect(refused.append)
    index = model.index(0, 1)
    assert not index.flags() & Qt.ItemFlag.ItemIsEditable
    assert not model.setData(index, "5")
    model.commit = commit
    table.sortByColumn(1, Qt.SortOrder.AscendingOrder)
    assert model.data(model.index(0, 1), Qt.ItemDataRole.EditRole) == "-250.4"
    assert model.setData(model.index(0, 1), "1,500")
    assert model.setData(model.index(0, 2), "4")
    assert model.setData(model.index(0, 3), "2035-06-30")
    assert model.setData(model.index(0, 3), "30/06/2036")
    assert model.setData(model.index(0, 4), "7")
    assert taken == [
        (1, "amount", 1500.0),
        (1, "rate", 0.04),
        (1, "due", date(2035, 6, 30)),
        (1, "due", date(2036, 6, 30)),
        (1, "count", 7),
    ]
    assert not model.setData(model.index(0, 1), "-250.4")
    assert not model.setData(model.index(0, 1), "lots")
    assert not model.setData(model.index(0, 4), "2.5")
    assert not model.setData(model.index(0, 3), "31/02/2031")
    assert not model.setData(model.index(0, 1), "99")
    assert len(refused) == 4
    assert refused[-1] == "No: too large."
    assert "“lots” is not a number" in refused[0]
    assert not model.index(0, 0).flags() & Qt.ItemFlag.ItemIsEditable


def test_the_keyboard_stays_in_the_table_when_an_edit_brings_other_rows(
    qtbot: QtBot, theme_switch: ThemeSwitch
) -> None:
    page = QWidget()
    rows = QVBoxLayout(page)
    table = Table(COLUMNS, theme_switch, name="Lines")
    rows.addWidget(table)
    rows.addWidget(QPushButton("Add a line"))
    qtbot.addWidget(page)

    def take(row: int, key: str, value: object) -> None:
        table.set_rows({**DATA, key: [value if place == row else own for place, own in enumerate(DATA[key])]})

    table.table_model.commit = take
    table.set_rows(DATA)
    page.show()
    page.activateWindow()
    table.setFocus()
    qtbot.waitUntil(table.hasFocus)
    table.setCurrentIndex(table.table_model.index(1, 1))
    table.edit(table.currentIndex())
    editor = QApplication.focusWidget()
    assert isinstance(editor, QLineEdit)
    editor.setText("77")
    QTest.keyClick(editor, Qt.Key.Key_Return)
    qtbot.waitUntil(lambda: shown(table, "amount")[1] == "77")
    assert table.hasFocus()
    QTest.keyClick(table, Qt.Key.Key_Down)
    assert table.current_source_row() == 2


def test_marks_are_told_in_words(table: Table) -> None:
    model = table.table_model
    model.set_marks({(1, "amount"): Mark("below zero"), (0, "rate"): Mark("high", grave=False)})
    table.sortByColumn(1, Qt.SortOrder.AscendingOrder)
    assert model.data(model.index(0, 1), Qt.ItemDataRole.ToolTipRole) == "below zero"
    assert model.data(model.index(0, 1), Qt.ItemDataRole.AccessibleTextRole) == "−250 (fault: below zero)"
    assert model.mark_at(0, 2) is None
    assert "(note: high)" in model.data(model.index(2, 2), Qt.ItemDataRole.AccessibleTextRole)


def test_marks_and_emphasis_can_be_seen(table: Table, theme_switch: ThemeSwitch) -> None:
    plain = table.grab().toImage()
    table.set_rows(DATA, marks={(1, "amount"): Mark("below zero")})
    marked = table.grab().toImage()
    assert marked != plain
    table.set_rows(DATA, marks={(1, "amount"): Mark("below zero", grave=False)})
    assert table.grab().toImage() != marked
    table.set_rows(DATA, strong=[1])
    assert table.grab().toImage() != plain
    theme_switch.set_mode("dark")
    dark = table.viewport().grab().toImage()
    assert dark.pixelColor(dark.width() - 5, dark.height() - 5) == DARK.surface


def test_widths_hold_the_largest_figure(table: Table) -> None:
    count = 50_000
    amounts = np.ones(count)
    amounts[12_345] = -123_456_789_012.0
    table.set_columns(COLUMNS[:2])
    table.set_rows({"line": ["x"] * count, "amount": amounts})
    needed = table.fontMetrics().horizontalAdvance("−123,456,789,012")
    assert table.columnWidth(1) >= needed + 16
    table.set_rows({"line": ["x" * 5000], "amount": [1.0]})
    table.fit_columns()
    assert table.columnWidth(0) == 360


def test_an_empty_table_says_what_it_would_hold(table: Table) -> None:
    table.set_rows({key: [] for key in DATA})
    blank = table.viewport().grab().toImage()
    table.empty_text = ""
    assert table.viewport().grab().toImage() != blank
    table.selectAll()
    QGuiApplication.clipboard().setText("before")
    table.copy()
    assert clipboard() == "before"
    assert table.current_source_row() == -1


def test_columns_of_unequal_length_are_refused(table: Table) -> None:
    with pytest.raises(ValueError, match="one length"):
        table.set_rows({**DATA, "count": [1]})
    assert table.table_model.rowCount() == 4


def test_the_menu_offers_paste_only_where_it_is_taken(table: Table) -> None:
    assert "Paste" not in [action.text() for action in table.make_menu().actions()]
    table.paste_callback = lambda row, key, grid: None
    texts = [action.text() for action in table.make_menu().actions()]
    assert {"Copy", "Copy with full precision", "Paste"} <= set(texts)


def test_the_model_keeps_the_rules_of_qt(qtbot: QtBot) -> None:
    model = TableModel(COLUMNS)
    tester = QAbstractItemModelTester(model, QAbstractItemModelTester.FailureReportingMode.Fatal)
    model.set_rows(DATA)
    model.sort(1, Qt.SortOrder.DescendingOrder)
    model.set_marks({(0, "rate"): Mark("high")})
    model.show_only(np.array([True, False, True, False]))
    model.set_columns(COLUMNS[:1])
    model.set_rows({"line": []})
    assert tester.model() is model
    assert model.rowCount() == 0
    assert model.columnCount(QModelIndex()) == 1


def test_the_process_ends_well_with_a_table_on_the_clipboard() -> None:
    script = """
from PySide6.QtWidgets import QApplication
from desk.window.parts.clipboard import put_table
app = QApplication([])
put_table("a\\tb", "<table></table>")
"""
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr


def test_many_rows_are_copied_in_several_turns(theme_switch: ThemeSwitch, qtbot: QtBot) -> None:
    table = Table(
        (Column("line", "Line"), Column("amount", "Amount", "EUR", "money")), theme_switch, name="t"
    )
    qtbot.addWidget(table)
    count = 10_001
    table.set_rows({"line": [f"line {row}" for row in range(count)], "amount": np.arange(float(count))})
    table.selectAll()
    told: list[str] = []
    table.message.connect(told.append)
    QGuiApplication.clipboard().setText("before")
    table.copy()
    assert told == ["Copying 10,001 rows…"]
    assert clipboard() == "before"
    assert QGuiApplication.overrideCursor() is not None
    qtbot.waitUntil(lambda: len(told) == 2)
    assert told[1] == "Copied 10,001 rows."
    assert QGuiApplication.overrideCursor() is None
    lines = clipboard().splitlines()
    assert len(lines) == count + 1
    assert lines[0] == "Line\tAmount (EUR)"
    assert lines[-1] == "line 10000\t10000"


def test_rows_that_change_on_their_way_to_the_clipboard_are_dropped(
    theme_switch: ThemeSwitch, qtbot: QtBot
) -> None:
    table = Table((Column("amount", "Amount", "EUR", "money"),), theme_switch, name="t")
    qtbot.addWidget(table)
    table.set_rows({"amount": np.arange(9_000.0)})
    table.selectAll()
    QGuiApplication.clipboard().setText("before")
    table.copy()
    table.set_rows({"amount": np.arange(3.0)})
    assert QGuiApplication.overrideCursor() is None
    qtbot.wait(20)
    assert clipboard() == "before"
