"""Reading a book workbook: the whole of it, with every fault."""

from __future__ import annotations

import difflib
from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import date
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from desk.book import Basis, Book, FlowTable, History, Holding, RatesModel, RiskyAssets, Run
from desk.intake.assets import read_risky_assets
from desk.intake.checks import plain
from desk.intake.columns import ColumnRows
from desk.intake.faults import FaultList
from desk.intake.flows import read_curve, read_flows, read_history
from desk.intake.holdings import read_holdings
from desk.intake.items import ItemSheet, read_basis_items, read_rates_model, read_run
from desk.intake.layout import SHEETS, SourceSheet, Table, find_known, fold, lay_out
from desk.intake.notes import read_notes
from desk.intake.processes import Limits
from desk.intake.records import Reading, SheetGrid
from desk.intake.source import open_source
from desk.rates.curve_error import CurveError
from desk.rates.day_count import DayCount, year_fraction

__all__ = ["read_workbook"]

FloatArray = NDArray[np.float64]


def read_workbook(
    path: Path, *, progress: Callable[[float], object] | None = None, limits: Limits | None = None
) -> Reading:
    """Read a book workbook to its end.

    The file is opened in processes of their own, under limits of memory and time, never in this one.

    Parameters
    ----------
    path : Path
        A workbook laid out as the book workbook. Formats other than ``.xlsx`` and ``.xlsm`` are read as
        far as the parser knows them, with a mild fault saying what cannot be told.
    progress : callable, optional
        Called now and then with the part done, from 0 to 1. It may raise to stop the reading: the
        processes are then ended at once and nothing stays behind.
    limits : Limits, optional
        Memory and time of the reading processes.

    Returns
    -------
    Reading
        With all faults, in the order of the sheets and rows, and the book where no grave one stands.
    """
    path = Path(path).absolute()
    report = progress or (lambda part: None)
    report(0.0)
    faults = FaultList()
    source = open_source(path, faults, limits=limits or Limits(), watch=report)
    report(0.9)
    tables: dict[str, Table] = {}
    book = None
    if source.sheets:
        tables = _lay_out_all(source.sheets, faults)
        parts = _read_parts(tables, faults)
        report(0.97)
        if parts is not None and not faults.any_grave:
            book = parts
    elif not faults.any_grave:
        faults.add("the workbook holds no sheets", "the sheets of a book", "Choose another file.")
    by_sheet = {table.sheet.name: table for table in tables.values()}
    grids = tuple(_grid(sheet, by_sheet.get(sheet.name)) for sheet in source.sheets)
    report(1.0)
    return Reading(path, source.sha256, book, faults.in_order(), grids)


def _grid(sheet: SourceSheet, table: Table | None) -> SheetGrid:
    if table is not None:
        return table.grid()
    return SheetGrid(sheet.name, ColumnRows(sheet.data), {}, None, sheet.data.hidden)


def _lay_out_all(sheets: list[SourceSheet], faults: FaultList) -> dict[str, Table]:
    """The book's sheets with their headings found, by the name the book has for them."""
    found: dict[str, SourceSheet] = {}
    for sheet in sheets:
        name = find_known(sheet.name, tuple(SHEETS))
        if name is None:
            _report_foreign(sheet, faults)
        elif name in found:
            faults.add(
                f'the sheet "{name}" is there twice, also as "{found[name].name}"',
                "each sheet once",
                "Remove or rename one of the two.",
                sheet=sheet.name,
            )
        else:
            found[name] = sheet
    tables: dict[str, Table] = {}
    for name, layout in SHEETS.items():
        if name in found:
            table = lay_out(found[name], layout, faults)
            if table is not None:
                tables[name] = table
        elif layout.needed:
            faults.add(
                f'the sheet "{name}" is missing',
                f'a sheet "{name}" with the columns {", ".join(layout.wanted)}',
                "Add the sheet.",
            )
    return tables


def _report_foreign(sheet: SourceSheet, faults: FaultList) -> None:
    close = difflib.get_close_matches(fold(sheet.name), [fold(name) for name in SHEETS], 1, 0.7)
    hint = next((name for name in SHEETS if close and fold(name) == close[0]), None)
    faults.mild(
        "the sheet is not one of a book's and was not read",
        f"one of the sheets {', '.join(SHEETS)}",
        f'Did you mean "{hint}"? Then rename it.'
        if hint
        else "Nothing needs to be done if it should not count.",
        sheet=sheet.name,
    )


@dataclass
class _Parts:
    """What the sheets gave, before it is known whether all of it is there."""

    basis: Basis | None = None
    liabilities: FlowTable | None = None
    holdings: tuple[Holding, ...] = ()
    asset_flows: FlowTable | None = field(default_factory=FlowTable.empty)
    rates_model: RatesModel | None = None
    risky_assets: RiskyAssets | None = None
    run: Run = field(default_factory=Run)
    history: History | None = None


def _item_sheet(tables: dict[str, Table], name: str, faults: FaultList) -> ItemSheet | None:
    table = tables.get(name)
    return ItemSheet(table, faults) if table is not None and len(table.fields) == 2 else None


def _read_parts(tables: dict[str, Table], faults: FaultList) -> Book | None:
    """Read every sheet that is there; None where something that must be there is not."""
    parts = _Parts()
    items: dict[str, Any] = {}
    if (sheet := _item_sheet(tables, "Basis", faults)) is not None:
        items = read_basis_items(sheet)
    valuation_date: date | None = items.get("valuation_date")
    day_count: DayCount = items.get("day_count") or DayCount.ACT_365F
    if "Curve" in tables:
        terms, rates = read_curve(tables["Curve"], faults)
        if items:
            parts.basis = _build_basis(items, terms, rates, tables["Curve"], faults)
    if "Liabilities" in tables:
        parts.liabilities = read_flows(
            tables["Liabilities"], faults, valuation_date=valuation_date, day_count=day_count, received=False
        )
    if "Holdings" in tables:
        parts.holdings = read_holdings(tables["Holdings"], faults, valuation_date=valuation_date)
    if "Asset flows" in tables:
        parts.asset_flows = read_flows(
            tables["Asset flows"], faults, valuation_date=valuation_date, day_count=day_count, received=True
        )
    if (sheet := _item_sheet(tables, "Rates model", faults)) is not None:
        parts.rates_model = read_rates_model(sheet)
    if "Risky assets" in tables:
        parts.risky_assets = read_risky_assets(tables["Risky assets"], faults)
    if (sheet := _item_sheet(tables, "Run", faults)) is not None:
        parts.run = read_run(sheet)
        _check_horizon(sheet, parts, valuation_date, day_count)
    if "History" in tables:
        parts.history = read_history(tables["History"], faults, valuation_date=valuation_date)
    notes = read_notes(tables, parts.risky_assets, faults)
    if parts.basis is None or parts.liabilities is None or parts.asset_flows is None:
        return None
    return Book(
        basis=parts.basis,
        liabilities=parts.liabilities,
        holdings=parts.holdings,
        asset_flows=parts.asset_flows,
        rates_model=parts.rates_model,
        risky_assets=parts.risky_assets,
        run=parts.run,
        history=parts.history,
        notes=notes,
    )


def _build_basis(
    items: dict[str, Any], terms: FloatArray, rates: FloatArray, table: Table, faults: FaultList
) -> Basis | None:
    """The basis, if its quotes give a curve."""
    sound = (
        bool(terms.size)
        and bool(np.isfinite(rates).all())
        and bool((np.diff(terms, prepend=0.0) > 0.0).all())
    )
    if not sound or any(value is None for value in items.values()):
        # What is wrong is reported already; what follows from it is not said twice.
        return None
    basis = Basis(terms=terms, rates=rates, **items)
    try:
        basis.curve.discount(basis.terms)
    except CurveError as error:
        for row in error.rows or (-1,):
            faults.add(
                f"the quotes give no curve: {error.found}",
                "quotes from which a curve can be drawn",
                error.mend,
                sheet=table.sheet.name,
                row=int(table.rows[row]) if row >= 0 else -1,
                column=table.fields["Rate"],
            )
        return None
    except ValueError as error:
        faults.add(
            f"the quotes give no curve: {plain(error)}",
            "quotes from which a curve can be drawn",
            "Correct the quotes, or choose another interpolation.",
            sheet=table.sheet.name,
        )
        return None
    return basis


def _check_horizon(
    sheet: ItemSheet,
    parts: _Parts,
    valuation_date: date | None,
    day_count: DayCount,
) -> None:
    """Report a run that goes on for more than a year after everything is paid."""
    if parts.liabilities is None or parts.asset_flows is None:
        # Rows that could not be read may be the last ones.
        return
    last = max(float(flows.time.max(initial=0.0)) for flows in (parts.liabilities, parts.asset_flows))
    maturities = [holding.maturity for holding in parts.holdings if holding.maturity is not None]
    if maturities and valuation_date is not None:
        start, end = np.datetime64(valuation_date, "D"), np.datetime64(max(maturities), "D")
        last = max(last, float(year_fraction(start, end, day_count)))
    horizon = parts.run.horizon_years
    if last > 0.0 and horizon > last + 1.0 and "Horizon (years)" in sheet.rows:
        sheet.fault(
            "Horizon (years)",
            f"the horizon of {horizon} years goes beyond the last flow, which is {last:.4g} years away",
            f"at most {int(np.ceil(last))} years",
            "The run goes on with nothing left to pay; shorten it if that is not wanted.",
            mild=True,
        )
