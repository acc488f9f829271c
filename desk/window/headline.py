"""The headline: the key figures of the open book, always in view."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from PySide6.QtCore import QEvent, QRect, QSize, Qt, Signal
from PySide6.QtGui import QEnterEvent, QFont, QFontMetrics, QKeyEvent, QPainter, QPaintEvent, QPen
from PySide6.QtWidgets import QAbstractButton, QHBoxLayout, QSizePolicy, QVBoxLayout, QWidget

from desk.valuation.records import Standing
from desk.window.document import Document
from desk.window.parts import numbers
from desk.window.parts.labels import ElidedLabel
from desk.window.parts.numbers import Scale
from desk.window.parts.theme import GAP, HALF, WIDE, Theme, ThemeSwitch, keep_look, mixed, soft_font, tabular

__all__ = ["Figure", "FigureButton", "Headline", "figures_of"]

_UNKNOWN = "n/a"


@dataclass(frozen=True)
class Figure:
    """One key figure as it is shown.

    Attributes
    ----------
    key : str
        Names it, and the rows that make it up.
    label, value, unit : str
    note : str
        What it means, in a few words.
    series : str
        Role of its mark in the theme; empty for none.
    """

    key: str
    label: str
    value: str
    unit: str
    note: str
    series: str = ""


def _shared_scale(values: Sequence[float]) -> tuple[Scale, int]:
    """A scale and decimals in which amounts of several sizes can be added up by eye."""
    largest = max((abs(value) for value in values if math.isfinite(value)), default=0.0)
    scale = numbers.scale_for(largest)
    if largest < 10 * scale.factor:
        scale = numbers.scale_for(largest / 10)
    return scale, 1 if largest >= 1_000 * scale.factor else 2


def _money(value: float, currency: str, scale: Scale, digits: int) -> tuple[str, str]:
    if not math.isfinite(value):
        return _UNKNOWN, currency
    scaled = numbers.money_scaled(value, currency, scale=scale, digits=digits)
    return scaled.text, scaled.unit


def _counted(count: int, one: str, more: str) -> str:
    return f"{numbers.integer(count)} {one if count == 1 else more}"


def _sign_note(value: float, below: str, none: str, above: str) -> str:
    if not math.isfinite(value):
        return "not defined here"
    return below if value < 0 else above if value > 0 else none


def figures_of(standing: Standing | None, currency: str = "") -> tuple[Figure, ...]:
    """The six key figures of a standing; without one, what they will be.

    Parameters
    ----------
    standing : Standing or None
    currency : str, optional
        Of the book, where there is no standing yet.
    """
    if standing is None:
        units = (currency, currency, currency, "", "years", currency)
        keys = ("assets", "liabilities", "surplus", "funding_ratio", "duration_gap", "dv01_gap")
        labels = ("Assets", "Liabilities", "Surplus", "Funding ratio", "Duration gap", "DV01 gap")
        marks = ("assets", "liabilities", "surplus", "", "", "")
        return tuple(
            Figure(key, label, numbers.NOT_AVAILABLE, unit, "", mark)
            for key, label, unit, mark in zip(keys, labels, units, marks, strict=True)
        )
    currency = standing.currency
    lines = {
        side: sum(line.side.value == side for line in standing.lines) for side in ("assets", "liabilities")
    }
    sides = (standing.assets.present_value, standing.liabilities.present_value)
    scale, digits = _shared_scale(sides)
    assets, asset_unit = _money(sides[0], currency, scale, digits)
    owed, owed_unit = _money(sides[1], currency, scale, digits)
    surplus, surplus_unit = _money(standing.surplus, currency, scale, digits)
    dv01, dv01_unit = _money(standing.dv01_gap, currency, numbers.scale_for(standing.dv01_gap), 2)
    ratio = standing.funding_ratio
    gap = standing.duration_gap
    return (
        Figure("assets", "Assets", assets, asset_unit, _counted(lines["assets"], "line", "lines"), "assets"),
        Figure(
            "liabilities",
            "Liabilities",
            owed,
            owed_unit,
            _counted(lines["liabilities"], "line", "lines"),
            "liabilities",
        ),
        Figure(
            "surplus",
            "Surplus",
            surplus,
            surplus_unit,
            _sign_note(standing.surplus, "in deficit", "in balance", "in surplus"),
            "surplus",
        ),
        Figure(
            "funding_ratio",
            "Funding ratio",
            numbers.number(100 * ratio, 1) if math.isfinite(ratio) else _UNKNOWN,
            "%",
            "of liabilities" if math.isfinite(ratio) else "no liabilities",
        ),
        Figure(
            "duration_gap",
            "Duration gap",
            numbers.years(gap) if math.isfinite(gap) else _UNKNOWN,
            "years",
            _sign_note(gap, "assets shorter", "matched", "assets longer"),
        ),
        Figure(
            "dv01_gap",
            "DV01 gap",
            dv01,
            f"{dv01_unit} a bp",
            _sign_note(
                standing.dv01_gap,
                "gains when rates rise",
                "unmoved by rates",
                "loses when rates rise",
            ),
        ),
    )


class FigureButton(QAbstractButton):
    """One key figure; pressing it opens the rows that make it up."""

    def __init__(self, figure: Figure, theme_switch: ThemeSwitch) -> None:
        super().__init__()
        self._theme_switch = theme_switch
        self._figure = figure
        self._state = ""
        self._is_under_pointer = False
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self.show_figure(figure, "")

    @property
    def figure(self) -> Figure:
        """What is shown."""
        return self._figure

    @property
    def note(self) -> str:
        """The line under the figure: the state where there is one to tell, what it means otherwise."""
        return self._state or self._figure.note

    def show_figure(self, figure: Figure, state: str) -> None:
        """Show a figure; `state` says in words why it is not to be relied on, if it is not."""
        self._figure, self._state = figure, state
        self.setText(figure.label)
        value = "not available" if figure.value in (numbers.NOT_AVAILABLE, _UNKNOWN) else figure.value
        told = f"{figure.label}: {value} {figure.unit}".strip()
        self.setAccessibleName(f"{told}, {self.note}" if self.note else told)
        self.setAccessibleDescription("Opens the rows that make it up.")
        self.setToolTip(f"{told}\nOpens the rows that make it up.")
        self.updateGeometry()
        self.update()

    def _fonts(self) -> tuple[QFont, QFont]:
        value = tabular(self.font())
        value.setPointSizeF(self.font().pointSizeF() * 1.45)
        value.setWeight(QFont.Weight.DemiBold)
        return soft_font(self.font()), value

    def sizeHint(self) -> QSize:
        """Three lines of text high."""
        soft, value = (QFontMetrics(font) for font in self._fonts())
        figure = self._figure
        wide = max(
            soft.horizontalAdvance(figure.label) + 12,
            value.horizontalAdvance(figure.value) + HALF + soft.horizontalAdvance(figure.unit),
            soft.horizontalAdvance(self.note),
        )
        return QSize(wide + 2 * GAP, 2 * soft.height() + value.height() + 2 * GAP)

    def minimumSizeHint(self) -> QSize:
        """Figure and unit are never cut; label and note may be."""
        soft, value = (QFontMetrics(font) for font in self._fonts())
        figure = self._figure
        wide = value.horizontalAdvance(figure.value) + HALF + soft.horizontalAdvance(figure.unit)
        return QSize(wide + 2 * GAP, self.sizeHint().height())

    def paintEvent(self, _event: QPaintEvent) -> None:
        """Label, figure with its unit, and the note."""
        theme = self._theme_switch.theme
        painter = QPainter(self)
        if self._is_under_pointer or self.isDown():
            painter.fillRect(self.rect(), mixed(theme.ground, theme.raised, 0.8))
        soft, value_font = self._fonts()
        soft_metrics, value_metrics = QFontMetrics(soft), QFontMetrics(value_font)
        left, top, wide = GAP, GAP, self.width() - 2 * GAP
        flat = int(Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter)
        painter.setFont(soft)
        painter.setPen(theme.ink_soft)
        indent = 0
        if self._figure.series:
            painter.fillRect(
                QRect(left, top + soft_metrics.height() // 2 - 4, 8, 8), theme.line(self._figure.series)
            )
            indent = 12
        label = QRect(left + indent, top, wide - indent, soft_metrics.height())
        painter.drawText(label, flat, soft_metrics.elidedText(self.text(), _RIGHT, label.width()))
        top += soft_metrics.height()
        painter.setFont(value_font)
        painter.setPen(theme.ink_soft if self._state else theme.ink)
        painter.drawText(QRect(left, top, wide, value_metrics.height()), flat, self._figure.value)
        shift = value_metrics.horizontalAdvance(self._figure.value) + HALF
        painter.setFont(soft)
        painter.setPen(theme.ink_soft)
        base = top + value_metrics.ascent()
        painter.drawText(left + shift, base, self._figure.unit)
        top += value_metrics.height()
        self._paint_note(painter, theme, QRect(left, top, wide, soft_metrics.height()), soft_metrics)
        if self.hasFocus():
            painter.setPen(QPen(theme.focus, 1))
            painter.drawRect(self.rect().adjusted(2, 2, -3, -3))
        painter.end()

    def _paint_note(self, painter: QPainter, theme: Theme, place: QRect, metrics: QFontMetrics) -> None:
        painter.setPen(theme.text("mild") if self._state else theme.ink_soft)
        flat = int(Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter)
        painter.drawText(place, flat, metrics.elidedText(self.note, _RIGHT, place.width()))

    def enterEvent(self, event: QEnterEvent) -> None:
        """The pointer came."""
        self._is_under_pointer = True
        self.update()
        super().enterEvent(event)

    def leaveEvent(self, event: QEvent) -> None:
        """The pointer left."""
        self._is_under_pointer = False
        self.update()
        super().leaveEvent(event)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Return opens, as the space bar does."""
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter):
            self.click()
            return
        super().keyPressEvent(event)


_RIGHT = Qt.TextElideMode.ElideRight


def _label(look: str, *, lines: int = 1) -> ElidedLabel:
    label = ElidedLabel(lines=lines)
    label.setMinimumWidth(96)
    keep_look(label, look)
    return label


class Headline(QWidget):
    """What book this is, and its six key figures.

    Signals
    -------
    opened(str)
        The reader asked for the rows of the figure of this key.
    """

    opened = Signal(str)

    def __init__(self, document: Document, theme_switch: ThemeSwitch, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._document = document
        self._theme_switch = theme_switch
        self.setAccessibleName("Headline")
        self._title = _label("strong", lines=2)
        self._place = _label("soft")
        self._state = _label("soft")
        book = QVBoxLayout()
        book.setSpacing(0)
        for label in (self._title, self._place, self._state):
            book.addWidget(label)
        row = QHBoxLayout(self)
        row.setContentsMargins(WIDE, HALF, GAP, HALF)
        row.setSpacing(0)
        row.addLayout(book, 5)
        row.addSpacing(GAP)
        self._buttons: dict[str, FigureButton] = {}
        for figure in figures_of(None):
            button = FigureButton(figure, theme_switch)
            button.clicked.connect(lambda _=False, key=figure.key: self.opened.emit(key))
            self._buttons[figure.key] = button
            row.addWidget(button, 3)
        for signal in (document.book_changed, document.standing_changed, document.history_changed):
            signal.connect(self.refresh)
        theme_switch.changed.connect(lambda _: self.update())
        self.refresh()

    @property
    def buttons(self) -> tuple[FigureButton, ...]:
        """From the left."""
        return tuple(self._buttons.values())

    @property
    def state(self) -> str:
        """What there is to say of all the figures; empty where they are those of the book."""
        document = self._document
        if document.book is None:
            return ""
        if document.standing_failure:
            return "could not be valued"
        if document.standing is None:
            return "being valued"
        return "out of date" if document.standing_is_stale else ""

    def refresh(self) -> None:
        """Show the document as it is."""
        document = self._document
        book = document.book
        state = self.state
        if book is None:
            self._title.set_text("No book is open")
            self._place.set_text("")
        else:
            name = document.path.name if document.path else ""
            self._title.set_text(book.basis.title or name)
            at = numbers.day(book.basis.valuation_date)
            self._place.set_text(f"at {at}, in {book.basis.currency}")
        told = {
            "could not be valued": f"Could not be valued: {document.standing_failure}",
            "being valued": "Being valued…",
            "out of date": "Out of date: being valued again…" if document.is_valuing else "Out of date",
        }.get(state, "Figures are up to date" if book is not None else "")
        self._state.set_text(told)
        keep_look(self._state, "grave" if document.standing_failure else "mild" if state else "soft")
        self._state.style().unpolish(self._state)
        self._state.style().polish(self._state)
        currency = book.basis.currency if book is not None else ""
        for figure in figures_of(document.standing, currency):
            self._buttons[figure.key].show_figure(figure, state)
            self._buttons[figure.key].setEnabled(book is not None)

    def take_focus(self) -> None:
        """Give the keyboard to the first figure."""
        self.buttons[0].setFocus(Qt.FocusReason.ShortcutFocusReason)

    def paintEvent(self, _event: QPaintEvent) -> None:
        """The line below, and those between the figures."""
        theme = self._theme_switch.theme
        painter = QPainter(self)
        painter.fillRect(self.rect(), theme.ground)
        painter.setPen(theme.hairline)
        painter.drawLine(0, self.height() - 1, self.width(), self.height() - 1)
        for button in self.buttons:
            x = button.x() - 1
            painter.drawLine(x, 2 * GAP, x, self.height() - 2 * GAP)
        painter.end()
