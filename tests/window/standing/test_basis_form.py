"""The form of the basis: liability methods, spreads by term, and what is refused."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtTest import QTest
from pytestqt.qtbot import QtBot

from desk.book import BondFit, LiabilityMethod
from desk.window.standing.edits import NO_CORPORATE_BONDS
from desk.window.standing.spreads import SpreadsTable
from desk.window.standing.station import StandingStation
from tests.window.benches import Bench, a_fund
from tests.window.standing.books import show, some_bonds


def choose(station: StandingStation, method: LiabilityMethod) -> None:
    """Choose a method as the reader would."""
    field = station.basis_form.method
    place = next(place for place, each in enumerate(LiabilityMethod) if each is method)
    field.combo.setCurrentIndex(place)
    field.combo.activated.emit(place)


def by_term(station: StandingStation, bench: Bench, qtbot: QtBot) -> SpreadsTable:
    """The table of spreads of a book that has some."""
    basis = replace(
        a_fund().basis,
        liability_method=LiabilityMethod.TERM_SPREADS,
        liability_terms=np.array([1.0, 5.0, 10.0]),
        liability_spreads=np.array([0.001, 0.002, 0.003]),
    )
    show(bench, station, qtbot, replace(a_fund(), basis=basis))
    return station.basis_form.spreads


def test_only_what_belongs_to_the_method_is_shown(
    station: StandingStation, bench: Bench, qtbot: QtBot
) -> None:
    form = station.basis_form
    parts = (form.expected_return, form.spreads, form.bond_fit, form.bonds_note)
    assert [part.isHidden() for part in parts] == [True] * 4
    choose(station, LiabilityMethod.EXPECTED_RETURN)
    assert bench.document.undo_text == "Change of the liability basis"
    show(bench, station, qtbot)
    assert [part.isHidden() for part in parts] == [False, True, True, True]
    choose(station, LiabilityMethod.TERM_SPREADS)
    show(bench, station, qtbot)
    assert [part.isHidden() for part in parts] == [True, False, True, True]
    assert form.spreads.table.table_model.rowCount() == 5
    bench.document.undo()
    bench.document.undo()
    show(bench, station, qtbot)
    assert form.method.value is LiabilityMethod.CURVE
    assert bench.book == a_fund()


def test_corporate_bonds_that_are_not_there_are_asked_for(station: StandingStation, bench: Bench) -> None:
    choose(station, LiabilityMethod.CORPORATE_BONDS)
    assert station.stale_text == f"{NO_CORPORATE_BONDS} The basis is unchanged."
    assert station.basis_form.method.value is LiabilityMethod.CURVE
    assert bench.book == a_fund()
    station.strip.button.click()
    assert station.stale_text == ""


def test_corporate_bonds_are_counted_and_their_fit_is_chosen(
    station: StandingStation, bench: Bench, qtbot: QtBot
) -> None:
    fund = a_fund()
    show(
        bench,
        station,
        qtbot,
        replace(fund, basis=replace(fund.basis, liability_bonds=some_bonds(), liability_fit=BondFit.EXACT)),
    )
    before = bench.document.standing
    choose(station, LiabilityMethod.CORPORATE_BONDS)
    show(bench, station, qtbot)
    assert "8 bonds" in station.basis_form.bonds_note.text()
    after = bench.document.standing
    assert before is not None
    assert after is not None
    assert after.liabilities.equivalent_rate != pytest.approx(before.liabilities.equivalent_rate, abs=1e-4)
    station.basis_form.bond_fit.committed.emit(BondFit.NELSON_SIEGEL)
    assert bench.book.basis.liability_fit is BondFit.NELSON_SIEGEL
    assert bench.document.undo_text == "Change of the fit of the corporate bonds"


def test_an_expected_return_is_edited(station: StandingStation, bench: Bench, qtbot: QtBot) -> None:
    choose(station, LiabilityMethod.EXPECTED_RETURN)
    show(bench, station, qtbot)
    field = station.basis_form.expected_return
    field.line.selectAll()
    QTest.keyClicks(field.line, "6")
    QTest.keyClick(field.line, Qt.Key.Key_Return)
    assert bench.book.basis.expected_return == 0.06
    show(bench, station, qtbot)
    standing = bench.document.standing
    assert standing is not None
    # The flat rate with the flat spread on its continuous form.
    expected = 1.06 * np.exp(bench.book.basis.liability_spread) - 1.0
    assert standing.liabilities.equivalent_rate == pytest.approx(expected, rel=1e-9)
    assert f"{100 * expected:.3f}" in station.basis_form.equivalent_note.text()


def test_an_entry_that_is_not_finished_is_left_alone(
    station: StandingStation, bench: Bench, qtbot: QtBot
) -> None:
    field = station.basis_form.liability_spread
    station.activateWindow()
    field.line.setFocus()
    qtbot.waitUntil(field.line.hasFocus)
    field.line.selectAll()
    QTest.keyClicks(field.line, "1.2")
    bench.edit_basis(market_risk_premium=0.03)
    show(bench, station, qtbot)
    assert field.line.text() == "1.2"
    QTest.keyClick(field.line, Qt.Key.Key_Return)
    assert bench.book.basis.liability_spread == 0.012


# Spreads by term


def test_a_spread_is_edited_in_its_cell(station: StandingStation, bench: Bench, qtbot: QtBot) -> None:
    model = by_term(station, bench, qtbot).table.table_model
    assert model.setData(model.index(1, 1), "0.45")
    assert bench.book.basis.liability_spreads.tolist() == [0.001, 0.0045, 0.003]
    assert bench.document.undo_text == "Change of the liability spread at 5 years"
    assert not model.setData(model.index(1, 0), "20")
    assert "Terms must rise" in station.stale_text
    assert bench.book.basis.liability_terms.tolist() == [1.0, 5.0, 10.0]


def test_terms_are_added_and_removed(station: StandingStation, bench: Bench, qtbot: QtBot) -> None:
    spreads = by_term(station, bench, qtbot)
    station.activateWindow()
    spreads.table.setFocus()
    qtbot.waitUntil(spreads.table.hasFocus)
    spreads.table.go_to(1)
    QTest.keyClick(spreads.table, Qt.Key.Key_Insert)
    assert bench.book.basis.liability_terms.tolist() == [1.0, 5.0, 7.5, 10.0]
    assert bench.book.basis.liability_spreads[2] == pytest.approx(0.0025)
    show(bench, station, qtbot)
    spreads.table.go_to(3)
    spreads.add_button.click()
    assert bench.book.basis.liability_terms.tolist() == [1.0, 5.0, 7.5, 10.0, 20.0]
    show(bench, station, qtbot)
    spreads.table.go_to(0)
    QTest.keyClick(spreads.table, Qt.Key.Key_Delete)
    assert bench.book.basis.liability_terms.tolist() == [5.0, 7.5, 10.0, 20.0]
    show(bench, station, qtbot)
    spreads.table.selectAll()
    spreads.remove_button.click()
    assert "one term at least" in station.stale_text
    spreads.table.clearSelection()
    spreads.remove_button.click()
    assert station.stale_text == "Select the terms to remove."


def test_spreads_are_pasted(station: StandingStation, bench: Bench, qtbot: QtBot) -> None:
    spreads = by_term(station, bench, qtbot)
    QGuiApplication.clipboard().setText("Term\tSpread\n2\t0.2\n6\t0.35\n12\t0.5\n25\t0.6\n")
    spreads.table.go_to(0)
    spreads.table.paste()
    basis = bench.book.basis
    assert basis.liability_terms.tolist() == [2.0, 6.0, 12.0, 25.0]
    assert basis.liability_spreads.tolist() == [0.002, 0.0035, 0.005, 0.006]
    assert bench.document.undo_text == "Pasted liability spreads"
    show(bench, station, qtbot)
    QGuiApplication.clipboard().setText("3\tmuch\n")
    spreads.table.go_to(0)
    spreads.table.paste()
    assert station.stale_text.startswith("Nothing was pasted.")
    assert bench.book.basis == basis
    QGuiApplication.clipboard().setText("1\t0.1\n2\t0.2\n")
    spreads.table.selectAll()
    spreads.table.paste()
    assert bench.book.basis.liability_terms.size == 2
