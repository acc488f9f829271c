"""The yield curve, present values, convergence, and models side by side."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import QPointF, Qt
from PySide6.QtTest import QTest
from pytestqt.qtbot import QtBot

from desk import tasks
from desk.book import Measure, ModelName, RatesModel, Sampling, ScenarioSet
from desk.scenarios.tail_readings import histogram_reading
from desk.window.scenarios.further_parts import ConvergencePart, CurvePart, ValuesPart
from desk.window.scenarios.models_part import ModelsPart
from desk.window.scenarios.station import ScenariosStation
from tests.window.benches import Bench, a_fund
from tests.window.scenarios.running import column, keys, run, settle


def curve_part(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> CurvePart:
    station.show_part("curve")
    part = station.part_of("curve")
    assert isinstance(part, CurvePart)
    qtbot.waitUntil(lambda: not bench.jobs.running)
    settle(station, qtbot)
    return part


def models_part(station: ScenariosStation) -> ModelsPart:
    station.show_part("models")
    part = station.part_of("models")
    assert isinstance(part, ModelsPart)
    return part


# The curve


def test_the_curve_at_a_year_stands_beside_the_forward_curve(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    simulation = run(station, bench, qtbot)
    part = curve_part(station, bench, qtbot)
    assert part.picture.title == "Yield curve in year 4"
    assert {"Mean", "Forward today", "Curve today"} <= set(part.picture.names)
    first = column(part.curve_table, "p0")[0]
    assert first == f"{100 * simulation.short_rate.percentile[4, 0]:.3f}".replace("-", "\u2212")
    assert part.fan is not None
    forward = bench.book.basis.curve.forward(4.0, 14.0)
    assert float(part.fan.forward[part.fan.term == 10.0][0]) == pytest.approx(float(forward), rel=1e-12)


def test_another_year_is_drawn_once_the_slider_rests_and_kept(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    run(station, bench, qtbot)
    part = curve_part(station, bench, qtbot)
    first = part.fan
    for row in (5, 6, 7):
        part.slider.setValue(row)
    assert not bench.jobs.running
    qtbot.waitUntil(lambda: part.fan is not None and part.fan.year == 7.0)
    assert set(part._kept) == {4, 7}
    part.slider.setValue(4)
    assert part.fan is first
    settle(station, qtbot)
    assert part.picture.title == "Yield curve in year 4"


def test_a_new_run_brings_a_new_curve(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    run(station, bench, qtbot)
    former = curve_part(station, bench, qtbot).fan
    station.run_form.items["volatility"].committed.emit(0.03)
    run(station, bench, qtbot)
    part = curve_part(station, bench, qtbot)
    assert former is not None
    assert part.fan is not None
    assert (part.fan.sd > 2.0 * former.sd).all()


def test_a_set_from_outside_has_no_curve_and_says_so(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    scenarios = ScenarioSet(np.array([1.0, 2.0]), np.full((3, 2), 0.02))
    outside = replace(a_fund(), rates_model=RatesModel(ModelName.OUTSIDE), scenario_set=scenarios)
    bench.open(outside)
    station.refresh_now()
    run(station, bench, qtbot)
    part = curve_part(station, bench, qtbot)
    assert part.fan is None
    assert "no bonds" in part.picture.description
    assert "no bonds" in part.curve_table.empty_text
    assert not part.picture.plot.isVisible()


# Present values


def test_present_values_mark_the_value_on_the_curve_and_have_tails(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    simulation = run(station, bench, qtbot)
    station.show_part("values")
    settle(station, qtbot)
    part = station.part_of("values")
    assert isinstance(part, ValuesPart)
    assert part.both.isVisible()
    assert part.both.names == ("Assets", "Liabilities")
    surplus = simulation.present_value[2]
    assert part.surplus._verticals["on the curve"][0] == surplus.curve
    assert "Below zero on" in part.surplus.description
    assert column(part.values, "name") == ["Assets", "Liabilities", "Surplus"]
    model = part.values.table_model
    assert model.column_values("below")[2] == surplus.below_zero
    assert model.column_values("p0_tail")[2] == surplus.tail_mean[0]
    assert model.column_values("p0_tail_se")[2] == surplus.tail_mean_se[0]
    assert "p0_low" not in keys(part.values)
    part.in_full.setChecked(True)
    settle(station, qtbot)
    assert "p0_low" in keys(part.values)
    middle = surplus.percentile[surplus.levels.index(50.0)]
    part.surplus._on_pointed(QPointF(float(middle), 0.0))
    assert "below, their mean" in part.surplus.reading
    assert histogram_reading(surplus.histogram, float(middle)).share == pytest.approx(0.5, abs=0.02)


def test_one_path_has_present_values_without_errors(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    bench.open(replace(a_fund(), run=replace(a_fund().run, paths=1, horizon_years=1)))
    station.refresh_now()
    run(station, bench, qtbot)
    for key in ("values", "convergence"):
        station.show_part(key)
        settle(station, qtbot)
    part = station.part_of("values")
    assert isinstance(part, ValuesPart)
    assert column(part.values, "se") == ["–", "–", "–"]


# Convergence


def test_every_headline_figure_shows_how_it_settles(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    simulation = run(station, bench, qtbot)
    station.show_part("convergence")
    settle(station, qtbot)
    part = station.part_of("convergence")
    assert isinstance(part, ConvergencePart)
    assert part.figure.count() == len(simulation.convergence) == part.convergence.table_model.rowCount()
    for place, found in enumerate(simulation.convergence):
        part.figure.setCurrentIndex(place)
        settle(station, qtbot)
        assert part.picture.title.casefold() == found.figure.casefold()
        assert part.picture.plot.axes["bottom"].names[float(np.log2(400))] == "400"
    part.convergence.activated_row.emit(1)
    settle(station, qtbot)
    assert part.picture.title == "Mean present value of assets"
    assert part.gains.table_model.rowCount() == 0
    assert "Plain sampling" in part.gains.empty_text


def test_the_gain_of_the_sampling_is_told(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    settings = replace(a_fund().run, sampling=Sampling.SOBOL, paths=512, replicates=8)
    bench.open(replace(a_fund(), run=settings))
    station.refresh_now()
    simulation = run(station, bench, qtbot)
    station.show_part("convergence")
    settle(station, qtbot)
    part = station.part_of("convergence")
    assert isinstance(part, ConvergencePart)
    gain = part.gains.table_model.column_values("gain")
    assert gain.tolist() == [each.gain for each in simulation.gains]
    assert gain[0] > 1.0


# Models


def test_models_are_drawn_side_by_side_in_the_background(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    simulation = run(station, bench, qtbot)
    part = models_part(station)
    settle(station, qtbot)
    assert "Nothing is compared yet" in part.surplus.description
    assert part.chosen == (ModelName.HULL_WHITE, ModelName.GAUSSIAN_2, ModelName.CIR_SHIFTED)
    assert not part.actions[ModelName.OUTSIDE].isEnabled()
    part.actions[ModelName.GAUSSIAN_2].setChecked(False)
    part.actions[ModelName.BLACK_KARASINSKI].setChecked(True)
    assert part.choice.text() == "3 models chosen"
    part.button.click()
    assert part.is_comparing
    # The keyboard stays where it was.
    assert part.button.isEnabled()
    assert part.button.text() == "Comparing…"
    qtbot.waitUntil(lambda: not part.is_comparing, timeout=20_000)
    settle(station, qtbot)
    assert part.button.isEnabled()
    table = part.models.table_model
    assert column(part.models, "model") == [
        "Hull-White",
        "Cox-Ingersoll-Ross, shifted",
        "Black-Karasinski",
    ]
    # The book's own model is the run that is shown, to the last bit.
    surplus = simulation.present_value[2]
    assert table.column_values("surplus")[0] == surplus.mean
    low = surplus.levels.index(5.0)
    assert table.column_values("low")[0] == surplus.percentile[low]
    assert np.isfinite(table.column_values("tail_se").astype(float)).all()
    assert part.surplus.plot.axes["bottom"].names[1.0] == "Hull-White"
    # Fitted models reprice the curve.
    assert table.column_values("check").astype(float).max() < 4.0


def test_both_measures_stand_side_by_side(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    model = a_fund().rates_model
    assert model is not None
    bench.open(replace(a_fund(), rates_model=replace(model, risk_price=0.5)))
    station.refresh_now()
    run(station, bench, qtbot)
    part = models_part(station)
    for name, action in part.actions.items():
        action.setChecked(name is ModelName.HULL_WHITE)
    part.both.setChecked(True)
    part.compare()
    qtbot.waitUntil(lambda: not part.is_comparing)
    settle(station, qtbot)
    assert column(part.models, "measure") == [str(Measure.PRICING), str(Measure.REAL_WORLD)]
    pricing, real = part.models.table_model.column_values("account").astype(float)
    assert real > pricing


def test_a_model_that_cannot_be_drawn_says_why_beside_the_others(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    below = replace(a_fund().basis, rates=np.array([-0.01, -0.005, 0.0, 0.01]))
    bench.open(replace(a_fund(), basis=below))
    station.refresh_now()
    run(station, bench, qtbot)
    part = models_part(station)
    for name, action in part.actions.items():
        action.setChecked(name in (ModelName.HULL_WHITE, ModelName.BLACK_KARASINSKI))
    part.compare()
    qtbot.waitUntil(lambda: not part.is_comparing)
    settle(station, qtbot)
    notes = column(part.models, "note")
    assert notes[0] == ""
    assert "forward" in notes[1]
    assert column(part.models, "surplus")[1] == "–"


def test_a_comparison_is_cancelled_and_none_is_kept_for_another_book(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    run(station, bench, qtbot)
    part = models_part(station)
    part.compare()
    bench.jobs.cancel_all()
    qtbot.waitUntil(lambda: not part.is_comparing)
    assert part.runs == ()
    assert part.button.isEnabled()
    part.compare()
    qtbot.waitUntil(lambda: not part.is_comparing, timeout=20_000)
    assert part.runs
    bench.open(a_fund())
    station.refresh_now()
    assert part.runs == ()
    run(station, bench, qtbot)
    assert part.runs == ()
    for action in part.actions.values():
        action.setChecked(False)
    assert not part.button.isEnabled()


def test_the_choice_of_models_opens_by_keyboard(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    run(station, bench, qtbot)
    part = models_part(station)
    menu = part.choice.menu()
    assert menu is not None
    assert menu.actions()
    assert part.choice.focusPolicy() & Qt.FocusPolicy.TabFocus
    assert "3 chosen" in part.choice.accessibleName()
    QTest.keyClick(part.both, Qt.Key.Key_Space)
    assert part.both.isChecked()


def test_the_task_gives_each_model_under_each_measure() -> None:
    model = a_fund().rates_model
    assert model is not None
    found = tasks.compare_models(a_fund(), [model], measures=tuple(Measure))
    assert [measure for measure, _ in found] == list(Measure)
    assert [run.simulation.measure for _, run in found if run.simulation is not None] == list(Measure)


def test_the_error_of_the_fitted_values_is_told(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    station.run_form.model.committed.emit(ModelName.BLACK_KARASINSKI)
    station.refresh_now()
    simulation = run(station, bench, qtbot)
    station.show_part("values")
    settle(station, qtbot)
    part = station.part_of("values")
    assert isinstance(part, ValuesPart)
    error = float(dict(simulation.provenance.settings)["surface_error"])
    assert 0.0 < error < 1e-10
    told = part.both.description.rsplit(" fit ", 1)[1].rstrip(".").replace("\N{MINUS SIGN}", "-")
    assert float(told) == pytest.approx(error, rel=0.5)
