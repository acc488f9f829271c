"""Which curve is looked at, what it is compared with, and curves stated by parameters or one rate."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest

from desk.book import CurveKind, CurveParameters, Inflation, LiabilityMethod
from desk.rates.compounding import Compounding
from desk.rates.curve import Interpolation
from desk.rates.day_count import DayCount
from desk.rates.parametric import Svensson
from desk.rates.smith_wilson import Extrapolation
from desk.window.curve.editing import Editor
from desk.window.curve.station import CurveStation
from desk.window.curve.targets import Part, Target
from tests.window.benches import Bench, a_fund
from tests.window.curve.books import (
    as_cells,
    choices,
    choose,
    edit,
    put_on_clipboard,
    shown,
    some_bonds,
    tabs,
    with_bonds,
)

LIABILITIES, INFLATION = Target(Part.LIABILITIES), Target(Part.INFLATION)
SECOND = Target(Part.CURVE, is_second=True)


def plain(text: str) -> str:
    return text.replace("\N{MINUS SIGN}", "-")


# Kinds of curve


def test_a_flat_rate_starts_on_the_curve_at_the_mean_time(station: CurveStation, bench: Bench) -> None:
    # Level payments over ten years: 5.5 years on average.
    expected = np.expm1(bench.book.basis.curve.zero(5.5))
    choose(station.fields.curve_kind, "One flat rate")
    basis = bench.book.basis
    assert basis.curve_kind is CurveKind.FLAT
    assert basis.flat_rate == pytest.approx(expected, abs=5e-5)
    assert tabs(station) == ["Rates by term"]
    assert not station.fields.flat_rate.isHidden()
    assert station.fields.interpolation.isHidden()
    assert station.fields.extrapolation.isHidden()
    assert "extrapolated" not in dict(station.picture.readings_at(30.0))


@pytest.mark.parametrize("name", ["Nelson-Siegel parameters", "Svensson parameters"])
@pytest.mark.parametrize("compounding", [Compounding.ANNUAL, Compounding.SEMI_ANNUAL, Compounding.CONTINUOUS])
def test_parameters_start_near_the_curve(
    station: CurveStation, bench: Bench, name: str, compounding: Compounding
) -> None:
    bench.edit_basis(compounding=compounding, interpolation=Interpolation.CUBIC_ZERO)
    station.refresh_now()
    before = bench.book.basis.curve.zero([1.0, 3.0, 5.0, 8.0, 10.0])
    choose(station.fields.curve_kind, name)
    assert bench.book.basis.parameters is not None
    assert bench.book.basis.curve.zero([1.0, 3.0, 5.0, 8.0, 10.0]) == pytest.approx(before, abs=1.5e-3)
    is_svensson = name.startswith("Svensson")
    assert station.fields.parameters.fields["tau_2"].isHidden() is not is_svensson


def test_a_second_bend_of_nothing_leaves_the_curve(station: CurveStation, bench: Bench) -> None:
    choose(station.fields.curve_kind, "Nelson-Siegel parameters")
    before = bench.book.basis.curve.zero([1.0, 5.0, 30.0])
    choose(station.fields.curve_kind, "Svensson parameters")
    assert bench.book.basis.curve.zero([1.0, 5.0, 30.0]) == pytest.approx(before, abs=1e-12)


def test_a_parameter_typed_in_is_an_edit(station: CurveStation, bench: Bench) -> None:
    none = np.zeros(0)
    parameters = CurveParameters(0.04, -0.02, 0.01, 2.0, -0.01, 8.0)
    bench.edit_basis(curve_kind=CurveKind.SVENSSON, parameters=parameters, terms=none, rates=none)
    station.refresh_now()
    line = station.fields.parameters.fields["beta_0"].line
    line.setFocus()
    line.setText("3.5")
    line.setModified(True)
    line.editingFinished.emit()
    assert bench.book.basis.parameters == replace(parameters, beta_0=0.035)
    assert bench.document.undo_text == "Change of the level β₀"
    curve = Svensson(0.035, -0.02, 0.01, -0.01, 2.0, 8.0, Compounding.ANNUAL)
    assert dict(station.picture.readings_at(0.0))["Zero"] == f"{100 * np.expm1(curve.zero(0.0)):.3f}"


def test_the_way_back_finds_what_was_there(station: CurveStation, bench: Bench) -> None:
    first = bench.book.basis
    choose(station.fields.curve_kind, "One flat rate")
    assert bench.book.basis.terms.size == 0
    choose(station.fields.curve_kind, "Zero rates")
    assert bench.book.basis == first
    assert tabs(station) == ["Quotes", "Rates by term"]


def test_quotes_are_read_off_a_curve_that_has_none(station: CurveStation, bench: Bench) -> None:
    none = np.zeros(0)
    bench.edit_basis(curve_kind=CurveKind.FLAT, flat_rate=0.03, terms=none, rates=none)
    station.refresh_now()
    for name in ("Par yields", "Swap rates", "Zero rates"):
        choose(station.fields.curve_kind, name)
        # On a flat curve every par yield is the rate itself.
        assert bench.book.basis.rates == pytest.approx(np.full(11, 0.03), abs=1e-9)
        choose(station.fields.curve_kind, "One flat rate")


def test_smith_wilson_goes_with_quotes_and_comes_back_with_them(station: CurveStation, bench: Bench) -> None:
    bench.edit_basis(extrapolation=Extrapolation.SMITH_WILSON, ultimate_forward_rate=0.033)
    station.refresh_now()
    assert "at alpha 0." in station.picture.description
    choose(station.fields.curve_kind, "One flat rate")
    kinds = [bench.book.basis.extrapolation]
    choose(station.fields.curve_kind, "Zero rates")
    kinds.append(bench.book.basis.extrapolation)
    assert kinds == [Extrapolation.FLAT_FORWARD, Extrapolation.SMITH_WILSON]
    assert not station.fields.tolerance.isHidden()


def test_an_edit_that_gives_no_curve_names_the_quote(station: CurveStation, bench: Bench) -> None:
    bench.edit_basis(curve_kind=CurveKind.PAR)
    station.refresh_now()
    before = bench.book
    assert not edit(station.quotes.table, 3, "rate", "60")
    assert "Quote at 10 years: " in station.stale_text
    assert "smooth" not in station.stale_text
    assert "The curve is unchanged." in station.stale_text
    assert bench.book is before


# The liabilities' curve


def test_spreads_by_term_start_at_nothing(station: CurveStation, bench: Bench) -> None:
    station.look_at(LIABILITIES)
    before = bench.book.basis.liability_spread_at([1.0, 7.0])
    choose(station.fields.method, "The curve and a spread by term")
    assert tabs(station) == ["Spreads", "Rates by term"]
    assert bench.book.basis.liability_spread_at([1.0, 7.0]) == pytest.approx(before, abs=1e-15)
    put_on_clipboard("1\t0.2\n10\t0.8 %\n")
    station.quotes.replace_all()
    basis = bench.book.basis
    assert basis.liability_spreads.tolist() == [0.002, 0.008]
    # Half-way there the spread is 0.5 %, and the flat one of 0.5 % is added.
    assert basis.liability_spread_at([5.5]) == pytest.approx([0.01])
    reading = dict(station.picture.readings_at(10.0))
    expected = 100 * np.expm1(float(basis.curve.zero(10.0)) + 0.013)
    assert reading["Zero"] == f"{expected:.3f}"
    station.quotes.table.go_to(0)
    station.quotes.add()
    assert bench.book.basis.liability_spreads.tolist() == pytest.approx([0.002, 0.005, 0.008])


def test_corporate_bonds_are_waited_for(station: CurveStation, bench: Bench) -> None:
    station.look_at(LIABILITIES)
    before = bench.book
    choose(station.fields.method, "High-quality corporate bonds")
    assert bench.book is before
    assert "no bonds yet" in station.stale_text
    put_on_clipboard(as_cells(some_bonds()))
    station.bonds.table.paste()
    basis = bench.book.basis
    assert basis.liability_method is LiabilityMethod.CORPORATE_BONDS
    assert basis.liability_bonds == some_bonds()
    assert basis.curve_kind is CurveKind.ZERO
    assert "misfit" in station.bonds.words
    assert edit(station.bonds.table, 0, "yield", "2.2")
    assert bench.document.undo_text == "Change of the yield of Gilt 2033"


def test_an_expected_return_starts_on_the_curve(station: CurveStation, bench: Bench) -> None:
    station.look_at(LIABILITIES)
    choose(station.fields.method, "The expected return on assets")
    expected = np.expm1(bench.book.basis.curve.zero(5.5))
    assert bench.book.basis.expected_return == pytest.approx(expected, abs=5e-5)
    assert not station.fields.expected_return.isHidden()
    assert tabs(station) == ["Rates by term"]


# Expected inflation


def test_inflation_is_pasted_typed_and_taken_back(station: CurveStation, bench: Bench) -> None:
    station.look_at(INFLATION)
    assert "no expected inflation yet" in station.picture.description
    assert station.fields.volatility.isHidden()
    put_on_clipboard("Term\tRate\n1\t2.5\n5\t2.2 %\n10\t2.1\n")
    station.quotes.table.paste()
    inflation = bench.book.basis.inflation
    assert inflation == Inflation(np.array([1.0, 5.0, 10.0]), np.array([0.025, 0.022, 0.021]))
    assert shown(station.quotes.table, 1, "discount") == f"{1.022**5:.4f}"
    assert dict(station.picture.readings_at(10.0))["Index"] == f"{1.021**10:.4f}"
    station.fields.volatility.committed.emit(0.012)
    station.fields.recent.committed.emit(0.03)
    assert bench.book.basis.inflation == replace(inflation, volatility=0.012, recent=0.03)
    for _ in range(3):
        bench.document.undo()
    station.refresh_now()
    assert bench.book.basis.inflation is None
    assert station.quotes.table.table_model.rowCount() == 0


@pytest.mark.parametrize(
    ("cells", "reason"),
    [
        ("5\t2\n1\t2", "1 years would come after 5 years"),
        ("1\t2\n1\t3", "would stand twice"),
        ("1\t\n2\t2", "the rate is missing"),
        ("one\t2", "“one” is no term"),
        ("1\t-100", "must be from"),
    ],
)
def test_wrong_pastes_leave_inflation_as_it_is(
    station: CurveStation, bench: Bench, cells: str, reason: str
) -> None:
    station.look_at(INFLATION)
    before = bench.book
    put_on_clipboard(cells)
    station.quotes.table.paste()
    assert "Nothing was pasted." in station.stale_text
    assert reason in station.stale_text
    assert bench.book is before


def test_a_first_quote_can_be_typed(station: CurveStation, bench: Bench) -> None:
    station.look_at(INFLATION)
    station.quotes.add()
    assert bench.book.basis.inflation == Inflation(np.array([1.0]), np.array([0.02]))


# Two bases


def test_the_second_basis_has_curves_of_its_own(station: CurveStation, bench: Bench) -> None:
    assert "Second basis: curve" not in choices(station.view)
    station.second_button.click()
    station.refresh_now()
    assert bench.book.second_basis == bench.book.basis
    choose(station.view, "Second basis: curve")
    assert station.target == SECOND
    assert edit(station.quotes.table, 0, "rate", "4")
    second = bench.book.second_basis
    assert second is not None
    assert second.rates[0] == 0.04
    assert bench.book.basis.rates[0] == 0.02
    station.second_button.click()
    station.refresh_now()
    assert bench.book.second_basis is None
    assert station.target == Target()
    assert station.view.value == Target()


def test_inflation_is_shared_until_the_second_basis_has_its_own(station: CurveStation, bench: Bench) -> None:
    station.second_button.click()
    station.look_at(INFLATION)
    put_on_clipboard("1\t2.5\n10\t2")
    station.quotes.table.paste()
    book = bench.book
    assert book.second_basis is not None
    assert book.second_basis.inflation == book.basis.inflation is not None
    station.look_at(Target(Part.INFLATION, is_second=True))
    assert edit(station.quotes.table, 0, "rate", "3")
    station.look_at(INFLATION)
    assert edit(station.quotes.table, 1, "rate", "2.2")
    book = bench.book
    assert book.second_basis is not None
    assert book.second_basis.inflation is not None
    assert book.basis.inflation is not None
    assert book.second_basis.inflation.rates.tolist() == [0.03, 0.02]
    assert book.basis.inflation.rates.tolist() == [0.025, 0.022]


def test_both_bases_count_days_alike(station: CurveStation, bench: Bench) -> None:
    station.second_button.click()
    station.refresh_now()
    station.fields.day_count.committed.emit(DayCount.ACT_360)
    assert bench.book.second_basis is not None
    assert bench.book.second_basis.day_count is bench.book.basis.day_count is DayCount.ACT_360


# Comparing


def test_the_liability_curve_is_its_spread_above(station: CurveStation) -> None:
    choose(station.shown_as, "Continuous")
    choose(station.compare_with, "Liability curve")
    reading = dict(station.picture.readings_at(5.0))
    assert plain(reading["Difference"]) == "-50.0 bp"
    assert {"Liability: zero", "Liability: forward"} <= reading.keys()
    assert not station.misfit.isHidden()
    assert plain(dict(station.misfit.readings_at(5.0))["Zero rates"]) == "-50.0"
    assert station.misfit.description.startswith("Curve of the basis less liability curve: at most")
    assert plain(shown(station.rates.table, 3, "difference")) == "-50.00"
    choose(station.compare_with, "Nothing")
    assert station.misfit.isHidden()
    assert "Difference" not in dict(station.picture.readings_at(5.0))
    assert set(station.picture.names) == {"Discount", "Forward", "Zero", "Quote"}


def test_a_curve_is_compared_with_the_one_before_its_last_edit(station: CurveStation, bench: Bench) -> None:
    assert "Before the last change" not in choices(station.compare_with)
    edit(station.quotes.table, 3, "rate", "3.4")
    choose(station.compare_with, "Before the last change")
    assert plain(dict(station.picture.readings_at(10.0))["Difference"]) == "+40.0 bp"
    bench.edit_basis(title="Another title")
    station.refresh_now()
    assert plain(dict(station.picture.readings_at(10.0))["Difference"]) == "+40.0 bp"
    edit(station.quotes.table, 3, "rate", "3.5")
    assert plain(dict(station.picture.readings_at(10.0))["Difference"]) == "+10.0 bp"
    bench.open(a_fund())
    station.refresh_now()
    assert "Before the last change" not in choices(station.compare_with)
    assert station.compare_with.value is None


def test_a_curve_is_compared_with_pasted_rates(station: CurveStation, bench: Bench) -> None:
    before = bench.book
    put_on_clipboard("1\t2\n10\t2.5\n")
    station.paste_button.click()
    assert station.compare_with.combo.currentText() == "The pasted rates"
    assert plain(dict(station.picture.readings_at(10.0))["Difference"]) == "+50.0 bp"
    assert bench.book is before


@pytest.mark.parametrize(
    ("cells", "reason"),
    [
        ("", "nothing to compare with"),
        ("2\n3", "two columns"),
        ("5\t2\n1\t2", "would come after"),
        ("a\tb\nc\td", "“c” is no term"),
    ],
)
def test_wrong_rates_to_compare_with_are_refused(station: CurveStation, cells: str, reason: str) -> None:
    put_on_clipboard(cells)
    station.paste_button.click()
    assert reason in station.stale_text
    assert station.compare_with.value is None


def test_real_rates_are_seen_against_expected_inflation(station: CurveStation, bench: Bench) -> None:
    bench.edit_basis(inflation=Inflation(np.array([1.0, 10.0]), np.array([0.02, 0.02])))
    station.refresh_now()
    choose(station.compare_with, "Expected inflation")
    assert plain(dict(station.picture.readings_at(10.0))["Difference"]) == "+100.0 bp"


# Rates by term and the whole


def test_rates_by_term_agree_with_the_curve(station: CurveStation, bench: Bench) -> None:
    station.pages.show_page("rates")
    assert station.home() is station.rates.table
    table, curve = station.rates.table, bench.book.basis.curve
    assert shown(table, 7, "term") == "5.00"
    assert shown(table, 7, "zero") == "2.6000"
    assert shown(table, 7, "continuous") == f"{100 * float(curve.zero(5.0)):.4f}"
    assert shown(table, 7, "forward") == f"{100 * np.expm1(float(curve.forward(4.0, 5.0))):.4f}"
    assert shown(table, 7, "discount") == f"{1.026**-5:.6f}"
    assert [shown(table, row, "beyond") for row in (12, 13)] == ["no", "yes"]


def test_everything_has_a_name_for_a_reader_who_listens(station: CurveStation, bench: Bench) -> None:
    bench.open(with_bonds())
    station.refresh_now()
    fields = station.fields
    for widget in (station.view.editor, station.compare_with.editor, fields.bond_fit.editor):
        assert widget.accessibleName()
    for page in (station.quotes, station.bonds, station.rates):
        assert page.table.accessibleName()
    assert station.misfit.accessibleDescription() == station.misfit.description
    assert "Zero rates from" in station.picture.accessibleDescription()
    assert station.bonds.add_one_button.accessibleDescription().endswith("(Insert)")


def test_the_reading_line_moves_by_key(station: CurveStation) -> None:
    choose(station.compare_with, "Liability curve")
    QTest.keyClick(station.picture.plot, Qt.Key.Key_End)
    assert "Difference" in station.picture.reading
    QTest.keyClick(station.picture.plot, Qt.Key.Key_Escape)
    assert not station.picture.reading


def test_the_editor_says_when_nothing_is_open(bench: Bench) -> None:
    editor = Editor(bench.document)
    with pytest.raises(RuntimeError, match="no open book"):
        _ = editor.basis
    bench.open(a_fund())
    editor.target = SECOND
    with pytest.raises(RuntimeError, match="no such basis"):
        _ = editor.basis


@pytest.mark.parametrize(
    "changes",
    [
        {"curve_kind": CurveKind.BONDS, "bonds": None},
        {"curve_kind": CurveKind.FLAT, "flat_rate": None},
        {"curve_kind": CurveKind.SVENSSON, "parameters": None},
        {"curve_kind": CurveKind.SVENSSON, "parameters": CurveParameters(0.02, 0.0, 0.0, 1.0)},
        {"curve_kind": CurveKind.FLAT, "flat_rate": -1.5},
        {"liability_method": LiabilityMethod.EXPECTED_RETURN},
        {"liability_method": LiabilityMethod.CORPORATE_BONDS},
        {"liability_method": LiabilityMethod.TERM_SPREADS},
        {"terms": np.array([3.0, 1.0]), "rates": np.array([0.01, 0.01])},
    ],
)
def test_a_basis_from_elsewhere_without_a_curve_is_shown_and_can_be_mended(
    station: CurveStation, bench: Bench, changes: dict[str, Any]
) -> None:
    bench.edit_basis(**changes)
    for target in (Target(), LIABILITIES):
        station.look_at(target)
        assert station.isVisible()
        is_theirs = ("liability_method" in changes) == (target == LIABILITIES)
        if is_theirs:
            assert station.stale_text.startswith("There is no curve. ")
            assert len(station.stale_text) > 30
    station.look_at(Target())
    choose(station.fields.curve_kind, "Par yields")
    choose(station.fields.curve_kind, "One flat rate")
    assert bench.book.basis.curve_kind is CurveKind.FLAT
    assert station.picture.names
