"""What the tests of single stations share: a small fund, and a document that values and simulates it."""

from __future__ import annotations

import threading
from collections.abc import Callable
from dataclasses import replace
from datetime import date
from pathlib import Path
from typing import Any

import numpy as np
from PySide6.QtCore import QCoreApplication, QEvent
from PySide6.QtWidgets import QWidget

from desk import tasks
from desk.book import Basis, Book, FlowTable, Holding, HoldingKind, ModelName, RatesModel, Run
from desk.intake.records import Reading
from desk.scenarios.records import Simulation
from desk.window.document import Document
from desk.window.jobs import Jobs

__all__ = ["Bench", "SlowSimulation", "a_fund", "dispose"]


def a_fund() -> Book:
    """Two liability lines, a bond, a zero and ready-made flows; small, with a Hull-White model."""
    terms, rates = np.array([1.0, 2.0, 5.0, 10.0]), np.array([0.02, 0.022, 0.026, 0.03])
    years = np.arange(1.0, 11.0)
    return Book(
        Basis(date(2031, 3, 31), "EUR", terms, rates, title="A small fund", liability_spread=0.005),
        FlowTable.build(
            ["pensions"] * 10 + ["spouses"] * 10, np.tile(years, 2), np.repeat([100_000.0, 40_000.0], 10)
        ),
        holdings=(
            Holding("bond", HoldingKind.BOND, 400_000.0, 0.03, 2, date(2036, 3, 31)),
            Holding("zero", HoldingKind.ZERO, 300_000.0, maturity=date(2039, 3, 31), market_value=230_000.0),
        ),
        asset_flows=FlowTable.build(["rent"] * 3, [1.0, 2.0, 3.0], [50_000.0] * 3),
        rates_model=RatesModel(ModelName.HULL_WHITE, mean_reversion=0.05, volatility=0.009),
        run=Run(paths=400, horizon_years=8, steps_per_year=2, seed=7),
    )


class SlowSimulation:
    """Simulates when it is let go; until then it can be cancelled."""

    def __init__(self) -> None:
        self.let_go = threading.Event()
        self.let_go.set()
        self.started = threading.Event()
        self.error: Exception | None = None

    def __call__(
        self, book: Book, *, progress: Callable[[float], None], cancel: threading.Event
    ) -> Simulation:
        self.started.set()
        while not self.let_go.wait(0.005):
            progress(0.25)
        if self.error is not None:
            raise self.error
        return tasks.simulate(book, progress=progress, cancel=cancel)


class Bench:
    """A document with a book in it, valued on threads of its own."""

    def __init__(self) -> None:
        self.jobs = Jobs(workers=2)
        self.simulation = SlowSimulation()
        self.document = Document(self.jobs, simulate=self.simulation)

    def open(self, book: Book) -> None:
        """Open a book as if it had been read."""
        self.document.open_reading(Reading(Path("fund.xlsx"), "ab" * 32, book, (), ()))

    @property
    def book(self) -> Book:
        """The open book."""
        book = self.document.book
        assert book is not None
        return book

    def edit_basis(self, **changes: Any) -> None:
        """Edit the basis as another station would."""
        basis = replace(self.book.basis, **changes)
        self.document.edit("Change elsewhere", replace(self.book, basis=basis))

    def close(self) -> None:
        """Stop everything."""
        self.simulation.let_go.set()
        self.document.stop()
        self.jobs.shutdown()


def dispose(widget: QWidget) -> None:
    """Close a widget and delete it at once: those that wait for it are restyled with every theme."""
    widget.close()
    widget.deleteLater()
    QCoreApplication.sendPostedEvents(widget, QEvent.Type.DeferredDelete)
