"""By year: the fan, the histogram with its readings, the tables, and single paths."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import QPointF, Qt
from PySide6.QtTest import QTest
from pytestqt.qtbot import QtBot

from desk.book import Book, Inflation, ModelName, RatesModel, RiskyAssets, ScenarioSet
from desk.scenarios.node_checks import node_checks
from desk.scenarios.suggestions import suggested_model
from desk.window.parts.plot_series import Bars, Line
from desk.window.parts.theme import ThemeSwitch
from desk.window.scenarios.station import ScenariosStation
from desk.window.scenarios.tables import ChecksTable, check_sentence
from tests.window.benches import Bench, a_fund, dispose
from tests.window.scenarios.running import column, keys, paths_part, run, settle


def with_assets(book: Book) -> Book:
    """Two funds and inflation beside the rates."""
    funds = RiskyAssets(
        ("shares", "property"),
        np.array([100.0, 50.0]),
        np.array([0.04, 0.02]),
        np.array([0.18, 0.1]),
        np.zeros(2),
        np.array([[1.0, 0.4], [0.4, 1.0]]),
        np.array([-0.2, 0.1]),
    )
    assert book.rates_model is not None
    model = replace(book.rates_model, inflation_mean_reversion=0.3, inflation_volatility=0.008)
    inflation = Inflation(np.array([1.0, 10.0]), np.array([0.02, 0.025]))
    return replace(
        book, basis=replace(book.basis, inflation=inflation), rates_model=model, risky_assets=funds
    )


def from_outside(book: Book) -> Book:
    """A set of odd nodes."""
    rates = 0.02 + np.random.default_rng(4).normal(0.0, 0.01, (60, 4))
    scenarios = ScenarioSet(np.array([0.5, 1.0, 2.5, 6.0]), rates)
    return replace(book, rates_model=RatesModel(ModelName.OUTSIDE), scenario_set=scenarios)


# Pictures


def test_the_fan_is_nested_bands_with_the_closed_form(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    run(station, bench, qtbot)
    part = paths_part(station)
    names = part.fan.names
    assert {"Mean", "50\u202f%", "Closed form"} <= set(names)
    assert sum(" to " in name for name in names) == 3
    part.with_paths.setChecked(True)
    settle(station, qtbot)
    assert "Paths" in part.fan.names


def test_on_a_log_scale_the_readings_stay(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    run(station, bench, qtbot)
    part = paths_part(station)
    plain = dict(part.fan.readings_at(8.0))
    part.logarithmic.setChecked(True)
    settle(station, qtbot)
    assert dict(part.fan.readings_at(8.0)) == plain
    ticks = part.fan.plot.axes["left"].names
    assert all(float(text) == pytest.approx(10.0**place) for place, text in ticks.items())
    part.logarithmic.setChecked(False)
    settle(station, qtbot)
    assert not part.fan.plot.axes["left"].names


def test_the_year_is_chosen_by_slider_key_and_click(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    simulation = run(station, bench, qtbot)
    part = paths_part(station)
    part.slider.setValue(6)
    assert part.row == 6
    assert part.year_label.text() == "Year 6"
    settle(station, qtbot)
    assert part.histogram.title == "Savings account at year 6"
    plot = part.fan.plot
    for _ in range(3):
        QTest.keyClick(plot, Qt.Key.Key_Right)
    QTest.keyClick(plot, Qt.Key.Key_Return)
    assert part.row == 2
    middle = float(simulation.savings_account.mean[5])
    scene = part.fan._box.mapViewToScene(QPointF(5.1, middle))
    QTest.mouseClick(plot.viewport(), Qt.MouseButton.LeftButton, pos=plot.mapFromScene(scene))
    assert part.row == 5


@pytest.mark.parametrize("quantity", ["account", "rate"])
def test_the_histogram_has_the_closed_form_over_it(
    station: ScenariosStation, bench: Bench, qtbot: QtBot, quantity: str
) -> None:
    run(station, bench, qtbot)
    part = paths_part(station)
    part.show_quantity(quantity)
    settle(station, qtbot)
    assert part.histogram.names == ("Paths", "Closed form")
    bars, line = (part.histogram._series[name] for name in ("Paths", "Closed form"))
    assert isinstance(bars, Bars)
    assert isinstance(line, Line)
    # Of 400 paths each bin has few: over all of them bars and law agree.
    area = np.sum(bars.heights) * bars.width
    assert area == pytest.approx(np.trapezoid(line.y, line.x), rel=0.03)


def test_the_pointer_reads_share_and_tail_mean(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    simulation = run(station, bench, qtbot)
    part = paths_part(station)
    picture, summary = part.histogram, simulation.savings_account
    x = float(summary.percentile[part.row, summary.levels.index(25.0)])
    picture._on_pointed(QPointF(x, 0.0))
    place = picture._reading_place
    assert place in summary.histograms[part.row].edges
    text = picture.reading
    assert text.startswith("≤ ")
    assert "; mean " in text
    assert text.count("law ") == 2
    shown = dict(picture.readings_at(x))
    sampled, law = shown["P(X ≤ x)"].split(", law ")
    share = float(sampled.split()[0])
    # The bin holds a few of 400 paths.
    assert share == pytest.approx(25.0, abs=1.0)
    exact = float(law.replace("\u202f%", ""))
    assert exact == pytest.approx(25.0, abs=8.0)
    QTest.keyClick(picture.plot, Qt.Key.Key_Home)
    assert ":  0." in picture.reading


def test_a_model_without_a_closed_form_says_so(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    station.run_form.model.committed.emit(ModelName.CIR)
    station.refresh_now()
    simulation = run(station, bench, qtbot)
    part = paths_part(station)
    assert simulation.closed_form is None
    assert "no closed form" in part.fan.description
    assert part.histogram.names == ("Paths",)
    assert "mean_closed" not in keys(part.percentiles)


def test_the_short_rate_has_its_own_fan(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    simulation = run(station, bench, qtbot)
    part = paths_part(station)
    part.quantity.setCurrentIndex(1)
    settle(station, qtbot)
    assert part.fan.title == "Short rate"
    assert "Closed form" not in part.fan.names
    assert not part.logarithmic.isEnabled()
    assert dict(part.fan.readings_at(8.0))["Mean"] == f"{100 * simulation.short_rate.mean[8]:.2f}"
    assert column(part.percentiles, "mean")[8] == f"{100 * simulation.short_rate.mean[8]:.3f}"


def test_assets_and_prices_have_fans_checks_and_a_covariance(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    bench.open(with_assets(a_fund()))
    station.refresh_now()
    simulation = run(station, bench, qtbot)
    part = paths_part(station)
    assert simulation.risky is not None
    assert simulation.index is not None
    assert [each.key for each in part.quantities] == [
        *("account", "rate", "asset 0", "asset 1", "total", "index")
    ]
    part.show_quantity("asset 0")
    part.pages.show_page("checks")
    settle(station, qtbot)
    assert part.fan.title.startswith("shares")
    mean = simulation.risky.assets[0].total_return.mean[8]
    assert dict(part.fan.readings_at(8.0))["Mean"] == f"{mean:.3f}"
    assert part.checks.table_model.column_values("mean")[8] == simulation.risky.assets[0].mean_excess[8]
    assert "standard errors" in part.verdict.words.text()
    part.show_quantity("index")
    settle(station, qtbot)
    expected = simulation.index.expected_discounted
    assert part.checks.table_model.column_values("expected").tolist() == expected.tolist()
    part.show_quantity("total")
    settle(station, qtbot)
    assert part.histogram.title == "All risky assets at year 4"
    # An axis of money leaves no thousands behind on the next one.
    part.show_quantity("account")
    settle(station, qtbot)
    assert "thousand" not in part.histogram._x.heading
    part.pages.show_page("assets")
    settle(station, qtbot)
    assert part.covariance.table_model.column_values("c0")[0] == pytest.approx(0.18**2)
    assert part.covariance.table_model.column_values("c0")[1] == pytest.approx(0.4 * 0.18 * 0.1)


def test_without_assets_there_is_no_covariance(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    run(station, bench, qtbot)
    assert not paths_part(station).pages.has_page("assets")


# Single paths


def test_a_path_is_chosen_by_number_and_read_node_by_node(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    simulation = run(station, bench, qtbot)
    part = paths_part(station)
    part.path_number.setText("13")
    part.path_number.setModified(True)
    part.path_number.editingFinished.emit()
    qtbot.waitUntil(lambda: part.path is not None)
    settle(station, qtbot)
    assert part.pages.current == "path"
    account = part.path_table.table_model.column_values("account")
    assert account.tolist() == simulation.sample_paths[12].tolist()
    assert "Path 13" in part.fan.names
    assert column(part.path_table, "mean_rate")[0] == "–"
    for key in ("rate", "asset 0"):
        part.show_quantity(key)
    settle(station, qtbot)
    assert "Path 13" in part.fan.names
    part.path_number.setFocus()
    QTest.keyClick(part.path_number, Qt.Key.Key_Up)
    qtbot.waitUntil(lambda: part.path is not None and part.path.first == 13)
    QTest.keyClick(part.path_number, Qt.Key.Key_Escape)
    settle(station, qtbot)
    assert part.path is None
    assert not any(name.startswith("Path ") for name in part.fan.names)


def test_a_path_is_picked_by_a_click_and_stepped_by_keys(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    simulation = run(station, bench, qtbot)
    part = paths_part(station)
    part.with_paths.setChecked(True)
    settle(station, qtbot)
    # The path that is highest at the end stands alone.
    highest = int(simulation.sample_paths[:25, 8].argmax())
    place = QPointF(7.9, float(np.interp(7.9, range(9), simulation.sample_paths[highest])))
    plot = part.fan.plot
    scene = part.fan._box.mapViewToScene(place)
    QTest.mouseClick(plot.viewport(), Qt.MouseButton.LeftButton, pos=plot.mapFromScene(scene))
    assert part.chosen_path == highest + 1
    qtbot.waitUntil(lambda: part.path is not None)
    QTest.keyClick(plot, Qt.Key.Key_PageDown)
    assert part.chosen_path == highest + 2
    QTest.keyClick(plot, Qt.Key.Key_PageUp)
    assert part.chosen_path == highest + 1


def test_some_paths_of_every_quantity_are_drawn(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    bench.open(with_assets(a_fund()))
    station.refresh_now()
    run(station, bench, qtbot)
    part = paths_part(station)
    part.with_paths.setChecked(True)
    qtbot.waitUntil(lambda: part._first_paths is not None)
    for key in ("account", "rate", "asset 1", "index"):
        part.show_quantity(key)
        settle(station, qtbot)
        assert "Paths" in part.fan.names, key
    part.show_quantity("total")
    settle(station, qtbot)
    assert "Paths" not in part.fan.names


def test_a_stale_run_shows_the_paths_of_its_own_book(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    simulation = run(station, bench, qtbot)
    station.run_form.items["volatility"].committed.emit(0.05)
    station.refresh_now()
    part = paths_part(station)
    part.path_number.setValue(2)
    qtbot.waitUntil(lambda: part.path is not None)
    assert part.path is not None
    assert part.path.account[:, 0].tolist() == simulation.sample_paths[1].tolist()


def test_odd_numbers_of_paths_change_nothing(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    run(station, bench, qtbot)
    box = paths_part(station).path_number
    for text, value in (("7", 7), ("x", 7), ("2.5", 7), ("99999", 400), ("-4", 0), ("", 0)):
        box.setText(text)
        box.setModified(True)
        box.editingFinished.emit()
        assert box.value() == value, text
    box.setText("12")
    box.setModified(True)
    QTest.keyClick(box, Qt.Key.Key_Escape)
    assert box.value() == 0
    assert box.text() == ""


# Tables


def test_every_sampled_figure_has_its_error_beside_it(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    simulation = run(station, bench, qtbot)
    part = paths_part(station)
    full = {"mean_se", "sd_se", "p0_se", "p0_low", "p0_high", "p0_closed", "p0_tail", "p0_tail_se"}
    assert full <= set(keys(part.percentiles))
    tail = part.percentiles.table_model.column_values("p0_tail")
    assert tail.tolist() == simulation.savings_account.tail_mean[:, 0].tolist()
    part.in_full.setChecked(False)
    settle(station, qtbot)
    shown = keys(part.percentiles)
    assert {"mean_se", "p0_se"} <= set(shown)
    assert "p0_low" not in shown
    values = part.percentiles.table_model.column_values("p0")
    assert values.tolist() == simulation.savings_account.percentile[:, 0].tolist()


def test_the_check_against_the_curve_marks_what_is_too_far_off(
    station: ScenariosStation, bench: Bench, qtbot: QtBot, theme_switch: ThemeSwitch
) -> None:
    simulation = run(station, bench, qtbot)
    part = paths_part(station)
    part.pages.show_page("checks")
    settle(station, qtbot)
    model = part.checks.table_model
    place = model.column_of("errors")
    assert not any(model.mark_at(row, place) for row in range(model.rowCount()))
    assert part.verdict.words.text().startswith("Agrees with the curve: all 8 years")
    check = simulation.repricing
    wrong = replace(check, mean_discount=check.mean_discount + np.where(check.year == 3, 0.05, 0.0))
    doubtful = replace(simulation, repricing=wrong)
    table = ChecksTable(theme_switch)
    table.show_check(node_checks(doubtful)[0], wrong.curve_discount)
    marked = [row for row in range(9) if table.table_model.mark_at(row, place)]
    assert marked == [3]
    assert column(table, "verdict")[2:4] == ["agrees", "too far off"]
    assert check_sentence(node_checks(doubtful)[0], doubtful).startswith("Doubtful: 1 of 8 years")
    dispose(table)


def test_moments_stand_beside_their_closed_forms(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    simulation = run(station, bench, qtbot)
    part = paths_part(station)
    part.pages.show_page("moments")
    settle(station, qtbot)
    assert simulation.diagnostics is not None
    model = part.moments.table_model
    assert model.column_values("sd_law").tolist() == simulation.diagnostics.rate_sd.tolist()
    slope = model.column_values("auto_law")[1:]
    # A step of half a year at a mean reversion of 0.05.
    np.testing.assert_allclose(slope[np.isfinite(slope)], np.exp(-0.05 * 0.5), rtol=1e-12)
    assert np.abs(model.column_values("auto_off")[2:]).max() < 4.0


def test_a_set_from_outside_at_odd_nodes(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    bench.open(from_outside(a_fund()))
    station.refresh_now()
    assert "The set holds 60 paths at 4 nodes from 0.5 to 6 years" in station.run_form.of_set.text()
    simulation = run(station, bench, qtbot)
    part = paths_part(station)
    assert simulation.paths == 60
    part.pages.show_page("checks")
    part.set_row(3)
    settle(station, qtbot)
    assert part.year_label.text() == "Year 2.5"
    assert "reprice" in part.verdict.words.text()
    assert "paths from outside" in station.run_form.state.text()
    part.path_number.setValue(60)
    qtbot.waitUntil(lambda: part.path is not None)
    settle(station, qtbot)
    assert column(part.path_table, "year")[:3] == ["0.0", "0.5", "1.0"]


@pytest.mark.parametrize("name", [ModelName.HO_LEE, ModelName.CIR])
def test_rates_that_run_away_are_still_shown(
    station: ScenariosStation, bench: Bench, qtbot: QtBot, name: ModelName
) -> None:
    book = with_assets(a_fund())
    model = replace(suggested_model(name, book.basis), volatility=4.0)
    run_long = replace(book.run, paths=50, horizon_years=120, steps_per_year=1)
    bench.open(replace(book, rates_model=model, run=run_long))
    station.refresh_now()
    simulation = run(station, bench, qtbot)
    part = paths_part(station)
    part.logarithmic.setChecked(True)
    part.with_paths.setChecked(True)
    part.path_number.setValue(1)
    for each in part.quantities:
        part.show_quantity(each.key)
        settle(station, qtbot)
        part.histogram._on_pointed(QPointF(float(each.summary.mean[part.row]), 0.0))
    for key in ("curve", "values", "convergence", "paths"):
        station.show_part(key)
        qtbot.waitUntil(lambda: not bench.jobs.running)
        settle(station, qtbot)
    part.show_quantity("account")
    part.set_row(120)
    settle(station, qtbot)
    assert part.histogram.title == "Savings account at year 120"
    part.pages.show_page("percentiles")
    settle(station, qtbot)
    assert part.percentiles.table_model.rowCount() == simulation.savings_account.year.size


def test_one_path_has_no_errors_to_show(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    bench.open(replace(a_fund(), run=replace(a_fund().run, paths=1, horizon_years=1)))
    station.refresh_now()
    run(station, bench, qtbot)
    part = paths_part(station)
    assert column(part.percentiles, "mean_se")[1] == "–"
    part.pages.show_page("checks")
    settle(station, qtbot)
    assert "nothing to check" in part.verdict.words.text()
    assert (part.slider.minimum(), part.slider.maximum(), part.row) == (1, 1, 1)
