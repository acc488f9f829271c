"""The terms of a line: asked for by button, key and menu, refused in one sentence, undone."""

from __future__ import annotations

from dataclasses import replace

import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QDialogButtonBox
from pytestqt.qtbot import QtBot

from desk.book import Indexation, IndexationKind, LineTerms, Side
from desk.window.standing.station import StandingStation
from desk.window.standing.terms_dialog import TermsDialog
from tests.window.benches import Bench, a_fund, dispose
from tests.window.standing.books import INFLATION, LINKED, column, show, with_inflation

PENSIONS = 3
"""The row of the first liability line."""


def ask(station: StandingStation, row: int = PENSIONS) -> TermsDialog:
    """The dialog on the terms of a line."""
    station.lines.table.go_to(row)
    station.lines.ask_terms()
    dialog = station.terms_dialog
    assert dialog is not None
    return dialog


def press_ok(dialog: TermsDialog) -> None:
    """Take the terms."""
    QTest.mouseClick(dialog.buttons.button(QDialogButtonBox.StandardButton.Ok), Qt.MouseButton.LeftButton)


def test_only_lines_of_flows_have_terms(station: StandingStation) -> None:
    lines = station.lines
    lines.table.go_to(0)
    assert not lines.terms_button.isEnabled()
    lines.ask_terms()
    assert station.terms_dialog is None
    lines.table.go_to(2)
    assert lines.terms_button.isEnabled()
    assert "Terms of the line…" in [action.text() for action in lines.table.make_menu().actions()]


def test_terms_are_asked_for_by_key_and_taken(station: StandingStation, bench: Bench, qtbot: QtBot) -> None:
    station.lines.table.go_to(PENSIONS)
    station.activateWindow()
    station.lines.table.setFocus()
    qtbot.waitUntil(station.lines.table.hasFocus)
    QTest.keyClick(station.lines.table, Qt.Key.Key_Return, Qt.KeyboardModifier.ControlModifier)
    dialog = station.terms_dialog
    assert dialog is not None
    assert dialog.windowTitle() == "Terms of pensions"
    dialog.kind.set_value(IndexationKind.RISING)
    dialog.kind.committed.emit(IndexationKind.RISING)
    assert not dialog.rise.isHidden()
    assert dialog.cap.isHidden()
    dialog.rise.set_value(0.02)
    press_ok(dialog)
    assert bench.book.line_terms == (
        LineTerms(Side.LIABILITIES, "pensions", Indexation(IndexationKind.RISING, rise=0.02)),
    )
    assert bench.document.undo_text == "Change of the terms of pensions"
    qtbot.waitUntil(lambda: station.terms_dialog is None)
    before = bench.document.standing
    show(bench, station, qtbot)
    after = bench.document.standing
    assert before is not None
    assert after is not None
    assert after.liabilities.present_value > before.liabilities.present_value
    assert column(station.lines.table, "indexation") == ["", "", "", "2\u202f% a year", ""]
    bench.document.undo()
    show(bench, station, qtbot)
    assert bench.book == a_fund()
    assert "indexation" not in [each.key for each in station.lines.table.table_model.columns]


def test_a_rate_or_a_spread_of_its_own(station: StandingStation, bench: Bench, qtbot: QtBot) -> None:
    dialog = ask(station)
    for name, value, words in (("rate", 0.04, "4\u202f%"), ("spread", 0.01, "curve + 1\u202f%")):
        choice = next(each for each in dialog.discounting._choices if each.value == name)
        dialog.discounting.set_value(choice.value)
        dialog.discounting.committed.emit(choice.value)
        field = getattr(dialog, name)
        assert not field.isHidden()
        field.set_value(value)
        press_ok(dialog)
        (terms,) = bench.book.line_terms
        assert getattr(terms, name) == value
        show(bench, station, qtbot)
        assert column(station.lines.table, "discounting")[PENSIONS] == words
        if name == "rate":
            standing = bench.document.standing
            assert standing is not None
            assert standing.lines[PENSIONS].measures.equivalent_rate == pytest.approx(0.04)
        dialog = ask(station)
        assert getattr(dialog, name).value == value
    dialog.reject()


def test_a_cap_below_its_floor_is_refused_in_one_sentence(
    station: StandingStation, bench: Bench, qtbot: QtBot
) -> None:
    fund = a_fund()
    show(bench, station, qtbot, replace(fund, basis=replace(fund.basis, inflation=INFLATION)))
    dialog = ask(station)
    dialog.kind.set_value(IndexationKind.COLLARED)
    dialog.kind.committed.emit(IndexationKind.COLLARED)
    dialog.floor.set_value(0.03)
    dialog.cap.set_value(0.01)
    dialog.cap.committed.emit(0.01)
    assert dialog.fault.text() == (
        "The cap of 1\u202f% is below the floor of 3\u202f%: raise the cap or lower the floor."
    )
    press_ok(dialog)
    assert station.terms_dialog is dialog
    assert not bench.document.can_undo
    dialog.cap.set_value(None)
    press_ok(dialog)
    (terms,) = bench.book.line_terms
    assert terms.indexation == Indexation(IndexationKind.COLLARED, floor=0.03)


def test_a_line_cannot_follow_prices_that_the_basis_does_not_state(
    station: StandingStation, bench: Bench
) -> None:
    dialog = ask(station)
    dialog.kind.set_value(IndexationKind.LINKED)
    dialog.kind.committed.emit(IndexationKind.LINKED)
    assert "no expected inflation" in dialog.fault.text()
    press_ok(dialog)
    assert not bench.document.can_undo
    dialog.reject()
    assert station.terms_dialog is None


def test_an_entry_that_was_not_read_keeps_the_dialog_open(station: StandingStation, bench: Bench) -> None:
    dialog = ask(station)
    dialog.kind.set_value(IndexationKind.RISING)
    dialog.kind.committed.emit(IndexationKind.RISING)
    dialog.rise.line.selectAll()
    QTest.keyClicks(dialog.rise.line, "much")
    dialog.rise.line.editingFinished.emit()
    press_ok(dialog)
    assert station.terms_dialog is dialog
    assert not bench.document.can_undo
    # What is unusual is taken, with a remark.
    dialog.rise.line.setText("12")
    dialog.rise.line.setModified(True)
    dialog.rise.line.editingFinished.emit()
    assert "outside the usual range" in dialog.rise.problem
    press_ok(dialog)
    assert bench.book.line_terms[0].indexation.rise == pytest.approx(0.12)


def test_terms_that_say_nothing_are_taken_away(station: StandingStation, bench: Bench, qtbot: QtBot) -> None:
    show(bench, station, qtbot, with_inflation())
    assert column(station.lines.table, "indexation")[PENSIONS] == "prices"
    station.lines.open_row(PENSIONS)
    assert station.lines.about.text().endswith("; rising with prices")
    station.lines.close_line()
    dialog = ask(station)
    assert dialog.kind.value is IndexationKind.LINKED
    dialog.kind.set_value(IndexationKind.FIXED)
    press_ok(dialog)
    assert not bench.book.line_terms
    bench.document.undo()
    assert bench.book.line_terms == LINKED


def test_the_same_terms_are_no_edit(station: StandingStation, bench: Bench, qtbot: QtBot) -> None:
    show(bench, station, qtbot, with_inflation())
    press_ok(ask(station))
    assert not bench.document.can_undo


def test_every_field_of_the_dialog_has_a_name(qtbot: QtBot) -> None:
    terms = LineTerms(
        Side.ASSETS, "rent", Indexation(IndexationKind.COLLARED, floor=0.0, cap=0.05), rate=0.03
    )
    dialog = TermsDialog(terms, has_inflation=True)
    dialog.show()
    assert dialog.entered == terms
    names = [field.editor.accessibleName() for field in dialog._fields() if field.isVisible()]
    assert names == ["Amounts", "Floor, % a year", "Cap, % a year", "Discounted at", "Rate, % a year"]
    dispose(dialog)
