"""The report of books with every kind of curve, liability basis and indexation, and with two bases."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from openpyxl.utils import get_column_letter

from desk import tasks
from desk.book import Book, HoldingKind, Indexation, IndexationKind, LiabilityMethod, LineTerms, Side
from desk.report.results import bonds as bond_sheet
from desk.report.results import collars, flows
from desk.report.results import curve as curve_sheet
from desk.report.results.workbook import write_report
from desk.valuation.prices import holding_prices
from tests.report import examples
from tests.report.full_books import bonds, curve_bases, full_book, inflation
from tests.report.spreadsheet import Spreadsheet

MASTER = ("Summary", "B3")
SHEETS = [
    "Summary", "Basis and curve", "Curve by term", "Liability basis", "Expected inflation", "Line terms",
    "Liabilities", "Holdings", "Asset flows", "Standing", "Key rates", "Periods", "Inflation key rates",
    "Real periods", "Comparison", "Second basis", "Second curve by term", "Second liability basis",
    "Second liability bonds", "Second inflation", "Second liabilities", "Second asset flows", "Checks",
    "Faults", "Provenance",
]  # fmt: skip


@pytest.fixture(scope="module")
def report(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The report of a book that has everything."""
    book = full_book()
    path = tmp_path_factory.mktemp("report") / "report.xlsx"
    return write_report(examples.reading(book), tasks.value(book), None, path)


@pytest.fixture
def sheet(report: Path) -> Spreadsheet:
    """The report, opened."""
    return Spreadsheet(report)


def write(of: Book, path: Path) -> Spreadsheet:
    """The report of a book, opened."""
    return Spreadsheet(write_report(examples.reading(of), tasks.value(of), None, path))


def failed(sheet: Spreadsheet) -> list[tuple[str, str]]:
    """Where a formula fails or a check does not hold."""
    return [(name, at) for name, at, _ in sheet.formulas() if sheet.value(name, at) in ("CHECK", "#VALUE!")]


def place(sheet: Spreadsheet, name: str, heading: str, *, row: int = 4) -> str:
    """Letter of the column under a heading."""
    (place,) = [
        number
        for number, cell in enumerate(sheet.book[name][row], start=1)
        if str(cell.value).replace("\u00a0", " ") == heading
    ]
    return get_column_letter(place)


def find_row(sheet: Spreadsheet, name: str, label: str, *, column: int = 1) -> int:
    """The first row whose cell in a column holds `label`."""
    for row in sheet.book[name].iter_rows(min_col=column, max_col=column):
        if row[0].value == label:
            return int(row[0].row or 0)
    raise AssertionError(f"{label} is not on {name}")


def test_everything_is_recomputed(sheet: Spreadsheet) -> None:
    assert sheet.book.sheetnames == SHEETS
    assert failed(sheet) == []
    assert sheet.value(*MASTER) == "OK"
    labels = {row[0].value for row in sheet.book["Checks"].iter_rows(min_row=7)}
    for side in ("Assets", "Liabilities"):
        for figure in ("inflation DV01", "inflation duration"):
            assert f"{side}: {figure}" in labels
        assert f"Second basis: {side.lower()}: present value" in labels
        assert f"Second basis: {side.lower()}: inflation DV01" in labels


def test_amounts_are_those_in_todays_money_times_their_growth(sheet: Spreadsheet) -> None:
    """A formula in each row, from terms that stand on the sheet of inflation."""
    book = full_book()
    letters = {
        key: place(sheet, "Liabilities", heading)
        for key, heading in (
            ("real", "Amount in today's money [EUR]"),
            ("growth", "Growth until paid"),
            ("paid", "Paid, in today's money [EUR]"),
        )
    }
    curve = book.basis.inflation
    assert curve is not None
    for number in range(len(book.liabilities)):
        row, time = 5 + number, float(book.liabilities.time[number])
        assert (
            sheet.book["Liabilities"][f"G{row}"].value == f"={letters['real']}{row}*{letters['growth']}{row}"
        )
        assert sheet.book["Liabilities"][f"{letters['real']}{row}"].value == book.liabilities.amount[number]
        amount = sheet.value("Liabilities", f"G{row}")
        deflated = amount * float(curve.curve.discount(time))
        assert sheet.value("Liabilities", f"{letters['paid']}{row}") == pytest.approx(deflated, rel=1e-12)
        if book.liabilities.line_names[book.liabilities.line[number]] == "Rising":
            assert amount / book.liabilities.amount[number] == pytest.approx(1.015**time, rel=1e-12)


def changed(sheet: Spreadsheet, name: str, address: str, by: float = 1e-5) -> None:
    """Change a number by a part of itself."""
    cell: Any = sheet.book[name][address]
    assert isinstance(cell.value, int | float), (name, address, cell.value)
    assert cell.value
    cell.value = cell.value * (1.0 + by)


@pytest.mark.parametrize(
    ("name", "label", "column", "letter"),
    [
        ("Expected inflation", "Volatility", 10, "K"),
        ("Expected inflation", "Recent inflation", 10, "K"),
        ("Expected inflation", "collared", 2, "E"),
        ("Expected inflation", "rising", 2, "C"),
        ("Liability basis", "Term [years]", 1, "B"),
        ("Line terms", "Own spread", 2, "I"),
        ("Line terms", "Own rate", 2, "J"),
        ("Basis and curve", "Liability spread", 1, "B"),
        ("Basis and curve", "Market risk premium", 1, "B"),
        ("Second basis", "Liability spread", 1, "B"),
        ("Second liability bonds", "Bond 3", 1, "N"),
        ("Second curve by term", "Beta 3: second curvature [a year]", 12, "M"),
        ("Comparison", "Surplus", 1, "E"),
        ("Comparison", "Assets: inflation duration", 1, "D"),
        ("Standing", "Collared", 1, "U"),
    ],
)
def test_a_changed_input_or_figure_is_caught(
    sheet: Spreadsheet, name: str, label: str, column: int, letter: str
) -> None:
    """What is stated takes part in the formulas: a part in a hundred thousand turns the workbook's check."""
    row = find_row(sheet, name, label, column=column)
    if label == "Term [years]":
        row += 2
    if label == "collared":
        row = next(at for at in range(row, row + 9) if sheet.book[name][f"{letter}{at}"].value)
    changed(sheet, name, f"{letter}{row}")
    assert sheet.value(*MASTER) == "CHECK"


@pytest.mark.parametrize(
    ("name", "address", "own"),
    [
        ("Expected inflation", "E6", "H6"),
        ("Second liability bonds", "J8", "Q8"),
        ("Second curve by term", "B20", "H20"),
        ("Real periods", "E9", "K9"),
        ("Comparison", "C6", "I6"),
    ],
)
def test_a_wrong_figure_turns_the_check_of_its_row(
    sheet: Spreadsheet, name: str, address: str, own: str
) -> None:
    assert sheet.value(name, own) == "OK"
    fresh = _fresh(sheet)
    changed(fresh, name, address)
    assert fresh.value(name, own) == "CHECK"


def _fresh(sheet: Spreadsheet) -> Spreadsheet:
    """The same workbook with nothing evaluated yet."""
    sheet._known.clear()
    sheet._areas.clear()
    return sheet


def test_key_rates_of_inflation_are_recomputed_where_nothing_is_held_between_bounds(tmp_path: Path) -> None:
    book = full_book()
    linked = Indexation(IndexationKind.LINKED, lag=0.25)
    terms = (LineTerms(Side.LIABILITIES, "Pensions", linked), LineTerms(Side.ASSETS, "Lease", linked))
    holdings = tuple(replace(holding, has_principal_floor=False) for holding in book.holdings)
    plain = replace(book, line_terms=terms, holdings=holdings, second_basis=None)
    sheet = write(plain, tmp_path / "report.xlsx")
    assert failed(sheet) == []
    assert sheet.value("Inflation key rates", "M10") == "OK"
    found = tasks.value(plain).inflation
    assert found is not None
    assert sheet.value("Inflation key rates", "I12") == pytest.approx(found.key_dv01_assets[7], rel=1e-9)
    fresh = _fresh(sheet)
    changed(fresh, "Inflation key rates", "E12")
    assert fresh.value("Inflation key rates", "M12") == "CHECK"


@pytest.mark.parametrize("kind", sorted(curve_bases()))
def test_any_curve_is_recomputed(tmp_path: Path, kind: str) -> None:
    """Formulas from their parameters, bonds repriced from their payments."""
    basis = curve_bases()[kind]
    book = replace(examples.book(), rates_model=None, basis=basis)
    sheet = write(book, tmp_path / "report.xlsx")
    assert failed(sheet) == []
    assert sheet.value(*MASTER) == "OK"
    is_formula = "exact" not in kind
    for at in (10, 60):
        formula = sheet.value("Curve by term", f"I{at}")
        if is_formula:
            assert formula == pytest.approx(float(basis.curve.zero((at - 5) / 2.0)), rel=1e-12)
        else:
            assert formula is None
    fit = basis.curve_fit
    assert ("Curve bonds" in sheet.book.sheetnames) == (fit is not None)
    if fit is not None:
        residuals = [sheet.value("Curve bonds", f"O{5 + row}") for row in range(len(fit.residual_bp))]
        np.testing.assert_allclose(np.array(residuals, float), fit.residual_bp, atol=1e-8)
        used = [sheet.book["Curve bonds"][f"H{5 + row}"].value == "yes" for row in range(len(residuals))]
        assert used == fit.is_used.tolist()


@pytest.mark.parametrize("method", list(LiabilityMethod))
def test_any_liability_basis_is_recomputed(tmp_path: Path, method: LiabilityMethod) -> None:
    """The spread of every row of the liabilities follows from what the basis states."""
    book = replace(full_book(), second_basis=None)
    basis = replace(book.basis, liability_method=method, liability_bonds=bonds(10), expected_return=0.041)
    if method is LiabilityMethod.TERM_SPREADS:
        basis = replace(basis, liability_terms=np.array([4.0]), liability_spreads=np.array([0.005]))
    book = replace(book, basis=basis)
    sheet = write(book, tmp_path / "report.xlsx")
    assert failed(sheet) == []
    assert ("Liability basis" in sheet.book.sheetnames) == (method is not LiabilityMethod.CURVE)
    assert sheet.book["Liabilities"]["I5"].data_type == "f"
    if method is not LiabilityMethod.CURVE:
        row = find_row(sheet, "Liability basis", "Single equivalent rate, recomputed")
        assert sheet.value("Liability basis", f"B{row}") == pytest.approx(
            tasks.value(book).liabilities.equivalent_rate, rel=1e-10
        )


def test_linked_bonds_show_their_terms_and_real_prices(sheet: Spreadsheet) -> None:
    book = full_book()
    prices = holding_prices(book)
    letters = [
        place(sheet, "Holdings", heading)
        for heading in (
            "Index ratio", "Index lag [months]", "Principal floor", "Clean price in real terms [per 100]",
            "Real yield [a year]",
        )
    ]  # fmt: skip
    for number, (holding, price) in enumerate(zip(book.holdings, prices, strict=True)):
        cells = [sheet.book["Holdings"][f"{letter}{5 + number}"].value for letter in letters]
        if holding.kind is HoldingKind.LINKED_BOND:
            floor = "yes" if holding.has_principal_floor else "no"
            wanted = [
                holding.index_ratio,
                holding.index_lag_months,
                floor,
                price.clean_price,
                price.real_yield,
            ]
            assert cells == wanted
        else:
            assert cells == [None] * 5
    assert prices[5].clean_price == pytest.approx(97.5)


def test_what_is_too_much_to_recompute_is_said(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Values in the place of formulas, and the rest still agrees."""
    monkeypatch.setattr(collars, "COLLAR_ROWS", 10)
    monkeypatch.setattr(bond_sheet, "BOND_WORK", 10)
    monkeypatch.setattr(curve_sheet, "WILSON_WORK", 10)
    sheet = write(full_book(), tmp_path / "report.xlsx")
    assert failed(sheet) == []
    assert sheet.value(*MASTER) == "OK"
    told = " ".join(str(row[0].value) for row in sheet.book["Checks"].iter_rows(min_row=7))
    assert "too many years" in told
    assert "too many payments" in told
    monkeypatch.setattr(flows, "ROW_CAP", 20)
    monkeypatch.setattr("desk.report.results.position.ROW_CAP", 20)
    summed = write(full_book(), tmp_path / "summed.xlsx")
    assert failed(summed) == []
    assert summed.value(*MASTER) == "OK"
    assert "Real periods" not in summed.book.sheetnames


def test_a_second_basis_that_gives_no_curve_is_said_and_the_first_is_reported(tmp_path: Path) -> None:
    book = full_book()
    assert book.second_basis is not None
    broken = replace(book, second_basis=replace(book.second_basis, parameters=None))
    sheet = write(broken, tmp_path / "report.xlsx")
    assert sheet.value(*MASTER) == "OK"
    assert "parameters" in str(sheet.book["Comparison"]["A5"].value)
    assert "Second liabilities" not in sheet.book.sheetnames


@pytest.mark.parametrize("volatility", [0.0, 1e-9, 0.2])
def test_inflation_at_a_floor_is_no_false_alarm(tmp_path: Path, volatility: float) -> None:
    """Without deviation the slope jumps where the floor is met: it is then left out and said so."""
    book = full_book()
    flat = replace(
        inflation(volatility=volatility, recent=None), terms=np.array([1.0]), rates=np.array([0.02])
    )
    held = Indexation(IndexationKind.COLLARED, floor=0.02, cap=0.02 if volatility == 0.2 else 0.04)
    terms = (LineTerms(Side.LIABILITIES, "Pensions", held),)
    book = replace(book, basis=replace(book.basis, inflation=flat), line_terms=terms, second_basis=None)
    sheet = write(book, tmp_path / "report.xlsx")
    assert failed(sheet) == []
    told = " ".join(str(row[0].value) for row in sheet.book["Checks"].iter_rows(min_row=7))
    assert ("durations are not recomputed" in told) == (volatility < 0.1)


def test_only_fixed_rises_without_expected_inflation(tmp_path: Path) -> None:
    book = full_book()
    terms = (LineTerms(Side.LIABILITIES, "Rising", Indexation(IndexationKind.RISING, rise=0.015)),)
    book = replace(
        book,
        basis=replace(book.basis, inflation=None),
        holdings=examples.book().holdings,
        line_terms=terms,
        second_basis=None,
    )
    sheet = write(book, tmp_path / "report.xlsx")
    assert failed(sheet) == []
    assert "Inflation key rates" not in sheet.book.sheetnames
    assert sheet.book["Expected inflation"]["B5"].value == "rising"
    changed(_fresh(sheet), "Expected inflation", "C5")
    assert sheet.value(*MASTER) == "CHECK"
