"""Where the keyboard goes in the window, and where the window goes on the screens."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

from PySide6.QtCore import QByteArray, QSize, Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtWidgets import QApplication, QWidget

__all__ = ["Pane", "focus_first", "next_pane", "restore_geometry"]

_LEAST_SEEN = 120
"""So much of the window's width must be on a screen to be found there [px]."""


@dataclass(frozen=True)
class Pane:
    """A part of the window that the keyboard goes round.

    Attributes
    ----------
    widget : QWidget
    take_focus : callable
        Gives the keyboard to what matters most in it.
    """

    widget: QWidget
    take_focus: Callable[[], None]

    @property
    def has_focus(self) -> bool:
        """Whether the keyboard is in it."""
        focus = QApplication.focusWidget()
        return focus is not None and (self.widget is focus or self.widget.isAncestorOf(focus))


def next_pane(panes: Sequence[Pane], step: int) -> None:
    """Give the keyboard to the pane that is `step` further, among those that are seen."""
    seen = [pane for pane in panes if pane.widget.isVisible()]
    if not seen:
        return
    outside = -1 if step > 0 else 0
    now = next((place for place, pane in enumerate(seen) if pane.has_focus), outside)
    seen[(now + step) % len(seen)].take_focus()


def focus_first(page: QWidget | None) -> None:
    """Give the keyboard to the first widget of a page, in its tab order, that takes it."""
    if page is None:
        return
    widget = page.nextInFocusChain()
    while widget is not None and widget is not page:
        takes = bool(widget.focusPolicy() & Qt.FocusPolicy.TabFocus)
        if takes and widget.isEnabled() and widget.isVisible() and page.isAncestorOf(widget):
            widget.setFocus(Qt.FocusReason.ShortcutFocusReason)
            return
        widget = widget.nextInFocusChain()


def restore_geometry(window: QWidget, geometry: QByteArray, size: QSize) -> None:
    """Put a window where it was left; in the middle of the first screen where that place is on none.

    Parameters
    ----------
    window : QWidget
    geometry : QByteArray
        As Qt packs it; empty for none.
    size : QSize
        For a window that was never left anywhere.
    """
    window.resize(size)
    restored = not geometry.isEmpty() and window.restoreGeometry(geometry)
    frame = window.frameGeometry()
    parts = [screen.availableGeometry().intersected(frame) for screen in QGuiApplication.screens()]
    if restored and any(part.width() >= _LEAST_SEEN for part in parts):
        return
    screen = QGuiApplication.primaryScreen()
    if screen is not None:
        room = screen.availableGeometry()
        window.resize(size.boundedTo(room.size()))
        place = window.rect()
        place.moveCenter(room.center())
        window.move(place.topLeft())
