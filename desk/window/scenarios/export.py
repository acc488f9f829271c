"""The export of a run's paths: asks where to, writes in the background, and says how it went."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from pathlib import Path

from PySide6.QtWidgets import QFileDialog, QWidget

from desk import tasks
from desk.book import Book
from desk.window.jobs import Job, Jobs
from desk.window.valued import reason

__all__ = ["PathExport"]

_YEARS = "Workbook, by year (*.xlsx)"
_STEPS = "Workbook, every step (*.xlsx)"
_CSV_YEARS = "Compressed CSV, by year (*.csv.gz)"
_CSV_STEPS = "Compressed CSV, every step (*.csv.gz)"
_FILTERS = (_YEARS, _STEPS, _CSV_YEARS, _CSV_STEPS)


class PathExport:
    """Exports the paths of a run; one at a time.

    Parameters
    ----------
    parent : QWidget
        Of the dialog.
    jobs : Jobs
    say : callable
        Tells the reader something.
    changed : callable
        An export began or ended.
    """

    def __init__(
        self, parent: QWidget, jobs: Jobs, *, say: Callable[[str], object], changed: Callable[[], object]
    ) -> None:
        self._parent, self._jobs, self._say, self._changed = parent, jobs, say, changed
        self.job: Job | None = None

    @property
    def is_running(self) -> bool:
        """Whether paths are being written."""
        return self.job is not None and self.job.is_running

    def ask(self, book: Book, name: str) -> None:
        """Ask for a file and write the paths of a book's run to it."""
        if self.is_running:
            return
        chosen, kind = QFileDialog.getSaveFileName(
            self._parent, "Export the paths", f"{name}.xlsx", ";;".join(_FILTERS)
        )
        if chosen:
            self.write(book, _named(Path(chosen), kind), every_step=kind in (_STEPS, _CSV_STEPS))

    def write(self, book: Book, path: Path, *, every_step: bool = False) -> None:
        """Write the paths of a book's run."""
        self.job = self._jobs.start(
            f"Writing {path.name}",
            partial(tasks.export_scenarios, book, path, every_step=every_step),
            on_done=lambda written: self._ended(f"The paths are in {written.name}."),
            on_failed=lambda error: self._ended(f"The paths were not written: {reason(error)}"),
            on_cancelled=lambda: self._ended("The export was stopped; nothing was written."),
        )
        self._changed()

    def _ended(self, text: str) -> None:
        self.job = None
        self._say(text)
        self._changed()


def _named(path: Path, kind: str) -> Path:
    """The path with the ending that goes with the kind chosen, where it has none that is known."""
    if path.name.casefold().endswith((".xlsx", ".csv.gz")):
        return path
    bare = path.name[:-3] if path.name.casefold().endswith(".gz") else path.name
    bare = bare[:-4] if bare.casefold().endswith(".csv") else bare
    return path.with_name(bare + (".csv.gz" if kind in (_CSV_YEARS, _CSV_STEPS) else ".xlsx"))
