"""Background work: started by the window, run by threads, heard of on the window's thread only."""

from __future__ import annotations

import logging
import os
import threading
import time
from collections.abc import Callable
from concurrent.futures import Future, ThreadPoolExecutor
from enum import StrEnum
from itertools import count
from queue import Empty, SimpleQueue
from typing import Any

from PySide6.QtCore import QObject, Qt, Signal, Slot

from desk.tasks import Cancelled

__all__ = ["Job", "JobState", "Jobs"]

_log = logging.getLogger(__name__)

_LEAST_SECONDS_BETWEEN_NEWS = 0.1
_LEAST_SECONDS_BEFORE_ESTIMATE = 0.5
_LEAST_PART_BEFORE_ESTIMATE = 0.02


class JobState(StrEnum):
    """Where a job is; it ends in exactly one of the last three."""

    RUNNING = "running"
    DONE = "done"
    FAILED = "failed"
    CANCELLED = "cancelled"


class Job:
    """One piece of work.

    Attributes
    ----------
    number : int
        Rises from job to job.
    title : str
        What runs, in words.
    state : JobState
    progress : float
        Part done, from 0 to 1.
    error : BaseException or None
        Why it failed.
    exclusive_key : str or None
    """

    def __init__(self, number: int, title: str, exclusive_key: str | None) -> None:
        self.number = number
        self.title = title
        self.exclusive_key = exclusive_key
        self.state = JobState.RUNNING
        self.progress = 0.0
        self.error: BaseException | None = None
        self._token = threading.Event()
        self._started = time.monotonic()
        self._future: Future[None] | None = None
        self._on_done: Callable[[Any], None] | None = None
        self._on_failed: Callable[[BaseException], None] | None = None
        self._on_cancelled: Callable[[], None] | None = None

    @property
    def is_running(self) -> bool:
        """Whether it has not ended yet."""
        return self.state is JobState.RUNNING

    @property
    def is_stopping(self) -> bool:
        """Whether it was asked to stop and has not ended yet."""
        return self.is_running and self._token.is_set()

    @property
    def elapsed_seconds(self) -> float:
        """Since it was started."""
        return time.monotonic() - self._started

    @property
    def remaining_seconds(self) -> float | None:
        """Estimate from the part done so far; None while there is too little to go by."""
        elapsed = self.elapsed_seconds
        if elapsed < _LEAST_SECONDS_BEFORE_ESTIMATE or self.progress < _LEAST_PART_BEFORE_ESTIMATE:
            return None
        return elapsed * (1 - self.progress) / self.progress

    def cancel(self) -> None:
        """Ask it to stop at its next step; its result, should it come all the same, is dropped."""
        if self.is_running:
            self._token.set()


class Jobs(QObject):
    """Runs functions in threads and reports on the thread that owns this object.

    Signals
    -------
    started(Job)
    progressed(Job)
        At most about ten times a second for a job.
    ended(Job)
        After the job's own callback.
    """

    started = Signal(object)
    progressed = Signal(object)
    ended = Signal(object)
    _news = Signal()

    def __init__(self, parent: QObject | None = None, *, workers: int | None = None) -> None:
        super().__init__(parent)
        # Two at least: a valuation must not wait behind a simulation.
        self._pool = ThreadPoolExecutor(
            max_workers=workers or max(2, (os.cpu_count() or 2) - 1), thread_name_prefix="gapwright"
        )
        self._numbers = count(1)
        self._running: dict[int, Job] = {}
        self._queue: SimpleQueue[tuple[Job, JobState, Any]] = SimpleQueue()
        self._is_shut = False
        self._news.connect(self._deliver, Qt.ConnectionType.QueuedConnection)

    @property
    def running(self) -> tuple[Job, ...]:
        """The jobs that have not ended, oldest first."""
        return tuple(self._running.values())

    def start(
        self,
        title: str,
        function: Callable[..., Any],
        *,
        on_done: Callable[[Any], None] | None = None,
        on_failed: Callable[[BaseException], None] | None = None,
        on_cancelled: Callable[[], None] | None = None,
        exclusive_key: str | None = None,
    ) -> Job:
        """Run ``function(progress=..., cancel=...)`` in a thread.

        Parameters
        ----------
        title : str
            What runs, in words for the reader.
        function : callable
            Takes a `progress` callback (part done, 0 to 1) and a `cancel` token; bind the rest beforehand.
        on_done, on_failed, on_cancelled : callable, optional
            Exactly one of them is called, on this object's thread, with the result, the exception or nothing.
        exclusive_key : str, optional
            Jobs that share one replace each other: those still running are cancelled.

        Raises
        ------
        RuntimeError
            After `shutdown`.
        """
        if self._is_shut:
            raise RuntimeError("no job can be started after the shutdown")
        if exclusive_key is not None:
            for other in self.running:
                if other.exclusive_key == exclusive_key:
                    self.cancel(other)
        job = Job(next(self._numbers), title, exclusive_key)
        job._on_done, job._on_failed, job._on_cancelled = on_done, on_failed, on_cancelled
        self._running[job.number] = job
        self.started.emit(job)
        job._future = self._pool.submit(self._work, job, function)
        return job

    def cancel(self, job: Job) -> None:
        """Ask `job` to stop; one that waits for a thread ends at once."""
        if not job.is_running:
            return
        job.cancel()
        if job._future is not None and job._future.cancel():
            self._post(job, JobState.CANCELLED, None)
        self.progressed.emit(job)

    def cancel_all(self) -> None:
        """Ask every job to stop."""
        for job in self.running:
            self.cancel(job)

    def shutdown(self) -> None:
        """Cancel everything, wait for the threads to stop, and end the jobs."""
        self._is_shut = True
        self.cancel_all()
        self._pool.shutdown(wait=True, cancel_futures=True)
        self._deliver()

    def _work(self, job: Job, function: Callable[..., Any]) -> None:
        """Run in a thread of the pool."""
        last = time.monotonic()

        def progress(part: float) -> None:
            nonlocal last
            if job._token.is_set():
                raise Cancelled
            now = time.monotonic()
            if now - last >= _LEAST_SECONDS_BETWEEN_NEWS:
                last = now
                self._post(job, JobState.RUNNING, part)

        try:
            if job._token.is_set():
                raise Cancelled
            result = function(progress=progress, cancel=job._token)
        except Cancelled:
            self._post(job, JobState.CANCELLED, None)
        except BaseException as error:
            self._post(job, JobState.FAILED, error)
        else:
            self._post(job, JobState.DONE, result)

    def _post(self, job: Job, state: JobState, value: Any) -> None:
        self._queue.put((job, state, value))
        self._news.emit()

    @Slot()
    def _deliver(self) -> None:
        """Hand over what the threads have left, on this object's thread."""
        while True:
            try:
                job, state, value = self._queue.get_nowait()
            except Empty:
                return
            if not job.is_running:
                continue
            if state is JobState.RUNNING:
                job.progress = min(1.0, max(job.progress, float(value)))
                self.progressed.emit(job)
            else:
                self._end(job, state, value)

    def _end(self, job: Job, state: JobState, value: Any) -> None:
        if job._token.is_set():
            # Whoever cancelled it reckons with nothing coming back, whatever it managed to finish.
            state = JobState.CANCELLED
        job.state = state
        self._running.pop(job.number, None)
        try:
            if state is JobState.DONE:
                job.progress = 1.0
                if job._on_done is not None:
                    job._on_done(value)
            elif state is JobState.FAILED:
                job.error = value
                # Faults of the data are told in the window: they are no failure of the program.
                if not getattr(value, "faults", ()):
                    _log.error("%s failed", job.title, exc_info=value)
                if job._on_failed is not None:
                    job._on_failed(value)
            elif job._on_cancelled is not None:
                job._on_cancelled()
        finally:
            job._on_done = job._on_failed = job._on_cancelled = None
            self.ended.emit(job)
