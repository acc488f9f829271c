"""Opening and saving books: what is read, where it is written, and what becomes of unsaved changes."""

from __future__ import annotations

import logging
from collections.abc import Callable
from functools import partial
from pathlib import Path

from PySide6.QtCore import QObject, Signal

from desk import places, tasks
from desk.book import Book
from desk.intake.records import Reading
from desk.window.dialogs import Choice, Dialogs, documents
from desk.window.document import Document
from desk.window.jobs import Job, Jobs
from desk.window.parts.paths import is_inside, is_same_file
from desk.window.recent import RecentBooks
from desk.window.settings import Settings

__all__ = ["BookFiles"]

_log = logging.getLogger(__name__)

_Stamp = tuple[int, int]


def _stamp(path: Path) -> _Stamp | None:
    """Time and size of a file; None where there is none."""
    try:
        facts = path.stat()
    except OSError:
        return None
    return facts.st_mtime_ns, facts.st_size


class BookFiles(QObject):
    """Reads books into the document and writes them out of it.

    Attributes
    ----------
    own_path : Path or None
        Where the reader chose to save the open book: saving goes there again without a question.

    Signals
    -------
    opened(Reading)
        A book was opened.
    refused(Reading)
        A workbook was read and is no book; the open one is as it was.
    saved(Path)
    told(str, bool)
        Something to tell the reader, and whether it is grave.
    """

    opened = Signal(object)
    refused = Signal(object)
    saved = Signal(object)
    told = Signal(str, bool)

    def __init__(
        self,
        document: Document,
        jobs: Jobs,
        settings: Settings,
        recent: RecentBooks,
        dialogs: Dialogs,
        parent: QObject | None = None,
        *,
        read: Callable[..., Reading] | None = None,
        save_copy: Callable[[Book, Path], Path] | None = None,
    ) -> None:
        """Use the document given; `read` and `save_copy` stand in for the tasks of those names."""
        super().__init__(parent)
        self._document = document
        self._jobs = jobs
        self._settings = settings
        self._recent = recent
        self._dialogs = dialogs
        self._read = read or tasks.read
        self._save_copy = save_copy or tasks.save_copy
        self.own_path: Path | None = None
        self._own_stamp: _Stamp | None = None
        self._saving: Job | None = None
        self._waiting: Callable[[], None] | None = None

    # Opening

    def ask_open(self) -> None:
        """Ask which workbook to open, and open it."""
        folder = self._settings.book_folder
        self._dialogs.ask_open(folder if folder and folder.is_dir() else documents(), self.open)

    def open(self, path: Path) -> None:
        """Read a workbook; where it is a book, it takes the open one's place.

        Unsaved changes are asked about only once the new book is there: a workbook that cannot be used costs
        nothing.
        """
        self._jobs.start(
            f"Reading {path.name}",
            partial(self._read, path),
            on_done=self._on_read,
            on_failed=partial(self._on_read_failed, path),
            on_cancelled=lambda: self.told.emit(f"{path.name} was not read to its end.", False),
            exclusive_key=f"reading of {id(self)}",
        )

    def read_again(self) -> None:
        """Read the file of the last reading once more."""
        reading = self._document.reading
        if reading is not None:
            self.open(reading.path)

    def _on_read(self, reading: Reading) -> None:
        if reading.book is None:
            self._document.open_reading(reading)
            self.refused.emit(reading)
            return
        self.settle_unsaved(f"before {reading.path.name} is opened", partial(self._take, reading))

    def _take(self, reading: Reading) -> None:
        self.own_path = self._own_stamp = None
        self._document.open_reading(reading)
        if not is_inside(reading.path, places.demo_books()):
            self._settings.book_folder = reading.path.parent
        self._recent.add(reading.path)
        self.opened.emit(reading)

    def _on_read_failed(self, path: Path, error: BaseException) -> None:
        if isinstance(error, OSError):
            if not path.is_file():
                self._recent.drop(path)
            self.told.emit(f"{path.name} could not be read: {_reason(error)}", True)
        else:
            raise error

    # Saving

    def save(self, then: Callable[[], None] | None = None) -> None:
        """Save to where the book was saved before, or ask where to.

        Parameters
        ----------
        then : callable, optional
            Called once the book is saved, and only then.
        """
        path = self.own_path
        if path is None:
            self.ask_save(then)
        elif self._own_stamp is not None and _stamp(path) not in (None, self._own_stamp):
            self._dialogs.ask_overwrite(
                f"Replace “{path.name}”?",
                "Somebody changed the file after the book was saved there. Replacing it loses that change.",
                partial(self._write, path, then),
            )
        else:
            self._write(path, then)

    def ask_save(self, then: Callable[[], None] | None = None) -> None:
        """Ask where to save a copy of the book."""
        if self._document.book is None:
            return
        self._dialogs.ask_save("Save a copy of the book", self._suggestion(), partial(self._chosen, then))

    def _suggestion(self) -> Path:
        if self.own_path is not None:
            return self.own_path
        source = self._document.path or Path("book.xlsx")
        folder = source.parent
        if is_inside(source, places.demo_books()) or not folder.is_dir():
            folder = self._settings.book_folder or documents()
        return folder / f"{source.stem} (copy).xlsx"

    def _chosen(self, then: Callable[[], None] | None, path: Path) -> None:
        source = self._document.source
        if source is not None and path != self.own_path and is_same_file(path, source.path):
            self._dialogs.ask_overwrite(
                f"Replace “{path.name}”?",
                "The book was opened from this workbook. What is in it beside the book (its formatting, "
                "formulas "
                "and further sheets) is lost when the book is saved over it.",
                partial(self._write, path, then),
            )
        else:
            self._write(path, then)

    def _write(self, path: Path, then: Callable[[], None] | None) -> None:
        book = self._document.book
        if book is None:
            return
        if self._saving is not None:
            # One after the other, or the older book might be the one that stays on the disk.
            self._waiting = partial(self._write, path, then)
            return

        def work(*, progress: Callable[[float], None], cancel: object) -> Path:
            del cancel
            progress(0.0)
            return self._save_copy(book, path)

        self._saving = self._jobs.start(
            f"Saving {path.name}",
            work,
            on_done=partial(self._on_saved, book, then),
            on_failed=partial(self._on_save_failed, path),
            on_cancelled=self._on_save_cancelled,
        )

    def _save_ended(self) -> None:
        self._saving = None
        waiting, self._waiting = self._waiting, None
        if waiting is not None:
            waiting()

    def _on_save_cancelled(self) -> None:
        self.told.emit("Saving was cancelled: the book counts as not saved.", False)
        self._waiting = None
        self._save_ended()

    def _on_saved(self, book: Book, then: Callable[[], None] | None, path: Path) -> None:
        self.own_path, self._own_stamp = path, _stamp(path)
        self._settings.book_folder = path.parent
        self._document.mark_saved(path, book)
        self._recent.add(path)
        self.saved.emit(path)
        self.told.emit(f"Saved to {path}.", False)
        self._save_ended()
        if then is not None:
            then()

    def _on_save_failed(self, path: Path, error: BaseException) -> None:
        self._waiting = None
        self._save_ended()
        if not isinstance(error, OSError):
            raise error
        self.told.emit(f"The book was not saved: {path.name} cannot be written: {_reason(error)}", True)

    # Unsaved changes

    def settle_unsaved(self, before: str, then: Callable[[], None]) -> None:
        """Do `then` at once, or after the reader has decided on unsaved changes, unless called off."""
        if not self._document.is_modified:
            then()
            return

        def decided(choice: Choice) -> None:
            if choice is Choice.SAVE:
                self.save(partial(self.settle_unsaved, before, then))
            elif choice is Choice.DISCARD:
                then()

        self._dialogs.ask_unsaved(self.name, before, decided)

    @property
    def name(self) -> str:
        """What the open book is called: its file's name."""
        path = self._document.path
        return path.name if path is not None else "book"


def _reason(error: OSError) -> str:
    return error.strerror or str(error) or type(error).__name__
