"""The report: a workbook of results that a reviewer can recompute, written whole or not at all."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from contextlib import suppress
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any
from zipfile import ZIP_DEFLATED, ZipFile

from desk.book import Book, Fault, Side
from desk.intake.records import Reading
from desk.report.results.calibration import plan_calibrations
from desk.report.results.checks import Checks
from desk.report.results.comparison import plan_comparison, plan_no_comparison
from desk.report.results.control import MASTER_CHECK_AREA, plan_faults, plan_provenance, plan_summary
from desk.report.results.inputs import plan_holdings
from desk.report.results.key_rates import plan_inflation_key_rates, plan_key_rates
from desk.report.results.liability_basis import plan_line_terms
from desk.report.results.look import Styles
from desk.report.results.naming import FIRST, SECOND
from desk.report.results.periods import plan_periods
from desk.report.results.plan import MASTER_CHECK, SheetPlan, widen, write_sheet
from desk.report.results.position import Position, plan_position
from desk.report.results.runs import plan_run
from desk.report.results.shocks import plan_shocks
from desk.report.results.standing import plan_lines
from desk.report.safe_cells import clean_text, write_whole
from desk.scenarios.calibration_records import Calibration
from desk.scenarios.records import Simulation
from desk.valuation.linked import is_linked
from desk.valuation.prices import HoldingPrice, holding_prices
from desk.valuation.records import Standing
from desk.valuation.shock_records import ShockTable
from desk.valuation.standing import stand

if TYPE_CHECKING:
    from openpyxl import Workbook

__all__ = ["plan_sheets", "write_report"]

Fits = tuple[Sequence[Calibration], Sequence[Fault]]


def write_report(
    reading: Reading,
    standing: Standing,
    simulation: Simulation | None,
    path: Path,
    *,
    second: Standing | None = None,
    shocks: ShockTable | None = None,
    fits: Fits = ((), ()),
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
    second : Standing, optional
        On the second basis of the book; where the book has one it is valued if this is left out.
    shocks : ShockTable, optional
        None, or one without results, leaves its sheets out, and the summary says so.
    fits : tuple
        Models fitted to data of the book, and faults of data that none could be fitted to.
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
        reading,
        reading.book,
        standing,
        simulation,
        second=second,
        shocks=shocks,
        fits=fits,
        written_at=written_at or datetime.now(UTC),
    )
    report(0.1)
    return write_whole(path, lambda target: _write(plans, names, target, report))


def plan_sheets(
    reading: Reading,
    book: Book,
    standing: Standing,
    simulation: Simulation | None,
    *,
    second: Standing | None = None,
    shocks: ShockTable | None = None,
    fits: Fits = ((), ()),
    written_at: datetime,
) -> tuple[list[SheetPlan], dict[str, str]]:
    """All sheets in their order, and the names that the workbook defines; see `write_report`."""
    checks = Checks()
    first = plan_position(book, standing, FIRST, checks)
    sheets, recomputed = first.sheets, first.recomputed
    holdings = plan_holdings(
        book.holdings,
        standing.lines,
        line_size=sheets[Side.ASSETS].line_size,
        currency=standing.currency,
        checks=checks,
        prices=_linked_prices(book),
    )
    lines = plan_lines(standing, sheets, checks)
    key_rates = plan_key_rates(standing, sheets, recomputed, checks)
    periods = plan_periods(standing, checks)
    terms = plan_line_terms(book, standing)
    further = [] if terms is None else [terms]
    after: list[SheetPlan] = []
    if standing.inflation is not None and first.growth is not None:
        after.append(
            plan_inflation_key_rates(standing, sheets, recomputed, checks, is_plain=first.growth.is_plain)
        )
        if all(sheet.is_by_row for sheet in sheets.values()):
            after.append(plan_periods(standing, checks, is_real=True))
    shocked = None
    if shocks is not None and shocks.results:
        shocked = plan_shocks(
            shocks,
            flows=first.flows,
            sheets=sheets,
            recomputed=recomputed,
            curve=book.basis.curve,
            checks=checks,
        )
        recomputed = recomputed | {"least_surplus": shocked.least_surplus}
    compared, of_second = _second_basis(book, standing, second, first, checks)
    fitted = plan_calibrations(*fits, checks)
    drawn: list[SheetPlan] = []
    if simulation is not None:
        drawn = plan_run(book, simulation, currency=standing.currency, checks=checks)
    summary = plan_summary(
        reading,
        standing,
        simulation,
        sheets=sheets,
        recomputed=recomputed,
        checks=checks,
        charts_from={plan.name: plan for plan in (periods, key_rates)},
        compared=compared.standing,
        shocks=shocks,
    )
    plans = [
        *(summary, *first.before, *further, sheets[Side.LIABILITIES].plan, holdings),
        *(sheets[Side.ASSETS].plan, lines, key_rates, periods, *after, *compared.plans),
    ]
    if shocked is not None:
        plans += shocked.sheets
    plans += fitted
    plans += drawn
    plans.append(checks.plan())
    plans.append(plan_faults(reading, standing, simulation, second=compared.standing, shocks=shocks))
    plans.append(plan_provenance(reading, standing, simulation, shocks=shocks, written_at=written_at))
    names = checks.names() | {MASTER_CHECK: MASTER_CHECK_AREA} | first.names
    if shocked is not None:
        names |= shocked.names
    largest = first.largest
    if of_second is not None:
        names |= of_second.names
        largest = max(largest, of_second.largest)
    widen(plans, largest)
    return plans, names


@dataclass(frozen=True)
class _Compared:
    """What the second basis brings to the report."""

    plans: tuple[SheetPlan, ...] = ()
    standing: Standing | None = None


def _second_basis(
    book: Book, standing: Standing, second: Standing | None, first: Position, checks: Checks
) -> tuple[_Compared, Position | None]:
    """The sheets of the second basis, where the book has one that gives a curve."""
    other = book.on_second_basis
    if other is None:
        return _Compared(), None
    if second is None:
        try:
            second = stand(other)
        except ValueError as error:
            return _Compared((plan_no_comparison(f"{error}"),)), None
    position = plan_position(other, second, SECOND, checks)
    comparison = plan_comparison(
        standing,
        second,
        (book.basis, other.basis),
        position.sheets,
        (first.recomputed, position.recomputed),
        checks,
    )
    flows = (position.sheets[side].plan for side in (Side.LIABILITIES, Side.ASSETS))
    return _Compared((comparison, *position.before, *flows), second), position


def _linked_prices(book: Book) -> tuple[HoldingPrice, ...]:
    """Prices of the holdings, where one of them follows an index; they are shown in real terms."""
    return holding_prices(book) if any(is_linked(holding) for holding in book.holdings) else ()


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
