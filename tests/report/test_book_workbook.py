"""A book written as a workbook reads in again the same."""

from __future__ import annotations

from dataclasses import fields, replace
from datetime import date
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from openpyxl import load_workbook

from desk.book import (
    Amortisation,
    Basis,
    Book,
    CurveKind,
    FlowTable,
    Holding,
    HoldingKind,
    Indexation,
    LineTerms,
    Notes,
    PriceKind,
    RiskyAssets,
    Run,
    Severity,
    Shock,
    ShockSettings,
    Side,
    YieldHistory,
)
from desk.intake.basis_items import QUOTED_KINDS
from desk.intake.workbook import read_workbook
from desk.rates.day_count import DayCount
from desk.rates.smith_wilson import Extrapolation
from desk.report.book_workbook import write_book
from tests.report.book_strategies import TODAY, books, holdings


def _basis(**changes: Any) -> Basis:
    return replace(
        Basis(TODAY, "EUR", np.array([1.0, 10.0, 30.0]), np.array([0.02, 0.03, 0.025]), title="=1+1"),
        **changes,
    )


def _book(**changes: Any) -> Book:
    return replace(Book(_basis(), FlowTable.build(["A", "B"], [1.0, 60.0], [5.0, 6.0])), **changes)


def _again(book: Book, folder: Path) -> Book:
    reading = read_workbook(write_book(book, folder / "book.xlsx"))
    assert reading.book is not None, [str(fault) for fault in reading.faults]
    return reading.book


@pytest.mark.parametrize("kind", QUOTED_KINDS)
@pytest.mark.parametrize("extrapolation", list(Extrapolation))
def test_how_the_curve_is_built_comes_back(
    kind: CurveKind, extrapolation: Extrapolation, tmp_path: Path
) -> None:
    by_method = extrapolation is Extrapolation.SMITH_WILSON
    basis = _basis(
        curve_kind=kind,
        payments_per_year=None if kind is CurveKind.ZERO else 2,
        extrapolation=extrapolation,
        last_liquid_point=20.0,
        ultimate_forward_rate=0.0345 if by_method else None,
        convergence_point=65.0 if by_method else None,
        convergence_tolerance=2e-4 if by_method else 1e-4,
    )
    reading = read_workbook(write_book(_book(basis=basis), tmp_path / "book.xlsx"))
    assert reading.faults == ()
    assert reading.book is not None
    assert reading.book.basis == basis


@settings(max_examples=25, deadline=None, suppress_health_check=list(HealthCheck))
@given(book=books())
def test_any_book_comes_back_the_same(book: Book, tmp_path_factory: pytest.TempPathFactory) -> None:
    again = _again(book, tmp_path_factory.mktemp("book"))
    assert again == book
    assert again.digest == book.digest


@settings(max_examples=60, deadline=None, suppress_health_check=list(HealthCheck))
@given(held=st.lists(holdings(), min_size=1, max_size=30))
def test_any_holdings_come_back_the_same(
    held: list[Holding], tmp_path_factory: pytest.TempPathFactory
) -> None:
    book = _book(holdings=tuple(held))
    again = _again(book, tmp_path_factory.mktemp("book"))
    assert again.holdings == book.holdings
    assert again.digest == book.digest


def test_every_term_of_a_holding_has_a_column(tmp_path: Path) -> None:
    """Holdings that state each field come back; columns that none fills are not written."""
    swap = Holding(
        "Swap", HoldingKind.PAYER_SWAP, -5.0, 0.02, 2, date(2040, 5, 31), DayCount.THIRTY_360, -1.5, 3.0,
        start_date=date(2027, 1, 4), current_rate=0.0, margin=-0.001, floating_frequency=4,
        floating_day_count=DayCount.ACT_360,
    )  # fmt: skip
    bond = Holding(
        "Bond", HoldingKind.BOND, 7.0, 0.0, 2, date(2040, 5, 31), start_date=date(2025, 1, 4),
        first_coupon=date(2026, 11, 30), ex_dividend_days=7, bought_ex_dividend=True,
        amortisation=Amortisation.ANNUITY, price=99.5, price_kind=PriceKind.DIRTY, default_rate=0.01,
        recovery_rate=0.4,
    )  # fmt: skip
    linked = Holding(
        "Linked", HoldingKind.LINKED_BOND, 7.0, 0.01, 2, date(2040, 5, 31), index_lag_months=8,
        index_ratio=1.25, has_principal_floor=True,
    )  # fmt: skip
    bill = Holding("Bill", HoldingKind.BILL, 7.0, maturity=date(2027, 1, 31), discount_rate=0.02)
    home = Holding("Home", HoldingKind.PROPERTY, market_value=9.0, duration=4.0)
    plain = Holding("Plain", HoldingKind.DEPOSIT)
    held = (swap, bond, linked, bill, home)
    unstated = {
        field.name
        for field in fields(Holding)
        if all(getattr(each, field.name) == getattr(plain, field.name) for each in held)
    }
    assert not unstated
    assert _again(_book(holdings=held), tmp_path).holdings == held
    path = write_book(_book(holdings=(plain,)), tmp_path / "plain.xlsx")
    headings = [cell.value for cell in load_workbook(path)["Holdings"][1]]
    assert headings == ["Name", "Kind", "Nominal", "Coupon", "Frequency", "Maturity"]


def test_a_second_copy_is_that_of_the_first(tmp_path: Path) -> None:
    """Notes of every kind of sheet stay where they are however often a book is saved."""
    book = _book(
        holdings=(Holding("Cash", HoldingKind.DEPOSIT, 5.0),),
        risky_assets=RiskyAssets(
            ("E",), np.ones(1), np.zeros(1), np.ones(1), np.zeros(1), np.eye(1), np.zeros(1)
        ),
        notes=(
            Notes("Basis", ("Item", "Source"), (("Title", "mine"), ("Compounding", 3.0))),
            Notes("Curve", ("Quoted by", "Quoted by"), (("a", None), (None, "=b"), (1.5, "c"))),
            Notes("Holdings", ("Where",), (("bank",),)),
            Notes("Risky assets", ("Index",), (("x",),)),
            Notes("Run", ("Item", "Why"), (("Seed", "chosen"),)),
            Notes("History", ("Source",), ()),
        ),
    )
    first = _again(book, tmp_path)
    assert first == book
    assert _again(first, tmp_path) == book


def test_a_sheet_reads_well(tmp_path: Path) -> None:
    path = write_book(_book(), tmp_path / "book.xlsx")
    workbook = load_workbook(path)
    assert workbook.sheetnames == ["Basis", "Curve", "Liabilities", "Run"]
    for sheet in workbook:
        assert sheet.freeze_panes == "A2"
        assert sheet["A1"].font.bold
        assert sheet.column_dimensions["A"].width > 10
    assert workbook["Curve"]["B2"].number_format == "0.0000%"
    assert workbook["Liabilities"]["C2"].number_format == "#,##0.00"
    assert workbook["Basis"]["B2"].data_type == "s"
    assert workbook["Basis"]["B3"].number_format == "yyyy-mm-dd"


@pytest.mark.parametrize(
    ("book", "match"),
    [
        (_book(liabilities=FlowTable.build([" "], [1.0], [1.0])), "without a name"),
        (_book(liabilities=FlowTable.build(["a\x00"], [1.0], [1.0])), "as it is"),
        (_book(liabilities=FlowTable.build(["x" * 40_000], [1.0], [1.0])), "as it is"),
        (_book(basis=_basis(valuation_date=date(1899, 1, 1))), "no date before"),
        (_book(basis=_basis(liability_spread=float("nan"))), "no number that is nan"),
        (_book(basis=_basis(title="x" * 40_000)), "no text of 40,000"),
        (_book(run=Run(seed=2**60)), "no seed above"),
        (_book(notes=(Notes("Liabilities", ("amount",), ((None,), (None,))),)), "column of that name"),
        (_book(notes=(Notes("Liabilities", ("Note",), ((None,),)),)), "1 rows for 2"),
        (_book(notes=(Notes("Basis", ("Item", "Note"), (("Colour", "x"),)),)), "does not have"),
        (
            _book(notes=(Notes("Scenario set", ("Q5",), ()), Notes("Yield history", ("5 Y",), ()))),
            "column of",
        ),
        (_book(second_basis=_basis(currency="USD")), "currency of the first"),
        (_book(shocks=(Shock("a", ()), Shock("a", ()))), "name"),
        (_book(shock_settings=ShockSettings(sets=("a;b",))), "name of the set"),
        (_book(shocks=(Shock("a", (), source=" "),)), "source"),
        (_book(line_terms=(LineTerms(Side.ASSETS, "A", Indexation(lag=0.25)),)), "no lag"),
        (
            _book(yield_history=YieldHistory(np.zeros(0, "M8[D]"), np.array([2.0, 1.0]), np.zeros((0, 2)))),
            "rise",
        ),
        (_book(notes=(Notes("Else", ("Note",), ()),)), "no sheet 'Else'"),
        (
            _book(
                risky_assets=RiskyAssets(
                    ("rates",), np.ones(1), np.zeros(1), np.ones(1), np.zeros(1), np.eye(1), np.zeros(1)
                )
            ),
            "heading of that name",
        ),
    ],
    ids=lambda value: value if isinstance(value, str) else "",
)
def test_what_a_workbook_cannot_hold_is_refused_and_nothing_is_lost(
    book: Book, match: str, tmp_path: Path
) -> None:
    path = tmp_path / "book.xlsx"
    write_book(_book(), path)
    former = path.read_bytes()
    with pytest.raises(ValueError, match=match):
        write_book(book, path)
    assert path.read_bytes() == former
    assert list(tmp_path.iterdir()) == [path]


def test_a_book_without_liabilities_reads_in_again_with_a_word(tmp_path: Path) -> None:
    book = _book(liabilities=FlowTable.empty())
    reading = read_workbook(write_book(book, tmp_path / "book.xlsx"))
    assert reading.book == book
    assert [fault.severity for fault in reading.faults if fault.sheet == "Liabilities"] == [Severity.MILD]
