"""Reading a book, valuing it, drawing its rates, and writing what came of it."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

from desk.book import Book
from desk.intake.records import Reading
from desk.scenarios.records import Simulation
from desk.tasks.running import CancelToken, Progress, part_of, watched
from desk.tasks.shocks import shock
from desk.valuation.records import Standing

if TYPE_CHECKING:
    from desk.valuation.shock_records import ShockTable

__all__ = ["read", "report", "save_copy", "simulate", "value"]


def read(path: Path, *, progress: Progress | None = None, cancel: CancelToken | None = None) -> Reading:
    """Read a book workbook to its end; faults come back in the reading, never as an exception.

    Parameters
    ----------
    path : Path
        The workbook.
    progress : callable, optional
        See `Progress`.
    cancel : threading.Event, optional
        See `CancelToken`.

    Returns
    -------
    Reading

    Raises
    ------
    Cancelled
        If `cancel` was set before the work was done.
    """
    from desk.intake.workbook import read_workbook

    watch = watched(progress, cancel)
    watch(0.0)
    reading = read_workbook(path, progress=watch)
    watch(1.0)
    return reading


def value(book: Book, *, progress: Progress | None = None, cancel: CancelToken | None = None) -> Standing:
    """Value a book.

    Parameters
    ----------
    book : Book
    progress, cancel : optional
        See `read`.

    Returns
    -------
    Standing

    Raises
    ------
    ValueError
        If the basis of the book gives no curve.
    Cancelled
        If `cancel` was set before the work was done.
    """
    from desk.valuation.standing import stand

    watch = watched(progress, cancel)
    watch(0.0)
    standing = stand(book, progress=watch)
    watch(1.0)
    return standing


def simulate(
    book: Book, *, progress: Progress | None = None, cancel: CancelToken | None = None
) -> Simulation:
    """Draw the book's rates model and value both sides along the paths, as the book's run says.

    Parameters
    ----------
    book : Book
    progress, cancel : optional
        See `read`.

    Returns
    -------
    Simulation

    Raises
    ------
    ValueError
        If the book has no rates model, or one that cannot be drawn.
    Cancelled
        If `cancel` was set before the work was done.
    """
    from desk.book import Side
    from desk.scenarios.simulation import simulate as draw
    from desk.valuation.priced import priced_flows

    watch = watched(progress, cancel)
    watch(0.0)
    assets, liabilities = priced_flows(book, Side.ASSETS), priced_flows(book, Side.LIABILITIES)
    simulation = draw(book, assets.flows, liabilities.flows, progress=watch)
    watch(1.0)
    # A spread that could not be solved changes the present values along the paths too.
    return replace(simulation, faults=(*assets.faults, *liabilities.faults, *simulation.faults))


def report(
    reading: Reading,
    path: Path,
    *,
    standing: Standing | None = None,
    simulation: Simulation | None = None,
    second: Standing | None = None,
    shocks: ShockTable | None = None,
    progress: Progress | None = None,
    cancel: CancelToken | None = None,
) -> Path:
    """Write the report; what is not handed over is computed.

    A book without a rates model is reported without the sheets of a simulation, and one under no shocks
    without those of shocks.

    Parameters
    ----------
    reading : Reading
        A reading with a book.
    path : Path
        The workbook to write; it is written whole or not at all.
    standing, simulation, shocks : optional
        Results of this book, where they are there already.
    second : Standing, optional
        On the second basis of the book. A second basis that gives no curve is said so in the report.
    progress, cancel : optional
        See `read`.

    Returns
    -------
    Path
        Where the report is.

    Raises
    ------
    ValueError
        If the reading has no book, or its basis gives no curve, or its model cannot be drawn.
    OSError
        If the file cannot be written.
    Cancelled
        If `cancel` was set before the work was done.
    """
    from desk.report.results.workbook import write_report
    from desk.scenarios.calibration import calibrations

    if reading.book is None:
        raise ValueError("`reading` must have a book: its faults stand in the way")
    watch = watched(progress, cancel)
    watch(0.0)
    if standing is None:
        standing = value(reading.book, progress=part_of(watch, 0.0, 0.1), cancel=cancel)
    start = 0.1
    if simulation is None and reading.book.rates_model is not None:
        simulation = simulate(reading.book, progress=part_of(watch, 0.1, 0.6), cancel=cancel)
        start = 0.6
    if shocks is None:
        shocks = shock(reading.book, progress=part_of(watch, start, start + 0.05), cancel=cancel)
    start += 0.05
    fits = calibrations(reading.book, progress=part_of(watch, start, start + 0.1))
    written = write_report(
        reading,
        standing,
        simulation,
        path,
        second=second,
        shocks=shocks,
        fits=fits,
        progress=part_of(watch, start + 0.1, 1.0),
    )
    watch(1.0)
    return written


def save_copy(book: Book, path: Path) -> Path:
    """Write a book as a book workbook that reads in again the same.

    Parameters
    ----------
    book : Book
    path : Path
        The workbook to write; it is written whole or not at all.

    Returns
    -------
    Path
        Where the workbook is.

    Raises
    ------
    ValueError
        If a workbook cannot hold the book as it is; the message says what in it.
    OSError
        If the file cannot be written.
    """
    from desk.report.book_workbook import write_book

    return write_book(book, path)
