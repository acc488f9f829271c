"""Columns that a sheet of flows has beyond the usual ones, each known before the sheet is planned."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any

from desk.report.results.plan import column_letter

__all__ = ["FurtherColumn", "FurtherColumns"]


@dataclass(frozen=True)
class FurtherColumn:
    """One column.

    Attributes
    ----------
    name : str
        By which the workbook knows it, after the prefix of the side; empty for none.
    heading : str
    role, form : str
    cells : callable
        Gives the cell of a flow from the row of the sheet and the number of the flow, from 0.
    is_summed : bool
        Whether its sum stands above it.
    width : float
    """

    name: str
    heading: str
    role: str
    form: str
    cells: Callable[[int, int], Any]
    is_summed: bool = False
    width: float = 15.0


@dataclass
class FurtherColumns:
    """The further columns of one sheet, in their order.

    Attributes
    ----------
    first : int
        Number of the first of them, from 1.
    columns : list of FurtherColumn
    amount, spread, paid : callable or None
        Give the formula of an amount, a spread or a payment in the place of its value, likewise.
    """

    first: int
    columns: list[FurtherColumn] = field(default_factory=list)
    amount: Callable[[int, int], Any] | None = None
    spread: Callable[[int, int], Any] | None = None
    paid: Callable[[int, int], Any] | None = None

    def add(self, column: FurtherColumn) -> str:
        """Add a column and return its letter."""
        self.columns.append(column)
        return column_letter(self.first + len(self.columns) - 1)

    @property
    def next_letter(self) -> str:
        """The letter of the next column to be added."""
        return column_letter(self.first + len(self.columns))
