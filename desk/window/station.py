"""What the stations have in common: heading, main pictures and table, form, and what they say when empty."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence

from PySide6.QtCore import Qt, QTimer, Signal
from PySide6.QtGui import QShowEvent
from PySide6.QtWidgets import (
    QApplication,
    QFrame,
    QHBoxLayout,
    QLabel,
    QPushButton,
    QScrollArea,
    QSplitter,
    QStackedWidget,
    QVBoxLayout,
    QWidget,
)

from desk.window.document import Document
from desk.window.jobs import Jobs
from desk.window.parts.fields import FORM_WIDTH, Form
from desk.window.parts.labels import ElidedLabel
from desk.window.parts.panes import focus_first
from desk.window.parts.theme import GAP, HALF, STEP, WIDE, ThemeSwitch, keep_look

__all__ = ["STALE", "Station"]

_READABLE = 110 * STEP
"""Width of running text [px]."""
STALE = "These figures are from before your last change."


class _Strip(QWidget):
    """A sentence across the station, with a button that mends what it says."""

    def __init__(self) -> None:
        super().__init__()
        keep_look(self, "strip")
        self.setAttribute(Qt.WidgetAttribute.WA_StyledBackground)
        self.text = QLabel()
        self.text.setWordWrap(True)
        self.text.setTextFormat(Qt.TextFormat.PlainText)
        self.button = QPushButton()
        row = QHBoxLayout(self)
        row.setContentsMargins(WIDE, HALF, WIDE, HALF)
        row.addWidget(self.text, 1)
        row.addWidget(self.button)
        self._act: Callable[[], object] | None = None
        self.button.clicked.connect(self._on_clicked)
        self.hide()

    def put(self, text: str, button_text: str, act: Callable[[], object] | None) -> None:
        """Say `text` and offer `act`."""
        self.text.setText(text)
        self.button.setText(button_text)
        self.button.setVisible(bool(button_text) and act is not None)
        self._act = act
        self.show()

    def _on_clicked(self) -> None:
        if self._act is not None:
            self._act()


class _Empty(QWidget):
    """What a station needs before it can show anything, and the step that brings it."""

    def __init__(self) -> None:
        super().__init__()
        self.text = QLabel()
        self.text.setWordWrap(True)
        self.text.setTextFormat(Qt.TextFormat.PlainText)
        self.text.setAlignment(Qt.AlignmentFlag.AlignHCenter)
        self.text.setFixedWidth(_READABLE)
        self.button = QPushButton()
        keep_look(self.button, "first")
        column = QVBoxLayout(self)
        column.setSpacing(WIDE)
        column.addStretch(2)
        # In a row of its own, for a wrapped label that is aligned gets the height of one line.
        row = QHBoxLayout()
        row.addStretch(1)
        row.addWidget(self.text)
        row.addStretch(1)
        column.addLayout(row)
        column.addWidget(self.button, 0, Qt.AlignmentFlag.AlignHCenter)
        column.addStretch(3)
        self._act: Callable[[], object] | None = None
        self.button.clicked.connect(self._on_clicked)

    def put(self, text: str, button_text: str, act: Callable[[], object] | None) -> None:
        """Say what is needed and offer the step."""
        self.text.setText(text)
        self.button.setText(button_text)
        self.button.setVisible(bool(button_text) and act is not None)
        self._act = act

    def _on_clicked(self) -> None:
        if self._act is not None:
            self._act()


class Station(QWidget):
    """One station of the work. Subclasses fill it in their ``__init__`` and in `refresh`.

    Attributes
    ----------
    key, title, purpose : str
        Of the class: a plain name, the heading, and one sentence on what is done here.
    document : Document
    jobs : Jobs
    theme_switch : ThemeSwitch
    form : Form
        In the panel at the right; hidden until `set_form_visible`.

    Signals
    -------
    message(str)
        Something to tell the reader in the foot.
    step_wanted(str)
        Another station (its key) or step is asked for: ``open`` asks for a book.
    """

    key = ""
    title = ""
    purpose = ""

    message = Signal(str)
    step_wanted = Signal(str)

    def __init__(
        self, document: Document, jobs: Jobs, theme_switch: ThemeSwitch, parent: QWidget | None = None
    ) -> None:
        super().__init__(parent)
        self.document = document
        self.jobs = jobs
        self.theme_switch = theme_switch
        self.setAccessibleName(self.title)
        self.setAccessibleDescription(self.purpose)
        self._is_outdated = True
        self._waits_to_go_home = False
        self._focus_left: QWidget | None = None
        self._instead: QWidget | None = None
        self._put_away: list[QWidget] = []
        self._refreshing = QTimer(self, singleShot=True, interval=0)
        self._refreshing.timeout.connect(self.refresh_now)

        heading = QLabel(self.title)
        keep_look(heading, "title")
        purpose = ElidedLabel(self.purpose)
        keep_look(purpose, "soft")
        self._heading_row = QHBoxLayout()
        self._heading_row.setContentsMargins(WIDE, WIDE - STEP, WIDE, GAP)
        self._heading_row.setSpacing(WIDE)
        self._heading_row.addWidget(heading, 0, Qt.AlignmentFlag.AlignBaseline)
        self._heading_row.addWidget(purpose, 1, Qt.AlignmentFlag.AlignBaseline)
        self._next = ""
        self.next_button = QPushButton()
        self.next_button.hide()
        self.next_button.clicked.connect(lambda _=False: self.step_wanted.emit(self._next))
        # As high with the button as without it.
        self._heading_row.addStrut(self.next_button.sizeHint().height())
        self._heading_row.addWidget(self.next_button, 0, Qt.AlignmentFlag.AlignVCenter)

        self.strip = _Strip()
        self.empty = _Empty()
        self.pictures = QSplitter(Qt.Orientation.Horizontal)
        self.main = QSplitter(Qt.Orientation.Vertical)
        self.form = Form()
        self._panel = QScrollArea()
        self._panel.setWidget(self.form)
        self._panel.setWidgetResizable(True)
        self._panel.setFrameShape(QFrame.Shape.NoFrame)
        self._panel.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self._panel.setFixedWidth(FORM_WIDTH)
        self._panel.setAccessibleName(f"Settings of {self.title}")
        # Its fields take the keyboard, and are scrolled to.
        self._panel.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self._panel.hide()
        self._chosen_sizes: dict[str, list[int]] = {}
        for name, splitter in self._splitters():
            splitter.setChildrenCollapsible(False)
            splitter.setHandleWidth(GAP)
            splitter.splitterMoved.connect(lambda *_, name=name: self._on_splitter_moved(name))
        self.pictures.hide()
        self.main.addWidget(self.pictures)
        body = QWidget()
        row = QHBoxLayout(body)
        row.setContentsMargins(WIDE, GAP, 0, 0)
        row.setSpacing(0)
        row.addWidget(self.main, 1)
        row.addWidget(self._panel)
        self._stack = QStackedWidget()
        self._stack.addWidget(body)
        self._stack.addWidget(self.empty)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addLayout(self._heading_row)
        column.addWidget(self.strip)
        column.addWidget(self._stack, 1)

        for signal in (
            document.reading_changed,
            document.book_changed,
            document.standing_changed,
            document.shocks_changed,
            document.simulation_changed,
        ):
            signal.connect(self.request_refresh)

    def views(self) -> tuple[Callable[[], object], ...]:
        """What brings pictures into view that are not seen at first, one after the other: for a batch."""
        return ()

    # Filling it

    def set_pictures(self, *pictures: QWidget, upright: bool = False) -> None:
        """The main pictures, side by side, or one under the other where `upright`."""
        self.pictures.setOrientation(Qt.Orientation.Vertical if upright else Qt.Orientation.Horizontal)
        for picture in pictures:
            self.pictures.addWidget(picture)
        self.pictures.show()
        self._share()

    def set_table(self, table: QWidget, *, share: int = 40) -> None:
        """The main table, under the pictures; `share` is its part of the height in percent."""
        self.main.addWidget(table)
        self._table_share = share
        self._share()

    def set_form_visible(self, visible: bool = True) -> None:
        """Show the form's panel."""
        self._panel.setVisible(visible)

    def add_to_heading(self, widget: QWidget) -> None:
        """Put a control at the right of the heading."""
        place = self._heading_row.count() - 1
        self._heading_row.insertWidget(place, widget, 0, Qt.AlignmentFlag.AlignVCenter)

    def show_instead(self, page: QWidget) -> None:
        """Put a page in the place of everything under the heading, until `show_again`."""
        if self._instead is not None:
            return
        column = self.layout()
        if isinstance(column, QVBoxLayout) and column.indexOf(page) < 0:
            column.addWidget(page, 1)
        self._instead = page
        own = [self.strip, self._stack]
        for place in range(2, self._heading_row.count()):
            item = self._heading_row.itemAt(place)
            widget = None if item is None else item.widget()
            if widget is not None:
                own.append(widget)
        self._put_away = [part for part in own if not part.isHidden()]
        for part in self._put_away:
            part.hide()
        page.show()

    def show_again(self) -> None:
        """Show the station's own again."""
        if self._instead is None:
            return
        self._instead.hide()
        self._instead = None
        for part in self._put_away:
            part.show()
        self.request_refresh()

    def set_next(self, key: str, title: str, purpose: str) -> None:
        """Offer the station that the work goes on to, while this one has something to show."""
        self._next = key
        self.next_button.setText(f"Next: {title}")
        self.next_button.setToolTip(purpose)
        self._offer_next()

    def _offer_next(self) -> None:
        there = bool(self._next) and not self.is_empty and self.document.book is not None
        self.next_button.setVisible(there)

    _table_share = 40

    def _share(self) -> None:
        if self.main.count() > 1:
            self.main.setStretchFactor(0, 100 - self._table_share)
            self.main.setStretchFactor(1, self._table_share)
            self.main.setSizes([10 * (100 - self._table_share), 10 * self._table_share])

    def _splitters(self) -> tuple[tuple[str, QSplitter], ...]:
        return (("pictures", self.pictures), ("main", self.main))

    def _on_splitter_moved(self, name: str) -> None:
        self._chosen_sizes[name] = dict(self._splitters())[name].sizes()

    @property
    def chosen_sizes(self) -> dict[str, list[int]]:
        """How the reader has shared the room, by the name of the splitter, where they did."""
        return dict(self._chosen_sizes)

    def choose_sizes(self, sizes: Mapping[str, Sequence[int]]) -> None:
        """Share the room as `chosen_sizes` said at another time."""
        for name, splitter in self._splitters():
            wanted = list(sizes.get(name, ()))
            # Parts that were hidden had no room: then there is nothing to go by.
            if len(wanted) >= 2 and wanted[0] > 0:
                splitter.setSizes(wanted)
                self._chosen_sizes[name] = wanted

    def focus_home(self) -> None:
        """Give the keyboard to what the reader came for: the step an empty station offers, or `home`."""
        target = self.empty.button if self.is_empty else self.home()
        if self._instead is not None:
            focus_first(self._instead)
        elif target is not None and target.isVisible() and target.isEnabled():
            target.setFocus(Qt.FocusReason.ShortcutFocusReason)
        else:
            focus_first(self)
        # There is nothing to go to before the first figures are there.
        self._waits_to_go_home = self.is_empty and not self.empty.button.isVisible()
        self._focus_left = QApplication.focusWidget()

    def _go_home(self) -> None:
        focus = QApplication.focusWidget()
        is_elsewhere = focus is not None and focus.isVisible() and not self.isAncestorOf(focus)
        if self.isVisible() and not (is_elsewhere and focus is not self._focus_left):
            self.focus_home()

    def home(self) -> QWidget | None:
        """What matters most here; None for the first widget there is."""
        return None

    # What it says

    def show_empty(self, text: str, button_text: str = "", act: Callable[[], object] | None = None) -> None:
        """Show nothing but what the station needs, and a button for the step that brings it."""
        self.hide_stale()
        self.empty.put(text, button_text, act)
        self._stack.setCurrentWidget(self.empty)
        self.next_button.hide()

    def show_content(self) -> None:
        """Show pictures, table and form."""
        self._stack.setCurrentIndex(0)
        self._offer_next()
        if self._waits_to_go_home:
            self._waits_to_go_home = False
            QTimer.singleShot(0, self, self._go_home)

    @property
    def is_empty(self) -> bool:
        """Whether the station shows only what it needs."""
        return self._stack.currentWidget() is self.empty

    def show_stale(
        self, button_text: str = "", act: Callable[[], object] | None = None, *, text: str = STALE
    ) -> None:
        """Say that the figures shown are stale, or whatever else `text` says, and offer what mends it."""
        self.strip.put(text, button_text, act)

    def hide_stale(self) -> None:
        """Take the strip away."""
        self.strip.hide()

    @property
    def stale_text(self) -> str:
        """What the strip says; empty where it is not there."""
        return "" if self.strip.isHidden() else self.strip.text.text()

    # Keeping up

    def request_refresh(self) -> None:
        """Refresh soon, once for all changes of this turn; a hidden station waits until it is shown."""
        self._is_outdated = True
        if self.isVisible():
            self._refreshing.start()

    def refresh_now(self) -> None:
        """Refresh if anything changed since the last time."""
        self._refreshing.stop()
        if self._is_outdated:
            self._is_outdated = False
            self.refresh()

    def refresh(self) -> None:
        """Bring everything shown up to date with the document."""
        raise NotImplementedError

    def showEvent(self, event: QShowEvent) -> None:
        """Be up to date from the first sight on."""
        super().showEvent(event)
        self.refresh_now()
