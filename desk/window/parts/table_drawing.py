"""How the headings and cells of a table are drawn."""

from __future__ import annotations

from typing import TYPE_CHECKING

from PySide6.QtCore import QPoint, QRect, QSize, Qt
from PySide6.QtGui import QFontMetrics, QPainter, QPaintEvent, QPolygon
from PySide6.QtWidgets import QHeaderView, QStyle, QStyledItemDelegate, QStyleOptionViewItem, QTableView

from desk.window.parts.columns import Mark
from desk.window.parts.table_model import Index
from desk.window.parts.theme import GAP, HALF, Theme, mixed, soft_font, strong_font

if TYPE_CHECKING:
    from desk.window.parts.tables import Table

__all__ = ["Cells", "Header", "paint_beyond", "paint_mark", "paint_rest"]


class Header(QHeaderView):
    """Headings in two lines: the name, and under it, softer, the unit."""

    def __init__(self, table: Table) -> None:
        super().__init__(Qt.Orientation.Horizontal, table)
        self._table = table
        self._measured_font = ""
        self._heights: tuple[int, ...] = ()
        self.setSectionsClickable(True)
        self.setHighlightSections(False)
        self.setSortIndicatorShown(True)
        self.setSortIndicatorClearable(True)
        self.setStretchLastSection(False)
        self.setMinimumSectionSize(36)

    def sizeHint(self) -> QSize:
        """High enough for both lines, or for one where no column has a unit."""
        # Asked for again and again while a table is laid out.
        key = self.font().key()
        if key != self._measured_font:
            self._measured_font = key
            fonts = strong_font(self.font()), soft_font(self.font())
            self._heights = tuple(QFontMetrics(font).height() for font in fonts)
        name, unit = self._heights
        has_units = any(column.shown_unit for column in self._table.table_model.columns)
        return QSize(self.length(), name + (unit if has_units else 0) + GAP)

    def paintSection(self, painter: QPainter, rect: QRect, section: int) -> None:
        """Draw one heading."""
        theme, column = self._table.theme, self._table.table_model.columns[section]
        side = Qt.AlignmentFlag.AlignRight if column.stands_right else Qt.AlignmentFlag.AlignLeft
        painter.save()
        painter.fillRect(rect, theme.surface)
        inner = rect.adjusted(GAP, HALF, -GAP, -HALF)
        name_font, unit_font = strong_font(self.font()), soft_font(self.font())
        name_metrics = QFontMetrics(name_font)
        if self.sortIndicatorSection() == section:
            self._paint_arrow(painter, inner, name_metrics.height(), column.stands_right)
            inner_name = inner.adjusted(12, 0, 0, 0) if column.stands_right else inner.adjusted(0, 0, -12, 0)
        else:
            inner_name = inner
        painter.setFont(name_font)
        painter.setPen(theme.ink)
        shown = name_metrics.elidedText(column.heading, Qt.TextElideMode.ElideRight, inner_name.width())
        painter.drawText(inner_name, int(side | Qt.AlignmentFlag.AlignTop), shown)
        painter.setFont(unit_font)
        painter.setPen(theme.ink_soft)
        unit = QFontMetrics(unit_font).elidedText(
            column.shown_unit, Qt.TextElideMode.ElideRight, inner.width()
        )
        painter.drawText(inner, int(side | Qt.AlignmentFlag.AlignBottom), unit)
        painter.setPen(mixed(theme.hairline, theme.ink_soft, 0.4))
        painter.drawLine(rect.bottomLeft(), rect.bottomRight())
        painter.restore()

    def _paint_arrow(self, painter: QPainter, inner: QRect, height: int, at_left: bool) -> None:
        x = inner.left() + 4 if at_left else inner.right() - 4
        y = inner.top() + height // 2
        tip = -3 if self.sortIndicatorOrder() is Qt.SortOrder.AscendingOrder else 3
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(self._table.theme.ink_soft)
        painter.drawPolygon(QPolygon([QPoint(x - 4, y - tip), QPoint(x + 4, y - tip), QPoint(x, y + tip)]))

    def paintEvent(self, event: QPaintEvent) -> None:
        """Carry the ground and the line on beyond the last heading."""
        super().paintEvent(event)
        paint_rest(self, self._table.theme)


class Cells(QStyledItemDelegate):
    """Cells with a hairline under each, emphasis, and the marks of faults."""

    def __init__(self, table: Table) -> None:
        super().__init__(table)
        self._table = table

    def paint(self, painter: QPainter, option: QStyleOptionViewItem, index: Index) -> None:
        """Draw one cell."""
        theme, model = self._table.theme, self._table.table_model
        rect = option.rect
        state = option.state
        row, place = index.row(), index.column()
        column = model.columns[place]
        chosen = bool(state & QStyle.StateFlag.State_Selected)
        mark = model.mark_at(row, place)
        painter.save()
        if chosen:
            part = 0.28 if self._table.hasFocus() else 0.14
            painter.fillRect(rect, mixed(theme.surface, theme.accent, part))
        elif mark is not None:
            painter.fillRect(rect, mixed(theme.surface, theme.grave if mark.grave else theme.mild, 0.10))
        painter.setFont(self._table.strong_font if model.is_strong(row) else self._table.font())
        painter.setPen(theme.ink)
        side = Qt.AlignmentFlag.AlignRight if column.stands_right else Qt.AlignmentFlag.AlignLeft
        inner = rect.adjusted(GAP, 0, -GAP, -1)
        text = str(model.data(index))
        shown = painter.fontMetrics().elidedText(text, Qt.TextElideMode.ElideRight, inner.width())
        painter.drawText(inner, int(side | Qt.AlignmentFlag.AlignVCenter), shown)
        painter.setPen(theme.hairline)
        painter.drawLine(rect.bottomLeft(), rect.bottomRight())
        if mark is not None:
            paint_mark(painter, rect, mark, theme)
        if bool(state & QStyle.StateFlag.State_HasFocus) and self._table.hasFocus():
            painter.setPen(theme.focus)
            painter.setBrush(Qt.BrushStyle.NoBrush)
            painter.drawRect(rect.adjusted(0, 0, -1, -1))
        painter.restore()


def paint_mark(painter: QPainter, rect: QRect, mark: Mark, theme: Theme) -> None:
    """Mark a cell. Grave is a filled corner, mild an open one: told apart without their colours."""
    corner = rect.topLeft()
    shape = QPolygon([corner, corner + QPoint(8, 0), corner + QPoint(0, 8)])
    colour = theme.grave if mark.grave else theme.mild
    painter.setPen(colour)
    painter.setBrush(colour if mark.grave else theme.surface)
    painter.drawPolygon(shape)


def paint_beyond(view: QTableView, theme: Theme) -> None:
    """Carry the hairlines under the rows on from the last column to the edge."""
    model, area = view.model(), view.viewport().rect()
    count = model.rowCount()
    start = view.horizontalHeader().length() - view.horizontalHeader().offset()
    if not count or start >= area.right():
        return
    painter = QPainter(view.viewport())
    painter.setPen(theme.hairline)
    row, height = max(view.rowAt(0), 0), view.verticalHeader().defaultSectionSize()
    line = view.rowViewportPosition(row) + height - 1
    while row < count and line <= area.bottom():
        painter.drawLine(start, line, area.right(), line)
        row, line = row + 1, line + height


def paint_rest(header: QHeaderView, theme: Theme) -> None:
    """Carry the ground and the line of headings on from the last one to the edge."""
    rest = header.viewport().rect()
    if header.count():
        last = header.logicalIndex(header.count() - 1)
        rest.setLeft(header.sectionViewportPosition(last) + header.sectionSize(last))
    if rest.width() > 0:
        painter = QPainter(header.viewport())
        painter.fillRect(rest, theme.surface)
        painter.setPen(mixed(theme.hairline, theme.ink_soft, 0.4))
        painter.drawLine(rest.bottomLeft(), rest.bottomRight())
