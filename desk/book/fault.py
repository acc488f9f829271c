"""A fault: one thing wrong with one cell or row of a source."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

__all__ = ["Fault", "Severity"]


class Severity(StrEnum):
    """How much a fault matters."""

    MILD = "mild"
    """The book can be used; what was done is said."""
    GRAVE = "grave"
    """The book cannot be used until it is mended."""


@dataclass(frozen=True, slots=True)
class Fault:
    """One thing wrong with one cell or row of a source.

    Attributes
    ----------
    found : str
        What was found, as one clause.
    expected : str
        What was expected there.
    mend : str
        What would mend it.
    sheet, cell : str
        Where: the sheet's name and the cell's address ("C14"); empty where it has no one place.
    severity : Severity
        Whether the book can be used all the same.
    """

    found: str
    expected: str
    mend: str
    sheet: str = ""
    cell: str = ""
    severity: Severity = Severity.GRAVE

    @property
    def place(self) -> str:
        """Sheet and cell as a spreadsheet writes them, for example ``Liabilities!C14``."""
        return f"{self.sheet}!{self.cell}" if self.sheet and self.cell else self.sheet or self.cell

    def __str__(self) -> str:
        """The fault in one line."""
        head = f"{self.place}: " if self.place else ""
        return f"{head}{self.found}; expected {self.expected}. {self.mend}"
