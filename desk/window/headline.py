"""The headline: the key figures of the open book, always in view."""

from __future__ import annotations

from PySide6.QtCore import QEvent, QRect, QSize, Qt, Signal
from PySide6.QtGui import QEnterEvent, QFont, QFontMetrics, QKeyEvent, QPainter, QPaintEvent, QPen
from PySide6.QtWidgets import QAbstractButton, QHBoxLayout, QSizePolicy, QVBoxLayout, QWidget

from desk.window.document import Document
from desk.window.figures import UNKNOWN, Figure, figures_of
from desk.window.parts import numbers
from desk.window.parts.labels import ElidedLabel
from desk.window.parts.theme import GAP, HALF, WIDE, Theme, ThemeSwitch, keep_look, mixed, soft_font, tabular

__all__ = ["FigureButton", "Headline"]


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
        """The line under the figure: its state where there is one to tell, its change, or what it means."""
        return self._state or self._figure.change or self._figure.note

    def show_figure(self, figure: Figure, state: str) -> None:
        """Show a figure; `state` says in words why it is not to be relied on, if it is not."""
        self._figure, self._state = figure, state
        self.setText(figure.label)
        value = "not available" if figure.value in (numbers.NOT_AVAILABLE, UNKNOWN) else figure.value
        told = f"{figure.label}: {value} {figure.unit}".strip()
        parts = (state,) if state else (figure.change_in_words, figure.note)
        said = ", ".join((told, *(part for part in parts if part)))
        self.setAccessibleName(said)
        self.setAccessibleDescription("Opens the rows that make it up.")
        tip = f"{told}\n{figure.change_in_words}" if figure.change_in_words and not state else told
        self.setToolTip(f"{tip}\nOpens the rows that make it up.")
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
        plain = theme.text(self._figure.change_role) if self._figure.change else theme.ink_soft
        painter.setPen(theme.text("mild") if self._state else plain)
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
        for signal in (
            document.book_changed,
            document.standing_changed,
            document.history_changed,
            document.what_if.changed,
        ):
            signal.connect(self.refresh)
        theme_switch.changed.connect(self._on_theme)
        self.refresh()

    def _on_theme(self, _theme: Theme) -> None:
        self.update()

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
        }.get(state, self._compared_text() if book is not None else "")
        self._state.set_text(told)
        second_failed = document.is_comparing and document.second_failure and not document.what_if.is_on
        is_mild = bool(state or second_failed)
        keep_look(self._state, "grave" if document.standing_failure else "mild" if is_mild else "soft")
        self._state.style().unpolish(self._state)
        self._state.style().polish(self._state)
        currency = book.basis.currency if book is not None else ""
        compared_with = document.comparison if document.comparison_is_current else None
        frame = document.what_if.frame
        moved = frame.position if frame is not None and not document.standing_is_stale else None
        for figure in figures_of(document.standing, currency, compared_with=compared_with, moved=moved):
            self._buttons[figure.key].show_figure(figure, state)
            self._buttons[figure.key].setEnabled(book is not None)

    def _compared_text(self) -> str:
        """What the figures are, where there is nothing to say against them."""
        document = self._document
        what_if = document.what_if
        if what_if.is_on:
            if what_if.frame is not None:
                return "With the what-if before its last move" if what_if.failure else "With the what-if"
            return "The what-if cannot be shown" if what_if.failure else "The what-if is being made ready…"
        if not document.is_comparing:
            return "Figures are up to date"
        if document.second_failure:
            return f"The second basis could not be valued: {document.second_failure}"
        if document.comparison_is_current:
            return "Against the second basis"
        return "The second basis is being valued…"

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
