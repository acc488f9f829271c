"""The report: a workbook of results that a reviewer can recompute, written whole or not at all."""

from __future__ import annotations

from collections.abc import Callable
from contextlib import suppress
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any
from zipfile import ZIP_DEFLATED, ZipFile

import numpy as np

from desk.book import Book, Side
from desk.intake.records import Reading
from desk.report.results.checks import Checks
from desk.report.results.control import MASTER_CHECK_AREA, plan_faults, plan_provenance, plan_summary
from desk.report.results.flows import FlowSheet, plan_flows
from desk.report.results.inputs import plan_basis, plan_curve, plan_holdings
from desk.report.results.key_rates import plan_key_rates
from desk.report.results.look import Styles
from desk.report.results.plan import MASTER_CHECK, SheetPlan, widen, write_sheet
from desk.report.results.runs import plan_present_values, plan_savings_account, plan_short_rate
from desk.report.results.standing import check_measures, plan_lines, plan_periods
from desk.report.safe_cells import clean_text, write_whole
from desk.scenarios.records import Simulation
from desk.valuation.priced import priced_flows
from desk.valuation.records import Standing

if TYPE_CHECKING:
    from openpyxl import Workbook

__all__ = ["plan_sheets", "write_report"]


def write_report(
    reading: Reading,
    standing: Standing,
    simulation: Simulation | None,
    path: Path,
    *,
    progress: Callable[[float], None] | None = None,
    written_at: datetime | None = None,
) -> Path:
    """Write the report.

    Parameters
    ----------
    reading : Reading
        With the book that was valued.
    standing : Standing
    simulation : Simulation or None
        None leaves its sheets out, and the summary says so.
    path : Path
        The workbook to write.
    progress : callable, optional
        Called with the part done, from 0 to 1; it may stop the work by raising.
    written_at : datetime, optional
        The time that the report bears; by default now.

    Returns
    -------
    Path
        `path`.

    Raises
    ------
    ValueError
        If the reading has no book.
    OSError
        If the file cannot be written.
    """
    if reading.book is None:
        raise ValueError("`reading` must have a book")
    report = progress or (lambda _: None)
    report(0.0)
    plans, names = plan_sheets(
        reading, reading.book, standing, simulation, written_at=written_at or datetime.now(UTC)
    )
    report(0.1)
    return write_whole(path, lambda target: _write(plans, names, target, report))


def plan_sheets(
    reading: Reading, book: Book, standing: Standing, simulation: Simulation | None, *, written_at: datetime
) -> tuple[list[SheetPlan], dict[str, str]]:
    """All sheets in their order, and the names that the workbook defines."""
    checks = Checks()
    sheets: dict[Side, FlowSheet] = {}
    last_time = largest = 0.0
    for side in Side:
        priced = priced_flows(book, side)
        sheets[side] = plan_flows(priced.flows, priced.date, book.basis.curve, currency=standing.currency)
        largest = max(largest, float(np.abs(priced.flows.amount).sum()))
        last_time = max(last_time, float(priced.flows.time.max(initial=0.0)))
    recomputed = check_measures(standing, sheets, checks)
    curve = plan_curve(book.basis, last_time=last_time, checks=checks)
    basis = plan_basis(book, curve, checks)
    holdings = plan_holdings(
        book.holdings,
        standing.lines,
        line_size=sheets[Side.ASSETS].line_size,
        currency=standing.currency,
        checks=checks,
    )
    lines = plan_lines(standing, sheets, checks)
    key_rates = plan_key_rates(standing, sheets, recomputed, checks)
    periods = plan_periods(standing, checks)
    summary = plan_summary(
        reading,
        standing,
        simulation,
        sheets=sheets,
        recomputed=recomputed,
        checks=checks,
        charts_from={plan.name: plan for plan in (periods, key_rates)},
    )
    plans = [
        *(summary, basis, curve, sheets[Side.LIABILITIES].plan, holdings, sheets[Side.ASSETS].plan),
        *(lines, key_rates, periods),
    ]
    if simulation is not None:
        plans.append(plan_savings_account(simulation))
        plans.append(plan_short_rate(simulation))
        plans.append(plan_present_values(simulation, currency=standing.currency))
    plans.append(checks.plan())
    plans.append(plan_faults(reading, standing, simulation))
    plans.append(plan_provenance(reading, standing, simulation, written_at=written_at))
    widen(plans, largest)
    names = checks.names() | {MASTER_CHECK: MASTER_CHECK_AREA}
    for sheet in sheets.values():
        names |= sheet.names
    return plans, names


def _write(
    plans: list[SheetPlan], names: dict[str, str], target: Path, report: Callable[[float], None]
) -> None:
    """Write the planned sheets into one file."""
    from openpyxl import Workbook
    from openpyxl.workbook.defined_name import DefinedName
    from openpyxl.writer.excel import ExcelWriter

    workbook = Workbook(write_only=True)
    workbook.calculation.fullCalcOnLoad = True
    workbook.properties.title = clean_text(plans[0].title)[:255]
    workbook.properties.creator = "Gapwright"
    for name, area in names.items():
        workbook.defined_names[name] = DefinedName(name, attr_text=area)
    try:
        _write_sheets(workbook, plans, report)
        # As a context the package is closed where the disk is full; left to itself it complains aloud.
        with ZipFile(target, "w", ZIP_DEFLATED) as package:
            ExcelWriter(workbook, package).save()
    except BaseException:
        _discard(workbook)
        raise
    report(1.0)


def _write_sheets(workbook: Workbook, plans: list[SheetPlan], report: Callable[[float], None]) -> None:
    """Write the sheets in their order."""
    styles = Styles(workbook)
    weights = [1 + (plan.block.count if plan.block else 0) for plan in plans]
    done, whole = 0, sum(weights)
    for plan, weight in zip(plans, weights, strict=True):
        write_sheet(workbook, plan, styles, _part(report, 0.1 + 0.7 * done / whole, 0.7 * weight / whole))
        done += weight
        report(0.1 + 0.7 * done / whole)


def _discard(workbook: Workbook) -> None:
    """Remove what a write-only workbook that is not finished keeps in temporary files."""
    for sheet in workbook.worksheets:
        # openpyxl offers no public way to abandon a sheet.
        unfinished: Any = sheet
        with suppress(OSError, ValueError):
            if not unfinished.closed:
                unfinished.close()
            unfinished._writer.cleanup()


def _part(report: Callable[[float], None], start: float, share: float) -> Callable[[float], None]:
    """Progress of one sheet."""
    return lambda part: report(start + share * part)
