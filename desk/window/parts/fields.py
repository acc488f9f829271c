"""Form fields: a name, what it means in one sentence, its sensible range, and what is wrong with an entry."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from datetime import date
from typing import Any

from PySide6.QtCore import QEvent, QPoint, Qt, Signal
from PySide6.QtGui import QKeyEvent, QKeySequence, QPainter, QPaintEvent, QPen, QWheelEvent
from PySide6.QtWidgets import (
    QComboBox,
    QHBoxLayout,
    QLabel,
    QLineEdit,
    QPushButton,
    QVBoxLayout,
    QWidget,
)

from desk.window.parts import numbers
from desk.window.parts.labels import well_broken
from desk.window.parts.theme import GAP, HALF, STEP, WIDE, keep_look, soft_font

__all__ = [
    "Choice",
    "ChoiceField",
    "Combo",
    "DateField",
    "Field",
    "Form",
    "IntegerField",
    "NumberField",
    "TextField",
]

FORM_WIDTH = 280
"""Of the panel that holds a form [px]."""


class _Line(QLineEdit):
    """An entry that Escape takes back; without typing to undo, the keys of undo are the book's."""

    reverted = Signal()

    def event(self, event: QEvent) -> bool:
        """Leave a key to the menus that would do nothing here."""
        if event.type() is QEvent.Type.ShortcutOverride and isinstance(event, QKeyEvent):
            keys = QKeySequence.StandardKey
            undoes, redoes = event.matches(keys.Undo), event.matches(keys.Redo)
            if (undoes and not self.isUndoAvailable()) or (redoes and not self.isRedoAvailable()):
                event.ignore()
                return False
        return super().event(event)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Escape takes the entry back."""
        if event.key() == Qt.Key.Key_Escape and self.isModified():
            self.reverted.emit()
            return
        super().keyPressEvent(event)


class Combo(QComboBox):
    """A choice that the wheel leaves alone on its way down the page."""

    def wheelEvent(self, event: QWheelEvent) -> None:
        """Turn only with the keyboard in it."""
        if self.hasFocus():
            super().wheelEvent(event)
        else:
            event.ignore()

    def paintEvent(self, event: QPaintEvent) -> None:
        """Draw the mark that it opens, in the colour of the theme, which a style sheet cannot."""
        super().paintEvent(event)
        painter = QPainter(self)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setPen(QPen(self.palette().placeholderText().color(), 1.5))
        x, y = self.width() - 3 * STEP, self.height() // 2
        painter.drawPolyline([QPoint(x - STEP, y - 2), QPoint(x, y + 2), QPoint(x + STEP, y - 2)])


class Field(QWidget):
    """A named field with its explanation.

    Signals
    -------
    committed(object)
        The reader entered another value.
    """

    committed = Signal(object)

    def __init__(self, label: str, editor: QWidget, *, unit: str = "", hint: str = "") -> None:
        super().__init__()
        self.label = QLabel(label)
        self.label.setBuddy(editor)
        self.editor = editor
        editor.setAccessibleName(f"{label}, {unit}" if unit else label)
        self._hint = self._note("soft")
        self._problem = self._note("grave")
        row = QHBoxLayout()
        row.setSpacing(HALF)
        row.addWidget(editor, 1)
        if unit:
            unit_label = QLabel(unit)
            keep_look(unit_label, "soft")
            row.addWidget(unit_label)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(HALF)
        column.addWidget(self.label)
        column.addLayout(row)
        column.addWidget(self._problem)
        column.addWidget(self._hint)
        self.setFocusProxy(editor)
        self.set_hint(hint)

    def _note(self, look: str) -> QLabel:
        note = QLabel()
        note.setWordWrap(True)
        note.setFont(soft_font(self.font()))
        note.setTextFormat(Qt.TextFormat.PlainText)
        note.hide()
        keep_look(note, look)
        return note

    def set_hint(self, hint: str) -> None:
        """Explain the field in a plain sentence."""
        self._hint_text = hint
        self._hint.setText(well_broken(hint))
        self._hint.setVisible(bool(hint))
        self.editor.setAccessibleDescription(hint)

    @property
    def hint(self) -> str:
        """The explanation under the field."""
        return self._hint_text

    @property
    def problem(self) -> str:
        """What is wrong with the entry; empty where nothing is."""
        return self._problem.text()

    def set_problem(self, problem: str) -> None:
        """Say what is wrong with the entry; nothing where nothing is."""
        self._problem.setText(problem)
        self._problem.setVisible(bool(problem))
        if self.editor.property("fault") != bool(problem):
            self.editor.setProperty("fault", bool(problem))
            style = self.editor.style()
            style.unpolish(self.editor)
            style.polish(self.editor)
        self.editor.setAccessibleDescription(f"{problem} {self.hint}".strip())


class _Entry(Field):
    """A field filled by typing."""

    def __init__(self, label: str, *, unit: str = "", hint: str = "", optional: bool = False) -> None:
        self.line = _Line()
        super().__init__(label, self.line, unit=unit, hint=hint)
        self.optional = optional
        self._value: Any = None
        self.line.editingFinished.connect(self._on_finished)
        self.line.reverted.connect(lambda: self.set_value(self._value))

    def set_value(self, value: Any) -> None:
        """Show `value`, without telling anyone."""
        self._value = value
        self.line.setText(self._written(value))
        self.line.setModified(False)
        self.line.setCursorPosition(0)
        self.set_problem("")

    def _on_finished(self) -> None:
        if not self.line.isModified():
            return
        self.line.setModified(False)
        text = self.line.text().strip()
        if not text and self.optional:
            value, problem = None, ""
        else:
            value, problem = self._read(text)
        if problem:
            self.set_problem(f"{problem} {self._former()}")
            return
        former = self._value
        self.set_value(value)
        if value != former:
            self.committed.emit(value)

    def _former(self) -> str:
        if self._value is None:
            return "Nothing is changed."
        return f"It stays at {self._written(self._value)}."

    def _written(self, value: Any) -> str:
        return "" if value is None else str(value)

    def _read(self, text: str) -> tuple[Any, str]:
        """The value of an entry, or what is wrong with it."""
        raise NotImplementedError


class NumberField(_Entry):
    """A number.

    Parameters
    ----------
    label : str
    unit : str
    percent : bool
        The value is a fraction, shown and entered in percent.
    low, high : float, optional
        What is outside of them is not taken.
    sensible : tuple of float, optional
        The range stated in the hint; what is outside of it is taken with a remark. The limits otherwise.
    hint : str
        What the field means, in one sentence.
    optional : bool
        It may be empty: None.
    """

    def __init__(
        self,
        label: str,
        *,
        unit: str = "",
        percent: bool = False,
        low: float | None = None,
        high: float | None = None,
        sensible: tuple[float, float] | None = None,
        hint: str = "",
        optional: bool = False,
    ) -> None:
        self.percent = percent
        self.low, self.high, self.sensible = low, high, sensible
        super().__init__(label, unit=unit or ("%" if percent else ""), optional=optional)
        self._unit = unit or ("%" if percent else "")
        self.line.setAlignment(Qt.AlignmentFlag.AlignRight)
        self.set_hint(f"{hint} {self._range_text()}".strip())

    @property
    def value(self) -> float | None:
        """The value entered last that was taken."""
        return None if self._value is None else float(self._value)

    def set_value(self, value: Any) -> None:
        """Show `value`, without telling anyone."""
        super().set_value(value)
        if value is not None and self.sensible and not self.sensible[0] <= value <= self.sensible[1]:
            keep_look(self._problem, "mild")
            self.set_problem("This is outside the usual range.")
            self.editor.setProperty("fault", False)

    def _range_text(self) -> str:
        low, high = self.sensible or (self.low, self.high)
        unit = f" {self._unit}" if self._unit else ""
        first = "Usual" if self.sensible else "Allowed"
        if low is not None and high is not None:
            return f"{first}: {self._written(low)} to {self._written(high)}{unit}."
        if low is not None:
            return f"{first}: at least {self._written(low)}{unit}."
        if high is not None:
            return f"{first}: at most {self._written(high)}{unit}."
        return ""

    def _written(self, value: Any) -> str:
        if value is None:
            return ""
        return numbers.exact(value, percent=self.percent).replace("-", numbers.MINUS, 1)

    def _parsed(self, text: str) -> float | None:
        return numbers.parse_rate(text) if self.percent else numbers.parse_number(text)

    def _read(self, text: str) -> tuple[Any, str]:
        keep_look(self._problem, "grave")
        value = self._parsed(text)
        if value is None:
            return None, f"“{text}” is not {self._what()}." if text else f"Enter {self._what()}."
        if self.low is not None and value < self.low:
            return None, f"It must be at least {self._written(self.low)}."
        if self.high is not None and value > self.high:
            return None, f"It must be at most {self._written(self.high)}."
        return value, ""

    def _what(self) -> str:
        return "a number"


class IntegerField(NumberField):
    """A whole number."""

    def _written(self, value: Any) -> str:
        return "" if value is None else numbers.integer(value)

    def _parsed(self, text: str) -> float | None:
        value = numbers.parse_number(text)
        return int(value) if value is not None and value == int(value) else None

    def _what(self) -> str:
        return "a whole number"


class TextField(_Entry):
    """A line of text."""

    def __init__(
        self, label: str, *, hint: str = "", most: int = 200, check: Callable[[str], str] | None = None
    ) -> None:
        """`check` returns what is wrong with a text, or nothing."""
        super().__init__(label, hint=hint)
        self.line.setMaxLength(most)
        self._check = check

    @property
    def value(self) -> str:
        """The text entered last that was taken."""
        return self._value or ""

    def _read(self, text: str) -> tuple[Any, str]:
        return text, self._check(text) if self._check else ""


class DateField(_Entry):
    """A date, in the short form of the locale or as year-month-day."""

    def __init__(self, label: str, *, hint: str = "") -> None:
        example = numbers.day(date(2031, 3, 31))
        super().__init__(label, hint=f"{hint} Written as {example} or 2031-03-31.".strip())

    @property
    def value(self) -> date | None:
        """The date entered last that was taken."""
        return self._value if isinstance(self._value, date) else None

    def _written(self, value: Any) -> str:
        return "" if value is None else numbers.day(value)

    def _read(self, text: str) -> tuple[Any, str]:
        value = numbers.parse_day(text)
        return value, "" if value is not None else f"“{text}” is not a date."


@dataclass(frozen=True)
class Choice:
    """One of the values of a choice, its name and what choosing it means, in one sentence."""

    value: Any
    text: str
    explanation: str = ""


class ChoiceField(Field):
    """One of a few values; what the chosen one means stands beneath."""

    def __init__(self, label: str, choices: Sequence[Choice], *, hint: str = "") -> None:
        self.combo = Combo()
        super().__init__(label, self.combo)
        self._general = hint
        self._value: Any = None
        self._choices: tuple[Choice, ...] = ()
        self.set_choices(choices)
        self.combo.activated.connect(self._on_activated)

    def set_choices(self, choices: Sequence[Choice]) -> None:
        """Offer other values; the first that is there is shown."""
        self._choices = tuple(choices)
        self.combo.clear()
        for choice in self._choices:
            self.combo.addItem(choice.text)
        self.set_value(self._choices[0].value if self._choices else None)

    @property
    def value(self) -> Any:
        """The value chosen."""
        return self._value

    def set_value(self, value: Any) -> None:
        """Show `value`, without telling anyone.

        Raises
        ------
        ValueError
            If it is not among the choices.
        """
        place = next((place for place, one in enumerate(self._choices) if one.value == value), -1)
        if place < 0 and value is not None:
            raise ValueError(f"`value` must be one of the choices, not {value!r}")
        self._value = value
        self.combo.setCurrentIndex(place)
        explanation = self._choices[place].explanation if place >= 0 else ""
        self.set_hint(f"{self._general} {explanation}".strip())

    def _on_activated(self, place: int) -> None:
        former = self._value
        self.set_value(self._choices[place].value)
        if self._value != former:
            self.committed.emit(self._value)


class Form(QWidget):
    """Fields under one another, with headings between."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._column = QVBoxLayout(self)
        self._column.setContentsMargins(WIDE, GAP, WIDE, WIDE)
        self._column.setSpacing(WIDE - HALF)
        self._column.addStretch(1)

    def _add(self, widget: QWidget) -> None:
        self._column.insertWidget(self._column.count() - 1, widget)

    def add(self, field: Field) -> None:
        """Add a field."""
        self._add(field)

    def add_heading(self, text: str) -> QLabel:
        """Add a heading for the fields that follow."""
        heading = QLabel(text)
        keep_look(heading, "strong")
        self._add(heading)
        return heading

    def add_note(self, text: str) -> QLabel:
        """Add a remark."""
        note = QLabel(text)
        note.setWordWrap(True)
        note.setFont(soft_font(self.font()))
        keep_look(note, "soft")
        self._add(note)
        return note

    def add_button(self, text: str, act: Callable[[], object], *, first: bool = False) -> QPushButton:
        """Add a button; `first` for the one thing to do here."""
        button = QPushButton(text)
        if first:
            keep_look(button, "first")
        button.clicked.connect(lambda _=False: act())
        self._add(button)
        return button

    def add_widget(self, widget: QWidget) -> None:
        """Add anything else."""
        self._add(widget)
