"""Where a source has the headings and rows of the book workbook."""

from __future__ import annotations

import difflib
from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from desk.book import Severity
from desk.intake.columns import ColumnRows, SheetColumns, address
from desk.intake.faults import FaultList
from desk.intake.records import SheetGrid
from desk.intake.sheets import (
    SHEETS,
    SheetLayout,
    by_fold,
    find_known,
    fold,
    heading_years,
    known_heading,
    looks_like_years,
)

__all__ = ["SHEETS", "SheetLayout", "SourceSheet", "Table", "find_known", "fold", "lay_out"]

IntArray = NDArray[np.int64]

_HEADING_DEPTH = 25
"""Rows in which headings are looked for, counted from the first that is filled."""
_MOST_YEARS = 200.0
"""Years from the valuation date beyond which a figure is taken for a slip."""


@dataclass(eq=False)
class SourceSheet:
    """One sheet of a source.

    Attributes
    ----------
    data : SheetColumns
    broken : dict of int to dict of int to str
        By column and row (0-based): cells whose value is an error or was never stored, and how to say so.
    hidden_rows, hidden_columns : list of (int, int)
        Runs, first and last, 0-based.
    """

    data: SheetColumns
    broken: dict[int, dict[int, str]] = field(default_factory=dict)
    hidden_rows: list[tuple[int, int]] = field(default_factory=list)
    hidden_columns: list[tuple[int, int]] = field(default_factory=list)

    @property
    def name(self) -> str:
        """Its name, as the source states it."""
        return self.data.name

    def filled(self, columns: Sequence[int]) -> NDArray[np.bool_]:
        """Which rows hold something in one of the columns, shape (rows,)."""
        result = np.zeros(self.data.count, dtype=np.bool_)
        for column in columns:
            result |= self.data.columns[column].filled
            rows = [row for row in self.broken.get(column, ()) if row < result.size]
            result[rows] = True
        return result


@dataclass(eq=False)
class Table:
    """A sheet of which the headings are known.

    Attributes
    ----------
    sheet : SourceSheet
    layout : SheetLayout
    heading_row : int
    fields : dict of str to int
        Column of each known heading that is there.
    further : list of (str, int)
        Heading and column of every other column.
    rows : ndarray of int, shape (n,)
        The rows of data.
    years : list of (float, int)
        Years and column of each heading that states years, in the order of the columns.
    """

    sheet: SourceSheet
    layout: SheetLayout
    heading_row: int
    fields: dict[str, int]
    further: list[tuple[str, int]]
    rows: IntArray
    years: list[tuple[float, int]] = field(default_factory=list)

    def column(self, heading: str) -> int | None:
        """Column of a heading, None where it is missing."""
        return self.fields.get(heading)

    def grid(self) -> SheetGrid:
        """The sheet for showing it."""
        return SheetGrid(
            self.sheet.name,
            ColumnRows(self.sheet.data),
            {
                **{column: heading for heading, column in self.fields.items()},
                **{column: f"{self.layout.years} {years:g}".capitalize() for years, column in self.years},
            },
            self.heading_row,
            self.sheet.data.hidden,
        )


def lay_out(sheet: SourceSheet, layout: SheetLayout, faults: FaultList) -> Table | None:
    """Find the headings of a sheet and the rows beneath them; what is wrong is added to `faults`."""
    data, name = sheet.data, sheet.name
    known = by_fold(layout.columns)
    heading_row = _find_headings(sheet, known)
    if heading_row is None and layout.years:
        heading_row = _first_full_row(sheet)
    wanted = ", ".join(layout.wanted)
    if heading_row is None:
        empty = not sheet.filled(range(len(data.columns))).any()
        faults.add(
            "the sheet is empty" if empty else "no row holds the headings",
            f"a row with the headings {wanted}",
            "Write the headings in the first row, one a column.",
            sheet=name,
        )
        return None
    fields, further = _match_headings(sheet, layout, heading_row, known, faults)
    years: list[tuple[float, int]] = []
    if layout.years:
        years, further = _take_years(sheet, layout, heading_row, further, faults)
    _report_missing(name, layout, fields, heading_row, faults)
    if (above := np.flatnonzero(sheet.filled(range(len(data.columns)))[:heading_row])).size:
        faults.mild(
            "1 row above the headings was not read"
            if above.size == 1
            else f"{above.size} rows above the headings were not read",
            "the headings in the first row",
            "Nothing needs to be done if these are titles; otherwise move the headings up.",
            sheet=name,
            row=int(above[0]),
            column=0,
        )
    own = [*fields.values(), *(column for _, column in years)]
    if layout.more:
        own += [column for _, column in further]
    beneath = np.arange(data.count) > heading_row
    rows = np.flatnonzero(sheet.filled(own) & beneath)
    _report_remarks(sheet, further, own, beneath, faults)
    shown = {f"{stated:g}": column for stated, column in years}
    _report_hidden(sheet, fields | shown, rows, faults)
    return Table(sheet, layout, heading_row, fields, further, rows, years)


def _find_headings(sheet: SourceSheet, known: dict[str, str]) -> int | None:
    """The row that holds most of the known headings, the first of equals; None where no row holds any."""
    data = sheet.data
    filled = np.flatnonzero(sheet.filled(range(len(data.columns))))
    best, most = None, 0
    for row in filled[:_HEADING_DEPTH].tolist():
        held = {known_heading(data.text(row, column), known) for column in range(len(data.columns))} - {None}
        if len(held) > most:
            best, most = row, len(held)
    return best


def _first_full_row(sheet: SourceSheet) -> int | None:
    """The first row that is about as full as any near the top: headings without a known one among them."""
    filled = np.flatnonzero(sheet.filled(range(len(sheet.data.columns))))[:_HEADING_DEPTH]
    if not filled.size:
        return None
    held = np.zeros(filled.size, dtype=np.int64)
    for column in sheet.data.columns:
        held += column.filled[filled]
    # The column of the paths often has no heading, which makes the headings the shorter row.
    return int(filled[np.argmax(held >= max(int(held.max()) - 1, 1))])


def _take_years(
    sheet: SourceSheet,
    layout: SheetLayout,
    heading_row: int,
    further: list[tuple[str, int]],
    faults: FaultList,
) -> tuple[list[tuple[float, int]], list[tuple[str, int]]]:
    """The columns headed by years, and the further ones that are left."""
    years: list[tuple[float, int]] = []
    rest: list[tuple[str, int]] = []
    seen: dict[float, int] = {}
    what = f"the years of a {layout.years}"

    def tell(column: int, found: str, expected: str, mend: str, severity: Severity = Severity.GRAVE) -> None:
        faults.add(found, expected, mend, sheet=sheet.name, row=heading_row, column=column, severity=severity)

    for text, column in further:
        stated = heading_years(text)
        shown = f"{stated:g}" if stated is not None else text[:60]
        if stated is None and not looks_like_years(text):
            if sheet.data.columns[column].kinds[heading_row]:
                _report_unknown(text, layout, False, faults, sheet=sheet.name, row=heading_row, column=column)
            rest.append((text, column))
        elif stated is None:
            found = f'the heading "{shown}" is no number of years'
            tell(column, found, f"{what}, as 5 or 0.25", "Write the years as a plain number.")
        elif not 0.0 < stated <= _MOST_YEARS:
            expected = f"{what}, above 0 and at most {_MOST_YEARS:g}"
            tell(column, f"the heading is {shown} years", expected, "Correct the heading.")
        elif stated in seen:
            found = f"the {layout.years} {shown} stands twice, also in {address(heading_row, seen[stated])}"
            tell(column, found, f"each {layout.years} once", "Remove one of the two columns.")
        else:
            if seen and stated < max(seen):
                tell(
                    column,
                    f"the {layout.years} {shown} stands after {max(seen):g}",
                    f"{layout.years}s that rise",
                    f"The columns are taken in the order of their {layout.years}s; "
                    "correct the heading if it is a slip.",
                    Severity.MILD,
                )
            seen[stated] = column
            years.append((stated, column))
    if not years and not any(looks_like_years(text) for text, _ in further):
        faults.add(
            f"no column is headed by {what}",
            f"one column a {layout.years}, headed by its years",
            f"Write the years of each {layout.years} over its column.",
            sheet=sheet.name,
            row=heading_row,
        )
    return years, rest


def _match_headings(
    sheet: SourceSheet, layout: SheetLayout, heading_row: int, known: dict[str, str], faults: FaultList
) -> tuple[dict[str, int], list[tuple[str, int]]]:
    """Columns of the known headings, and the further columns."""
    data, name = sheet.data, sheet.name
    fields: dict[str, int] = {}
    further: list[tuple[str, int]] = []
    seen: dict[str, int] = {}
    for column in range(len(data.columns)):
        text = data.text(heading_row, column).strip()
        heading = known_heading(text, known)
        if heading in fields:
            faults.add(
                f'the heading "{heading}" stands twice, also in {address(heading_row, fields[heading])}',
                "each heading once",
                "Remove or rename one of the two columns.",
                sheet=name,
                row=heading_row,
                column=column,
            )
        elif heading is not None:
            fields[heading] = column
        elif text:
            if not layout.more and not layout.years:
                _report_unknown(
                    text, layout, fold(text) in seen, faults, sheet=name, row=heading_row, column=column
                )
            seen[fold(text)] = column
            further.append((text, column))
        elif not layout.spread and sheet.filled([column])[heading_row + 1 :].any():
            letters = address(0, column)[:-1]
            faults.mild(
                f"column {letters} holds data but has no heading",
                "a heading over every column",
                f'It is kept as a note under "Column {letters}"; write a heading over it.',
                sheet=name,
                row=heading_row,
                column=column,
            )
            further.append((f"Column {letters}", column))
    return fields, further


def _report_unknown(
    text: str, layout: SheetLayout, repeated: bool, faults: FaultList, *, sheet: str, row: int, column: int
) -> None:
    close = difflib.get_close_matches(fold(text), [fold(heading) for heading in layout.columns], 1, 0.75)
    hint = next((heading for heading in layout.columns if close and fold(heading) == close[0]), None)
    faults.mild(
        f'the heading "{text[:60]}" is not one of this sheet\'s' + (" and stands twice" if repeated else ""),
        f"one of {', '.join(layout.allowed)}",
        (f'Did you mean "{hint}"? ' if hint else "") + "The column is kept as a note.",
        sheet=sheet,
        row=row,
        column=column,
    )


def _report_missing(
    name: str, layout: SheetLayout, fields: dict[str, int], heading_row: int, faults: FaultList
) -> None:
    for heading in layout.columns:
        if heading not in fields and heading not in layout.optional:
            faults.add(
                f'the heading "{heading}" is missing',
                f'a column "{heading}"',
                f'Add the column "{heading}" in row {heading_row + 1}.',
                sheet=name,
                row=heading_row,
            )
    if "Year" in layout.columns and not {"Date", "Year"} & fields.keys():
        faults.add(
            'neither "Date" nor "Year" is among the headings',
            "a column with the date of each flow, or with its years from the valuation date",
            f'Add the column "Date" or "Year" in row {heading_row + 1}.',
            sheet=name,
            row=heading_row,
        )


def _report_remarks(
    sheet: SourceSheet,
    further: list[tuple[str, int]],
    own: list[int],
    beneath: NDArray[np.bool_],
    faults: FaultList,
) -> None:
    """Rows that hold nothing but a note belong to no row of data."""
    notes = {column: sheet.filled([column]) for _, column in further if column not in own}
    for row in np.flatnonzero(sheet.filled(list(notes)) & ~sheet.filled(own) & beneath).tolist():
        column = next(column for column, filled in notes.items() if filled[row])
        faults.mild(
            "the row holds only a note and was not read",
            "a note beside a row of data",
            "Move the note to a row of data, or leave it out.",
            sheet=sheet.name,
            row=row,
            column=column,
        )


def _report_hidden(sheet: SourceSheet, fields: dict[str, int], rows: IntArray, faults: FaultList) -> None:
    name = sheet.name
    if sheet.data.hidden and rows.size:
        faults.mild(
            "the sheet is hidden and was read",
            "data that can be seen",
            "Unhide the sheet, or remove it if it should not count.",
            sheet=name,
        )
    column = min(fields.values(), default=0)
    for first, last in sheet.hidden_rows:
        used = rows[(rows >= first) & (rows <= last)]
        if used.size:
            which = f"row {used[0] + 1} is" if used.size == 1 else f"rows {used[0] + 1} to {used[-1] + 1} are"
            faults.mild(
                f"{which} hidden and {'was' if used.size == 1 else 'were'} read",
                "data that can be seen",
                "Unhide the rows, or remove them if they should not count.",
                sheet=name,
                row=int(used[0]),
                column=column,
            )
    for heading, place in fields.items():
        if any(first <= place <= last for first, last in sheet.hidden_columns):
            faults.mild(
                f'the column "{heading}" is hidden and was read',
                "data that can be seen",
                "Unhide the column.",
                sheet=name,
                row=0,
                column=place,
            )
