"""The work of the program, as the window and the commands call it.

Every task takes a `progress` callback and a `cancel` token. The rooms below know only the callback:
the one they are given looks at the token first and stops the work by raising `Cancelled`.
"""

from __future__ import annotations

import threading
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

from desk.book import Book, Fault, Shock
from desk.book.arrays import FloatArray
from desk.intake.records import Reading
from desk.places import resources
from desk.scenarios.records import Simulation
from desk.valuation.records import Standing

if TYPE_CHECKING:
    from desk.intake.prescribed_shocks import ShockSets
    from desk.valuation.reverse import Goal, ReverseResult
    from desk.valuation.reverse_rates import LeastMove
    from desk.valuation.shock_grid import ShockGrid
    from desk.valuation.shock_records import ShockTable

__all__ = [
    "CancelToken",
    "Cancelled",
    "Progress",
    "grid",
    "least_move",
    "read",
    "report",
    "reverse",
    "save_copy",
    "shock",
    "shock_sets",
    "shocks_of",
    "simulate",
    "value",
]

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


def shock_sets(currency: str, *, folder: Path | None = None) -> ShockSets:
    """The prescribed sets of shocks, as they stand for a currency.

    Parameters
    ----------
    currency : str
        ISO 4217 code.
    folder : Path, optional
        Where the sets are; by default those that come with the program.

    Returns
    -------
    ShockSets
        With the faults of their files.
    """
    from desk.intake.prescribed_shocks import read_shock_sets

    return read_shock_sets(folder or resources() / "shocks", currency=currency)


def shocks_of(
    book: Book, *, sets: tuple[str, ...] = (), folder: Path | None = None
) -> tuple[tuple[Shock, ...], tuple[Fault, ...]]:
    """The shocks that a book is to be put under.

    Parameters
    ----------
    book : Book
    sets : tuple of str
        Names of prescribed sets in place of those the book asks for.
    folder : Path, optional
        See `shock_sets`.

    Returns
    -------
    shocks : tuple of Shock
        The book's own first, then those of the sets it asks for; where it asks for none, of the sets usual
        for its currency.
    faults : tuple of Fault
        Sets that could not be had.
    """
    from desk.intake.prescribed_shocks import chosen_shocks

    found = shock_sets(book.basis.currency, folder=folder)
    prescribed, faults = chosen_shocks(
        found,
        asked=sets or book.shock_settings.sets,
        currency=book.basis.currency,
        with_inflation=book.basis.inflation is not None,
    )
    return (*book.shocks, *prescribed), (*found.faults, *faults)


def shock(
    book: Book,
    *,
    sets: tuple[str, ...] = (),
    folder: Path | None = None,
    progress: Progress | None = None,
    cancel: CancelToken | None = None,
) -> ShockTable:
    """Put a book under its shocks.

    Parameters
    ----------
    book : Book
    sets, folder : optional
        See `shocks_of`.
    progress, cancel : optional
        See `read`.

    Returns
    -------
    ShockTable

    Raises
    ------
    ValueError
        If the basis of the book gives no curve.
    Cancelled
        If `cancel` was set before the work was done.
    """
    from desk.valuation.shocks import shock_table

    watched = _watched(progress, cancel)
    watched(0.0)
    shocks, faults = shocks_of(book, sets=sets, folder=folder)
    asked = sets or book.shock_settings.sets
    settings = (("sets", ", ".join(asked) if asked else f"usual for {book.basis.currency}"),)
    table = shock_table(book, shocks, settings=settings, progress=watched)
    watched(1.0)
    return replace(table, faults=(*faults, *table.faults))


def reverse(
    book: Book,
    *,
    goal: Goal,
    level: float,
    along: Shock | None = None,
    progress: Progress | None = None,
    cancel: CancelToken | None = None,
) -> ReverseResult:
    """Find the size of a shock at which the funding ratio or the surplus comes to a level.

    Parameters
    ----------
    book : Book
    goal : Goal
    level : float
        As a ratio, or [currency].
    along : Shock, optional
        Its shape; by default a parallel move of all rates.
    progress, cancel : optional
        See `read`.

    Returns
    -------
    ReverseResult
        With the reason where there is no solution.

    Raises
    ------
    ValueError
        If the basis of the book gives no curve, or the shock can be computed at no size.
    Cancelled
        If `cancel` was set before the work was done.
    """
    from desk.valuation.reverse import reverse_along, reverse_parallel
    from desk.valuation.shock_base import shock_base

    watched = _watched(progress, cancel)
    watched(0.0)
    base = shock_base(book)
    watched(0.2)
    if along is None:
        found = reverse_parallel(base, goal=goal, level=level)
    else:
        found = reverse_along(base, along, goal=goal, level=level)
    watched(1.0)
    return found


def least_move(
    book: Book,
    *,
    goal: Goal,
    level: float,
    from_history: bool = False,
    horizon: float = 1.0,
    progress: Progress | None = None,
    cancel: CancelToken | None = None,
) -> LeastMove:
    """Find the likeliest move of the key rates that brings the funding ratio or the surplus to a level.

    Parameters
    ----------
    book : Book
    goal : Goal
    level : float
        As a ratio, or [currency].
    from_history : bool
        Whether the covariance is that of the book's yield history; by default that of its rates model.
    horizon : float
        Of the covariance [years].
    progress, cancel : optional
        See `read`.

    Returns
    -------
    LeastMove
        With the reason where there is no solution.

    Raises
    ------
    ValueError
        If the book has no such source of a covariance, or its basis gives no curve.
    Cancelled
        If `cancel` was set before the work was done.
    """
    from desk.rates.gaussian import GaussianRates
    from desk.scenarios.models import rate_model
    from desk.valuation.reverse_rates import covariance_of_history, covariance_of_model
    from desk.valuation.reverse_rates import least_move as find
    from desk.valuation.shock_base import shock_base

    watched = _watched(progress, cancel)
    watched(0.0)
    if from_history:
        if book.yield_history is None:
            raise ValueError("the book has no history of yields, from which a covariance could be taken")
        covariance = covariance_of_history(book.yield_history, horizon=horizon)
    else:
        if book.rates_model is None:
            raise ValueError("the book has no rates model, which would give a covariance")
        model = rate_model(book)
        if not isinstance(model, GaussianRates):
            raise ValueError(f"the model {book.rates_model.name} is not Gaussian: it gives no one covariance")
        covariance = covariance_of_model(model, horizon=horizon)
    base = shock_base(book)
    watched(0.2)
    found = find(base, covariance, goal=goal, level=level)
    watched(1.0)
    return found


def grid(
    book: Book,
    first: Shock,
    second: Shock,
    *,
    first_scale: FloatArray,
    second_scale: FloatArray,
    progress: Progress | None = None,
    cancel: CancelToken | None = None,
) -> ShockGrid:
    """Put a book under two shocks together, each in many sizes.

    Parameters
    ----------
    book : Book
    first, second : Shock
    first_scale, second_scale : ndarray, shapes (m,) and (k,)
        What the sizes are multiplied by.
    progress, cancel : optional
        See `read`.

    Returns
    -------
    ShockGrid

    Raises
    ------
    ValueError
        If the basis of the book gives no curve, or one of the shocks can be computed at no scale.
    Cancelled
        If `cancel` was set before the work was done.
    """
    from desk.valuation.shock_base import shock_base
    from desk.valuation.shock_grid import shock_grid

    watched = _watched(progress, cancel)
    watched(0.0)
    return shock_grid(
        shock_base(book),
        first,
        second,
        first_scale=first_scale,
        second_scale=second_scale,
        progress=watched,
    )


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
    second: Standing | None = None,
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
    written = write_report(
        reading, standing, simulation, path, second=second, progress=_part(watched, start, 1.0)
    )
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
