"""Report: its pages, where it goes, and that it is written with the results at hand."""

from __future__ import annotations

import threading
from collections.abc import Callable, Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from pytestqt.qtbot import QtBot

from desk import tasks
from desk.book import Run
from desk.intake.records import Reading
from desk.tasks import Cancelled
from desk.window.document import Document
from desk.window.jobs import Jobs
from desk.window.parts.theme import ThemeSwitch
from desk.window.report.station import ReportStation
from desk.window.settings import Settings
from tests.window.frame import FakeDialogs, a_book, a_reading


class FakeReport:
    """Stands in for the task that writes: notes what it was handed and writes a word."""

    def __init__(self) -> None:
        self.given: list[dict[str, Any]] = []
        self.error: Exception | None = None
        self.let_go = threading.Event()
        self.let_go.set()

    def __call__(
        self,
        reading: Reading,
        path: Path,
        *,
        standing: object,
        simulation: object,
        shocks: object,
        progress: Callable[[float], None],
        cancel: threading.Event,
    ) -> Path:
        while not self.let_go.wait(0.005):
            if cancel.is_set():
                raise Cancelled
        if self.error is not None:
            raise self.error
        self.given.append(
            {"book": reading.book, "standing": standing, "simulation": simulation, "shocks": shocks}
        )
        path.write_text("a report", encoding="utf-8")
        return path


class Bench:
    """The station with stand-ins."""

    def __init__(self, folder: Path, theme_switch: ThemeSwitch) -> None:
        self.folder = folder
        self.jobs = Jobs(workers=2)
        self.document = Document(self.jobs)
        self.report = FakeReport()
        self.settings = Settings(folder / "settings.ini")
        self.station = ReportStation(self.document, self.jobs, theme_switch, report=self.report)
        self.dialogs = FakeDialogs(self.station)
        self.station._dialogs = self.dialogs
        self.station.use_settings(self.settings)


@pytest.fixture
def bench(qtbot: QtBot, tmp_path: Path, theme_switch: ThemeSwitch) -> Iterator[Bench]:
    made = Bench(tmp_path, theme_switch)
    qtbot.addWidget(made.station)
    made.station.resize(1100, 640)
    made.station.show()
    yield made
    made.report.let_go.set()
    made.document.stop()
    made.jobs.shutdown()


def _open(bench: Bench, qtbot: QtBot, *, model: bool = False) -> None:
    book = replace(a_book(model=model), run=Run(paths=200, horizon_years=5, steps_per_year=1))
    source = bench.folder / "fund.xlsx"
    source.write_text("the book", encoding="utf-8")
    bench.document.open_reading(a_reading(book, source))
    qtbot.waitUntil(lambda: bench.station.preview.shown[0] == "Summary" and not bench.jobs.running)


def _write(bench: Bench, qtbot: QtBot) -> None:
    bench.station.write()
    qtbot.waitUntil(lambda: not bench.jobs.running)


def test_without_a_book_there_is_nothing_to_report(bench: Bench) -> None:
    assert bench.station.is_empty


def test_the_pages_are_those_of_the_book(bench: Bench, qtbot: QtBot) -> None:
    _open(bench, qtbot)
    names = list(bench.station.sheets.table_model.column_values("sheet"))
    assert names[0] == "Summary"
    assert {"Liabilities", "Key rates", "Faults", "Provenance"} <= set(names)
    assert "Savings account" not in names
    assert "no rates model" in bench.station._contents.text()
    bench.station.sheets.go_to(names.index("Liabilities"))
    assert bench.station.preview.shown[0] == "Liabilities"


def test_shocks_have_their_sheets(bench: Bench, qtbot: QtBot) -> None:
    _open(bench, qtbot)
    names = list(bench.station.sheets.table_model.column_values("sheet"))
    assert {"Shocks", "Shock moves", "Shock rates", "Shock recomputed", "Parallel moves"} <= set(names)
    bench.document.request_shocks()
    qtbot.waitUntil(lambda: bench.document.shocks.result is not None and not bench.jobs.running)
    _write(bench, qtbot)
    assert bench.report.given[0]["shocks"] is bench.document.shocks.result


def test_a_run_brings_its_sheets(bench: Bench, qtbot: QtBot) -> None:
    _open(bench, qtbot, model=True)
    assert bench.station.run_button.isVisible()
    assert "Writing the report runs it first (200 paths over 5 years" in bench.station._contents.text()
    bench.station.run_button.click()
    qtbot.waitUntil(
        lambda: "Savings account" in bench.station.sheets.table_model.column_values("sheet"), timeout=20_000
    )
    assert not bench.station.run_button.isVisible()
    assert bench.station._contents.text().startswith("The run at hand goes in: 200 paths")


def test_the_report_is_written_with_the_results_at_hand(bench: Bench, qtbot: QtBot) -> None:
    _open(bench, qtbot)
    assert bench.station.target.value == str(bench.folder / "fund_report.xlsx")
    _write(bench, qtbot)
    given = bench.report.given[0]
    assert given["book"] is bench.document.book
    assert given["standing"] is bench.document.standing
    assert given["simulation"] is None
    assert given["shocks"] is None
    model = bench.station.runs.table_model
    assert model.rowCount() == 1
    assert model.column_values("file")[0] == "fund_report.xlsx"
    standing = bench.document.standing
    assert standing is not None
    assert model.column_values("surplus")[0] == standing.surplus
    assert bench.settings.report_folder == bench.folder


def test_a_stale_standing_is_not_handed_over(bench: Bench, qtbot: QtBot) -> None:
    _open(bench, qtbot)
    held = threading.Event()

    def value(book: object, *, progress: Callable[[float], None], cancel: threading.Event) -> Any:
        while not held.wait(0.005):
            if cancel.is_set():
                raise Cancelled
        return tasks.value(a_book(spread=0.01))

    bench.document._value = value
    bench.document.edit("Change", a_book(spread=0.01))
    assert bench.document.standing_is_stale
    bench.station.write()
    qtbot.waitUntil(lambda: len(bench.report.given) == 1)
    assert bench.report.given[0]["standing"] is None
    qtbot.waitUntil(
        lambda: bench.station.stale_text.startswith("These pages are from before your last change")
    )
    held.set()
    qtbot.waitUntil(lambda: not bench.station.stale_text and not bench.jobs.running)


@pytest.mark.parametrize(
    ("name", "problem"),
    [
        ("", "Enter where the report goes."),
        ("report.txt", "The name must end in .xlsx."),
        ("nowhere/report.xlsx", "There is no folder"),
        ("fund.xlsx", "This is the book itself"),
    ],
)
def test_a_place_that_will_not_do_is_said(bench: Bench, qtbot: QtBot, name: str, problem: str) -> None:
    _open(bench, qtbot)
    bench.station.target.line.setText(str(bench.folder / name) if name else "")
    bench.station.write()
    assert bench.station.target.problem.startswith(problem)
    assert bench.report.given == []
    assert (bench.folder / "fund.xlsx").read_text() == "the book"


@pytest.mark.parametrize("agreed", [False, True])
def test_a_file_of_somebody_else_is_asked_about(bench: Bench, qtbot: QtBot, agreed: bool) -> None:
    _open(bench, qtbot)
    target = bench.folder / "fund_report.xlsx"
    target.write_text("from a colleague", encoding="utf-8")
    bench.dialogs.overwrite = agreed
    _write(bench, qtbot)
    assert len(bench.dialogs.asked) == 1
    assert target.read_text() == ("a report" if agreed else "from a colleague")
    if agreed:
        _write(bench, qtbot)
        assert len(bench.dialogs.asked) == 1, "its own report is written again without a question"


def test_a_file_chosen_in_the_dialog_is_not_asked_about_twice(bench: Bench, qtbot: QtBot) -> None:
    _open(bench, qtbot)
    chosen = bench.folder / "chosen.xlsx"
    chosen.write_text("older", encoding="utf-8")
    bench.dialogs.save_path = chosen
    bench.station.browse.click()
    _write(bench, qtbot)
    assert bench.dialogs.asked == ["save"]
    assert chosen.read_text() == "a report"


def test_a_failure_and_a_cancel_leave_no_report(bench: Bench, qtbot: QtBot) -> None:
    _open(bench, qtbot)
    bench.report.error = OSError(13, "Permission denied")
    _write(bench, qtbot)
    assert "Permission denied" in bench.station.target.problem
    bench.report.error = None
    bench.report.let_go.clear()
    bench.station.write()
    assert not bench.station.write_button.isEnabled()
    bench.jobs.cancel_all()
    qtbot.waitUntil(lambda: not bench.jobs.running)
    assert bench.station.write_button.isEnabled()
    assert bench.station.written == []


def test_a_book_that_cannot_be_valued_is_not_reported(bench: Bench, qtbot: QtBot) -> None:
    _open(bench, qtbot)

    def fail(book: object, **_: object) -> Any:
        raise ValueError("the quotes give no curve")

    bench.document._value = fail
    bench.document.edit("Change", a_book(spread=0.01))
    qtbot.waitUntil(lambda: "the quotes give no curve" in bench.station.stale_text)
    assert not bench.station.write_button.isEnabled()
    assert bench.station.preview.shown == ("", 0, 0)


def test_the_report_itself_is_a_workbook(qtbot: QtBot, tmp_path: Path, theme_switch: ThemeSwitch) -> None:
    bench = Bench(tmp_path, theme_switch)
    bench.station._report = tasks.report
    qtbot.addWidget(bench.station)
    bench.station.show()
    _open(bench, qtbot)
    bench.station.write()
    qtbot.waitUntil(lambda: len(bench.station.written) == 1, timeout=30_000)
    from openpyxl import load_workbook

    names = load_workbook(tmp_path / "fund_report.xlsx", read_only=True).sheetnames
    assert names == list(bench.station.sheets.table_model.column_values("sheet"))
    bench.jobs.shutdown()
