"""The window: rail, headline, station and foot about one open book."""

from __future__ import annotations

import os
from collections.abc import Callable, Mapping, Sequence
from functools import partial
from importlib import import_module
from pathlib import Path
from typing import Protocol, runtime_checkable

from PySide6.QtCore import QEvent, QSize, Qt, QTimer
from PySide6.QtGui import QCloseEvent, QDragEnterEvent, QDropEvent, QKeySequence, QShortcut
from PySide6.QtWidgets import QHBoxLayout, QMainWindow, QStackedWidget, QVBoxLayout, QWidget

from desk.intake.records import Reading
from desk.window.actions import Acts, Menus
from desk.window.book_files import BookFiles
from desk.window.dialogs import Dialogs
from desk.window.document import Document
from desk.window.foot import Foot
from desk.window.headline import Headline
from desk.window.help_pages import HelpPage, about, keys, what_it_does
from desk.window.jobs import Jobs
from desk.window.parts import numbers
from desk.window.parts.panes import Pane, next_pane, restore_geometry
from desk.window.parts.theme import ThemeSwitch
from desk.window.rail import Rail
from desk.window.recent import RecentBooks
from desk.window.settings import Settings
from desk.window.station import Station
from desk.window.stations import StationEntry
from desk.window.welcome import Welcome

__all__ = ["MainWindow", "RemembersSettings"]

_SIZE = QSize(1280, 800)
_LEAST = QSize(960, 600)
_BETWEEN_STATIONS_MS = 250
_BETWEEN_PLOTS_MS = 40
_PLOTS_AHEAD = 5
"""As many areas as the stations have pictures at first."""
_LATER = ("scipy.special", "scipy.optimize", "scipy.interpolate", "scipy.stats")
"""What the first valuation or run would otherwise wait for."""


@runtime_checkable
class RemembersSettings(Protocol):
    """A station that remembers something from one start to the next."""

    def use_settings(self, settings: Settings) -> None:
        """Remember it in `settings`."""


class MainWindow(QMainWindow):
    """One window, one book.

    Attributes
    ----------
    document : Document
    jobs : Jobs
    files : BookFiles
    recent : RecentBooks
    rail, headline, foot, welcome, menus
        The parts.
    """

    def __init__(
        self,
        *,
        jobs: Jobs,
        document: Document,
        settings: Settings,
        theme_switch: ThemeSwitch,
        stations: Sequence[StationEntry],
        dialogs: Callable[[QWidget], Dialogs] = Dialogs,
        files: Callable[..., BookFiles] = BookFiles,
    ) -> None:
        """Put the parts together; `dialogs` and `files` may be stand-ins."""
        super().__init__()
        self.jobs = jobs
        self.document = document
        self._settings = settings
        self._theme_switch = theme_switch
        self._entries = {entry.key: entry for entry in stations}
        self._stations: dict[str, Station] = {}
        self._shown = ""
        self._may_close = self._is_closing = False
        self._made_ahead = 0
        self.recent = RecentBooks(settings, jobs, self)
        self.files = files(document, jobs, settings, self.recent, dialogs(self), self)
        self._build_parts(theme_switch)
        self.menus = Menus(
            self,
            document=document,
            files=self.files,
            recent=self.recent,
            stations=tuple(stations),
            theme_switch=theme_switch,
            acts=Acts(
                show_station=self._go_to_station,
                show_welcome=self.show_welcome,
                show_report=lambda: self._go_to_station("report"),
                show_help=lambda: self._open_page("What this program does", what_it_does(tuple(stations))),
                show_keys=lambda: self._open_page("Keyboard", keys(tuple(stations))),
                show_about=lambda: self._open_page("About Gapwright", about()),
                set_theme=self._set_theme,
                close=self.close,
            ),
        )
        for keys_text, step in (("F6", 1), ("Shift+F6", -1)):
            shortcut = QShortcut(QKeySequence(keys_text), self)
            shortcut.activated.connect(lambda step=step: next_pane(self._panes(), step))
        self.setAcceptDrops(True)
        self.setMinimumSize(_LEAST)
        restore_geometry(self, settings.geometry, _SIZE)
        self._listen()
        self._retitle()
        self.show_welcome()
        self.recent.look()

    def _build_parts(self, theme_switch: ThemeSwitch) -> None:
        self.rail = Rail(theme_switch)
        for entry in self._entries.values():
            self.rail.add(entry.key, entry.title, entry.number, entry.purpose)
        self.headline = Headline(self.document, theme_switch)
        self.welcome = Welcome(self.recent, theme_switch)
        self.foot = Foot(self.jobs, theme_switch)
        self.stack = QStackedWidget()
        self.stack.addWidget(self.welcome)
        right = QVBoxLayout()
        right.setContentsMargins(0, 0, 0, 0)
        right.setSpacing(0)
        right.addWidget(self.headline)
        right.addWidget(self.stack, 1)
        upper = QHBoxLayout()
        upper.setContentsMargins(0, 0, 0, 0)
        upper.setSpacing(0)
        upper.addWidget(self.rail)
        upper.addLayout(right, 1)
        middle = QWidget()
        rows = QVBoxLayout(middle)
        rows.setContentsMargins(0, 0, 0, 0)
        rows.setSpacing(0)
        rows.addLayout(upper, 1)
        rows.addWidget(self.foot)
        self.setCentralWidget(middle)

    def _listen(self) -> None:
        document, files = self.document, self.files
        self.rail.chosen.connect(self.show_station)
        self.headline.opened.connect(self._open_rows)
        self.welcome.open_asked.connect(files.ask_open)
        self.welcome.chosen.connect(files.open)
        files.opened.connect(self._on_opened)
        files.refused.connect(self._on_refused)
        files.told.connect(lambda text, grave: self.foot.tell(text, grave=grave))
        document.failed.connect(lambda text: self.foot.tell(text, grave=True))
        document.modified_changed.connect(self.setWindowModified)
        document.history_changed.connect(self._retitle)
        for signal in (
            document.reading_changed,
            document.book_changed,
            document.standing_changed,
            document.shocks_changed,
            document.simulation_changed,
            document.what_if.changed,
        ):
            signal.connect(self._note_states)
        self._note_states()

    # Stations

    @property
    def shown(self) -> str:
        """Key of the station that is shown; empty for the welcome."""
        return self._shown

    def station(self, key: str) -> Station:
        """A station, made when it is first asked for."""
        if key not in self._stations:
            made = self._entries[key].load()(self.document, self.jobs, self._theme_switch)
            self._stations[key] = made
            self.stack.addWidget(made)
            self._attach(made)
        return self._stations[key]

    def _attach(self, station: Station) -> None:
        """Join a station's wishes and messages to the window."""
        station.message.connect(self.foot.tell)
        station.step_wanted.connect(self._take_step)
        after = _next_to(self._entries, station.key)
        if after is not None:
            station.set_next(after.key, after.title, after.purpose)
        station.choose_sizes(self._settings.sizes(station.key))
        if isinstance(station, RemembersSettings):
            station.use_settings(self._settings)
        # The foot comes after the station for the keyboard too.
        QWidget.setTabOrder(_last_in(station), self.foot)
        QWidget.setTabOrder(self.foot, self.foot.cancel_button)

    def _take_step(self, step: str) -> None:
        """Do what a station asks for: a step by its name, or another station by its key."""
        steps: dict[str, Callable[[], object]] = {
            "open": self.files.ask_open,
            "read_again": self.files.read_again,
            "save": self.files.save,
            "simulate": self._simulate,
        }
        if step in steps:
            steps[step]()
        else:
            self._go_to_station(step)

    def _simulate(self) -> None:
        if self.document.book is not None:
            self.document.run_simulation()

    def warm_up(self, then: Callable[[], None] | None = None) -> None:
        """Load in the background what the stations need, so that the first visit to one is quick.

        Parameters
        ----------
        then : callable, optional
            Called when it is done, or came to nothing: then each station loads what it needs.
        """
        entries = tuple(self._entries.values())

        def work(*, progress: Callable[[float], None], cancel: object) -> None:
            del cancel
            steps: list[Callable[[], object]] = [
                *(entry.load for entry in entries),
                *(partial(import_module, name) for name in _LATER),
            ]
            for place, step in enumerate(steps, start=1):
                step()
                progress(place / len(steps))

        def loaded(_: None) -> None:
            if then is not None:
                then()

        def failed(error: BaseException) -> None:
            loaded(None)
            raise error

        self.jobs.start("Getting the stations ready", work, on_done=loaded, on_failed=failed)

    def make_ahead(self) -> None:
        """Make the stations that were not visited yet, one at a time, while nothing runs.

        The first is the one that a book opens on; before it come the areas of its pictures.
        """
        order = sorted(self._entries, key=lambda key: key != self._first_station())
        missing = next((key for key in order if key not in self._stations), None)
        if missing is None or self._is_closing:
            return
        if not self.jobs.running:
            from desk.window.parts.plot_parts import store_plot

            if self._made_ahead < _PLOTS_AHEAD:
                self._made_ahead += 1
                store_plot()
                QTimer.singleShot(_BETWEEN_PLOTS_MS, self, self.make_ahead)
                return
            self.station(missing)
        QTimer.singleShot(_BETWEEN_STATIONS_MS, self, self.make_ahead)

    def _first_station(self) -> str:
        """Key of the station that a book opens on: the one left last, or the standing."""
        remembered = self._settings.station
        wanted = remembered if remembered in self._entries else "standing"
        return wanted if wanted in self._entries else next(iter(self._entries), "")

    def show_station(self, key: str) -> None:
        """Show a station; nothing happens for one this version does not have."""
        if key not in self._entries:
            return
        station = self.station(key)
        self.headline.setVisible(True)
        self.stack.setCurrentWidget(station)
        self._shown = key
        self.rail.show_chosen(key)
        self._settings.station = key

    def _go_to_station(self, key: str) -> None:
        """Show a station and take the keyboard there."""
        self.show_station(key)
        if key == self._shown:
            self._stations[key].focus_home()

    def show_welcome(self) -> None:
        """Show the page before a book is open."""
        self.headline.setVisible(self.document.book is not None)
        self.stack.setCurrentWidget(self.welcome)
        self._shown = ""
        self.rail.show_chosen("")
        self.welcome.take_focus()

    def _open_rows(self, figure: str) -> None:
        """Show the rows that make up a key figure."""
        self.show_station("standing")
        show_rows = getattr(self._stations.get("standing"), "show_rows", None)
        if callable(show_rows):
            show_rows(figure)

    def _on_opened(self, reading: Reading) -> None:
        if not self._shown:
            self._go_to_station(self._first_station())
        mild = len(reading.faults)
        about_faults = ""
        if mild:
            about_faults = f" with {_counted(mild, 'mild fault')}: Intake lists them"
        self.foot.tell(f"{reading.path.name} is open{about_faults}.")

    def _on_refused(self, reading: Reading) -> None:
        self._go_to_station("intake")
        kept = f" {self.files.name} stays open, unchanged." if self.document.book is not None else ""
        faults = _counted(len(reading.grave), "grave fault")
        self.foot.tell(f"{reading.path.name} cannot be used yet: {faults}.{kept}", grave=True)

    def _note_states(self) -> None:
        """Say on the rail what the reader would want to know before going there."""
        document = self.document
        notes: dict[str, tuple[str, str]] = {}
        if document.reading is not None:
            grave = len(document.reading.grave)
            mild = len(document.faults) - grave
            if grave:
                notes["intake"] = (_counted(grave, "grave fault"), "grave")
            elif mild:
                notes["intake"] = (_counted(mild, "mild fault"), "mild")
            else:
                notes["intake"] = ("no faults", "ink_soft")
        if document.book is not None:
            if document.standing_failure:
                notes["standing"] = ("could not be valued", "grave")
            elif document.standing is None or document.standing_is_stale:
                notes["standing"] = ("being valued", "mild")
            if document.what_if.is_on:
                notes["shocks"] = ("what-if on", "what_if")
            elif document.shocks.failure:
                notes["shocks"] = ("could not be computed", "grave")
            if document.is_simulating:
                notes["scenarios"] = ("running", "ink_soft")
            elif document.simulation is None:
                has_model = document.book.rates_model is not None
                notes["scenarios"] = ("not run yet" if has_model else "no rates model", "ink_soft")
            elif document.simulation_is_stale:
                notes["scenarios"] = ("out of date", "mild")
        for button in self.rail.buttons:
            button.set_note(*notes.get(button.key, ("", "ink_soft")))

    # The frame

    def _retitle(self) -> None:
        name = f"{self.files.name}[*] — Gapwright" if self.document.book is not None else "Gapwright[*]"
        self.setWindowTitle(name)
        self.setWindowModified(self.document.is_modified)

    def _set_theme(self, mode: str) -> None:
        self._settings.theme_mode = mode
        self._theme_switch.set_mode(mode)

    def _open_page(self, title: str, page: str) -> None:
        HelpPage(title, page, self).show()

    def _panes(self) -> tuple[Pane, ...]:
        return (
            Pane(self.rail, self.rail.take_focus),
            Pane(self.headline, self.headline.take_focus),
            Pane(self.stack, self._focus_station),
            Pane(self.foot, self.foot.take_focus),
        )

    def _focus_station(self) -> None:
        if self.stack.currentWidget() is self.welcome:
            self.welcome.take_focus()
        elif self._shown:
            self._stations[self._shown].focus_home()

    # What Qt calls

    def closeEvent(self, event: QCloseEvent) -> None:
        """Settle unsaved changes first; then stop what runs, wait for it, and go."""
        if not self._may_close and self.document.is_modified:
            event.ignore()
            self.files.settle_unsaved("before closing", self._close_now)
            return
        self._settings.geometry = self.saveGeometry()
        for key, station in self._stations.items():
            self._settings.set_sizes(key, station.chosen_sizes)
        self._settings.flush()
        self._is_closing = True
        self.hide()
        self.document.stop()
        self.jobs.shutdown()
        event.accept()

    def discard_changes(self) -> None:
        """Close without asking about unsaved changes from now on."""
        self._may_close = True

    def _close_now(self) -> None:
        self.discard_changes()
        self.close()

    def dragEnterEvent(self, event: QDragEnterEvent) -> None:
        """Take files of this machine."""
        if _local_files(event):
            event.acceptProposedAction()

    def dropEvent(self, event: QDropEvent) -> None:
        """Open the file that was dropped."""
        paths = _local_files(event)
        if not paths:
            return
        event.acceptProposedAction()
        if len(paths) > 1:
            self.foot.tell(f"One window holds one book: {paths[0].name} is opened, the others are not.")
        self.files.open(paths[0])

    def changeEvent(self, event: QEvent) -> None:
        """Redraw the parts that paint themselves when the look changes."""
        super().changeEvent(event)
        if event.type() is QEvent.Type.PaletteChange and hasattr(self, "rail"):
            for part in (self.rail, self.headline, self.foot):
                for button in part.findChildren(QWidget):
                    button.update()


def _next_to(entries: Mapping[str, StationEntry], key: str) -> StationEntry | None:
    """The station after the one of this key; None after the last."""
    keys = list(entries)
    place = keys.index(key) + 1
    return entries[keys[place]] if place < len(keys) else None


def _last_in(page: QWidget) -> QWidget:
    """The widget that the keyboard comes to last on a page."""
    last = page
    widget = page.nextInFocusChain()
    while widget is not None and widget is not page:
        takes = bool(widget.focusPolicy() & Qt.FocusPolicy.TabFocus) and widget.focusProxy() is None
        if takes and page.isAncestorOf(widget):
            last = widget
        widget = widget.nextInFocusChain()
    return last


def _counted(count: int, what: str) -> str:
    return f"{numbers.integer(count)} {what}{'' if count == 1 else 's'}"


def _local_files(event: QDropEvent) -> list[Path]:
    urls = event.mimeData().urls()
    paths = [Path(url.toLocalFile()) for url in urls if url.isLocalFile()]
    return [path for path in paths if not os.path.isdir(path)]
