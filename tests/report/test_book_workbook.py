"""A book written as a workbook reads in again the same."""

from __future__ import annotations

from calendar import monthrange
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
    History,
    Holding,
    HoldingKind,
    Measure,
    ModelName,
    Notes,
    PriceKind,
    RatesModel,
    RiskyAssets,
    Run,
    Severity,
)
from desk.book.holding import SWAP_KINDS
from desk.book.run import MOST_PATHS
from desk.intake.layout import SHEETS, find_known, fold
from desk.intake.workbook import read_workbook
from desk.rates.compounding import Compounding
from desk.rates.curve import Interpolation
from desk.rates.day_count import TIME_COUNTS, DayCount, year_fraction
from desk.rates.smith_wilson import Extrapolation
from desk.report.book_workbook import write_book
from desk.report.safe_cells import clean_text

TODAY = date(2026, 9, 30)


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


names = st.one_of(
    st.text(min_size=1, max_size=20).filter(lambda text: bool(text.strip()) and clean_text(text) == text),
    st.sampled_from(
        ["=1+1", "+x", "-x", "@x", "#N/A", "_x0041_", " a ", "a\nb", "\u00e9\u4e2d\U0001f600", "12", "TRUE"]
    ),
)
amounts = st.floats(-1e15, 1e15)
rates = st.floats(-0.4, 0.9)
dates = st.dates(date(2026, 10, 1), date(2200, 12, 31))


@st.composite
def flow_tables(draw: st.DrawFn, day_count: DayCount, *, beta: bool) -> FlowTable:
    """Flows of which some state a date and some the years."""
    lines = draw(st.lists(names, min_size=1, max_size=6))
    days = [draw(st.one_of(st.none(), dates)) for _ in lines]
    stated = np.array(days, dtype="M8[D]")
    years = np.array([draw(st.floats(-3.0, 150.0)) for _ in lines])
    time = np.where(np.isnat(stated), years, year_fraction(np.datetime64(TODAY), stated, day_count))
    betas = [draw(st.one_of(st.just(0.0), st.floats(-2, 2))) for _ in lines] if beta else None
    return FlowTable.build(lines, time, [draw(amounts) for _ in lines], beta=betas, date=stated)


QUOTED = (HoldingKind.BOND, HoldingKind.ZERO, HoldingKind.FLOATER, HoldingKind.BILL)
WITH_COUPONS = (HoldingKind.BOND, HoldingKind.FLOATER, *SWAP_KINDS)
STATED = (HoldingKind.FUND, HoldingKind.PROPERTY)


def months_before(day: date, months: int) -> date:
    """A date some months earlier, month ends clipped."""
    year, month = divmod(day.year * 12 + day.month - 1 - months, 12)
    return date(year, month + 1, min(day.day, monthrange(year, month + 1)[1]))


@st.composite
def dated_terms(draw: st.DrawFn, kind: HoldingKind, frequency: int) -> dict[str, Any]:
    """Maturity, start, first coupon, ex-dividend days and amortisation of a kind that has a maturity."""
    maturity = draw(dates)
    start = draw(st.one_of(st.none(), st.dates(date(1990, 1, 1), date(2026, 9, 1))))
    first = None
    if kind in (HoldingKind.BOND, HoldingKind.FLOATER):
        apart = 12 // frequency * draw(st.integers(0, 8))
        first = draw(st.sampled_from([None, months_before(maturity, apart)]))
        if first is not None and first <= (start or first):
            first = None
    days = draw(st.integers(0, 25)) if kind in WITH_COUPONS else 0
    repaid = [Amortisation.BULLET]
    if kind in WITH_COUPONS:
        repaid.append(Amortisation.LEVEL)
    if kind is HoldingKind.BOND:
        repaid.append(Amortisation.ANNUITY)
    return {
        "maturity": maturity,
        "start_date": start,
        "first_coupon": first,
        "ex_dividend_days": days,
        "bought_ex_dividend": days > 0 and draw(st.booleans()),
        "amortisation": draw(st.sampled_from(repaid)),
    }


def maybe(strategy: st.SearchStrategy[Any]) -> st.SearchStrategy[Any]:
    """Nothing, or one of these."""
    return st.one_of(st.none(), strategy)


@st.composite
def holdings(draw: st.DrawFn) -> Holding:
    """A holding of any kind with anything that it may state."""
    kind = draw(st.sampled_from(HoldingKind))
    worth, rate, day_count = st.floats(1e-3, 1e12), st.floats(-0.05, 0.2), st.sampled_from(DayCount)
    frequency = draw(st.sampled_from([1, 2, 4, 12])) if kind in (*WITH_COUPONS, HoldingKind.ZERO) else 1
    terms: dict[str, Any] = {}
    if kind not in (HoldingKind.DEPOSIT, *STATED):
        terms = draw(dated_terms(kind, frequency))
    if kind in QUOTED:
        by_rate = kind is HoldingKind.BILL and draw(st.booleans())
        terms["discount_rate" if by_rate else "price"] = draw(maybe(st.floats(1e-3, 0.9)))
        terms["price_kind"] = draw(st.sampled_from(PriceKind))
    if kind in (*QUOTED, HoldingKind.TERM_DEPOSIT):
        terms["default_rate"] = draw(st.floats(0.0, 0.99))
        terms["recovery_rate"] = draw(st.floats(0.0, 1.0))
    if kind in (HoldingKind.FLOATER, *SWAP_KINDS):
        terms |= {"current_rate": draw(maybe(rate)), "margin": draw(rate)}
    if kind in SWAP_KINDS:
        terms["floating_frequency"] = draw(maybe(st.sampled_from([1, 2, 4, 12])))
        terms["floating_day_count"] = draw(maybe(day_count))
    pays_fixed = kind in (HoldingKind.BOND, *SWAP_KINDS) or terms.get("start_date") is not None
    return Holding(
        name=draw(names),
        kind=kind,
        nominal=0.0 if kind in STATED else draw(worth),
        coupon=draw(st.floats(0.0, 0.2)) if pays_fixed else 0.0,
        frequency=frequency,
        day_count=draw(maybe(day_count)),
        market_value=draw(worth if kind in STATED else maybe(worth)),
        units=draw(maybe(worth)),
        duration=draw(maybe(st.floats(0, 50))) if kind in STATED else None,
        **terms,
    )


@st.composite
def risky(draw: st.DrawFn) -> RiskyAssets:
    """Assets whose correlations hold together: those of one common driver."""
    own = names.filter(lambda name: find_known(name, SHEETS["Risky assets"].columns) is None)
    called = draw(st.lists(own, min_size=1, max_size=4, unique_by=fold))
    count = len(called)
    loading = np.array([draw(st.floats(-0.9, 0.9)) for _ in range(count + 1)])
    joint = np.outer(loading, loading)
    np.fill_diagonal(joint, 1.0)

    def column(low: float, high: float) -> Any:
        return np.array([draw(st.floats(low, high)) for _ in called])

    return RiskyAssets(
        tuple(called),
        column(0, 1e9),
        column(-0.1, 0.2),
        column(0, 0.9),
        column(0, 0.1),
        joint[1:, 1:],
        joint[0, 1:],
    )


@st.composite
def books(draw: st.DrawFn) -> Book:
    """A book with anything a workbook can hold."""
    day_count = draw(st.sampled_from(TIME_COUNTS))
    terms = sorted(draw(st.sets(st.floats(0.05, 100.0), min_size=1, max_size=8)))
    quotes = np.array([draw(st.floats(-0.02, 0.15)) for _ in terms])
    basis = Basis(
        valuation_date=TODAY,
        currency=draw(st.sampled_from(["EUR", "GBP", "USD"])),
        terms=np.array(terms),
        rates=quotes,
        compounding=draw(st.sampled_from(Compounding)),
        interpolation=draw(st.sampled_from([Interpolation.LOG_LINEAR, Interpolation.LINEAR_ZERO])),
        liability_spread=draw(rates),
        market_risk_premium=draw(rates),
        day_count=day_count,
        title=draw(st.one_of(st.just(""), names)),
        payments_per_year=draw(maybe(st.sampled_from([1, 2, 4, 12]))),
        last_liquid_point=draw(maybe(st.floats(terms[0], 100.0))),
    )
    liabilities = draw(flow_tables(day_count, beta=True))
    heading = names.map(str.strip).filter(
        lambda text: find_known(text, SHEETS["Liabilities"].columns) is None
    )
    headings = draw(st.lists(heading, max_size=2, unique_by=fold))
    note = st.one_of(st.none(), names, amounts)
    notes: tuple[Notes, ...] = ()
    if headings:
        rows = tuple(tuple(draw(note) for _ in headings) for _ in range(len(liabilities)))
        notes = (Notes("Liabilities", tuple(headings), rows),)
    model = st.builds(
        RatesModel,
        name=st.sampled_from([ModelName.HULL_WHITE, ModelName.HO_LEE]),
        mean_reversion=st.floats(0, 5),
        volatility=st.floats(0, 0.9),
        long_run_rate=st.one_of(st.none(), rates),
        risk_price=st.floats(-3, 3),
    )
    history_days = sorted(draw(st.sets(st.dates(date(1950, 1, 1), TODAY), max_size=4)))
    return Book(
        basis=basis,
        liabilities=liabilities,
        holdings=tuple(draw(st.lists(holdings(), max_size=4))),
        asset_flows=draw(st.one_of(st.just(FlowTable.empty()), flow_tables(day_count, beta=False))),
        rates_model=draw(st.one_of(st.none(), model)),
        risky_assets=draw(st.one_of(st.none(), risky())),
        run=Run(
            paths=draw(st.integers(1, MOST_PATHS)),
            horizon_years=draw(st.integers(1, 200)),
            steps_per_year=draw(st.integers(1, 366)),
            seed=draw(st.integers(0, 2**53)),
            measure=draw(st.sampled_from(Measure)),
            percentiles=tuple(sorted(draw(st.sets(st.floats(1e-3, 99.9), min_size=1, max_size=7)))),
        ),
        history=None
        if not history_days
        else History(np.array(history_days, "M8[D]"), np.array([draw(rates) for _ in history_days])),
        notes=notes,
    )


@pytest.mark.parametrize("kind", list(CurveKind))
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
    bill = Holding("Bill", HoldingKind.BILL, 7.0, maturity=date(2027, 1, 31), discount_rate=0.02)
    home = Holding("Home", HoldingKind.PROPERTY, market_value=9.0, duration=4.0)
    plain = Holding("Plain", HoldingKind.DEPOSIT)
    held = (swap, bond, bill, home)
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
