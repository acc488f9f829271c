"""The open book: history, and what is stale."""

from __future__ import annotations

import threading
from collections.abc import Callable, Iterator
from dataclasses import replace
from datetime import date
from pathlib import Path
from typing import Any, cast

import numpy as np
import pytest
from PySide6.QtCore import SignalInstance
from pytestqt.qtbot import QtBot

from desk.book import Basis, Book, Fault, FlowTable, LineTerms, ModelName, RatesModel, Run, Side
from desk.intake.records import Reading
from desk.scenarios.records import Simulation
from desk.tasks import Cancelled
from desk.valuation.records import Standing
from desk.window.document import Document, changed_fields
from desk.window.jobs import Jobs


def a_book(spread: float = 0.0) -> Book:
    terms, rates = np.array([1.0, 10.0]), np.array([0.02, 0.03])
    basis = Basis(date(2031, 3, 31), "EUR", terms, rates, liability_spread=spread)
    return Book(basis=basis, liabilities=FlowTable.empty())


def a_reading(book: Book | None, name: str = "fund.xlsx") -> Reading:
    faults = () if book else (Fault("nothing", "a sheet", "Add it."),)
    return Reading(path=Path(name), sha256="", book=book, faults=faults, sheets=())


class Answer(tuple[str, float]):
    """What a worker answers; as a result of a task it has faults."""

    faults: tuple[Fault, ...] = ()


class Worker:
    """Stands in for a task: held until let go, answers with the spread of the book it was given."""

    def __init__(self) -> None:
        self.let_go = threading.Event()
        self.let_go.set()
        self.asked: list[Book] = []
        self.error: Exception | None = None

    def __call__(self, book: Book, *, progress: Callable[[float], None], cancel: threading.Event) -> Any:
        self.asked.append(book)
        while not self.let_go.wait(0.005):
            if cancel.is_set():
                raise Cancelled
        if self.error is not None:
            raise self.error
        return Answer(("of", book.basis.liability_spread))


class Bench:
    """A document with workers in the place of the tasks, and a list of what it said."""

    def __init__(self) -> None:
        self.jobs = Jobs(workers=2)
        self.value, self.simulate = Worker(), Worker()
        self.document = Document(
            self.jobs,
            value=cast(Callable[..., Standing], self.value),
            simulate=cast(Callable[..., Simulation], self.simulate),
        )
        self.said: list[str] = []
        for name in ("reading", "book", "standing", "simulation", "history"):
            signal: SignalInstance = getattr(self.document, f"{name}_changed")
            signal.connect(lambda name=name: self.said.append(name))
        self.modified: list[bool] = []
        self.document.modified_changed.connect(self.modified.append)
        self.failures: list[str] = []
        self.document.failed.connect(self.failures.append)

    @property
    def standing(self) -> Any:
        return self.document.standing

    @property
    def simulation(self) -> Any:
        return self.document.simulation


@pytest.fixture
def bench(qtbot: QtBot) -> Iterator[Bench]:
    bench = Bench()
    yield bench
    bench.jobs.shutdown()


@pytest.fixture
def opened(bench: Bench, qtbot: QtBot) -> Bench:
    bench.document.open_reading(a_reading(a_book()))
    qtbot.waitUntil(lambda: bench.standing == ("of", 0.0))
    bench.said.clear()
    return bench


def settled(bench: Bench, qtbot: QtBot) -> None:
    qtbot.waitUntil(lambda: not bench.document.is_valuing and not bench.jobs.running)


def test_an_opened_book_is_valued_at_once(bench: Bench, qtbot: QtBot) -> None:
    assert bench.document.book is None
    assert bench.document.current_reading is None
    bench.document.open_reading(a_reading(a_book(0.01)))
    assert bench.document.book == a_book(0.01)
    assert bench.document.is_valuing
    assert {"reading", "book", "standing", "simulation", "history"} <= set(bench.said)
    settled(bench, qtbot)
    assert bench.standing == ("of", 0.01)
    assert not bench.document.standing_is_stale
    assert not bench.document.is_modified
    assert bench.document.path == Path("fund.xlsx")


def test_a_reading_without_a_book_leaves_the_open_one(opened: Bench) -> None:
    before = opened.document.book
    bad = a_reading(None, "bad.xlsx")
    opened.document.open_reading(bad)
    assert opened.document.reading is bad
    assert opened.document.book is before
    assert opened.document.path == Path("fund.xlsx")
    assert opened.said == ["reading"]
    source = opened.document.current_reading
    assert source is not None
    assert source.path == Path("fund.xlsx")


def test_an_edit_marks_the_standing_stale_until_the_new_one_is_there(opened: Bench, qtbot: QtBot) -> None:
    opened.value.let_go.clear()
    opened.document.edit("Change of the spread", a_book(0.02))
    assert opened.document.standing_is_stale
    assert opened.standing == ("of", 0.0)
    assert opened.modified == [True]
    opened.value.let_go.set()
    settled(opened, qtbot)
    assert opened.standing == ("of", 0.02)
    assert not opened.document.standing_is_stale
    source = opened.document.current_reading
    assert source is not None
    assert source.book == a_book(0.02)


def test_the_latest_edit_wins(opened: Bench, qtbot: QtBot) -> None:
    opened.value.let_go.clear()
    for step in range(1, 30):
        opened.document.edit("Change of the spread", a_book(step / 1000))
    opened.value.let_go.set()
    settled(opened, qtbot)
    assert opened.standing == ("of", 0.029)
    assert not opened.document.standing_is_stale
    assert opened.failures == []


def test_undo_back_to_what_was_valued_makes_it_fresh_again(opened: Bench, qtbot: QtBot) -> None:
    opened.value.let_go.clear()
    asked = len(opened.value.asked)
    opened.document.edit("Change of the spread", a_book(0.02))
    opened.document.undo()
    assert not opened.document.standing_is_stale
    assert not opened.document.is_modified
    assert opened.modified == [True, False]
    settled(opened, qtbot)
    assert opened.standing == ("of", 0.0)
    assert len(opened.value.asked) <= asked + 1


def test_undo_and_redo_walk_the_history(opened: Bench) -> None:
    document = opened.document
    assert not document.can_undo
    document.edit("First", a_book(0.01))
    document.edit("Second", a_book(0.02))
    assert (document.undo_text, document.redo_text) == ("Second", "")
    document.undo()
    assert document.book == a_book(0.01)
    assert (document.undo_text, document.redo_text) == ("First", "Second")
    document.redo()
    assert document.book == a_book(0.02)
    document.redo()
    document.undo()
    document.undo()
    document.undo()
    assert document.book == a_book()
    document.edit("Third", a_book(0.03))
    assert not document.can_redo
    assert document.undo_text == "Third"


def test_an_edit_that_changes_nothing_is_none(opened: Bench) -> None:
    opened.document.edit("Nothing", a_book())
    assert not opened.document.can_undo
    assert opened.said == []


def test_edits_of_one_drag_are_one_step(opened: Bench) -> None:
    document = opened.document
    for step in range(1, 6):
        document.edit("Drag", a_book(step / 100), merge_key="drag 1")
    document.edit("Drag", a_book(0.5), merge_key="drag 2")
    document.edit("Another", a_book(0.6), merge_key="drag 2")
    document.edit("Plain", a_book(0.7))
    document.edit("Plain", a_book(0.8))
    walked = []
    while document.can_undo:
        document.undo()
        book = document.book
        assert book is not None
        walked.append(book.basis.liability_spread)
    assert walked == [0.7, 0.6, 0.5, 0.05, 0.0]


def test_a_drag_does_not_swallow_what_was_saved(opened: Bench) -> None:
    document = opened.document
    document.edit("Drag", a_book(0.01), merge_key=1)
    document.mark_saved(Path("copy.xlsx"))
    assert not document.is_modified
    assert document.path == Path("copy.xlsx")
    document.edit("Drag", a_book(0.02), merge_key=1)
    assert document.is_modified
    document.undo()
    assert document.book == a_book(0.01)
    assert not document.is_modified
    document.undo()
    assert document.is_modified


def test_the_history_is_bounded(opened: Bench) -> None:
    for step in range(1, 260):
        opened.document.edit("Step", a_book(step / 1e4))
    steps = 0
    while opened.document.can_undo:
        opened.document.undo()
        steps += 1
    assert steps == 200
    assert opened.document.is_modified


def test_a_failed_valuation_keeps_the_former_standing(opened: Bench, qtbot: QtBot) -> None:
    opened.value.error = ValueError("the rates give no curve")
    with qtbot.waitSignal(opened.document.failed):
        opened.document.edit("Change of the curve", a_book(0.02))
    assert opened.standing == ("of", 0.0)
    assert opened.document.standing_is_stale
    assert opened.document.standing_failure == "the rates give no curve"
    assert opened.failures == ["The book could not be valued: the rates give no curve"]
    opened.value.error = None
    opened.document.undo()
    assert not opened.document.standing_is_stale
    assert opened.document.standing_failure == ""


def test_a_valuation_the_reader_cancels_is_over_and_says_so(opened: Bench, qtbot: QtBot) -> None:
    former = opened.document.standing
    opened.value.let_go.clear()
    opened.document.edit("Change of the spread", a_book(0.02))
    job = next(job for job in opened.jobs.running if job.title == "Valuing the book")
    opened.jobs.cancel(job)
    settled(opened, qtbot)
    document = opened.document
    assert document.standing is former
    assert document.standing_is_stale
    assert not document.is_valuing
    assert "cancelled" in document.standing_failure
    opened.value.let_go.set()
    document.revalue()
    settled(opened, qtbot)
    assert opened.standing == ("of", 0.02)
    assert not document.standing_is_stale
    assert document.standing_failure == ""


def test_what_an_edit_makes_stale(opened: Bench, qtbot: QtBot) -> None:
    document = opened.document
    document.run_simulation()
    settled(opened, qtbot)
    assert opened.simulation == ("of", 0.0)
    asked = len(opened.value.asked)
    document.edit("Change of the run", replace(a_book(), run=Run(seed=2)))
    assert not document.standing_is_stale
    assert document.simulation_is_stale
    model = RatesModel(
        name=ModelName.HULL_WHITE, mean_reversion=0.1, volatility=0.01, long_run_rate=0.03, starting_rate=0.02
    )
    document.edit("Change of the model", replace(a_book(), rates_model=model))
    assert not document.standing_is_stale
    assert document.simulation_is_stale
    assert len(opened.value.asked) == asked
    document.undo()
    document.undo()
    assert not document.simulation_is_stale
    document.edit("Change of the spread", a_book(0.01))
    assert document.standing_is_stale
    assert document.simulation_is_stale


def test_changed_fields_compares_by_value() -> None:
    assert changed_fields(a_book(), a_book()) == frozenset()
    assert changed_fields(a_book(), a_book(0.01)) == {"basis"}
    assert changed_fields(a_book(), replace(a_book(), run=Run(paths=5))) == {"run"}


def test_a_cancelled_run_leaves_the_former_result(opened: Bench, qtbot: QtBot) -> None:
    document = opened.document
    document.run_simulation()
    settled(opened, qtbot)
    former = document.simulation
    opened.simulate.let_go.clear()
    document.run_simulation()
    assert document.is_simulating
    document.cancel_simulation()
    qtbot.waitUntil(lambda: not document.is_simulating)
    assert document.simulation is former
    assert not document.simulation_is_stale
    assert opened.failures == []


def test_a_failed_run_leaves_the_former_result_and_says_why(opened: Bench, qtbot: QtBot) -> None:
    document = opened.document
    document.run_simulation()
    settled(opened, qtbot)
    former = document.simulation
    opened.simulate.error = ValueError("no model")
    with qtbot.waitSignal(document.failed):
        document.run_simulation()
    settled(opened, qtbot)
    assert document.simulation is former
    assert not document.is_simulating
    assert opened.failures == ["The simulation came to nothing: no model"]


def test_a_run_on_a_book_edited_meanwhile_is_stale_when_it_comes(opened: Bench, qtbot: QtBot) -> None:
    opened.simulate.let_go.clear()
    opened.document.run_simulation()
    opened.document.edit("Change of the spread", a_book(0.02))
    opened.simulate.let_go.set()
    settled(opened, qtbot)
    assert opened.simulation == ("of", 0.0)
    assert opened.document.simulation_is_stale


def test_another_book_drops_what_belonged_to_the_former(opened: Bench, qtbot: QtBot) -> None:
    document = opened.document
    document.run_simulation()
    settled(opened, qtbot)
    opened.simulate.let_go.clear()
    document.run_simulation()
    document.edit("Change of the spread", a_book(0.02))
    document.open_reading(a_reading(a_book(0.05), "other.xlsx"))
    assert document.simulation is None
    assert not document.is_simulating
    opened.simulate.let_go.set()
    settled(opened, qtbot)
    assert opened.simulation is None
    assert opened.standing == ("of", 0.05)
    assert not document.can_undo
    assert not document.is_modified


def test_nothing_can_be_edited_or_run_without_a_book(bench: Bench) -> None:
    with pytest.raises(RuntimeError, match="no open book"):
        bench.document.edit("Change", a_book())
    with pytest.raises(RuntimeError, match="no open book"):
        bench.document.run_simulation()
    bench.document.undo()
    bench.document.redo()
    bench.document.revalue()
    assert not bench.jobs.running


# The second basis


def two_bases(first: float, second: float) -> Book:
    return replace(a_book(first), second_basis=a_book(second).basis)


def both_settled(bench: Bench, qtbot: QtBot) -> None:
    document = bench.document
    qtbot.waitUntil(
        lambda: not (document.is_valuing or document.is_valuing_second or bench.jobs.running), timeout=10_000
    )


def second_of(bench: Bench) -> Any:
    return bench.document.second_standing


def test_a_book_with_two_bases_has_two_standings(bench: Bench, qtbot: QtBot) -> None:
    bench.document.open_reading(a_reading(two_bases(0.01, 0.03)))
    both_settled(bench, qtbot)
    document = bench.document
    assert (bench.standing, second_of(bench)) == (("of", 0.01), ("of", 0.03))
    assert document.is_comparing
    assert document.comparison_is_current
    assert document.comparison is document.second_standing
    assert [book.second_basis is None for book in bench.value.asked].count(True) == 1


def test_without_a_second_basis_nothing_is_compared(opened: Bench) -> None:
    document = opened.document
    assert (document.second_standing, document.second_failure, document.comparison) == (None, "", None)
    assert not document.is_comparing
    assert not document.comparison_is_current
    assert len(opened.value.asked) == 1


def test_the_comparison_is_put_off_and_on(bench: Bench, qtbot: QtBot) -> None:
    document = bench.document
    document.open_reading(a_reading(two_bases(0.01, 0.03)))
    both_settled(bench, qtbot)
    bench.said.clear()
    document.compare(False)
    document.compare(False)
    assert bench.said == ["standing"]
    assert document.comparison is None
    assert second_of(bench) == ("of", 0.03)
    document.compare(True)
    assert document.comparison is document.second_standing


def test_a_second_basis_that_fails_leaves_the_first_standing(bench: Bench, qtbot: QtBot) -> None:
    document, plain = bench.document, bench.value

    def picky(book: Book, **tools: Any) -> Any:
        if book.basis.liability_spread > 0.1:
            raise ValueError("the rates give no curve")
        return plain(book, **tools)

    document._value = picky
    document.open_reading(a_reading(two_bases(0.01, 0.2)))
    both_settled(bench, qtbot)
    assert bench.standing == ("of", 0.01)
    assert document.standing_failure == ""
    assert document.second_failure == "the rates give no curve"
    assert document.second_standing is None
    assert bench.failures == ["The second basis could not be valued: the rates give no curve"]
    assert not document.comparison_is_current
    document.edit("Change of the second basis", two_bases(0.01, 0.05))
    both_settled(bench, qtbot)
    assert document.second_failure == ""
    assert second_of(bench) == ("of", 0.05)
    # And the other way round.
    document.edit("Change of the first basis", two_bases(0.2, 0.05))
    both_settled(bench, qtbot)
    assert document.standing_failure == "the rates give no curve"
    assert document.second_failure == ""
    assert second_of(bench) == ("of", 0.05)


def test_a_second_basis_taken_away_takes_its_standing_along(bench: Bench, qtbot: QtBot) -> None:
    document = bench.document
    document.open_reading(a_reading(two_bases(0.01, 0.03)))
    both_settled(bench, qtbot)
    bench.said.clear()
    document.edit("The second basis taken away", replace(two_bases(0.01, 0.03), second_basis=None))
    assert second_of(bench) is None
    assert "standing" in bench.said
    both_settled(bench, qtbot)
    document.undo()
    both_settled(bench, qtbot)
    assert second_of(bench) == ("of", 0.03)


def test_a_run_does_not_follow_from_the_second_basis(bench: Bench, qtbot: QtBot) -> None:
    document = bench.document
    document.open_reading(a_reading(two_bases(0.01, 0.03)))
    document.run_simulation()
    both_settled(bench, qtbot)
    document.edit("Change of the second basis", two_bases(0.01, 0.04))
    assert not document.simulation_is_stale
    assert document.standing_is_stale
    assert document.second_is_stale
    terms = (LineTerms(Side.LIABILITIES, "pensions", spread=0.01),)
    document.edit("Terms of a line", replace(two_bases(0.01, 0.04), line_terms=terms))
    assert document.simulation_is_stale


def test_the_latest_edit_wins_on_both_bases(bench: Bench, qtbot: QtBot) -> None:
    document = bench.document
    document.open_reading(a_reading(two_bases(0.01, 0.03)))
    both_settled(bench, qtbot)
    bench.value.let_go.clear()
    for step in range(1, 20):
        document.edit("Change", two_bases(step / 1000, step / 500))
    document.stop()
    document.revalue()
    bench.value.let_go.set()
    both_settled(bench, qtbot)
    assert (bench.standing, second_of(bench)) == (("of", 0.019), ("of", 0.038))
    assert bench.failures == []
