"""The work of the program, as the window and the commands call it.

Every task takes a `progress` callback and a `cancel` token. The rooms below know only the callback:
the one they are given looks at the token first and stops the work by raising `Cancelled`.
"""

from __future__ import annotations

import threading
from collections.abc import Callable
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
    """Read a book workbook to its end; faults come back in the reading, never as an exception."""
    raise NotImplementedError


def value(book: Book, *, progress: Progress | None = None, cancel: CancelToken | None = None) -> Standing:
    """Value a book. Raises ValueError when its basis gives no curve."""
    raise NotImplementedError


def simulate(
    book: Book, *, progress: Progress | None = None, cancel: CancelToken | None = None
) -> Simulation:
    """Draw the book's rates model and value both sides along the paths, as the book's run says."""
    raise NotImplementedError


def report(
    reading: Reading,
    path: Path,
    *,
    standing: Standing | None = None,
    simulation: Simulation | None = None,
    progress: Progress | None = None,
    cancel: CancelToken | None = None,
) -> Path:
    """Write the report; what is not handed over is computed."""
    raise NotImplementedError


def save_copy(book: Book, path: Path) -> Path:
    """Write a book as a book workbook that reads in again the same."""
    raise NotImplementedError
