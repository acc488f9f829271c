"""The station Scenarios: settings, runs that are slow, cancelled or fail, pictures and tables of a run."""

from __future__ import annotations

from dataclasses import replace

import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from pytestqt.qtbot import QtBot

from desk.book import Measure, ModelName, Sampling
from desk.scenarios.suggestions import MODEL_ITEMS
from desk.window.parts.theme import ThemeSwitch
from desk.window.scenarios.models_part import ModelsPart
from desk.window.scenarios.station import ScenariosStation
from tests.window.benches import Bench, a_fund, dispose
from tests.window.scenarios.running import paths_part, run, settle

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
        key.replace("root_", "").replace("relative_", "")
        for key, field in station.run_form.items.items()
        if not field.isHidden()
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
    assert form.items["risk_price"].isHidden()
    form.measure.committed.emit(Measure.REAL_WORLD)
    station.refresh_now()
    assert "no prices" in form.measure.hint
    assert not form.items["risk_price"].isHidden()


def test_a_square_root_model_takes_no_negative_rate(station: ScenariosStation) -> None:
    form = station.run_form
    assert form.items["starting_rate"].low == -0.2
    form.model.committed.emit(ModelName.CIR)
    station.refresh_now()
    assert form.items["starting_rate"].low == 0.0
    assert (form.items["mean_reversion"].low or 0.0) > 0.0


def test_a_model_that_cannot_be_drawn_says_why(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    model = a_fund().rates_model
    assert model is not None
    bench.document.edit("x", replace(a_fund(), rates_model=replace(model, volatility=None)))
    station.refresh_now()
    qtbot.waitUntil(lambda: station.outlook is not None)
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
    part = paths_part(station)
    assert part.slider.maximum() == 8
    assert part.row == 4
    mean = dict(part.fan.readings_at(8.0))["Mean"]
    assert mean == f"{simulation.savings_account.mean[8]:.3f}"


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
    assert station._shown is not None
    assert station._shown.simulation is former


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


def test_another_book_starts_from_nothing(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    run(station, bench, qtbot)
    bench.open(a_fund())
    station.refresh_now()
    assert station.invitation.isVisible()
    assert not station.pictures.isVisible()
    assert not station.tabs.isVisible()


# Looking ahead


def test_what_a_run_takes_is_said_before_it(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    qtbot.waitUntil(lambda: station.outlook is not None)
    assert "A run draws 400 paths of 16 steps" in station.run_form.memory.text()
    assert "MB of memory" in station.run_form.memory.text()


def test_a_run_that_would_not_fit_is_refused_with_what_would(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    run_of = replace(bench.book.run, paths=20_000_000, sampling=Sampling.SOBOL, horizon_years=100)
    bench.document.edit("x", replace(bench.book, run=run_of))
    station.refresh_now()
    qtbot.waitUntil(lambda: station.outlook is not None)
    assert not station.run_form.run_button.isEnabled()
    assert "GB of memory" in station.run_form.state.text()
    assert "set Paths to at most" in station.run_form.state.text()


# Parts


def test_parts_are_gone_through_by_keys(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    run(station, bench, qtbot)
    station.activateWindow()
    station.run_form.run_button.setFocus()
    qtbot.waitUntil(station.run_form.run_button.hasFocus)
    seen = []
    for _ in range(station.tabs.count()):
        assert station.part is not None
        seen.append(station.part.key)
        QTest.keyClick(station, Qt.Key.Key_Tab, Qt.KeyboardModifier.ControlModifier)
    assert seen == ["paths", "curve", "values", "convergence", "models"]
    assert station.part is not None
    assert station.part.key == "paths"
    for picture in station.part.pictures:
        assert picture.isVisible()
    with pytest.raises(ValueError, match="paths, curve"):
        station.part_of("none")


def test_every_control_has_a_name_and_an_explanation(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    run(station, bench, qtbot)
    for key in ("paths", "curve", "values", "convergence", "models"):
        station.show_part(key)
        settle(station, qtbot)
        part = station.part_of(key)
        for control in part.controls:
            assert control.accessibleName() or getattr(control, "text", str)(), (key, control)
        assert part.purpose
        for picture in part.pictures:
            assert picture.accessibleName()
    form = station.run_form
    for field in (*form.items.values(), form.paths, form.horizon, form.steps, form.seed, form.replicates):
        assert field.hint
        assert field.editor.accessibleName()


def test_it_can_be_closed_while_everything_runs(
    bench: Bench, qtbot: QtBot, theme_switch: ThemeSwitch
) -> None:
    made = ScenariosStation(bench.document, bench.jobs, theme_switch)
    made.show()
    bench.open(a_fund())
    made.refresh_now()
    run(made, bench, qtbot)
    part = paths_part(made)
    part.with_paths.setChecked(True)
    part.path_number.setValue(3)
    made.show_part("curve")
    made.show_part("models")
    models = made.part_of("models")
    assert isinstance(models, ModelsPart)
    models.compare()
    made.run()
    bench.document.stop()
    bench.jobs.cancel_all()
    dispose(made)
    qtbot.waitUntil(lambda: not bench.jobs.running)


def test_views_for_a_batch_bring_every_picture(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> None:
    assert station.views() == ()
    run(station, bench, qtbot)
    titles = set()
    for view in (lambda: None, *station.views()):
        view()
        qtbot.waitUntil(lambda: not bench.jobs.running)
        settle(station, qtbot)
        assert station.part is not None
        titles |= {picture.title for picture in station.part.pictures}
    assert {"Short rate", "Yield curve in year 4", "Surplus"} <= titles
