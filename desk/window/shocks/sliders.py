"""A slider with its name and a box for the number."""

from __future__ import annotations

from PySide6.QtCore import QPointF, QSignalBlocker, Qt, Signal
from PySide6.QtGui import QKeyEvent, QMouseEvent, QPainter, QPaintEvent, QPen, QWheelEvent
from PySide6.QtWidgets import (
    QHBoxLayout,
    QLabel,
    QLineEdit,
    QSlider,
    QWidget,
)

from desk.window.parts import numbers
from desk.window.parts.theme import HALF, LIGHT, STEP, keep_look
from desk.window.shocks.hand import Handle

__all__ = ["HandleRow"]

_LABEL = 23 * STEP
_BOX = 12 * STEP
_KNOB = 6.0
"""Half the width of the handle [px]."""
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

    def paintEvent(self, _event: QPaintEvent) -> None:
        """A hairline with a mark at nothing, filled from there to where the handle stands."""
        painter = QPainter(self)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        palette = self.palette()
        middle = self.height() / 2
        nothing, here = self._x_of(0), self._x_of(self.value())
        painter.setPen(QPen(palette.placeholderText().color(), 1))
        painter.drawLine(QPointF(_KNOB, middle), QPointF(self.width() - _KNOB, middle))
        painter.drawLine(QPointF(nothing, middle - _KNOB), QPointF(nothing, middle + _KNOB))
        colour = LIGHT.fill("what_if") if self.isEnabled() else palette.mid().color()
        if self.value():
            painter.setPen(QPen(colour, 3))
            painter.drawLine(QPointF(nothing, middle), QPointF(here, middle))
        has_focus = self.hasFocus()
        frame = palette.highlight() if has_focus else palette.placeholderText()
        painter.setPen(QPen(frame.color(), 2.0 if has_focus else 1.0))
        painter.setBrush(colour if self.value() else palette.base().color())
        painter.drawEllipse(QPointF(here, middle), _KNOB - 1.0, _KNOB - 1.0)
        painter.end()

    def _x_of(self, value: int) -> float:
        room = self.width() - 2 * _KNOB
        share = (value - self.minimum()) / max(self.maximum() - self.minimum(), 1)
        return _KNOB + share * room

    def _value_at(self, x: float) -> int:
        room = max(self.width() - 2 * _KNOB, 1)
        share = min(max((x - _KNOB) / room, 0.0), 1.0)
        return round(self.minimum() + share * (self.maximum() - self.minimum()))

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """Take the handle to where the pointer is."""
        if event.button() is Qt.MouseButton.LeftButton:
            self.setSliderDown(True)
            self.setValue(self._value_at(event.position().x()))
            event.accept()
        else:
            event.ignore()

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """Follow the pointer."""
        if self.isSliderDown():
            self.setValue(self._value_at(event.position().x()))

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """Let go."""
        if event.button() is Qt.MouseButton.LeftButton:
            self.setSliderDown(False)

    def mouseDoubleClickEvent(self, _event: QMouseEvent) -> None:
        """Back to nothing."""
        self.setSliderDown(False)
        self.setValue(0)


class _Box(QLineEdit):
    """A number within limits; Up and Down step it, and Escape takes an entry back.

    Signals
    -------
    valueChanged(float)
    """

    valueChanged = Signal(float)

    def __init__(self, low: float, high: float) -> None:
        super().__init__()
        self._low, self._high = low, high
        self._value = 0.0
        self.setAlignment(Qt.AlignmentFlag.AlignRight)
        self.editingFinished.connect(self._on_finished)
        self._show()

    def value(self) -> float:
        """The number that was taken last."""
        return self._value

    def setValue(self, value: float) -> None:
        """Take a number; what is too much is the most."""
        value = min(max(value, self._low), self._high)
        changed = value != self._value
        self._value = value
        self._show()
        if changed:
            self.valueChanged.emit(value)

    def _show(self) -> None:
        self.setText(numbers.exact(round(self._value, 4)).replace("-", numbers.MINUS))
        self.setModified(False)

    def _on_finished(self) -> None:
        if not self.isModified():
            return
        text = self.text().strip()
        # Nothing is nothing moved; what is no number changes nothing.
        value = numbers.parse_number(text) if text else 0.0
        self.setValue(self._value if value is None else value)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Step, or take the entry back."""
        steps = {Qt.Key.Key_Up: 1, Qt.Key.Key_Down: -1, Qt.Key.Key_PageUp: 10, Qt.Key.Key_PageDown: -10}
        if event.key() in steps:
            self._on_finished()
            self.setValue(self._value + steps[Qt.Key(event.key())])
        elif event.key() == Qt.Key.Key_Escape and self.isModified():
            self._show()
        else:
            super().keyPressEvent(event)


class HandleRow(QWidget):
    """A handle: its name, a slider, and the number.

    Attributes
    ----------
    handle : Handle
    slider : QSlider
    box : QLineEdit
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
        self.box = _Box(handle.least, handle.most)
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
