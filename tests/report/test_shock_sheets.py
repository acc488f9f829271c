"""The sheets of shocks: reported as the task reports them, revalued by their own formulas."""

from __future__ import annotations

import re
import zipfile
from dataclasses import replace
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import numpy as np
import pytest

from desk import tasks
from desk.book import FlowTable, Move, MoveKind, Shock, ShockSettings
from desk.rates.compounding import Compounding
from desk.valuation.moved_curve import CurveMove
from desk.valuation.shock_records import ShockTable, band_name
from tests.report import examples
from tests.report.shocked_books import FIRST, MASTER, OWN, SHEETS, failures, shocked_book, write
from tests.report.spreadsheet import FUNCTION_CALL, FUNCTION_NAMES, Spreadsheet


@pytest.fixture(scope="module")
def path(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The report of the example."""
    target = tmp_path_factory.mktemp("shocks") / "report.xlsx"
    write(shocked_book(), target)
    return target


@pytest.fixture(scope="module")
def found() -> ShockTable:
    """What the report must hold."""
    return tasks.shock(shocked_book())


@pytest.fixture
def sheet(path: Path) -> Spreadsheet:
    """The report, opened."""
    return Spreadsheet(path)


def test_every_formula_of_the_report_agrees(sheet: Spreadsheet) -> None:
    """All checks say OK, no formula fails, and the sheets stand in their order before the checks."""
    names = sheet.book.sheetnames
    assert names[names.index("Shocks") : names.index("Checks")] == SHEETS
    assert failures(sheet) == []
    assert sheet.value(*MASTER) == "OK"


def test_every_figure_is_that_of_the_task(sheet: Spreadsheet, found: ShockTable) -> None:
    """Bit for bit, in the order asked for, each with its set."""
    page = sheet.book["Shocks"]
    names = (
        *("assets", "liabilities", "surplus", "funding_ratio", "change_in_assets"),
        *("change_in_liabilities", "change_in_surplus", "change_in_funding_ratio"),
    )
    last = FIRST + len(found.results) - 1
    rows = list(page.iter_rows(min_row=FIRST, max_row=last, values_only=True))
    assert [row[1] for row in rows] == [result.name for result in found.results]
    assert [row[2] for row in rows] == [result.set_name or "Own" for result in found.results]
    assert [row[3:11] for row in rows] == [
        tuple(getattr(result, name) for name in names) for result in found.results
    ]
    assert [row[11] for row in rows] == [band_name(result.band, found.thresholds) for result in found.results]
    base = [cell.value for cell in page[FIRST - 1]][3:7]
    assert base == [
        found.base.assets, found.base.liabilities, found.base.surplus, found.base.funding_ratio,
    ]  # fmt: skip
    start = next(row[0].row for row in page.iter_rows(min_row=last + 1) if row[0].value == "Shock number")
    estimates = list(
        page.iter_rows(min_row=(start or 0) + 1, max_row=(start or 0) + len(rows), values_only=True)
    )
    assert [row[3:6] for row in estimates] == [
        (
            result.estimated_change_in_assets,
            result.estimated_change_in_liabilities,
            result.estimated_change_in_surplus,
        )
        for result in found.results
    ]
    text = {cell.value for row in page.iter_rows() for cell in row}
    assert {result.source for result in found.results if result.source} <= text


def test_the_profile_is_that_of_the_task(sheet: Spreadsheet, found: ShockTable) -> None:
    """Every parallel move with both sides, the tangent, the ratio and the gap."""
    profile = found.profile
    rows = list(sheet.book["Parallel moves"].iter_rows(min_row=5, max_col=7, values_only=True))
    figures = np.array(rows[: profile.move.size], dtype=float)
    expected = (
        *(profile.move, profile.assets, profile.liabilities, profile.surplus, profile.tangent),
        *(profile.funding_ratio, profile.duration_gap),
    )
    np.testing.assert_array_equal(figures, np.stack(expected, axis=1))
    assert "duration gap" in str(sheet.book["Parallel moves"]["A2"].value)


@pytest.mark.parametrize("is_swapped", [False, True])
def test_where_the_surplus_turns_is_said(tmp_path: Path, is_swapped: bool) -> None:
    """Payments about those of the other side: the surplus is least, or greatest, where the gap is nil."""
    about = FlowTable.build(["Early", "Late"], [2.0, 25.0], [1.2e6, 1e6])
    middle = FlowTable.build(["Middle"], [12.0], [2e6])
    sides = (middle, about) if is_swapped else (about, middle)
    book = replace(shocked_book(shocks=OWN[:1]), holdings=(), asset_flows=sides[0], liabilities=sides[1])
    found = tasks.shock(replace(book, shock_settings=ShockSettings(sets=("None such",))))
    turn = found.profile.gap_turns[0]
    at = np.argmax if is_swapped else np.argmin
    assert abs(found.profile.move[at(found.profile.surplus)] - turn) <= 10.0
    sheet = write(book, tmp_path / "r.xlsx", found)
    word = "greatest" if is_swapped else "least"
    said = f"{turn:+,.1f} (the surplus is {word} there)".replace("-", "−")
    assert said in str(sheet.book["Parallel moves"]["A2"].value)
    text = " ".join(str(row[0].value) for row in sheet.book["Summary"].iter_rows(max_col=1))
    assert said in text


def test_moves_are_listed_with_their_units(sheet: Spreadsheet, found: ShockTable) -> None:
    """Every move of every shock, with size, term and what it applies to."""
    listed = [
        (row[0], row[3], row[4], row[6])
        for row in sheet.book["Shock moves"].iter_rows(min_row=5, values_only=True)
        if row[0] is not None
    ]
    expected = [
        (number, move.kind.value, move.size, move.term)
        for number, result in enumerate(found.results, start=1)
        for move in result.shock.moves
    ]
    assert sorted(listed, key=str) == sorted(expected, key=str)
    units = {row[3]: row[5] for row in sheet.book["Shock moves"].iter_rows(min_row=5, values_only=True)}
    assert units["parallel"] == "basis points"
    assert units["value"] == "share"
    assert units["time"] == "years"
    targets = [row[9] for row in sheet.book["Shock moves"].iter_rows(min_row=5, values_only=True)]
    assert {"Pensions", "bond", "Funds and property", "All rates"} <= set(targets)


def test_shifts_are_formulas_and_those_of_the_curve_move(sheet: Spreadsheet, found: ShockTable) -> None:
    """Every shock's shift at every term, computed from the sheet of moves, is the program's."""
    page = sheet.book["Shock rates"]
    curve = shocked_book().basis.curve
    rows = range(5, page.max_row + 1, 7)
    time = np.array([sheet.value("Shock rates", f"A{row}") for row in rows], dtype=float)
    zero = curve.zero(time)
    for number, result in enumerate(found.results):
        cells = [page.cell(row, 8 + number) for row in rows]
        assert all(cell.data_type == "f" for cell in cells)
        live = [float(sheet.value("Shock rates", cell.coordinate)) for cell in cells]
        move = CurveMove.of_shock(result.shock)
        expected = np.zeros(time.size) if move is None else move.change(time, zero)
        np.testing.assert_allclose(live, expected, rtol=0.0, atol=1e-15)


def _random_shock(generator: np.random.Generator, number: int) -> Shock:
    """Moves of rates of several kinds, at one term or many, in any order."""
    moves = [
        Move(kind, float(generator.uniform(-200.0, 200.0)))
        for kind in (MoveKind.PARALLEL, MoveKind.SHORT, MoveKind.LONG)
        if generator.random() < 0.4
    ]
    if generator.random() < 0.4:
        moves.append(Move(MoveKind.TWIST, float(generator.uniform(-80, 80)), float(generator.uniform(1, 20))))
    for kind, most in ((MoveKind.RATE, 150.0), (MoveKind.RELATIVE, 0.5), (MoveKind.FLOOR, 100.0)):
        if generator.random() < 0.6:
            terms = generator.choice(np.arange(0.5, 60.0, 0.5), int(generator.integers(1, 6)), replace=False)
            moves += [Move(kind, float(generator.uniform(-most, most)), float(term)) for term in terms]
    if any(move.kind is MoveKind.RELATIVE for move in moves):
        sign = 1.0 if generator.random() < 0.5 else -1.0
        moves += [Move(MoveKind.LEAST, sign * 60.0, 1.0), Move(MoveKind.LEAST, sign * 20.0, 30.0)]
    order = generator.permutation(len(moves))
    kinds = list(Compounding)
    return Shock(
        f"Random {number}",
        tuple(moves[place] for place in order) or (Move(MoveKind.PARALLEL, 1.0),),
        compounding=kinds[int(generator.integers(len(kinds)))],
    )


def test_random_shocks_are_revalued(tmp_path: Path) -> None:
    """Sixty shocks of any shape: the formulas agree with the program on both sides."""
    generator = np.random.default_rng(77)
    shocks = tuple(_random_shock(generator, number) for number in range(60))
    few = FlowTable.build(["A"] * 12, generator.uniform(0.1, 58.0, 12), [1e6] * 12)
    book = replace(examples.book(), liabilities=few, holdings=(), rates_model=None, shocks=shocks)
    book = replace(book, shock_settings=ShockSettings(sets=("None such",)))
    found = tasks.shock(book)
    assert len(found.results) > 55
    sheet = write(book, tmp_path / "report.xlsx", found)
    page = sheet.book["Shock recomputed"]
    for number, result in enumerate(found.results):
        row = 5 + number
        assert page.cell(row, 2).value == result.name
        live = [sheet.value("Shock recomputed", f"{letter}{row}") for letter in "DGI"]
        after = [result.assets, result.liabilities, result.surplus]
        np.testing.assert_allclose(live, after, rtol=1e-12)
    assert failures(sheet) == []


@pytest.mark.parametrize(
    ("name", "address"),
    [
        ("Shocks", "D7"),
        ("Shocks", "F9"),
        ("Shocks", "G8"),
        ("Shocks", "I7"),
        ("Shocks", "J10"),
        ("Shocks", "K6"),
        ("Shocks", "D5"),
        ("Shock moves", "E6"),
        ("Shock moves", "G8"),
        ("Shock rates", "A40"),
        ("Shock rates", "D30"),
        ("Parallel moves", "B9"),
        ("Parallel moves", "E20"),
        ("Liabilities", "G9"),
        ("Asset flows", "D14"),
    ],
)
def test_a_wrong_figure_is_caught(sheet: Spreadsheet, name: str, address: str) -> None:
    """A small part more on one cell turns the workbook's check."""
    cell = sheet.book[name][address]
    assert isinstance(cell.value, int | float)
    assert cell.value
    cell.value = 1.001 * float(cell.value)
    assert sheet.value(*MASTER) == "CHECK"


def test_a_wrong_estimate_and_a_wrong_verdict_are_caught(path: Path, found: ShockTable) -> None:
    """Estimates add up, and a verdict is what the thresholds make it."""
    last = FIRST + len(found.results) - 1
    for column, below in ((6, True), (12, False)):
        sheet = Spreadsheet(path)
        page = sheet.book["Shocks"]
        row = FIRST
        if below:
            row = 1 + next(
                row[0].row or 0 for row in page.iter_rows(min_row=last + 1) if row[0].value == "Shock number"
            )
        cell = page.cell(row, column)
        cell.value = 1.001 * float(str(cell.value)) if below else "another"
        assert sheet.value(*MASTER) == "CHECK"


def test_other_thresholds_give_other_verdicts(sheet: Spreadsheet, found: ShockTable) -> None:
    """The thresholds are cells to be changed; verdicts and counts follow."""
    page = sheet.book["Shocks"]
    row = next(row[1].row or 0 for row in page.iter_rows(min_row=FIRST) if row[1].value == "Thresholds")
    assert [page.cell(row + 1, 3).value, page.cell(row + 2, 3).value] == [1.1, 0.9]
    page.cell(row + 1, 3).value, page.cell(row + 2, 3).value = 10.0, 9.0
    verdicts = [sheet.value("Shocks", f"M{FIRST + number}") for number in range(len(found.results))]
    assert set(verdicts) == {"poor"}
    assert sheet.value("Shocks", f"D{row + 1}") == len(found.results)


def test_one_shock_is_chosen_and_revalued_term_by_term(path: Path, found: ShockTable) -> None:
    """Whichever is chosen, the sums over the terms are what the shock was reported to do by rates alone."""
    for number in (3, 4, len(found.results)):
        sheet = Spreadsheet(path)
        place = sheet.book.defined_names["shock_chosen"].attr_text.rsplit("!", 1)[1].replace("$", "")
        page = sheet.book["Shock recomputed"]
        row = page[place].row
        page[place].value = number
        result = found.results[number - 1]
        assert sheet.value("Shock recomputed", f"C{row + 1}") == result.name
        by_rates = replace(
            result.shock, moves=tuple(move for move in result.shock.moves if move.kind in RATES)
        )
        expected = (found.base.assets, found.base.liabilities)
        if by_rates.moves:
            alone = tasks.shock(
                replace(shocked_book(shocks=(by_rates,)), shock_settings=ShockSettings(("x",)))
            )
            expected = (alone.results[0].assets, alone.results[0].liabilities)
        live = [sheet.value("Shock recomputed", f"C{row + offset}") for offset in (3, 4)]
        np.testing.assert_allclose(live, expected, rtol=1e-12)
        other = sheet.value("Shock recomputed", f"E{row + 3}")
        assert other == pytest.approx(result.assets - expected[0], abs=1e-5)


RATES = frozenset(MoveKind) - {
    MoveKind.INFLATION, MoveKind.SPREAD, MoveKind.VALUE, MoveKind.AMOUNT, MoveKind.TIME, MoveKind.DECLINE,
}  # fmt: skip


def test_a_side_that_is_not_moved_by_rates_alone_is_not_recomputed(sheet: Spreadsheet) -> None:
    """It is reported, and its cell says so; the other side is recomputed."""
    cells = {
        row[1]: row[2:10]
        for row in sheet.book["Shock recomputed"].iter_rows(min_row=5, max_row=11, values_only=True)
    }
    assert cells["Markets fall"][1] == "not by rates alone"
    assert str(cells["Markets fall"][4]).startswith("=SUMPRODUCT(")
    assert str(cells["Lives are longer"][1]).startswith("=SUMPRODUCT(")
    assert cells["Lives are longer"][4] == "not by rates alone"
    assert cells["Everywhere"][7] == "none"


def test_the_summary_and_the_provenance_tell_of_shocks(sheet: Spreadsheet, found: ShockTable) -> None:
    """The worst shock by name, how many fall below each threshold, and where the sets come from."""
    text = " ".join(str(row[0].value) for row in sheet.book["Summary"].iter_rows(max_col=1))
    worst = min(found.results, key=lambda result: result.surplus)
    assert worst.name in text
    below = sum(result.funding_ratio < 1.1 for result in found.results)
    assert f"{below} below 110 %" in text
    rows = {row[0].value: row for row in sheet.book["Summary"].iter_rows(min_row=5, max_row=12)}
    reported = rows["Least surplus after a shock"]
    assert reported[2].value == worst.surplus
    assert sheet.value("Summary", f"D{reported[0].row}") == pytest.approx(worst.surplus, rel=1e-12)
    items = {row[0].value: row[1].value for row in sheet.book["Provenance"].iter_rows(min_row=5, max_col=2)}
    assert items["Shocks: sets"] == ", ".join(shocked_book().shock_settings.sets)
    assert "2015/35" in str(items["Shocks: set Solvency II rates"])
    assert items["Shocks: SHA-256 of the book's contents"] == shocked_book().digest


def test_formulas_keep_to_a_few_plain_functions(sheet: Spreadsheet) -> None:
    """No nested IF, no volatile function, nothing that a reviewer cannot follow; names stay text."""
    for name, _, text in sheet.formulas():
        if name in SHEETS:
            called = FUNCTION_CALL.findall(text)
            assert set(called) <= FUNCTION_NAMES
            assert called.count("IF") <= 1
            assert len(text) < 220
    cell = sheet.book["Shocks"][f"B{FIRST}"]
    assert (cell.value, cell.data_type) == (examples.HOSTILE, "s")
    cell = sheet.book["Shock rates"]["H4"]
    assert cell.data_type != "f"


CHART = "{http://schemas.openxmlformats.org/drawingml/2006/chart}"


def test_charts_show_the_changes_and_the_profile(path: Path) -> None:
    """Bars by shock, full and estimated, and the surplus with its tangent over the whole scale."""
    with zipfile.ZipFile(path) as archive:
        found = [
            ElementTree.fromstring(archive.read(name))
            for name in archive.namelist()
            if re.fullmatch(r"xl/charts/chart\d+\.xml", name)
        ]
    titled: dict[str, Any] = {}
    for chart in found:
        words = [str(node.text) for node in chart.iter() if node.tag.endswith("}t")]
        titled[words[0]] = chart
    bars = titled["Change in surplus by shock"]
    assert len(list(bars.iter(f"{CHART}ser"))) == 2
    lines = titled["Surplus by parallel move of all rates"]
    assert [node.get("val") for node in lines.iter(f"{CHART}min")] == ["-300"]
    assert all(node.get("val") == "0" for node in lines.iter(f"{CHART}smooth"))
