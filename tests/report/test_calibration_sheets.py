"""The sheets of fitted models, recomputed by a spreadsheet written apart from the program."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from desk.book import Book, Fault, ModelName, RatesModel
from desk.book.model import History
from desk.intake.records import Reading
from desk.report.results.workbook import write_report
from desk.scenarios.calibration import calibrations
from desk.valuation.standing import stand
from tests.report.spreadsheet import FUNCTION_CALL, FUNCTION_NAMES, Spreadsheet
from tests.scenarios.fitted_books import bare_book, history, with_all

SHEETS = ("Model fit history", "Model fit volatilities", "Model fit yields")


def report_of(book: Book, path: Path) -> Spreadsheet:
    reading = Reading(Path("fund.xlsx"), "ab" * 32, book, (), ())
    write_report(reading, stand(book), None, path, fits=calibrations(book))
    return Spreadsheet(path)


def checks(sheet: Spreadsheet) -> dict[str, tuple[float, float, str]]:
    """Reported, recomputed and the word of every check of the sheets of fits."""
    found = {}
    for row in range(7, sheet.book["Checks"].max_row + 1):
        if sheet.value("Checks", f"B{row}") in SHEETS:
            cells = (sheet.value("Checks", f"{letter}{row}") for letter in "DEH")
            reported, recomputed, word = cells
            found[str(sheet.value("Checks", f"A{row}"))] = (reported, recomputed, word)
    return found


@pytest.fixture(scope="module")
def written(tmp_path_factory: pytest.TempPathFactory) -> Spreadsheet:
    return report_of(with_all(), tmp_path_factory.mktemp("fits") / "report.xlsx")


def test_every_check_of_the_fits_holds(written: Spreadsheet) -> None:
    found = checks(written)
    assert {word for _, _, word in found.values()} == {"OK"}
    for name in (
        "History: long run rate",
        "History: volatility",
        "History: log likelihood",
        "History, by regression: mean reversion",
        "History, by regression: long run rate",
        "History, by regression: volatility",
        "Residuals of the history, by step",
        "Residuals of the volatilities, by quote",
        "Prices at the quoted volatilities",
        "Yields at 5 years: residual, root mean square",
    ):
        reported, recomputed, _ = found[name]
        assert recomputed == pytest.approx(reported, rel=1e-9, abs=1e-12)


def test_the_sheets_use_plain_functions_and_give_no_errors(written: Spreadsheet) -> None:
    for sheet, address, formula in written.formulas():
        if sheet in SHEETS:
            assert set(FUNCTION_CALL.findall(formula)) <= FUNCTION_NAMES
            assert not str(written.value(sheet, address)).startswith("#")


def test_a_wrong_estimate_is_found_out(tmp_path: Path) -> None:
    book = replace(bare_book(), history=history(weeks=200))
    sheet = report_of(book, tmp_path / "report.xlsx")
    cell = sheet.book["Model fit history"]["C6"]
    assert sheet.book["Model fit history"]["A6"].value == "Long-run rate"
    cell.value *= 1.0001
    found = checks(sheet)
    assert found["Residuals of the history, by step"][2] == "CHECK"
    assert found["History: log likelihood"][2] == "CHECK"


def test_a_square_root_model_has_forecasts_recomputed(tmp_path: Path) -> None:
    book = replace(
        bare_book(),
        history=replace(history(weeks=200), rate=history(weeks=200).rate + 0.02),
        rates_model=RatesModel(ModelName.CIR, 0.1, 0.05, 0.02, 0.02),
    )
    found = checks(report_of(book, tmp_path / "report.xlsx"))
    assert found == {"Forecasts and deviations of the history, by step": (0, 0, "OK")}


def test_dates_a_month_apart_are_no_equal_steps(tmp_path: Path) -> None:
    """Then the regression is shown for comparison, and checks nothing."""
    months = np.arange("2021-01", "2027-01", dtype="datetime64[M]").astype("datetime64[D]")
    book = replace(bare_book(), history=History(months, history(weeks=months.size, step_days=30).rate))
    sheet = report_of(book, tmp_path / "report.xlsx")
    found = checks(sheet)
    assert found["History: volatility"][2] == "OK"
    assert not any("regression" in name for name in found)
    slope = sheet.value("Model fit history", "K5")
    rate = book.history.rate if book.history is not None else np.empty(0)
    assert slope == pytest.approx(np.polyfit(rate[:-1], rate[1:], 1)[0])


def test_a_daily_history_that_hardly_reverts_still_checks(tmp_path: Path) -> None:
    """The mean reversion of a step is small: differences in the sheet must not lose their figures."""
    generator = np.random.default_rng(8)
    rate = 0.03 + np.cumsum(generator.normal(0.0, 1e-5, 900)) * 0.999
    day = np.datetime64("2028-01-01") + np.arange(900)
    sheet = report_of(replace(bare_book(), history=History(day, rate)), tmp_path / "report.xlsx")
    words = {name: word for name, (_, _, word) in checks(sheet).items()}
    assert set(words.values()) <= {"OK"}


def test_no_mean_reversion_leaves_values_only(tmp_path: Path) -> None:
    day = np.datetime64("2021-01-04") + 7 * np.arange(80)
    rising = History(day, 0.01 + 0.001 * np.arange(80) + 1e-5 * np.cos(np.arange(80.0)))
    sheet = report_of(replace(bare_book(), history=rising), tmp_path / "report.xlsx")
    assert checks(sheet) == {}
    assert "no mean reversion" in str(sheet.value("Model fit history", "A2"))


def test_what_cannot_be_fitted_is_told(tmp_path: Path) -> None:
    book = replace(bare_book(), history=history(weeks=4))
    sheet = report_of(book, tmp_path / "report.xlsx")
    assert sheet.value("Model fit refused", "A5") == "History"
    assert "too short" in str(sheet.value("Model fit refused", "B5"))
    assert not set(SHEETS) & set(sheet.book.sheetnames)


def test_text_of_a_fault_is_no_formula(tmp_path: Path) -> None:
    book = bare_book()
    reading = Reading(Path("fund.xlsx"), "ab" * 32, book, (), ())
    path = tmp_path / "report.xlsx"
    write_report(reading, stand(book), None, path, fits=((), (Fault("=1+1", "x", "y", "=2"),)))
    sheet = Spreadsheet(path)
    assert sheet.book["Model fit refused"]["A5"].data_type == "s"
    assert sheet.book["Model fit refused"]["B5"].data_type == "s"


def test_a_book_without_data_has_no_such_sheets(tmp_path: Path) -> None:
    sheet = report_of(bare_book(), tmp_path / "report.xlsx")
    assert not [name for name in sheet.book.sheetnames if name.startswith("Model fit")]
