"""The station Curve: quotes shown, edited and pasted; the picture; the premiums."""

from __future__ import annotations

import numpy as np
import pytest
from PySide6.QtCore import QLocale, Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtTest import QTest
from pytestqt.qtbot import QtBot

from desk.book import CurveKind
from desk.rates.compounding import Compounding, to_continuous
from desk.rates.curve import Interpolation
from desk.rates.day_count import DayCount
from desk.rates.smith_wilson import Extrapolation
from desk.window.curve.edits import merged, next_term, quotes_fault, read_cells
from desk.window.curve.station import CurveStation
from desk.window.parts.theme import ThemeSwitch
from tests.window.benches import Bench, a_fund, dispose


def put_on_clipboard(text: str) -> None:
    QGuiApplication.clipboard().setText(text)


def edit(station: CurveStation, row: int, key: str, text: str) -> bool:
    model = station.quotes.table.table_model
    return model.setData(model.index(row, model.column_of(key)), text)


def shown(station: CurveStation, row: int, key: str) -> str:
    model = station.quotes.table.table_model
    return str(model.data(model.index(row, model.column_of(key))))


# What is shown


def test_without_a_book_it_asks_for_one(bench: Bench, qtbot: QtBot, theme_switch: ThemeSwitch) -> None:
    station = CurveStation(bench.document, bench.jobs, theme_switch)
    station.show()
    assert station.is_empty
    with qtbot.waitSignal(station.step_wanted) as wanted:
        station.empty.button.click()
    assert wanted.args == ["open"]
    dispose(station)


def test_the_table_shows_the_quotes_and_what_follows(station: CurveStation) -> None:
    assert station.quotes.table.table_model.rowCount() == 4
    assert shown(station, 0, "rate") == "2.000"
    # ln(1.02) = 0.0198026, 1/1.02 = 0.980392, and from 1 to 2 years ln(1.022² / 1.02) = 0.0237204.
    assert shown(station, 0, "zero") == "1.9803"
    assert shown(station, 0, "discount") == "0.980392"
    assert shown(station, 0, "forward") == "2.3720"


def test_the_picture_reads_zero_forward_and_discount(station: CurveStation) -> None:
    readings = dict(station.picture.readings_at(1.0))
    assert readings["Quote"] == readings["Zero"] == "2.000"
    assert readings["Discount"] == "0.9804"
    assert "Forward" in readings


def test_the_picture_reaches_beyond_the_last_quote(station: CurveStation) -> None:
    assert "beyond the last quote the forward rate stays at" in station.picture.description
    assert dict(station.picture.readings_at(11.0)).keys() == {"Zero", "Forward", "Discount", "extrapolated"}


def test_rates_are_shown_continuously_on_request(station: CurveStation, bench: Bench) -> None:
    station.shown_as.combo.setCurrentIndex(1)
    station.shown_as.combo.activated.emit(1)
    assert dict(station.picture.readings_at(1.0))["Zero"] == "1.980"
    assert not bench.document.is_modified


# Editing


def test_a_rate_typed_over_is_an_edit(station: CurveStation, bench: Bench) -> None:
    assert edit(station, 1, "rate", "2.5")
    assert bench.book.basis.rates[1] == 0.025
    assert bench.document.undo_text == "Change of the rate at 2 years"
    station.refresh_now()
    assert shown(station, 1, "rate") == "2.500"
    bench.document.undo()
    station.refresh_now()
    assert shown(station, 1, "rate") == "2.200"


@pytest.mark.parametrize(
    ("text", "reason"),
    [
        ("0", "above 0 years"),
        ("-3", "above 0 years"),
        ("1", "would stand twice"),
        ("7", "Terms must rise"),
    ],
)
def test_a_term_that_gives_no_curve_is_refused(
    station: CurveStation, bench: Bench, text: str, reason: str
) -> None:
    before = bench.book
    assert not edit(station, 1, "term", text)
    assert reason in station.stale_text
    assert "The curve is unchanged." in station.stale_text
    assert bench.book is before
    assert not bench.document.can_undo


def test_the_reason_goes_with_the_next_edit_that_is_taken(station: CurveStation) -> None:
    edit(station, 1, "term", "0")
    assert station.stale_text
    edit(station, 1, "term", "3")
    station.refresh_now()
    assert not station.stale_text


def test_words_are_no_rate(station: CurveStation, bench: Bench) -> None:
    assert not edit(station, 0, "rate", "high")
    assert "“high” is not a number" in station.stale_text
    assert not bench.document.can_undo


def test_a_quote_is_added_on_the_curve(station: CurveStation, bench: Bench) -> None:
    before = bench.book.basis.curve.zero([1.5, 3.5, 7.0])
    station.quotes.table.go_to(1)
    station.quotes.add()
    basis = bench.book.basis
    assert basis.terms.tolist() == [1.0, 2.0, 3.5, 5.0, 10.0]
    assert basis.curve.zero([1.5, 3.5, 7.0]) == pytest.approx(before, abs=2e-6)
    assert station.quotes.table.current_source_row() == 2


def test_the_keyboard_adds_and_removes(station: CurveStation, bench: Bench, qtbot: QtBot) -> None:
    station.activateWindow()
    station.quotes.table.setFocus()
    qtbot.waitUntil(station.quotes.table.hasFocus)
    station.quotes.table.go_to(3)
    QTest.keyClick(station.quotes.table, Qt.Key.Key_Insert)
    assert bench.book.basis.terms.tolist() == [1.0, 2.0, 5.0, 10.0, 15.0]
    station.quotes.table.selectRow(0)
    QTest.keyClick(station.quotes.table, Qt.Key.Key_Delete)
    assert bench.book.basis.terms.tolist() == [2.0, 5.0, 10.0, 15.0]


def test_the_last_quote_cannot_be_removed(station: CurveStation, bench: Bench) -> None:
    station.quotes.table.selectAll()
    station.quotes.remove()
    assert "at least one quote" in station.stale_text
    assert bench.book.basis.terms.size == 4


def test_quotes_from_elsewhere_that_give_no_curve_can_be_mended(station: CurveStation, bench: Bench) -> None:
    bench.edit_basis(terms=np.array([1.0, 1.0]), rates=np.array([0.02, 0.03]))
    station.refresh_now()
    assert "no curve" in station.stale_text
    assert "1 years would stand twice" in station.stale_text
    assert shown(station, 0, "discount") == "–"
    assert not station.picture.names
    assert edit(station, 1, "term", "2")
    station.refresh_now()
    assert not station.stale_text
    assert "Zero" in station.picture.names


# Pasting


def test_rows_are_pasted_over_as_one_step(station: CurveStation, bench: Bench) -> None:
    put_on_clipboard("2\t2.4\n5\t2.8%\n")
    station.quotes.table.go_to(1)
    station.quotes.table.paste()
    assert bench.book.basis.rates.tolist() == [0.02, 0.024, 0.028, 0.03]
    bench.document.undo()
    assert bench.book.basis == a_fund().basis


def test_nothing_is_pasted_over_some_of_sorted_rows(station: CurveStation, bench: Bench) -> None:
    station.quotes.table.sortByColumn(1, Qt.SortOrder.DescendingOrder)
    put_on_clipboard("2\t2.4")
    station.quotes.table.go_to(1)
    station.quotes.table.paste()
    assert "the rows are sorted" in station.stale_text
    assert not bench.document.can_undo


def test_rows_beyond_the_last_are_added(station: CurveStation, bench: Bench) -> None:
    put_on_clipboard("10\t3.1\n20\t3.2\n30\t3.0")
    station.quotes.table.go_to(3)
    station.quotes.table.paste()
    assert bench.book.basis.terms.tolist() == [1.0, 2.0, 5.0, 10.0, 20.0, 30.0]


def test_every_bad_cell_is_named_and_nothing_is_pasted(station: CurveStation, bench: Bench) -> None:
    put_on_clipboard("1\t2.1\ntwo\t2.2\n5\t#N/A\n")
    station.quotes.table.go_to(0)
    station.quotes.table.paste()
    assert "Nothing was pasted." in station.stale_text
    assert "Row 2: “two” is no term." in station.stale_text
    assert "Row 3: “#N/A” is no rate." in station.stale_text
    assert not bench.document.can_undo


def test_pasted_terms_that_do_not_rise_are_refused(station: CurveStation, bench: Bench) -> None:
    put_on_clipboard("9\t2.1")
    station.quotes.table.go_to(1)
    station.quotes.table.paste()
    assert "5 years would come after 9 years" in station.stale_text
    assert not bench.document.can_undo


def test_a_whole_curve_takes_the_place_of_all(station: CurveStation, bench: Bench, qtbot: QtBot) -> None:
    put_on_clipboard("Term\tRate\n0.5\t1.9 %\n30\t3,000.5E-3")
    with qtbot.waitSignal(station.message) as told:
        station.quotes.replace_button.click()
    assert bench.book.basis.terms.tolist() == [0.5, 30.0]
    assert bench.book.basis.rates == pytest.approx([0.019, 0.030005])
    assert "read as percent a year" in told.args[0]
    assert bench.document.undo_text == "Pasted curve"


def test_figures_are_read_in_the_readers_locale(station: CurveStation, bench: Bench) -> None:
    QLocale.setDefault(QLocale(QLocale.Language.German, QLocale.Country.Germany))
    put_on_clipboard("0,5\t1,9\n1\t2,05\n")
    station.quotes.replace_all()
    assert bench.book.basis.terms.tolist() == [0.5, 1.0]
    assert bench.book.basis.rates == pytest.approx([0.019, 0.0205])


def test_a_paste_on_what_follows_is_explained(station: CurveStation, bench: Bench) -> None:
    put_on_clipboard("0.97")
    station.quotes.table.go_to(0, 3)
    station.quotes.table.paste()
    assert "the other columns follow" in station.stale_text
    assert not bench.document.can_undo


def test_an_empty_clipboard_is_said(station: CurveStation) -> None:
    put_on_clipboard("")
    station.quotes.replace_all()
    assert "nothing to paste" in station.stale_text


# The form


def test_interpolation_and_spread_are_edits(station: CurveStation, bench: Bench) -> None:
    station.fields.interpolation.committed.emit(Interpolation.MONOTONE_CONVEX)
    station.fields.liability_spread.committed.emit(0.01)
    assert bench.book.basis.interpolation is Interpolation.MONOTONE_CONVEX
    assert bench.book.basis.liability_spread == 0.01
    assert bench.document.undo_text == "Change of the liability spread"


def test_compounding_says_what_the_figures_mean(station: CurveStation, bench: Bench) -> None:
    station.fields.compounding.committed.emit(Compounding.QUARTERLY)
    station.refresh_now()
    basis = bench.book.basis
    assert basis.rates.tolist() == a_fund().basis.rates.tolist()
    assert basis.curve.zero(basis.terms) == pytest.approx(to_continuous(basis.rates, Compounding.QUARTERLY))
    assert "compounded quarterly" in station.fields.compounding.hint


def test_quotes_of_another_kind_give_another_curve(station: CurveStation, bench: Bench) -> None:
    before = bench.book.basis.curve.zero(bench.book.basis.terms)
    assert station.fields.payments.isHidden()
    station.fields.curve_kind.committed.emit(CurveKind.SWAP)
    station.fields.payments.committed.emit(2)
    station.refresh_now()
    basis = bench.book.basis
    assert (basis.curve_kind, basis.payments_per_year) == (CurveKind.SWAP, 2)
    assert not np.allclose(basis.curve.zero(basis.terms), before)
    assert not station.fields.payments.isHidden()
    assert shown(station, 3, "zero") == f"{100 * float(basis.curve.zero(basis.terms[3])):.4f}"


def test_a_curve_goes_on_to_an_ultimate_forward_rate(station: CurveStation, bench: Bench) -> None:
    station.fields.extrapolation.committed.emit(Extrapolation.SMITH_WILSON)
    assert "ultimate forward rate" in station.stale_text
    assert bench.book.basis.extrapolation is Extrapolation.FLAT_FORWARD
    assert station.fields.extrapolation.value is Extrapolation.FLAT_FORWARD
    station.fields.ultimate_forward_rate.committed.emit(0.033)
    station.fields.extrapolation.committed.emit(Extrapolation.SMITH_WILSON)
    station.fields.last_liquid_point.committed.emit(float(bench.book.basis.terms[-2]))
    station.refresh_now()
    basis = bench.book.basis
    far = float(basis.curve.forward(150.0, 151.0))
    assert far == pytest.approx(np.log(1.033), abs=1e-4)
    assert station.fields.interpolation.isHidden()
    # The quote that is left out is still in the table, with what the curve says there.
    assert shown(station, 3, "zero") == f"{100 * float(basis.curve.zero(basis.terms[3])):.4f}"
    assert "3.30 %" in station.picture.accessibleDescription().replace(" ", " ").replace("\u202f", " ")


def test_the_day_count_moves_the_dates(station: CurveStation, bench: Bench) -> None:
    station.fields.day_count.committed.emit(DayCount.ACT_360)
    assert bench.book.basis.day_count is DayCount.ACT_360


# The pieces


@pytest.mark.parametrize(
    ("terms", "rates", "part"),
    [
        ([], [], "at least one"),
        ([1.0, np.nan], [0.1, 0.1], "a term and a rate"),
        ([1.0], [np.inf], "a term and a rate"),
        ([0.0], [0.02], "above 0 years"),
        ([1.0], [-1.0], "from −50 to 100"),
        ([1.0, 2.0], [0.02, 9.0], "not 900"),
        ([1.0, 250.0], [0.02, 0.02], "at most 200 years"),
        ([1.0, 2.0], [-0.01, 0.0], ""),
        ([1.0, 200.0], [-0.5, 1.0], ""),
    ],
)
def test_what_is_wrong_with_quotes(terms: list[float], rates: list[float], part: str) -> None:
    fault = quotes_fault(np.array(terms), np.array(rates))
    assert part in fault
    assert bool(fault) == bool(part)


def test_spreads_may_begin_today() -> None:
    terms, spreads = np.array([0.0, 5.0]), np.array([0.01, 0.012])
    assert not quotes_fault(terms, spreads, what="spread", from_zero=True)
    assert "at least 0 years" in quotes_fault(-terms[::-1], spreads, what="spread", from_zero=True)


def test_a_curve_that_cannot_converge_is_refused(station: CurveStation, bench: Bench) -> None:
    bench.edit_basis(
        extrapolation=Extrapolation.SMITH_WILSON, ultimate_forward_rate=0.04, convergence_tolerance=1e-10
    )
    station.refresh_now()
    before = bench.book
    for point, reason in ((5.0, "not after the last liquid point"), (10.5, "No alpha brings")):
        station.fields.convergence_point.committed.emit(point)
        assert reason in station.stale_text
        assert "The curve is unchanged." in station.stale_text
        assert bench.book is before
    station.fields.convergence_point.committed.emit(70.0)
    assert bench.book.basis.convergence_point == 70.0


def test_a_tolerance_is_taken_or_refused_with_its_reason(station: CurveStation, bench: Bench) -> None:
    bench.edit_basis(extrapolation=Extrapolation.SMITH_WILSON, ultimate_forward_rate=0.04)
    station.refresh_now()
    line = station.fields.tolerance.line

    def enter(text: str) -> None:
        line.clear()
        QTest.keyClicks(line, text)
        QTest.keyClick(line, Qt.Key.Key_Return)

    enter("0.0000001")
    assert bench.book.basis.convergence_tolerance == pytest.approx(1e-9, rel=1e-12)
    assert not station.stale_text
    before = bench.book
    for text in ("0", "-0.01"):
        enter(text)
        assert station.stale_text.startswith("The tolerance is not above 0. One basis point is usual.")
        assert bench.book is before
        assert line.text() == "0.0000001"


def test_ctrl_tab_goes_from_page_to_page(station: CurveStation, qtbot: QtBot) -> None:
    station.activateWindow()
    station.quotes.table.setFocus()
    qtbot.waitUntil(station.quotes.table.hasFocus)
    control, shift = Qt.KeyboardModifier.ControlModifier, Qt.KeyboardModifier.ShiftModifier
    QTest.keyClick(station.quotes.table, Qt.Key.Key_Tab, control)
    assert station.pages.current == "rates"
    assert station.focusWidget() is station.rates.table
    QTest.keyClick(station.rates.table, Qt.Key.Key_Backtab, control | shift)
    assert station.pages.current == "source"


@pytest.mark.parametrize("grid", [[], [[]], [["", ""]], [["Term", "Rate"]]])
def test_cells_without_a_quote_are_said_to_hold_none(grid: list[list[str]]) -> None:
    assert read_cells(grid, "term").faults == ("There is no quote among what was pasted.",)


def test_too_many_columns_and_rows_are_refused() -> None:
    assert "3 columns" in read_cells([["1", "2", "3"]], "term").fault
    assert "2 columns" in read_cells([["1", "2"]], "rate").fault
    assert "too many" in read_cells([["1", "2"]] * 10_001, "term").fault


def test_a_long_list_of_faults_is_cut() -> None:
    found = read_cells([["x", "y"]] * 40 + [["1", "z9"]], "term")
    assert "more." in found.fault
    assert len(found.faults) > 70
    assert len(found.fault) < 400


def test_rates_alone_do_not_make_new_rows() -> None:
    terms, rates = np.array([1.0, 2.0]), np.array([0.01, 0.02])
    _, _, fault = merged(terms, rates, read_cells([["1"], ["2"]], "rate"), 1)
    assert "fewer rows" in fault
    _, after, fault = merged(terms, rates, read_cells([["3"]], "rate"), 1)
    assert not fault
    assert after.tolist() == [0.01, 0.03]


def test_a_quote_after_the_last_is_as_far_again() -> None:
    terms = a_fund().basis.terms
    assert next_term(terms, 3) == 15.0
    assert next_term(terms, 0) == 1.5
    assert next_term(terms[:1], 0) == 2.0
    assert next_term(np.zeros(0), -1) == 1.0
