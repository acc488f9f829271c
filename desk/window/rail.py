"""The rail: the stations of the work, in their order, down the left side of the window."""

from __future__ import annotations

from PySide6.QtCore import QEvent, QRect, QRectF, QSize, Qt, Signal
from PySide6.QtGui import QEnterEvent, QFontMetrics, QKeyEvent, QPainter, QPaintEvent, QPen
from PySide6.QtWidgets import QAbstractButton, QButtonGroup, QSizePolicy, QVBoxLayout, QWidget

from desk.window.parts.icons import paint_icon
from desk.window.parts.theme import GAP, HALF, STEP, WIDE, Theme, ThemeSwitch, mixed, soft_font, strong_font

__all__ = ["Rail", "RailButton"]

_ICON = 20
_WIDTH = 176


class RailButton(QAbstractButton):
    """One station on the rail: its sign, its name, its key, and a short note on it.

    Attributes
    ----------
    key : str
        Of the station.
    """

    def __init__(self, key: str, title: str, number: int, purpose: str, theme_switch: ThemeSwitch) -> None:
        super().__init__()
        self.key = key
        self._number = number
        self._note = ""
        self._note_role = "ink_soft"
        self._is_under_pointer = False
        self._theme_switch = theme_switch
        self.setText(title)
        self.setCheckable(True)
        self.setToolTip(f"{purpose} (Alt+{number})")
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setSizePolicy(QSizePolicy.Policy.Fixed, QSizePolicy.Policy.Fixed)
        self._name_itself()

    @property
    def note(self) -> str:
        """A few words on the state of the station."""
        return self._note

    def set_note(self, note: str, role: str = "ink_soft") -> None:
        """Show a few words under the name, in the colour of a role of the theme."""
        if (note, role) != (self._note, self._note_role):
            self._note, self._note_role = note, role
            self._name_itself()
            self.update()

    def _name_itself(self) -> None:
        self.setAccessibleName(f"{self.text()}: {self._note}" if self._note else self.text())
        self.setAccessibleDescription(self.toolTip())

    def sizeHint(self) -> QSize:
        """Two lines of text high."""
        name = QFontMetrics(strong_font(self.font())).height()
        note = QFontMetrics(soft_font(self.font())).height()
        return QSize(_WIDTH, name + note + 2 * GAP)

    def paintEvent(self, _event: QPaintEvent) -> None:
        """Draw it; what is chosen has a bar at its edge and heavier letters, not a colour alone."""
        theme = self._theme_switch.theme
        painter = QPainter(self)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        rect = self.rect()
        chosen = self.isChecked()
        if chosen:
            painter.fillRect(rect, theme.ground)
            painter.fillRect(QRect(0, 0, STEP, rect.height()), theme.accent)
        elif self._is_under_pointer:
            painter.fillRect(rect, mixed(theme.raised, theme.ground, 0.5))
        ink = theme.ink if chosen else theme.ink_soft
        left = STEP + GAP + HALF
        top = (rect.height() - _ICON) / 2
        paint_icon(painter, self.key, QRectF(left, top, _ICON, _ICON), theme.accent if chosen else ink)
        self._paint_words(painter, theme, QRect(left + _ICON + GAP + HALF, 0, 0, 0), chosen)
        if self.hasFocus():
            painter.setPen(QPen(theme.focus, 1))
            painter.setBrush(Qt.BrushStyle.NoBrush)
            painter.drawRect(QRectF(rect).adjusted(STEP + 2.5, 2.5, -3.5, -3.5))
        painter.end()

    def _paint_words(self, painter: QPainter, theme: Theme, place: QRect, chosen: bool) -> None:
        name_font = strong_font(self.font()) if chosen else self.font()
        soft = soft_font(self.font())
        name_height = QFontMetrics(name_font).height()
        note_height = QFontMetrics(soft).height() if self._note else 0
        top = (self.height() - name_height - note_height) // 2
        right = self.width() - GAP - HALF
        hint = f"Alt+{self._number}"
        hint_width = QFontMetrics(soft).horizontalAdvance(hint)
        name = QRect(place.left(), top, right - hint_width - HALF - place.left(), name_height)
        painter.setFont(name_font)
        painter.setPen(theme.ink)
        painter.drawText(name, int(Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter), self.text())
        painter.setFont(soft)
        painter.setPen(theme.ink_soft)
        place_of_hint = QRect(right - hint_width, top, hint_width, name_height)
        painter.drawText(
            place_of_hint, int(Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter), hint
        )
        if self._note:
            note = QRect(place.left(), top + name_height, right - place.left(), note_height)
            painter.setPen(theme.text(self._note_role))
            shown = QFontMetrics(soft).elidedText(self._note, Qt.TextElideMode.ElideRight, note.width())
            painter.drawText(note, int(Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter), shown)

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
        """Return chooses, as the space bar does."""
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter):
            self.click()
            return
        super().keyPressEvent(event)


class Rail(QWidget):
    """The stations; exactly one is chosen once a book is open, none on the welcome.

    Signals
    -------
    chosen(str)
        The reader asked for the station of this key.
    """

    chosen = Signal(str)

    def __init__(self, theme_switch: ThemeSwitch, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._theme_switch = theme_switch
        self._buttons: dict[str, RailButton] = {}
        self._group = QButtonGroup(self)
        self._rows = QVBoxLayout(self)
        self._rows.setContentsMargins(0, WIDE, 0, WIDE)
        self._rows.setSpacing(0)
        self._rows.addStretch(1)
        self.setFixedWidth(_WIDTH)
        self.setAccessibleName("Stations")
        self._group.buttonClicked.connect(self._on_clicked)
        theme_switch.changed.connect(lambda _: self.update())

    @property
    def buttons(self) -> tuple[RailButton, ...]:
        """From the top."""
        return tuple(self._buttons.values())

    def add(self, key: str, title: str, number: int, purpose: str) -> None:
        """Put a station under those there are."""
        button = RailButton(key, title, number, purpose, self._theme_switch)
        self._buttons[key] = button
        self._group.addButton(button)
        self._rows.insertWidget(self._rows.count() - 1, button)

    def button(self, key: str) -> RailButton:
        """The button of a station."""
        return self._buttons[key]

    def show_chosen(self, key: str) -> None:
        """Mark a station as the one that is shown; an empty key marks none."""
        if key:
            self._buttons[key].setChecked(True)
        else:
            self._group.setExclusive(False)
            for button in self._buttons.values():
                button.setChecked(False)
            self._group.setExclusive(True)

    def take_focus(self) -> None:
        """Give the keyboard to the chosen station's button."""
        checked = self._group.checkedButton()
        buttons = self.buttons
        target = checked or (buttons[0] if buttons else None)
        if target is not None:
            target.setFocus(Qt.FocusReason.ShortcutFocusReason)

    def _on_clicked(self, button: QAbstractButton) -> None:
        if isinstance(button, RailButton):
            self.chosen.emit(button.key)

    def paintEvent(self, _event: QPaintEvent) -> None:
        """Its ground, and the line to the rest."""
        theme = self._theme_switch.theme
        painter = QPainter(self)
        painter.fillRect(self.rect(), theme.raised)
        painter.setPen(theme.hairline)
        painter.drawLine(self.width() - 1, 0, self.width() - 1, self.height())
        painter.end()
