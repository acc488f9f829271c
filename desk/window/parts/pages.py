"""Pages one behind the other, with a row of tabs over them."""

from __future__ import annotations

from functools import partial

from PySide6.QtCore import Qt, Signal
from PySide6.QtGui import QKeySequence, QShortcut
from PySide6.QtWidgets import QHBoxLayout, QStackedWidget, QTabBar, QVBoxLayout, QWidget

from desk.window.parts.panes import focus_first
from desk.window.parts.theme import GAP, Theme, ThemeSwitch

__all__ = ["Pages"]


class Pages(QWidget):
    """Pages with tabs; Left and Right in the tabs go from one to the next, and Ctrl+Tab by `take_keys_of`.

    Signals
    -------
    changed(str)
        Another page (its key) is shown.
    """

    changed = Signal(str)

    def __init__(self, theme_switch: ThemeSwitch, *, name: str) -> None:
        super().__init__()
        self.tabs = QTabBar()
        self.tabs.setDrawBase(False)
        self.tabs.setExpanding(False)
        self.tabs.setAccessibleName(name)
        self._stack = QStackedWidget()
        self._keys: list[str] = []
        self._row = QHBoxLayout()
        self._row.setContentsMargins(0, 0, GAP, 0)
        self._row.setSpacing(GAP)
        self._row.addWidget(self.tabs)
        self._row.addStretch(1)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addLayout(self._row)
        column.addWidget(self._stack, 1)
        self.tabs.currentChanged.connect(self._on_changed)
        theme_switch.changed.connect(self._on_theme)
        self._on_theme(theme_switch.theme)

    def add(self, key: str, title: str, page: QWidget) -> None:
        """Add a page at the end."""
        self._keys.append(key)
        self._stack.addWidget(page)
        self.tabs.addTab(title)

    def add_control(self, widget: QWidget) -> None:
        """Put a control at the right of the tabs."""
        self._row.addWidget(widget)

    def set_page_visible(self, key: str, visible: bool) -> None:
        """Offer a page or not; one that was shown and goes gives way to the first."""
        place = self._keys.index(key)
        if not visible and self.tabs.currentIndex() == place:
            self.tabs.setCurrentIndex(0)
        self.tabs.setTabVisible(place, visible)
        # The bar does not see by itself that it needs other room now.
        self.tabs.updateGeometry()

    def has_page(self, key: str) -> bool:
        """Whether a page is offered."""
        return self.tabs.isTabVisible(self._keys.index(key))

    @property
    def current(self) -> str:
        """The key of the page shown; empty where there is none."""
        place = self.tabs.currentIndex()
        return self._keys[place] if 0 <= place < len(self._keys) else ""

    def show_page(self, key: str) -> None:
        """Show the page of this key.

        Raises
        ------
        ValueError
            If there is none.
        """
        self.tabs.setCurrentIndex(self._keys.index(key))

    def take_keys_of(self, station: QWidget) -> None:
        """Let Ctrl+Tab and Ctrl+Shift+Tab anywhere in a station go from page to page."""
        for key, by in (("Ctrl+Tab", 1), ("Ctrl+Shift+Tab", -1)):
            shortcut = QShortcut(QKeySequence(key), station)
            shortcut.setContext(Qt.ShortcutContext.WidgetWithChildrenShortcut)
            shortcut.activated.connect(partial(self.step, by))

    def step(self, by: int) -> None:
        """Show the page that is `by` further among those offered, and give it the keyboard."""
        offered = [place for place in range(self.tabs.count()) if self.tabs.isTabVisible(place)]
        if not offered:
            return
        now = offered.index(self.tabs.currentIndex())
        self.tabs.setCurrentIndex(offered[(now + by) % len(offered)])
        focus_first(self._stack.currentWidget())

    def _on_changed(self, place: int) -> None:
        if 0 <= place < self._stack.count():
            self._stack.setCurrentIndex(place)
            self.changed.emit(self._keys[place])

    def _on_theme(self, theme: Theme) -> None:
        self.tabs.setStyleSheet(
            f"QTabBar::tab {{ background: transparent; color: {theme.ink_soft.name()}; border: none; "
            "border-bottom: 2px solid transparent; padding: 4px 12px; }"
            f"QTabBar::tab:hover {{ color: {theme.ink.name()}; }}"
            f"QTabBar::tab:selected {{ color: {theme.ink.name()}; "
            f"border-bottom: 2px solid {theme.accent.name()}; }}"
            f"QTabBar::tab:focus {{ background: {theme.raised.name()}; }}"
        )
