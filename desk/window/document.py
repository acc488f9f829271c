"""The open book: what was read, what was edited, what follows from it, and what of that is stale."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

from PySide6.QtCore import QObject, Signal

from desk import tasks
from desk.book import Book, Fault
from desk.intake.records import Reading
from desk.scenarios.records import Simulation
from desk.valuation.records import Standing
from desk.valuation.shock_records import ShockTable
from desk.window.history import History
from desk.window.jobs import Job, Jobs
from desk.window.simulated import Simulated
from desk.window.valued import Valued, changed_fields
from desk.window.what_if import LiveWhatIf

__all__ = ["Document", "changed_fields"]

_VALUED = frozenset({"basis", "liabilities", "holdings", "asset_flows", "line_terms"})
STANDING_FIELDS = _VALUED | {"second_basis"}
"""Parts of a book that its standings follow from, on the first basis and on the second."""
SHOCK_FIELDS = _VALUED | {"shocks", "shock_settings"}
"""Parts of a book that its table of shocks follows from."""
SIMULATION_FIELDS = _VALUED | {"rates_model", "risky_assets", "run", "scenario_set"}
"""Parts of a book that a simulation follows from."""


class Document(QObject):
    """One open book.

    Attributes
    ----------
    reading : Reading or None
        What was read last, whether or not it gave a book.
    source : Reading or None
        The reading the open book came from.
    book : Book or None
    simulation : Simulation or None
        The last run that came to its end.
    path : Path or None
        Where the book was opened from or last saved to.
    shocks : Valued of ShockTable
        The book under its shocks, once `request_shocks` asked for it.
    what_if : LiveWhatIf
        A shock that is tried out; it never changes the book.

    Signals
    -------
    reading_changed, book_changed, standing_changed, shocks_changed, simulation_changed, history_changed
        The attribute changed, or whether it is stale.
    modified_changed(bool)
    failed(str)
        A valuation or a run came to nothing, and why.
    """

    reading_changed = Signal()
    book_changed = Signal()
    standing_changed = Signal()
    shocks_changed = Signal()
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
        shock: Callable[..., ShockTable] | None = None,
    ) -> None:
        """Start empty; `value`, `simulate` and `shock` stand in for the tasks of those names."""
        super().__init__(parent)
        self._value = value or tasks.value
        self._shock = shock or tasks.shock
        self.reading: Reading | None = None
        self.source: Reading | None = None
        self.path: Path | None = None
        self._first = Valued(
            jobs,
            title="Valuing the book",
            value=lambda: self._value,
            names=STANDING_FIELDS,
            on_changed=self.standing_changed.emit,
            on_failed=lambda why: self.failed.emit(f"The book could not be valued: {why}"),
        )
        self._second = Valued(
            jobs,
            title="Valuing the second basis",
            value=lambda: self._value,
            names=STANDING_FIELDS,
            on_changed=self.standing_changed.emit,
            on_failed=lambda why: self.failed.emit(f"The second basis could not be valued: {why}"),
        )
        self.shocks = Valued(
            jobs,
            title="Shocking the book",
            value=lambda: self._shock,
            names=SHOCK_FIELDS,
            on_changed=self.shocks_changed.emit,
            on_failed=lambda why: self.failed.emit(f"The shocks came to nothing: {why}"),
        )
        self._shocks_asked: Book | None = None
        self.what_if = LiveWhatIf(jobs, _VALUED, self)
        self._wants_comparison = True
        self._run = Simulated(
            jobs,
            simulate=simulate or tasks.simulate,
            names=SIMULATION_FIELDS,
            on_changed=self.simulation_changed.emit,
            on_failed=self.failed.emit,
        )
        self._history = History()
        self._was_modified = False

    # The book and its history

    @property
    def book(self) -> Book | None:
        """The book as edited."""
        return self._history.book

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
        further = dict.fromkeys(
            (*self._first.faults, *self._second.faults, *self.shocks.faults, *self._run.faults)
        )
        return (*self.reading.faults, *further)

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
        self._history.start(reading.book)
        self._first.forget()
        self._second.forget()
        self.shocks.forget()
        self._shocks_asked = None
        self.what_if.forget()
        self._wants_comparison = True
        self._run.forget()
        self._request_standings()
        self.reading_changed.emit()
        self.book_changed.emit()
        self.standing_changed.emit()
        self.shocks_changed.emit()
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
        self._history.add(text, book, merge_key=merge_key)
        self._book_replaced()

    @property
    def can_undo(self) -> bool:
        """Whether there is an edit to undo."""
        return self._history.can_undo

    @property
    def can_redo(self) -> bool:
        """Whether there is an edit to do again."""
        return self._history.can_redo

    @property
    def undo_text(self) -> str:
        """What would be undone; empty where nothing can be."""
        return self._history.undo_text

    @property
    def redo_text(self) -> str:
        """What would be done again; empty where nothing can be."""
        return self._history.redo_text

    def undo(self) -> None:
        """Go back one edit."""
        if self._history.step(-1):
            self._book_replaced()

    def redo(self) -> None:
        """Go forward one edit."""
        if self._history.step(1):
            self._book_replaced()

    @property
    def is_modified(self) -> bool:
        """Whether the book differs in its history from what was opened or last saved."""
        return self._history.is_modified

    def mark_saved(self, path: Path, book: Book | None = None) -> None:
        """Note that a version of the book was saved to `path`.

        Parameters
        ----------
        path : Path
        book : Book, optional
            The version that was saved, where edits may have followed; by default the book as it stands.
        """
        if self.book is None:
            return
        self._history.mark_saved(book)
        self.path = path
        self._tell_history()

    def _book_replaced(self) -> None:
        book = self._open_book()
        stale = (self.standing_is_stale, self.second_is_stale, self._run.is_stale)
        had_second = self._second.result is not None
        self._run.note(book)
        self.shocks.note(book)
        self._request_standings()
        self.what_if.follow(book)
        self.book_changed.emit()
        lost_second = had_second and self._second.result is None
        if (self.standing_is_stale, self.second_is_stale) != stale[:2] or lost_second:
            self.standing_changed.emit()
        if self._run.is_stale != stale[2]:
            self.simulation_changed.emit()
        self._tell_history()

    def _tell_history(self) -> None:
        self.history_changed.emit()
        if self.is_modified != self._was_modified:
            self._was_modified = self.is_modified
            self.modified_changed.emit(self._was_modified)

    def _open_book(self) -> Book:
        book = self._history.book
        assert book is not None
        return book

    # What follows from the book

    @property
    def standing(self) -> Standing | None:
        """Of the book, or of a former version of it while `standing_is_stale`."""
        return self._first.result

    @property
    def standing_faults(self) -> tuple[Fault, ...]:
        """What the valuation could not do as asked, beside what the reading says."""
        return self._first.faults

    @property
    def standing_failure(self) -> str:
        """Why the book as it stands could not be valued; empty where it could, or while it is valued."""
        return self._first.failure

    @property
    def standing_is_stale(self) -> bool:
        """Whether `standing` is that of a former version of the book."""
        return self._first.is_stale

    @property
    def second_standing(self) -> Standing | None:
        """On the second basis of the book, or of a former version of it while `second_is_stale`."""
        return self._second.result

    @property
    def second_failure(self) -> str:
        """Why the book could not be valued on its second basis; empty where it could."""
        return self._second.failure

    @property
    def second_faults(self) -> tuple[Fault, ...]:
        """What the valuation on the second basis could not do as asked and the first one could."""
        return tuple(fault for fault in self._second.faults if fault not in self._first.faults)

    @property
    def second_is_stale(self) -> bool:
        """Whether `second_standing` is that of a former version of the book."""
        return self._second.is_stale

    @property
    def is_comparing(self) -> bool:
        """Whether the book has a second basis and is looked at beside it."""
        return self._wants_comparison and self.book is not None and self.book.second_basis is not None

    @property
    def comparison(self) -> Standing | None:
        """What the standing is compared with; None while it is compared with nothing."""
        return self._second.result if self.is_comparing else None

    @property
    def comparison_is_current(self) -> bool:
        """Whether there is a comparison and both of its standings are those of the book as it stands."""
        return self.comparison is not None and not (self.standing_is_stale or self.second_is_stale)

    def compare(self, wanted: bool) -> None:
        """Look at the book beside its second basis, or at the first alone."""
        if wanted != self._wants_comparison:
            self._wants_comparison = wanted
            self.standing_changed.emit()

    @property
    def simulation(self) -> Simulation | None:
        """The last run that came to its end."""
        return self._run.result

    @property
    def simulation_book(self) -> Book | None:
        """The version of the book that `simulation` was run on."""
        return self._run.of

    @property
    def simulation_is_stale(self) -> bool:
        """Whether `simulation` was run on a former version of the book."""
        return self._run.is_stale

    @property
    def is_valuing(self) -> bool:
        """Whether a valuation runs on the first basis."""
        return self._first.is_running

    @property
    def is_valuing_second(self) -> bool:
        """Whether a valuation runs on the second basis."""
        return self._second.is_running

    @property
    def is_simulating(self) -> bool:
        """Whether a run is under way."""
        return self._run.is_running

    def stop(self) -> None:
        """Cancel what runs for this book."""
        self._first.stop()
        self._second.stop()
        self.shocks.stop()
        self.what_if.stop()
        self._run.stop()

    def revalue(self) -> None:
        """Value the book once more, on both bases."""
        self._first.restart()
        self._second.restart()

    def _request_standings(self) -> None:
        """See to it that the standings come to be those of the book."""
        book = self._open_book()
        told = () if self.source is None else self.source.faults
        self._first.follow(book, told)
        second = book.on_second_basis
        if second is None:
            self._second.forget()
        else:
            self._second.follow(second, told)

    def request_shocks(self, *, again: bool = False) -> None:
        """See to it that the table of shocks comes to be that of the book; `again` after a failure."""
        book, shocks = self.book, self.shocks
        answered = shocks.is_running or shocks.failure or (shocks.result is not None and not shocks.is_stale)
        if book is None or (book is self._shocks_asked and answered and not again):
            return
        self._shocks_asked = book
        told = () if self.source is None else self.source.faults
        self.shocks.follow(book, told)

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
        return self._run.start(book, () if self.source is None else self.source.faults)

    def cancel_simulation(self) -> None:
        """Stop the run under way; the former result stays."""
        self._run.cancel()
