"""A sheet as it is: addresses, cell texts, fields over the columns, faults in their cells."""

from __future__ import annotations

from datetime import date, datetime, timedelta

import pytest
from PySide6.QtCore import QItemSelection, QItemSelectionModel, Qt
from PySide6.QtGui import QGuiApplication
from pytestqt.qtbot import QtBot

from desk.intake.records import SheetGrid
from desk.window.intake.sheet_view import SheetModel, SheetView, cell_place, cell_text, column_name
from desk.window.parts.columns import Mark
from desk.window.parts.theme import ThemeSwitch
from tests.window.frame import SHEETS


@pytest.mark.parametrize(
    ("address", "place"),
    [
        ("A1", (0, 0)),
        ("C14", (13, 2)),
        ("$B$2", (1, 1)),
        ("Z1", (0, 25)),
        ("AA1", (0, 26)),
        ("XFD1048576", (1_048_575, 16_383)),
        ("", None),
        ("14", None),
        ("C0", None),
    ],
)
def test_addresses_lead_to_cells_and_back(address: str, place: tuple[int, int] | None) -> None:
    assert cell_place(address) == place
    if place is not None:
        assert f"{column_name(place[1])}{place[0] + 1}" == address.replace("$", "")


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (None, ""),
        (True, "TRUE"),
        (0.1 + 0.2, "0.30000000000000004"),
        (-3, "−3"),
        (1e300, "1E+300"),
        (date(2031, 3, 9), "09/03/2031"),
        (datetime(2031, 3, 9), "09/03/2031"),
        (datetime(2031, 3, 9, 14, 5), "09/03/2031 14:05:00"),
        (timedelta(hours=30), "1 day, 6:00:00"),
        ("two\nlines", "two lines"),
    ],
)
def test_a_cell_is_shown_as_it_is(value: object, text: str) -> None:
    assert cell_text(value) == text


def test_rows_may_differ_in_length_and_faults_may_lie_beyond_them() -> None:
    model = SheetModel()
    model.set_grid(SHEETS[1], {(4, 5): Mark("nothing is here")})
    assert (model.rowCount(), model.columnCount()) == (5, 6)
    assert model.data(model.index(2, 2)) == ""
    assert model.data(model.index(4, 5), Qt.ItemDataRole.ToolTipRole) == "nothing is here"
    told = model.data(model.index(4, 5), Qt.ItemDataRole.AccessibleTextRole)
    assert told == "F5 (grave fault: nothing is here)"


def test_an_empty_sheet_has_no_cells() -> None:
    model = SheetModel()
    model.set_grid(SheetGrid("Empty", (), {}, None, False), {})
    assert (model.rowCount(), model.columnCount()) == (0, 0)


def test_the_heading_says_what_the_book_takes(theme_switch: ThemeSwitch, qtbot: QtBot) -> None:
    view = SheetView(theme_switch)
    qtbot.addWidget(view)
    view.show_sheet(SHEETS[1], {})
    told = [
        view.sheet_model.headerData(place, Qt.Orientation.Horizontal, Qt.ItemDataRole.AccessibleTextRole)
        for place in (1, 3)
    ]
    assert told == ["Column B, taken as Date", "Column D, kept as a note"]
    assert view.sheet_model.headerData(3, Qt.Orientation.Vertical) == "4"


def test_a_copy_holds_whole_figures_and_no_formula(theme_switch: ThemeSwitch, qtbot: QtBot) -> None:
    view = SheetView(theme_switch)
    qtbot.addWidget(view)
    view.show_sheet(SHEETS[1], {})
    model = view.sheet_model
    chosen = QItemSelection(model.index(1, 1), model.index(1, 3))
    view.selectionModel().select(chosen, QItemSelectionModel.SelectionFlag.ClearAndSelect)
    with qtbot.waitSignal(view.message) as caught:
        view.copy()
    assert QGuiApplication.clipboard().text() == "2031-01-01\t100.5\t'=1+1\n"
    assert caught.args == ["Copied 1 row."]


def test_half_a_million_rows_are_shown_where_they_are(theme_switch: ThemeSwitch, qtbot: QtBot) -> None:
    row = ("pensions", date(2031, 1, 1), 100.5)
    rows = [row] * 500_000
    view = SheetView(theme_switch)
    qtbot.addWidget(view)
    view.show_sheet(SheetGrid("Liabilities", rows, {0: "Line"}, 0, False), {})
    assert view.sheet_model.grid.rows is rows, "nothing is copied"
    assert view.go_to(499_999, 2)
    assert view.currentIndex().row() == 499_999
    assert not view.go_to(500_000, 2)
