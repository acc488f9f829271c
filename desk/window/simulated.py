"""The run of a book that changes: the job that makes it, its result, and whether that is stale."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from typing import Any

from desk.book import Book, Fault
from desk.scenarios.records import Simulation
from desk.window.jobs import Job, Jobs
from desk.window.valued import is_outdated, reason, with_faults

__all__ = ["Simulated"]


class Simulated:
    """A simulation, run when it is asked for.

    Attributes
    ----------
    result : Simulation or None
        The last run that came to its end.
    of : Book or None
        The version of the book that it was run on.
    faults : tuple of Fault
        What it could not do as asked, beside what was told before.
    is_stale : bool
        Whether `of` is a former version of the book.
    """

    def __init__(
        self,
        jobs: Jobs,
        *,
        simulate: Callable[..., Simulation],
        names: frozenset[str],
        on_changed: Callable[[], None],
        on_failed: Callable[[str], None],
    ) -> None:
        """Start without a run.

        Parameters
        ----------
        jobs : Jobs
        simulate : callable
            The task.
        names : frozenset of str
            Parts of a book that the result follows from.
        on_changed : callable
            Called when a run begins, and when it ends in any way.
        on_failed : callable
            Called with the reason, before `on_changed`.
        """
        self._jobs = jobs
        self._simulate = simulate
        self._names = names
        self._on_changed = on_changed
        self._on_failed = on_failed
        self._book: Book | None = None
        self._job: Job | None = None
        self.result: Simulation | None = None
        self.of: Book | None = None
        self.faults: tuple[Fault, ...] = ()
        self.is_stale = False

    @property
    def is_running(self) -> bool:
        """Whether a run is under way."""
        return self._job is not None

    def note(self, book: Book) -> None:
        """See whether the result is still that of `book`."""
        self._book = book
        self.is_stale = is_outdated(self.of, book, self._names)

    def start(self, book: Book, told: tuple[Fault, ...]) -> Job:
        """Run it; a run under way is cancelled for it, and faults `told` before are not repeated."""
        self._book = book
        job: Job = self._jobs.start(
            "Simulating",
            partial(with_faults, self._simulate, book, told),
            on_done=lambda made: self._ended(job, partial(self._done, book, made)),
            on_failed=lambda error: self._ended(job, partial(self._failed, error)),
            on_cancelled=lambda: self._ended(job),
            exclusive_key=f"simulation of {id(self)}",
        )
        self._job = job
        self._on_changed()
        return job

    def cancel(self) -> None:
        """Stop the run under way; the former result stays."""
        if self._job is not None:
            self._jobs.cancel(self._job)

    def stop(self) -> None:
        """Cancel what runs, and hear no more of it."""
        self.cancel()
        self._job = None

    def forget(self) -> None:
        """Cancel what runs and drop what there is."""
        self.stop()
        self.result = self.of = self._book = None
        self.faults = ()
        self.is_stale = False

    def _ended(self, job: Job, act: Callable[[], Any] | None = None) -> None:
        if job is not self._job:
            return
        self._job = None
        if act is not None:
            act()
        self._on_changed()

    def _done(self, book: Book, made: tuple[Simulation, tuple[Fault, ...]]) -> None:
        (self.result, self.faults), self.of = made, book
        self.is_stale = self._book is not None and is_outdated(book, self._book, self._names)

    def _failed(self, error: BaseException) -> None:
        self._on_failed(f"The simulation came to nothing: {reason(error)}")
