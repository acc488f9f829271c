"""The task that fits a short-rate model to data of the book."""

from __future__ import annotations

from typing import TYPE_CHECKING

from desk.book import Book, ModelName
from desk.tasks.running import CancelToken, Progress, watched

if TYPE_CHECKING:
    from desk.scenarios.calibration_records import Calibration, CalibrationSource

__all__ = ["calibrate"]


def calibrate(
    book: Book,
    *,
    source: CalibrationSource,
    model: ModelName | None = None,
    progress: Progress | None = None,
    cancel: CancelToken | None = None,
) -> Calibration:
    """Fit a short-rate model to data of the book; the book stays as it is.

    Parameters
    ----------
    book : Book
    source : CalibrationSource
        The data.
    model : ModelName, optional
        By default the book's own, where it can be fitted to these data, or the usual one.
    progress, cancel : optional
        See `read`.

    Returns
    -------
    Calibration

    Raises
    ------
    CalibrationError
        If the book has no such data, or the model cannot be fitted to them.
    Cancelled
        If `cancel` was set before the work was done.
    """
    from desk.scenarios.calibration import calibrate as fit

    watch = watched(progress, cancel)
    watch(0.0)
    found = fit(book, source=source, model=model)
    watch(1.0)
    return found
