"""One figure a term: quotes of a curve, spreads or expected inflation, edited and pasted."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Protocol

import numpy as np
from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication

from desk.book.arrays import FloatArray
from desk.rates.curve import DiscountCurve
from desk.window.curve.edits import merged, next_term, read_cells
from desk.window.curve.headings import QUOTE_COLUMNS
from desk.window.curve.page import SORTED, TablePage
from desk.window.parts import numbers
from desk.window.parts.columns import Column
from desk.window.parts.tables import parse_grid
from desk.window.parts.theme import ThemeSwitch

__all__ = ["QuotesPage"]


class _Take(Protocol):
    def __call__(self, text: str, terms: FloatArray, rates: FloatArray) -> str: ...


class QuotesPage(TablePage):
    """Terms and rates; Insert adds one, Delete removes those selected.

    Attributes
    ----------
    take : callable
        Puts terms and rates into the book, with a text for undo; returns why not, or nothing.
    suggest : callable
        The rate to add at a term.
    """

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            QUOTE_COLUMNS,
            theme_switch,
            name="Quotes of the curve",
            description="Term and rate can be edited and pasted over. Insert adds a quote, Delete removes "
            "those selected.",
            empty_text="No quotes.",
        )
        self.take: _Take = lambda text, terms, rates: "There is nothing to edit."
        self.suggest: Callable[[float], float] = lambda _: 0.0
        self._terms = self._rates = np.zeros(0)
        self._noun = "quote"
        self.table.table_model.commit = self._commit
        self.table.paste_callback = self._on_paste
        self.add_one_button = self.add_button(
            "Add a quote", "After the selected one, on the curve (Insert)", self.add
        )
        self.remove_button = self.add_button("Remove", "The selected ones (Delete)", self.remove)
        self.replace_button = self.add_button(
            "Paste a whole curve", "What is on the clipboard takes the place of all", self.replace_all
        )
        self.add_key(Qt.Key.Key_Insert, self.add)
        self.add_key(Qt.Key.Key_Delete, self.remove)

    def set_kind(self, columns: Sequence[Column], noun: str, name: str, how: str) -> None:
        """Show another kind of quotes; `noun` is what one of them is called."""
        if tuple(columns) != self.table.table_model.columns:
            self.table.set_columns(columns)
        self._noun = noun
        self.table.setAccessibleName(name)
        self.add_one_button.setText(f"Add a {noun}")
        self.table.empty_text = f"No {noun}s. Paste terms in years beside rates in percent, or add one."
        self.say(how)

    def show_quotes(
        self, terms: FloatArray, rates: FloatArray, curve: DiscountCurve | None, *, is_index: bool = False
    ) -> None:
        """Show quotes and what a curve says at them; None where they give none."""
        self._terms, self._rates = terms, rates
        zero = discount = forward = np.full(terms.shape, np.nan)
        if curve is not None and terms.size:
            zero, discount = curve.zero(terms), curve.discount(terms)
            if is_index:
                discount = 1.0 / discount
            forward = curve.forward(terms, np.append(terms[1:], terms[-1]))
        self.table.set_rows(
            {"term": terms, "rate": rates, "zero": zero, "discount": discount, "forward": forward}
        )
        self.remove_button.setEnabled(terms.size > 0)

    # Editing

    def _commit(self, row: int, key: str, value: float | None) -> str | None:
        if value is None:
            return f"A {self._noun} needs a {key}. The curve is unchanged."
        columns = {"term": self._terms.copy(), "rate": self._rates.copy()}
        columns[key][row] = value
        at = f"{numbers.exact(float(self._terms[row]))} years"
        what = f"Change of the {self._figure} at {at}" if key == "rate" else f"Change of the term {at}"
        return self.take(what, columns["term"], columns["rate"]) or None

    @property
    def _figure(self) -> str:
        return "spread" if self._noun == "spread" else "rate"

    def add(self) -> None:
        """Add one after the current one, on the curve, and go to it."""
        row = self.table.current_source_row()
        after = row if row >= 0 else self._terms.size - 1
        term = next_term(self._terms, after)
        reason = self.take(
            f"New {self._noun} at {numbers.exact(term)} years",
            np.insert(self._terms, after + 1, term),
            np.insert(self._rates, after + 1, round(self.suggest(term), 6)),
        )
        if reason:
            self.refused.emit(reason)
            return
        self.table.go_to(after + 1)
        self.table.setFocus()

    def remove(self) -> None:
        """Remove those that are selected."""
        chosen = self.selected()
        if not chosen:
            self.refused.emit(f"Select the {self._noun}s to remove.")
            return
        at = f"{numbers.exact(float(self._terms[chosen[0]]))} years"
        what = f"{self._noun} at {at}" if len(chosen) == 1 else f"{self._noun}s"
        reason = self.take(
            f"Removal of the {what}", np.delete(self._terms, chosen), np.delete(self._rates, chosen)
        )
        if reason:
            self.refused.emit(reason)

    def replace_all(self) -> None:
        """Put the clipboard's terms and rates in the place of all."""
        grid = parse_grid(QGuiApplication.clipboard().text())
        if not grid:
            self.refused.emit(
                "There is nothing to paste: copy two columns, terms in years and rates in percent."
            )
            return
        pasted = read_cells(grid, "term")
        fault = pasted.fault
        if not fault and "rate" not in pasted.columns:
            fault = "A whole curve needs two columns: terms in years and rates in percent."
        if fault:
            self.refused.emit(f"Nothing was pasted. {fault}")
            return
        self._paste("Pasted curve", np.array(pasted.columns["term"]), np.array(pasted.columns["rate"]))

    def _on_paste(self, row: int, key: str, grid: list[list[str]]) -> str | None:
        if key not in ("term", "rate"):
            self.refused.emit("Paste on a term or a rate: the other columns follow from them.")
            return None
        is_whole = not self._terms.size or len(self.selected()) == self._terms.size > 1
        if is_whole and max(map(len, grid)) > 1:
            self.replace_all()
            return None
        if not self.is_in_order:
            self.refused.emit(SORTED)
            return None
        pasted = read_cells(grid, key)
        if pasted.faults:
            self.refused.emit(f"Nothing was pasted. {pasted.fault}")
            return None
        terms, rates, fault = merged(self._terms, self._rates, pasted, max(row, 0))
        if fault:
            self.refused.emit(f"Nothing was pasted. {fault}")
            return None
        self._paste(f"Pasted {self._noun}s", terms, rates)
        return None

    def _paste(self, text: str, terms: FloatArray, rates: FloatArray) -> None:
        reason = self.take(text, terms, rates)
        if reason:
            self.refused.emit(f"Nothing was pasted. {reason}")
            return
        low, high = numbers.rate(float(rates.min()), 3), numbers.rate(float(rates.max()), 3, with_unit=True)
        self.message.emit(
            f"Pasted. {numbers.integer(rates.size)} {self._noun}s from {low} to {high}, read as percent a "
            "year."
        )
