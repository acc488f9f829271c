"""Reverse, and two moves together."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import Qt
from PySide6.QtGui import QPainterPath
from PySide6.QtTest import QTest
from pytestqt.qtbot import QtBot

from desk import tasks
from desk.book import Move, MoveKind, Shock
from desk.valuation.reverse import Goal, ReverseResult
from desk.valuation.reverse_rates import LeastMove
from desk.valuation.shock_base import shock_base
from desk.valuation.shocks import run_shock
from desk.window.parts.theme import DARK, LIGHT, contrast
from desk.window.shocks.grid_axes import MOST_STEPS, axes_of
from desk.window.shocks.grid_mode import GridMode
from desk.window.shocks.heat_picture import contour_path, shade_of
from desk.window.shocks.reverse_mode import ReverseMode
from desk.window.shocks.station import ShocksStation
from tests.window.benches import Bench
from tests.window.shocks.books import FALL, a_shocked_fund, column, settled, without_liabilities


@pytest.fixture
def reverse(bench: Bench, station: ShocksStation) -> ReverseMode:
    """The mode Reverse."""
    station.show_mode("reverse")
    mode = station.mode
    assert isinstance(mode, ReverseMode)
    return mode


@pytest.fixture
def grid(bench: Bench, station: ShocksStation) -> GridMode:
    """The mode Two moves."""
    station.show_mode("grid")
    mode = station.mode
    assert isinstance(mode, GridMode)
    return mode


def _find(bench: Bench, mode: ReverseMode, qtbot: QtBot) -> None:
    mode.find_button.click()
    assert mode.cancel_button.isVisible()
    qtbot.waitUntil(lambda: not bench.jobs.running, timeout=20_000)
    assert mode.find_button.isVisible()


def test_a_parallel_move_is_found_told_and_kept(
    bench: Bench, station: ShocksStation, reverse: ReverseMode, qtbot: QtBot
) -> None:
    level = tasks.shock(bench.book).base.funding_ratio - 0.01
    reverse.ratio.set_value(level)
    _find(bench, reverse, qtbot)
    found = reverse.found
    assert isinstance(found, ReverseResult)
    assert found.result is not None
    assert found.result.funding_ratio == pytest.approx(level, abs=1e-9)
    assert station.words.text().startswith("A parallel move of ")
    assert reverse.position.table_model.rowCount() == 6
    move = reverse.terms.table_model.column_values("move").astype(float)
    np.testing.assert_allclose(move, found.scales[0], rtol=1e-9)
    reverse.keep()
    kept = bench.book.shocks[-1]
    assert kept.name.startswith("Funding ratio to ")
    assert run_shock(shock_base(bench.book), kept).funding_ratio == pytest.approx(level, abs=1e-9)
    bench.document.undo()
    assert len(bench.book.shocks) == 3


def test_along_a_shock_and_by_the_model_to_a_surplus(
    bench: Bench, station: ShocksStation, reverse: ReverseMode, qtbot: QtBot
) -> None:
    reverse.goal.set_value(Goal.SURPLUS)
    reverse._show_fields()
    assert reverse.surplus.isVisible()
    assert "EUR" in reverse.surplus.label.text()
    level = tasks.shock(bench.book).base.surplus - 20_000.0
    reverse.surplus.set_value(level)
    reverse.along.set_value(bench.book.shocks[0])
    _find(bench, reverse, qtbot)
    assert "times “Rates fall”" in station.words.text()
    assert isinstance(reverse.found, ReverseResult)
    assert reverse.found.result is not None
    assert reverse.found.result.surplus == pytest.approx(level, abs=0.01)
    reverse.along.set_value("model")
    reverse._show_fields()
    assert reverse.horizon.isVisible()
    _find(bench, reverse, qtbot)
    assert isinstance(reverse.found, LeastMove)
    assert "standard deviations away" in station.words.text()
    assert reverse.found.result is not None
    assert reverse.found.result.surplus == pytest.approx(level, abs=0.01)


def test_no_solution_is_told_in_one_line(
    bench: Bench, station: ShocksStation, reverse: ReverseMode, qtbot: QtBot
) -> None:
    reverse.along.set_value(bench.book.shocks[2])
    reverse.ratio.set_value(90.0)
    _find(bench, reverse, qtbot)
    assert isinstance(reverse.found, ReverseResult)
    assert reverse.found.fault is not None
    assert "Longer lives" in station.words.text()
    assert "\n" not in station.words.text()
    assert not reverse.keep_button.isEnabled()


def test_what_is_missing_is_told(
    bench: Bench, station: ShocksStation, reverse: ReverseMode, qtbot: QtBot
) -> None:
    _find(bench, reverse, qtbot)
    reverse.along.set_value("history")
    reverse.find_button.click()
    assert not bench.jobs.running
    assert station.words.text().startswith("The book has no history of yields")
    assert reverse.found is None
    bench.document.edit("No model", replace(bench.book, rates_model=None))
    reverse.along.set_value("model")
    reverse.find()
    assert station.words.text().startswith("The book has no rates model")


def test_what_is_shown_of_a_former_book_is_of_that_book_throughout(
    bench: Bench, station: ShocksStation, qtbot: QtBot
) -> None:
    """Its figures before the move are not those of the book as it stands now."""
    station.show_mode("reverse")
    reverse, grid = station.mode_of("reverse"), station.mode_of("grid")
    assert isinstance(reverse, ReverseMode)
    assert isinstance(grid, GridMode)
    _find(bench, reverse, qtbot)
    before = column(reverse.position, "before")
    station.show_mode("grid")
    grid.run()
    qtbot.waitUntil(lambda: grid.grid is not None and not bench.jobs.running, timeout=20_000)
    grid.shown.setCurrentIndex(2)
    place = column(grid.values, "size").index("0")
    untouched = [column(grid.values, "c10")[place]]
    bench.edit_basis(liability_spread=0.01)
    settled(bench, station, qtbot)
    grid.shown.setCurrentIndex(1)
    grid.shown.setCurrentIndex(2)
    assert grid.is_stale
    assert [column(grid.values, "c10")[place]] == untouched
    assert float(untouched[0].replace("\u2212", "-").replace("\u2013", "0") or 0.0) == 0.0
    station.show_mode("reverse")
    settled(bench, station, qtbot)
    assert reverse.is_stale
    assert column(reverse.position, "before") == before


def test_an_answer_along_a_shock_that_was_changed_says_so(
    bench: Bench, station: ShocksStation, qtbot: QtBot
) -> None:
    station.show_mode("reverse")
    reverse, grid = station.mode_of("reverse"), station.mode_of("grid")
    assert isinstance(reverse, ReverseMode)
    assert isinstance(grid, GridMode)
    reverse.along.set_value(FALL)
    _find(bench, reverse, qtbot)
    station.show_mode("grid")
    grid.second.which.set_value(next(axis for axis in axes_of(bench.book, (FALL,)) if axis.shock == FALL))
    grid.second.suggest()
    grid.run()
    qtbot.waitUntil(lambda: grid.grid is not None and not bench.jobs.running, timeout=20_000)
    assert not grid.is_stale
    assert not reverse.is_stale
    shocks = (replace(FALL, moves=(Move(MoveKind.PARALLEL, -90.0),)), *bench.book.shocks[1:])
    bench.document.edit("Change of a shock", replace(bench.book, shocks=shocks))
    settled(bench, station, qtbot)
    assert grid.is_stale
    assert reverse.is_stale
    bench.document.undo()
    settled(bench, station, qtbot)
    assert not grid.is_stale
    assert not reverse.is_stale


def test_a_least_move_of_a_former_model_says_so(
    bench: Bench, station: ShocksStation, reverse: ReverseMode, qtbot: QtBot
) -> None:
    reverse.along.set_value("model")
    _find(bench, reverse, qtbot)
    model = bench.book.rates_model
    assert model is not None
    bench.document.edit("Another model", replace(bench.book, rates_model=replace(model, volatility=0.02)))
    settled(bench, station, qtbot)
    assert reverse.is_stale
    reverse.along.set_value("parallel")
    _find(bench, reverse, qtbot)
    bench.document.undo()
    settled(bench, station, qtbot)
    assert not reverse.is_stale


def test_an_answer_of_a_former_book_says_so(
    bench: Bench, station: ShocksStation, reverse: ReverseMode, qtbot: QtBot
) -> None:
    _find(bench, reverse, qtbot)
    bench.edit_basis(liability_spread=0.01)
    settled(bench, station, qtbot)
    assert reverse.is_stale
    assert station.words.text().startswith("Before your last change: ")
    settled(bench, station, qtbot, a_shocked_fund(FALL))
    assert reverse.found is None
    assert not station.words.text().startswith("Before")


def test_without_liabilities_there_is_no_ratio_to_reach(
    bench: Bench, bare: ShocksStation, qtbot: QtBot
) -> None:
    settled(bench, bare, qtbot, without_liabilities())
    bare.show_mode("reverse")
    mode = bare.mode
    assert isinstance(mode, ReverseMode)
    _find(bench, mode, qtbot)
    assert "no liabilities" in bare.words.text()


# Two moves


def _run(bench: Bench, mode: GridMode, qtbot: QtBot) -> None:
    mode.run_button.click()
    qtbot.waitUntil(lambda: not bench.jobs.running, timeout=20_000)


def test_a_grid_holds_full_revaluations(
    bench: Bench, station: ShocksStation, grid: GridMode, qtbot: QtBot
) -> None:
    assert grid.first.axis is not None
    assert grid.second.axis is not None
    assert (grid.first.axis.label, grid.second.axis.label) == ("All rates", "Funds")
    for fields in (grid.first, grid.second):
        fields.steps.set_value(5)
    _run(bench, grid, qtbot)
    found = grid.grid
    assert found is not None
    assert found.surplus.shape == (5, 5)
    both = Shock("x", (Move(MoveKind.PARALLEL, -200.0), Move(MoveKind.VALUE, 0.25, target="fund")))
    expected = run_shock(shock_base(bench.book), both)
    assert found.surplus[0, 3] == pytest.approx(expected.surplus, rel=1e-10)
    assert grid.values.table_model.rowCount() == 5
    assert len(grid.values.table_model.columns) == 6
    assert column(grid.values, "size") == ["50", "25", "0", "−25", "−50"]
    assert [each.heading for each in grid.values.table_model.columns[1:3]] == ["−200 bp", "−100 bp"]
    assert float(column(grid.values, "c0")[1]) == pytest.approx(100 * expected.funding_ratio, abs=0.06)
    assert "cells there is a deficit" in station.words.text()


def test_the_heat_picture_is_read_by_keys_and_pointer(bench: Bench, grid: GridMode, qtbot: QtBot) -> None:
    for fields in (grid.first, grid.second):
        fields.steps.set_value(5)
    _run(bench, grid, qtbot)
    heat = grid.heat
    assert heat.title == "Funding ratio under all rates and funds"
    QTest.keyClick(heat.plot, Qt.Key.Key_Right)
    assert heat.reading.startswith("All rates 0 bp, Funds 0.00 %:")
    QTest.keyClick(heat.plot, Qt.Key.Key_Up)
    QTest.keyClick(heat.plot, Qt.Key.Key_Left)
    assert heat.reading.startswith("All rates −100 bp, Funds 25.00 %:")
    QTest.keyClick(heat.plot, Qt.Key.Key_Escape)
    assert not heat.reading
    grid.shown.setCurrentIndex(2)
    assert heat.title.startswith("Change in surplus")
    heat.read_cell(2, 2)
    assert heat.reading.endswith("EUR 0")


def test_a_long_name_keeps_to_its_axis(bench: Bench, station: ShocksStation, qtbot: QtBot) -> None:
    """It is whole in the choice and in the tip; title, axis and table have a short one."""
    name = "A fall of all rates that goes on for very much longer than anybody thought"
    settled(bench, station, qtbot, a_shocked_fund(replace(FALL, name=name)))
    station.show_mode("grid")
    grid = station.mode
    assert isinstance(grid, GridMode)
    axis = next(axis for axis in axes_of(bench.book, bench.book.shocks) if axis.label == name)
    assert axis.short_label == "A fall of all rates that go…"
    grid.second.which.set_value(axis)
    grid.second.suggest()
    _run(bench, grid, qtbot)
    assert grid.heat.title == "Funding ratio under all rates and “A fall of all rates that go…”"
    first = grid.values.table_model.columns[0]
    assert (first.heading, first.tooltip) == (axis.short_label, name)


def test_what_makes_no_grid_is_refused(bench: Bench, station: ShocksStation, grid: GridMode) -> None:
    grid.first.low.set_value(100.0)
    grid.first.high.set_value(-100.0)
    grid.run()
    assert "must rise" in station.stale_text
    grid.first.suggest()
    grid.second.low.set_value(-150.0)
    grid.run()
    assert "at most 100" in station.stale_text
    grid.second.which.set_value(grid.first.axis)
    grid.second.suggest()
    grid.run()
    assert "two different moves" in station.stale_text
    assert grid.grid is None
    assert grid.first.steps.high == MOST_STEPS
    assert not bench.jobs.running


def test_a_grid_of_shocks_runs_in_times_and_can_be_cancelled(
    bench: Bench, grid: GridMode, qtbot: QtBot
) -> None:
    grid.first.which.set_value(grid.first.which._choices[-1].value)
    grid.first.suggest()
    assert grid.first.axis is not None
    assert grid.first.axis.unit == "times"
    grid.run()
    grid.cancel()
    qtbot.waitUntil(lambda: not bench.jobs.running)
    assert grid.grid is None
    assert grid.run_button.isVisible()
    _run(bench, grid, qtbot)
    assert grid.grid is not None


def test_a_contour_is_where_the_level_is() -> None:
    x, y = np.linspace(0.0, 4.0, 5), np.linspace(-1.0, 1.0, 3)
    value = x[:, None] + 0.0 * y[None, :]
    path: QPainterPath = contour_path(x, y, value, 1.5)
    box = path.boundingRect()
    assert (box.left(), box.right()) == (1.5, 1.5)
    assert (box.top(), box.bottom()) == (-1.0, 1.0)
    value[2, 1] = np.nan
    assert contour_path(x, y, value, 1.5).elementCount() < path.elementCount()
    assert contour_path(x, y, value, 99.0).isEmpty()


def test_shades_part_at_the_level() -> None:
    for theme in (LIGHT, DARK):
        assert shade_of(theme, 0.0) == theme.surface
        below, above = shade_of(theme, -1.0), shade_of(theme, 1.0)
        assert below.red() > below.blue()
        assert above.blue() > above.red()
        assert contrast(below, theme.surface) > contrast(shade_of(theme, -0.2), theme.surface)
        assert shade_of(theme, float("nan")) == theme.raised


def test_the_batch_shows_the_worst_shock_and_a_grid(
    bench: Bench, station: ShocksStation, qtbot: QtBot
) -> None:
    worst, two = station.views()
    worst()
    table = tasks.shock(bench.book)
    expected = min(table.results, key=lambda result: result.change_in_surplus)
    assert station.selected == expected.shock
    two()
    qtbot.waitUntil(lambda: not bench.jobs.running)
    mode = station.mode
    assert isinstance(mode, GridMode)
    assert mode.grid is not None
    no_shocks = replace(bench.book, shocks=())
    bench.document.edit("None", no_shocks)
    settled(bench, station, qtbot)
    worst()
