"""A book written as a book workbook that reads in again the same."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from datetime import date
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from desk.book import Book, FlowTable, Holding, HoldingKind, Notes
from desk.intake.layout import SHEETS, find_known, fold
from desk.report.safe_cells import LONGEST_TEXT, clean_text, put, write_whole

if TYPE_CHECKING:
    from openpyxl import Workbook

__all__ = ["write_book"]

Value = str | float | date | np.datetime64 | None

_PERCENT = "0.0000%"
_MONEY = "#,##0.00"
_YEARS = "0.0000"
_FORMATS = {
    **dict.fromkeys(("Rate", "Coupon", "Premium", "Volatility", "Dividend yield", "Short rate"), _PERCENT),
    **dict.fromkeys(("Amount", "Nominal", "Market value", "Value", "Units"), _MONEY),
    **dict.fromkeys(("Term", "Year", "Duration"), _YEARS),
}
_ITEM_FORMATS = {
    **dict.fromkeys(("Liability spread", "Market risk premium", "Volatility"), _PERCENT),
    **dict.fromkeys(("Long-run rate", "Starting rate", "Second volatility"), _PERCENT),
    "Paths": "#,##0",
}
_WIDTHS = {"Line": 30.0, "Name": 34.0, "Item": 24.0}
_WIDTH = 16.0
_NOTE_WIDTH = 24.0
_LAST_ROW = 1_048_576
_LARGEST_WHOLE = 2**53
"""Beyond this a cell, which holds a float, does not hold every whole number."""


def write_book(book: Book, path: Path) -> Path:
    """Write a book as a book workbook.

    The workbook reads in again as an equal book with an equal digest. The time of a flow that has a date
    is derived from it again; a text of blanks alone counts as none; a sheet without rows counts as absent.

    Parameters
    ----------
    book : Book
    path : Path
        Written whole or not at all.

    Returns
    -------
    Path
        `path`.

    Raises
    ------
    ValueError
        If the book holds what the workbook cannot: more rows than a sheet has, a name that is blank,
        too long or that of a heading, a date before March 1900, a number that is not finite.
    OSError
        If the file cannot be written.
    """
    from openpyxl import Workbook

    _check_names(book)
    notes = {note.sheet: note for note in book.notes}
    workbook = Workbook(write_only=True)
    _write_items(workbook, "Basis", _basis(book), notes.get("Basis"))
    basis = book.basis
    _write_table(
        workbook, "Curve", zip(basis.terms.tolist(), basis.rates.tolist(), strict=True), notes.get("Curve")
    )
    _write_flows(workbook, "Liabilities", book.liabilities, notes.get("Liabilities"))
    if book.holdings:
        _write_table(workbook, "Holdings", map(_holding, book.holdings), notes.get("Holdings"))
    if len(book.asset_flows):
        _write_flows(workbook, "Asset flows", book.asset_flows, notes.get("Asset flows"))
    if book.rates_model is not None:
        _write_items(workbook, "Rates model", _rates_model(book), notes.get("Rates model"))
    if book.risky_assets is not None and book.risky_assets.names:
        _write_risky_assets(workbook, book, notes.get("Risky assets"))
    _write_items(workbook, "Run", _run(book), notes.get("Run"))
    history = book.history
    if history is not None and history.date.size:
        rows = zip(history.date, history.rate.tolist(), strict=True)
        _write_table(workbook, "History", rows, notes.get("History"))
    return write_whole(path, workbook.save)


def _check_names(book: Book) -> None:
    """Refuse names that would not come back as they are."""
    for what, names in (
        ("line", book.liabilities.line_names),
        ("line", book.asset_flows.line_names),
        ("holding", [holding.name for holding in book.holdings]),
        ("asset", () if book.risky_assets is None else book.risky_assets.names),
    ):
        for name in names:
            if not name.strip():
                raise ValueError(f"a workbook holds no {what} without a name")
            if clean_text(name) != name:
                raise ValueError(f"a workbook does not hold the name of the {what} {name[:40]!r} as it is")
    if book.risky_assets is not None:
        reserved = {fold(heading) for heading in SHEETS["Risky assets"].columns}
        for name in book.risky_assets.names:
            if fold(name) in reserved:
                raise ValueError(f"no asset can be called {name!r}: the sheet has a heading of that name")
    if book.run.seed > _LARGEST_WHOLE:
        raise ValueError(f"a workbook holds no seed above {_LARGEST_WHOLE}")


def _basis(book: Book) -> dict[str, Value]:
    basis = book.basis
    return {
        "Title": basis.title or None,
        "Valuation date": basis.valuation_date,
        "Currency": basis.currency,
        "Curve kind": str(basis.curve_kind),
        "Compounding": str(basis.compounding),
        "Interpolation": str(basis.interpolation),
        "Liability spread": basis.liability_spread,
        "Market risk premium": basis.market_risk_premium,
        "Day count": str(basis.day_count),
    }


def _rates_model(book: Book) -> dict[str, Value]:
    model = book.rates_model
    if model is None:
        return {}
    return {
        "Model": str(model.name),
        "Mean reversion": model.mean_reversion,
        "Volatility": model.volatility,
        "Long-run rate": model.long_run_rate,
        "Starting rate": model.starting_rate,
        "Second mean reversion": model.second_mean_reversion,
        "Second volatility": model.second_volatility,
        "Factor correlation": model.factor_correlation,
        "Risk price": model.risk_price,
    }


def _run(book: Book) -> dict[str, Value]:
    run = book.run
    return {
        "Paths": run.paths,
        "Horizon (years)": run.horizon_years,
        "Steps a year": run.steps_per_year,
        "Seed": run.seed,
        "Measure": str(run.measure),
        "Percentiles": "; ".join(repr(float(level)).removesuffix(".0") for level in run.percentiles),
    }


def _holding(holding: Holding) -> tuple[Value, ...]:
    """A holding's row; what a kind does not have is left empty unless it is stated."""
    is_bond = holding.kind is HoldingKind.BOND
    return (
        holding.name,
        str(holding.kind),
        None if holding.kind is HoldingKind.FUND and holding.nominal == 0.0 else holding.nominal,
        holding.coupon if is_bond or holding.coupon != 0.0 else None,
        holding.frequency if is_bond or holding.frequency != 1 else None,
        holding.maturity,
        None if holding.day_count is None else str(holding.day_count),
        holding.market_value,
        holding.units,
        holding.duration,
    )


def _write_flows(workbook: Workbook, sheet: str, flows: FlowTable, notes: Notes | None) -> None:
    """Flows with the columns they use: a date where one is stated, the years where not."""
    dated = ~np.isnat(flows.date)
    columns: dict[str, Iterable[Value]] = {"Line": (flows.line_names[line] for line in flows.line.tolist())}
    if dated.any() or not len(flows):
        columns["Date"] = iter(flows.date)
    if not dated.all():
        columns["Year"] = (
            None if has_date else time
            for has_date, time in zip(dated.tolist(), flows.time.tolist(), strict=True)
        )
    columns["Amount"] = iter(flows.amount.tolist())
    if "Beta" in SHEETS[sheet].columns and flows.beta.any():
        columns["Beta"] = iter(flows.beta.tolist())
    _write_rows(workbook, sheet, list(columns), zip(*columns.values(), strict=True), notes, len(flows))


def _write_table(
    workbook: Workbook, sheet: str, rows: Iterable[Sequence[Value]], notes: Notes | None
) -> None:
    """A table whose optional columns are left out where no row fills them."""
    layout, rows = SHEETS[sheet], list(rows)
    used = [
        number
        for number, heading in enumerate(layout.columns)
        if heading not in layout.optional or any(row[number] is not None for row in rows)
    ]
    headings = [layout.columns[number] for number in used]
    kept = ([row[number] for number in used] for row in rows)
    _write_rows(workbook, sheet, headings, kept, notes, len(rows))


def _write_risky_assets(workbook: Workbook, book: Book, notes: Notes | None) -> None:
    assets = book.risky_assets
    if assets is None:
        return
    own = ["Name", "Value", "Premium", "Volatility", "Dividend yield"]
    rows = (
        [
            name,
            *(float(column[entry]) for column in (assets.value, assets.premium, assets.volatility)),
            float(assets.dividend_yield[entry]),
            *assets.correlation[entry].tolist(),
            float(assets.rates_correlation[entry]),
        ]
        for entry, name in enumerate(assets.names)
    )
    headings = [*own, *assets.names, "Rates"]
    _write_rows(workbook, "Risky assets", headings, rows, notes, len(assets.names))


def _write_items(workbook: Workbook, sheet: str, items: dict[str, Value], notes: Notes | None) -> None:
    """A sheet of items and values, each item beside its notes; an item with neither is left out."""
    beside: dict[str, tuple[Any, ...]] = {}
    headings: tuple[str, ...] = ()
    if notes is not None:
        headings = notes.headings[1:]
        for row in notes.rows:
            item = find_known(str(row[0]), tuple(items))
            if item is None:
                raise ValueError(
                    f"the notes of the sheet {sheet} name an item {row[0]!r} that it does not have"
                )
            beside[item] = row[1:]
    empty = (None,) * len(headings)
    written = _start(workbook, sheet, ["Item", "Value"], headings)
    for item, value in items.items():
        if value is None and item not in beside:
            continue
        cells = [_cell(written, item), _cell(written, value, _ITEM_FORMATS.get(item))]
        written.append(cells + [_cell(written, note) for note in beside.get(item, empty)])


def _write_rows(
    workbook: Workbook,
    sheet: str,
    headings: list[str],
    rows: Iterable[Sequence[Value]],
    notes: Notes | None,
    count: int,
) -> None:
    if count >= _LAST_ROW:
        raise ValueError(f"the sheet {sheet} would need {count + 1:,} rows; a sheet has {_LAST_ROW:,}")
    if notes is not None and len(notes.rows) != count:
        raise ValueError(f"the notes of the sheet {sheet} have {len(notes.rows)} rows for {count} of data")
    formats = [_FORMATS.get(heading) for heading in headings]
    written = _start(workbook, sheet, headings, () if notes is None else notes.headings)
    further: Iterator[Sequence[Value]] = iter(() if notes is None else notes.rows)
    for row in rows:
        cells = [_cell(written, value, form) for value, form in zip(row, formats, strict=True)]
        written.append(cells + [_cell(written, note) for note in next(further, ())])


def _start(workbook: Workbook, sheet: str, headings: Sequence[str], further: Sequence[str]) -> Any:
    """A new sheet with its headings, frozen."""
    from openpyxl.styles import Font
    from openpyxl.utils import get_column_letter

    written: Any = workbook.create_sheet(sheet)
    written.freeze_panes = "A2"
    for number, heading in enumerate([*headings, *further], start=1):
        width = _WIDTHS.get(heading, _WIDTH) if number <= len(headings) else _NOTE_WIDTH
        written.column_dimensions[get_column_letter(number)].width = width
    if sheet in ("Basis", "Rates model", "Run"):
        written.column_dimensions["B"].width = 28.0
    bold = Font(bold=True)
    cells = []
    for heading in [*headings, *further]:
        cell = _cell(written, heading)
        cell.font = bold
        cells.append(cell)
    written.append(cells)
    return written


def _cell(written: Any, value: Value, number_format: str | None = None) -> Any:
    from openpyxl.cell import WriteOnlyCell

    if isinstance(value, str):
        if len(value) > LONGEST_TEXT:
            raise ValueError(f"a workbook holds no text of {len(value):,} characters")
        if not value.strip():
            return None
    elif isinstance(value, int | float) and not np.isfinite(value):
        raise ValueError(f"a book workbook holds no number that is {value}")
    elif value is None or (isinstance(value, np.datetime64) and np.isnat(value)):
        return None
    return put(WriteOnlyCell(written), value, number_format=number_format)
