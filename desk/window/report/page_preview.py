"""The pages of the report on screen."""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtCore import QRectF, QSize, Qt, Signal
from PySide6.QtGui import QColor, QFont, QFontMetricsF, QKeyEvent, QPainter, QPaintEvent, QPen
from PySide6.QtWidgets import QHBoxLayout, QScrollArea, QSizePolicy, QToolButton, QVBoxLayout, QWidget

from desk.report.results.look import ASSETS, INK, LIABILITIES, QUIET
from desk.report.results.plan import PlannedCell, SheetPlan
from desk.window.parts import numbers
from desk.window.parts.labels import ElidedLabel
from desk.window.parts.theme import GAP, HALF, ThemeSwitch, keep_look, tabular
from desk.window.report.page_layout import FORMULA_SIGN, MARGINS, PAGE, LaidOutSheet, Place, planned_text

__all__ = ["PagePreview"]

_GROUNDS = {
    "heading": QColor("#E9E7E0"),
    "heading_left": QColor("#E9E7E0"),
    "heading_centre": QColor("#E9E7E0"),
    "heading_unit": QColor("#E9E7E0"),
    "input": QColor("#FFFBE6"),
    "live": QColor("#F1F3F1"),
    "check": QColor("#F1F3F1"),
}
_INKS = {"note": QUIET, "caution": LIABILITIES, "input": "0000FF"}
_LINE = QColor("#C9C6BC")
_SMALL = QSize(280, 200)
_LARGE = QSize(1263, 893)
"""A page at one and a half times its size on paper, at 72 dots an inch."""
_LEFT = ("title", "note", "caution", "heading_left", "sign", "unit", "heading_unit")


class _Page(QWidget):
    """One page, as large as there is room for."""

    turned = Signal(int)

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__()
        self._theme_switch = theme_switch
        self.sheet: LaidOutSheet | None = None
        self.page = 0
        self.file_name = ""
        self.empty_text = ""
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Expanding)
        self.setMinimumSize(_SMALL)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Turn the page."""
        steps = {
            Qt.Key.Key_PageDown: 1,
            Qt.Key.Key_Right: 1,
            Qt.Key.Key_PageUp: -1,
            Qt.Key.Key_Left: -1,
        }
        step = steps.get(Qt.Key(event.key()))
        if step is None:
            super().keyPressEvent(event)
        else:
            self.turned.emit(step)

    def paintEvent(self, _event: QPaintEvent) -> None:
        """Draw the page on the ground of the window."""
        painter = QPainter(self)
        theme = self._theme_switch.theme
        if self.sheet is None:
            painter.setPen(theme.ink_soft)
            flags = Qt.AlignmentFlag.AlignCenter | Qt.TextFlag.TextWordWrap
            painter.drawText(self.rect().adjusted(GAP, GAP, -GAP, -GAP), int(flags), self.empty_text)
            painter.end()
            return
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setRenderHint(QPainter.RenderHint.TextAntialiasing)
        factor = min((self.width() - 4) / PAGE[0], (self.height() - 4) / PAGE[1])
        painter.translate((self.width() - factor * PAGE[0]) / 2, 2)
        painter.scale(factor, factor)
        paper = QRectF(0, 0, *PAGE)
        painter.fillRect(paper, QColor("white"))
        painter.setPen(QPen(theme.focus if self.hasFocus() else theme.hairline, 1 / factor))
        painter.drawRect(paper)
        painter.setClipRect(paper)
        _PagePainter(painter, self.sheet, self.font()).paint(self.page, self.file_name)
        painter.end()


class _PagePainter:
    """Draws one page in points."""

    def __init__(self, painter: QPainter, sheet: LaidOutSheet, font: QFont) -> None:
        self._painter = painter
        self._sheet = sheet
        self._plain = tabular(font)
        self._plain.setPixelSize(10)
        self._strong = QFont(self._plain)
        self._strong.setWeight(QFont.Weight.Bold)
        self._large = QFont(self._strong)
        self._large.setPixelSize(15)

    def paint(self, page: int, file_name: str) -> None:
        """Draw the rows, the places of the charts, and the footer."""
        painter, sheet = self._painter, self._sheet
        self._footer(page, file_name)
        painter.save()
        painter.setClipRect(
            QRectF(
                MARGINS[0],
                MARGINS[1],
                PAGE[0] - MARGINS[0] - MARGINS[2],
                PAGE[1] - MARGINS[1] - MARGINS[3] + 2,
            )
        )
        painter.translate(MARGINS[0], MARGINS[1])
        painter.scale(sheet.scale, sheet.scale)
        y = 0.0
        body = 0.0
        for row in sheet.rows_on(page):
            if row == sheet.first_row(page):
                body = y
            height = sheet.height_of(row)
            self._row(sheet.cells_in(row), y, height)
            y += height
        above = sum(sheet.height_of(row) for row in range(1, sheet.first_row(page)))
        for title, place in sheet.charts:
            self._chart(title, place, body - above)
        painter.restore()

    def _footer(self, page: int, file_name: str) -> None:
        painter = self._painter
        painter.setFont(self._plain)
        painter.setPen(QColor(f"#{INK}"))
        line = QRectF(MARGINS[0], PAGE[1] - 36, PAGE[0] - MARGINS[0] - MARGINS[2], 14)
        painter.drawText(line, int(Qt.AlignmentFlag.AlignLeft), file_name)
        painter.drawText(line, int(Qt.AlignmentFlag.AlignHCenter), self._sheet.plan.name)
        told = f"Page {page + 1} of {self._sheet.page_count}"
        painter.drawText(line, int(Qt.AlignmentFlag.AlignRight), told)

    def _row(self, cells: dict[int, PlannedCell], y: float, height: float) -> None:
        sheet = self._sheet
        columns = sorted(cells)
        for place, column in enumerate(columns):
            cell = cells[column]
            left = sheet.left_of(column)
            own = QRectF(left, y, sheet.width_of(column), height)
            end = sheet.left_of(columns[place + 1]) if place + 1 < len(columns) else 10_000.0
            self._cell(cell, own, end - left)

    def _cell(self, cell: PlannedCell, own: QRectF, free: float) -> None:
        painter, role = self._painter, cell.role
        ground = _GROUNDS.get(role)
        if ground is not None:
            painter.fillRect(own, ground)
        if role not in ("title", "note", "caution"):
            painter.setPen(QPen(QColor(f"#{QUIET}") if role.startswith("heading") else _LINE, 0.5))
            painter.drawLine(own.bottomLeft(), own.bottomRight())
        text = planned_text(cell.value, cell.form)
        if not text:
            return
        bold = role in ("check", "caution") or role.startswith("heading")
        font = self._large if role == "title" else self._strong if bold else self._plain
        painter.setFont(font)
        painter.setPen(QColor(f"#{_INKS.get(role, INK)}"))
        to_left = role in _LEFT or (
            role not in ("heading", "check", "heading_centre") and cell.form == "text"
        )
        inner = own.adjusted(2, 0, -2, 0)
        if text == FORMULA_SIGN:
            painter.setPen(QColor(f"#{ASSETS}"))
        if role.startswith("heading"):
            side = Qt.AlignmentFlag.AlignLeft if to_left else Qt.AlignmentFlag.AlignRight
            if role == "heading_centre":
                side = Qt.AlignmentFlag.AlignHCenter
            flags = side | Qt.AlignmentFlag.AlignBottom | Qt.TextFlag.TextWordWrap
            painter.drawText(inner, int(flags), text)
            return
        side = Qt.AlignmentFlag.AlignLeft if to_left else Qt.AlignmentFlag.AlignRight
        if role == "check":
            side = Qt.AlignmentFlag.AlignHCenter
        if to_left:
            # A text runs on over the empty cells after it.
            inner.setWidth(max(inner.width(), free - 4))
        shown = QFontMetricsF(font).elidedText(text, Qt.TextElideMode.ElideRight, inner.width() + 0.5)
        painter.drawText(inner, int(side | Qt.AlignmentFlag.AlignVCenter), shown)

    def _chart(self, title: str, place: Place, shift: float) -> None:
        painter = self._painter
        frame = QRectF(place.x, place.y + shift, place.width, place.height).adjusted(4, 4, -4, -4)
        painter.setPen(QPen(_LINE, 0.75))
        painter.setBrush(QColor("#FBFAF6"))
        painter.drawRect(frame)
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.setFont(self._strong)
        painter.setPen(QColor(f"#{INK}"))
        flags = Qt.AlignmentFlag.AlignCenter | Qt.TextFlag.TextWordWrap
        painter.drawText(frame.adjusted(8, 0, -8, -10), int(flags), title or "Chart")
        painter.setFont(self._plain)
        painter.setPen(QColor(f"#{QUIET}"))
        under = frame.adjusted(8, frame.height() / 2 + 8, -8, 0)
        top = Qt.AlignmentFlag.AlignHCenter | Qt.AlignmentFlag.AlignTop
        painter.drawText(under, int(top), "a chart, drawn by the spreadsheet program")


class PagePreview(QWidget):
    """The pages of one sheet, one at a time, with what turns them.

    Attributes
    ----------
    back, on, larger : QToolButton
    """

    def __init__(self, theme_switch: ThemeSwitch, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._sheets: dict[str, LaidOutSheet] = {}
        self._page = _Page(theme_switch)
        self._page.turned.connect(self.turn)
        self.label = ElidedLabel()
        keep_look(self.label, "soft")
        self.back, self.on = QToolButton(), QToolButton()
        for button, text, name, step in (
            (self.back, "‹", "Former page", -1),
            (self.on, "›", "Next page", 1),
        ):
            button.setText(text)
            button.setAccessibleName(name)
            button.setToolTip(name)
            button.clicked.connect(lambda _=False, step=step: self.turn(step))
        self.larger = QToolButton()
        self.larger.setText("Larger")
        self.larger.setCheckable(True)
        self.larger.setToolTip("Show the page larger than there is room for, to be scrolled")
        self.larger.toggled.connect(self._on_larger)
        self._scroll = QScrollArea()
        self._scroll.setWidget(self._page)
        self._scroll.setWidgetResizable(True)
        self._scroll.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        row = QHBoxLayout()
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(HALF)
        row.addWidget(self.label, 1)
        row.addWidget(self.larger)
        row.addWidget(self.back)
        row.addWidget(self.on)
        column = QVBoxLayout(self)
        column.setContentsMargins(GAP, 0, GAP, HALF)
        column.setSpacing(HALF)
        column.addLayout(row)
        column.addWidget(self._scroll, 1)
        theme_switch.changed.connect(lambda _: self._page.update())
        self.show_plans((), "", "")

    @property
    def shown(self) -> tuple[str, int, int]:
        """Name of the sheet shown, its page from 1, and its pages; empty and 0 without a sheet."""
        sheet = self._page.sheet
        return (sheet.plan.name, self._page.page + 1, sheet.page_count) if sheet else ("", 0, 0)

    def show_plans(self, plans: Sequence[SheetPlan], file_name: str, empty_text: str) -> None:
        """Show other sheets; the one shown stays where there is still one of its name."""
        former, page = self.shown[0], self._page.page
        self._sheets = {plan.name: LaidOutSheet(plan) for plan in plans}
        self._page.file_name = file_name
        self._page.empty_text = empty_text
        name = former if former in self._sheets else next(iter(self._sheets), "")
        self.show_sheet(name, page if name == former else 0)

    def set_file_name(self, file_name: str) -> None:
        """Show another name in the footer."""
        self._page.file_name = file_name
        self._page.update()

    def page_count(self, name: str) -> int:
        """Pages of a sheet."""
        return self._sheets[name].page_count

    def show_sheet(self, name: str, page: int = 0) -> None:
        """Show a page (from 0) of a sheet."""
        sheet = self._sheets.get(name)
        self._page.sheet = sheet
        self._page.page = min(max(page, 0), sheet.page_count - 1) if sheet else 0
        self._tell()
        self._page.update()

    def turn(self, steps: int) -> None:
        """Go some pages on or back."""
        sheet = self._page.sheet
        if sheet is not None:
            self.show_sheet(sheet.plan.name, self._page.page + steps)

    def _on_larger(self, larger: bool) -> None:
        self._page.setMinimumSize(_LARGE if larger else _SMALL)

    def _tell(self) -> None:
        name, page, pages = self.shown
        told = f"{name}, page {numbers.integer(page)} of {numbers.integer(pages)}" if name else ""
        self.label.set_text(f"{told}   {FORMULA_SIGN} marks a formula" if told else "")
        self.back.setEnabled(page > 1)
        self.on.setEnabled(page < pages)
        self._page.setAccessibleName(f"Page as it will come out: {told}" if told else "Pages of the report")
        sheet = self._page.sheet
        self._page.setAccessibleDescription(sheet.plan.note if sheet else self._page.empty_text)
