"""The bonds a curve is drawn through, edited and pasted, with the misfit of each."""

from __future__ import annotations

from collections.abc import Callable
from datetime import date
from typing import Any

import numpy as np
from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication

from desk.book import CurveBonds
from desk.window.curve.bond_cells import (
    BOND_KEYS,
    merged_bonds,
    no_bonds,
    read_bonds,
    removed,
    with_cell,
)
from desk.window.curve.bond_figures import BondFigures
from desk.window.curve.headings import BOND_COLUMNS, HOW_BONDS
from desk.window.curve.page import SORTED, TablePage
from desk.window.parts import numbers
from desk.window.parts.tables import parse_grid
from desk.window.parts.theme import ThemeSwitch

__all__ = ["BondsPage"]

_WHAT = {
    "name": "name",
    "maturity": "maturity",
    "coupon": "coupon",
    "frequency": "coupons a year",
    "price": "price",
    "price_kind": "kind of price",
    "yield": "yield",
}


class BondsPage(TablePage):
    """Bonds; Insert adds one, Delete removes those selected.

    Attributes
    ----------
    take : callable
        Puts bonds into the book, with a text for undo; returns why not, or nothing.
    with_new : callable
        The bonds with one more after a row.
    """

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            BOND_COLUMNS,
            theme_switch,
            name="Bonds of the curve",
            description="Every given figure can be edited and pasted over. Insert adds a bond, Delete "
            "removes those selected.",
            empty_text="No bonds yet. Copy rows of a spreadsheet and press Ctrl+V, or add them one by one.",
        )
        self.take: Callable[[str, CurveBonds], str] = lambda text, bonds: "There is nothing to edit."
        self.with_new: Callable[[CurveBonds, int], CurveBonds] = lambda bonds, after: bonds
        self._bonds = no_bonds()
        self.table.table_model.commit = self._commit
        self.table.paste_callback = self._on_paste
        self.add_one_button = self.add_button(
            "Add a bond", "After the selected one, at par on the curve (Insert)", self.add
        )
        self.remove_button = self.add_button("Remove", "The selected bonds (Delete)", self.remove)
        self.replace_button = self.add_button(
            "Paste all bonds", "What is on the clipboard takes the place of all bonds", self.replace_all
        )
        self.add_key(Qt.Key.Key_Insert, self.add)
        self.add_key(Qt.Key.Key_Delete, self.remove)
        self.say(HOW_BONDS)

    @property
    def bonds(self) -> CurveBonds:
        """The bonds shown."""
        return self._bonds

    def show_bonds(self, bonds: CurveBonds, figures: BondFigures, words: str) -> None:
        """Show bonds and what follows from them; `words` tells how the curve fits them."""
        self._bonds = bonds
        self.table.set_rows(
            {
                "name": list(bonds.names),
                "maturity": bonds.maturity,
                "coupon": bonds.coupon,
                "frequency": bonds.frequency,
                "price": figures.price,
                "price_kind": ["clean" if clean else "dirty" for clean in bonds.is_clean.tolist()],
                "yield": figures.bond_yield,
                "given": ["yield" if np.isnan(price) else "price" for price in bonds.price.tolist()],
                "fitted": figures.fitted_yield,
                "misfit_bp": figures.misfit_bp,
                "misfit_price": figures.misfit_price,
            }
        )
        self.remove_button.setEnabled(len(bonds) > 0)
        self.say(words or HOW_BONDS)

    # Editing

    def _commit(self, row: int, key: str, value: Any) -> str | None:
        if value is None or value == "":
            return f"A bond needs a {_WHAT[key]}. The curve is unchanged."
        if key == "price_kind":
            text = str(value).strip().casefold()
            if text not in ("clean", "dirty"):
                return f"“{value}” is neither clean nor dirty. The curve is unchanged."
            value = text == "clean"
        elif key == "frequency" and value not in (1, 2, 4, 12):
            return "Coupons are paid 1, 2, 4 or 12 times a year. The curve is unchanged."
        elif key == "price" and value <= 0.0:
            return "A price must be above 0. The curve is unchanged."
        elif key == "maturity" and isinstance(value, date):
            value = np.datetime64(value, "D")
        name = self._bonds.names[row] or f"bond {row + 1}"
        return (
            self.take(f"Change of the {_WHAT[key]} of {name}", with_cell(self._bonds, row, key, value))
            or None
        )

    def add(self) -> None:
        """Add a bond after the current one, at par on the curve, and go to it."""
        row = self.table.current_source_row()
        after = row if row >= 0 else len(self._bonds) - 1
        reason = self.take("New bond", self.with_new(self._bonds, after))
        if reason:
            self.refused.emit(reason)
            return
        self.table.go_to(after + 1)
        self.table.setFocus()

    def remove(self) -> None:
        """Remove the bonds that are selected."""
        chosen = self.selected()
        if not chosen:
            self.refused.emit("Select the bonds to remove.")
            return
        what = self._bonds.names[chosen[0]] if len(chosen) == 1 else "bonds"
        reason = self.take(f"Removal of {what or 'a bond'}", removed(self._bonds, chosen))
        if reason:
            self.refused.emit(reason)

    def replace_all(self) -> None:
        """Put the clipboard's bonds in the place of all."""
        grid = parse_grid(QGuiApplication.clipboard().text())
        if not grid:
            self.refused.emit(f"There is nothing to paste. {HOW_BONDS}")
            return
        self._paste(no_bonds(), "name", grid, 0, "Pasted bonds")

    def _on_paste(self, row: int, key: str, grid: list[list[str]]) -> str | None:
        if key not in BOND_KEYS:
            self.refused.emit("Paste on a column from the name to the yield: the others follow from them.")
            return None
        is_whole = not len(self._bonds) or len(self.selected()) == len(self._bonds) > 1
        if is_whole and max(map(len, grid)) > 1:
            self.replace_all()
        elif not self.is_in_order:
            self.refused.emit(SORTED)
        else:
            self._paste(self._bonds, key, grid, max(row, 0), "Pasted into the bonds")
        return None

    def _paste(self, bonds: CurveBonds, key: str, grid: list[list[str]], start: int, text: str) -> None:
        pasted = read_bonds(grid, key)
        fault = pasted.fault
        after = bonds
        if not fault:
            after, fault = merged_bonds(bonds, pasted, start)
        if not fault:
            fault = self.take(text, after)
        if fault:
            self.refused.emit(f"Nothing was pasted. {fault}")
            return
        count = numbers.integer(pasted.count)
        days = np.sort(after.maturity[start : start + pasted.count])
        self.message.emit(
            f"Pasted. {count} {'bond' if pasted.count == 1 else 'bonds'}, maturing from "
            f"{numbers.day(days[0])} to {numbers.day(days[-1])}."
        )
