"""The menus of the window and what stands in them."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import partial
from pathlib import Path

from PySide6.QtGui import QAction, QActionGroup, QKeySequence
from PySide6.QtWidgets import QApplication, QMainWindow, QMenu, QWidget

from desk.window.book_files import BookFiles
from desk.window.document import Document
from desk.window.parts.icons import icon
from desk.window.parts.theme import Theme, ThemeSwitch
from desk.window.recent import RecentBooks
from desk.window.stations import StationEntry
from desk.window.welcome import demo_books_there

__all__ = ["Acts", "Menus"]

_Keys = QKeySequence.StandardKey


@dataclass(frozen=True)
class Acts:
    """What the menus call of the window.

    Attributes
    ----------
    show_station : callable of a key
    show_welcome, show_report, show_help, show_keys, show_about, close : callable
    set_theme : callable of ``system``, ``light`` or ``dark``
    """

    show_station: Callable[[str], None]
    show_welcome: Callable[[], None]
    show_report: Callable[[], None]
    show_help: Callable[[], None]
    show_keys: Callable[[], None]
    show_about: Callable[[], None]
    set_theme: Callable[[str], None]
    close: Callable[[], object]


class Menus:
    """The menus.

    Attributes
    ----------
    open, again, save, save_as, report, quit, undo, redo, copy : QAction
    themes : dict of str to QAction
    stations : dict of str to QAction
    recent, demos, help : QMenu
    """

    def __init__(
        self,
        window: QMainWindow,
        *,
        document: Document,
        files: BookFiles,
        recent: RecentBooks,
        stations: tuple[StationEntry, ...],
        theme_switch: ThemeSwitch,
        acts: Acts,
    ) -> None:
        self._window = window
        self._document = document
        self._files = files
        self._recent_books = recent
        self._icons: list[tuple[QAction, str]] = []
        self._make_file_menu(acts)
        self._make_edit_menu()
        self._make_view_menu(acts, stations, theme_switch)
        self._make_help_menu(acts)
        for signal in (document.book_changed, document.history_changed, document.reading_changed):
            signal.connect(self.refresh)
        recent.changed.connect(self._fill_recent)
        theme_switch.changed.connect(self._tint)
        self._tint(theme_switch.theme)
        self._fill_recent()
        self.refresh()

    def _action(
        self,
        menu: QMenu,
        text: str,
        act: Callable[[], object],
        keys: _Keys | str | None = None,
        sign: str = "",
        tip: str = "",
    ) -> QAction:
        action = QAction(text, self._window)
        if keys is not None:
            action.setShortcut(QKeySequence(keys))
        action.triggered.connect(lambda _=False: act())
        if tip:
            action.setToolTip(tip)
        if sign:
            self._icons.append((action, sign))
        menu.addAction(action)
        return action

    def _make_file_menu(self, acts: Acts) -> None:
        menu = self._window.menuBar().addMenu("&File")
        files = self._files
        self.open = self._action(menu, "&Open…", files.ask_open, _Keys.Open, "open")
        self.demos = menu.addMenu("Open a &demo book")
        for book, path in demo_books_there():
            self._action(self.demos, book.title, partial(files.open, path))
        self.demos.setEnabled(bool(self.demos.actions()))
        self.recent = menu.addMenu("Open &recent")
        self.again = self._action(menu, "Read &again", files.read_again, "F5", "again")
        menu.addSeparator()
        self.save = self._action(menu, "&Save", files.save, _Keys.Save, "save")
        self.save_as = self._action(menu, "Save a &copy…", files.ask_save, "Ctrl+Shift+S")
        menu.addSeparator()
        self.report = self._action(menu, "&Export report…", acts.show_report, "Ctrl+E", "report")
        menu.addSeparator()
        self.quit = self._action(menu, "&Quit", acts.close, "Ctrl+Q")
        self.quit.setMenuRole(QAction.MenuRole.QuitRole)

    def _make_edit_menu(self) -> None:
        menu = self._window.menuBar().addMenu("&Edit")
        self.undo = self._action(menu, "&Undo", self._document.undo, _Keys.Undo, "undo")
        self.redo = self._action(menu, "&Redo", self._document.redo, _Keys.Redo, "redo")
        self.redo.setShortcuts([QKeySequence("Ctrl+Shift+Z"), QKeySequence("Ctrl+Y")])
        menu.addSeparator()
        # Tables and fields take the key themselves: the entry must not take it from them.
        self.copy = self._action(menu, "&Copy\tCtrl+C", _copy_from_focus)
        menu.aboutToShow.connect(
            lambda: self.copy.setEnabled(_copier(QApplication.focusWidget()) is not None)
        )

    def _make_view_menu(
        self, acts: Acts, stations: tuple[StationEntry, ...], theme_switch: ThemeSwitch
    ) -> None:
        menu = self._window.menuBar().addMenu("&View")
        self.stations: dict[str, QAction] = {}
        for entry in stations:
            act = partial(acts.show_station, entry.key)
            action = self._action(menu, entry.title, act, f"Alt+{entry.number}", entry.key)
            self.stations[entry.key] = action
        self._action(menu, "&Welcome", acts.show_welcome, "Alt+Home")
        menu.addSeparator()
        themes = menu.addMenu("&Theme")
        group = QActionGroup(self._window)
        self.themes: dict[str, QAction] = {}
        for mode, text in (("system", "As the &system"), ("light", "&Light"), ("dark", "&Dark")):
            action = self._action(themes, text, partial(acts.set_theme, mode))
            action.setCheckable(True)
            action.setChecked(theme_switch.mode == mode)
            group.addAction(action)
            self.themes[mode] = action

    def _make_help_menu(self, acts: Acts) -> None:
        self.help = menu = self._window.menuBar().addMenu("&Help")
        self._action(menu, "&What this program does", acts.show_help, _Keys.HelpContents)
        self._action(menu, "&Keyboard", acts.show_keys)
        menu.addSeparator()
        about = self._action(menu, "&About Gapwright", acts.show_about)
        about.setMenuRole(QAction.MenuRole.AboutRole)

    def refresh(self) -> None:
        """Switch on what can be done, and name what would be undone."""
        document = self._document
        has_book = document.book is not None
        for action in (self.save, self.save_as, self.report):
            action.setEnabled(has_book)
        self.again.setEnabled(document.reading is not None)
        for action, able, name, text in (
            (self.undo, document.can_undo, "&Undo", document.undo_text),
            (self.redo, document.can_redo, "&Redo", document.redo_text),
        ):
            action.setEnabled(able)
            action.setText(f"{name} {_lowered(text)}".rstrip())

    def _fill_recent(self) -> None:
        self.recent.clear()
        for place, path in enumerate(self._recent_books.paths, start=1):
            mark = f"&{place % 10} " if place <= 10 else ""
            shown = path.name.replace("&", "&&")
            action = self._action(self.recent, f"{mark}{shown}", partial(self._files.open, path))
            action.setToolTip(str(path))
            action.setStatusTip(str(path))
        self.recent.setToolTipsVisible(True)
        self.recent.setEnabled(bool(self._recent_books.paths))
        if self._recent_books.paths:
            self.recent.addSeparator()
            self._action(self.recent, "&Forget these", self._recent_books.clear)

    def _tint(self, theme: Theme) -> None:
        for action, name in self._icons:
            action.setIcon(icon(name, theme))

    def recent_paths(self) -> list[Path]:
        """The books that the menu offers."""
        return [Path(action.toolTip()) for action in self.recent.actions() if action.statusTip()]


def _lowered(text: str) -> str:
    """``Change of the spread`` within a sentence."""
    if len(text) > 1 and text[1].isupper():
        return text
    return text[:1].lower() + text[1:]


def _copier(widget: QWidget | None) -> Callable[[], object] | None:
    """What copies the selection of a widget; None where it has nothing to copy."""
    copy = getattr(widget, "copy", None)
    return copy if callable(copy) else None


def _copy_from_focus() -> None:
    copy = _copier(QApplication.focusWidget())
    if copy is not None:
        copy()
