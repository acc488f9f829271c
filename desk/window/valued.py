"""What follows from a book: the job that makes it, what it could not do, and whether it is stale."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import fields
from functools import partial
from typing import Any, Generic, Protocol, TypeVar

from desk.book import Book, Fault
from desk.report.said_once import further_faults
from desk.window.jobs import Job, Jobs

__all__ = ["CANCELLED", "Valued", "changed_fields", "is_outdated", "reason", "with_faults"]

CANCELLED = "It was cancelled."
"""Why there is no result, where the reader stopped the job."""


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


def is_outdated(of: Book | None, book: Book, names: frozenset[str]) -> bool:
    """Whether what was made of one book, if any, is not that of another: one of these parts differs."""
    return of is not None and bool(changed_fields(of, book) & names)


def with_faults(
    task: Callable[..., Any], book: Book, told: tuple[Fault, ...], **tools: Any
) -> tuple[Any, tuple[Fault, ...]]:
    """Run a task; its result, and what it could not do as asked that `told` does not say already."""
    result = task(book, **tools)
    return result, further_faults(told, result.faults) if result.faults else ()


def reason(error: BaseException) -> str:
    """Why, in the words of the error; its kind where it has none."""
    return str(error).strip() or type(error).__name__


class _HasFaults(Protocol):
    @property
    def faults(self) -> tuple[Fault, ...]: ...


Result = TypeVar("Result", bound=_HasFaults)


class Valued(Generic[Result]):
    """What is made of a book that changes: a standing, or a table of shocks.

    Attributes
    ----------
    result : Result or None
        Of the book, or of a former version of it while `is_stale`.
    faults : tuple of Fault
        What could not be done as asked, beside what was told before.
    failure : str
        Why nothing could be made of the book as it stands; empty where it could, or while it is under way.
    is_stale : bool
        Whether `result` is that of a former version.
    """

    def __init__(
        self,
        jobs: Jobs,
        *,
        title: str,
        value: Callable[[], Callable[..., Result]],
        names: frozenset[str],
        on_changed: Callable[[], None],
        on_failed: Callable[[str], None],
    ) -> None:
        """Start without a book.

        Parameters
        ----------
        jobs : Jobs
        title : str
            Of the job.
        value : callable
            Gives the task that makes the result of a book.
        names : frozenset of str
            Parts of a book that the result follows from.
        on_changed : callable
            Called when a result came, or failed to.
        on_failed : callable
            Called with the reason, after `on_changed`.
        """
        self._jobs = jobs
        self._title = title
        self._value = value
        self._names = names
        self._on_changed = on_changed
        self._on_failed = on_failed
        self._book: Book | None = None
        self._told: tuple[Fault, ...] = ()
        self._of: Book | None = None
        self._job: Job | None = None
        self._job_book: Book | None = None
        self.result: Result | None = None
        self.faults: tuple[Fault, ...] = ()
        self.failure = ""
        self.is_stale = False

    @property
    def is_running(self) -> bool:
        """Whether a job is under way."""
        return self._job is not None

    def stop(self) -> None:
        """Cancel what runs."""
        if self._job is not None:
            self._jobs.cancel(self._job)
        self._job = self._job_book = None

    def forget(self) -> None:
        """Cancel what runs and drop what there is."""
        self.stop()
        self.result = self._book = self._of = None
        self.faults = ()
        self.failure = ""
        self.is_stale = False

    def follow(self, book: Book, told: tuple[Fault, ...]) -> None:
        """See to it that the result comes to be that of `book`; faults `told` before are not repeated."""
        self._book, self._told = book, told
        self.is_stale = is_outdated(self._of, book, self._names)
        if self.result is not None and not self.is_stale:
            self.stop()
            self.failure = ""
        elif self._job is None or is_outdated(self._job_book, book, self._names):
            self.restart()

    def note(self, book: Book) -> None:
        """See whether the result is still that of `book`, without making another."""
        self.is_stale = is_outdated(self._of, book, self._names)
        if self._job is not None and is_outdated(self._job_book, book, self._names):
            self.stop()

    def restart(self) -> None:
        """Make it once more."""
        book = self._book
        if book is None:
            return
        self.failure = ""
        self._job_book = book
        # The former job, if one runs, is cancelled by the key; its callbacks no longer know this book.
        job = self._jobs.start(
            self._title,
            partial(with_faults, self._value(), book, self._told),
            on_done=partial(self._done, book),
            on_failed=partial(self._failed, book),
            on_cancelled=lambda: self._cancelled(job),
            exclusive_key=f"{self._title} of {id(self)}",
        )
        self._job = job

    def _done(self, book: Book, result: tuple[Result, tuple[Fault, ...]]) -> None:
        if book is not self._job_book or self._book is None:
            return
        self._job = self._job_book = None
        (self.result, self.faults), self._of = result, book
        self.is_stale = is_outdated(book, self._book, self._names)
        self._on_changed()

    def _failed(self, book: Book, error: BaseException) -> None:
        if book is not self._job_book:
            return
        self._job = self._job_book = None
        self.failure = reason(error)
        self._on_changed()
        self._on_failed(self.failure)

    def _cancelled(self, job: Job) -> None:
        """The reader stopped it; one that was replaced or is no longer wanted is not the running one."""
        if job is not self._job:
            return
        self._job = self._job_book = None
        self.failure = CANCELLED
        self._on_changed()
