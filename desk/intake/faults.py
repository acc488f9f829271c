"""Gathering every fault of a source, each with its place."""

from __future__ import annotations

from desk.book import Fault, Severity
from desk.intake.columns import address

__all__ = ["FaultList"]


class FaultList:
    """The faults found so far; rows and columns are 0-based, -1 stands for the sheet as a whole."""

    def __init__(self) -> None:
        self._found: list[tuple[int, int, int, Fault]] = []
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
        self._found.append((order, row, column, Fault(found, expected, mend, sheet, cell, severity)))

    def mild(
        self, found: str, expected: str, mend: str, *, sheet: str = "", row: int = -1, column: int = -1
    ) -> None:
        """Add one fault that leaves the book usable."""
        self.add(found, expected, mend, sheet=sheet, row=row, column=column, severity=Severity.MILD)

    def __len__(self) -> int:
        """How many there are."""
        return len(self._found)

    @property
    def any_grave(self) -> bool:
        """Whether one of them keeps the book from being used."""
        return any(fault.severity is Severity.GRAVE for *_, fault in self._found)

    def grave_rows(self, sheet: str) -> set[int]:
        """Rows of a sheet that hold a grave fault."""
        order = self._order.get(sheet, len(self._order))
        return {
            row for place, row, _, fault in self._found if place == order and fault.severity is Severity.GRAVE
        }

    def in_order(self) -> tuple[Fault, ...]:
        """All of them, by sheet, row and column."""
        return tuple(entry[3] for entry in sorted(self._found, key=lambda entry: entry[:3]))
