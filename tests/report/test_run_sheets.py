"""The sheets of a run: its own figures, recomputed where a spreadsheet can, and a wrong one is caught."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from desk import tasks
from desk.book import Measure
from desk.report.results import runs_market
from desk.report.results.workbook import write_report
from desk.report.scenario_wording import MEASURE_USES, OUTSIDE_SET
from desk.scenarios.records import NodeSummary
from tests.report import examples
from tests.report.run_books import ASSETS, ODD, WHOLE, book_of, simulation_of
from tests.report.spreadsheet import FUNCTION_CALL, FUNCTION_NAMES, Spreadsheet

MASTER = ("Summary", "B3")


@pytest.fixture(scope="module")
def written(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    """Reports that have been written, by the name of the book."""
    folder = tmp_path_factory.mktemp("runs")
    return {"folder": folder}


def opened(written: dict[str, Path], name: str) -> Spreadsheet:
    """The report of a book, opened afresh."""
    if name not in written:
        book = book_of(name)
        path = written["folder"] / f"{name}.xlsx"
        write_report(examples.reading(book), tasks.value(book), simulation_of(name), path)
        written[name] = path
    return Spreadsheet(written[name])


def column(sheet: Spreadsheet, name: str, heading: str, *, after: str = "") -> list[Any]:
    """The cells below a heading: the first one, or the first below a title."""
    page = sheet.book[name]
    seen = not after
    for row in page.iter_rows():
        for cell in row:
            if not seen and str(cell.value).startswith(after):
                seen = True
            if seen and str(cell.value).replace("\u00a0", " ") == heading:
                found = []
                at = int(cell.row or 0) + 1
                while (value := page.cell(at, int(cell.column or 0)).value) is not None:
                    found.append(value)
                    at += 1
                return found
    raise AssertionError(f"{heading!r} is not on {name}")


def same(found: list[Any], wanted: np.ndarray) -> None:
    """The very figures, and ``n/a`` where there is none."""
    assert len(found) >= wanted.size
    for cell, value in zip(found, wanted.tolist(), strict=False):
        assert cell == (value if np.isfinite(value) else "n/a")


def same_summary(sheet: Spreadsheet, name: str, summary: NodeSummary) -> None:
    """A quantity by year, with errors, intervals and tails."""
    same(column(sheet, name, "Year"), summary.year)
    same(column(sheet, name, "Mean"), summary.mean)
    same(column(sheet, name, "Mean, standard error"), summary.mean_se)
    same(column(sheet, name, "Standard deviation"), summary.sd)
    same(column(sheet, name, "Standard deviation, standard error"), summary.sd_se)
    for place, level in enumerate(summary.levels):
        same(column(sheet, name, f"{level:g} %"), summary.percentile[:, place])
        errors = column(sheet, name, f"{level:g} %", after="Standard errors of the percentiles")
        same(errors, summary.percentile_se[:, place])
        same(column(sheet, name, f"{level:g} %, from"), summary.percentile_low[:, place])
        same(column(sheet, name, f"{level:g} %, to"), summary.percentile_high[:, place])
        beyond = f"At and {'below' if level < 50 else 'above'} {level:g} %"
        same(column(sheet, name, beyond), summary.tail_mean[:, place])
        same(column(sheet, name, f"{level:g} %, standard error"), summary.tail_mean_se[:, place])


def change(sheet: Spreadsheet, page: str, address: str) -> None:
    """One part in ten thousand more, or one more where something is counted or nothing stands."""
    cell = sheet.book[page][address]
    assert isinstance(cell.value, int | float)
    is_count = isinstance(cell.value, int) or not cell.value
    cell.value = cell.value + 1 if is_count else cell.value * 1.0001


@pytest.mark.parametrize("name", [*WHOLE, *ODD])
def test_every_formula_agrees(written: dict[str, Path], name: str) -> None:
    """No check fails, no formula fails, whatever was drawn; and formulas stay plain."""
    sheet = opened(written, name)
    for page, at, text in sheet.formulas():
        assert sheet.value(page, at) not in ("CHECK", "#VALUE!"), (page, at, text)
        called = FUNCTION_CALL.findall(text)
        assert set(called) <= FUNCTION_NAMES
        assert called.count("IF") <= 1
        assert len(text) < 220
    assert sheet.value(*MASTER) == "OK"


@pytest.mark.parametrize("name", WHOLE)
def test_figures_are_those_of_the_run(written: dict[str, Path], name: str) -> None:
    """Bit for bit, sheet by sheet."""
    sheet, run = opened(written, name), simulation_of(name)
    same_summary(sheet, "Savings account", run.savings_account)
    same_summary(sheet, "Short rate", run.short_rate)
    same(column(sheet, "Savings account", "Mean", after="Mean of 1/R"), run.repricing.mean_discount)
    same(column(sheet, "Savings account", "Expected"), run.repricing.expected_discount)
    same(column(sheet, "Savings account", "Discount factor of the curve"), run.repricing.curve_discount)
    laws = [("Savings account", run.closed_form)]
    if run.risky is not None:
        for number, asset in enumerate(run.risky.assets, start=1):
            page = f"Risky asset {number}"
            same_summary(sheet, page, asset.total_return)
            same(column(sheet, page, "Mean", after="Mean of "), asset.mean_excess)
            same(column(sheet, page, "Mean, standard error", after="Mean of "), asset.mean_excess_se)
            same(column(sheet, page, "Expected"), asset.expected_excess)
            laws.append((page, asset.closed_form))
        total = run.risky.total
        same(column(sheet, "Risky assets", "Mean [EUR]"), total.mean)
        same(column(sheet, "Risky assets", "95 % [EUR]"), total.percentile[:, total.levels.index(95.0)])
        same(column(sheet, "Risky assets", "=Equity", after="Covariance")[:2], run.risky.covariance[:, 0])
    if run.index is not None:
        same_summary(sheet, "Price index", run.index.index)
        same(column(sheet, "Price index", "Expected"), run.index.expected_discounted)
        same(column(sheet, "Price index", "Index expected today"), run.index.expected_index)
        laws.append(("Price index", run.index.closed_form))
    for page, law in laws:
        if law is None:
            continue
        same(column(sheet, page, "Mean", after="Closed form"), law.mean)
        same(column(sheet, page, "Standard deviation", after="Closed form"), law.sd)
        same(column(sheet, page, "5 %", after="Closed form"), law.percentile[:, 1])
        same(column(sheet, page, "At and above 95 %", after="Closed form"), law.tail_mean[:, 5])


@pytest.mark.parametrize("name", WHOLE)
def test_values_convergence_and_gains_are_those_of_the_run(written: dict[str, Path], name: str) -> None:
    sheet, run = opened(written, name), simulation_of(name)
    rows = {str(row[0].value): row for row in sheet.book["Present values"].iter_rows(min_row=5)}
    for number, side in enumerate(run.present_value):
        at = 2 + 3 * number
        for label, value in (
            ("Mean", side.mean),
            ("Standard error of the mean", side.se),
            ("Standard deviation", side.sd),
            ("Percentile 5 %", side.percentile[1]),
            ("Mean at and below 5 %", side.tail_mean[1]),
            ("Mean at and above 99 %", side.tail_mean[6]),
            ("On the model's curve", side.curve),
            ("Share of paths below 0", side.below_zero),
        ):
            assert rows[label][at].value == float(value)
        assert rows["Percentile 5 %"][at + 1].value == side.percentile_low[1]
        errors = [row[at].value for row in sheet.book["Present values"].iter_rows(min_row=5, max_row=40)
                  if row[0].value == "   its standard error"]  # fmt: skip
        same(errors, np.concatenate((side.percentile_se, side.tail_mean_se)))
    told = list(sheet.book["Convergence"].iter_rows(min_row=5, max_col=7, values_only=True))
    at = 0
    for found in run.convergence:
        for place, paths in enumerate(found.paths.tolist()):
            assert str(told[at][0]).lower() == found.figure.lower()
            assert told[at][2] == paths
            assert told[at][3] == found.value[place]
            at += 1
    if run.gains:
        cells = list(sheet.book["Sampling gains"].iter_rows(min_row=5, max_col=4, values_only=True))
        for gain, cell in zip(run.gains, cells, strict=False):
            wanted = gain.gain if np.isfinite(gain.gain) else "no error left"
            assert cell[1:] == (gain.plain_se, gain.se, wanted)
    else:
        assert "Sampling gains" not in sheet.book.sheetnames


@pytest.mark.parametrize(
    ("page", "title", "heading", "year"),
    [
        ("Savings account", "Mean of 1/R", "Mean", 4),
        ("Savings account", "Mean of 1/R", "Expected", 4),
        ("Savings account", "Closed form", "Mean", 6),
        ("Savings account", "Closed form", "Standard deviation", 6),
        ("Savings account", "Closed form", "95 %", 6),
        ("Savings account", "Closed form", "At and below 5 %", 6),
        ("Savings account", "Closed form", "Mean of ln R", 6),
        ("Savings account", "Closed form", "Variance of ln R", 6),
        ("Risky asset 1", "Mean of ", "Mean", 5),
        ("Risky asset 2", "Mean of ", "Expected", 5),
        ("Risky asset 2", "Closed form", "At and above 75 %", 5),
        ("Price index", "Mean of ", "Mean", 7),
        ("Price index", "Closed form", "1 %", 7),
        ("Risky assets", "", "Volatility, stated [a year]", 0),
        ("Risky assets", "", "Value today [EUR]", 1),
        ("Scenario diagnostics", "", "Beyond 3 standard errors", 0),
        ("Scenario diagnostics", "Short rate against", "Mean", 3),
        ("Scenario diagnostics", "Short rate against", "Standard deviation, closed form", 3),
        ("Scenario diagnostics", "Short rate against", "Slope on a step before", 3),
        ("Present values", "", "Surplus", 0),
        ("Present values", "", "Paths", 12),
        ("Convergence", "", "Value", 4),
    ],
)
def test_a_wrong_figure_is_caught(
    unharmed: Spreadsheet, page: str, title: str, heading: str, year: int
) -> None:
    """The workbook says CHECK as long as it stands there."""
    sheet = unharmed
    seen = not title
    for row in sheet.book[page].iter_rows():
        for cell in row:
            seen = seen or str(cell.value).startswith(title)
            if seen and str(cell.value).replace("\u00a0", " ") == heading:
                told = sheet.book[page].cell(int(cell.row or 0) + 1 + year, int(cell.column or 0))
                right = told.value
                change(sheet, page, told.coordinate)
                sheet.forget()
                word = run_word(sheet)
                told.value = right
                assert word == "CHECK"
                return
    raise AssertionError(f"{heading!r} is not on {page}")


@pytest.fixture(scope="module")
def unharmed(written: dict[str, Path]) -> Spreadsheet:
    """A report that tests change one cell of, and put right again."""
    sheet = opened(written, "pricing")
    assert run_word(sheet) == "OK"
    return sheet


def run_word(sheet: Spreadsheet) -> str:
    """The word of the checks of a run, which are the last on the sheet of checks."""
    page = sheet.book["Checks"]
    first = next(
        int(row[0].row or 0)
        for row in page.iter_rows(min_row=7, max_col=2)
        if row[1].value in ("Savings account", "Present values")
    )
    rows = [row for row in range(first, page.max_row + 1) if page.cell(row, 8).value is not None]
    assert len(rows) > 10
    return "CHECK" if any(sheet.value("Checks", f"H{row}") == "CHECK" for row in rows) else "OK"


def test_a_changed_parameter_is_caught(written: dict[str, Path]) -> None:
    """The law of the savings account follows from the model's own parameters."""
    sheet = opened(written, "real-world")
    for label in ("Mean reversion", "Volatility", "Risk price"):
        cells = sheet.book["Scenario model"].iter_rows(min_row=5, max_row=12)
        cell = next(row[1] for row in cells if row[0].value == label)
        right = cell.value
        change(sheet, "Scenario model", cell.coordinate)
        sheet.forget()
        assert run_word(sheet) == "CHECK", label
        cell.value = right
        sheet.forget()
        assert run_word(sheet) == "OK"
    assert sheet.value(*MASTER) == "OK"


def test_gains_are_recomputed(written: dict[str, Path]) -> None:
    sheet = opened(written, "sobol")
    change(sheet, "Sampling gains", "C5")
    assert sheet.value(*MASTER) == "CHECK"


def test_sheets_are_there_where_their_figures_are(written: dict[str, Path]) -> None:
    drawn = {"Scenario model", "Savings account", "Short rate", "Present values", "Scenario diagnostics"}
    beside = {"Risky assets", "Risky asset 1", "Risky asset 2", "Price index"}
    assert drawn | beside <= set(opened(written, "pricing").book.sheetnames)
    assert drawn <= set(opened(written, "no reversion").book.sheetnames)
    assert not beside & set(opened(written, "no reversion").book.sheetnames)
    assert "Price index" not in opened(written, "outside").book.sheetnames
    assert "Sampling gains" in opened(written, "sobol").book.sheetnames


def words(sheet: Spreadsheet, page: str) -> str:
    return " ".join(str(row[0].value) for row in sheet.book[page].iter_rows(max_col=1))


def test_what_was_drawn_and_what_for(written: dict[str, Path]) -> None:
    pricing = opened(written, "pricing")
    assert MEASURE_USES[Measure.PRICING] in words(pricing, "Scenario model")
    assert MEASURE_USES[Measure.REAL_WORLD] in words(opened(written, "real-world"), "Scenario model")
    items = {
        row[0]: row[1]
        for row in pricing.book["Scenario model"].iter_rows(
            min_row=5, max_row=30, max_col=2, values_only=True
        )
    }
    model = book_of("pricing").rates_model
    assert model is not None
    assert items["Mean reversion"] == model.mean_reversion
    assert items["Inflation volatility"] == model.inflation_volatility
    assert items["Measure"] == "pricing"
    assert "makes a curve of its own" in words(opened(written, "own curve"), "Scenario model")
    outside = opened(written, "outside")
    assert OUTSIDE_SET in words(outside, "Scenario model")
    assert "need not reprice" in words(outside, "Scenario diagnostics")
    assert "own set of scenarios" in words(outside, "Summary")


def test_verdicts_are_counted_and_fail_no_check(written: dict[str, Path]) -> None:
    """A set that does not reprice the curve is told so, and the workbook still agrees with the program."""
    sheet, run = opened(written, "outside"), simulation_of("outside")
    distance = (run.repricing.mean_discount - run.repricing.expected_discount)[1:]
    far = np.abs(distance) > 3.0 * run.repricing.mean_discount_se[1:]
    assert far.any()
    assert sheet.value("Scenario diagnostics", "D5") == far.sum()
    assert sheet.value("Scenario diagnostics", "E5") == far.sum()
    assert sheet.value(*MASTER) == "OK"
    assert "further than 3 standard errors off" in words(sheet, "Summary")


def test_correlations_that_were_mended_are_told(written: dict[str, Path]) -> None:
    sheet = opened(written, "mended")
    mended = simulation_of("mended").risky
    assert mended is not None
    assert mended.mended is not None
    assert f"the largest change is {mended.mended.largest_change:.3g}" in words(sheet, "Risky assets")
    assert mended.counted in words(sheet, "Risky assets")


def test_names_of_assets_are_no_formulas(written: dict[str, Path]) -> None:
    sheet = opened(written, "pricing")
    cell = sheet.book["Risky assets"]["A5"]
    assert (cell.value, cell.data_type) == ("=Equity", "s")
    assert not [text for _, _, text in sheet.formulas() if text.startswith("=Equity")]


def test_parameters_of_another_book_recompute_nothing(tmp_path: Path) -> None:
    """A run that is not of the book the report is about stands by itself."""
    book = book_of("pricing")
    assert book.rates_model is not None
    other = replace(book, rates_model=replace(book.rates_model, volatility=0.02))
    path = tmp_path / "other.xlsx"
    write_report(examples.reading(other), tasks.value(other), simulation_of("pricing"), path)
    sheet = Spreadsheet(path)
    assert sheet.value(*MASTER) == "OK"
    assert "Volatility" not in words(sheet, "Scenario model")


def test_only_the_first_of_many_assets_have_their_sheets(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(runs_market, "ASSETS_SHOWN", 1)
    path = tmp_path / "many.xlsx"
    book = book_of("pricing")
    write_report(examples.reading(book), tasks.value(book), simulation_of("pricing"), path)
    sheet = Spreadsheet(path)
    assert "Risky asset 2" not in sheet.book.sheetnames
    assert f"The first 1 of {len(ASSETS.names)} assets" in words(sheet, "Risky assets")
    assert sheet.value(*MASTER) == "OK"
