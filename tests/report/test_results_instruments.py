"""The report of a book with every kind of holding: floating, amortising, defaultable and swapped."""

from __future__ import annotations

from dataclasses import replace
from datetime import date
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from desk import tasks
from desk.book import Amortisation, Book, Holding, HoldingKind, PriceKind, Side
from desk.report.results import flows
from desk.report.results.workbook import write_report
from desk.valuation.detail import line_flows
from tests.report import examples
from tests.report.spreadsheet import Spreadsheet

MASTER = ("Summary", "B3")
END = date(2036, 5, 31)
SWAP = Holding("Swap", HoldingKind.PAYER_SWAP, 8e6, 0.045, 1, END, floating_frequency=4, current_rate=0.021)
HOLDINGS = (
    Holding("Floater", HoldingKind.FLOATER, 5e6, 0.0, 4, END, current_rate=0.023, margin=0.002, price=99.0),
    SWAP,
    replace(SWAP, name="Received", kind=HoldingKind.RECEIVER_SWAP, start_date=date(2028, 1, 15)),
    Holding(
        "Annuity", HoldingKind.BOND, 4e6, 0.03, 2, END, amortisation=Amortisation.ANNUITY, price=101.0,
        price_kind=PriceKind.DIRTY,
    ),
    Holding(
        "Risky", HoldingKind.BOND, 3e6, 0.06, 1, END, market_value=2.9e6, default_rate=0.02, recovery_rate=0.4
    ),
    Holding("Bill", HoldingKind.BILL, 1e6, maturity=date(2026, 9, 30), discount_rate=0.021),
    Holding(
        "Term", HoldingKind.TERM_DEPOSIT, 1e6, 0.02, maturity=date(2026, 12, 31),
        start_date=date(2025, 12, 31),
    ),
    Holding("Offices", HoldingKind.PROPERTY, market_value=2e6, duration=7.0),
)  # fmt: skip


def held(*holdings: Holding) -> Book:
    """The example with these holdings."""
    return replace(examples.book(), holdings=holdings)


def write(of: Book, path: Path) -> Spreadsheet:
    """The report of a book, opened; without a simulation."""
    return Spreadsheet(write_report(examples.reading(of), tasks.value(of), None, path))


def words(sheet: Spreadsheet) -> dict[tuple[str, str], Any]:
    """The value of every formula."""
    return {(name, at): sheet.value(name, at) for name, at, _ in sheet.formulas()}


def column(sheet: Spreadsheet, name: str, heading: str) -> dict[str, Any]:
    """The cells under a heading by the first cell of their row."""
    page: Any = sheet.book[name]
    (place,) = [cell.column for cell in page[4] if str(cell.value).replace("\u00a0", " ") == heading]
    return {str(row[0].value): row[place - 1].value for row in page.iter_rows(min_row=5)}


@pytest.fixture(scope="module")
def report(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The report of all of them."""
    path = tmp_path_factory.mktemp("report") / "report.xlsx"
    book = held(*HOLDINGS)
    return write_report(examples.reading(book), tasks.value(book), None, path)


def test_every_kind_of_holding_is_recomputed(report: Path) -> None:
    sheet = Spreadsheet(report)
    failed = {place: value for place, value in words(sheet).items() if value in ("CHECK", "#VALUE!")}
    assert not failed
    assert sheet.value(*MASTER) == "OK"


def test_what_is_paid_stands_beside_what_is_discounted(report: Path) -> None:
    """Years show payments, values the amounts that replicate them; a wrong payment is caught."""
    book, sheet = held(*HOLDINGS), Spreadsheet(report)
    standing = tasks.value(book)
    paid = [
        line_flows(book, Side.ASSETS, number).amount.sum()
        for number, holding in enumerate(HOLDINGS)
        if holding.kind is not HoldingKind.PROPERTY
    ]
    lease = examples.book().asset_flows.amount.sum()
    assert standing.periods.assets.sum() == pytest.approx(float(np.sum(paid)) + lease, rel=1e-12)
    page: Any = sheet.book["Asset flows"]
    assert page["P4"].value == "Paid, as projected [EUR]"
    rows = [row for row in page.iter_rows(min_row=5) if row[0].value == "Floater" and row[5].value == 1]
    (cell,) = [row[15] for row in rows if row[15].value and 4.5 < row[3].value < 4.8][:1]
    cell.value += 100.0
    found = words(sheet)
    assert sheet.value(*MASTER) == "CHECK"
    assert found["Periods", "K9"] == "CHECK"
    assert found["Periods", "K8"] == "OK"


def test_a_book_of_fixed_payments_has_no_such_column(tmp_path: Path) -> None:
    sheet = write(examples.book(), tmp_path / "report.xlsx")
    assert sheet.book["Asset flows"]["P4"].value is None
    assert sheet.value(*MASTER) == "OK"


def test_a_wrong_value_of_a_swap_is_caught(report: Path) -> None:
    sheet = Spreadsheet(report)
    for name, heading in (("Standing", "Present value, reported [EUR]"), ("Holdings", "Check")):
        assert column(sheet, name, heading)["Swap"]
    cell = next(row[12] for row in sheet.book["Holdings"].iter_rows(min_row=5) if row[0].value == "Swap")
    assert isinstance(cell.value, float)
    assert cell.value < 0.0
    cell.value *= 1.00001
    assert sheet.value("Holdings", f"P{cell.row}") == "CHECK"


@pytest.mark.parametrize("away", [0.0, 1e-12, 1e-6])
def test_a_swap_that_is_worth_next_to_nothing_is_no_false_alarm(away: float, tmp_path: Path) -> None:
    """Legs of hundreds of millions that cancel to less than their own rounding, or nearly."""
    swap = replace(SWAP, nominal=8e8)
    low, high = 0.0, 0.1
    for _ in range(60):
        middle = 0.5 * (low + high)
        worth = tasks.value(held(replace(swap, coupon=middle))).lines[0].measures.present_value
        low, high = (middle, high) if worth > 0.0 else (low, middle)
    book = held(replace(swap, coupon=low + away), *HOLDINGS)
    assert abs(tasks.value(book).lines[0].measures.present_value) < 1e-5 * swap.nominal
    sheet = write(book, tmp_path / "report.xlsx")
    assert not [place for place, value in words(sheet).items() if value in ("CHECK", "#VALUE!")]
    assert sheet.value(*MASTER) == "OK"


def test_holdings_show_their_terms_and_what_default_takes(report: Path) -> None:
    sheet, standing = Spreadsheet(report), tasks.value(held(*HOLDINGS))
    lines = {line.line: line for line in standing.lines}
    durations = column(sheet, "Holdings", "Spread duration [years]")
    losses = column(sheet, "Holdings", "Expected credit loss [EUR]")
    values = column(sheet, "Holdings", "Market value [EUR]")
    for holding in HOLDINGS:
        line = lines[holding.name]
        assert durations[holding.name] == line.spread_duration
        assert losses[holding.name] == line.expected_credit_loss
        assert values[holding.name] == line.market_value
    assert losses["Risky"] > 0.0
    assert durations["Floater"] > 5.0 > 1.0 > lines["Floater"].measures.effective_duration
    assert column(sheet, "Holdings", "Price [per 100 of nominal]")["Annuity"] == 101.0
    assert column(sheet, "Holdings", "Amortisation")["Annuity"] == "annuity"
    assert column(sheet, "Holdings", "Kind")["Received"] == "receiver swap"
    assert column(sheet, "Holdings", "Default rate [a year]")["Risky"] == 0.02
    headings = {cell.value for cell in sheet.book["Holdings"][4]}
    assert "First coupon" not in headings


def test_sums_by_year_show_what_is_paid_too(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(flows, "ROW_CAP", 20)
    sheet = write(held(*HOLDINGS), tmp_path / "report.xlsx")
    assert sheet.value(*MASTER) == "OK"
    assert sheet.book["Asset flows"]["P4"].value == "Paid, as projected [EUR]"
