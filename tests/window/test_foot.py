"""The foot: what runs, how long it will take, and that it can be cancelled."""

from __future__ import annotations

import threading
from collections.abc import Callable, Iterator

import pytest
from pytestqt.qtbot import QtBot

from desk.report.wording import CAUTION
from desk.tasks import Cancelled
from desk.window.foot import Foot, time_left
from desk.window.jobs import Jobs
from desk.window.parts.theme import ThemeSwitch


@pytest.fixture
def foot(qtbot: QtBot, theme_switch: ThemeSwitch) -> Iterator[tuple[Foot, Jobs]]:
    jobs = Jobs(workers=2)
    made = Foot(jobs, theme_switch)
    qtbot.addWidget(made)
    made.show()
    yield made, jobs
    jobs.shutdown()


def _held(*, progress: Callable[[float], None], cancel: threading.Event) -> None:
    progress(0.25)
    while not cancel.wait(0.005):
        progress(0.25)
    raise Cancelled


@pytest.mark.parametrize(
    ("seconds", "text"),
    [
        (None, ""),
        (0.4, "a moment left"),
        (12.4, "about 12 s left"),
        (300.0, "about 5 min left"),
        (9000.0, "about 2.5 h left"),
    ],
)
def test_remaining_time_in_words(seconds: float | None, text: str) -> None:
    assert time_left(seconds) == text


def test_the_caution_stands_there_while_nothing_runs(foot: tuple[Foot, Jobs]) -> None:
    assert foot[0].text == CAUTION


def test_a_job_is_shown_with_its_progress_and_can_be_cancelled(foot: tuple[Foot, Jobs], qtbot: QtBot) -> None:
    shown, jobs = foot
    job = jobs.start("Simulating", _held)
    qtbot.waitUntil(lambda: shown.is_running and "25 %" in shown.text)
    assert shown.text.startswith("Simulating 25 %")
    assert shown.cancel_button.accessibleName() == "Cancel: Simulating"
    shown.cancel_button.click()
    qtbot.waitUntil(lambda: not job.is_running)
    assert not shown.is_running
    assert shown.text == CAUTION


def test_a_second_job_is_counted(foot: tuple[Foot, Jobs], qtbot: QtBot) -> None:
    shown, jobs = foot
    jobs.start("Simulating", _held)
    jobs.start("Writing", _held)
    qtbot.waitUntil(lambda: shown.text.startswith("Simulating and 1 more"))
    jobs.cancel_all()
    qtbot.waitUntil(lambda: not jobs.running)


def test_what_is_over_at_once_does_not_flicker(foot: tuple[Foot, Jobs], qtbot: QtBot) -> None:
    shown, jobs = foot
    seen: list[bool] = []
    jobs.ended.connect(lambda _: seen.append(shown.is_running))
    with qtbot.waitSignal(jobs.ended):
        jobs.start("Valuing", lambda *, progress, cancel: progress(1.0))
    assert seen == [False]


def test_a_message_gives_way_to_the_caution(foot: tuple[Foot, Jobs], qtbot: QtBot) -> None:
    shown, _ = foot
    shown._back.setInterval(20)
    shown.tell("Copied 3 rows.")
    assert shown.text == "Copied 3 rows."
    qtbot.waitUntil(lambda: shown.text == CAUTION)
