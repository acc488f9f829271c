"""Gathering every fault of a source, each with its place."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import numpy as np
from numpy.typing import NDArray

from desk.book import Fault, Severity
from desk.intake.columns import address, column_letters

__all__ = ["FaultList"]


class FaultList:
    """The faults found so far; rows and columns are 0-based, -1 stands for the sheet as a whole."""

    def __init__(self) -> None:
        self._faults: list[Fault] = []
        # Of each batch of faults: the order of its sheet, its column, and the row of each.
        self._places: list[tuple[int, int, NDArray[np.int64]]] = []
        self._graves = 0
        self._order: dict[str, int] = {}

    def order_sheets(self, names: list[str]) -> None:
        """State the order in which the sheets stand."""
        self._order = {name: number for number, name in enumerate(names)}

    def add(
        self,
        found: str,
        expected: str,
        mend: str,
        *,
        sheet: str = "",
        row: int = -1,
        column: int = -1,
        severity: Severity = Severity.GRAVE,
    ) -> None:
        """Add one fault."""
        cell = address(row, column) if row >= 0 and column >= 0 else ""
        order = self._order.get(sheet, len(self._order)) if sheet else -1
        self._faults.append(Fault(found, expected, mend, sheet, cell, severity))
        self._places.append((order, column, np.array([row], dtype=np.int64)))
        self._graves += severity is Severity.GRAVE

    def mild(
        self, found: str, expected: str, mend: str, *, sheet: str = "", row: int = -1, column: int = -1
    ) -> None:
        """Add one fault that leaves the book usable."""
        self.add(found, expected, mend, sheet=sheet, row=row, column=column, severity=Severity.MILD)

    def add_rows(
        self,
        found: Iterable[str],
        expected: str,
        mend: str,
        *,
        sheet: str,
        rows: Sequence[int],
        column: int,
        severity: Severity,
    ) -> None:
        """Add one fault a row, all in one column."""
        order = self._order.get(sheet, len(self._order))
        letters = column_letters(column) if column >= 0 else ""
        cells = [f"{letters}{row + 1}" for row in rows] if letters else [""] * len(rows)
        self._faults += [
            Fault(text, expected, mend, sheet, cell, severity)
            for text, cell in zip(found, cells, strict=True)
        ]
        self._places.append((order, column, np.asarray(rows, dtype=np.int64)))
        self._graves += len(rows) if severity is Severity.GRAVE else 0

    def __len__(self) -> int:
        """How many there are."""
        return len(self._faults)

    @property
    def any_grave(self) -> bool:
        """Whether one of them keeps the book from being used."""
        return self._graves > 0

    @property
    def grave_count(self) -> int:
        """How many of them keep the book from being used."""
        return self._graves

    def grave_rows(self, sheet: str) -> set[int]:
        """Rows of a sheet that hold a grave fault."""
        orders, rows, _ = self._all_places()
        here = orders == self._order.get(sheet, len(self._order))
        return {
            row
            for number, row in zip(np.flatnonzero(here).tolist(), rows[here].tolist(), strict=True)
            if self._faults[number].severity is Severity.GRAVE
        }

    def in_order(self) -> tuple[Fault, ...]:
        """All of them, by sheet, row and column."""
        orders, rows, columns = self._all_places()
        return tuple([self._faults[number] for number in np.lexsort((columns, rows, orders)).tolist()])

    def _all_places(self) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.int64]]:
        """Order of the sheet, row and column of each fault."""
        sizes = [rows.size for *_, rows in self._places]
        orders = np.repeat(np.array([order for order, *_ in self._places], dtype=np.int64), sizes)
        columns = np.repeat(np.array([column for _, column, _ in self._places], dtype=np.int64), sizes)
        rows = np.concatenate([np.zeros(0, dtype=np.int64), *(rows for *_, rows in self._places)])
        return orders, rows, columns
