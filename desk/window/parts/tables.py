"""The table on screen: headings with units, hairlines, copying and pasting."""

from __future__ import annotations

import csv
import io
from collections.abc import Callable, Mapping, Sequence

import numpy as np
from PySide6.QtCore import QModelIndex, Qt, Signal
from PySide6.QtGui import (
    QAction,
    QContextMenuEvent,
    QFontMetrics,
    QGuiApplication,
    QKeyEvent,
    QKeySequence,
    QPainter,
    QPaintEvent,
)
from PySide6.QtWidgets import (
    QAbstractItemView,
    QHeaderView,
    QMenu,
    QTableView,
    QWidget,
)

from desk.window.parts.clipboard import RowCopier
from desk.window.parts.columns import Column, Kind, Mark
from desk.window.parts.table_drawing import Cells, Header, paint_beyond
from desk.window.parts.table_model import TableModel, Values
from desk.window.parts.theme import GAP, Theme, ThemeSwitch, soft_font, strong_font, tabular

__all__ = ["Column", "Kind", "Mark", "Table", "TableModel", "parse_grid"]

PasteCallback = Callable[[int, str, list[list[str]]], "str | None"]

_WIDEST = 360
_SAMPLE = 200
_MOST_PASTED = 50_000_000


def parse_grid(text: str) -> list[list[str]]:
    """The cells of tab-separated text, as a spreadsheet puts it on the clipboard."""
    body = text[:_MOST_PASTED].replace("\x00", "")
    try:
        rows = list(csv.reader(io.StringIO(body, newline=""), dialect="excel-tab"))
    except csv.Error:
        # A quotation mark left open swallows more than a field may hold: then it quotes nothing.
        rows = [line.split("\t") for line in body.splitlines()]
    while rows and not any(rows[-1]):
        rows.pop()
    return rows


class Table(QTableView):
    """A table.

    Attributes
    ----------
    table_model : TableModel
    paste_callback : callable or None
        Called with the source row and key of the current cell (-1 and the first key where there is none) and
        the pasted cells; returns why they were not taken, or None.

    Signals
    -------
    activated_row(int)
        A source row was opened by Return or a double click.
    current_row_changed(int)
        The source row that has the keyboard; -1 for none.
    message(str)
        Something to tell the reader: an edit or a paste that was not taken, or what was copied.
    """

    activated_row = Signal(int)
    current_row_changed = Signal(int)
    message = Signal(str)

    def __init__(
        self,
        columns: Sequence[Column],
        theme_switch: ThemeSwitch,
        *,
        name: str,
        description: str = "",
        empty_text: str = "",
        parent: QWidget | None = None,
    ) -> None:
        super().__init__(parent)
        self.theme = theme_switch.theme
        self.empty_text = empty_text
        self.paste_callback: PasteCallback | None = None
        self._fitted = False
        self.setAccessibleName(name)
        self.setAccessibleDescription(description)
        self.setFont(tabular(self.font()))
        self.strong_font = strong_font(self.font())
        self.setShowGrid(False)
        self.setWordWrap(False)
        self.setCornerButtonEnabled(False)
        self.setAlternatingRowColors(False)
        self.setTabKeyNavigation(False)
        self.setSelectionMode(QAbstractItemView.SelectionMode.ExtendedSelection)
        self.setVerticalScrollMode(QAbstractItemView.ScrollMode.ScrollPerPixel)
        self.setHorizontalScrollMode(QAbstractItemView.ScrollMode.ScrollPerPixel)
        self.setEditTriggers(
            QAbstractItemView.EditTrigger.DoubleClicked
            | QAbstractItemView.EditTrigger.EditKeyPressed
            | QAbstractItemView.EditTrigger.AnyKeyPressed
        )
        rows = self.verticalHeader()
        rows.setVisible(False)
        rows.setSectionResizeMode(QHeaderView.ResizeMode.Fixed)
        rows.setMinimumSectionSize(16)
        rows.setDefaultSectionSize(QFontMetrics(self.font()).height() + GAP)
        self.table_model = TableModel(columns, self)
        self.setHorizontalHeader(Header(self))
        self.setItemDelegate(Cells(self))
        self.setModel(self.table_model)
        self.sortByColumn(-1, Qt.SortOrder.AscendingOrder)
        self.setSortingEnabled(True)
        self.table_model.refused.connect(self.message)
        self.doubleClicked.connect(self._on_double_click)
        self.selectionModel().currentRowChanged.connect(self._on_current_row)
        theme_switch.changed.connect(self._on_theme)
        self._actions = self._make_actions()
        self._copier = RowCopier(self)
        self._copier.message.connect(self.message)
        # Rows are copied as they are: what is still on its way when they change is dropped.
        self.table_model.modelAboutToBeReset.connect(self._copier.stop)
        self.table_model.layoutAboutToBeChanged.connect(lambda *_: self._copier.stop())

    # Content

    def set_rows(
        self,
        data: Mapping[str, Values],
        *,
        marks: Mapping[tuple[int, str], Mark] | None = None,
        strong: Sequence[int] = (),
    ) -> None:
        """Show other rows; the current cell, its column's widths and the order stay."""
        current = self.current_source_row()
        place = max(self.currentIndex().column(), 0)
        scrolled = self.verticalScrollBar().value()
        is_edited = self.state() is QAbstractItemView.State.EditingState
        self.table_model.set_rows(data, marks=marks, strong=strong)
        if is_edited:
            # The cell's editor went with the former rows, and the keyboard with it to whatever comes next.
            self.setFocus()
        if not self._fitted and self.table_model.rowCount():
            self.fit_columns()
        if current >= 0:
            self.go_to(current, place)
            self.verticalScrollBar().setValue(scrolled)
        self.viewport().update()

    def set_columns(self, columns: Sequence[Column]) -> None:
        """Show other columns; the rows are gone until `set_rows`."""
        self.table_model.set_columns(columns)
        self._fitted = False
        self.sortByColumn(-1, Qt.SortOrder.AscendingOrder)

    def fit_columns(self) -> None:
        """Widths from the headings, a sample of the rows and the extremes of each column."""
        model = self.table_model
        strong = QFontMetrics(self.strong_font)
        soft = QFontMetrics(soft_font(self.font()))
        count = len(model.column_values(model.columns[0].key)) if model.columns else 0
        sample = np.unique(np.linspace(0, max(count - 1, 0), min(count, _SAMPLE)).astype(int))
        for place, column in enumerate(model.columns):
            width = max(
                strong.horizontalAdvance(column.heading) + 12, soft.horizontalAdvance(column.shown_unit)
            )
            values = model.column_values(column.key)
            rows = sample
            if column.is_numeric and count:
                finite = np.where(np.isfinite(values.astype(float)), values.astype(float), 0.0)
                rows = np.append(sample, [finite.argmin(), finite.argmax()])
            for row in rows:
                width = max(width, strong.horizontalAdvance(column.shown(values[row])))
            self.setColumnWidth(place, min(width + 2 * GAP + 2, _WIDEST))
        self._fitted = count > 0

    def current_source_row(self) -> int:
        """The source row that has the keyboard; -1 for none."""
        index = self.currentIndex()
        return self.table_model.source_row(index.row()) if index.isValid() else -1

    def go_to(self, source_row: int, place: int = 0) -> bool:
        """Make a cell the current one and show it; whether its row is among those shown."""
        row = self.table_model.row_of(source_row)
        if row < 0:
            return False
        self.setCurrentIndex(self.table_model.index(row, min(place, len(self.table_model.columns) - 1)))
        return True

    # Copying and pasting

    def _chosen(self) -> tuple[list[int], list[int], set[tuple[int, int]] | None]:
        """Rows and columns that the selection touches, and its cells where they are not all of those."""
        selection = self.selectionModel().selection()
        ranges = [selection.at(place) for place in range(selection.count())]
        if not ranges:
            return [], [], None
        rows = sorted({row for part in ranges for row in range(part.top(), part.bottom() + 1)})
        places = sorted({place for part in ranges for place in range(part.left(), part.right() + 1)})
        places.sort(key=self.horizontalHeader().visualIndex)
        if len(ranges) == 1 or sum(part.width() * part.height() for part in ranges) >= len(rows) * len(
            places
        ):
            return rows, places, None
        cells = {
            (row, place)
            for part in ranges
            for row in range(part.top(), part.bottom() + 1)
            for place in range(part.left(), part.right() + 1)
        }
        return rows, places, cells

    def copy(self, *, exactly: bool = False) -> None:
        """Put the selection on the clipboard, as tab-separated text and as a table.

        Headings go with it where the whole table is selected.
        """
        rows, places, chosen = self._chosen()
        if not rows:
            return
        model = self.table_model
        columns = [model.columns[place] for place in places]

        def lines_of(some: Sequence[int]) -> list[tuple[str, ...]]:
            texts: list[list[str]] = []
            for place, column in zip(places, columns, strict=True):
                cells = column.copied(model.values_at(some, place), exactly=exactly)
                if chosen is not None:
                    cells = [
                        text if (row, place) in chosen else "" for row, text in zip(some, cells, strict=True)
                    ]
                texts.append(cells)
            return list(zip(*texts, strict=True))

        whole = len(rows) == model.rowCount() and len(places) == len(model.columns)
        headings = [
            f"{column.heading} ({column.shown_unit})" if column.shown_unit else column.heading
            for column in columns
        ]
        tags = [_opening_tag(column) for column in columns]
        self._copier.copy(rows, lines_of, tags=tags, headings=headings if whole else ())

    def paste(self) -> None:
        """Hand the clipboard's cells to whoever takes them."""
        if self.paste_callback is None:
            return
        grid = parse_grid(QGuiApplication.clipboard().text())
        if not grid:
            self.message.emit("There is nothing to paste: the clipboard holds no cells.")
            return
        place = max(self.currentIndex().column(), 0)
        key = self.table_model.columns[place].key
        reason = self.paste_callback(self.current_source_row(), key, grid)
        if reason:
            self.message.emit(reason)

    # Actions

    def _make_actions(self) -> dict[str, QAction]:
        made: dict[str, QAction] = {}
        for name, text, keys, act in (
            ("copy", "Copy", QKeySequence(QKeySequence.StandardKey.Copy), self.copy),
            (
                "copy_exactly",
                "Copy with full precision",
                QKeySequence("Ctrl+Shift+C"),
                lambda: self.copy(exactly=True),
            ),
            ("paste", "Paste", QKeySequence(QKeySequence.StandardKey.Paste), self.paste),
            ("select_all", "Select all", QKeySequence(QKeySequence.StandardKey.SelectAll), self.selectAll),
        ):
            action = QAction(text, self)
            action.setShortcut(keys)
            action.setShortcutContext(Qt.ShortcutContext.WidgetShortcut)
            action.triggered.connect(lambda _=False, act=act: act())
            self.addAction(action)
            made[name] = action
        return made

    def make_menu(self) -> QMenu:
        """The menu on the cells."""
        menu = QMenu(self)
        has_cells = self.table_model.rowCount() > 0
        for name in ("copy", "copy_exactly", "select_all"):
            self._actions[name].setEnabled(has_cells)
            menu.addAction(self._actions[name])
        if self.paste_callback is not None:
            menu.addAction(self._actions["paste"])
        menu.addSeparator()
        menu.addAction("Order as in the source", lambda: self.sortByColumn(-1, Qt.SortOrder.AscendingOrder))
        menu.addAction("Fit the columns", self.fit_columns)
        return menu

    # What Qt calls

    def contextMenuEvent(self, event: QContextMenuEvent) -> None:
        """Show the menu on the cells."""
        menu = self.make_menu()
        menu.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        menu.popup(event.globalPos())

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Return opens the row, unless its cell is edited."""
        index = self.currentIndex()
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter) and index.isValid():
            if index.flags() & Qt.ItemFlag.ItemIsEditable:
                self.edit(index)
            else:
                self.activated_row.emit(self.table_model.source_row(index.row()))
            return
        super().keyPressEvent(event)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Carry the hairlines on to the edge; say what an empty table would hold."""
        super().paintEvent(event)
        paint_beyond(self, self.theme)
        if self.table_model.rowCount() == 0 and self.empty_text:
            painter = QPainter(self.viewport())
            painter.setPen(self.theme.ink_soft)
            place = self.viewport().rect().adjusted(4 * GAP, 2 * GAP, -4 * GAP, -2 * GAP)
            flags = Qt.AlignmentFlag.AlignHCenter | Qt.AlignmentFlag.AlignVCenter | Qt.TextFlag.TextWordWrap
            painter.drawText(place, int(flags), self.empty_text)

    def _on_double_click(self, index: QModelIndex) -> None:
        if not index.flags() & Qt.ItemFlag.ItemIsEditable:
            self.activated_row.emit(self.table_model.source_row(index.row()))

    def _on_current_row(self, current: QModelIndex, _former: QModelIndex) -> None:
        self.current_row_changed.emit(self.table_model.source_row(current.row()) if current.isValid() else -1)

    def _on_theme(self, theme: Theme) -> None:
        self.theme = theme
        self.viewport().update()
        self.horizontalHeader().viewport().update()


def _opening_tag(column: Column) -> str:
    """Of a cell in HTML: a spreadsheet leaves text as it is."""
    if column.is_numeric:
        return '<td align="right">'
    return "<td style=\"mso-number-format:'\\@'\">" if column.kind == "text" else "<td>"
