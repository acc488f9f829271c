"""A slider with its name and a box for the number."""

from __future__ import annotations

from PySide6.QtCore import QSignalBlocker, Qt, Signal
from PySide6.QtGui import QKeyEvent, QPainter, QPaintEvent, QPen, QWheelEvent
from PySide6.QtWidgets import (
    QAbstractSpinBox,
    QDoubleSpinBox,
    QHBoxLayout,
    QLabel,
    QSlider,
    QStyle,
    QStyleOptionSlider,
    QWidget,
)

from desk.window.parts.numbers import shown_locale
from desk.window.parts.theme import HALF, STEP, keep_look
from desk.window.shocks.hand import Handle

__all__ = ["HandleRow"]

_LABEL = 22 * STEP
_BOX = 15 * STEP
_FINE = 1
_COARSE = {"bp": 25, "%": 5}


class _Slider(QSlider):
    """A slider that the wheel leaves alone on its way down the page; its middle is nothing."""

    def __init__(self) -> None:
        super().__init__(Qt.Orientation.Horizontal)

    def wheelEvent(self, event: QWheelEvent) -> None:
        """Turn only with the keyboard in it."""
        if self.hasFocus():
            super().wheelEvent(event)
        else:
            event.ignore()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """0 is nothing."""
        if event.key() in (Qt.Key.Key_0, Qt.Key.Key_Delete):
            self.setValue(0)
            return
        super().keyPressEvent(event)

    def paintEvent(self, event: QPaintEvent) -> None:
        """With a mark where nothing is moved."""
        option = QStyleOptionSlider()
        self.initStyleOption(option)
        groove = self.style().subControlRect(
            QStyle.ComplexControl.CC_Slider, option, QStyle.SubControl.SC_SliderGroove, self
        )
        handle = self.style().subControlRect(
            QStyle.ComplexControl.CC_Slider, option, QStyle.SubControl.SC_SliderHandle, self
        )
        room = groove.width() - handle.width()
        x = (
            groove.left()
            + handle.width() // 2
            + QStyle.sliderPositionFromValue(self.minimum(), self.maximum(), 0, room)
        )
        painter = QPainter(self)
        painter.setPen(QPen(self.palette().placeholderText().color(), 1))
        middle = self.height() // 2
        painter.drawLine(x, middle - 9, x, middle + 9)
        painter.end()
        super().paintEvent(event)


class _Box(QDoubleSpinBox):
    """A number that the wheel leaves alone."""

    def wheelEvent(self, event: QWheelEvent) -> None:
        """Turn only with the keyboard in it."""
        if self.hasFocus():
            super().wheelEvent(event)
        else:
            event.ignore()


class HandleRow(QWidget):
    """A handle: its name, a slider, and the number.

    Attributes
    ----------
    handle : Handle
    slider : QSlider
    box : QDoubleSpinBox
        It takes more than the slider reaches.

    Signals
    -------
    moved(float)
        In the unit of the handle.
    """

    moved = Signal(float)

    def __init__(self, handle: Handle) -> None:
        super().__init__()
        self.handle = handle
        name = f"{handle.label}, {handle.unit}"
        self.label = QLabel(handle.label)
        self.label.setFixedWidth(_LABEL)
        self.slider = _Slider()
        self.slider.setRange(round(handle.low), round(handle.high))
        self.slider.setSingleStep(_FINE)
        self.slider.setPageStep(_COARSE[handle.unit])
        self.slider.setAccessibleName(name)
        self.slider.setAccessibleDescription(handle.explanation)
        self.box = _Box()
        self.box.setLocale(shown_locale())
        self.box.setButtonSymbols(QAbstractSpinBox.ButtonSymbols.NoButtons)
        self.box.setDecimals(1)
        self.box.setRange(handle.least, handle.most)
        self.box.setSingleStep(_FINE)
        self.box.setAlignment(Qt.AlignmentFlag.AlignRight)
        self.box.setKeyboardTracking(False)
        self.box.setFixedWidth(_BOX)
        self.box.setAccessibleName(f"{name}, number")
        self.box.setAccessibleDescription(handle.explanation)
        unit = QLabel(handle.unit)
        unit.setFixedWidth(unit.fontMetrics().horizontalAdvance("bp") + 2)
        keep_look(unit, "soft")
        self.label.setBuddy(self.box)
        for widget in (self, self.label, self.slider, self.box):
            widget.setToolTip(handle.explanation)
        row = QHBoxLayout(self)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(HALF)
        row.addWidget(self.label)
        row.addWidget(self.slider, 1)
        row.addWidget(self.box)
        row.addWidget(unit)
        self.slider.valueChanged.connect(self._on_slider)
        self.box.valueChanged.connect(self._on_box)

    @property
    def value(self) -> float:
        """In the unit of the handle."""
        return float(self.box.value())

    def set_value(self, value: float) -> None:
        """Show a value, without telling anyone."""
        with QSignalBlocker(self.slider), QSignalBlocker(self.box):
            self.slider.setValue(round(value))
            self.box.setValue(value)

    def _on_slider(self, value: int) -> None:
        with QSignalBlocker(self.box):
            self.box.setValue(value)
        self.moved.emit(float(value))

    def _on_box(self, value: float) -> None:
        with QSignalBlocker(self.slider):
            self.slider.setValue(round(value))
        self.moved.emit(float(value))
