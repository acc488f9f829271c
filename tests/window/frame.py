"""What the tests of the window's frame share: books in code, and stand-ins for dialogs, tasks and "
"stations."""

from __future__ import annotations

import threading
from collections.abc import Callable, Sequence
from datetime import date
from pathlib import Path
from typing import Any

import numpy as np
from PySide6.QtCore import QObject
from PySide6.QtWidgets import QLabel, QPushButton, QWidget

from desk.book import Basis, Book, Fault, FlowTable, Holding, HoldingKind, ModelName, RatesModel, Severity
from desk.intake.records import Reading, SheetGrid
from desk.tasks import Cancelled
from desk.window.book_files import BookFiles
from desk.window.dialogs import Choice, Dialogs
from desk.window.document import Document
from desk.window.jobs import Jobs
from desk.window.main_window import MainWindow
from desk.window.parts.theme import ThemeSwitch
from desk.window.settings import Settings
from desk.window.station import Station
from desk.window.stations import StationEntry

VALUATION_DATE = date(2031, 3, 31)


def a_book(*, title: str = "A fund", spread: float = 0.0, owed: float = 1000.0, model: bool = False) -> Book:
    """Ten payments of 100 against a zero worth less than they are."""
    years = np.arange(1.0, 11.0)
    basis = Basis(
        VALUATION_DATE,
        "EUR",
        np.array([1.0, 10.0]),
        np.array([0.02, 0.03]),
        liability_spread=spread,
        title=title,
    )
    return Book(
        basis=basis,
        liabilities=FlowTable.build(["pensions"] * 10, years, np.full(10, owed / 10)),
        holdings=(Holding("zero", HoldingKind.ZERO, nominal=700.0, maturity=date(2034, 3, 31)),),
        rates_model=RatesModel(ModelName.HULL_WHITE, mean_reversion=0.1, volatility=0.01) if model else None,
    )


GRAVE = Fault("the text “many”", "a number", "Write a number.", "Liabilities", "C3")
MILD = Fault("a date in the past", "a later one", "Nothing need be done.", "Liabilities", "B2", Severity.MILD)
MISSING = Fault("there is no sheet Curve", "one", "Add it.", "Curve")

SHEETS = (
    SheetGrid("Basis", (("Item", "Value"), ("Currency", "EUR")), {0: "Item", 1: "Value"}, 0, False),
    SheetGrid(
        "Liabilities",
        (("Line", "Date", "Amount", "Remark"), ("pensions", date(2031, 1, 1), 100.5, "=1+1"), ("pensions",)),
        {0: "Line", 1: "Date", 2: "Amount"},
        0,
        False,
    ),
)


def a_reading(book: Book | None, path: Path = Path("fund.xlsx"), *, faults: Sequence[Fault] = ()) -> Reading:
    """A reading with two sheets."""
    return Reading(path=path, sha256="ab" * 32, book=book, faults=tuple(faults), sheets=SHEETS)


class FakeDialogs(Dialogs):
    """Answers at once, as told; an answer of None leaves the question open."""

    def __init__(self, parent: QWidget) -> None:
        super().__init__(parent)
        self.asked: list[str] = []
        self.choice: Choice | None = Choice.CANCEL
        self.overwrite = False
        self.open_path: Path | None = None
        self.save_path: Path | None = None
        self.suggested: list[Path] = []

    def ask_unsaved(self, name: str, before: str, on_choice: Callable[[Choice], None]) -> None:
        self.asked.append(f"unsaved {name} {before}")
        if self.choice is not None:
            on_choice(self.choice)

    def ask_overwrite(self, question: str, why: str, on_yes: Callable[[], None]) -> None:
        self.asked.append(f"overwrite {question} {why}")
        if self.overwrite:
            on_yes()

    def ask_open(self, folder: Path, on_path: Callable[[Path], None]) -> None:
        self.asked.append("open")
        if self.open_path is not None:
            on_path(self.open_path)

    def ask_save(self, title: str, suggestion: Path, on_path: Callable[[Path], None]) -> None:
        self.asked.append("save")
        self.suggested.append(suggestion)
        if self.save_path is not None:
            on_path(self.save_path)


class FakeRead:
    """Stands in for the task that reads: answers by the file's name, or waits until it is let go."""

    def __init__(self) -> None:
        self.readings: dict[str, Reading] = {}
        self.error: Exception | None = None
        self.let_go = threading.Event()
        self.let_go.set()
        self.paths: list[Path] = []

    def __call__(self, path: Path, *, progress: Callable[[float], None], cancel: threading.Event) -> Reading:
        self.paths.append(path)
        while not self.let_go.wait(0.005):
            if cancel.is_set():
                raise Cancelled
        progress(1.0)
        if self.error is not None:
            raise self.error
        return self.readings.get(path.name) or a_reading(a_book(title=path.stem), path)


class FakeSave:
    """Stands in for the task that saves: notes what it was given and writes a word."""

    def __init__(self) -> None:
        self.saved: list[tuple[Book, Path]] = []
        self.error: Exception | None = None
        self.let_go = threading.Event()
        self.let_go.set()

    def __call__(self, book: Book, path: Path) -> Path:
        self.let_go.wait(10)
        if self.error is not None:
            raise self.error
        self.saved.append((book, path))
        path.write_text(f"copy {len(self.saved)}", encoding="utf-8")
        return path


class PlainStation(Station):
    """A station with a button, that counts what is asked of it."""

    key, title, purpose = "standing", "Standing", "For tests"

    def __init__(self, document: Document, jobs: Jobs, theme_switch: ThemeSwitch) -> None:
        super().__init__(document, jobs, theme_switch)
        self.rows_asked: list[str] = []
        self.refreshed = 0
        self.button = QPushButton("a button")
        self.set_pictures(self.button)
        self.set_table(QLabel("a table"))

    def show_rows(self, figure: str) -> None:
        """Note what was asked for."""
        self.rows_asked.append(figure)

    def refresh(self) -> None:
        """Count."""
        self.refreshed += 1


class PlainIntake(PlainStation):
    """Another."""

    key, title = "intake", "Intake"


ENTRIES = (
    StationEntry(1, "intake", "Intake", "Reading", lambda: PlainIntake),
    StationEntry(3, "standing", "Standing", "Valuing", lambda: PlainStation),
)


class Frame:
    """A window with stand-ins."""

    def __init__(
        self, folder: Path, theme_switch: ThemeSwitch, entries: Sequence[StationEntry] = ENTRIES
    ) -> None:
        self.jobs = Jobs(workers=2)
        self.document = Document(self.jobs)
        self.read, self.save = FakeRead(), FakeSave()
        self.settings = Settings(folder / "settings.ini")
        self.folder = folder
        self.window = MainWindow(
            jobs=self.jobs,
            document=self.document,
            settings=self.settings,
            theme_switch=theme_switch,
            stations=entries,
            dialogs=self._make_dialogs,
            files=self._make_files,
        )

    def _make_dialogs(self, parent: QWidget) -> Dialogs:
        self.dialogs = FakeDialogs(parent)
        return self.dialogs

    def _make_files(
        self,
        document: Document,
        jobs: Jobs,
        settings: Settings,
        recent: Any,
        dialogs: Dialogs,
        parent: QObject,
    ) -> BookFiles:
        return BookFiles(
            document, jobs, settings, recent, dialogs, parent, read=self.read, save_copy=self.save
        )

    def edit(self, spread: float = 0.01, text: str = "Change of the liability spread") -> None:
        """Change the open book."""
        book = self.document.book
        assert book is not None
        basis = a_book(title=book.basis.title, spread=spread).basis
        self.document.edit(text, Book(basis=basis, liabilities=book.liabilities, holdings=book.holdings))

    def file(self, name: str = "fund.xlsx") -> Path:
        """A file that is there."""
        path = self.folder / name
        path.write_text("a workbook", encoding="utf-8")
        return path
