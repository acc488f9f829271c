"""The station Shocks: what happens to both sides when markets move, and which move breaks the fund."""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtCore import Qt, QTimer
from PySide6.QtGui import QKeyEvent, QKeySequence, QShortcut
from PySide6.QtWidgets import QHBoxLayout, QLabel, QStackedWidget, QTabBar, QVBoxLayout, QWidget

from desk.book import Shock
from desk.window.document import Document
from desk.window.jobs import Jobs
from desk.window.parts.theme import GAP, HALF, WIDE, ThemeSwitch
from desk.window.shocks.grid_mode import GridMode
from desk.window.shocks.mode import Mode
from desk.window.shocks.modes import MODES
from desk.window.station import Station

__all__ = ["ShocksStation"]


class ShocksStation(Station):
    """Shocks prescribed, own, live and in reverse.

    Attributes
    ----------
    tabs : QTabBar
        The modes.
    selected : Shock or None
        The shock whose moves are shown.
    """

    key = "shocks"
    title = "Shocks"
    purpose = "What happens to both sides when markets move"

    def __init__(
        self, document: Document, jobs: Jobs, theme_switch: ThemeSwitch, parent: QWidget | None = None
    ) -> None:
        super().__init__(document, jobs, theme_switch, parent)
        self.selected: Shock | None = None
        self._refusal = ""
        self._modes: dict[str, Mode] = {}
        self._shown = ""
        self.tabs = QTabBar()
        self.tabs.setDrawBase(False)
        self.tabs.setExpanding(False)
        self.tabs.setAccessibleName("Parts of the station Shocks")
        for each in MODES:
            place = self.tabs.addTab(each.title)
            self.tabs.setTabToolTip(place, each.purpose)
        self.words = QLabel()
        self.words.setWordWrap(True)
        self.words.setTextFormat(Qt.TextFormat.PlainText)
        self.words.setAccessibleName("What the shocks say")
        self.words.setContentsMargins(WIDE, 0, WIDE, HALF)
        self._bar = QWidget()
        self._row = QHBoxLayout(self._bar)
        self._row.setContentsMargins(GAP, 0, WIDE, HALF)
        self._row.addWidget(self.tabs)
        self._row.addStretch(1)
        column = self.layout()
        if isinstance(column, QVBoxLayout):
            column.insertWidget(1, self._bar)
            column.insertWidget(2, self.words)
        self._last_stop: QWidget = self.tabs
        self._tables = QStackedWidget()
        self.set_pictures()
        self.set_table(self._tables, share=44)
        self.set_form_visible()
        self.tabs.currentChanged.connect(lambda place: self.show_mode(MODES[place].key))
        document.what_if.changed.connect(self._on_what_if)
        for key, step in (("Ctrl+Tab", 1), ("Ctrl+Shift+Tab", -1)):
            shortcut = QShortcut(QKeySequence(key), self)
            shortcut.setContext(Qt.ShortcutContext.WidgetWithChildrenShortcut)
            shortcut.activated.connect(lambda step=step: self._step(step))

    # Modes

    @property
    def mode(self) -> Mode | None:
        """The mode that is shown."""
        return self._modes.get(self._shown)

    def mode_of(self, key: str) -> Mode:
        """A mode, made where it is not there yet.

        Raises
        ------
        ValueError
            If there is none of this key.
        """
        if key not in self._modes:
            made = next((each for each in MODES if each.key == key), None)
            if made is None:
                raise ValueError(f"`key` must be one of {', '.join(each.key for each in MODES)}, not {key}")
            mode = made(self)
            self._modes[key] = mode
            for picture in mode.pictures:
                picture.hide()
                self.pictures.addWidget(picture)
            self._tables.addWidget(mode.table)
            mode.form.hide()
            self.form.add_widget(mode.form)
            for control in mode.controls:
                control.hide()
                self._row.addWidget(control)
            self._put_in_order(mode)
        return self._modes[key]

    def _put_in_order(self, mode: Mode) -> None:
        """The keyboard comes to a mode made late where the others are, and not after the foot."""
        window = self.window()
        chain = [window]
        while (following := chain[-1].nextInFocusChain()) is not None and following is not window:
            chain.append(following)
        for part in (*mode.controls, *mode.pictures, mode.table, mode.form):
            for widget in chain:
                inside = part is widget or part.isAncestorOf(widget)
                takes = bool(widget.focusPolicy() & Qt.FocusPolicy.TabFocus) and widget.focusProxy() is None
                if inside and takes:
                    QWidget.setTabOrder(self._last_stop, widget)
                    self._last_stop = widget

    def show_mode(self, key: str) -> None:
        """Show a mode.

        Raises
        ------
        ValueError
            If there is none of this key.
        """
        if self.document.book is None:
            return
        mode = self.mode_of(key)
        former = self.mode
        place = next(place for place, each in enumerate(MODES) if each.key == key)
        if self.tabs.currentIndex() != place:
            self.tabs.setCurrentIndex(place)
            return
        if former is not mode:
            if former is not None:
                former.leave()
                for part in (former.form, *former.pictures, *former.controls):
                    part.hide()
            self._shown = key
            self._tables.setCurrentWidget(mode.table)
            for part in (mode.form, *mode.pictures, *mode.controls):
                part.show()
            self.main.setSizes([10 * (100 - mode.share), 10 * mode.share])
            # What was hidden has no width yet.
            QTimer.singleShot(0, self, self.share_pictures)
        self._show()

    def share_pictures(self) -> None:
        """Equal shares for the pictures that are seen, unless the reader chose others."""
        self.pictures.setSizes([self.pictures.width()] * self.pictures.count())

    def refresh_shown(self) -> None:
        """Bring the mode that is shown up to date at once: an edit was made in it."""
        self._show()
        self._say_what_is_stale()

    def _step(self, step: int) -> None:
        count = self.tabs.count()
        self.tabs.setCurrentIndex((self.tabs.currentIndex() + step) % count)

    def open_shock(self, shock: Shock) -> None:
        """Show what a shock moves."""
        self.selected = shock
        self.show_mode("shock")

    def home(self) -> QWidget | None:
        """What matters most in the mode shown."""
        return self.mode.home() if self.mode is not None else None

    def views(self) -> tuple[Callable[[], object], ...]:
        """The worst shock, and two moves together."""
        return (self._show_worst, self._show_grid)

    def _show_worst(self) -> None:
        table = self.document.shocks.result
        if table is not None and table.results:
            worst = min(table.results, key=lambda result: result.change_in_surplus)
            self.open_shock(worst.shock)

    def _show_grid(self) -> None:
        self.show_mode("grid")
        mode = self.mode_of("grid")
        if isinstance(mode, GridMode):
            mode.run()

    # What it says

    def refuse(self, reason: str) -> None:
        """Say why something was not done, where it is seen, until the next edit."""
        self._refusal = reason
        self._say_what_is_stale()

    def accept_edit(self) -> None:
        """An edit goes through: what was refused before is no longer told."""
        self._refusal = ""

    def _close_refusal(self) -> None:
        self._refusal = ""
        self._say_what_is_stale()

    # Showing

    def refresh(self) -> None:
        """Show the shocks of the open book, and say where they are stale."""
        document = self.document
        book = document.book
        if book is None:
            self._show_none(
                "Shocks need a book: promised payments, what is held, and a curve that can be moved.",
                "Open a book",
                lambda: self.step_wanted.emit("open"),
            )
            return
        document.request_shocks()
        if document.shocks.result is None:
            if document.shocks.failure:
                self._show_none(
                    f"The book could not be shocked: {document.shocks.failure}",
                    "Try again",
                    lambda: document.request_shocks(again=True),
                )
            else:
                self._show_none("The book is put under its shocks.")
            return
        self._bar.show()
        self.words.show()
        self.show_content()
        self.show_mode(self._shown or MODES[self.tabs.currentIndex()].key)
        self._say_what_is_stale()

    def _show(self) -> None:
        """Bring the mode that is shown up to date."""
        book, mode = self.document.book, self.mode
        if book is None or mode is None:
            return
        mode.show_book(book)
        self.say(mode.words())

    def say(self, words: str) -> None:
        """Put a sentence over the pictures."""
        self.words.setText(words)
        self.words.setVisible(bool(words))

    def _show_none(self, text: str, button: str = "", act: Callable[[], object] | None = None) -> None:
        for mode in self._modes.values():
            mode.leave()
        self._bar.hide()
        self.words.hide()
        self.hide_stale()
        self.show_empty(text, button, act)

    def _say_what_is_stale(self) -> None:
        document = self.document
        shocks = document.shocks
        if self._refusal:
            self.show_stale("Close", self._close_refusal, text=self._refusal)
        elif shocks.failure:
            self.show_stale(
                "Try again",
                lambda: document.request_shocks(again=True),
                text="These figures are from before your last change: the book as it stands could not be "
                f"shocked. {shocks.failure}",
            )
        elif shocks.is_stale:
            self.show_stale()
        elif shocks.faults:
            more = f" ({len(shocks.faults) - 1} more)" if len(shocks.faults) > 1 else ""
            self.show_stale(
                "See the faults",
                lambda: self.step_wanted.emit("intake"),
                text=f"{shocks.faults[0]}{more}",
            )
        else:
            self.hide_stale()

    def _on_what_if(self) -> None:
        """Follow the hand, where that is shown."""
        if self.isVisible() and self.mode is not None and self.mode.key == "what_if" and not self.is_empty:
            self._show()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Escape takes back what was begun, and after that puts a what-if back."""
        if event.key() == Qt.Key.Key_Escape and self.mode is not None and self.mode.take_back():
            return
        if event.key() == Qt.Key.Key_Escape and self.document.what_if.is_on:
            self.document.what_if.put_back()
            self.message.emit("The what-if is put back.")
            return
        super().keyPressEvent(event)
