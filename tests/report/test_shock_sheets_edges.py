"""The sheets of shocks where there is nothing to show, or too much."""

from __future__ import annotations

import re
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from desk import tasks
from desk.book import FlowTable, Move, MoveKind, Shock, ShockSettings
from desk.report.results import flows, shocks_rates
from desk.report.results.workbook import write_report
from tests.report import examples
from tests.report.full_books import full_book
from tests.report.shocked_books import FIRST, MASTER, OWN, SHEETS, failures, shocked_book, write
from tests.report.spreadsheet import Spreadsheet


def test_without_shocks_their_sheets_are_left_out(tmp_path: Path) -> None:
    """The summary says so, what was wrong stands among the faults, and all else stands."""
    book = replace(examples.book(), rates_model=None, shock_settings=ShockSettings(sets=("None such",)))
    found = tasks.shock(book)
    assert found.results == ()
    for shocks in (found, None):
        target = write_report(
            examples.reading(book), tasks.value(book), None, tmp_path / "r.xlsx", shocks=shocks
        )
        sheet = Spreadsheet(target)
        assert not set(SHEETS) & set(sheet.book.sheetnames)
        text = " ".join(str(row[0].value) for row in sheet.book["Summary"].iter_rows(max_col=1))
        assert "No shocks were computed" in text
        told = [str(row[4].value) for row in sheet.book["Faults"].iter_rows(min_row=5)]
        assert any("None such" in line for line in told) == (shocks is not None)
        assert sheet.value(*MASTER) == "OK"


def test_a_shock_that_cannot_be_computed_is_among_the_faults(tmp_path: Path) -> None:
    """The others stand, and the fault says while doing what it was met."""
    bad = Shock("No sense", (Move(MoveKind.PARALLEL, -1e6),))
    sheet = write(shocked_book(shocks=(bad, *OWN[:1])), tmp_path / "r.xlsx")
    told = {str(row[4].value): row[3].value for row in sheet.book["Faults"].iter_rows(min_row=5)}
    assert [met for line, met in told.items() if "No sense" in line] == ["Shocks"]
    assert sheet.book["Shocks"][f"B{FIRST}"].value == examples.HOSTILE
    assert sheet.value(*MASTER) == "OK"


@pytest.mark.parametrize("without", ["liabilities", "assets"])
def test_an_empty_side_is_shocked(tmp_path: Path, without: str) -> None:
    """Without liabilities there is no ratio and no verdict; nothing fails."""
    book = shocked_book()
    if without == "liabilities":
        book = replace(book, liabilities=FlowTable.empty())
    else:
        book = replace(book, holdings=(), asset_flows=FlowTable.empty())
    sheet = write(book, tmp_path / "r.xlsx")
    assert failures(sheet) == []
    assert sheet.value(*MASTER) == "OK"
    if without == "liabilities":
        assert sheet.book["Shocks"][f"G{FIRST}"].value == "n/a"
        assert sheet.book["Shocks"][f"M{FIRST}"].value in (None, "")


def test_inflation_is_reported_and_not_recomputed(tmp_path: Path) -> None:
    """A side that follows the index is not moved by rates alone."""
    book = shocked_book(full_book(), (Shock("Prices", (Move(MoveKind.INFLATION, 50.0),)), OWN[1]))
    book = replace(book, shock_settings=ShockSettings(sets=("None such",)), second_basis=None)
    sheet = write(book, tmp_path / "r.xlsx")
    page = sheet.book["Shock recomputed"]
    assert page["B5"].value == "Prices"
    assert page["G5"].value == "not by rates alone"
    assert sheet.value("Shock recomputed", "J6") == "OK"
    assert sheet.value(*MASTER) == "OK"


def test_times_that_are_all_but_equal_are_one_term(tmp_path: Path) -> None:
    """A tenth times three and three tenths differ by rounding alone: no flow is counted twice."""
    book = replace(
        shocked_book(), liabilities=FlowTable.build(["A"] * 3, [0.1 * 3, 0.3, 7.0], [1e6, 1e6, 2e6])
    )
    sheet = write(book, tmp_path / "r.xlsx")
    page = sheet.book["Shock rates"]
    times = np.array([page.cell(row, 1).value for row in range(5, page.max_row + 1)], dtype=float)
    assert (np.abs(times - 0.3) < 1e-6).sum() == 1
    assert failures(sheet) == []


def test_too_many_shifts_are_cut_and_said(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The first shocks are recomputed, all are reported, and the sheets say so."""
    book = shocked_book()
    monkeypatch.setattr(shocks_rates, "SHIFT_CAP", 1_000)
    sheet = write(book, tmp_path / "r.xlsx")
    for name in ("Shocks", "Shock recomputed"):
        assert re.search(r"The first \d of \d+ shocks are recomputed", str(sheet.book[name]["A2"].value))
    assert failures(sheet) == []
    assert sheet.value(*MASTER) == "OK"


@pytest.mark.parametrize("cap", ["rows", "terms", "shifts"])
def test_where_nothing_is_recomputed_it_is_said(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, cap: str
) -> None:
    """Too many flows, or terms, for a spreadsheet: reported figures stand alone with the reason."""
    if cap == "rows":
        monkeypatch.setattr(flows, "ROW_CAP", 60)
        monkeypatch.setattr("desk.report.results.position.ROW_CAP", 60)
    elif cap == "terms":
        monkeypatch.setattr(shocks_rates, "LIVE_WORK", 100)
    else:
        monkeypatch.setattr(shocks_rates, "SHIFT_CAP", 10)
    sheet = write(shocked_book(), tmp_path / "r.xlsx")
    assert not {"Shock rates", "Shock recomputed"} & set(sheet.book.sheetnames)
    assert "not recomputed" in str(sheet.book["Shocks"]["A2"].value)
    labels = " ".join(str(row[0].value) for row in sheet.book["Checks"].iter_rows(min_row=7))
    assert "Shocks are not recomputed" in labels
    assert failures(sheet) == []
    assert sheet.value(*MASTER) == "OK"
