"""Reading a book workbook: the whole of it, with every fault."""

from __future__ import annotations

import difflib
from collections.abc import Callable
from datetime import date
from pathlib import Path
from typing import Any

import numpy as np

from desk.book import Book, FlowTable, Holding, Run, Side
from desk.intake.assets import read_risky_assets
from desk.intake.basis import FIRST, SECOND, read_basis, report_missing, unused_sheets
from desk.intake.basis_items import BasisItems, read_basis_items
from desk.intake.columns import ColumnRows
from desk.intake.faults import FaultList
from desk.intake.flows import read_flows, read_history
from desk.intake.holdings import read_holdings
from desk.intake.item_sheet import ItemSheet
from desk.intake.items import read_rates_model, read_run, read_shock_settings
from desk.intake.layout import SHEETS, SourceSheet, Table, find_known, fold, lay_out
from desk.intake.line_terms import read_line_terms
from desk.intake.market import read_scenario_set, read_volatilities, read_yield_history
from desk.intake.notes import read_notes
from desk.intake.processes import Limits
from desk.intake.quotes import read_bonds, read_by_term
from desk.intake.records import Reading, SheetGrid
from desk.intake.shocks import read_shocks
from desk.intake.source import open_source
from desk.rates.day_count import DayCount, year_fraction

__all__ = ["read_workbook"]


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
        reader = _Reader(source.sheets, faults)
        tables = reader.tables
        parts = reader.read()
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


def _match_sheets(sheets: list[SourceSheet], faults: FaultList) -> dict[str, SourceSheet]:
    """The book's sheets by the name the book has for them."""
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
    for name, layout in SHEETS.items():
        if layout.needed and name not in found:
            faults.add(
                f'the sheet "{name}" is missing',
                f'a sheet "{name}" with the columns {", ".join(layout.wanted)}',
                "Add the sheet.",
            )
    return found


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


class _Reader:
    """Reads the sheets of one source."""

    def __init__(self, sheets: list[SourceSheet], faults: FaultList) -> None:
        self.faults = faults
        self.tables: dict[str, Table] = {}
        """The sheets of which the headings are known, by the name the book has for them."""
        self._found = _match_sheets(sheets, faults)
        self._used: dict[str, Table] = {}
        self._items: dict[str, BasisItems | None] = {}
        for names, first in ((FIRST, None), (SECOND, FIRST)):
            self._lay_out(names.items)
            sheet = self._item_sheet(names.items)
            own = self._items.get(first.items) if first is not None else None
            if sheet is not None and first is not None:
                self._items[names.items] = read_basis_items(sheet, first=own or BasisItems(sheet))
            elif sheet is not None:
                self._items[names.items] = read_basis_items(sheet)
        unused = self._unused()
        for name in SHEETS:
            if name not in (*self.tables, FIRST.items, SECOND.items):
                self._lay_out(name, unused.get(name))

    def _unused(self) -> dict[str, str]:
        """What would use each sheet that nothing uses."""
        unused = {
            sheet: use
            for names in (FIRST, SECOND)
            for sheet, use in unused_sheets(self._items.get(names.items), names)
        }
        if SECOND.items not in self._found:
            unused |= dict.fromkeys(SECOND.beside, f'a second basis, in a sheet "{SECOND.items}", uses it')
        return unused

    def _lay_out(self, name: str, use: str | None = None) -> None:
        """Find the headings of a sheet; one that nothing uses is kept where it is sound."""
        if name not in self._found:
            return
        sheet = self._found[name]
        own = self.faults if use is None else FaultList()
        table = lay_out(sheet, SHEETS[name], own)
        if table is not None:
            self.tables[name] = table
        if use is None:
            if table is not None:
                self._used[name] = table
            return
        kept = table is not None and not own.any_grave and self._is_kept(name, table)
        if kept and table is not None:
            self._used[name] = table
        self.faults.mild(
            "the sheet is not used" + (", though it is kept" if kept else " and was not read"),
            f"no such sheet: {use}",
            "Nothing needs to be done if it should not count.",
            sheet=sheet.name,
        )

    def _is_kept(self, name: str, table: Table) -> bool:
        """Whether a sheet that the first or second basis does not use has its place in it and is sound."""
        trial = FaultList()
        for names in (FIRST, SECOND):
            if names is SECOND and SECOND.items not in self._found:
                continue
            if name in (names.bonds, names.liability_bonds):
                read_bonds(table, trial, valuation_date=None, distinct=False)
                return not trial.any_grave
            if name == names.liability_spreads:
                read_by_term(table, trial, value="Spread", from_zero=True)
                return not trial.any_grave
        return False

    def _item_sheet(self, name: str) -> ItemSheet | None:
        table = self.tables.get(name)
        return ItemSheet(table, self.faults) if table is not None and len(table.fields) == 2 else None

    @property
    def _has_inflation(self) -> bool:
        """Whether there is expected inflation, or a sheet that is meant to hold it."""
        table = self._used.get(FIRST.inflation)
        return FIRST.inflation in self._found and (table is None or table.rows.size > 0)

    def name_of(self, name: str) -> str:
        """What the source calls a sheet of the book."""
        return self._found[name].name if name in self._found else name

    def read(self) -> Book | None:
        """Read every sheet that is there; None where something that must be there is not."""
        faults, used = self.faults, self._used
        items = self._items.get(FIRST.items)
        stated: dict[str, Any] = {} if items is None else items.fields
        valuation_date: date | None = stated.get("valuation_date")
        day_count: DayCount = stated.get("day_count") or DayCount.ACT_365F
        report_missing(items, FIRST, self._found, faults)
        basis = read_basis(items, FIRST, used, faults)
        second = None
        if SECOND.items in self._found:
            own = self._items.get(SECOND.items)
            report_missing(own, SECOND, self._found, faults)
            second = read_basis(own, SECOND, used, faults, first=basis)
        liabilities = None
        if "Liabilities" in used:
            liabilities = read_flows(
                used["Liabilities"],
                faults,
                valuation_date=valuation_date,
                day_count=day_count,
                received=False,
            )
        holdings: tuple[Holding, ...] = ()
        if "Holdings" in used:
            holdings = read_holdings(
                used["Holdings"],
                faults,
                valuation_date=valuation_date,
                has_inflation=self._has_inflation,
            )
        asset_flows: FlowTable | None = FlowTable.empty()
        if "Asset flows" in used:
            asset_flows = read_flows(
                used["Asset flows"], faults, valuation_date=valuation_date, day_count=day_count, received=True
            )
        parts: dict[str, Any] = {}
        if (sheet := self._item_sheet("Rates model")) is not None:
            parts["rates_model"] = read_rates_model(sheet)
        if "Risky assets" in used:
            model = parts.get("rates_model")
            parts["risky_assets"] = read_risky_assets(
                used["Risky assets"], faults, mend=model is not None and model.mend_correlation
            )
        if (sheet := self._item_sheet("Run")) is not None:
            before = faults.grave_count
            parts["run"] = read_run(sheet)
            # A horizon that could not be read is told already.
            if liabilities is not None and asset_flows is not None and faults.grave_count == before:
                # Rows that could not be read may be the last ones.
                last = _last_payment(liabilities, asset_flows, holdings, valuation_date, day_count)
                _check_horizon(sheet, parts["run"], last)
        if "History" in used:
            parts["history"] = read_history(used["History"], faults, valuation_date=valuation_date)
        if "Yield history" in used:
            parts["yield_history"] = read_yield_history(
                used["Yield history"], faults, valuation_date=valuation_date
            )
        if "Volatilities" in used:
            parts["volatilities"] = read_volatilities(used["Volatilities"], faults)
        if "Scenario set" in used:
            parts["scenario_set"] = read_scenario_set(used["Scenario set"], faults)
        lines = None if liabilities is None else liabilities.line_names
        if "Line terms" in used:
            received = None if asset_flows is None else asset_flows.line_names
            parts["line_terms"] = read_line_terms(
                used["Line terms"],
                faults,
                lines={Side.LIABILITIES: lines, Side.ASSETS: received},
                has_inflation=self._has_inflation,
            )
        if "Shocks" in used:
            held = [holding.name for holding in holdings]
            if asset_flows is not None:
                held += asset_flows.line_names
            known = None if faults.grave_rows(self.name_of("Holdings")) else held
            parts["shocks"] = read_shocks(used["Shocks"], faults, holdings=known, lines=lines)
        if (sheet := self._item_sheet("Shock settings")) is not None:
            parts["shock_settings"] = read_shock_settings(sheet)
        notes = read_notes(used, parts.get("risky_assets"), faults)
        if basis is None or liabilities is None or asset_flows is None:
            return None
        return Book(
            basis=basis,
            liabilities=liabilities,
            holdings=holdings,
            asset_flows=asset_flows,
            notes=notes,
            second_basis=second,
            **parts,
        )


def _last_payment(
    liabilities: FlowTable,
    asset_flows: FlowTable,
    holdings: tuple[Holding, ...],
    valuation_date: date | None,
    day_count: DayCount,
) -> float:
    """When the last payment falls due [years]."""
    last = max(float(flows.time.max(initial=0.0)) for flows in (liabilities, asset_flows))
    maturities = [holding.maturity for holding in holdings if holding.maturity is not None]
    if maturities and valuation_date is not None:
        start, end = np.datetime64(valuation_date, "D"), np.datetime64(max(maturities), "D")
        last = max(last, float(year_fraction(start, end, day_count)))
    return last


def _check_horizon(sheet: ItemSheet, run: Run, last: float) -> None:
    """Report a run that goes on for more than a year after everything is paid."""
    horizon = run.horizon_years
    if last > 0.0 and horizon > last + 1.0 and "Horizon (years)" in sheet.rows:
        sheet.fault(
            "Horizon (years)",
            f"the horizon of {horizon} years goes beyond the last flow, which is {last:.4g} years away",
            f"at most {int(np.ceil(last))} years",
            "The run goes on with nothing left to pay; shorten it if that is not wanted.",
            mild=True,
        )
