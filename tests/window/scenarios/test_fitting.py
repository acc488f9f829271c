"""The page that fits a model to data of the book: choice, pictures, tables, and what goes into the book."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QAbstractButton, QComboBox, QSlider
from pytestqt.qtbot import QtBot

from desk.book import Book, ModelName
from desk.book.market import CalibrationSource
from desk.book.model import History
from desk.window.parts.plot_series import Band, Bars, Dots, Line
from desk.window.parts.theme import ThemeSwitch
from desk.window.scenarios.fitting import FittingPage
from desk.window.scenarios.station import ScenariosStation
from tests.scenarios.fitted_books import history, quoted, yields
from tests.window.benches import Bench, a_fund, dispose

HISTORY, VOLATILITIES, YIELDS = CalibrationSource


def a_book() -> Book:
    """The small fund with data of every kind."""
    book = a_fund()
    return replace(
        book,
        history=history(weeks=260),
        volatilities=quoted(book, noise=0.004),
        yield_history=yields(dates=60),
    )


@pytest.fixture
def bench() -> Iterator[Bench]:
    made = Bench()
    yield made
    made.close()


@pytest.fixture
def station(bench: Bench, qtbot: QtBot, theme_switch: ThemeSwitch) -> Iterator[ScenariosStation]:
    made = ScenariosStation(bench.document, bench.jobs, theme_switch)
    made.resize(1130, 586)
    made.show()
    bench.open(a_book())
    made.refresh_now()
    yield made
    dispose(made)


def opened(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> FittingPage:
    """The page, with its first fit done."""
    station.fitting.button.click()
    page = station.fitting.page
    assert page is not None
    qtbot.waitUntil(lambda: not bench.jobs.running)
    return page


def choose(page: FittingPage, bench: Bench, qtbot: QtBot, source: CalibrationSource, model: str = "") -> None:
    """Choose and fit, with the mouse as it were."""
    combo = page.panel.source.combo
    place = [choice.value for choice in page.panel.source._choices].index(source)
    combo.setCurrentIndex(place)
    combo.activated.emit(place)
    if model:
        names = [choice.value for choice in page.panel.model._choices]
        place = names.index(ModelName(model))
        page.panel.model.combo.setCurrentIndex(place)
        page.panel.model.combo.activated.emit(place)
    page.panel.fit_button.click()
    qtbot.waitUntil(lambda: not bench.jobs.running)


def test_the_page_takes_the_place_of_the_run_and_gives_it_back(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    assert station.invitation.isVisible()
    page = opened(station, bench, qtbot)
    assert page.isVisible()
    assert not station.invitation.isVisible()
    assert not station.run_form.run_button.isVisible()
    assert not station.fitting.button.isVisible()
    bench.edit_basis(liability_spread=0.011)
    station.refresh_now()
    assert page.isVisible()
    assert not station.invitation.isVisible()
    QTest.keyClick(page, Qt.Key.Key_Escape)
    assert not page.isVisible()
    station.refresh_now()
    assert station.invitation.isVisible()
    assert station.fitting.button.isVisible()
    assert station.run_form.run_button.isVisible()


def test_it_begins_with_a_fit_and_leaves_the_book_alone(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    before = bench.book
    page = opened(station, bench, qtbot)
    assert page.found is not None
    assert page.found.source is HISTORY
    assert bench.book is before
    assert not bench.document.can_undo
    assert page.verdict.text() == page.found.verdict
    assert page.panel.note.text() == page.found.measure


def test_the_model_goes_into_the_book_on_request_and_out_by_undo(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    page = opened(station, bench, qtbot)
    former = bench.book.rates_model
    found = page.found
    assert found is not None
    said: list[str] = []
    page.message.connect(said.append)
    page.panel.use_button.click()
    assert bench.book.rates_model == found.model
    assert bench.document.undo_text == "Model Vasicek fitted to the history of short rates"
    assert not page.panel.use_button.isEnabled()
    assert "model of the book" in page.panel.note.text()
    assert "Undo" in said[-1]
    bench.document.undo()
    station.refresh_now()
    assert bench.book.rates_model == former
    assert page.panel.use_button.isEnabled()


def test_a_history_in_pictures_and_tables(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    page = opened(station, bench, qtbot)
    found = page.found
    assert found is not None
    assert found.band is not None
    assert found.profile is not None
    data = bench.book.history
    assert data is not None
    assert [page.history.isVisible(), page.profile.isVisible(), page.quotes.isVisible()] == [
        True,
        True,
        False,
    ]
    band, line = page.history._series["95 % band"], page.history._series["History"]
    assert isinstance(band, Band)
    assert isinstance(line, Line)
    np.testing.assert_array_equal(line.y, data.rate)
    assert line.x[-1] == pytest.approx(2031 + 89 / 365)
    page.history.step_reading(-1)
    assert page.history.reading.startswith("Date 31/03/2031")
    curve, cut = page.profile._series["Profile"], page.profile._series["95 % cut"]
    assert isinstance(curve, Line)
    assert isinstance(cut, Line)
    np.testing.assert_array_equal(curve.y, found.profile.log_likelihood)
    assert set(cut.y) == {found.profile.cut}
    page.second.setCurrentIndex(1)
    assert page.quantiles.isVisible()
    assert not page.profile.isVisible()
    dots = page.quantiles._series["Residual"]
    assert isinstance(dots, Dots)
    np.testing.assert_array_equal(dots.y, np.sort(found.residual))
    assert page.figures.table_model.rowCount() == len(found.figures)
    model = page.figures.table_model
    values = model.column_values("value")
    assert values[0] == found.figure("mean_reversion").value
    assert values[1] == 100.0 * found.figure("long_run_rate").value
    assert page.residuals.table_model.rowCount() == data.rate.size - 1
    assert page.pages.has_page("tests")
    assert found.verdict in page.words.text()
    assert all(remark in page.words.text() for remark in found.remarks)


def test_estimates_are_copied_as_numbers(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    page = opened(station, bench, qtbot)
    page.figures.selectAll()
    with qtbot.waitSignal(page.figures.message):
        page.figures.copy(exactly=True)
    cells = [line.split("\t") for line in QGuiApplication.clipboard().text().splitlines()]
    assert cells[0][:2] == ["Figure", "Unit"]
    assert page.found is not None
    assert float(cells[1][2]) == page.found.figure("mean_reversion").value


def test_volatilities_by_kind(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    page = opened(station, bench, qtbot)
    choose(page, bench, qtbot, VOLATILITIES, "hull-white")
    found, data = page.found, bench.book.volatilities
    assert found is not None
    assert data is not None
    assert found.name is ModelName.HULL_WHITE
    assert page.kind.isVisible()
    assert not page.second.isVisible()
    for kind in ("normal", "lognormal"):
        page.kind.setCurrentText(kind.capitalize())
        rows = [place for place, each in enumerate(data.kind) if each.value == kind]
        seen, bars = page.quotes._series["Quoted"], page.errors._series["Fitted less quoted"]
        assert isinstance(seen, Dots)
        assert isinstance(bars, Bars)
        np.testing.assert_array_equal(seen.y, data.volatility[rows])
        np.testing.assert_allclose(bars.heights, found.residual[rows])
    page.kind.setCurrentText("Normal")
    page.quotes.step_reading(1)
    assert "1y into 5y" in page.quotes.reading
    assert page.residuals.table_model.rowCount() == len(data.kind)
    assert not page.pages.has_page("tests")


def test_yields_by_date(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    page = opened(station, bench, qtbot)
    choose(page, bench, qtbot, YIELDS)
    data = bench.book.yield_history
    assert data is not None
    assert page.day.isVisible()
    page.day.setValue(4)
    observed = page.yields._series["Observed"]
    assert isinstance(observed, Dots)
    np.testing.assert_array_equal(observed.y, data.rates[4])
    page.second.setCurrentIndex(1)
    assert page.quantiles.isVisible()
    assert page.residuals.table_model.rowCount() == data.terms.size


def test_data_that_are_missing_name_their_sheet(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    bench.open(a_fund())
    station.refresh_now()
    page = opened(station, bench, qtbot)
    assert page.found is None
    assert not page.panel.fit_button.isEnabled()
    assert "Add a sheet “History” with the columns Date and Short rate" in page.verdict.text()
    page.panel.source.combo.activated.emit(1)
    assert "“Volatilities”" in page.verdict.text()
    page.panel.source.combo.activated.emit(2)
    assert "“Yield history”" in page.panel.state.text().replace("\N{NO-BREAK SPACE}", " ")


def test_a_refusal_is_one_sentence_and_keeps_the_last_fit(
    station: ScenariosStation, bench: Bench, qtbot: QtBot, caplog: pytest.LogCaptureFixture
) -> None:
    low = history(weeks=260)
    bench.open(replace(a_book(), history=replace(low, rate=low.rate - 0.03)))
    station.refresh_now()
    page = opened(station, bench, qtbot)
    kept = page.found
    choose(page, bench, qtbot, HISTORY, "cir")
    assert "rates are 0 or negative" in page.verdict.text()
    assert page.found is kept is not None
    assert not bench.document.can_undo
    choose(page, bench, qtbot, HISTORY, "vasicek")
    assert page.found is not None
    assert page.verdict.text() == page.found.verdict


def test_changed_data_make_a_fit_stale(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    page = opened(station, bench, qtbot)
    data = bench.book.history
    assert data is not None
    bench.document.edit("Shorter", replace(bench.book, history=History(data.date[50:], data.rate[50:])))
    station.refresh_now()
    assert page.is_stale
    assert page.verdict.text().startswith("The data have changed since this fit")
    assert not page.panel.use_button.isEnabled()
    former = bench.book.rates_model
    page.use()
    assert bench.book.rates_model == former
    page.panel.fit_button.click()
    qtbot.waitUntil(lambda: not bench.jobs.running)
    assert not page.is_stale


def test_the_curve_matters_to_volatilities_alone(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    page = opened(station, bench, qtbot)
    bench.edit_basis(rates=bench.book.basis.rates + 0.001)
    assert not page.is_stale
    choose(page, bench, qtbot, VOLATILITIES, "ho-lee")
    bench.edit_basis(rates=bench.book.basis.rates + 0.001)
    assert page.is_stale


def test_another_book_begins_anew(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    page = opened(station, bench, qtbot)
    first = page.found
    bench.open(replace(a_book(), history=None))
    station.refresh_now()
    qtbot.waitUntil(lambda: not bench.jobs.running)
    assert page.found is not None
    assert page.found is not first
    assert page.found.source is VOLATILITIES
    assert page.panel.source.value is VOLATILITIES


def test_a_fit_can_be_cancelled(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    page = opened(station, bench, qtbot)
    kept = page.found
    page.panel.source.combo.activated.emit(2)
    page.panel.fit_button.setFocus()
    page.fit()
    assert page.is_fitting
    assert page.panel.cancel_button.isVisible()
    assert not page.panel.fit_button.isVisible()
    page.panel.cancel_button.click()
    qtbot.waitUntil(lambda: not bench.jobs.running)
    assert not page.is_fitting
    assert page.found is kept
    assert page.panel.fit_button.isVisible()


def test_no_mean_reversion_cannot_be_used(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    day = np.datetime64("2021-01-04") + 7 * np.arange(80)
    rising = History(day, 0.01 + 0.001 * np.arange(80) + 1e-5 * np.cos(np.arange(80.0)))
    bench.open(replace(a_fund(), history=rising))
    station.refresh_now()
    page = opened(station, bench, qtbot)
    assert page.verdict.text().startswith("The fit is poor: the history shows no mean reversion")
    assert not page.panel.use_button.isEnabled()
    assert "no estimate" in page.panel.note.text()


def test_a_book_without_a_model_can_be_given_a_fitted_one(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    bench.open(replace(a_book(), rates_model=None))
    station.refresh_now()
    assert station.is_empty
    page = opened(station, bench, qtbot)
    assert page.isVisible()
    page.panel.use_button.click()
    assert bench.book.rates_model is not None
    page.panel.back_button.click()
    station.refresh_now()
    assert not station.is_empty
    assert station.run_form.run_button.isVisible()


def test_by_keyboard_alone(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    station.activateWindow()
    station.fitting.button.setFocus()
    QTest.keyClick(station.fitting.button, Qt.Key.Key_Space)
    page = station.fitting.page
    assert page is not None
    qtbot.waitUntil(lambda: not bench.jobs.running)
    station.focus_home()
    reached = set()
    widget = page.panel.fit_button
    widget.setFocus()
    for _ in range(40):
        focus = station.focusWidget()
        assert focus is not None
        assert page.isAncestorOf(focus) or focus is page
        reached.add(focus)
        QTest.keyClick(focus, Qt.Key.Key_Tab)
    for target in (
        page.panel.use_button,
        page.panel.back_button,
        page.panel.source.combo,
        page.panel.model.combo,
        page.second,
        page.pages.tabs,
        page.figures,
    ):
        assert target in reached


def test_every_control_has_a_name(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    page = opened(station, bench, qtbot)
    for kind in (QComboBox, QSlider):
        for widget in page.findChildren(kind):
            assert widget.accessibleName(), widget
    for button in page.findChildren(QAbstractButton):
        assert button.text() or button.accessibleName() or not button.isVisible()
    for picture in (page.history, page.profile):
        assert picture.accessibleName()
        assert picture.accessibleDescription()
