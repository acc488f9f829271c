"""A sheet of items and values."""

from __future__ import annotations

import difflib
from collections.abc import Callable
from datetime import date
from enum import StrEnum
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from desk.intake.cells import Cells
from desk.intake.faults import FaultList
from desk.intake.layout import Table, find_known, fold

__all__ = ["Check", "ItemSheet"]

Choice = TypeVar("Choice", bound=StrEnum)
Check = Callable[[Cells, NDArray[np.float64], str], None]


class ItemSheet:
    """A sheet of items and values.

    Parameters
    ----------
    table : Table
    faults : FaultList
        Unknown and repeated items are added at once.
    """

    def __init__(self, table: Table, faults: FaultList) -> None:
        self._table = table
        self._faults = faults
        self.rows: dict[str, int] = {}
        items = Cells(table.sheet, table.column("Item"), table.rows, faults)
        for row, text in zip(table.rows.tolist(), items.texts_of("the name of an item"), strict=True):
            if text:
                self._place(text, row)

    def _place(self, text: str, row: int) -> None:
        table, known = self._table, self._table.layout.items
        sheet, column = table.sheet.name, table.fields["Item"]
        item = find_known(text, known)
        if item is None:
            close = difflib.get_close_matches(fold(text), [fold(name) for name in known], 1, 0.8)
            found, expected = f'the item "{text[:60]}" is not known', f"one of {', '.join(known)}"
            if close:
                name = next(name for name in known if fold(name) == close[0])
                self._faults.add(
                    found, expected, f'Did you mean "{name}"?', sheet=sheet, row=row, column=column
                )
            else:
                self._faults.mild(
                    found, expected, "It is not used; remove the row.", sheet=sheet, row=row, column=column
                )
        elif item in self.rows:
            self._faults.add(
                f'the item "{item}" stands twice, also in row {self.rows[item] + 1}',
                "each item once",
                "Remove one of the two rows.",
                sheet=sheet,
                row=row,
                column=column,
            )
        else:
            self.rows[item] = row

    @property
    def name(self) -> str:
        """Name of the sheet, as the source states it."""
        return self._table.sheet.name

    def states(self, item: str) -> bool:
        """Whether an item is there with a value."""
        return item in self.rows and bool(self._cells(item).filled[0])

    def _cells(self, item: str) -> Cells:
        rows = np.array([self.rows[item]], dtype=np.int64)
        return Cells(self._table.sheet, self._table.column("Value"), rows, self._faults)

    def _absent(self, item: str, required: bool, instead: str = "") -> bool:
        if item in self.rows:
            return False
        sheet = self._table.sheet.name
        if required:
            self._faults.add(
                f'the item "{item}" is missing',
                f'a row with the item "{item}" and its value',
                "Add the row.",
                sheet=sheet,
            )
        elif instead:
            self._faults.mild(
                f'the item "{item}" is missing; {instead} is taken',
                f'a row with the item "{item}" and its value',
                "Add the row.",
                sheet=sheet,
            )
        return True

    def number(
        self, item: str, expected: str, *checks: Check, required: bool = False, instead: str = ""
    ) -> float | None:
        """A number, None where there is none or it is wrong."""
        if self._absent(item, required, instead):
            return None
        cells = self._cells(item)
        values = cells.numbers(expected, required=required)
        for check in checks:
            check(cells, values, f"the {item.lower()}")
        if instead and not cells.filled[0]:
            cells.mild(0, f"the cell is empty; {instead} is taken", expected, f"Write {expected} into it.")
        return None if np.isnan(values[0]) else float(values[0])

    def whole(self, item: str, what: str, *, least: int, most: int, instead: int) -> int:
        """A whole number, `instead` where there is none; `what` is its name in a sentence."""
        expected = f"a whole number from {least:,} to {most:,}"
        value = self.number(item, expected, instead=f"{instead:,}")
        if value is None:
            return instead
        if not value.is_integer() or not least <= value <= most:
            self._cells(item).fault(0, f"the {what} is {value:.12g}", expected, "Correct the figure.")
            return instead
        return int(value)

    def choice(
        self, item: str, choices: type[Choice], expected: str, *, required: bool = False, instead: str = ""
    ) -> Choice | None:
        """One of a few words."""
        if self._absent(item, required, instead):
            return None
        cells = self._cells(item)
        if instead and not cells.filled[0]:
            cells.mild(0, f"the cell is empty; {instead} is taken", expected, f"Write {expected} into it.")
        return cells.choices(choices, expected, required=required)[0]

    def date(self, item: str, expected: str, *, required: bool = True) -> date | None:
        """A date, None where there is none or it is wrong."""
        if self._absent(item, required):
            return None
        day = self._cells(item).dates(expected, required=required)[0]
        return None if np.isnat(day) else day.item()

    def text(self, item: str, expected: str, *, required: bool = False) -> str:
        """A text, "" where there is none."""
        if self._absent(item, required):
            return ""
        return self._cells(item).texts_of(expected, required=required)[0]

    def fault(self, item: str, found: str, expected: str, mend: str, *, mild: bool = False) -> None:
        """Add a fault at the value of an item that is there."""
        cells = self._cells(item)
        (cells.mild if mild else cells.fault)(0, found, expected, mend)

    def stated(self, item: str) -> str:
        """The value of an item that is there, as a fault quotes it."""
        return self._cells(item).stated(0)

    def spread_out(self, item: str) -> list[Cells]:
        """The cells of an item: its value, and what follows in columns without a heading."""
        table = self._table
        taken = {column for _, column in table.further} | set(table.fields.values())
        start = table.fields["Value"]
        rows = np.array([self.rows[item]], dtype=np.int64)
        columns = range(start, len(table.sheet.data.columns))
        cells = [
            Cells(table.sheet, column, rows, self._faults)
            for column in columns
            if column == start or column not in taken
        ]
        return [cell for number, cell in enumerate(cells) if number == 0 or cell.filled[0]]
