"""Background work ends once, on the window's thread."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable, Iterator
from typing import Any

import pytest
from PySide6.QtCore import QObject
from pytestqt.qtbot import QtBot

from desk.book import Fault
from desk.scenarios.calibration_records import CalibrationError
from desk.tasks import Cancelled
from desk.window.jobs import Job, Jobs, JobState


class Held:
    """Work that waits until it is let go, and says when it has begun."""

    def __init__(self, result: object = "result", *, listens: bool = True) -> None:
        self.begun = threading.Event()
        self.let_go = threading.Event()
        self.result = result
        self.listens = listens

    def __call__(self, *, progress: Callable[[float], None], cancel: threading.Event) -> object:
        self.begun.set()
        while not self.let_go.wait(0.005):
            if self.listens and cancel.is_set():
                raise Cancelled
        return self.result


class Heard:
    """Everything a job said, and on which thread."""

    def __init__(self, jobs: Jobs) -> None:
        self.said: list[tuple[str, object]] = []
        self.ends: list[JobState] = []
        self.threads: set[int] = set()
        jobs.ended.connect(self._ended)

    def _ended(self, job: Job) -> None:
        self.threads.add(threading.get_ident())
        self.ends.append(job.state)

    def _note(self, name: str, value: object) -> None:
        self.threads.add(threading.get_ident())
        self.said.append((name, value))

    @property
    def callbacks(self) -> dict[str, Any]:
        return {
            "on_done": lambda value: self._note("done", value),
            "on_failed": lambda error: self._note("failed", error),
            "on_cancelled": lambda: self._note("cancelled", None),
        }


@pytest.fixture
def jobs(qtbot: QtBot) -> Iterator[Jobs]:
    jobs = Jobs(workers=2)
    yield jobs
    jobs.shutdown()
    assert not [thread for thread in threading.enumerate() if thread.name.startswith("gapwright")]


def test_a_result_arrives_on_the_windows_thread(qtbot: QtBot, jobs: Jobs) -> None:
    heard = Heard(jobs)
    worker: list[int] = []

    def work(*, progress: Callable[[float], None], cancel: threading.Event) -> int:
        worker.append(threading.get_ident())
        return 42

    with qtbot.waitSignal(jobs.ended):
        job = jobs.start("Working", work, **heard.callbacks)
        assert list(jobs.running) == [job]
    assert heard.said == [("done", 42)]
    assert heard.ends == [JobState.DONE]
    assert heard.threads == {threading.get_ident()}
    assert worker != [threading.get_ident()]
    assert list(jobs.running) == []
    assert job.progress == 1


def test_a_failure_says_why(qtbot: QtBot, jobs: Jobs, caplog: pytest.LogCaptureFixture) -> None:
    heard = Heard(jobs)

    def work(*, progress: Callable[[float], None], cancel: threading.Event) -> None:
        raise ValueError("no curve")

    with qtbot.waitSignal(jobs.ended):
        job = jobs.start("Working", work, **heard.callbacks)
    assert [name for name, _ in heard.said] == ["failed"]
    assert str(job.error) == "no curve"
    assert job.state is JobState.FAILED
    assert "Working failed" in caplog.text


def test_cancelling_stops_the_work(qtbot: QtBot, jobs: Jobs) -> None:
    heard, held = Heard(jobs), Held()
    job = jobs.start("Working", held, **heard.callbacks)
    qtbot.waitUntil(held.begun.is_set)
    with qtbot.waitSignal(jobs.ended):
        jobs.cancel(job)
        assert job.is_stopping
    assert heard.said == [("cancelled", None)]
    assert heard.ends == [JobState.CANCELLED]


def test_a_result_that_comes_after_the_cancel_is_dropped(qtbot: QtBot, jobs: Jobs) -> None:
    heard, held = Heard(jobs), Held(listens=False)
    job = jobs.start("Working", held, **heard.callbacks)
    qtbot.waitUntil(held.begun.is_set)
    jobs.cancel(job)
    with qtbot.waitSignal(jobs.ended):
        held.let_go.set()
    assert heard.said == [("cancelled", None)]
    jobs.cancel(job)
    assert heard.ends == [JobState.CANCELLED]


def test_the_callback_stops_work_that_never_looks_at_its_token(qtbot: QtBot, jobs: Jobs) -> None:
    heard, begun = Heard(jobs), threading.Event()

    def work(*, progress: Callable[[float], None], cancel: threading.Event) -> None:
        while True:
            begun.set()
            time.sleep(0.001)
            progress(0.5)

    job = jobs.start("Working", work, **heard.callbacks)
    qtbot.waitUntil(begun.is_set)
    with qtbot.waitSignal(jobs.ended):
        jobs.cancel(job)
    assert heard.ends == [JobState.CANCELLED]


def test_work_that_waits_for_a_thread_is_cancelled_at_once(qtbot: QtBot, jobs: Jobs) -> None:
    held = [Held(), Held()]
    for one in held:
        jobs.start("Holding", one)
    qtbot.waitUntil(lambda: all(one.begun.is_set() for one in held))
    heard, waiting = Heard(jobs), Held()
    job = jobs.start("Waiting", waiting, **heard.callbacks)
    with qtbot.waitSignal(jobs.ended):
        jobs.cancel(job)
    assert heard.said == [("cancelled", None)]
    assert not waiting.begun.is_set()


def test_the_latest_of_a_key_wins(qtbot: QtBot, jobs: Jobs) -> None:
    heard, first = Heard(jobs), Held("first", listens=False)
    jobs.start("First", first, exclusive_key="value", **heard.callbacks)
    qtbot.waitUntil(first.begun.is_set)
    second = Held("second")
    second.let_go.set()
    with qtbot.waitSignals([jobs.ended, jobs.ended]):
        jobs.start("Second", second, exclusive_key="value", **heard.callbacks)
        first.let_go.set()
    assert sorted(heard.said, key=str) == [("cancelled", None), ("done", "second")]


def test_progress_is_throttled_and_never_falls(qtbot: QtBot, jobs: Jobs) -> None:
    seen: list[float] = []
    jobs.progressed.connect(lambda job: seen.append(job.progress))

    def work(*, progress: Callable[[float], None], cancel: threading.Event) -> None:
        end = time.monotonic() + 0.35
        while time.monotonic() < end:
            progress(0.5)
            progress(0.4)

    with qtbot.waitSignal(jobs.ended):
        jobs.start("Working", work)
    assert 1 <= len(seen) <= 4
    assert seen == sorted(seen)


def test_the_time_left_follows_from_the_part_done() -> None:
    job = Job(1, "Working", None)
    assert job.remaining_seconds is None
    job._started -= 30
    assert job.remaining_seconds is None
    job.progress = 0.75
    assert job.remaining_seconds == pytest.approx(10, abs=0.1)


def test_shutdown_ends_every_job_and_refuses_more(qtbot: QtBot) -> None:
    jobs = Jobs(workers=1)
    heard = Heard(jobs)
    for _ in range(5):
        jobs.start("Holding", Held(), **heard.callbacks)
    jobs.shutdown()
    assert heard.said == [("cancelled", None)] * 5
    assert heard.ends == [JobState.CANCELLED] * 5
    with pytest.raises(RuntimeError, match="after the shutdown"):
        jobs.start("Late", Held())


def test_many_jobs_each_end_once(qtbot: QtBot, jobs: Jobs) -> None:
    results: list[int] = []

    def work(value: int) -> Callable[..., int]:
        return lambda *, progress, cancel: value

    for value in range(300):
        jobs.start("Working", work(value), on_done=results.append)
    qtbot.waitUntil(lambda: len(results) == 300)
    assert sorted(results) == list(range(300))


def test_jobs_can_have_a_parent(qtbot: QtBot) -> None:
    owner = QObject()
    jobs = Jobs(owner)
    assert jobs.parent() is owner
    jobs.shutdown()


def test_what_is_wrong_with_the_data_is_no_failure_of_the_program(
    qtbot: QtBot, jobs: Jobs, caplog: pytest.LogCaptureFixture
) -> None:
    """It is told in the window, and not as a traceback beside it."""
    fault = Fault("the history is too short", "more dates", "Add rows.", "History")

    def work(**_: object) -> None:
        raise CalibrationError((fault,))

    said: list[BaseException] = []
    job = jobs.start("Fitting", work, on_failed=said.append)
    qtbot.waitUntil(lambda: bool(said))
    assert job.state is JobState.FAILED
    assert isinstance(said[0], CalibrationError)
    assert caplog.text == ""
