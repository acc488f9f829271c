"""The tasks: progress is passed on, and a set token stops the work from inside."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest

from desk import tasks
from desk.book import Book
from desk.places import demo_books
from tests.report import examples

SOURCE = demo_books() / "small_endowment.xlsx"


def small() -> Book:
    """A book that is quick to simulate."""
    return examples.book()


def test_read_value_simulate_report(tmp_path: Path) -> None:
    """The whole job on a file, each step with progress from 0 to 1 that never goes back."""
    parts: dict[str, list[float]] = {"read": [], "value": [], "simulate": [], "report": []}
    reading = tasks.read(SOURCE, progress=parts["read"].append)
    assert reading.book is not None
    assert not reading.grave
    book = replace(reading.book, run=small().run)
    standing = tasks.value(book, progress=parts["value"].append)
    simulation = tasks.simulate(book, progress=parts["simulate"].append)
    target = tmp_path / "report.xlsx"
    written = tasks.report(
        replace(reading, book=book), target, standing=standing, simulation=simulation,
        progress=parts["report"].append,
    )  # fmt: skip
    assert written == target
    assert target.stat().st_size > 10_000
    for seen in parts.values():
        assert seen == sorted(seen)
        assert (seen[0], seen[-1]) == (0.0, 1.0)


def test_report_computes_what_is_missing(tmp_path: Path) -> None:
    """Without a standing or a run it makes them; without a model there is no run."""
    seen: list[float] = []
    path = tasks.report(examples.reading(), tmp_path / "a.xlsx", progress=seen.append)
    assert path.exists()
    assert seen == sorted(seen)
    bare = examples.reading(replace(small(), rates_model=None))
    assert tasks.report(bare, tmp_path / "b.xlsx").stat().st_size < path.stat().st_size


def test_report_refuses_a_reading_without_a_book(tmp_path: Path) -> None:
    """There is nothing to report then."""
    with pytest.raises(ValueError, match="must have a book"):
        tasks.report(replace(examples.reading(), book=None), tmp_path / "a.xlsx")
    assert not list(tmp_path.iterdir())


Work = Callable[[tasks.Progress | None, tasks.CancelToken], object]


def works(tmp_path: Path) -> dict[str, Work]:
    """Every task that can be stopped."""
    return {
        "read": lambda progress, cancel: tasks.read(SOURCE, progress=progress, cancel=cancel),
        "value": lambda progress, cancel: tasks.value(small(), progress=progress, cancel=cancel),
        "simulate": lambda progress, cancel: tasks.simulate(small(), progress=progress, cancel=cancel),
        "report": lambda progress, cancel: tasks.report(
            examples.reading(), tmp_path / "report.xlsx", progress=progress, cancel=cancel
        ),
    }


@pytest.mark.parametrize("name", ["read", "value", "simulate", "report"])
def test_a_set_token_stops_the_task_at_once(name: str, tmp_path: Path) -> None:
    """Before anything is done."""
    token = tasks.CancelToken()
    token.set()
    with pytest.raises(tasks.Cancelled):
        works(tmp_path)[name](None, token)
    assert not list(tmp_path.iterdir())


@pytest.mark.parametrize("name", ["read", "value", "simulate", "report"])
def test_a_token_set_on_the_way_stops_the_task(name: str, tmp_path: Path) -> None:
    """From inside the callback, at the next step."""
    token = tasks.CancelToken()

    def stop_soon(part: float) -> None:
        if part > 0.0:
            token.set()

    with pytest.raises(tasks.Cancelled):
        works(tmp_path)[name](stop_soon, token)
    assert not list(tmp_path.iterdir())


def test_a_saved_copy_reads_in_again_the_same(tmp_path: Path) -> None:
    """The digest of the contents does not change."""
    book = tasks.read(SOURCE).book
    assert book is not None
    path = tasks.save_copy(book, tmp_path / "copy.xlsx")
    again = tasks.read(path).book
    assert again is not None
    assert again.digest == book.digest
