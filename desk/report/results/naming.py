"""How the sheets, names and figures of a book's first and second basis are told apart."""

from __future__ import annotations

from dataclasses import dataclass

from desk.book import Side

__all__ = ["FIRST", "SECOND", "Naming"]

_SECOND_SHEETS = {
    "Basis and curve": "Second basis",
    "Curve by term": "Second curve by term",
    "Curve bonds": "Second curve bonds",
    "Liability basis": "Second liability basis",
    "Liability bonds": "Second liability bonds",
    "Expected inflation": "Second inflation",
    "Liabilities": "Second liabilities",
    "Asset flows": "Second asset flows",
    "Standing": "Comparison",
}


@dataclass(frozen=True)
class Naming:
    """The names of one basis.

    Attributes
    ----------
    is_second : bool
    """

    is_second: bool = False

    def sheet(self, name: str) -> str:
        """Name of a sheet, given that of the first basis."""
        return _SECOND_SHEETS[name] if self.is_second else name

    def name(self, name: str) -> str:
        """A name that the workbook defines."""
        return f"second_{name}" if self.is_second else name

    def prefix(self, side: Side) -> str:
        """How the names of a side's columns begin."""
        return self.name(side.value)

    def figure(self, label: str) -> str:
        """A figure in the list of checks."""
        return f"Second basis: {label[0].lower()}{label[1:]}" if self.is_second else label

    def title(self, title: str) -> str:
        """Title of a sheet."""
        return f"Second basis: {title[0].lower()}{title[1:]}" if self.is_second else title


FIRST, SECOND = Naming(), Naming(is_second=True)
