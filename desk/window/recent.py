"""The books opened lately."""

from __future__ import annotations

import os
from collections.abc import Callable
from functools import partial
from pathlib import Path

from PySide6.QtCore import QObject, Signal

from desk.window.jobs import Jobs
from desk.window.settings import Settings

__all__ = ["MOST_RECENT", "RecentBooks"]

MOST_RECENT = 10


def _key(path: Path) -> str:
    """Equal for two ways of writing one path, without asking the disk."""
    return os.path.normcase(os.path.abspath(path))


def _still_there(paths: tuple[Path, ...], *, progress: Callable[[float], None], cancel: object) -> set[Path]:
    """Which of the files exist; run in a thread, as a drive that does not answer can take its time."""
    del cancel
    found = set()
    for place, path in enumerate(paths):
        if path.is_file():
            found.add(path)
        progress((place + 1) / len(paths))
    return found


class RecentBooks(QObject):
    """The last ten books, remembered in the settings.

    Signals
    -------
    changed()
    """

    changed = Signal()

    def __init__(self, settings: Settings, jobs: Jobs, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._settings = settings
        self._jobs = jobs
        self._paths = settings.recent[:MOST_RECENT]

    @property
    def paths(self) -> tuple[Path, ...]:
        """The latest first."""
        return self._paths

    def add(self, path: Path) -> None:
        """Put a book first."""
        whole = Path(os.path.abspath(path))
        others = [other for other in self._paths if _key(other) != _key(whole)]
        self._keep((whole, *others)[:MOST_RECENT])

    def drop(self, path: Path) -> None:
        """Take a book out."""
        self._keep(tuple(other for other in self._paths if _key(other) != _key(path)))

    def clear(self) -> None:
        """Forget all."""
        self._keep(())

    def look(self) -> None:
        """Drop, in the background, the books that are no longer there."""
        if self._paths:
            self._jobs.start(
                "Looking for the recent books",
                partial(_still_there, self._paths),
                on_done=partial(self._looked, self._paths),
                exclusive_key=f"recent books of {id(self)}",
            )

    def _looked(self, asked: tuple[Path, ...], found: set[Path]) -> None:
        missing = {path for path in asked if path not in found}
        if missing:
            self._keep(tuple(path for path in self._paths if path not in missing))

    def _keep(self, paths: tuple[Path, ...]) -> None:
        if paths != self._paths:
            self._paths = paths
            self._settings.recent = paths
            self.changed.emit()
