"""The commands on odd and hostile versions of the sheets that a book may have beside the usual ones."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import dataclass
from datetime import date
from pathlib import Path

import pytest

import desk.__main__ as entry
from desk.asked import MOST_LINES
from tests.intake.books import Sheets, save
from tests.intake.further_books import by_bonds, by_formula, wide_sheets

COMMANDS = ("check", "value", "shock")


@dataclass(frozen=True)
class Odd:
    """A workbook that cannot be used, and the cells whose faults must say so."""

    name: str
    make: Callable[[], Sheets]
    places: tuple[str, ...]
    words: str


def _decay_of_nothing() -> Sheets:
    sheets = by_formula("nelson-siegel")
    for row in sheets["Basis"]:
        row[1] = 0 if row[0] == "Tau 1 (years)" else row[1]
    return sheets


def _negative_frequencies() -> Sheets:
    sheets = by_bonds()
    for place, frequency in enumerate((-2, 0, 3.5, "two"), start=1):
        sheets["Curve bonds"][place][3] = frequency
    return sheets


def _dates_as_text() -> Sheets:
    sheets = by_bonds()
    for place, maturity in enumerate(("15 May 2028", "2030-13-45", "soon", 1e9), start=1):
        sheets["Curve bonds"][place][1] = maturity
    return sheets


def _crossed_collar() -> Sheets:
    sheets = wide_sheets()
    sheets["Line terms"][1][4:6] = [0.05, 0.0]
    return sheets


def _another_day() -> Sheets:
    sheets = wide_sheets()
    sheets["Second basis"] += [["Valuation date", date(2025, 9, 30)], ["Currency", "USD"]]
    return sheets


def _absurd_shock() -> Sheets:
    sheets = wide_sheets()
    sheets["Shocks"][1:] = [["Huge", "parallel", 1e9], ["Fine", "parallel", 10]]
    return sheets


def _formulas() -> Sheets:
    sheets = wide_sheets()
    sheets["Shocks"][1:] = [["=1+1", "parallel", "=A1", None, "=cmd|' /C calc'!A0", None]]
    return sheets


ODD = (
    Odd("a decay of 0 years", _decay_of_nothing, ("Basis!B14",), "the tau 1 (years) is 0"),
    Odd(
        "negative frequencies",
        _negative_frequencies,
        ("Curve bonds!D2", "Curve bonds!D3", "Curve bonds!D4", "Curve bonds!D5"),
        "the frequency is -2",
    ),
    Odd(
        "dates as text",
        _dates_as_text,
        ("Curve bonds!B2", "Curve bonds!B3", "Curve bonds!B4", "Curve bonds!B5"),
        "stands where a date belongs",
    ),
    Odd("a cap below its floor", _crossed_collar, ("Line terms!F2",), "the cap 0 is below the floor 0.05"),
    Odd(
        "a second basis on another day",
        _another_day,
        ("Second basis!B8", "Second basis!B9"),
        "is not that of the first basis",
    ),
    Odd("a shock of a billion basis points", _absurd_shock, ("Shocks!C2",), "1000000000 basis points"),
    Odd(
        "formulas never computed",
        _formulas,
        ("Shocks!A2", "Shocks!C2", "Shocks!E2"),
        "result was never stored",
    ),
)


@pytest.mark.parametrize("case", ODD, ids=lambda case: case.name)
def test_what_cannot_be_used_is_told_by_its_cells(
    case: Odd, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Every command says the same, in one line a fault, and leaves with status 2."""
    path = save(case.make(), tmp_path / "book.xlsx")
    told = []
    for command in COMMANDS:
        assert entry.main([command, str(path), "--json"]) == 2
        captured = capsys.readouterr()
        told.append(captured.err)
        found = json.loads(captured.out)["faults"]
        assert captured.err.count("\n") == len(found)
    assert len(set(told)) == 1
    lines = told[0].splitlines()
    assert tuple(line.partition(": ")[0] for line in lines) == case.places
    assert case.words in told[0]


def test_names_that_look_like_formulas_go_through(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """As text: in the shocks' own report no cell is a formula of theirs."""
    from openpyxl import load_workbook

    sheets = wide_sheets()
    hostile = ("+cmd|' /C calc'!A0", "@SUM(A1)", "-2+3")
    sheets["Shocks"] += [[name, "parallel", 10, None, None, name] for name in hostile]
    sheets["Second liability bonds"][1][0] = hostile[0]
    path = save(sheets, tmp_path / "book.xlsx")
    assert entry.main(["shock", str(path), "--json"]) == 0
    names = [row["name"] for row in json.loads(capsys.readouterr().out)["shocks"]]
    assert set(hostile) <= set(names)
    out = tmp_path / "report.xlsx"
    assert entry.main(["report", str(path), "--out", str(out)]) == 0
    cells = [
        cell
        for sheet in load_workbook(out).worksheets
        for row in sheet.iter_rows()
        for cell in row
        if isinstance(cell.value, str) and any(name in cell.value for name in hostile)
    ]
    assert cells
    assert {cell.data_type for cell in cells} == {"s"}


def test_a_shock_of_a_hundred_per_cent_leaves_the_others(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """What makes no sense is left out in one line; the next shock is computed."""
    sheets = wide_sheets()
    sheets["Shocks"][1:] = [["Wild", "parallel", -9999], ["Fine", "parallel", 10]]
    path = save(sheets, tmp_path / "book.xlsx")
    assert entry.main(["shock", str(path), "--json"]) == 0
    captured = capsys.readouterr()
    names = [row["name"] for row in json.loads(captured.out)["shocks"]]
    assert "Fine" in names
    assert "Wild" not in names
    assert captured.err.count("'Wild'") == 1


def test_terms_of_many_lines_that_are_not_there_are_told_once(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Each by its cell; the valuation, which finds them again, adds nothing."""
    sheets = wide_sheets()
    count = 3_000
    sheets["Line terms"] = [["Line", "Indexation"], *([f"Line {row}", "linked"] for row in range(count))]
    path = save(sheets, tmp_path / "book.xlsx")
    for command in COMMANDS:
        assert entry.main([command, str(path)]) == 0
        lines = capsys.readouterr().err.splitlines()
        told = [line for line in lines if "Line terms!" in line]
        assert len(told) == len(set(told)) == MOST_LINES
        assert sum(f"{count - MOST_LINES:,} further mild faults" in line for line in lines) == 1


def test_many_shocks_are_all_computed(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """One row a shock, thousands of them, in their order."""
    sheets = wide_sheets()
    wanted = [f"Shock {row}" for row in range(2_000)]
    sheets["Shocks"][1:] = [[name, "parallel", row % 97 - 48] for row, name in enumerate(wanted)]
    path = save(sheets, tmp_path / "book.xlsx")
    assert entry.main(["shock", str(path), "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    assert [row["name"] for row in found["shocks"]][: len(wanted)] == wanted
    nothing = next(row for row in found["shocks"] if row["name"] == "Shock 48")
    assert nothing["change_in_surplus"] == pytest.approx(0.0, abs=1e-9 * nothing["assets"])


def test_an_empty_sheet_is_one_fault(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Whichever it is: none is told twice."""
    sheets = wide_sheets()
    emptied = ("Second basis", "Shocks", "Volatilities", "Yield history", "Line terms", "Liability spreads")
    for name in emptied:
        sheets[name] = []
    path = save(sheets, tmp_path / "book.xlsx")
    assert entry.main(["check", str(path)]) == 2
    lines = capsys.readouterr().err.splitlines()
    for name in emptied:
        assert sum(line.startswith(f"{name}: the sheet is empty") for line in lines) == 1
