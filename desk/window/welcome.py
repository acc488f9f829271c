"""What the window shows while no book is open: what the program does, and where to begin."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import partial
from pathlib import Path

from PySide6.QtCore import Qt, Signal
from PySide6.QtGui import QFontMetrics, QKeyEvent, QPainter, QPaintEvent, QPen
from PySide6.QtWidgets import (
    QAbstractButton,
    QGridLayout,
    QHBoxLayout,
    QLabel,
    QPushButton,
    QScrollArea,
    QSizePolicy,
    QVBoxLayout,
    QWidget,
)

from desk.places import demo_books
from desk.window.parts.labels import ElidedLabel
from desk.window.parts.theme import GAP, HALF, STEP, WIDE, ThemeSwitch, keep_look, soft_font, strong_font
from desk.window.recent import RecentBooks

__all__ = ["DEMO_BOOKS", "DemoBook", "DemoCard", "Welcome", "demo_books_there"]

_WIDTH = 880
_RECENT_SHOWN = 6


@dataclass(frozen=True)
class DemoBook:
    """One demo book as the welcome offers it.

    Attributes
    ----------
    file : str
    title : str
    shows : str
        What there is to see in it, in one sentence.
    """

    file: str
    title: str
    shows: str


DEMO_BOOKS = (
    DemoBook(
        "pension_fund.xlsx",
        "A pension fund",
        "Benefits of four groups over 70 years against 45 holdings: funded to 92 %, and assets far shorter "
        "than "
        "what is promised.",
    ),
    DemoBook(
        "life_insurer.xlsx",
        "A life insurer",
        "15,000 flows in twelve product lines against 400 bonds: well funded, but liabilities are longer "
        "than "
        "assets.",
    ),
    DemoBook(
        "small_endowment.xlsx",
        "A small endowment",
        "Promises of a school, bonds and a fund: small enough to follow every figure by hand.",
    ),
)


def demo_books_there(folder: Path | None = None) -> tuple[tuple[DemoBook, Path], ...]:
    """The demo books whose files are there, with their paths.

    Parameters
    ----------
    folder : Path, optional
        By default the one that comes with the program.
    """
    folder = folder or demo_books()
    found = [(book, folder / book.file) for book in DEMO_BOOKS]
    return tuple((book, path) for book, path in found if path.is_file())


class DemoCard(QAbstractButton):
    """A demo book to open."""

    def __init__(self, book: DemoBook, theme_switch: ThemeSwitch) -> None:
        super().__init__()
        self._book = book
        self._theme_switch = theme_switch
        self.setText(book.title)
        self.setAccessibleName(f"Open the demo book: {book.title}")
        self.setAccessibleDescription(book.shows)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self.setAttribute(Qt.WidgetAttribute.WA_Hover)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)
        line = QFontMetrics(self.font()).lineSpacing()
        self.setMinimumHeight(6 * line + 3 * GAP + HALF)

    def paintEvent(self, _event: QPaintEvent) -> None:
        """The title, what it shows, and a line along the top that deepens under the pointer."""
        theme = self._theme_switch.theme
        painter = QPainter(self)
        lit = self.underMouse() or self.hasFocus() or self.isDown()
        painter.fillRect(self.rect(), theme.surface)
        painter.fillRect(0, 0, self.width(), STEP if lit else 1, theme.accent if lit else theme.hairline)
        inner = self.rect().adjusted(WIDE, WIDE, -WIDE, -GAP)
        painter.setFont(strong_font(self.font()))
        painter.setPen(theme.ink)
        painter.drawText(inner, int(Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignTop), self.text())
        inner.setTop(inner.top() + painter.fontMetrics().lineSpacing() + HALF)
        painter.setFont(self.font())
        painter.setPen(theme.ink_soft)
        flags = Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignTop | Qt.TextFlag.TextWordWrap
        painter.drawText(inner, int(flags), self._book.shows)
        if self.hasFocus():
            painter.setPen(QPen(theme.focus, 1))
            painter.setBrush(Qt.BrushStyle.NoBrush)
            painter.drawRect(self.rect().adjusted(0, 0, -1, -1))
        painter.end()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Return opens, as the space bar does."""
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter):
            self.click()
            return
        super().keyPressEvent(event)


class _RecentButton(QAbstractButton):
    """A book opened lately: its name, and softer where it is."""

    def __init__(self, path: Path, theme_switch: ThemeSwitch) -> None:
        super().__init__()
        self._theme_switch = theme_switch
        self._folder = str(path.parent)
        self.setText(path.name)
        self.setToolTip(str(path))
        self.setAccessibleName(f"Open {path.name} in {path.parent}")
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self.setAttribute(Qt.WidgetAttribute.WA_Hover)
        self.setFixedHeight(QFontMetrics(self.font()).height() + GAP)

    def paintEvent(self, _event: QPaintEvent) -> None:
        """One line with a hairline under it."""
        theme = self._theme_switch.theme
        painter = QPainter(self)
        if self.underMouse():
            painter.fillRect(self.rect(), theme.raised)
        painter.setPen(theme.hairline)
        painter.drawLine(0, self.height() - 1, self.width(), self.height() - 1)
        flat = int(Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter)
        name_width = min(painter.fontMetrics().horizontalAdvance(self.text()) + 2, self.width() // 2)
        place = self.rect().adjusted(0, 0, 0, -1)
        painter.setPen(theme.ink)
        name = painter.fontMetrics().elidedText(self.text(), Qt.TextElideMode.ElideMiddle, name_width)
        painter.drawText(place, flat, name)
        painter.setFont(soft_font(self.font()))
        painter.setPen(theme.ink_soft)
        place.setLeft(name_width + WIDE)
        folder = painter.fontMetrics().elidedText(
            self._folder, Qt.TextElideMode.ElideMiddle, max(place.width(), 0)
        )
        painter.drawText(place, flat, folder)
        if self.hasFocus():
            painter.setPen(theme.focus)
            painter.drawRect(self.rect().adjusted(0, 0, -1, -1))
        painter.end()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Return opens, as the space bar does."""
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter):
            self.click()
            return
        super().keyPressEvent(event)


class Welcome(QScrollArea):
    """The page before a book is open.

    Attributes
    ----------
    open_button : QPushButton
    cards : tuple of DemoCard

    Signals
    -------
    open_asked()
        The reader wants to choose a file.
    chosen(Path)
        The reader chose a book.
    """

    open_asked = Signal()
    chosen = Signal(object)

    def __init__(
        self,
        recent: RecentBooks,
        theme_switch: ThemeSwitch,
        parent: QWidget | None = None,
        *,
        demos: Sequence[tuple[DemoBook, Path]] | None = None,
    ) -> None:
        super().__init__(parent)
        self._recent = recent
        self._theme_switch = theme_switch
        self.setWidgetResizable(True)
        self.setAccessibleName("Welcome")
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        column = QWidget()
        column.setMaximumWidth(_WIDTH)
        rows = QVBoxLayout(column)
        rows.setContentsMargins(WIDE, 2 * WIDE, WIDE, WIDE)
        rows.setSpacing(GAP)
        rows.addStretch(3)
        title = QLabel("What is promised, and whether what is held will meet it")
        keep_look(title, "title")
        rows.addWidget(title)
        rows.addWidget(
            _wrapped(
                "Gapwright reads a workbook of promised payments and holdings and says what both are worth "
                "today, "
                "how far apart they are, and how that gap moves with interest rates. It draws thousands of "
                "rate "
                "scenarios to show the chance of a shortfall, and writes every figure into a workbook in "
                "which a "
                "colleague can check it."
            )
        )
        rows.addSpacing(WIDE)
        there = demo_books_there() if demos is None else tuple(demos)
        self.cards = tuple(self._card(book, path) for book, path in there)
        if self.cards:
            rows.addWidget(_heading("Begin with an invented book"))
            grid = QGridLayout()
            grid.setSpacing(WIDE)
            for place, card in enumerate(self.cards):
                grid.addWidget(card, 0, place)
                grid.setColumnStretch(place, 1)
            rows.addLayout(grid)
            rows.addSpacing(WIDE)
        rows.addWidget(_heading("Or with your own" if self.cards else "Begin with your own book"))
        self.open_button = QPushButton("Open a workbook…")
        keep_look(self.open_button, "first")
        self.open_button.setToolTip("Ctrl+O")
        self.open_button.clicked.connect(self.open_asked)
        opening = QHBoxLayout()
        opening.setSpacing(WIDE)
        opening.addWidget(self.open_button)
        hint = QLabel("or drop a file anywhere on this window")
        keep_look(hint, "soft")
        opening.addWidget(hint)
        opening.addStretch(1)
        rows.addLayout(opening)
        rows.addSpacing(WIDE)
        self._recent_heading = _heading("Opened lately")
        rows.addWidget(self._recent_heading)
        self._recent_rows = QVBoxLayout()
        self._recent_rows.setSpacing(0)
        rows.addLayout(self._recent_rows)
        rows.addStretch(4)
        holder = QWidget()
        row = QHBoxLayout(holder)
        row.setContentsMargins(0, 0, 0, 0)
        row.addStretch(1)
        row.addWidget(column, 100)
        row.addStretch(1)
        self.setWidget(holder)
        recent.changed.connect(self._show_recent)
        theme_switch.changed.connect(lambda _: self._repaint())
        self._show_recent()

    def _card(self, book: DemoBook, path: Path) -> DemoCard:
        card = DemoCard(book, self._theme_switch)
        card.clicked.connect(partial(self._choose, path))
        return card

    def _choose(self, path: Path, _checked: bool = False) -> None:
        self.chosen.emit(path)

    @property
    def recent_buttons(self) -> tuple[QAbstractButton, ...]:
        """The books opened lately, from the top."""
        items = [self._recent_rows.itemAt(place) for place in range(self._recent_rows.count())]
        widgets = [item.widget() for item in items if item is not None]
        return tuple(widget for widget in widgets if isinstance(widget, QAbstractButton))

    def _show_recent(self) -> None:
        for button in self.recent_buttons:
            self._recent_rows.removeWidget(button)
            button.deleteLater()
        shown = self._recent.paths[:_RECENT_SHOWN]
        for path in shown:
            button = _RecentButton(path, self._theme_switch)
            button.clicked.connect(partial(self._choose, path))
            self._recent_rows.addWidget(button)
        self._recent_heading.setVisible(bool(shown))

    def _repaint(self) -> None:
        for button in self.findChildren(QAbstractButton):
            button.update()

    def take_focus(self) -> None:
        """Give the keyboard to the first thing to open."""
        first: QWidget = self.cards[0] if self.cards else self.open_button
        first.setFocus(Qt.FocusReason.OtherFocusReason)


def _wrapped(text: str) -> QLabel:
    label = QLabel(text)
    label.setWordWrap(True)
    return label


def _heading(text: str) -> ElidedLabel:
    label = ElidedLabel(text)
    keep_look(label, "strong")
    return label
