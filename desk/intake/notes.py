"""Further columns, kept as notes beside the rows of the book."""

from __future__ import annotations

from datetime import date, datetime, time, timedelta

from desk.book import Notes, RiskyAssets
from desk.intake.assets import further_columns
from desk.intake.cells import Cells
from desk.intake.columns import address
from desk.intake.faults import FaultList
from desk.intake.layout import SHEETS, Table, find_known
from desk.intake.records import Cell

__all__ = ["read_notes"]

NoteValue = str | float | None


def read_notes(
    tables: dict[str, Table], risky_assets: RiskyAssets | None, faults: FaultList
) -> tuple[Notes, ...]:
    """The notes of every sheet that has further columns, in the order of the book's sheets.

    On a sheet of items and values the first heading of the notes is ``Item``, and only items with a note
    are in it.
    """
    notes = []
    for name in SHEETS:
        table = tables.get(name)
        if table is None:
            continue
        further = table.further
        if table.layout.more:
            further = further_columns(table, () if risky_assets is None else risky_assets.names)
            if risky_assets is not None:
                _report_unknown(table, further, faults)
        if not further:
            continue
        _report_broken(table, further, faults)
        columns = [table.sheet.data.columns[column] for _, column in further]
        headings = tuple(heading for heading, _ in further)
        rows: list[tuple[NoteValue, ...]] = [
            tuple(_note(column.cell(row)) for column in columns) for row in table.rows.tolist()
        ]
        if table.layout.items:
            notes.append(Notes(name, ("Item", *headings), _by_item(table, rows)))
        else:
            notes.append(Notes(name, headings, tuple(rows)))
    return tuple(notes)


def _note(value: Cell) -> NoteValue:
    """A cell as a note: a number or a text."""
    if value is None or (isinstance(value, str) and not value.strip()):
        return None
    if isinstance(value, bool):
        return str(value).upper()
    if isinstance(value, int | float):
        return float(value)
    if isinstance(value, datetime):
        return value.isoformat(sep=" ")
    if isinstance(value, date | time):
        return value.isoformat()
    return str(value) if isinstance(value, timedelta) else value


def _by_item(table: Table, rows: list[tuple[NoteValue, ...]]) -> tuple[tuple[NoteValue, ...], ...]:
    """The rows that hold a note, each with its item before it, in the order of the items."""
    column = table.fields.get("Item", 0)
    found: dict[str, tuple[NoteValue, ...]] = {}
    for row, values in zip(table.rows.tolist(), rows, strict=True):
        item = find_known(table.sheet.data.text(row, column), table.layout.items)
        if item is not None and any(value is not None for value in values):
            found.setdefault(item, values)
    return tuple((item, *found[item]) for item in table.layout.items if item in found)


def _report_unknown(table: Table, further: list[tuple[str, int]], faults: FaultList) -> None:
    for heading, column in further:
        faults.mild(
            f'the heading "{heading[:60]}" is neither one of this sheet\'s nor the name of an asset',
            f"one of {', '.join(table.layout.columns)}, or a name",
            "The column is kept as a note.",
            sheet=table.sheet.name,
            row=table.heading_row,
            column=column,
        )


def _report_broken(table: Table, further: list[tuple[str, int]], faults: FaultList) -> None:
    """Error cells among the notes do no harm, but they are said."""
    for heading, column in further:
        cells = Cells(table.sheet, column, table.rows, faults)
        for entry, row in enumerate(table.rows.tolist() if cells.broken else ()):
            if row in cells.broken:
                cells.mild(
                    entry,
                    cells.broken[row],
                    f'a note under "{heading[:60]}" (at {address(row, column)})',
                    "It is kept as an empty note; mend the formula.",
                )
