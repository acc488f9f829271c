"""The station Scenarios: settings, runs that are slow, cancelled or fail, pictures and tables of a run."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import QPointF, Qt
from PySide6.QtTest import QTest
from pytestqt.qtbot import QtBot

from desk.book import Measure, ModelName
from desk.scenarios.records import Simulation
from desk.scenarios.suggestions import MODEL_ITEMS, suggested_model
from desk.window.parts.plot_series import Bars, Line
from desk.window.parts.tables import Table
from desk.window.parts.theme import ThemeSwitch
from desk.window.scenarios.station import ScenariosStation
from desk.window.scenarios.tables import RepricingTable
from tests.window.benches import Bench, a_fund, dispose


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
    bench.open(a_fund())
    made.refresh_now()
    yield made
    dispose(made)


def run(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> Simulation:
    station.run()
    qtbot.waitUntil(lambda: not bench.document.is_simulating)
    station.refresh_now()
    settle(station, qtbot)
    simulation = bench.document.simulation
    assert simulation is not None
    return simulation


def settle(station: ScenariosStation, qtbot: QtBot) -> None:
    qtbot.waitUntil(lambda: not station._waiting)


def column(table: Table, key: str) -> list[str]:
    model = table.table_model
    place = model.column_of(key)
    return [str(model.data(model.index(row, place))) for row in range(model.rowCount())]


# Before the first run


def test_without_a_book_it_asks_for_one(bench: Bench, qtbot: QtBot, theme_switch: ThemeSwitch) -> None:
    station = ScenariosStation(bench.document, bench.jobs, theme_switch)
    station.show()
    assert station.is_empty
    with qtbot.waitSignal(station.step_wanted) as wanted:
        station.empty.button.click()
    assert wanted.args == ["open"]
    dispose(station)


def test_before_the_first_run_it_offers_one(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    assert station.invitation.isVisible()
    assert not station.pictures.isVisible()
    station.invitation_button.click()
    assert bench.document.is_simulating
    qtbot.waitUntil(lambda: not bench.document.is_simulating)
    station.refresh_now()
    assert not station.invitation.isVisible()
    assert station.pictures.isVisible()


def test_a_book_without_a_model_is_offered_one(bench: Bench, station: ScenariosStation) -> None:
    bench.open(replace(a_fund(), rates_model=None))
    station.refresh_now()
    assert station.is_empty
    station.run()
    assert not bench.document.is_simulating
    station.empty.button.click()
    model = bench.book.rates_model
    assert model is not None
    assert (model.name, model.mean_reversion, model.volatility) == (ModelName.HULL_WHITE, 0.05, 0.009)
    assert bench.document.undo_text == "New rates model Hull-White"
    station.refresh_now()
    assert not station.is_empty
    bench.document.undo()
    station.refresh_now()
    assert station.is_empty


# Settings


@pytest.mark.parametrize("name", [name for name in ModelName if name is not ModelName.OUTSIDE])
def test_only_what_a_model_uses_is_asked_for(
    station: ScenariosStation, bench: Bench, name: ModelName
) -> None:
    station.run_form.model.committed.emit(name)
    station.refresh_now()
    items = {
        key.replace("root_", "") for key, field in station.run_form.items.items() if not field.isHidden()
    }
    assert items == set(MODEL_ITEMS[name])
    roots = not station.run_form.items["root_volatility"].isHidden()
    assert roots == (name in (ModelName.CIR, ModelName.CIR_SHIFTED))
    assert station.run_form.run_button.isEnabled()
    assert station.run_form.model.hint


def test_settings_are_edits_that_can_be_undone(station: ScenariosStation, bench: Bench) -> None:
    form = station.run_form
    form.items["volatility"].committed.emit(0.012)
    form.paths.committed.emit(900)
    form.measure.committed.emit(Measure.REAL_WORLD)
    station.refresh_now()
    model = bench.book.rates_model
    assert model is not None
    assert model.volatility == 0.012
    assert (bench.book.run.paths, bench.book.run.measure) == (900, Measure.REAL_WORLD)
    assert bench.document.undo_text == "Change of the measure"
    for _ in range(3):
        bench.document.undo()
    assert bench.book == a_fund()


def test_the_measure_says_what_it_may_be_used_for(station: ScenariosStation, bench: Bench) -> None:
    form = station.run_form
    assert "For values" in form.measure.hint
    assert form.risk_price.isHidden()
    form.measure.committed.emit(Measure.REAL_WORLD)
    station.refresh_now()
    assert "no prices" in form.measure.hint
    assert not form.risk_price.isHidden()


def test_a_square_root_model_takes_no_negative_rate(station: ScenariosStation) -> None:
    form = station.run_form
    assert form.items["starting_rate"].low == -0.2
    form.model.committed.emit(ModelName.CIR)
    station.refresh_now()
    assert form.items["starting_rate"].low == 0.0
    assert (form.items["mean_reversion"].low or 0.0) > 0.0


def test_a_model_that_cannot_be_drawn_says_why(station: ScenariosStation, bench: Bench) -> None:
    model = a_fund().rates_model
    assert model is not None
    bench.document.edit("x", replace(a_fund(), rates_model=replace(model, volatility=None)))
    station.refresh_now()
    assert not station.run_form.run_button.isEnabled()
    assert "Volatility is missing" in station.run_form.state.text()
    assert "Volatility is missing" in station.invitation_text.text()


# Running


def test_a_run_is_shown_with_its_settings(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    simulation = run(station, bench, qtbot)
    assert (
        "400 paths of Hull-White over 8 years, pricing measure, seed\N{NO-BREAK SPACE}7."
        in station.run_form.state.text()
    )
    assert station.slider.maximum() == 8
    assert station.year == 4
    mean = dict(station.fan.readings_at(8.0))["Mean"]
    assert mean == f"{simulation.savings_account.mean[8]:.3f}"
    assert column(station.percentiles, "mean")[8] == f"{simulation.savings_account.mean[8]:.4f}"


def test_while_it_runs_it_can_be_cancelled(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    former = run(station, bench, qtbot)
    bench.simulation.let_go.clear()
    station.run()
    form = station.run_form
    assert form.cancel_button.isVisible()
    assert not form.run_button.isVisible()
    qtbot.waitUntil(lambda: "25" in form.state.text())
    form.cancel_button.click()
    qtbot.waitUntil(lambda: not bench.document.is_simulating)
    station.refresh_now()
    assert bench.document.simulation is former
    assert form.run_button.isVisible()
    assert station._shown is former


def test_ctrl_r_runs(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    station.activateWindow()
    station.run_form.run_button.setFocus()
    qtbot.waitUntil(station.run_form.run_button.hasFocus)
    QTest.keyClick(station, Qt.Key.Key_R, Qt.KeyboardModifier.ControlModifier)
    qtbot.waitUntil(lambda: bench.document.simulation is not None)


def test_a_second_run_waits_for_the_first(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    bench.simulation.let_go.clear()
    station.run()
    job = station._job
    station.run()
    assert station._job is job
    bench.simulation.let_go.set()
    qtbot.waitUntil(lambda: bench.document.simulation is not None)


def test_a_run_from_before_an_edit_is_marked(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    former = run(station, bench, qtbot)
    station.run_form.items["volatility"].committed.emit(0.02)
    station.refresh_now()
    assert "from before your last change" in station.stale_text
    station.strip.button.click()
    qtbot.waitUntil(lambda: not bench.document.is_simulating)
    station.refresh_now()
    assert not station.stale_text
    simulation = bench.document.simulation
    assert simulation is not None
    assert simulation.savings_account.sd[8] > 1.5 * former.savings_account.sd[8]


def test_a_run_that_fails_says_why_and_the_former_stays(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    former = run(station, bench, qtbot)
    bench.simulation.error = ValueError("the model ran away")
    station.run()
    qtbot.waitUntil(lambda: not bench.document.is_simulating)
    station.refresh_now()
    assert "the model ran away" in station.stale_text
    assert bench.document.simulation is former
    assert station.pictures.isVisible()
    station.strip.button.click()
    assert not station.stale_text


# Pictures


def test_the_fan_is_nested_bands_with_the_closed_form(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    run(station, bench, qtbot)
    names = station.fan.names
    assert {"Mean", "50\u202f%", "Closed form"} <= set(names)
    assert sum(" to " in name for name in names) == 3
    station.with_paths.setChecked(True)
    settle(station, qtbot)
    assert "Paths" in station.fan.names


def test_on_a_log_scale_the_readings_stay(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    run(station, bench, qtbot)
    plain = dict(station.fan.readings_at(8.0))
    station.logarithmic.setChecked(True)
    settle(station, qtbot)
    assert dict(station.fan.readings_at(8.0)) == plain
    ticks = station.fan.plot.axes["left"].names
    assert all(float(text) == pytest.approx(10.0**place) for place, text in ticks.items())
    station.logarithmic.setChecked(False)
    settle(station, qtbot)
    assert not station.fan.plot.axes["left"].names


def test_the_year_is_chosen_by_slider_key_and_click(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    simulation = run(station, bench, qtbot)
    station.slider.setValue(6)
    assert station.year == 6
    assert station.year_label.text() == "Year 6"
    settle(station, qtbot)
    assert station.histogram.title == "Savings account at year 6"
    plot = station.fan.plot
    for _ in range(3):
        QTest.keyClick(plot, Qt.Key.Key_Right)
    QTest.keyClick(plot, Qt.Key.Key_Return)
    assert station.year == 2
    middle = float(simulation.savings_account.mean[5])
    scene = station.fan._box.mapViewToScene(QPointF(5.1, middle))
    QTest.mouseClick(plot.viewport(), Qt.MouseButton.LeftButton, pos=plot.mapFromScene(scene))
    assert station.year == 5


def test_the_histogram_has_the_closed_form_over_it(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    run(station, bench, qtbot)
    assert station.histogram.names == ("Paths", "Closed form")
    bars = station.histogram._series["Paths"]
    line = station.histogram._series["Closed form"]
    assert isinstance(bars, Bars)
    assert isinstance(line, Line)
    # Of 400 paths each bin has few: over all of them bars and law agree.
    area = np.sum(bars.heights) * bars.width
    assert area == pytest.approx(np.trapezoid(line.y, line.x), rel=0.03)


def test_a_model_without_a_closed_form_says_so(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    station.run_form.model.committed.emit(ModelName.CIR)
    station.refresh_now()
    simulation = run(station, bench, qtbot)
    assert simulation.closed_form is None
    assert "no closed form" in station.fan.description
    assert station.histogram.names == ("Paths",)
    assert "mean_closed" not in [each.key for each in station.percentiles.table_model.columns]


def test_the_short_rate_has_its_own_fan(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    simulation = run(station, bench, qtbot)
    station.quantity.setCurrentIndex(1)
    settle(station, qtbot)
    assert station.fan.title == "Short rate"
    assert "Closed form" not in station.fan.names
    assert not station.logarithmic.isVisible()
    assert dict(station.fan.readings_at(8.0))["Mean"] == f"{100 * simulation.short_rate.mean[8]:.2f}"
    assert column(station.percentiles, "mean")[8] == f"{100 * simulation.short_rate.mean[8]:.3f}"


def test_present_values_mark_the_value_on_the_curve(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    simulation = run(station, bench, qtbot)
    station.quantity.setCurrentIndex(2)
    settle(station, qtbot)
    sides_picture, surplus_picture = station.values_pictures
    assert sides_picture.isVisible()
    assert not station.fan.isVisible()
    assert sides_picture.names == ("Assets", "Liabilities")
    surplus = simulation.present_value[2]
    assert surplus_picture._verticals["on the curve"][0] == surplus.curve
    assert "Below zero on" in surplus_picture.description
    assert station.pages.current == "values"
    assert column(station.values, "name") == ["Assets", "Liabilities", "Surplus"]
    assert station.values.table_model.column_values("below")[2] == surplus.below_zero
    station.quantity.setCurrentIndex(0)
    settle(station, qtbot)
    assert station.pages.current == "percentiles"


# Tables


def test_every_sampled_figure_has_its_error_beside_it(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    simulation = run(station, bench, qtbot)
    keys = [each.key for each in station.percentiles.table_model.columns]
    assert {"mean_se", "sd_se", "p0_low", "p0_high", "p0_closed"} <= set(keys)
    station.in_full.setChecked(False)
    settle(station, qtbot)
    keys = [each.key for each in station.percentiles.table_model.columns]
    assert "mean_se" in keys
    assert "p0_low" not in keys
    shown = station.percentiles.table_model.column_values("p0")
    assert shown.tolist() == simulation.savings_account.percentile[:, 0].tolist()


def test_the_check_against_the_curve_marks_what_is_too_far_off(
    station: ScenariosStation, bench: Bench, qtbot: QtBot, theme_switch: ThemeSwitch
) -> None:
    simulation = run(station, bench, qtbot)
    station.pages.show_page("repricing")
    settle(station, qtbot)
    model = station.repricing.table_model
    place = model.column_of("errors")
    assert not any(model.mark_at(row, place) for row in range(model.rowCount()))
    check = simulation.repricing
    wrong = replace(check, mean_discount=check.mean_discount + np.where(check.year == 3, 0.05, 0.0))
    table = RepricingTable(theme_switch)
    table.show_run(replace(simulation, repricing=wrong))
    marked = [row for row in range(9) if table.table_model.mark_at(row, place)]
    assert marked == [3]
    dispose(table)


@pytest.mark.parametrize("name", [ModelName.HO_LEE, ModelName.CIR])
def test_rates_that_run_away_are_still_shown(
    station: ScenariosStation, bench: Bench, qtbot: QtBot, name: ModelName
) -> None:
    book = a_fund()
    model = replace(suggested_model(name, book.basis), volatility=4.0)
    run_long = replace(book.run, paths=50, horizon_years=120, steps_per_year=1)
    bench.open(replace(book, rates_model=model, run=run_long))
    station.refresh_now()
    simulation = run(station, bench, qtbot)
    for quantity in (0, 1, 2):
        station.quantity.setCurrentIndex(quantity)
        settle(station, qtbot)
    station.quantity.setCurrentIndex(0)
    station.logarithmic.setChecked(True)
    station.set_year(120)
    settle(station, qtbot)
    assert station.histogram.title == "Savings account at year 120"
    assert station.percentiles.table_model.rowCount() == simulation.savings_account.year.size


def test_one_path_has_no_errors_to_show(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    bench.open(replace(a_fund(), run=replace(a_fund().run, paths=1, horizon_years=1)))
    station.refresh_now()
    run(station, bench, qtbot)
    station.quantity.setCurrentIndex(2)
    settle(station, qtbot)
    assert column(station.values, "se") == ["–", "–", "–"]
    assert (station.slider.minimum(), station.slider.maximum(), station.year) == (1, 1, 1)


def test_another_book_starts_from_nothing(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    run(station, bench, qtbot)
    bench.open(a_fund())
    station.refresh_now()
    assert station.invitation.isVisible()
    assert not station.pictures.isVisible()
