"""The number of a path, entered or stepped."""

from __future__ import annotations

from PySide6.QtCore import Qt, Signal
from PySide6.QtGui import QKeyEvent
from PySide6.QtWidgets import QLineEdit

from desk.window.parts import numbers

__all__ = ["PathBox"]


class PathBox(QLineEdit):
    """A number from 1 to the number of paths, or nothing.

    Up and Down go to the next and the last, Page Up and Page Down by ten; Escape takes an entry back, and
    after that the path.

    Signals
    -------
    valueChanged(int)
        0 for none.
    """

    valueChanged = Signal(int)

    def __init__(self) -> None:
        super().__init__()
        self._value, self._most = 0, 1
        self.setPlaceholderText("none")
        self.setAlignment(Qt.AlignmentFlag.AlignRight)
        self.setFixedWidth(self.fontMetrics().horizontalAdvance("20,000,000") + 20)
        self.editingFinished.connect(self._on_finished)

    def set_most(self, most: int) -> None:
        """How many paths there are; a number beyond them gives way to none, without telling anyone."""
        self._most = most
        if self._value > most:
            self._value = 0
            self._show()

    def value(self) -> int:
        """The number that was taken last."""
        return self._value

    def setValue(self, value: int) -> None:
        """Take a number; 0 is none, what is too much is the last path."""
        value = min(max(value, 0), self._most)
        changed = value != self._value
        self._value = value
        self._show()
        if changed:
            self.valueChanged.emit(value)

    def _show(self) -> None:
        self.setText(numbers.integer(self._value) if self._value else "")
        self.setModified(False)

    def _on_finished(self) -> None:
        if not self.isModified():
            return
        text = self.text().strip()
        found = numbers.parse_number(text) if text else 0.0
        is_number = found is not None and found == int(found)
        self.setValue(int(found) if found is not None and is_number else self._value)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Step, or take the entry back."""
        steps = {Qt.Key.Key_Up: 1, Qt.Key.Key_Down: -1, Qt.Key.Key_PageUp: 10, Qt.Key.Key_PageDown: -10}
        step = steps.get(Qt.Key(event.key()))
        if step is not None:
            self._on_finished()
            self.setValue(self._value + step)
        elif event.key() == Qt.Key.Key_Escape and self.isModified():
            self._show()
        elif event.key() == Qt.Key.Key_Escape and self._value:
            self.setValue(0)
        else:
            super().keyPressEvent(event)
