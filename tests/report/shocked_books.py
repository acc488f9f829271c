"""Invented shocks of every kind, and reports of books under them."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

from desk import tasks
from desk.book import Book, Move, MoveKind, Shock, ShockSettings
from desk.rates.compounding import Compounding
from desk.report.results.workbook import write_report
from desk.valuation.shock_records import ShockTable
from tests.report import examples
from tests.report.spreadsheet import Spreadsheet

__all__ = ["FIRST", "MASTER", "OWN", "SHEETS", "failures", "shocked_book", "write"]

SHEETS = ["Shocks", "Shock moves", "Shock rates", "Shock recomputed", "Parallel moves"]
MASTER = ("Summary", "B3")
FIRST = 6
"""Row of the first shock on the sheet of shocks."""
OWN = (
    Shock(examples.HOSTILE, (Move(MoveKind.TWIST, 45.0, 8.0), Move(MoveKind.PARALLEL, -12.5))),
    Shock(
        "Out of order",
        (Move(MoveKind.RATE, 80.0, 20.0), Move(MoveKind.RATE, -40.0, 2.0), Move(MoveKind.RATE, 15.0, 7.5)),
        source="an invented rule, Article 7",
    ),
    Shock(
        "Shares with a least size and floors",
        (
            Move(MoveKind.RELATIVE, 0.4, 1.0),
            Move(MoveKind.RELATIVE, 0.2, 15.0),
            Move(MoveKind.LEAST, 90.0, 1.0),
            Move(MoveKind.LEAST, 40.0, 30.0),
            Move(MoveKind.SHORT, -250.0),
            Move(MoveKind.FLOOR, -50.0, 0.0),
            Move(MoveKind.FLOOR, 60.0, 25.0),
        ),
        compounding=Compounding.SEMI_ANNUAL,
    ),
    Shock("Markets fall", (Move(MoveKind.VALUE, -0.3), Move(MoveKind.SPREAD, 75.0, target="bond"))),
    Shock("Lives are longer", (Move(MoveKind.DECLINE, 0.004), Move(MoveKind.PARALLEL, -30.0))),
    Shock("Later, and more", (Move(MoveKind.TIME, 0.5), Move(MoveKind.AMOUNT, 0.1, target="Pensions"))),
    Shock(
        "Everywhere", (Move(MoveKind.PARALLEL, -60.0), Move(MoveKind.VALUE, -0.1), Move(MoveKind.TIME, 1.0))
    ),
)


def shocked_book(of: Book | None = None, shocks: tuple[Shock, ...] = OWN) -> Book:
    """A book that asks for own shocks and prescribed sets of every kind."""
    sets = ("EU 2024/856", "Solvency II rates")
    settings = ShockSettings(sets=sets, thresholds=(1.1, 0.9))
    return replace(of or examples.book(), rates_model=None, shocks=shocks, shock_settings=settings)


def write(of: Book, path: Path, found: ShockTable | None = None) -> Spreadsheet:
    """The report of a book under its shocks, opened."""
    found = found or tasks.shock(of)
    return Spreadsheet(write_report(examples.reading(of), tasks.value(of), None, path, shocks=found))


def failures(sheet: Spreadsheet) -> list[tuple[str, str]]:
    """Every cell that says that something is wrong."""
    return [(name, at) for name, at, _ in sheet.formulas() if sheet.value(name, at) in ("CHECK", "#VALUE!")]
