"""Rows over columns, sorted by numpy, with marks, edits and emphasis."""

from __future__ import annotations

from collections.abc import Callable, Collection, Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QAbstractTableModel, QModelIndex, QObject, QPersistentModelIndex, Qt, Signal

from desk.window.parts.columns import Column, Mark

__all__ = ["Index", "TableModel", "Values", "plain_column"]

Index = QModelIndex | QPersistentModelIndex
Values = Sequence[Any] | NDArray[Any]

_NOWHERE = QModelIndex()


def plain_column(values: Values, column: Column) -> NDArray[Any]:
    """`values` as an array that can be sorted and sampled; None becomes NaN among figures."""
    if isinstance(values, np.ndarray) and values.dtype.kind in "fiubM":
        return values
    if column.is_numeric:
        return np.array([np.nan if value is None else value for value in values], dtype=np.float64)
    if column.kind == "date":
        return np.array(
            [np.datetime64("NaT", "D") if value is None else value for value in values], "datetime64[D]"
        )
    array = np.empty(len(values), dtype=object)
    array[:] = list(values)
    return array


def _order(values: NDArray[Any], *, falling: bool) -> NDArray[np.intp]:
    """Stable order of the rows; what has no value comes last either way."""
    if values.dtype.kind == "M":
        keys = np.where(np.isnat(values), np.nan, values.astype("datetime64[D]").astype(np.int64))
    elif values.dtype.kind == "O":
        texts = ["" if value is None else str(value).casefold() for value in values]
        _, ranks = np.unique(np.array(texts, dtype=object), return_inverse=True)
        keys = np.where([text == "" for text in texts], np.nan, ranks.astype(np.float64))
    else:
        keys = values.astype(np.float64)
    return np.argsort(-keys if falling else keys, kind="stable")


class TableModel(QAbstractTableModel):
    """Rows over columns of equal length, sorted by numpy.

    A *source row* counts in the order of the data, a *row* as shown.

    Signals
    -------
    refused(str)
        An edit was not taken, and why.
    """

    refused = Signal(str)

    def __init__(self, columns: Sequence[Column], parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._columns = tuple(columns)
        self._values: list[NDArray[Any]] = [plain_column((), column) for column in columns]
        self._order: NDArray[np.intp] = np.arange(0)
        self._count = 0
        self._shown: NDArray[np.bool_] | None = None
        self._sorted_by: tuple[int, bool] | None = None
        self._marks: dict[tuple[int, str], Mark] = {}
        self._strong: frozenset[int] = frozenset()
        self.commit: Callable[[int, str, Any], str | None] | None = None
        """Called with source row, key and new value; returns why it was not taken, or None."""

    # The data

    @property
    def columns(self) -> tuple[Column, ...]:
        """The columns, from the left."""
        return self._columns

    def set_columns(self, columns: Sequence[Column]) -> None:
        """Show other columns; the rows are gone until `set_rows`."""
        self.beginResetModel()
        self._columns = tuple(columns)
        self._values = [plain_column((), column) for column in columns]
        self._count = 0
        self._sorted_by = None
        self._shown = None
        self._marks = {}
        self._strong = frozenset()
        self._arrange()
        self.endResetModel()

    def set_rows(
        self,
        data: Mapping[str, Values],
        *,
        marks: Mapping[tuple[int, str], Mark] | None = None,
        strong: Collection[int] = (),
    ) -> None:
        """Show other rows, in the order chosen so far.

        Parameters
        ----------
        data : mapping of str to sequence or ndarray
            One entry a column, by key, all of one length.
        marks : mapping of (source row, key) to Mark, optional
        strong : collection of int
            Source rows with emphasis: totals, which come last in any order but that of the data.
        """
        values = [plain_column(data[column.key], column) for column in self._columns]
        lengths = {len(array) for array in values}
        if len(lengths) > 1:
            raise ValueError("`data` must hold columns of one length")
        self.beginResetModel()
        count = lengths.pop() if lengths else 0
        if self._shown is not None and len(self._shown) != count:
            self._shown = None
        self._values, self._count = values, count
        self._marks, self._strong = dict(marks or {}), frozenset(strong)
        self._arrange()
        self.endResetModel()

    def set_marks(self, marks: Mapping[tuple[int, str], Mark]) -> None:
        """Mark other cells."""
        self._marks = dict(marks)
        if self.rowCount() and self._columns:
            self.dataChanged.emit(self.index(0, 0), self.index(self.rowCount() - 1, len(self._columns) - 1))

    def show_only(self, wanted: NDArray[np.bool_] | None) -> None:
        """Show only the source rows that `wanted` (one flag a row) picks; None for all."""
        if wanted is not None and len(wanted) != self._count:
            raise ValueError("`wanted` must hold one flag for each row")
        self.beginResetModel()
        self._shown = None if wanted is None else np.array(wanted, dtype=bool)
        self._arrange()
        self.endResetModel()

    def column_values(self, key: str) -> NDArray[Any]:
        """One column, in source order."""
        return self._values[self.column_of(key)]

    def column_of(self, key: str) -> int:
        """The place of the column named `key`."""
        return next(place for place, column in enumerate(self._columns) if column.key == key)

    def source_row(self, row: int) -> int:
        """The source row shown at `row`."""
        return int(self._order[row])

    def row_of(self, source_row: int) -> int:
        """Where a source row is shown; -1 where it is not."""
        found = np.flatnonzero(self._order == source_row)
        return int(found[0]) if found.size else -1

    def value_at(self, row: int, place: int) -> Any:
        """The value shown at `row` in the column at `place`."""
        return self._values[place][self._order[row]]

    def values_at(self, rows: Sequence[int], place: int) -> NDArray[Any]:
        """The values shown at `rows` in the column at `place`."""
        return self._values[place][self._order[list(rows)]]

    def mark_at(self, row: int, place: int) -> Mark | None:
        """The mark of a cell."""
        if not self._marks:
            return None
        return self._marks.get((self.source_row(row), self._columns[place].key))

    def is_strong(self, row: int) -> bool:
        """Whether a row has emphasis."""
        return bool(self._strong) and self.source_row(row) in self._strong

    def _arrange(self) -> None:
        if self._sorted_by is None:
            order = np.arange(self._count)
        else:
            place, falling = self._sorted_by
            order = _order(self._values[place], falling=falling)
            if self._strong:
                # Totals stay under what they sum up.
                totals = np.isin(order, list(self._strong))
                order = np.concatenate((order[~totals], np.sort(order[totals])))
        if self._shown is not None:
            order = order[self._shown[order]]
        self._order = order

    # What Qt asks

    def rowCount(self, parent: Index = _NOWHERE) -> int:
        """Rows shown."""
        return 0 if parent.isValid() else len(self._order)

    def columnCount(self, parent: Index = _NOWHERE) -> int:
        """Columns."""
        return 0 if parent.isValid() else len(self._columns)

    def data(self, index: Index, role: int = Qt.ItemDataRole.DisplayRole) -> Any:
        """What a cell shows."""
        if not index.isValid():
            return None
        row, place = index.row(), index.column()
        column = self._columns[place]
        if role == Qt.ItemDataRole.DisplayRole:
            return column.shown(self.value_at(row, place))
        if role == Qt.ItemDataRole.EditRole:
            return column.edited(self.value_at(row, place))
        if role == Qt.ItemDataRole.TextAlignmentRole:
            side = Qt.AlignmentFlag.AlignRight if column.stands_right else Qt.AlignmentFlag.AlignLeft
            return side | Qt.AlignmentFlag.AlignVCenter
        if role == Qt.ItemDataRole.ToolTipRole:
            mark = self.mark_at(row, place)
            return mark.text if mark else None
        if role == Qt.ItemDataRole.AccessibleTextRole:
            text = column.shown(self.value_at(row, place))
            mark = self.mark_at(row, place)
            return f"{text} ({'fault' if mark.grave else 'note'}: {mark.text})" if mark else text
        return None

    def headerData(
        self, section: int, orientation: Qt.Orientation, role: int = Qt.ItemDataRole.DisplayRole
    ) -> Any:
        """Headings; the unit goes with them for a reader who listens."""
        if orientation is not Qt.Orientation.Horizontal or not 0 <= section < len(self._columns):
            return None
        column = self._columns[section]
        if role == Qt.ItemDataRole.DisplayRole:
            return column.heading
        if role == Qt.ItemDataRole.AccessibleTextRole:
            return f"{column.heading}, {column.shown_unit}" if column.shown_unit else column.heading
        if role == Qt.ItemDataRole.ToolTipRole:
            return column.tooltip or None
        return None

    def flags(self, index: Index) -> Qt.ItemFlag:
        """Editable where the column is and someone takes the edits."""
        if not index.isValid():
            return Qt.ItemFlag.NoItemFlags
        flags = Qt.ItemFlag.ItemIsEnabled | Qt.ItemFlag.ItemIsSelectable
        if self.commit is not None and self._columns[index.column()].editable:
            flags |= Qt.ItemFlag.ItemIsEditable
        return flags

    def setData(self, index: Index, value: Any, role: int = Qt.ItemDataRole.EditRole) -> bool:
        """Hand an edit on; the rows change when whoever took it sets them."""
        if role != Qt.ItemDataRole.EditRole or not index.isValid() or self.commit is None:
            return False
        column = self._columns[index.column()]
        text = str(value)
        if text.strip() == column.edited(self.value_at(index.row(), index.column())).strip():
            return False
        parsed = column.parsed(text)
        if parsed is None and text.strip():
            what = {"date": "a date", "flag": "yes or no", "integer": "a whole number"}
            self.refused.emit(
                f"“{text}” is not {what.get(column.kind, 'a number')}; {column.heading} is unchanged."
            )
            return False
        reason = self.commit(self.source_row(index.row()), column.key, parsed)
        if reason:
            self.refused.emit(reason)
        return not reason

    def sort(self, column: int, order: Qt.SortOrder = Qt.SortOrder.AscendingOrder) -> None:
        """Sort by a column; by none (-1) in the order of the data."""
        self.layoutAboutToBeChanged.emit()
        before = self.persistentIndexList()
        sources = [(self.source_row(index.row()), index.column()) for index in before]
        known = 0 <= column < len(self._columns)
        self._sorted_by = (column, order is Qt.SortOrder.DescendingOrder) if known else None
        self._arrange()
        if before:
            places = np.full(max(self._count, 1), -1)
            places[self._order] = np.arange(len(self._order))
            after = [self.index(int(places[source]), place) for source, place in sources]
            self.changePersistentIndexList(before, after)
        self.layoutChanged.emit()
