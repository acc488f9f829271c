"""Sheets of flows, and the history of short rates."""

from __future__ import annotations

from datetime import date

import numpy as np
from numpy.typing import NDArray

from desk.book import FlowTable, History
from desk.intake.cells import Cells
from desk.intake.checks import check_rates, check_size
from desk.intake.faults import FaultList
from desk.intake.layout import Table, fold
from desk.rates.day_count import DayCount, year_fraction

__all__ = ["check_history_dates", "read_flows", "read_history"]

FloatArray = NDArray[np.float64]

_CALENDAR_YEAR = 200.0
"""Years from the valuation date beyond which a figure is taken for a slip."""
_SAME_TIME = 0.01
"""Years by which a rounded `Year` may differ from its `Date`."""


def read_flows(
    table: Table, faults: FaultList, *, valuation_date: date | None, day_count: DayCount, received: bool
) -> FlowTable | None:
    """The flows of a sheet; None where a row could not be read.

    Where a row states both, its time is that of its date.
    """
    sheet, rows = table.sheet, table.rows
    line_cells = Cells(sheet, table.column("Line"), rows, faults)
    date_cells = Cells(sheet, table.column("Date"), rows, faults)
    year_cells = Cells(sheet, table.column("Year"), rows, faults)
    amount_cells = Cells(sheet, table.column("Amount"), rows, faults)
    beta_cells = Cells(sheet, table.column("Beta"), rows, faults)
    names, line = line_cells.names("the name of a line")
    dates = date_cells.dates("the date of the flow", required=False)
    years = year_cells.numbers("years from the valuation date", required=False)
    amounts = amount_cells.numbers("an amount to be received" if received else "an amount to be paid")
    beta = beta_cells.numbers("a multiple of the market risk premium", required=False)
    timed = date_cells if date_cells.column is not None else year_cells
    if timed.column is not None:
        timed.each(
            ~date_cells.filled & ~year_cells.filled,
            "the row states no time",
            "a date, or years from the valuation date",
            "Write the date of the flow.",
        )
    by_date = ~np.isnat(dates)
    time = years.copy()
    if valuation_date is not None and by_date.any():
        from_dates = year_fraction(np.datetime64(valuation_date, "D"), dates, day_count)
        _check_both(year_cells, from_dates, years)
        time = np.where(by_date, from_dates, years)
    _check_times(date_cells, year_cells, dates, time, valuation_date)
    _check_names(line_cells, names, line)
    if not rows.size:
        faults.mild("the sheet holds no flows", "one row a flow", "Add the flows.", sheet=sheet.name)
    check_size(amount_cells, amounts, "the amount")
    check_size(beta_cells, beta, "the beta", most=100.0)
    beta = np.where(np.isnan(beta), 0.0, beta)
    if (line < 0).any() or not (np.isfinite(time).all() and np.isfinite(amounts).all()):
        return None
    return FlowTable(tuple(names), line, time, amounts, beta, dates)


def _check_both(cells: Cells, from_dates: FloatArray, years: FloatArray) -> None:
    """Report rows whose date and years disagree."""
    with np.errstate(invalid="ignore"):
        apart = np.abs(from_dates - years) > _SAME_TIME
    for entry in np.flatnonzero(apart).tolist():
        cells.fault(
            entry,
            f"{years[entry]:.6g} years stand beside a date that is {from_dates[entry]:.6g} years away",
            "one time a flow",
            "Correct one of the two, or leave the years empty.",
        )


def _check_times(
    date_cells: Cells,
    year_cells: Cells,
    dates: NDArray[np.datetime64],
    time: FloatArray,
    valuation_date: date | None,
) -> None:
    """Report flows that are not after the valuation date, and those that cannot be meant."""
    by_date = ~np.isnat(dates)
    with np.errstate(invalid="ignore"):
        past, far = time <= 0.0, time > _CALENDAR_YEAR
    entries = np.flatnonzero(past & by_date)
    date_cells.each_with(
        entries,
        (
            f"the flow of {day} is not after the valuation date {valuation_date}"
            for day in np.datetime_as_string(dates[entries]).tolist()
        ),
        "a date after the valuation date",
        "It is left out of every figure; correct the date or remove the row.",
        mild=True,
    )
    entries = np.flatnonzero(past & ~by_date)
    year_cells.each_with(
        entries,
        (
            f"the flow is due {years:.6g} years from the valuation date, not after it"
            for years in time[entries].tolist()
        ),
        "years above 0",
        "It is left out of every figure; correct the years or remove the row.",
        mild=True,
    )
    for entry in np.flatnonzero(far & by_date).tolist():
        date_cells.mild(
            entry,
            f"the flow of {dates[entry]} is {time[entry]:.0f} years away",
            "a date within 200 years",
            "It counts as it stands; correct the date if it is a slip.",
        )
    year_cells.each(
        far & ~by_date,
        "{} is no number of years from the valuation date; it looks like a calendar year",
        "years from the valuation date, at most 200",
        "Write the years from the valuation date, or the date itself under Date.",
    )


def _check_names(cells: Cells, names: list[str], line: NDArray[np.int64]) -> None:
    """Report lines whose names differ only in case or blanks: they are easily one line written twice."""
    seen: dict[str, str] = {}
    for number, name in enumerate(names):
        first = seen.setdefault(fold(name), name)
        if first != name:
            cells.mild(
                int(np.argmax(line == number)),
                f'the line "{name[:60]}" differs from "{first[:60]}" only in case or blanks',
                "each line under one name",
                "It counts as a line of its own; write both alike if they are one.",
            )


def read_history(table: Table, faults: FaultList, *, valuation_date: date | None) -> History | None:
    """The history of short rates; None where a row could not be read or there is none."""
    date_cells = Cells(table.sheet, table.column("Date"), table.rows, faults)
    rate_cells = Cells(table.sheet, table.column("Short rate"), table.rows, faults)
    dates = date_cells.dates("a date")
    rates = rate_cells.numbers("a continuously compounded rate a year")
    check_rates(rate_cells, rates, "the short rate")
    check_history_dates(date_cells, dates, valuation_date)
    if not table.rows.size:
        faults.mild(
            "the sheet holds no history",
            "one row a date",
            "Add rows, or remove the sheet.",
            sheet=table.sheet.name,
        )
        return None
    if np.isnat(dates).any() or np.isnan(rates).any():
        return None
    return History(dates, rates)


def check_history_dates(cells: Cells, dates: NDArray[np.datetime64], valuation_date: date | None) -> None:
    """Report dates of a history that do not rise or have yet to come."""
    step = np.diff(dates, prepend=np.datetime64("NaT", "D")).astype("timedelta64[D]")
    cells.each(
        step == np.timedelta64(0, "D"), "{} stands twice", "each date once", "Remove one of the two rows."
    )
    cells.each(
        step < np.timedelta64(0, "D"),
        "{} is before the date above it",
        "dates that rise",
        "Sort the rows by their date.",
    )
    if valuation_date is not None:
        cells.each(
            dates > np.datetime64(valuation_date, "D"),
            "{} is after the valuation date",
            "a date of the past",
            "It counts as it stands; correct the date if it is a slip.",
            mild=True,
        )
