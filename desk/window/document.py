"""The open book: what was read, what was edited, what follows from it, and what of that is stale."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, fields, replace
from functools import partial
from pathlib import Path
from typing import Any

from PySide6.QtCore import QObject, Signal

from desk import tasks
from desk.book import Book, Fault
from desk.intake.records import Reading
from desk.report.said_once import further_faults
from desk.scenarios.records import Simulation
from desk.valuation.records import Standing
from desk.window.jobs import Job, Jobs

__all__ = ["Document", "changed_fields"]

STANDING_FIELDS = frozenset({"basis", "liabilities", "holdings", "asset_flows"})
"""Parts of a book that its standing follows from."""
SIMULATION_FIELDS = STANDING_FIELDS | {"rates_model", "risky_assets", "run"}
"""Parts of a book that a simulation follows from."""

_LONGEST_HISTORY = 200


def changed_fields(old: Book, new: Book) -> frozenset[str]:
    """The names of the parts in which two books differ."""
    if old is new:
        return frozenset()
    names = (field.name for field in fields(Book))
    return frozenset(
        name
        for name in names
        if getattr(old, name) is not getattr(new, name) and getattr(old, name) != getattr(new, name)
    )


@dataclass(frozen=True, eq=False)
class _Version:
    """A book in the history; `text` says what edit led to it."""

    text: str
    book: Book
    merge_key: object = None


class Document(QObject):
    """One open book.

    Attributes
    ----------
    reading : Reading or None
        What was read last, whether or not it gave a book.
    source : Reading or None
        The reading the open book came from.
    book : Book or None
    standing : Standing or None
        Of the book, or of a former version of it while `standing_is_stale`.
    standing_faults : tuple of Fault
        What the valuation could not do as asked, beside what the reading says.
    standing_failure : str
        Why the book as it stands could not be valued; empty where it could, or while it is being valued.
    simulation : Simulation or None
        The last run that came to its end.
    path : Path or None
        Where the book was opened from or last saved to.

    Signals
    -------
    reading_changed, book_changed, standing_changed, simulation_changed, history_changed
        The attribute changed, or whether it is stale.
    modified_changed(bool)
    failed(str)
        A valuation or a run came to nothing, and why.
    """

    reading_changed = Signal()
    book_changed = Signal()
    standing_changed = Signal()
    simulation_changed = Signal()
    history_changed = Signal()
    modified_changed = Signal(bool)
    failed = Signal(str)

    def __init__(
        self,
        jobs: Jobs,
        parent: QObject | None = None,
        *,
        value: Callable[..., Standing] | None = None,
        simulate: Callable[..., Simulation] | None = None,
    ) -> None:
        """Start empty; `value` and `simulate` stand in for the tasks of those names."""
        super().__init__(parent)
        self._jobs = jobs
        self._value = value or tasks.value
        self._simulate = simulate or tasks.simulate
        self.reading: Reading | None = None
        self.source: Reading | None = None
        self.path: Path | None = None
        self.standing: Standing | None = None
        self.standing_faults: tuple[Fault, ...] = ()
        self._simulation_faults: tuple[Fault, ...] = ()
        self.standing_failure = ""
        self.simulation: Simulation | None = None
        self._history: list[_Version] = []
        self._place = -1
        self._saved: _Version | None = None
        self._was_modified = False
        self._standing_book: Book | None = None
        self._simulation_book: Book | None = None
        self._standing_stale = False
        self._simulation_stale = False
        self._valuing: Job | None = None
        self._valuing_book: Book | None = None
        self._simulating: Job | None = None

    # The book and its history

    @property
    def book(self) -> Book | None:
        """The book as edited."""
        return self._history[self._place].book if self._history else None

    @property
    def current_reading(self) -> Reading | None:
        """The source of the open book with the book as edited in it: what a report is made from."""
        if self.source is None or self.book is None:
            return None
        return replace(self.source, book=self.book)

    @property
    def faults(self) -> tuple[Fault, ...]:
        """Those of what was read last; for the open book also what its standing and its run add to them."""
        if self.reading is None:
            return ()
        if self.reading is not self.source:
            return self.reading.faults
        of_run = tuple(fault for fault in self._simulation_faults if fault not in self.standing_faults)
        return (*self.reading.faults, *self.standing_faults, *of_run)

    def open_reading(self, reading: Reading) -> None:
        """Open what was read.

        A reading without a book is shown with its faults, and the open book stays as it is.
        """
        self.reading = reading
        if reading.book is None:
            self.reading_changed.emit()
            return
        self.stop()
        self.source = reading
        self.path = reading.path
        self._history = [_Version("", reading.book)]
        self._place = 0
        self._saved = self._history[0]
        self.standing = self._standing_book = None
        self.standing_failure = ""
        self.simulation = self._simulation_book = None
        self.standing_faults = self._simulation_faults = ()
        self._standing_stale = self._simulation_stale = False
        self._request_standing()
        self.reading_changed.emit()
        self.book_changed.emit()
        self.standing_changed.emit()
        self.simulation_changed.emit()
        self._tell_history()

    def edit(self, text: str, book: Book, *, merge_key: object = None) -> None:
        """Put `book` in the place of the open one.

        Parameters
        ----------
        text : str
            What the edit did, for undo and redo, for example ``Change of the liability spread``.
        book : Book
        merge_key : object, optional
            Edits of one `text` with one key that is not None are one step of the history: a drag.

        Raises
        ------
        RuntimeError
            If no book is open.
        """
        former = self.book
        if former is None:
            raise RuntimeError("there is no open book to edit")
        if not changed_fields(former, book):
            return
        version = _Version(text, book, merge_key)
        last = self._history[self._place]
        merges = (
            merge_key is not None
            and last.merge_key == merge_key
            and last.text == text
            and last is not self._saved
            and self._place == len(self._history) - 1
        )
        del self._history[self._place + (0 if merges else 1) :]
        self._history.append(version)
        del self._history[: -_LONGEST_HISTORY - 1]
        self._place = len(self._history) - 1
        self._book_replaced()

    @property
    def can_undo(self) -> bool:
        """Whether there is an edit to undo."""
        return self._place > 0

    @property
    def can_redo(self) -> bool:
        """Whether there is an edit to do again."""
        return 0 <= self._place < len(self._history) - 1

    @property
    def undo_text(self) -> str:
        """What would be undone; empty where nothing can be."""
        return self._history[self._place].text if self.can_undo else ""

    @property
    def redo_text(self) -> str:
        """What would be done again; empty where nothing can be."""
        return self._history[self._place + 1].text if self.can_redo else ""

    def undo(self) -> None:
        """Go back one edit."""
        if self.can_undo:
            self._place -= 1
            self._book_replaced()

    def redo(self) -> None:
        """Go forward one edit."""
        if self.can_redo:
            self._place += 1
            self._book_replaced()

    @property
    def is_modified(self) -> bool:
        """Whether the book differs in its history from what was opened or last saved."""
        return bool(self._history) and self._history[self._place] is not self._saved

    def mark_saved(self, path: Path, book: Book | None = None) -> None:
        """Note that a version of the book was saved to `path`.

        Parameters
        ----------
        path : Path
        book : Book, optional
            The version that was saved, where edits may have followed; by default the book as it stands.
        """
        if not self._history:
            return
        saved = self._history[self._place]
        if book is not None:
            saved = next((version for version in self._history if version.book is book), self._saved or saved)
        self._saved = saved
        self.path = path
        self._tell_history()

    def _book_replaced(self) -> None:
        book = self._open_book()
        standing_was_stale = self._standing_stale
        simulation_was_stale = self._simulation_stale
        self._standing_stale = self._is_outdated(self._standing_book, book, STANDING_FIELDS)
        self._simulation_stale = self._is_outdated(self._simulation_book, book, SIMULATION_FIELDS)
        self._request_standing()
        self.book_changed.emit()
        if self._standing_stale != standing_was_stale:
            self.standing_changed.emit()
        if self._simulation_stale != simulation_was_stale:
            self.simulation_changed.emit()
        self._tell_history()

    def _tell_history(self) -> None:
        self.history_changed.emit()
        if self.is_modified != self._was_modified:
            self._was_modified = self.is_modified
            self.modified_changed.emit(self._was_modified)

    def _open_book(self) -> Book:
        return self._history[self._place].book

    @staticmethod
    def _is_outdated(of: Book | None, book: Book, names: frozenset[str]) -> bool:
        return of is not None and bool(changed_fields(of, book) & names)

    # What follows from the book

    @property
    def standing_is_stale(self) -> bool:
        """Whether `standing` is that of a former version of the book."""
        return self._standing_stale

    @property
    def simulation_is_stale(self) -> bool:
        """Whether `simulation` was run on a former version of the book."""
        return self._simulation_stale

    @property
    def is_valuing(self) -> bool:
        """Whether a valuation runs."""
        return self._valuing is not None

    @property
    def is_simulating(self) -> bool:
        """Whether a run is under way."""
        return self._simulating is not None

    def stop(self) -> None:
        """Cancel what runs for this book."""
        for job in (self._valuing, self._simulating):
            if job is not None:
                self._jobs.cancel(job)
        self._valuing = self._valuing_book = self._simulating = None

    def revalue(self) -> None:
        """Value the book once more."""
        if self._history:
            self._start_valuing()

    def _request_standing(self) -> None:
        """See to it that the standing comes to be that of the book."""
        book = self._open_book()
        if self.standing is not None and not self._standing_stale:
            if self._valuing is not None:
                self._jobs.cancel(self._valuing)
                self._valuing = self._valuing_book = None
            self.standing_failure = ""
            return
        if self._valuing is not None and not self._is_outdated(self._valuing_book, book, STANDING_FIELDS):
            return
        self._start_valuing()

    def _start_valuing(self) -> None:
        book = self._open_book()
        self.standing_failure = ""
        self._valuing_book = book
        # The former job, if one runs, is cancelled by the key; its callbacks no longer know this book.
        self._valuing = self._jobs.start(
            "Valuing the book",
            partial(_with_faults, self._value, book, self._told()),
            on_done=partial(self._standing_done, book),
            on_failed=partial(self._standing_failed, book),
            exclusive_key=f"standing of {id(self)}",
        )

    def _told(self) -> tuple[Fault, ...]:
        return () if self.source is None else self.source.faults

    def _standing_done(self, book: Book, result: tuple[Standing, tuple[Fault, ...]]) -> None:
        if book is not self._valuing_book:
            return
        self._valuing = self._valuing_book = None
        (self.standing, self.standing_faults), self._standing_book = result, book
        self._standing_stale = self._is_outdated(book, self._open_book(), STANDING_FIELDS)
        self.standing_changed.emit()

    def _standing_failed(self, book: Book, error: BaseException) -> None:
        if book is not self._valuing_book:
            return
        self._valuing = self._valuing_book = None
        self.standing_failure = _reason(error)
        self.standing_changed.emit()
        self.failed.emit(f"The book could not be valued: {self.standing_failure}")

    def run_simulation(self) -> Job:
        """Run the book's simulation; a run under way is cancelled for it.

        Raises
        ------
        RuntimeError
            If no book is open.
        """
        book = self.book
        if book is None:
            raise RuntimeError("there is no open book to simulate")
        key = f"simulation of {id(self)}"
        job: Job | None = None

        def ended(act: Callable[[Any], None], value: Any = None) -> None:
            if job is self._simulating:
                self._simulating = None
                act(value)
                self.simulation_changed.emit()

        def done(result: tuple[Simulation, tuple[Fault, ...]]) -> None:
            (self.simulation, self._simulation_faults), self._simulation_book = result, book
            self._simulation_stale = self._is_outdated(book, self._open_book(), SIMULATION_FIELDS)

        def failed(error: BaseException) -> None:
            self.failed.emit(f"The simulation came to nothing: {_reason(error)}")

        job = self._jobs.start(
            "Simulating",
            partial(_with_faults, self._simulate, book, self._told()),
            on_done=partial(ended, done),
            on_failed=partial(ended, failed),
            on_cancelled=partial(ended, lambda _: None),
            exclusive_key=key,
        )
        self._simulating = job
        self.simulation_changed.emit()
        return job

    def cancel_simulation(self) -> None:
        """Stop the run under way; the former result stays."""
        if self._simulating is not None:
            self._jobs.cancel(self._simulating)


def _with_faults(
    task: Callable[..., Any], book: Book, told: tuple[Fault, ...], **tools: Any
) -> tuple[Any, tuple[Fault, ...]]:
    """Run a task; its result, and what it could not do as asked that `told` does not say already."""
    result = task(book, **tools)
    return result, further_faults(told, result.faults) if result.faults else ()


def _reason(error: BaseException) -> str:
    """Why, in the words of the error; its kind where it has none."""
    return str(error).strip() or type(error).__name__
