"""Two bases side by side: the table of measures, the lines, the form that holds and swaps them."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtGui import QGuiApplication
from pytestqt.qtbot import QtBot

from desk.valuation.standing import stand
from desk.window.standing.comparison import compared_measures
from desk.window.standing.edits import swapped
from desk.window.standing.station import StandingStation
from tests.window.benches import Bench, a_fund
from tests.window.standing.books import LINKED, column, show, two_bases, with_inflation


def test_every_measure_is_compared() -> None:
    book = two_bases()
    first, second = stand(book), stand(swapped(book))
    rows = {(row.group, row.name): row for row in compared_measures(first, second)}
    assert len(rows) == 4 + 2 * 8
    owed = rows["Liabilities", "Present value"]
    factor = {"EUR": 1.0, "EUR thousand": 1e3, "EUR million": 1e6}[owed.unit]
    assert owed.first * factor == pytest.approx(first.liabilities.present_value)
    assert owed.difference * factor == pytest.approx(
        first.liabilities.present_value - second.liabilities.present_value
    )
    assert owed.difference > 0.0
    rate = rows["Liabilities", "Equivalent rate"]
    assert rate.unit == "% a year"
    assert rate.second == pytest.approx(100 * second.liabilities.equivalent_rate)
    assert rows["Assets", "Present value"].difference == 0.0
    ratio = rows["Both sides", "Funding ratio"]
    assert ratio.difference == pytest.approx(100 * (first.funding_ratio - second.funding_ratio))
    assert rows["Both sides", "DV01 gap"].second != 0.0


def test_inflation_figures_are_compared_where_either_basis_has_them() -> None:
    book = with_inflation()
    first = stand(book)
    second = stand(replace(book, basis=a_fund().basis, line_terms=()))
    assert first.inflation is not None
    assert second.inflation is None
    rows = {(row.group, row.name): row for row in compared_measures(first, second)}
    duration = rows["Liabilities", "Inflation duration"]
    assert duration.first == pytest.approx(first.inflation.liabilities_duration)
    assert np.isnan(duration.second)
    assert np.isnan(duration.difference)
    assert rows["Both sides", "Real duration gap"].first == pytest.approx(first.inflation.real_duration_gap)


def test_without_a_second_basis_nothing_of_it_is_shown(station: StandingStation) -> None:
    assert not station.pages.has_page("comparison")
    assert not station.basis_form.compare.isEnabled()
    assert station.basis_form.swap_button.isHidden()
    assert station.basis_form.drop_button.isHidden()
    assert "one basis" in station.basis_form.second_note.text()
    keys = [each.key for each in station.lines.table.table_model.columns]
    assert "second_value" not in keys


def test_the_bases_stand_side_by_side(station: StandingStation, bench: Bench, qtbot: QtBot) -> None:
    show(bench, station, qtbot, two_bases())
    assert station.pages.has_page("comparison")
    table = station.comparison.table
    assert column(table, "name")[:4] == ["Surplus", "Funding ratio", "Duration gap", "DV01 gap"]
    assert column(table, "difference")[0].startswith("−")
    assert "spread 2.00" in station.comparison.words.text()
    model = table.table_model
    first, second = model.column_values("first"), model.column_values("second")
    np.testing.assert_allclose(model.column_values("difference"), first - second)
    table.selectAll()
    table.copy()
    text = QGuiApplication.clipboard().text()
    assert text.startswith("Side\tMeasure\tFirst basis (in the unit)\tSecond basis (in the unit)\tDifference")
    assert len(text.splitlines()) == 1 + model.rowCount()
    standing, other = bench.document.standing, bench.document.second_standing
    assert standing is not None
    assert other is not None
    note = station.basis_form.equivalent_note.text()
    assert f"{100 * standing.liabilities.equivalent_rate:.3f}" in note
    assert f"{100 * other.liabilities.equivalent_rate:.3f}" in note


def test_the_lines_show_their_value_on_the_second_basis(
    station: StandingStation, bench: Bench, qtbot: QtBot
) -> None:
    station.lines.table.go_to(3)
    show(bench, station, qtbot, two_bases())
    other = bench.document.second_standing
    assert other is not None
    model = station.lines.table.table_model
    values = model.column_values("second_value")
    assert values.tolist() == [line.measures.present_value for line in other.lines]
    np.testing.assert_allclose(
        model.column_values("second_difference"), model.column_values("present_value") - values
    )
    assert column(station.lines.table, "second_difference")[3].startswith("+")
    assert station.lines.totals.table_model.column_values("second_value").tolist() == [
        other.assets.present_value,
        other.liabilities.present_value,
    ]
    assert station.lines.table.current_source_row() == 3


def test_the_comparison_is_put_off_in_the_form(station: StandingStation, bench: Bench, qtbot: QtBot) -> None:
    show(bench, station, qtbot, two_bases())
    station.pages.show_page("comparison")
    station.basis_form.compare.committed.emit(False)
    station.refresh_now()
    assert not station.pages.has_page("comparison")
    assert station.pages.current == "lines"
    assert station.basis_form.compare.value is False
    assert "second_value" not in [each.key for each in station.lines.table.table_model.columns]
    assert "second" not in station.basis_form.equivalent_note.text()
    assert not bench.document.can_undo
    station.basis_form.compare.committed.emit(True)
    station.refresh_now()
    assert station.pages.has_page("comparison")


def test_hold_swap_and_take_away_are_edits(station: StandingStation, bench: Bench, qtbot: QtBot) -> None:
    form, document = station.basis_form, bench.document
    form.hold_button.click()
    assert bench.book.second_basis == bench.book.basis
    assert document.undo_text == "Basis held as the second"
    show(bench, station, qtbot)
    assert station.pages.has_page("comparison")
    assert set(column(station.comparison.table, "difference")) == {"0.000"}
    form.liability_spread.committed.emit(0.03)
    show(bench, station, qtbot)
    assert column(station.comparison.table, "difference")[0].startswith("+")
    form.swap_button.click()
    assert bench.book.basis.liability_spread == 0.005
    assert bench.book.second_basis is not None
    assert bench.book.second_basis.liability_spread == 0.03
    show(bench, station, qtbot)
    assert column(station.comparison.table, "difference")[0].startswith("−")
    form.drop_button.click()
    assert bench.book.second_basis is None
    show(bench, station, qtbot)
    assert not station.pages.has_page("comparison")
    for _ in range(4):
        document.undo()
    assert bench.book == a_fund()
    assert not document.can_undo


def test_a_second_basis_without_a_curve_leaves_the_first(
    station: StandingStation, bench: Bench, qtbot: QtBot
) -> None:
    show(bench, station, qtbot, two_bases(terms=np.array([2.0, 1.0]), rates=np.array([0.02, 0.02])))
    assert bench.document.standing is not None
    assert bench.document.second_standing is None
    assert station.stale_text.startswith("The second basis could not be valued: ")
    assert station.pages.has_page("comparison")
    assert station.comparison.table.table_model.rowCount() == 0
    assert column(station.lines.table, "line")[0] == "bond"
    station.basis_form.drop_button.click()
    show(bench, station, qtbot)
    assert station.stale_text == ""


def test_what_the_second_basis_could_not_do_is_said(
    station: StandingStation, bench: Bench, qtbot: QtBot
) -> None:
    book = replace(with_inflation(), second_basis=a_fund().basis)
    show(bench, station, qtbot, book)
    (fault,) = bench.document.second_faults
    assert bench.document.faults == (fault,)
    assert station.stale_text == f"On the second basis: {fault}"
    bench.document.compare(False)
    station.refresh_now()
    assert station.stale_text == ""


def test_a_book_whose_lines_differ_in_place_is_not_compared_line_by_line(
    station: StandingStation, bench: Bench
) -> None:
    standing = bench.document.standing
    assert standing is not None
    other = replace(standing, lines=standing.lines[::-1])
    station.lines.show_standing(standing, terms=LINKED, second=other)
    values = station.lines.table.table_model.column_values("second_value")
    # The middle line alone is where it was.
    assert np.isnan(values).tolist() == [True, True, False, True, True]


def test_nothing_is_cut_at_the_least_usual_size(station: StandingStation, bench: Bench, qtbot: QtBot) -> None:
    """1280 by 720 less rail, headline and foot, with every page there can be."""
    book = with_inflation()
    show(bench, station, qtbot, replace(book, second_basis=replace(book.basis, liability_spread=0.02)))
    tabs = station.pages.tabs

    def shown() -> int:
        return sum(tabs.tabRect(place).width() for place in range(tabs.count()) if tabs.isTabVisible(place))

    # The row is laid out anew in the next turn of the event loop.
    qtbot.waitUntil(lambda: 0 < shown() <= tabs.width())
    assert all(tabs.isTabVisible(place) for place in range(tabs.count()))
    form = station.basis_form
    for button in (form.hold_button, form.swap_button, form.drop_button, station.lines.terms_button):
        assert button.width() >= button.sizeHint().width()
    for name in ("comparison", "inflation"):
        station.pages.show_page(name)
        table = station.comparison.table if name == "comparison" else station.inflation.totals
        assert table.horizontalHeader().length() <= table.viewport().width()
