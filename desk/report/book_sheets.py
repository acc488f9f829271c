"""Sheets of items and sheets of rows, with their notes beside them."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence

from desk.book import Notes
from desk.intake.sheets import SHEETS, find_known
from desk.report.plain_workbook import PlainSheet, Style, Value
from desk.report.safe_cells import LONGEST_TEXT

__all__ = ["items_sheet", "rows_sheet", "table_sheet", "unless_zero"]

_STYLES = {
    **dict.fromkeys(
        ("Rate", "Coupon", "Premium", "Volatility", "Dividend yield", "Short rate"), Style.PERCENT
    ),
    **dict.fromkeys(
        ("Discount rate", "Current rate", "Margin", "Default rate", "Recovery rate"), Style.PERCENT
    ),
    **dict.fromkeys(("Spread", "Yield", "Rise", "Floor", "Cap", "Discount spread"), Style.PERCENT),
    **dict.fromkeys(("Strike", "Shift"), Style.PERCENT),
    **dict.fromkeys(("Amount", "Nominal", "Market value", "Value", "Units"), Style.MONEY),
    **dict.fromkeys(("Term", "Year", "Duration", "Expiry", "Length"), Style.YEARS),
    **dict.fromkeys(("Date", "Maturity", "Start date", "First coupon"), Style.DATE),
}
_ITEM_STYLES = {
    **dict.fromkeys(("Liability spread", "Market risk premium", "Volatility"), Style.PERCENT),
    **dict.fromkeys(("Long-run rate", "Starting rate", "Second volatility"), Style.PERCENT),
    **dict.fromkeys(("Beta 0", "Beta 1", "Beta 2", "Beta 3", "Flat rate"), Style.PERCENT),
    **dict.fromkeys(("Expected return", "Inflation volatility", "Recent inflation"), Style.PERCENT),
    "Paths": Style.WHOLE,
}
_WIDTHS = {"Line": 30.0, "Name": 34.0, "Item": 24.0, "Shock": 30.0, "Applies to": 30.0, "Source": 40.0}
_WIDTH = 16.0
_VALUE_WIDTH = 28.0
_NOTE_WIDTH = 24.0
_LAST_ROW = 1_048_576


def table_sheet(sheet: str, rows: Sequence[Sequence[Value]], notes: Notes | None) -> PlainSheet:
    """A table whose optional columns are left out where no row fills them."""
    layout = SHEETS[sheet]
    used = [
        number
        for number, heading in enumerate(layout.columns)
        if heading not in layout.optional or any(row[number] is not None for row in rows)
    ]
    headings = [layout.columns[number] for number in used]
    return rows_sheet(sheet, headings, ([row[number] for number in used] for row in rows), notes, len(rows))


def items_sheet(sheet: str, items: dict[str, Value], notes: Notes | None) -> PlainSheet:
    """A sheet of items and values, each item beside its notes; an item with neither is left out."""
    beside: dict[str, tuple[Value, ...]] = {}
    further: tuple[str, ...] = ()
    if notes is not None:
        further = notes.headings[1:]
        for row in notes.rows:
            item = find_known(str(row[0]), tuple(items))
            if item is None:
                raise ValueError(
                    f"the notes of the sheet {sheet} name an item {row[0]!r} that it does not have"
                )
            beside[item] = row[1:]
    empty = (None,) * len(further)
    plain = [Style.PLAIN] * len(further)
    rows = [
        (
            [item, _checked(value), *beside.get(item, empty)],
            [Style.PLAIN, _ITEM_STYLES.get(item, Style.PLAIN), *plain],
        )
        for item, value in items.items()
        if value is not None or item in beside
    ]
    widths = [_WIDTHS["Item"], _VALUE_WIDTH, *[_NOTE_WIDTH] * len(further)]
    return PlainSheet(sheet, ["Item", "Value", *further], widths, rows)


def rows_sheet(
    sheet: str,
    headings: Sequence[Value],
    rows: Iterable[Sequence[Value]],
    notes: Notes | None,
    count: int,
    *,
    styles: list[Style] | None = None,
) -> PlainSheet:
    """A sheet of rows with their notes beside them."""
    if count >= _LAST_ROW:
        raise ValueError(f"the sheet {sheet} would need {count + 1:,} rows; a sheet has {_LAST_ROW:,}")
    own = styles or [_STYLES.get(str(heading), Style.PLAIN) for heading in headings]
    widths = [_WIDTHS.get(str(heading), _WIDTH) for heading in headings]
    if notes is None:
        return PlainSheet(sheet, headings, widths, ((row, own) for row in rows))
    if len(notes.rows) != count:
        raise ValueError(f"the notes of the sheet {sheet} have {len(notes.rows)} rows for {count} of data")
    further = [Style.PLAIN] * len(notes.headings)
    return PlainSheet(
        sheet,
        [*headings, *notes.headings],
        [*widths, *[_NOTE_WIDTH] * len(further)],
        (
            ([*row, *map(_checked, beside)], [*own, *further])
            for row, beside in zip(rows, notes.rows, strict=True)
        ),
    )


def _checked(value: Value) -> Value:
    """A value that is no name: a text too long for a cell is refused rather than cut."""
    if isinstance(value, str) and len(value) > LONGEST_TEXT:
        raise ValueError(f"a workbook holds no text of {len(value):,} characters")
    return value


def unless_zero(value: float) -> float | None:
    """A number; None for a plain 0, which an empty cell states as well."""
    return value if value != 0.0 or math.copysign(1.0, value) < 0.0 else None
