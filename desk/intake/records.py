"""What reading a source gives."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date, datetime, time, timedelta
from pathlib import Path

from desk.book import Book, Fault, Severity

__all__ = ["Cell", "Reading", "SheetGrid"]

Cell = str | float | int | bool | date | datetime | time | timedelta | None


@dataclass(frozen=True)
class SheetGrid:
    """One sheet as it is, for showing it.

    Attributes
    ----------
    name : str
    rows : sequence of sequence
        Cell values from A1 on; shared with the parser and not to be changed. Rows may differ in length.
    fields : dict of int to str
        For each column (0-based) that the book takes something from, what it takes.
    heading_row : int or None
        0-based row of the headings; None where the sheet has none that are known.
    hidden : bool
    """

    name: str
    rows: Sequence[Sequence[Cell]]
    fields: dict[int, str]
    heading_row: int | None
    hidden: bool


@dataclass(frozen=True)
class Reading:
    """A source that was read to its end.

    Attributes
    ----------
    path : Path
    sha256 : str
        Of the file's bytes; empty where it could not be read.
    book : Book or None
        None where a grave fault stands in its way.
    faults : tuple of Fault
        All of them, in the order of the sheets and rows.
    sheets : tuple of SheetGrid
    """

    path: Path
    sha256: str
    book: Book | None
    faults: tuple[Fault, ...]
    sheets: tuple[SheetGrid, ...]

    @property
    def grave(self) -> tuple[Fault, ...]:
        """The faults that keep the book from being used."""
        return tuple(fault for fault in self.faults if fault.severity is Severity.GRAVE)
