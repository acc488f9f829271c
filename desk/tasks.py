"""The work of the program, as the window and the commands call it.

Every task takes a `progress` callback and a `cancel` token. The rooms below know only the callback:
the one they are given looks at the token first and stops the work by raising `Cancelled`.
"""

from __future__ import annotations

import threading
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

from desk.book import Book
from desk.intake.records import Reading
from desk.scenarios.records import Simulation
from desk.valuation.records import Standing

__all__ = ["CancelToken", "Cancelled", "Progress", "read", "report", "save_copy", "simulate", "value"]

Progress = Callable[[float], None]
"""Called with the part done, from 0 to 1, from the thread that does the work."""

CancelToken = threading.Event
"""Set it to stop a task at its next step."""


class Cancelled(Exception):
    """A task was stopped on request."""


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

    watched = _watched(progress, cancel)
    watched(0.0)
    reading = read_workbook(path, progress=watched)
    watched(1.0)
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

    watched = _watched(progress, cancel)
    watched(0.0)
    standing = stand(book, progress=watched)
    watched(1.0)
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

    watched = _watched(progress, cancel)
    watched(0.0)
    assets, liabilities = priced_flows(book, Side.ASSETS), priced_flows(book, Side.LIABILITIES)
    simulation = draw(book, assets.flows, liabilities.flows, progress=watched)
    watched(1.0)
    # A spread that could not be solved changes the present values along the paths too.
    return replace(simulation, faults=(*assets.faults, *liabilities.faults, *simulation.faults))


def report(
    reading: Reading,
    path: Path,
    *,
    standing: Standing | None = None,
    simulation: Simulation | None = None,
    progress: Progress | None = None,
    cancel: CancelToken | None = None,
) -> Path:
    """Write the report; what is not handed over is computed.

    A book without a rates model is reported without the sheets of a simulation.

    Parameters
    ----------
    reading : Reading
        A reading with a book.
    path : Path
        The workbook to write; it is written whole or not at all.
    standing, simulation : optional
        Results of this book, where they are there already.
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

    if reading.book is None:
        raise ValueError("`reading` must have a book: its faults stand in the way")
    watched = _watched(progress, cancel)
    watched(0.0)
    if standing is None:
        standing = value(reading.book, progress=_part(watched, 0.0, 0.1), cancel=cancel)
    start = 0.1
    if simulation is None and reading.book.rates_model is not None:
        simulation = simulate(reading.book, progress=_part(watched, 0.1, 0.6), cancel=cancel)
        start = 0.6
    written = write_report(reading, standing, simulation, path, progress=_part(watched, start, 1.0))
    watched(1.0)
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


def _watched(progress: Progress | None, cancel: CancelToken | None) -> Progress:
    """A callback that stops the work once the token is set and passes progress on."""

    def watch(part: float) -> None:
        if cancel is not None and cancel.is_set():
            raise Cancelled
        if progress is not None:
            progress(part)

    return watch


def _part(progress: Progress, start: float, end: float) -> Progress:
    """Progress of one step of a task that goes from `start` to `end`."""
    return lambda part: progress(start + (end - start) * part)
