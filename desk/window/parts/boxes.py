"""A box to tick that is seen on a light and on a dark ground."""

from __future__ import annotations

from PySide6.QtCore import QPoint, QRect, QSize, Qt
from PySide6.QtGui import QPainter, QPaintEvent, QPen
from PySide6.QtWidgets import QCheckBox

from desk.window.parts.theme import GAP, STEP

__all__ = ["TickBox"]

_SIDE = 14


class TickBox(QCheckBox):
    """A choice of yes or no. The style would frame it in a shade of the ground, unseen where that is dark."""

    def sizeHint(self) -> QSize:
        """Room for the box and its text."""
        metrics = self.fontMetrics()
        wide = _SIDE + GAP + metrics.horizontalAdvance(self.text()) + STEP
        return QSize(wide, max(_SIDE, metrics.height()) + GAP)

    def minimumSizeHint(self) -> QSize:
        """No less."""
        return self.sizeHint()

    def hitButton(self, place: QPoint) -> bool:
        """The whole of it can be clicked."""
        return self.rect().contains(place)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Draw the box, its tick and its text in the colours of the theme."""
        painter = QPainter(self)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        palette = self.palette()
        box = QRect(1, (self.height() - _SIDE) // 2, _SIDE, _SIDE)
        has_focus = self.hasFocus()
        frame = palette.highlight() if has_focus else palette.placeholderText()
        painter.setPen(QPen(frame.color(), 2.0 if has_focus else 1.0))
        painter.setBrush(palette.base())
        painter.drawRoundedRect(box, 2.0, 2.0)
        ink = palette.text().color() if self.isEnabled() else palette.placeholderText().color()
        if self.isChecked():
            painter.setPen(QPen(ink, 2.0))
            corner = box.topLeft()
            painter.drawPolyline([corner + QPoint(3, 7), corner + QPoint(6, 10), corner + QPoint(11, 4)])
        painter.setPen(ink)
        words = self.rect().adjusted(_SIDE + GAP, 0, 0, 0)
        flags = Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter | Qt.TextFlag.TextShowMnemonic
        painter.drawText(words, int(flags), self.text())
