"""What a sound workbook gives: the values, the layout, the notes."""

from __future__ import annotations

import hashlib
from datetime import date, datetime, time, timedelta
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from openpyxl import Workbook, load_workbook

from desk.book import (
    CurveKind,
    History,
    HoldingKind,
    Measure,
    ModelName,
    Notes,
    RiskyAssets,
    Run,
)
from desk.intake.columns import Column, address, column_letters, pack_column
from desk.intake.workbook import read_workbook
from desk.rates.compounding import Compounding
from desk.rates.curve import Interpolation
from desk.rates.day_count import DayCount
from tests.intake.books import save, sound_sheets


def test_every_sheet_is_read(tmp_path: Path) -> None:
    path = save(sound_sheets(), tmp_path / "book.xlsx")
    reading = read_workbook(path)
    assert reading.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()
    book = reading.book
    assert book is not None
    basis = book.basis
    assert (basis.valuation_date, basis.currency, basis.title) == (date(2026, 9, 30), "EUR", "Test book")
    assert basis.curve_kind is CurveKind.ZERO
    assert basis.compounding is Compounding.ANNUAL
    assert basis.interpolation is Interpolation.LOG_LINEAR
    assert basis.day_count is DayCount.ACT_365F
    assert (basis.liability_spread, basis.market_risk_premium) == (0.005, 0.03)
    assert basis.terms.tolist() == [1.0, 5.0, 10.0, 30.0]
    assert basis.rates.tolist() == [0.02, 0.025, 0.028, 0.03]
    flows = book.liabilities
    assert flows.line_names == ("Pensioners", "Deferred")
    assert flows.line.tolist() == [0, 1, 0]
    assert flows.amount.tolist() == [1000.5, 2000.0, 900.0]
    assert flows.beta.tolist() == [0.0, 0.2, 0.0]
    # Days counted by hand: 365; 14 years with 4 leap days; 24 years with 6.
    assert flows.time.tolist() == [365 / 365, (14 * 365 + 4) / 365, (24 * 365 + 6) / 365]
    bond, strip, cash, fund = book.holdings
    assert (bond.kind, bond.coupon, bond.frequency, bond.maturity) == (
        HoldingKind.BOND,
        0.02,
        2,
        date(2036, 5, 15),
    )
    assert (bond.day_count, bond.market_value) == (DayCount.THIRTY_360, 950.25)
    assert (strip.kind, strip.nominal, strip.market_value) == (HoldingKind.ZERO, 500.0, None)
    assert (cash.kind, cash.nominal, cash.maturity) == (HoldingKind.DEPOSIT, 250.0, None)
    assert (fund.market_value, fund.units, fund.duration) == (800.0, 40.0, 2.5)
    assert book.asset_flows.time.tolist() == [1.5, 2.5]
    assert np.isnat(book.asset_flows.date).all()
    model = book.rates_model
    assert model is not None
    assert (model.name, model.mean_reversion, model.volatility) == (ModelName.HULL_WHITE, 0.05, 0.009)
    assert (model.long_run_rate, model.risk_price) == (None, -0.1)
    assert book.risky_assets == RiskyAssets(
        names=("Equity", "Property"),
        value=np.array([500.0, 300.0]),
        premium=np.array([0.04, 0.03]),
        volatility=np.array([0.16, 0.12]),
        dividend_yield=np.array([0.02, 0.0]),
        correlation=np.array([[1.0, 0.5], [0.5, 1.0]]),
        rates_correlation=np.array([0.1, -0.1]),
    )
    assert book.run == Run(2000, 20, 12, 7, Measure.REAL_WORLD, (1.0, 5.0, 50.0, 95.0, 99.0))
    assert book.history == History(
        np.array(["2026-07-31", "2026-08-31", "2026-09-30"], "M8[D]"), np.array([0.021, 0.0205, 0.02])
    )
    assert book.notes == ()


def test_only_the_needed_sheets(tmp_path: Path) -> None:
    sheets = {name: sound_sheets()[name] for name in ("Basis", "Curve", "Liabilities")}
    book = read_workbook(save(sheets, tmp_path / "book.xlsx")).book
    assert book is not None
    assert book.holdings == ()
    assert len(book.asset_flows) == 0
    assert (book.rates_model, book.risky_assets, book.history, book.run) == (None, None, None, Run())


def test_headings_without_case_in_any_order_with_units(tmp_path: Path) -> None:
    sheets = sound_sheets()
    plain = read_workbook(save(sheets, tmp_path / "plain.xlsx")).book
    sheets[" curve "] = [
        ["  RATE", "Term (years)"],
        *([rate, term] for term, rate in sheets.pop("Curve")[1:]),
    ]
    sheets["LIABILITIES"] = [list(reversed(row)) for row in sheets.pop("Liabilities")]
    sheets["Basis"] = [["item", "VALUE"], *reversed(sheets["Basis"][1:])]
    sheets["Run"][2][0] = "horizon"
    reading = read_workbook(save(sheets, tmp_path / "book.xlsx"))
    assert reading.faults == ()
    assert reading.book == plain


@pytest.mark.parametrize(
    "cells", [["1, 5, 25"], ["1;5;25"], ["1 5 25"], [1, 5, 25], ["1; 5", 25], ["1, 5, 25,"]], ids=str
)
def test_percentiles_in_one_cell_or_in_several(cells: list[Any], tmp_path: Path) -> None:
    sheets = sound_sheets()
    sheets["Run"][-1] = ["Percentiles", *cells]
    reading = read_workbook(save(sheets, tmp_path / "book.xlsx"))
    assert reading.faults == ()
    assert reading.book is not None
    assert reading.book.run.percentiles == (1.0, 5.0, 25.0)


def test_further_columns_are_kept_as_notes(tmp_path: Path) -> None:
    sheets = sound_sheets()
    sheets["Liabilities"] = [
        ["Source", "Line", "Date", "Amount", "Row"],
        ["file 7", "A", date(2030, 1, 1), 5, 1],
        [None, "B", date(2031, 1, 1), 6, True],
        [None, None, None, None, None],
        [date(2020, 2, 2), "A", date(2052, 1, 1), 7, 2.5],
    ]
    sheets["Basis"][0].append("Source")
    sheets["Basis"][5].append("circular 3")
    sheets["Risky assets"][0].append("Index")
    sheets["Risky assets"][1].append("=all shares".replace("=", "+"))
    reading = read_workbook(save(sheets, tmp_path / "book.xlsx"))
    assert reading.grave == ()
    assert len(reading.faults) == 4
    assert reading.book is not None
    assert reading.book.notes == (
        Notes("Basis", ("Item", "Source"), (("Compounding", "circular 3"),)),
        Notes("Liabilities", ("Source", "Row"), (("file 7", 1.0), (None, "TRUE"), ("2020-02-02", 2.5))),
        Notes("Risky assets", ("Index",), (("+all shares",), (None,))),
    )


def test_the_sheets_are_kept_for_showing(tmp_path: Path) -> None:
    sheets = sound_sheets()
    sheets["Curve"].insert(0, ["Our curve"])
    reading = read_workbook(save(sheets, tmp_path / "book.xlsx"))
    grids = {grid.name: grid for grid in reading.sheets}
    assert list(grids) == list(sheets)
    curve = grids["Curve"]
    assert (curve.heading_row, curve.fields, curve.hidden) == (1, {0: "Term", 1: "Rate"}, False)
    assert curve.rows[2] == [1.0, 0.02]
    assert curve.rows[-1] == [30.0, 0.03]
    assert len(curve.rows) == 6
    with pytest.raises(IndexError):
        curve.rows[6]


def test_values_equal_those_of_another_reader(tmp_path: Path) -> None:
    path = tmp_path / "messy.xlsx"
    workbook = Workbook()
    sheet = workbook.worksheets[0]
    messy: list[list[Any]] = [
        [None, "Text", " blanks ", "\u00e9\u4e2d\U0001f600", "3.75%", "1\u00a0234,56", "000123", "N/A"],
        [],
        [0, -1, 0.1, 1e-300, 1.7e308, 123456789012345678, True, False],
        [date(1999, 12, 31), datetime(2031, 5, 6, 7, 8, 9), time(13, 14, 15), timedelta(hours=36)],
        ["#N/A", "#DIV/0!", None, "after errors"],
        ["line\nfeed", "tab\there", "quote\"'&<>", "=1+1"],
    ]
    for row in messy:
        sheet.append(row)
    sheet["C3"].number_format = "0.00%"
    sheet["D9"] = "far"
    workbook.save(path)
    (grid,) = read_workbook(path).sheets
    other = load_workbook(path, data_only=True).worksheets[0]
    assert len(grid.rows) == other.max_row
    for ours, theirs in zip(grid.rows, other.iter_rows(), strict=True):
        for value, cell in zip(ours, theirs, strict=True):
            expected: Any = cell.value
            if cell.data_type == "e":
                expected = None
            elif isinstance(expected, datetime) and expected.time() == time() and value == expected.date():
                expected = expected.date()
            assert value == expected, cell.coordinate


@pytest.mark.parametrize(
    "cells",
    [
        [],
        [1.0, 2, True, False, "a", "", "a", None],
        [date(1900, 3, 1), date(9999, 12, 31), datetime(2031, 5, 6, 7, 8, 9, 500_000)],
        [time(1, 2, 3), timedelta(days=-1, hours=3), "b\u2028"],
        ["", None, "  "],
    ],
    ids=str,
)
def test_columns_come_back_as_they_were(cells: list[Any]) -> None:
    column = Column.unpack(pack_column(cells), len(cells))
    back = [column.cell(row) for row in range(len(cells))]
    assert back == [
        None if cell is None or (isinstance(cell, str) and not cell.strip()) else cell for cell in cells
    ]
    assert [type(cell) is bool for cell in back] == [type(cell) is bool for cell in cells]


def test_texts_hold_nothing_that_a_workbook_could_not() -> None:
    column = Column.unpack(pack_column(["a\r\nb\rc\x00d\x1fe"]), 1)
    assert column.cell(0) == "a\nb\nc\ufffdd\ufffde"


def test_addresses() -> None:
    from openpyxl.utils import get_column_letter

    assert [column_letters(column) for column in range(16_384)] == [
        get_column_letter(column + 1) for column in range(16_384)
    ]
    assert address(13, 2) == "C14"
