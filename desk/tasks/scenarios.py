"""What is asked of the paths of a run beside its results: single ones, all in a file, curves at a horizon."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

from desk.book import Book, Measure, RatesModel, Side
from desk.tasks.running import CancelToken, Progress, part_of, watched

if TYPE_CHECKING:
    from desk.book import PricedFlows
    from desk.scenarios.compare import ModelRun
    from desk.scenarios.curve_fan import CurveFan
    from desk.scenarios.drawn_paths import DrawnPaths
    from desk.scenarios.outlook import RunOutlook

__all__ = ["compare_models", "curve_at", "export_scenarios", "look_ahead", "paths_of"]


def _sides(book: Book) -> tuple[PricedFlows, PricedFlows]:
    """The flows that a run of the book values: some models are worked out as far as they reach."""
    from desk.valuation.priced import priced_flows

    return priced_flows(book, Side.ASSETS).flows, priced_flows(book, Side.LIABILITIES).flows


def look_ahead(
    book: Book, *, progress: Progress | None = None, cancel: CancelToken | None = None
) -> RunOutlook:
    """What can be said of the book's run before it is made; what stands in its way is in the answer.

    Parameters
    ----------
    book : Book
    progress, cancel : optional
        See `read`.

    Raises
    ------
    Cancelled
        If `cancel` was set before the work was done.
    """
    from desk.scenarios.outlook import run_outlook

    watch = watched(progress, cancel)
    watch(0.0)
    found = run_outlook(book)
    watch(1.0)
    return found


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


def compare_models(
    book: Book,
    models: Sequence[RatesModel],
    *,
    measures: Sequence[Measure] = (),
    progress: Progress | None = None,
    cancel: CancelToken | None = None,
) -> tuple[tuple[Measure, ModelRun], ...]:
    """Draw several models on one book with the same settings of the run.

    Parameters
    ----------
    book : Book
    models : sequence of RatesModel
    measures : sequence of Measure, optional
        Under each of which every model is drawn; that of the run when left out.
    progress, cancel : optional
        See `read`.

    Returns
    -------
    tuple of (Measure, ModelRun)
        By measure and then by model; one that cannot be drawn says why.

    Raises
    ------
    Cancelled
        If `cancel` was set before the work was done.
    """
    from desk.scenarios.compare import compare_models as compare

    watch = watched(progress, cancel)
    watch(0.0)
    sides = _sides(book)
    wanted = tuple(measures) or (book.run.measure,)
    found: list[tuple[Measure, ModelRun]] = []
    for number, measure in enumerate(wanted):
        part = part_of(watch, number / len(wanted), (number + 1) / len(wanted))
        under = replace(book, run=replace(book.run, measure=measure))
        found += [(measure, run) for run in compare(under, tuple(models), *sides, progress=part)]
    watch(1.0)
    return tuple(found)
