"""A curve drawn through bonds: from the first paste to the misfit of each."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pyqtgraph as pg
import pytest
from PySide6.QtCore import QLocale, Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtTest import QTest
from pytestqt.qtbot import QtBot

from desk.book import BondFit, CurveKind, LiabilityMethod
from desk.window.curve.bond_figures import bond_figures, fit_in_words
from desk.window.curve.faults import fault_of
from desk.window.curve.marks import Marks
from desk.window.curve.station import CurveStation
from desk.window.curve.targets import Part, Target
from tests.window.benches import Bench, a_fund
from tests.window.curve.books import (
    TERMS,
    YIELDS,
    as_cells,
    choose,
    edit,
    put_on_clipboard,
    shown,
    some_bonds,
    tabs,
    with_bonds,
)


@pytest.fixture
def bonded(station: CurveStation, bench: Bench) -> CurveStation:
    """With a curve of bonds in the book."""
    bench.open(with_bonds())
    station.refresh_now()
    return station


# Coming to bonds


def test_a_curve_of_bonds_waits_for_them_on_the_former_curve(station: CurveStation, bench: Bench) -> None:
    before = bench.book
    zero = station.picture.description
    choose(station.fields.curve_kind, "Bonds")
    assert bench.book is before
    assert station.picture.description == zero
    assert "There are no bonds yet: paste them" in station.stale_text
    assert "The former curve stays in use until then." in station.stale_text
    assert tabs(station) == ["Bonds", "Rates by term"]
    assert station.bonds.table.table_model.rowCount() == 0
    put_on_clipboard(as_cells(some_bonds()))
    station.bonds.table.paste()
    basis = bench.book.basis
    assert basis.curve_kind is CurveKind.BONDS
    assert basis.bonds == some_bonds()
    assert basis.terms.size == 0
    assert not station.stale_text
    bench.document.undo()
    assert bench.book.basis == a_fund().basis


def test_too_few_bonds_wait_for_more(station: CurveStation, bench: Bench) -> None:
    before = bench.book
    choose(station.fields.curve_kind, "Bonds")
    put_on_clipboard(as_cells(some_bonds(TERMS[:3], YIELDS[:3])))
    station.bonds.table.paste()
    assert bench.book is before
    assert station.bonds.table.table_model.rowCount() == 3
    assert "There are 3 bonds, and this fit needs 6" in station.stale_text
    choose(station.fields.bond_fit, "Exact")
    assert len(bench.book.basis.bonds or ()) == 3
    assert bench.book.basis.bond_fit is BondFit.EXACT


def test_bonds_can_be_gathered_one_by_one(station: CurveStation, bench: Bench) -> None:
    choose(station.fields.curve_kind, "Bonds")
    former = bench.book.basis.curve
    for _ in range(6):
        station.bonds.add()
    bonds = bench.book.basis.bonds
    assert bonds is not None
    assert len(bonds) == 6
    assert len(set(bonds.names)) == 6
    # Each was put at par on the former curve, every two years.
    zero = np.expm1(former.zero([2.0, 4.0, 6.0, 8.0, 10.0, 12.0]))
    assert bonds.bond_yield == pytest.approx(zero, abs=1e-3)


def test_a_draft_can_be_given_up(station: CurveStation, bench: Bench) -> None:
    choose(station.fields.curve_kind, "Bonds")
    put_on_clipboard(as_cells(some_bonds(TERMS[:3], YIELDS[:3])))
    assert station.strip.button.text() == "Paste bonds"
    station.strip.button.click()
    assert station.bonds.table.table_model.rowCount() == 3
    assert station.strip.button.text() == "Give it up"
    station.strip.button.click()
    assert not station.stale_text
    assert station.fields.curve_kind.value is CurveKind.ZERO
    assert tabs(station) == ["Quotes", "Rates by term"]
    assert not bench.document.can_undo


def test_the_former_kind_chosen_again_gives_a_draft_up(station: CurveStation, bench: Bench) -> None:
    choose(station.fields.curve_kind, "Bonds")
    choose(station.fields.curve_kind, "Zero rates")
    assert not station.stale_text
    assert tabs(station) == ["Quotes", "Rates by term"]
    assert not bench.document.can_undo


def test_the_keyboard_goes_past_bonds_to_other_kinds(
    station: CurveStation, bench: Bench, qtbot: QtBot
) -> None:
    station.activateWindow()
    combo = station.fields.curve_kind.combo
    combo.setFocus()
    qtbot.waitUntil(combo.hasFocus)
    for _ in range(4):
        QTest.keyClick(combo, Qt.Key.Key_Down)
    assert combo.hasFocus()
    assert bench.book.basis.curve_kind is CurveKind.NELSON_SIEGEL
    assert not station.stale_text


def test_a_draft_goes_with_the_book_that_it_belongs_to(station: CurveStation, bench: Bench) -> None:
    choose(station.fields.curve_kind, "Bonds")
    bench.open(a_fund())
    station.refresh_now()
    assert not station.stale_text
    assert tabs(station) == ["Quotes", "Rates by term"]


# What is shown


def test_the_table_and_the_words_say_how_each_bond_fits(bonded: CurveStation, bench: Bench) -> None:
    fit = bench.book.basis.curve_fit
    assert fit is not None
    worst = int(np.abs(fit.residual_bp).argmax())
    table = bonded.bonds.table
    assert shown(table, worst, "misfit_bp").replace("\N{MINUS SIGN}", "-") == f"{fit.residual_bp[worst]:+.2f}"
    assert shown(table, 0, "given") == "yield"
    assert f"Gilt {2031 + int(TERMS[worst])}" in bonded.bonds.words
    assert f"misfit {fit.rmse_bp:.1f} bp over 10 bonds" in bonded.bonds.words
    assert not bonded.misfit.isHidden()
    (name, _), (_, misfit) = bonded.misfit.readings_at(float(bench.book.basis.quoted_bonds.term[worst]))
    assert name == f"Gilt {2031 + int(TERMS[worst])}"
    assert misfit.replace("\N{MINUS SIGN}", "-") == f"{fit.residual_bp[worst]:.2f}"


def test_the_picture_says_what_rings_and_ticks_are(bonded: CurveStation, bench: Bench) -> None:
    basis = bench.book.basis
    fit = basis.curve_fit
    assert fit is not None
    picture = bonded.picture
    assert {"Bond yields", "On the curve"} <= set(picture.names)
    assert picture.description.endswith(
        "Rings: bond yields as quoted; ticks: the same bonds' yields on the curve."
    )
    picture.settle()
    assert "Bond yields" in {item.text() for item in picture._names}
    flows = basis.quoted_bonds
    term, own = float(flows.term[4]), flows.instrument == 4
    # Discounted at each of the two yields the bond is worth what is quoted, and its value on the curve.
    read = dict(picture.readings_at(term))["Bond yield"]
    yields = [float(part.split()[0]) / 100.0 for part in read.split(", ")]
    for rate, worth in zip(yields, (flows.target[4], flows.values(basis.curve)[4]), strict=True):
        assert flows.amount[own] @ (1.0 + rate) ** -flows.time[own] == pytest.approx(worth, abs=0.004)
    assert abs(yields[0] - yields[1]) > 2e-5
    assert "Bond yield" not in dict(picture.readings_at(term + 0.5))
    choose(bonded.fields.curve_kind, "Zero rates")
    assert "On the curve" not in picture.names
    assert "Rings" not in picture.description


def test_a_spread_that_the_yields_do_not_have_is_said(bonded: CurveStation, bench: Bench) -> None:
    bench.edit_basis(
        liability_method=LiabilityMethod.CORPORATE_BONDS, liability_bonds=some_bonds(), liability_spread=0.01
    )
    bonded.look_at(Target(Part.LIABILITIES))
    assert bonded.picture.description.endswith("on the curve, without the liability spread.")


@pytest.mark.parametrize("size", [(900, 560), (1130, 586)])
def test_the_line_over_the_misfits_keeps_the_bonds_name(
    bonded: CurveStation, bench: Bench, size: tuple[int, int]
) -> None:
    bonds = some_bonds()
    names = tuple(f"Treasury stock of {name}, third series" for name in bonds.names)
    bench.edit_basis(bonds=replace(bonds, names=names))
    bonded.resize(*size)
    bonded.refresh_now()
    fit = bench.book.basis.curve_fit
    assert fit is not None
    worst = names[int(np.abs(fit.residual_bp).argmax())]
    assert worst in " ".join(bonded.misfit._strip.shown)
    assert worst in bonded.misfit.description


def test_many_marks_are_stamped_on_the_screen_and_drawn_into_files(
    bonded: CurveStation, bench: Bench, tmp_path: Path
) -> None:
    """Drawn one by one they would hold up the window; stamped they would be images in an SVG file."""
    terms = np.linspace(1.0, 28.0, 61)
    bonds = some_bonds(terms, 0.02 + 0.01 * np.sin(terms))
    days = (365.25 * terms).astype(int)
    bench.edit_basis(bonds=replace(bonds, maturity=np.datetime64("2031-03-31") + days))
    bonded.redrawer.stop()
    fit = bench.book.basis.curve_fit
    assert fit is not None
    bonded.misfit.show_misfits(terms, fit, bonds.names, "")
    bonded.misfit.show()
    bonded.misfit.settle()
    marks = bonded.misfit._series["Misfit"]
    assert isinstance(marks, Marks)
    drawn: list[bool] = []
    real = pg.ScatterPlotItem.paint

    def noted(item: pg.ScatterPlotItem, *more: object) -> None:
        if item is marks.item:
            drawn.append(bool(item.opts["useCache"]))
        real(item, *more)

    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(pg.ScatterPlotItem, "paint", noted)
        bonded.misfit.plot.viewport().repaint()
        assert drawn == [True]
        for name in ("misfit.svg", "misfit.png"):
            drawn.clear()
            bonded.misfit.save(tmp_path / name)
            assert drawn[-1] is False, name
    assert "<image" not in (tmp_path / "misfit.svg").read_text(encoding="utf-8")
    marks.set(terms[:60], terms[:60])
    assert not marks.item.opts["useCache"]


def test_price_follows_from_yield_and_yield_from_price() -> None:
    basis = with_bonds().basis
    bonds = some_bonds()
    found = bond_figures(basis, bonds, None)
    # On a coupon date a yearly bond is worth Σ c/(1+y)^k + 100/(1+y)^n: no interest has accrued.
    for row, (term, rate) in enumerate(zip(TERMS, YIELDS, strict=True)):
        growth = (1.0 + rate) ** -np.arange(1, int(term) + 1)
        assert found.price[row] == pytest.approx(2.5 * growth.sum() + 100.0 * growth[-1], abs=1e-9)
    by_price = replace(bonds, price=found.price, bond_yield=np.full(len(bonds), np.nan))
    assert bond_figures(basis, by_price, None).bond_yield == pytest.approx(YIELDS, abs=1e-12)


def test_accrued_interest_is_between_clean_and_dirty() -> None:
    basis = replace(with_bonds().basis, valuation_date=a_fund().basis.valuation_date.replace(month=9, day=30))
    clean = some_bonds()
    dirty = replace(clean, is_clean=np.zeros(len(clean), dtype=bool))
    apart = bond_figures(basis, dirty, None).price - bond_figures(basis, clean, None).price
    # 183 of the 366 days from 31 March 2031 to 31 March 2032 have passed.
    assert apart == pytest.approx(np.full(len(clean), 2.5 * 183 / 366), abs=1e-9)


def test_an_exact_fit_says_so_and_draws_no_rounding(bonded: CurveStation) -> None:
    choose(bonded.fields.bond_fit, "Exact")
    assert bonded.bonds.words == "The curve reprices all 10 bonds exactly."
    assert bonded.misfit.isHidden()
    assert not bonded.fields.interpolation.isHidden()
    choose(bonded.fields.bond_fit, "Smooth: Nelson-Siegel")
    assert bonded.fields.interpolation.isHidden()
    assert not bonded.misfit.isHidden()


def test_a_smooth_fit_is_advised_where_bonds_give_no_exact_one() -> None:
    yields = YIELDS.copy()
    yields[5] = 0.9
    basis = with_bonds(bonds=some_bonds(TERMS, yields), bond_fit=BondFit.EXACT).basis
    fault = fault_of(basis, Part.CURVE)
    assert "Check this quote and those beside it. Or choose a smooth fit through the bonds." in fault
    assert "Or choose" not in fault_of(replace(basis, bonds=some_bonds(TERMS, YIELDS * 300)), Part.CURVE)


def test_few_bonds_for_many_parameters_are_said() -> None:
    few = with_bonds(bonds=some_bonds(TERMS[:7], YIELDS[:7])).basis
    assert few.bonds is not None
    assert few.curve_fit is not None
    assert "7 bonds are few for 6 parameters" in fit_in_words(few.bonds, few.curve_fit, is_exact=False)
    many = with_bonds(bond_fit=BondFit.NELSON_SIEGEL).basis
    assert many.curve_fit is not None
    assert "few" not in fit_in_words(some_bonds(), many.curve_fit, is_exact=False)


def test_a_search_without_rest_is_said() -> None:
    fit = with_bonds().basis.curve_fit
    assert fit is not None
    words = fit_in_words(some_bonds(), replace(fit, converged=False), is_exact=False)
    assert "did not come to rest" in words


# Editing


def test_a_price_takes_the_place_of_the_yield(bonded: CurveStation, bench: Bench) -> None:
    assert edit(bonded.bonds.table, 3, "price", "99.5")
    bonds = bench.book.basis.bonds
    assert bonds is not None
    assert (bonds.price[3], np.isnan(bonds.bond_yield[3])) == (99.5, True)
    assert shown(bonded.bonds.table, 3, "given") == "price"
    assert bench.document.undo_text == "Change of the price of Gilt 2036"
    assert edit(bonded.bonds.table, 3, "yield", "2.6")
    bonds = bench.book.basis.bonds
    assert bonds is not None
    assert (np.isnan(bonds.price[3]), bonds.bond_yield[3]) == (True, 0.026)
    bench.document.undo()
    bonded.refresh_now()
    assert shown(bonded.bonds.table, 3, "price") == "99.500"


@pytest.mark.parametrize(
    ("key", "text", "reason"),
    [
        ("maturity", "2030-01-01", "Gilt 2033, due 01/01/2030"),
        ("maturity", "soon", "“soon” is not a date"),
        ("coupon", "-1", "Gilt 2033, due 31/03/2033: The coupon is below 0"),
        ("frequency", "3", "1, 2, 4 or 12 times"),
        ("price", "0", "above 0"),
        ("price_kind", "net", "neither clean nor dirty"),
        ("yield", "-100", "Gilt 2033"),
        ("name", "", "needs a name"),
    ],
)
def test_what_no_bond_can_have_is_refused(
    bonded: CurveStation, bench: Bench, key: str, text: str, reason: str
) -> None:
    before = bench.book
    assert not edit(bonded.bonds.table, 0, key, text)
    assert reason in bonded.stale_text
    assert bench.book is before


def test_two_bonds_of_one_day_are_named(bonded: CurveStation, bench: Bench) -> None:
    assert edit(bonded.bonds.table, 1, "maturity", "2033-03-31")
    before = bench.book
    choose(bonded.fields.bond_fit, "Exact")
    assert "Gilt 2033, due 31/03/2033; Gilt 2034, due 31/03/2033: Bonds mature on the same day" in (
        bonded.stale_text
    )
    assert "Keep one of each such group" in bonded.stale_text
    assert bench.book is before
    assert bonded.fields.bond_fit.value is BondFit.SVENSSON


def test_the_keyboard_adds_and_removes(bonded: CurveStation, bench: Bench, qtbot: QtBot) -> None:
    bonded.activateWindow()
    table = bonded.bonds.table
    table.setFocus()
    qtbot.waitUntil(table.hasFocus)
    table.go_to(9)
    before = bench.book.basis.curve.zero([5.0, 20.0])
    QTest.keyClick(table, Qt.Key.Key_Insert)
    bonds = bench.book.basis.bonds
    assert bonds is not None
    assert bonds.maturity[-1] == np.datetime64("2063-03-31")
    assert bench.book.basis.curve.zero([5.0, 20.0]) == pytest.approx(before, abs=2e-4)
    table.selectRow(0)
    QTest.keyClick(table, Qt.Key.Key_Delete)
    assert bench.book.basis.bonds == replace(
        bonds,
        names=bonds.names[1:],
        **{
            name: getattr(bonds, name)[1:]
            for name in ("maturity", "coupon", "frequency", "price", "bond_yield", "is_clean")
        },
    )


def test_a_fit_keeps_the_bonds_that_it_needs(bonded: CurveStation, bench: Bench) -> None:
    bonded.bonds.table.selectAll()
    bonded.bonds.remove()
    assert "no bonds" in bonded.stale_text
    assert len(bench.book.basis.bonds or ()) == 10


def test_the_table_copies_to_a_spreadsheet_and_back(bonded: CurveStation, bench: Bench) -> None:
    bonded.bonds.table.selectAll()
    bonded.bonds.table.copy(exactly=True)
    text = QGuiApplication.clipboard().text()
    assert text.splitlines()[0].startswith("Bond\tMaturity\tCoupon (% a year)\tTimes (a year)")
    put_on_clipboard(text)
    bonded.bonds.replace_all()
    after = bench.book.basis.bonds
    assert after is not None
    assert after.names == some_bonds().names
    assert after.maturity.tolist() == some_bonds().maturity.tolist()
    # Where both stand, the price counts: it gives the same yields.
    assert bond_figures(bench.book.basis, after, None).bond_yield == pytest.approx(YIELDS, abs=1e-12)


# Pasting


def test_rows_without_headings_are_read_in_order(bonded: CurveStation, bench: Bench) -> None:
    put_on_clipboard(as_cells(some_bonds(TERMS[:7], YIELDS[:7] + 0.001), headings=False))
    bonded.bonds.replace_all()
    bonds = bench.book.basis.bonds
    assert bonds is not None
    assert bonds.bond_yield == pytest.approx(YIELDS[:7] + 0.001)
    assert bench.document.undo_text == "Pasted bonds"


def test_prices_are_pasted_over_a_column(bonded: CurveStation, bench: Bench) -> None:
    put_on_clipboard("99.1\n98.7")
    bonded.bonds.table.go_to(2, 4)
    bonded.bonds.table.paste()
    bonds = bench.book.basis.bonds
    assert bonds is not None
    assert bonds.price[2:4].tolist() == [99.1, 98.7]
    assert np.isnan(bonds.bond_yield[2:4]).all()
    assert np.isnan(bonds.price[[1, 4]]).all()


def test_nothing_is_pasted_over_some_of_sorted_rows(bonded: CurveStation, bench: Bench) -> None:
    before = bench.book
    bonded.bonds.table.sortByColumn(6, Qt.SortOrder.DescendingOrder)
    put_on_clipboard("99.1\n98.7")
    bonded.bonds.table.go_to(2, 4)
    bonded.bonds.table.paste()
    assert "the rows are sorted" in bonded.stale_text
    assert bench.book is before
    bonded.bonds.table.sortByColumn(-1, Qt.SortOrder.AscendingOrder)
    bonded.bonds.table.paste()
    assert bench.book is not before


def test_every_bad_cell_is_named_and_nothing_is_pasted(bonded: CurveStation, bench: Bench) -> None:
    before = bench.book
    put_on_clipboard("Maturity\tCoupon\tPrice\n31/03/36\t2.5\t99\n2037-03-31\thigh\t#N/A\n2038-03-31\t2\t-4")
    bonded.bonds.replace_all()
    for part in (
        "Nothing was pasted.",
        "Row 2: “31/03/36” is no date with a four-figure year.",
        "Row 3: “high” is no coupon.",
        "Row 3: “#N/A” is no price above 0.",
        "Row 4: “-4” is no price above 0.",
    ):
        assert part in bonded.stale_text
    assert bench.book is before


def test_a_bond_without_price_and_yield_is_named(bonded: CurveStation, bench: Bench) -> None:
    before = bench.book
    put_on_clipboard("Maturity\tCoupon\tYield\n2036-03-31\t2.5\t2.4\n2037-03-31\t2.5\t")
    bonded.bonds.replace_all()
    assert "Row 2: the price or yield of the bond is missing." in bonded.stale_text
    assert bench.book is before


def test_a_paste_on_what_follows_is_explained(bonded: CurveStation, bench: Bench) -> None:
    put_on_clipboard("2.4")
    bonded.bonds.table.go_to(0, 8)
    bonded.bonds.table.paste()
    assert "the others follow" in bonded.stale_text
    assert not bench.document.can_undo


def test_an_empty_clipboard_is_said(bonded: CurveStation) -> None:
    put_on_clipboard("")
    bonded.bonds.replace_all()
    assert "nothing to paste" in bonded.stale_text


def test_bonds_are_read_in_the_readers_locale(bonded: CurveStation, bench: Bench) -> None:
    QLocale.setDefault(QLocale(QLocale.Language.German, QLocale.Country.Germany))
    rows = [f"Bund {2033 + place}\t31.03.{2033 + place}\t2,5\t1\t9{place},25" for place in range(7)]
    put_on_clipboard("\n".join(rows))
    bonded.bonds.replace_all()
    bonds = bench.book.basis.bonds
    assert bonds is not None
    assert bonds.maturity[0] == np.datetime64("2033-03-31")
    assert bonds.price.tolist() == [90.25 + place for place in range(7)]
    assert (bonds.coupon == 0.025).all()


def test_bonds_beyond_the_last_liquid_point_stand_apart(bonded: CurveStation, bench: Bench) -> None:
    bonded.fields.last_liquid_point.committed.emit(16.5)
    fit = bench.book.basis.curve_fit
    assert fit is not None
    assert fit.is_used.tolist() == [True] * 8 + [False] * 2
    assert set(bonded.misfit.names) == {"Misfit", "Left out"}
    last = float(bench.book.basis.quoted_bonds.term[-1])
    assert dict(bonded.misfit.readings_at(last)).keys() == {"Gilt 2061", "Left out"}
    assert "over 8 bonds" in bonded.bonds.words
    assert "extrapolated" in dict(bonded.picture.readings_at(18.0))


def test_a_fit_that_is_none_says_so(bonded: CurveStation) -> None:
    rows = [
        f"B{place}\t{2033 + place}-03-31\t2\t1\t{price}"
        for place, price in enumerate((3, 170, 20, 99, 300, 1, 90))
    ]
    put_on_clipboard("\n".join(rows))
    bonded.bonds.replace_all()
    assert "That is no fit: check the bonds furthest off." in bonded.bonds.words


@pytest.mark.parametrize(
    ("key", "text", "reason"),
    [
        ("yield", "210", "Gilt 2033: a yield is at most 100\u202f% a year."),
        ("yield", "-60", "a yield is at least −50\u202f% a year."),
        ("coupon", "300", "a coupon is at most 100\u202f% a year."),
        ("price", "2000000", "a price is at most 1,000,000"),
    ],
)
def test_what_no_workbook_could_give_back_is_refused(
    bonded: CurveStation, bench: Bench, key: str, text: str, reason: str
) -> None:
    before = bench.book
    assert not edit(bonded.bonds.table, 0, key, text)
    assert reason in bonded.stale_text
    assert bench.book is before


def test_what_was_copied_is_pasted_back_as_it_was_given(bonded: CurveStation, bench: Bench) -> None:
    assert edit(bonded.bonds.table, 1, "price", "99.5")
    bonded.refresh_now()
    before = bench.book.basis.bonds
    assert before is not None
    bonded.bonds.table.selectAll()
    bonded.bonds.table.copy(exactly=True)
    bonded.bonds.replace_all()
    after = bench.book.basis.bonds
    assert after is not None
    np.testing.assert_allclose(after.bond_yield, before.bond_yield, rtol=1e-12)
    np.testing.assert_allclose(after.price, before.price, rtol=1e-12)
    assert np.isnan(after.price).sum() == len(after) - 1
