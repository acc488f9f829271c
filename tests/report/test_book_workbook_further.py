"""Two bases, terms of lines, shocks and market data in a written workbook."""

from __future__ import annotations

from dataclasses import fields, replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from openpyxl import load_workbook

from desk.book import (
    Basis,
    Book,
    CurveKind,
    FlowTable,
    Inflation,
    LineTerms,
    Move,
    MoveKind,
    Notes,
    ScenarioSet,
    Shock,
    ShockSettings,
    Side,
    YieldHistory,
)
from desk.intake.records import Reading
from desk.intake.sheets import SHEETS
from desk.intake.workbook import read_workbook
from desk.report.book_workbook import write_book
from tests.intake.books import save
from tests.intake.further_books import by_bonds, by_formula, wide_sheets
from tests.report.book_strategies import TODAY

BASIS = Basis(TODAY, "EUR", np.array([1.0, 10.0]), np.array([0.02, 0.03]))
INFLATION = Inflation(np.array([5.0]), np.array([0.02]), volatility=0.01, recent=0.03)


def plain_book(**changes: Any) -> Book:
    """A book with no more than it needs."""
    return replace(Book(BASIS, FlowTable.build(["A", "B"], [1.0, 60.0], [5.0, 6.0])), **changes)


def again(book: Book, folder: Path) -> Reading:
    """A book written and read."""
    return read_workbook(write_book(book, folder / "book.xlsx"))


@pytest.fixture(scope="module")
def wide(tmp_path_factory: pytest.TempPathFactory) -> Book:
    """A book with every kind of sheet."""
    book = read_workbook(save(wide_sheets(), tmp_path_factory.mktemp("wide") / "book.xlsx")).book
    assert book is not None
    return book


def test_a_wide_book_comes_back_without_a_fault(wide: Book, tmp_path: Path) -> None:
    reading = again(wide, tmp_path)
    assert reading.faults == ()
    assert reading.book == wide
    assert reading.book.digest == wide.digest
    unused = {
        *("Curve bonds", "Liability bonds"),
        *("Second curve", "Second curve bonds", "Second liability spreads", "Second inflation"),
    }
    assert [sheet.name for sheet in reading.sheets] == [name for name in SHEETS if name not in unused]


@pytest.mark.parametrize("kind", ["bonds", "svensson", "nelson-siegel", "flat"])
def test_curves_without_quotes_come_back_without_a_fault(kind: str, tmp_path: Path) -> None:
    sheets = by_bonds(Bond_fit="exact") if kind == "bonds" else by_formula(kind)
    book = read_workbook(save(sheets, tmp_path / "first.xlsx")).book
    assert book is not None
    reading = again(book, tmp_path)
    assert reading.faults == ()
    assert reading.book == book
    assert "Curve" not in {sheet.name for sheet in reading.sheets}


def test_every_field_of_a_basis_has_a_place(wide: Book) -> None:
    """A field that the random books of the round trip leave as usual would be lost unseen."""
    known = {
        *("valuation_date", "currency", "terms", "rates", "curve_kind", "compounding", "interpolation"),
        *("liability_spread", "market_risk_premium", "day_count", "title", "payments_per_year"),
        *("ultimate_forward_rate", "last_liquid_point", "convergence_point", "convergence_tolerance"),
        *("extrapolation", "bonds", "bond_fit", "parameters", "flat_rate", "liability_method"),
        *("liability_terms", "liability_spreads", "liability_bonds", "liability_fit", "expected_return"),
        "inflation",
    }
    assert {field.name for field in fields(wide.basis)} == known
    assert {field.name for field in fields(Inflation)} == {
        *("terms", "rates", "interpolation", "volatility", "recent"),
    }
    assert {field.name for field in fields(Shock)} == {"name", "moves", "source", "compounding", "set_name"}
    assert {field.name for field in fields(Move)} == {"kind", "size", "term", "target"}
    assert {field.name for field in fields(ShockSettings)} == {"sets", "thresholds"}
    assert {field.name for field in fields(LineTerms)} == {"side", "line", "indexation", "spread", "rate"}


def test_no_text_becomes_a_formula(wide: Book, tmp_path: Path) -> None:
    evil = "=HYPERLINK(A1)"
    assert wide.second_basis is not None
    assert wide.second_basis.liability_bonds is not None
    named = replace(wide.second_basis.liability_bonds, names=(evil, "+x", "-x", "@x", "=1", "=2", "=3"))
    book = replace(
        wide,
        second_basis=replace(wide.second_basis, title=evil, liability_bonds=named),
        line_terms=(LineTerms(Side.ASSETS, evil),),
        shocks=(Shock(evil, (Move(MoveKind.VALUE, 0.1, target="=2+2"),), "@source", set_name="+set"),),
        shock_settings=ShockSettings((evil, "=3")),
        notes=(Notes("Scenario set", ("=Note",), ((evil,), ("-1",))),),
    )
    path = write_book(book, tmp_path / "book.xlsx")
    for sheet in load_workbook(path):
        for row in sheet.iter_rows():
            assert all(cell.data_type != "f" for cell in row), sheet.title
    assert read_workbook(path).book == book


def test_headings_of_years_are_numbers(tmp_path: Path) -> None:
    node = np.array([1e-05, 0.012345678901234567, 0.25, 1.0, 1 / 3 + 1, 100.0])
    scenarios = ScenarioSet(node, np.full((2, node.size), 0.02))
    path = write_book(plain_book(scenario_set=scenarios), tmp_path / "book.xlsx")
    assert [cell.value for cell in load_workbook(path)["Scenario set"][1]] == ["Path", *node.tolist()]
    read = read_workbook(path).book
    assert read is not None
    assert read.scenario_set == scenarios


@pytest.mark.parametrize(
    ("first", "second", "sheets"),
    [
        (None, None, set()),
        (INFLATION, INFLATION, {"Inflation"}),
        (INFLATION, None, {"Inflation", "Second inflation"}),
        (None, INFLATION, {"Second inflation"}),
        (INFLATION, replace(INFLATION, recent=None), {"Inflation", "Second inflation"}),
    ],
)
def test_inflation_of_two_bases(
    first: Inflation | None, second: Inflation | None, sheets: set[str], tmp_path: Path
) -> None:
    book = plain_book(
        basis=replace(BASIS, inflation=first), second_basis=replace(BASIS, title="x", inflation=second)
    )
    reading = again(book, tmp_path)
    assert reading.book == book
    assert {sheet.name for sheet in reading.sheets} & {"Inflation", "Second inflation"} == sheets


@pytest.mark.parametrize(
    "changes",
    [
        {"shocks": (Shock("Nothing", ()), Shock("Up", (Move(MoveKind.PARALLEL, 0.0),)))},
        {"shock_settings": ShockSettings(thresholds=())},
        {"shock_settings": ShockSettings(sets=("a, b", "c"))},
        {"basis": replace(BASIS, flat_rate=0.02, expected_return=-0.0, market_risk_premium=-0.0)},
        {
            "basis": replace(
                BASIS, curve_kind=CurveKind.FLAT, flat_rate=0.0, terms=np.zeros(0), rates=np.zeros(0)
            )
        },
        {
            "yield_history": YieldHistory(
                np.array(["2020-02-29"], "M8[D]"), np.array([0.5]), np.array([[np.nan]])
            )
        },
    ],
    ids=lambda changes: next(iter(changes)),
)
def test_odd_books_come_back(changes: dict[str, Any], tmp_path: Path) -> None:
    book = plain_book(**changes)
    reading = again(book, tmp_path)
    assert reading.book == book, [str(fault) for fault in reading.faults]
    assert reading.book.digest == book.digest


def test_notes_of_sheets_of_years_stay(tmp_path: Path) -> None:
    days = np.array(["2020-02-28", "2020-03-31"], "M8[D]")
    book = plain_book(
        yield_history=YieldHistory(days, np.array([1.0, 5.0]), np.array([[0.01, np.nan], [0.02, 0.03]])),
        shocks=(Shock("Up", (Move(MoveKind.PARALLEL, 100.0),)),),
        notes=(
            Notes("Shocks", ("Asked by",), (("board",),)),
            Notes("Yield history", ("Quoted by", "Note"), (("a", None), (None, "b"))),
        ),
    )
    assert again(book, tmp_path).book == book
