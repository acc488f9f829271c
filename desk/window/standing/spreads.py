"""The spreads by term of a basis as a small table: edited, pasted over, added to and taken from."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from PySide6.QtCore import Qt, Signal
from PySide6.QtGui import QKeySequence, QShortcut
from PySide6.QtWidgets import QHBoxLayout, QPushButton, QVBoxLayout, QWidget

from desk.book import Basis
from desk.book.arrays import FloatArray
from desk.window.curve.edits import merged, read_cells
from desk.window.parts import numbers
from desk.window.parts.tables import Column, Table
from desk.window.parts.theme import HALF, ThemeSwitch

__all__ = ["SpreadsTable", "spreads_fault"]

_ROWS_SHOWN = 6
_WIDEST = 0.5
"""A spread beyond it is a slip [1/year]."""


def spreads_fault(terms: FloatArray, spreads: FloatArray) -> str:
    """Why these are no spreads by term, in one sentence; empty where they are."""
    if not terms.size:
        return "There must be a spread for one term at least."
    if not (np.isfinite(terms).all() and np.isfinite(spreads).all()):
        return "Every row needs a term and a spread."
    if (terms < 0.0).any():
        return f"A term must be at least 0 years, not {numbers.exact(float(terms[terms < 0.0][0]))}."
    steps = np.diff(terms)
    if (steps <= 0.0).any():
        place = int(np.flatnonzero(steps <= 0.0)[0])
        before, after = (numbers.exact(float(term)) for term in terms[place : place + 2])
        return f"Terms must rise: {after} years would come after {before} years."
    if (np.abs(spreads) > _WIDEST).any():
        bad = float(spreads[np.abs(spreads) > _WIDEST][0])
        return f"A spread of {numbers.rate(bad, 1, with_unit=True)} a year is out of all proportion."
    return ""


class SpreadsTable(QWidget):
    """Terms and spreads.

    Attributes
    ----------
    table : Table
    add_button, remove_button : QPushButton

    Signals
    -------
    edited(str, object, object)
        What was done, the terms and the spreads that are to take the place of those shown.
    refused(str)
        What was not taken, and why.
    """

    edited = Signal(str, object, object)
    refused = Signal(str)

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__()
        self._terms = self._spreads = np.zeros(0)
        self.table = Table(
            (
                Column("term", "Term", "years", "years", digits=2, editable=True),
                Column("spread", "Spread", "% a year", "rate", digits=3, editable=True),
            ),
            theme_switch,
            name="Liability spreads by term",
            description="Over the curve, continuously compounded; straight lines between the terms, flat "
            "outside them. Both columns can be edited and pasted over. Insert adds a term, Delete removes "
            "those selected.",
        )
        self.table.setSortingEnabled(False)
        row = self.table.verticalHeader().defaultSectionSize()
        head = self.table.horizontalHeader().sizeHint().height()
        self.table.setFixedHeight(head + _ROWS_SHOWN * row + 2)
        self.table.table_model.commit = self._commit
        self.table.table_model.refused.connect(self.refused)
        self.table.paste_callback = self._on_paste
        self.add_button = QPushButton("Add")
        self.add_button.setToolTip("A term after the selected one (Insert)")
        self.add_button.setAccessibleName("Add a term to the liability spreads")
        self.remove_button = QPushButton("Remove")
        self.remove_button.setToolTip("The selected terms (Delete)")
        self.remove_button.setAccessibleName("Remove the selected liability spreads")
        acts: tuple[tuple[QPushButton, Qt.Key, Callable[[], None]], ...] = (
            (self.add_button, Qt.Key.Key_Insert, self.add_term),
            (self.remove_button, Qt.Key.Key_Delete, self.remove_terms),
        )
        buttons = QHBoxLayout()
        buttons.setSpacing(HALF)
        for button, key, act in acts:
            button.clicked.connect(lambda _=False, act=act: act())
            buttons.addWidget(button)
            shortcut = QShortcut(QKeySequence(key), self.table)
            shortcut.setContext(Qt.ShortcutContext.WidgetShortcut)
            shortcut.activated.connect(act)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(HALF)
        column.addWidget(self.table)
        column.addLayout(buttons)

    def show_basis(self, basis: Basis) -> None:
        """Show the spreads of a basis."""
        self._terms, self._spreads = basis.liability_terms, basis.liability_spreads
        self.table.set_rows({"term": self._terms, "spread": self._spreads})

    # Editing

    def _put(self, text: str, terms: FloatArray, spreads: FloatArray) -> str:
        fault = spreads_fault(terms, spreads)
        if fault:
            return f"{fault} The spreads are unchanged."
        self.edited.emit(text, terms, spreads)
        return ""

    def _commit(self, row: int, key: str, value: float | None) -> str | None:
        if value is None:
            return f"A row needs a {key}. The spreads are unchanged."
        terms, spreads = self._terms.copy(), self._spreads.copy()
        (terms if key == "term" else spreads)[row] = value
        at = f"{numbers.exact(float(self._terms[row]))} years"
        what = f"Change of the liability spread at {at}" if key == "spread" else f"Change of the term {at}"
        return self._put(what, terms, spreads) or None

    def add_term(self) -> None:
        """Add a term after the selected one, at the spread that holds there already."""
        terms, spreads = self._terms, self._spreads
        row = self.table.current_source_row()
        after = row if row >= 0 else terms.size - 1
        if after < terms.size - 1:
            term = round((float(terms[after]) + float(terms[after + 1])) / 2, 2)
        else:
            term = float(terms[-1]) + 10.0 if terms.size else 10.0
        spread = float(np.interp(term, terms, spreads)) if terms.size else 0.0
        reason = self._put(
            f"New liability spread at {numbers.exact(term)} years",
            np.insert(terms, after + 1, term),
            np.insert(spreads, after + 1, spread),
        )
        if reason:
            self.refused.emit(reason)

    def remove_terms(self) -> None:
        """Remove the terms that are selected."""
        chosen = sorted({index.row() for index in self.table.selectionModel().selectedIndexes()})
        if not chosen:
            self.refused.emit("Select the terms to remove.")
            return
        one = f"at {numbers.exact(float(self._terms[chosen[0]]))} years"
        what = (
            f"Removal of the liability spread {one}" if len(chosen) == 1 else "Removal of liability spreads"
        )
        reason = self._put(what, np.delete(self._terms, chosen), np.delete(self._spreads, chosen))
        if reason:
            self.refused.emit(reason)

    def _on_paste(self, row: int, key: str, grid: list[list[str]]) -> str | None:
        # Its words for the columns of a curve: a spread is entered as a rate is.
        pasted = read_cells(grid, "term" if key == "term" else "rate")
        if pasted.faults:
            self.refused.emit(f"Nothing was pasted. {pasted.fault}")
            return None
        everything = len(self.table.selectionModel().selectedRows()) == self._terms.size
        if len(pasted.columns) == 2 and everything:
            terms, spreads = (np.array(pasted.columns[name]) for name in ("term", "rate"))
            fault = ""
        else:
            terms, spreads, fault = merged(self._terms, self._spreads, pasted, max(row, 0))
        reason = fault or self._put("Pasted liability spreads", terms, spreads)
        if reason:
            self.refused.emit(f"Nothing was pasted. {reason}")
        return None
