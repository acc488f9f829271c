"""A page of the station Curve: a table, what can be done with it, and a line of words under it."""

from __future__ import annotations

from collections.abc import Callable, Sequence

from PySide6.QtCore import Qt, Signal
from PySide6.QtGui import QKeySequence, QShortcut
from PySide6.QtWidgets import QHBoxLayout, QPushButton, QVBoxLayout, QWidget

from desk.window.parts.columns import Column
from desk.window.parts.labels import ElidedLabel
from desk.window.parts.tables import Table
from desk.window.parts.theme import GAP, HALF, ThemeSwitch, keep_look, soft_font

__all__ = ["SORTED", "TablePage"]

SORTED = (
    "Nothing was pasted: the rows are sorted. Choose “Order as in the source” in the menu on the cells first."
)


class TablePage(QWidget):
    """A table with a row of buttons over it and a line of words.

    Signals
    -------
    refused(str)
        Why an edit was not taken.
    message(str)
        Something to tell the reader.
    """

    refused = Signal(str)
    message = Signal(str)

    def __init__(
        self,
        columns: Sequence[Column],
        theme_switch: ThemeSwitch,
        *,
        name: str,
        description: str,
        empty_text: str = "",
    ) -> None:
        super().__init__()
        self.table = Table(columns, theme_switch, name=name, description=description, empty_text=empty_text)
        self.table.table_model.refused.connect(self.refused)
        self.table.message.connect(self.message)
        self._words = ElidedLabel(lines=2)
        self._words.setFont(soft_font(self.font()))
        keep_look(self._words, "soft")
        self._buttons = QHBoxLayout()
        self._buttons.setContentsMargins(0, HALF, GAP, HALF)
        self._buttons.setSpacing(GAP)
        self._buttons.addWidget(self._words, 1)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addLayout(self._buttons)
        column.addWidget(self.table, 1)
        self.setFocusProxy(self.table)

    @property
    def words(self) -> str:
        """The line of words."""
        return self._words.text().strip()

    def say(self, text: str) -> None:
        """Put a line of words beside the buttons."""
        self._words.set_text(text)

    def add_button(self, text: str, tooltip: str, act: Callable[[], object]) -> QPushButton:
        """Add a button at the right."""
        button = QPushButton(text)
        button.setToolTip(tooltip)
        button.setAccessibleDescription(tooltip)
        button.clicked.connect(lambda _=False: act())
        self._buttons.addWidget(button)
        return button

    def add_key(self, key: Qt.Key, act: Callable[[], object]) -> None:
        """Let a key of the table do something."""
        shortcut = QShortcut(QKeySequence(key), self.table)
        shortcut.setContext(Qt.ShortcutContext.WidgetShortcut)
        shortcut.activated.connect(act)

    @property
    def is_in_order(self) -> bool:
        """Whether the rows stand in the order of the source, so that pasted ones go where they are seen."""
        model = self.table.table_model
        return all(model.source_row(row) == row for row in range(model.rowCount()))

    def selected(self) -> list[int]:
        """Source rows in which a cell is selected."""
        rows = {index.row() for index in self.table.selectionModel().selectedIndexes()}
        return sorted(self.table.table_model.source_row(row) for row in rows)
