"""What is asked of the paths of a run beside its results: single ones, all in a file, curves at a horizon."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from desk.book import Book, Side
from desk.tasks.running import CancelToken, Progress, part_of, watched

if TYPE_CHECKING:
    from desk.book import PricedFlows
    from desk.scenarios.curve_fan import CurveFan
    from desk.scenarios.drawn_paths import DrawnPaths

__all__ = ["curve_at", "export_scenarios", "paths_of"]


def _sides(book: Book) -> tuple[PricedFlows, PricedFlows]:
    """The flows that a run of the book values: some models are worked out as far as they reach."""
    from desk.valuation.priced import priced_flows

    return priced_flows(book, Side.ASSETS).flows, priced_flows(book, Side.LIABILITIES).flows


def curve_at(
    book: Book, *, year: float, progress: Progress | None = None, cancel: CancelToken | None = None
) -> CurveFan:
    """Zero rates by term at a node of the book's run, over its paths.

    Parameters
    ----------
    book : Book
    year : float
        [years]
    progress, cancel : optional
        See `read`.

    Raises
    ------
    ValueError
        If `year` is no node of the run, or the model cannot be drawn or has no bonds.
    Cancelled
        If `cancel` was set before the work was done.
    """
    from desk.scenarios.curve_fan import curve_fan

    watch = watched(progress, cancel)
    watch(0.0)
    sides = _sides(book)
    found = curve_fan(book, *sides, year=year, progress=part_of(watch, 0.1, 1.0))
    watch(1.0)
    return found


def paths_of(
    book: Book,
    *,
    first: int = 0,
    count: int = 1,
    progress: Progress | None = None,
    cancel: CancelToken | None = None,
) -> tuple[DrawnPaths, ...]:
    """Some paths of the book's run at its reported times.

    Parameters
    ----------
    book : Book
    first, count : int
        From which path on, counted from 0, and how many.
    progress, cancel : optional
        See `read`.

    Raises
    ------
    ValueError
        If the run has no such path, or the model cannot be drawn.
    Cancelled
        If `cancel` was set before the work was done.
    """
    from desk.scenarios.drawn_paths import drawn_path_range
    from desk.scenarios.plans import planned_run

    watch = watched(progress, cancel)
    watch(0.0)
    sides = _sides(book)
    watch(0.2)
    plan = planned_run(book, *sides).plan
    watch(0.4)
    found = drawn_path_range(plan, first=first, count=count, asset_names=_names(book))
    watch(1.0)
    return found


def export_scenarios(
    book: Book,
    path: Path,
    *,
    every_step: bool = False,
    progress: Progress | None = None,
    cancel: CancelToken | None = None,
) -> Path:
    """Write the paths of the book's run to a workbook or to compressed CSV.

    Parameters
    ----------
    book : Book
    path : Path
        Its name ends in ``.xlsx`` or ``.csv.gz``; it is written whole or not at all.
    every_step : bool
        Every node of the paths; otherwise the reported years.
    progress, cancel : optional
        See `read`.

    Returns
    -------
    Path
        Where the file is.

    Raises
    ------
    ValueError
        If the model cannot be drawn, the name ends otherwise, or a sheet cannot hold the paths.
    OSError
        If the file cannot be written.
    Cancelled
        If `cancel` was set before the work was done: then there is no file.
    """
    from desk.report.scenario_export import write_scenarios
    from desk.scenarios.plans import planned_run

    watch = watched(progress, cancel)
    watch(0.0)
    plan = planned_run(book, *_sides(book)).plan
    written = write_scenarios(book, plan, path, every_step=every_step, progress=part_of(watch, 0.05, 1.0))
    watch(1.0)
    return written


def _names(book: Book) -> tuple[str, ...]:
    return () if book.risky_assets is None else book.risky_assets.names
