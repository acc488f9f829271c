"""A sheet as it is: rows and columns, the field over each column, and the faults in their cells."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from datetime import date, datetime
from typing import Any

from PySide6.QtCore import QAbstractTableModel, QModelIndex, QObject, QRect, QSize, Qt, Signal
from PySide6.QtGui import QAction, QContextMenuEvent, QFontMetrics, QKeySequence, QPainter, QPaintEvent
from PySide6.QtWidgets import (
    QAbstractItemView,
    QHeaderView,
    QMenu,
    QStyle,
    QStyledItemDelegate,
    QStyleOptionViewItem,
    QTableView,
    QWidget,
)

from desk.intake.records import SheetGrid
from desk.window.parts import numbers
from desk.window.parts.clipboard import RowCopier
from desk.window.parts.columns import Mark
from desk.window.parts.table_drawing import paint_beyond, paint_mark, paint_rest
from desk.window.parts.table_model import Index
from desk.window.parts.theme import GAP, HALF, Theme, ThemeSwitch, mixed, soft_font, strong_font, tabular

__all__ = ["SheetModel", "SheetView", "cell_place", "cell_text", "column_name"]

_ADDRESS = re.compile(r"\$?([A-Za-z]{1,3})\$?([1-9]\d{0,6})")
_NOWHERE = QModelIndex()
_SAMPLE = 200
_NARROWEST, _WIDEST = 64, 320
EMPTY = SheetGrid("", (), {}, None, False)


def column_name(place: int) -> str:
    """The letters over a column, from 0: ``A`` … ``Z``, ``AA`` …"""
    letters = ""
    place += 1
    while place:
        place, rest = divmod(place - 1, 26)
        letters = chr(ord("A") + rest) + letters
    return letters


def cell_place(address: str) -> tuple[int, int] | None:
    """Row and column, from 0, of an address such as ``C14``; None where it is none."""
    found = _ADDRESS.match(address.strip())
    if found is None:
        return None
    place = 0
    for letter in found[1].upper():
        place = 26 * place + ord(letter) - ord("A") + 1
    return int(found[2]) - 1, place - 1


def cell_text(value: Any) -> str:
    """A cell as it is shown: every figure a number has, dates in the locale."""
    if value is None:
        return ""
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    if isinstance(value, int | float):
        return numbers.exact(value).replace("-", numbers.MINUS, 1)
    if isinstance(value, datetime):
        clock = f" {value:%H:%M:%S}" if value.time().isoformat() != "00:00:00" else ""
        return numbers.day(value.date()) + clock
    if isinstance(value, date):
        return numbers.day(value)
    return " ".join(str(value).split("\n"))


def _plain_text(value: Any) -> str:
    """A cell for a spreadsheet: dates as year-month-day, and no text that would become a formula."""
    if isinstance(value, str):
        return f"'{value}" if value.startswith(("=", "+", "-", "@", "\t", "\r")) else value
    if isinstance(value, int | float) and not isinstance(value, bool):
        return numbers.exact(value)
    return "" if value is None else str(value)


class SheetModel(QAbstractTableModel):
    """The rows of one sheet, read where they are."""

    def __init__(self, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self.grid = EMPTY
        self.marks: Mapping[tuple[int, int], Mark] = {}
        self._columns = 0
        self._rows = 0

    def set_grid(self, grid: SheetGrid, marks: Mapping[tuple[int, int], Mark]) -> None:
        """Show another sheet with its faults by (row, column)."""
        self.beginResetModel()
        self.grid, self.marks = grid, marks
        widest = max((len(row) for row in grid.rows), default=0)
        # A fault may lie in a cell that is missing: there is a place to show it.
        self._columns = max([widest, *(place + 1 for place in grid.fields), *(c + 1 for _, c in marks)])
        self._rows = max([len(grid.rows), *(row + 1 for row, _ in marks)])
        self.endResetModel()

    def value_at(self, row: int, place: int) -> Any:
        """What a cell holds; None beyond the end of its row."""
        if row >= len(self.grid.rows):
            return None
        cells = self.grid.rows[row]
        return cells[place] if place < len(cells) else None

    def rowCount(self, parent: Index = _NOWHERE) -> int:
        """Rows of the sheet."""
        return 0 if parent.isValid() else self._rows

    def columnCount(self, parent: Index = _NOWHERE) -> int:
        """Columns of the sheet."""
        return 0 if parent.isValid() else self._columns

    def data(self, index: Index, role: int = Qt.ItemDataRole.DisplayRole) -> Any:
        """What a cell shows."""
        if not index.isValid():
            return None
        row, place = index.row(), index.column()
        if role == Qt.ItemDataRole.DisplayRole:
            return cell_text(self.value_at(row, place))
        if role == Qt.ItemDataRole.ToolTipRole:
            mark = self.marks.get((row, place))
            if mark is not None:
                return mark.text
            text = cell_text(self.value_at(row, place))
            return text if len(text) > 24 else None
        if role == Qt.ItemDataRole.AccessibleTextRole:
            mark = self.marks.get((row, place))
            text = f"{column_name(place)}{row + 1} {cell_text(self.value_at(row, place))}".rstrip()
            if mark is None:
                return text
            return f"{text} ({'grave' if mark.grave else 'mild'} fault: {mark.text})"
        return None

    def headerData(
        self, section: int, orientation: Qt.Orientation, role: int = Qt.ItemDataRole.DisplayRole
    ) -> Any:
        """Letters and fields over the columns, numbers beside the rows."""
        if orientation is Qt.Orientation.Vertical:
            return str(section + 1) if role == Qt.ItemDataRole.DisplayRole else None
        field = self.grid.fields.get(section, "")
        if role == Qt.ItemDataRole.DisplayRole:
            return column_name(section)
        if role == Qt.ItemDataRole.AccessibleTextRole:
            taken = f"taken as {field}" if field else "kept as a note" if self.grid.fields else "not taken"
            return f"Column {column_name(section)}, {taken}"
        if role == Qt.ItemDataRole.ToolTipRole:
            return f"The book takes {field} from this column" if field else None
        return None


class _SheetHeader(QHeaderView):
    """Letters, and under each the field that the column gives."""

    def __init__(self, view: SheetView) -> None:
        super().__init__(Qt.Orientation.Horizontal, view)
        self._view = view
        self.setSectionsClickable(True)
        self.setHighlightSections(False)
        self.setMinimumSectionSize(36)

    def sizeHint(self) -> QSize:
        """High enough for both lines."""
        letter = QFontMetrics(soft_font(self.font())).height()
        field = QFontMetrics(strong_font(self.font())).height()
        return QSize(self.length(), letter + field + GAP)

    def paintSection(self, painter: QPainter, rect: QRect, section: int) -> None:
        """Draw one heading."""
        theme = self._view.theme
        field = self._view.sheet_model.grid.fields.get(section, "")
        painter.save()
        painter.fillRect(rect, theme.surface)
        inner = rect.adjusted(GAP, HALF, -GAP, -HALF)
        soft, strong = soft_font(self.font()), strong_font(self.font())
        left = Qt.AlignmentFlag.AlignLeft
        painter.setFont(strong)
        painter.setPen(theme.ink)
        shown = QFontMetrics(strong).elidedText(field, Qt.TextElideMode.ElideRight, inner.width())
        painter.drawText(inner, int(left | Qt.AlignmentFlag.AlignTop), shown)
        painter.setFont(soft)
        painter.setPen(theme.ink_soft)
        painter.drawText(inner, int(left | Qt.AlignmentFlag.AlignBottom), column_name(section))
        painter.setPen(mixed(theme.hairline, theme.ink_soft, 0.4))
        painter.drawLine(rect.bottomLeft(), rect.bottomRight())
        painter.restore()

    def paintEvent(self, event: QPaintEvent) -> None:
        """Carry the ground and the line on beyond the last heading."""
        super().paintEvent(event)
        paint_rest(self, self._view.theme)


class _RowHeader(QHeaderView):
    """Row numbers."""

    def __init__(self, view: SheetView) -> None:
        super().__init__(Qt.Orientation.Vertical, view)
        self._view = view
        self.setSectionsClickable(True)
        self.setHighlightSections(False)

    def sizeHint(self) -> QSize:
        """Wide enough for the last number."""
        last = "8" * max(3, len(str(self._view.sheet_model.rowCount())))
        return QSize(QFontMetrics(soft_font(self.font())).horizontalAdvance(last) + 2 * GAP, 0)

    def paintSection(self, painter: QPainter, rect: QRect, section: int) -> None:
        """Draw one number."""
        theme = self._view.theme
        painter.save()
        painter.fillRect(rect, theme.surface)
        painter.setFont(soft_font(self.font()))
        painter.setPen(theme.ink_soft)
        flags = Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter
        painter.drawText(rect.adjusted(0, 0, -GAP, -1), int(flags), str(section + 1))
        painter.setPen(theme.hairline)
        painter.drawLine(rect.bottomLeft(), rect.bottomRight())
        painter.restore()


class _SheetCells(QStyledItemDelegate):
    """Cells as in a spreadsheet: figures and dates to the right, text to the left."""

    def __init__(self, view: SheetView) -> None:
        super().__init__(view)
        self._view = view

    def paint(self, painter: QPainter, option: QStyleOptionViewItem, index: Index) -> None:
        """Draw one cell."""
        theme, model = self._view.theme, self._view.sheet_model
        row, place = index.row(), index.column()
        rect, state = option.rect, option.state
        mark = model.marks.get((row, place))
        value = model.value_at(row, place)
        is_heading = row == model.grid.heading_row
        painter.save()
        if state & QStyle.StateFlag.State_Selected:
            part = 0.28 if self._view.hasFocus() else 0.14
            painter.fillRect(rect, mixed(theme.surface, theme.accent, part))
        elif mark is not None:
            painter.fillRect(rect, mixed(theme.surface, theme.grave if mark.grave else theme.mild, 0.12))
        elif is_heading:
            painter.fillRect(rect, theme.raised)
        painter.setFont(self._view.strong if is_heading else self._view.font())
        taken = is_heading or not model.grid.fields or place in model.grid.fields
        painter.setPen(theme.ink if taken else theme.ink_soft)
        to_right = isinstance(value, int | float | date) and not isinstance(value, bool)
        side = Qt.AlignmentFlag.AlignRight if to_right else Qt.AlignmentFlag.AlignLeft
        inner = rect.adjusted(GAP, 0, -GAP, -1)
        text = painter.fontMetrics().elidedText(cell_text(value), Qt.TextElideMode.ElideRight, inner.width())
        painter.drawText(inner, int(side | Qt.AlignmentFlag.AlignVCenter), text)
        painter.setPen(theme.hairline)
        painter.drawLine(rect.bottomLeft(), rect.bottomRight())
        if mark is not None:
            paint_mark(painter, rect, mark, theme)
        if state & QStyle.StateFlag.State_HasFocus and self._view.hasFocus():
            painter.setPen(theme.focus)
            painter.setBrush(Qt.BrushStyle.NoBrush)
            painter.drawRect(rect.adjusted(0, 0, -1, -1))
        painter.restore()


class SheetView(QTableView):
    """One sheet on screen.

    Attributes
    ----------
    sheet_model : SheetModel

    Signals
    -------
    message(str)
        What was copied.
    """

    message = Signal(str)

    def __init__(self, theme_switch: ThemeSwitch, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.theme = theme_switch.theme
        self.setAccessibleName("Sheet")
        self.setAccessibleDescription("The sheet as it is, with faults marked in their cells.")
        self.setFont(tabular(self.font()))
        self.strong = strong_font(self.font())
        self.setShowGrid(False)
        self.setWordWrap(False)
        self.setCornerButtonEnabled(False)
        self.setTabKeyNavigation(False)
        self.setSelectionMode(QAbstractItemView.SelectionMode.ContiguousSelection)
        self.setVerticalScrollMode(QAbstractItemView.ScrollMode.ScrollPerPixel)
        self.setHorizontalScrollMode(QAbstractItemView.ScrollMode.ScrollPerPixel)
        self.setEditTriggers(QAbstractItemView.EditTrigger.NoEditTriggers)
        self.sheet_model = SheetModel(self)
        self.setHorizontalHeader(_SheetHeader(self))
        rows = _RowHeader(self)
        self.setVerticalHeader(rows)
        rows.setSectionResizeMode(QHeaderView.ResizeMode.Fixed)
        rows.setMinimumSectionSize(16)
        rows.setDefaultSectionSize(QFontMetrics(self.font()).height() + GAP)
        self.setItemDelegate(_SheetCells(self))
        self.setModel(self.sheet_model)
        self._copy_action = QAction("Copy", self)
        self._copy_action.setShortcut(QKeySequence(QKeySequence.StandardKey.Copy))
        self._copy_action.setShortcutContext(Qt.ShortcutContext.WidgetShortcut)
        self._copy_action.triggered.connect(lambda _=False: self.copy())
        self.addAction(self._copy_action)
        self._copier = RowCopier(self)
        self._copier.message.connect(self.message)
        self.sheet_model.modelAboutToBeReset.connect(self._copier.stop)
        theme_switch.changed.connect(self._on_theme)

    def show_sheet(self, grid: SheetGrid, marks: Mapping[tuple[int, int], Mark]) -> None:
        """Show a sheet from its first cell on."""
        self.sheet_model.set_grid(grid, marks)
        self.setAccessibleName(f"Sheet {grid.name}")
        self._fit_columns()
        self.verticalHeader().updateGeometry()
        self.scrollToTop()

    def go_to(self, row: int, place: int) -> bool:
        """Make a cell the current one, in the middle of what is seen; whether there is such a cell."""
        index = self.sheet_model.index(row, place)
        if not index.isValid():
            return False
        self.setCurrentIndex(index)
        self.scrollTo(index, QAbstractItemView.ScrollHint.PositionAtCenter)
        return True

    def copy(self) -> None:
        """Put the selection on the clipboard with every figure the numbers have."""
        chosen = self.selectionModel().selection()
        if not chosen.count():
            return
        part = chosen.at(0)
        model, places = self.sheet_model, range(part.left(), part.right() + 1)

        def lines_of(rows: Sequence[int]) -> list[list[str]]:
            return [[_plain_text(model.value_at(row, place)) for place in places] for row in rows]

        self._copier.copy(range(part.top(), part.bottom() + 1), lines_of, tags=["<td>"] * len(places))

    def _fit_columns(self) -> None:
        plain, strong = QFontMetrics(self.font()), QFontMetrics(self.strong)
        grid = self.sheet_model.grid
        step = max(1, len(grid.rows) // _SAMPLE)
        sample = [*grid.rows[:_SAMPLE], *grid.rows[::step]][: 2 * _SAMPLE]
        for place in range(self.sheet_model.columnCount()):
            texts = {cell_text(row[place]) for row in sample if place < len(row)}
            widest = max((strong.horizontalAdvance(text[:80]) for text in texts), default=0)
            field = strong.horizontalAdvance(grid.fields.get(place, ""))
            width = max(widest, field, plain.horizontalAdvance("AAA")) + 2 * GAP + 4
            self.setColumnWidth(place, min(max(width, _NARROWEST), _WIDEST))

    def paintEvent(self, event: QPaintEvent) -> None:
        """Carry the hairlines on to the edge."""
        super().paintEvent(event)
        paint_beyond(self, self.theme)

    def contextMenuEvent(self, event: QContextMenuEvent) -> None:
        """Show the menu on the cells."""
        menu = QMenu(self)
        menu.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        menu.addAction(self._copy_action)
        menu.popup(event.globalPos())

    def _on_theme(self, theme: Theme) -> None:
        self.theme = theme
        for part in (self, self.horizontalHeader(), self.verticalHeader()):
            part.viewport().update()
