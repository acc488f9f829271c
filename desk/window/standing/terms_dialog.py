"""The terms of one line: how its amounts grow, and what it is discounted at."""

from __future__ import annotations

from enum import StrEnum

from PySide6.QtCore import Qt, Signal
from PySide6.QtWidgets import QDialog, QDialogButtonBox, QLabel, QVBoxLayout, QWidget

from desk.book import Indexation, IndexationKind, LineTerms
from desk.window.parts.fields import Choice, ChoiceField, Form, NumberField
from desk.window.parts.theme import GAP, STEP, WIDE, keep_look
from desk.window.standing.line_columns import side_name
from desk.window.standing.line_words import INDEXATIONS, collar_fault

__all__ = ["TermsDialog"]

_WIDTH = 100 * STEP
_NO_INFLATION = (
    "This basis states no expected inflation for the line to follow: put it in a sheet Inflation of the "
    "workbook, or in Curve as expected inflation."
)


class _Discounting(StrEnum):
    """Where the discount rate of the line comes from."""

    BASIS = "basis"
    SPREAD = "spread"
    RATE = "rate"


_DISCOUNTINGS = (
    Choice(_Discounting.BASIS, "As the basis says", "Like the other lines of its side."),
    Choice(
        _Discounting.SPREAD,
        "The curve with a spread of its own",
        "In the place of what the basis adds to the curve; a beta counts on top.",
    ),
    Choice(_Discounting.RATE, "A flat rate of its own", "In the place of curve and spread."),
)


class TermsDialog(QDialog):
    """Asks for the terms of a line, without stopping the event loop.

    Signals
    -------
    chosen(LineTerms)
        Terms that go together were entered and taken.
    """

    chosen = Signal(object)

    def __init__(self, terms: LineTerms, *, has_inflation: bool, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._terms = terms
        self._has_inflation = has_inflation
        self.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        self.setWindowModality(Qt.WindowModality.WindowModal)
        self.setWindowTitle(f"Terms of {terms.line}")
        self.setMinimumWidth(_WIDTH)
        self._make_fields()
        self.fault = QLabel()
        self.fault.setWordWrap(True)
        self.fault.setTextFormat(Qt.TextFormat.PlainText)
        self.fault.setAccessibleName("What is wrong with the terms")
        keep_look(self.fault, "grave")
        self.fault.hide()
        self.buttons = QDialogButtonBox(
            QDialogButtonBox.StandardButton.Ok | QDialogButtonBox.StandardButton.Cancel
        )
        self.buttons.accepted.connect(self.accept)
        self.buttons.rejected.connect(self.reject)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, GAP, 0, WIDE)
        column.setSpacing(0)
        column.addWidget(self.form)
        foot = QVBoxLayout()
        foot.setContentsMargins(WIDE, 0, WIDE, 0)
        foot.setSpacing(GAP)
        foot.addWidget(self.fault)
        foot.addWidget(self.buttons)
        column.addLayout(foot)
        self._fill()

    def _make_fields(self) -> None:
        self.form = form = Form()
        form.add_heading(f"{self._terms.line}, {side_name(self._terms.side).casefold()}")
        self.kind = ChoiceField("Amounts", INDEXATIONS)
        self.rise = NumberField(
            "Rise", unit="% a year", percent=True, low=-0.5, high=1.0, sensible=(0.0, 0.05), hint="Each year."
        )
        self.floor = NumberField(
            "Floor",
            unit="% a year",
            percent=True,
            low=-0.5,
            high=1.0,
            sensible=(0.0, 0.03),
            hint="The least rise of a year; empty for none.",
            optional=True,
        )
        self.cap = NumberField(
            "Cap",
            unit="% a year",
            percent=True,
            low=-0.5,
            high=1.0,
            sensible=(0.02, 0.07),
            hint="The greatest rise of a year; empty for none.",
            optional=True,
        )
        self.discounting = ChoiceField("Discounted at", _DISCOUNTINGS)
        self.spread = NumberField(
            "Spread",
            unit="% a year",
            percent=True,
            low=-0.5,
            high=0.5,
            sensible=(-0.01, 0.05),
            hint="Over the continuous zero rates.",
        )
        self.rate = NumberField(
            "Rate",
            unit="% a year",
            percent=True,
            low=-0.5,
            high=0.5,
            sensible=(0.0, 0.08),
            hint="Annual effective.",
        )
        for field in self._fields():
            form.add(field)
            field.committed.connect(lambda _: self._on_changed())

    def _fields(self) -> tuple[ChoiceField | NumberField, ...]:
        return (self.kind, self.rise, self.floor, self.cap, self.discounting, self.spread, self.rate)

    def _fill(self) -> None:
        terms, indexation = self._terms, self._terms.indexation
        self.kind.set_value(indexation.kind)
        self.rise.set_value(indexation.rise)
        self.floor.set_value(indexation.floor)
        self.cap.set_value(indexation.cap)
        if terms.rate is not None:
            self.discounting.set_value(_Discounting.RATE)
        elif terms.spread is not None:
            self.discounting.set_value(_Discounting.SPREAD)
        else:
            self.discounting.set_value(_Discounting.BASIS)
        self.spread.set_value(0.0 if terms.spread is None else terms.spread)
        self.rate.set_value(0.0 if terms.rate is None else terms.rate)
        self._on_changed()

    def _on_changed(self) -> None:
        kind, discounting = self.kind.value, self.discounting.value
        self.rise.setVisible(kind is IndexationKind.RISING)
        self.floor.setVisible(kind is IndexationKind.COLLARED)
        self.cap.setVisible(kind is IndexationKind.COLLARED)
        self.spread.setVisible(discounting is _Discounting.SPREAD)
        self.rate.setVisible(discounting is _Discounting.RATE)
        self._say(self._wrong())

    def _wrong(self) -> str:
        """What stands in the way of taking the terms; empty where nothing does."""
        kind = self.kind.value
        if kind in (IndexationKind.LINKED, IndexationKind.COLLARED) and not self._has_inflation:
            return _NO_INFLATION
        return collar_fault(self.floor.value, self.cap.value) if kind is IndexationKind.COLLARED else ""

    def _say(self, text: str) -> None:
        self.fault.setText(text)
        self.fault.setVisible(bool(text))
        self.adjustSize()

    @property
    def entered(self) -> LineTerms:
        """The terms as they stand in the fields.

        Raises
        ------
        ValueError
            If they do not go together.
        """
        kind, discounting = self.kind.value, self.discounting.value
        collared = kind is IndexationKind.COLLARED
        indexation = Indexation(
            kind,
            rise=(self.rise.value or 0.0) if kind is IndexationKind.RISING else 0.0,
            floor=self.floor.value if collared else None,
            cap=self.cap.value if collared else None,
        )
        return LineTerms(
            self._terms.side,
            self._terms.line,
            indexation,
            spread=(self.spread.value or 0.0) if discounting is _Discounting.SPREAD else None,
            rate=(self.rate.value or 0.0) if discounting is _Discounting.RATE else None,
        )

    def accept(self) -> None:
        """Take the terms, if they go together and every entry was read."""
        unread = [
            field for field in self._fields() if field.isVisibleTo(self) and field.editor.property("fault")
        ]
        if unread:
            unread[0].setFocus()
            return
        wrong = self._wrong()
        if wrong:
            self._say(wrong)
            return
        self.chosen.emit(self.entered)
        super().accept()
