"""The mode Shocks: every shock of the book, what is asked for, and how it is judged."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from PySide6.QtCore import QItemSelectionModel, Qt
from PySide6.QtGui import QKeySequence, QShortcut
from PySide6.QtWidgets import QWidget

from desk.book import Book, Move, MoveKind, Shock
from desk.valuation.shock_records import ShockResult, ShockTable
from desk.window.parts import numbers
from desk.window.shocks.change_picture import ChangePicture
from desk.window.shocks.curve_pictures import ProfilePicture
from desk.window.shocks.edits import free_name, own_copy, read_shocks, with_added, without_shock
from desk.window.shocks.mode import Mode
from desk.window.shocks.results_table import ResultsTable
from desk.window.shocks.settings_form import SettingsForm
from desk.window.shocks.wording import table_words

if TYPE_CHECKING:
    from desk.window.shocks.station import ShocksStation

__all__ = ["TableMode"]


class TableMode(Mode):
    """All shocks."""

    key = "table"
    title = "All shocks"
    purpose = "Both sides under every shock"

    def __init__(self, station: ShocksStation) -> None:
        super().__init__(station)
        self._shown: ShockTable | None = None
        self.change = ChangePicture(self.theme_switch)
        self.profile = ProfilePicture(self.theme_switch)
        self.pictures = (self.change, self.profile)
        self.results = ResultsTable(self.theme_switch)
        self.table = self.results
        self.results.activated_row.connect(self._open)
        self.results.current_row_changed.connect(self._on_row)
        self.results.paste_callback = self._paste
        for key, act in ((Qt.Key.Key_Insert, self.add), (Qt.Key.Key_Delete, self.remove)):
            shortcut = QShortcut(QKeySequence(key), self.results)
            shortcut.setContext(Qt.ShortcutContext.WidgetShortcut)
            shortcut.activated.connect(act)
        self.add_button = self.form.add_button("New shock", self.add, first=True)
        self.add_button.setToolTip("A shock of your own (Insert in the table)")
        self.open_button = self.form.add_button("Show its moves", self.open_current)
        self.open_button.setToolTip("Of the selected shock (Return in the table)")
        self.copy_button = self.form.add_button("Copy as my own", self.copy)
        self.copy_button.setToolTip("A copy of the selected shock, to be changed")
        self.remove_button = self.form.add_button("Delete", self.remove)
        self.remove_button.setToolTip("The selected shock of your own (Delete in the table)")
        self.settings = SettingsForm(self)
        for teller in (self.change, self.profile, self.results):
            teller.message.connect(self.station.message)

    # Showing

    def show_book(self, book: Book) -> None:
        """Show the book under its shocks."""
        self.settings.show_book(book)
        table = self.document.shocks.result
        if table is not None and table is not self._shown:
            self._shown = table
            self.change.show_table(table)
            self.profile.show_profile(table.profile, table.currency)
            self.results.show_table(table)
        self._show_buttons()

    def leave(self) -> None:
        """Forget what was shown where the document has forgotten it."""
        if self.document.shocks.result is None:
            self._shown = None

    def words(self) -> str:
        """The worst and the best."""
        table = self.document.shocks.result
        return "" if table is None else table_words(table)

    def _show_buttons(self) -> None:
        result = self.results.current_result()
        self.open_button.setEnabled(result is not None)
        self.copy_button.setEnabled(result is not None)
        self.remove_button.setEnabled(result is not None and not result.set_name)

    def _on_row(self, source_row: int) -> None:
        self._show_buttons()
        result = self.results.result_at(source_row)
        if result is not None:
            self.station.selected = result.shock
            self.change.show_row(source_row - 1)
        else:
            self.change.stop_reading()

    def _open(self, source_row: int) -> None:
        result = self.results.result_at(source_row)
        if result is not None:
            self.station.open_shock(result.shock)

    def open_current(self) -> None:
        """Show what the selected shock moves."""
        result = self.results.current_result()
        if result is not None:
            self.station.open_shock(result.shock)

    def select(self, name: str, set_name: str) -> None:
        """Give the row of a shock the keyboard."""
        for place, result in enumerate(self.results.results):
            if (result.name, result.set_name) == (name, set_name):
                self.results.go_to(place + 1)
                self.results.selectionModel().select(
                    self.results.currentIndex(),
                    QItemSelectionModel.SelectionFlag.ClearAndSelect,
                )
                return

    # Editing

    def _place_of(self, result: ShockResult | None) -> int:
        """Where an own shock stands in the book; -1 for none."""
        book = self.document.book
        if result is None or result.set_name or book is None:
            return -1
        return next((place for place, shock in enumerate(book.shocks) if shock.name == result.name), -1)

    def add(self) -> None:
        """Add a shock of the user's own, and show it to be changed."""
        book = self.document.book
        if book is None:
            return
        shock = Shock(free_name(book, "My shock"), (Move(MoveKind.PARALLEL, -100.0),))
        self.edit(f"New shock {shock.name}", with_added(book, shock))
        self.station.open_shock(shock)

    def copy(self) -> None:
        """Copy the selected shock as one of the user's own."""
        book, result = self.document.book, self.results.current_result()
        if book is None or result is None:
            return
        shock = own_copy(book, result.shock)
        self.edit(f"Copy of the shock {result.name}", with_added(book, shock))
        self.station.open_shock(shock)

    def remove(self) -> None:
        """Delete the selected shock, if it is the user's own."""
        book, result = self.document.book, self.results.current_result()
        if book is None or result is None:
            return
        place = self._place_of(result)
        if place < 0:
            self.refuse(f"“{result.name}” is of the set {result.set_name}: untick the set to leave it out.")
            return
        self.edit(f"Deletion of the shock {result.name}", without_shock(book, place))

    def _paste(self, _row: int, _key: str, grid: list[list[str]]) -> str | None:
        book = self.document.book
        if book is None:
            return None
        pasted = read_shocks(grid)
        if pasted.fault:
            self.refuse(f"Nothing was pasted. {pasted.fault}")
            return None
        named: dict[str, Shock] = {shock.name.casefold(): shock for shock in pasted.shocks}
        kept = [named.pop(shock.name.casefold(), shock) for shock in book.shocks]
        self.edit("Pasted shocks", replace(book, shocks=(*kept, *named.values())))
        count = len(pasted.shocks)
        self.message(f"Pasted {numbers.integer(count)} {'shock' if count == 1 else 'shocks'}.")
        return None

    def home(self) -> QWidget:
        """The table."""
        return self.results
