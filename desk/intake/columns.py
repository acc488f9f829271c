"""A sheet's cells as compact columns: what the reading process hands over.

Each cell has a kind and a number. Dates count days from 1970-01-01, times of day and durations count
seconds, moments count seconds from 1970-01-01, a text is the number of its entry in a table of texts.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from datetime import date, datetime, time, timedelta
from enum import IntEnum
from functools import cache
from itertools import compress
from typing import TYPE_CHECKING, Any, overload

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from desk.intake.records import Cell

__all__ = ["Column", "ColumnRows", "Kind", "SheetColumns", "address", "column_letters", "pack_column"]

_EPOCH = date(1970, 1, 1).toordinal()
_EPOCH_MOMENT = datetime(1970, 1, 1)


class Kind(IntEnum):
    """What stands in a cell."""

    BLANK = 0
    NUMBER = 1
    TEXT = 2
    TRUTH = 3
    DATE = 4
    MOMENT = 5
    TIME = 6
    DURATION = 7


_KINDS: dict[type, int] = {
    float: Kind.NUMBER,
    int: Kind.NUMBER,
    str: Kind.TEXT,
    bool: Kind.TRUTH,
    date: Kind.DATE,
    datetime: Kind.MOMENT,
    time: Kind.TIME,
    timedelta: Kind.DURATION,
    type(None): Kind.BLANK,
}

PackedColumn = tuple[bytes, bytes, list[str]]


def pack_column(cells: Sequence[Any]) -> PackedColumn:
    """One column as bytes of kinds, bytes of float64 numbers and its texts; a blank one as nothing."""
    count = len(cells)
    kinds = np.fromiter(map(_KINDS.__getitem__, map(type, cells)), dtype=np.uint8, count=count)
    values = np.zeros(count)
    texts: dict[str, int] = {}
    for kind in set(kinds.tolist()) - {Kind.BLANK}:
        where = kinds == kind
        chosen = list(compress(cells, where.tolist()))
        if kind == Kind.TEXT:
            values[where] = [texts.setdefault(text, len(texts)) for text in chosen]
        elif kind == Kind.DATE:
            values[where] = [day.toordinal() - _EPOCH for day in chosen]
        elif kind == Kind.MOMENT:
            values[where] = [(moment - _EPOCH_MOMENT).total_seconds() for moment in chosen]
        elif kind == Kind.TIME:
            values[where] = [_seconds_of_day(moment) for moment in chosen]
        elif kind == Kind.DURATION:
            values[where] = [length.total_seconds() for length in chosen]
        else:
            values[where] = chosen
    if texts:
        empty = np.array([not text.strip() for text in texts])
        if empty.any():
            is_text = kinds == Kind.TEXT
            kinds[is_text] = np.where(empty[values[is_text].astype(np.int64)], Kind.BLANK, Kind.TEXT)
    if not kinds.any():
        # A stray cell makes a sheet wide: columns of nothing are handed over as nothing.
        return b"", b"", []
    return kinds.tobytes(), values.tobytes(), [_plain(text) for text in texts]


def _seconds_of_day(moment: time) -> float:
    return moment.hour * 3600 + moment.minute * 60 + moment.second + moment.microsecond / 1e6


def _plain(text: str) -> str:
    """`text` with one kind of line end and without characters that no workbook can hold."""
    if text.isprintable():
        return text
    text = text.replace("\r\n", "\n").replace("\r", "\n")
    return "".join(
        c if c in "\t\n" or (c >= " " and c not in "\ufffe\uffff") else "\N{REPLACEMENT CHARACTER}"
        for c in text
    )


# By `Kind`: a table, because looking up the members of an enumeration costs more than all the rest.
_MADE: tuple[Callable[[float, list[str]], Cell], ...] = (
    lambda value, texts: None,
    lambda value, texts: value,
    lambda value, texts: texts[int(value)],
    lambda value, texts: bool(value),
    lambda value, texts: date.fromordinal(int(value) + _EPOCH),
    lambda value, texts: _EPOCH_MOMENT + timedelta(seconds=value),
    lambda value, texts: (_EPOCH_MOMENT + timedelta(seconds=value)).time(),
    lambda value, texts: timedelta(seconds=value),
)


@dataclass(frozen=True, eq=False)
class Column:
    """One column of a sheet, from its first row on.

    Attributes
    ----------
    kinds : ndarray of uint8, shape (rows,)
        The `Kind` of each cell.
    values : ndarray, shape (rows,)
    texts : list of str
        Table of the column's texts.
    """

    kinds: NDArray[np.uint8]
    values: NDArray[np.float64]
    texts: list[str]

    @classmethod
    def unpack(cls, packed: PackedColumn, count: int) -> Column:
        """The column of `count` rows that `pack_column` packed."""
        kinds, values, texts = packed
        if not kinds:
            return cls(
                np.broadcast_to(np.uint8(Kind.BLANK), (count,)),
                np.broadcast_to(np.float64(0.0), (count,)),
                [],
            )
        return cls(np.frombuffer(kinds, dtype=np.uint8), np.frombuffer(values), texts)

    @property
    def filled(self) -> NDArray[np.bool_]:
        """Which cells hold something, shape (rows,)."""
        return np.asarray(self.kinds != Kind.BLANK)

    def cell(self, row: int) -> Cell:
        """The value of one cell."""
        return _MADE[int(self.kinds[row])](float(self.values[row]), self.texts)

    def stated(self, row: int) -> str:
        """The value of one cell as a fault quotes it."""
        value = self.cell(row)
        if value is None:
            return "nothing"
        if isinstance(value, str):
            return f'the text "{value if len(value) <= 40 else value[:37] + "…"}"'
        if isinstance(value, bool):
            return f"the truth value {str(value).upper()}"
        if isinstance(value, float):
            return f"{value:.12g}"
        if isinstance(value, datetime):
            return f"the date and time {value:%Y-%m-%d %H:%M}"
        if isinstance(value, date):
            return f"the date {value.isoformat()}"
        return f"the time {value}"


@dataclass(frozen=True, eq=False)
class SheetColumns:
    """One sheet as columns from A on, all of one length.

    Attributes
    ----------
    name : str
    hidden : bool
    count : int
        Number of rows.
    columns : list of Column
    """

    name: str
    hidden: bool
    count: int
    columns: list[Column]

    def text(self, row: int, column: int) -> str:
        """A cell as a heading or a name: text as it stands, anything else spelt out, "" for a blank."""
        value = self.columns[column].cell(row)
        if value is None:
            return ""
        if isinstance(value, float) and value.is_integer() and abs(value) < 1e15:
            return str(int(value))
        return str(value).upper() if isinstance(value, bool) else str(value)


class ColumnRows(Sequence["list[Cell]"]):
    """The rows of a sheet, each made when it is asked for."""

    def __init__(self, sheet: SheetColumns) -> None:
        self._sheet = sheet

    def __len__(self) -> int:
        """Number of rows."""
        return self._sheet.count

    @overload
    def __getitem__(self, index: int) -> list[Cell]: ...

    @overload
    def __getitem__(self, index: slice) -> list[list[Cell]]: ...

    def __getitem__(self, index: int | slice) -> list[Cell] | list[list[Cell]]:
        """One row, or several."""
        if isinstance(index, slice):
            return [self[row] for row in range(*index.indices(len(self)))]
        row = index + len(self) if index < 0 else index
        if not 0 <= row < len(self):
            raise IndexError(f"no row {index} in a sheet of {len(self)} rows")
        return [column.cell(row) for column in self._sheet.columns]


@cache
def column_letters(column: int) -> str:
    """Letters of a 0-based column: 0 is A, 26 is AA."""
    letters = ""
    column += 1
    while column:
        column, digit = divmod(column - 1, 26)
        letters = chr(65 + digit) + letters
    return letters


def address(row: int, column: int) -> str:
    """Address of a cell by 0-based row and column."""
    return f"{column_letters(column)}{row + 1}"


def pack_rows(rows: Iterable[Sequence[Any]]) -> list[PackedColumn]:
    """The columns of rows of one length."""
    return [pack_column(cells) for cells in zip(*rows, strict=True)]
