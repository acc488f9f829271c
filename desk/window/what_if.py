"""A shock tried out while the hand moves: priced once in the background, then a frame a turn of the loop."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import partial

from PySide6.QtCore import QObject, QTimer, Signal

from desk.book import Book, Move, MoveKind, Shock
from desk.valuation.shock_base import shock_base
from desk.valuation.shock_effects import CannotShock
from desk.valuation.what_if import Frame, WhatIf
from desk.window.jobs import Job, Jobs
from desk.window.valued import CANCELLED, is_outdated, reason

__all__ = ["MOST_MS", "WHAT_IF", "LiveWhatIf"]

WHAT_IF = "What-if"
"""Name of the shock that is tried out."""
MOST_MS = 16.0
"""A frame that takes longer is left to a thread."""

_PROBE = Shock(WHAT_IF, (Move(MoveKind.PARALLEL, 1.0), Move(MoveKind.SPREAD, 1.0)))


@dataclass(frozen=True, eq=False)
class _Engine:
    """A book ready to be moved, and how long a frame of it takes [ms]."""

    book: Book
    what_if: WhatIf
    frame_ms: float
    before: Frame


class LiveWhatIf(QObject):
    """The what-if of a document. It never changes the book.

    Attributes
    ----------
    shock : Shock or None
        What is tried out; None while nothing is.
    frame : Frame or None
        Both sides after it, or after a former one for a turn of the event loop; None while nothing is tried
        out, or while the book is made ready.
    failure : str
        Why there is no frame, or the frame is a former one; empty where there is nothing to say.
    frames, worst_ms : int, float
        How many were made on the window's thread since the book was made ready, and the longest [ms].

    Signals
    -------
    changed
        Any of these, or whether the book is ready.
    """

    changed = Signal()

    def __init__(self, jobs: Jobs, names: frozenset[str], parent: QObject | None = None) -> None:
        """Start without a book; `names` are the parts of a book that frames follow from."""
        super().__init__(parent)
        self._jobs = jobs
        self._names = names
        self._engine: _Engine | None = None
        self._preparing: Job | None = None
        self._preparing_book: Book | None = None
        self._framing: Job | None = None
        self._book: Book | None = None
        self._is_due = False
        self.shock: Shock | None = None
        self.frame: Frame | None = None
        self.failure = ""
        self.frames = 0
        self.worst_ms = 0.0
        # One frame for all moves of one turn of the event loop.
        self._soon = QTimer(self, singleShot=True, interval=0)
        self._soon.timeout.connect(self._draw)

    # State

    @property
    def is_on(self) -> bool:
        """Whether something is tried out."""
        return self.shock is not None

    @property
    def is_ready(self) -> bool:
        """Whether the book is ready to be moved."""
        return self._engine is not None

    @property
    def is_preparing(self) -> bool:
        """Whether the book is being made ready."""
        return self._preparing is not None

    @property
    def engine(self) -> WhatIf | None:
        """The book, ready to be moved."""
        return None if self._engine is None else self._engine.what_if

    @property
    def before(self) -> Frame | None:
        """The book before anything is tried out; None while it is not ready."""
        return None if self._engine is None else self._engine.before

    @property
    def is_threaded(self) -> bool:
        """Whether frames of this book take too long for the window's thread."""
        return self._engine is not None and self._engine.frame_ms > MOST_MS

    # What the document says

    def forget(self) -> None:
        """Drop everything: another book is opened."""
        self.stop()
        self._engine = self._book = self.frame = self.shock = None
        self.failure = ""
        self.changed.emit()

    def stop(self) -> None:
        """Cancel what runs, and begin nothing more."""
        self._soon.stop()
        self._is_due = False
        for job in (self._preparing, self._framing):
            if job is not None:
                self._jobs.cancel(job)
        self._preparing = self._preparing_book = self._framing = None

    def follow(self, book: Book) -> None:
        """The book was edited: what is tried out is tried on it as it stands now."""
        self._book = book
        of = self._preparing_book if self._preparing is not None else None
        if self._engine is not None and is_outdated(self._engine.book, book, self._names):
            self._engine = None
            self.frame = None
        if self._engine is None:
            # What stood in the way of the former book need not stand in the way of this one.
            self.failure = ""
        if self._engine is None and (self.is_on or (of is not None and is_outdated(of, book, self._names))):
            self._prepare(book)
        self.changed.emit()

    def want(self, book: Book) -> None:
        """Make the book ready, where it is not."""
        self._book = book
        if self._engine is None and self._preparing is None and not self.failure:
            self._prepare(book)

    # What the hand does

    def move(self, shock: Shock) -> None:
        """Try out another shock; one without moves puts it back."""
        if not shock.moves:
            self.put_back()
            return
        self.shock = shock
        if self._engine is None:
            self.failure = ""
            if self._book is not None and self._preparing is None:
                self._prepare(self._book)
            self.changed.emit()
        else:
            self._soon.start()

    def put_back(self) -> None:
        """Try out nothing any more."""
        self._soon.stop()
        self._is_due = False
        if self.shock is not None or self.frame is not None or self.failure:
            self.shock = self.frame = None
            self.failure = ""
            self.changed.emit()

    def show_now(self) -> None:
        """Make the frame of the last move at once."""
        if self._soon.isActive():
            self._soon.stop()
            self._draw()

    # Making it ready

    def _prepare(self, book: Book) -> None:
        self.failure = ""
        self._preparing_book = book
        job = self._jobs.start(
            "Making the what-if ready",
            partial(_made_ready, book),
            on_done=partial(self._ready, book),
            on_failed=partial(self._not_ready, book),
            on_cancelled=lambda: self._preparing_stopped(job),
            exclusive_key=f"what-if of {id(self)}",
        )
        self._preparing = job

    def _ready(self, book: Book, engine: _Engine) -> None:
        if book is not self._preparing_book:
            return
        self._preparing = self._preparing_book = None
        if self._book is not None and is_outdated(book, self._book, self._names):
            self._prepare(self._book)
            return
        self._engine = engine
        self.frames, self.worst_ms = 0, 0.0
        if self.is_on:
            self._draw()
        else:
            self.changed.emit()

    def _not_ready(self, book: Book, error: BaseException) -> None:
        if book is not self._preparing_book:
            return
        self._preparing = self._preparing_book = None
        self.failure = reason(error)
        self.changed.emit()

    def _preparing_stopped(self, job: Job) -> None:
        """The reader cancelled it; the next move of the hand makes it ready."""
        if job is not self._preparing:
            return
        self._preparing = self._preparing_book = None
        self.failure = CANCELLED
        self.changed.emit()

    # Frames

    def _draw(self) -> None:
        engine, shock = self._engine, self.shock
        if engine is None or shock is None:
            return
        if self.is_threaded:
            self._draw_in_thread(engine, shock)
            return
        start = time.perf_counter()
        try:
            frame = engine.what_if.frame(shock)
        except (CannotShock, ValueError) as error:
            self.failure = reason(error)
        else:
            self.frame, self.failure = frame, ""
        took = 1e3 * (time.perf_counter() - start)
        self.frames += 1
        self.worst_ms = max(self.worst_ms, took)
        if took > MOST_MS and self.frames > 1:
            # The machine is busier than when it was measured: leave the window awake from now on.
            self._engine = replace(engine, frame_ms=0.5 * (engine.frame_ms + took))
        self.changed.emit()

    def _draw_in_thread(self, engine: _Engine, shock: Shock) -> None:
        """The latest wins: while one is made, only the last of those asked for waits."""
        if self._framing is not None:
            self._is_due = True
            return
        self._is_due = False
        job = self._jobs.start(
            "Following the what-if",
            partial(_framed, engine.what_if, shock),
            on_done=lambda frame: self._framed(job, engine, frame),
            on_failed=lambda error: self._not_framed(job, reason(error)),
            on_cancelled=lambda: self._not_framed(job, CANCELLED),
        )
        self._framing = job

    def _framed(self, job: Job, engine: _Engine, frame: Frame) -> None:
        if job is not self._framing:
            return
        self._framing = None
        if self.is_on and engine is self._engine:
            self.frame, self.failure = frame, ""
            self.changed.emit()
        if self._is_due and self.is_on:
            self._draw()

    def _not_framed(self, job: Job, why: str) -> None:
        if job is not self._framing:
            return
        self._framing = None
        if self.is_on and not self._is_due:
            self.failure = why
            self.changed.emit()
        if self._is_due and self.is_on:
            self._draw()


def _made_ready(book: Book, *, progress: Callable[[float], None], cancel: threading.Event) -> _Engine:
    """A book ready to be moved, in a thread."""
    del cancel
    progress(0.0)
    base = shock_base(book)
    progress(0.7)
    what_if = WhatIf(base)
    progress(0.9)
    # One that moves spreads too takes longest; the first of all takes longer than those that follow.
    took = []
    for _ in range(3):
        start = time.perf_counter()
        try:
            what_if.frame(_PROBE)
        except CannotShock:
            what_if.frame(Shock(WHAT_IF, _PROBE.moves[:1]))
        took.append(1e3 * (time.perf_counter() - start))
    return _Engine(book, what_if, min(took), what_if.frame(Shock(WHAT_IF, ())))


def _framed(
    what_if: WhatIf, shock: Shock, *, progress: Callable[[float], None], cancel: threading.Event
) -> Frame:
    del cancel
    progress(0.0)
    return what_if.frame(shock)
