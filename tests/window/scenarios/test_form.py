"""The form: models with what they are for, inflation, assets, sampling; the export."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from PySide6.QtWidgets import QFileDialog
from pytestqt.qtbot import QtBot

from desk.book import Bridge, Inflation, Measure, ModelName, RiskyAssets, Sampling, ScenarioSet
from desk.window.scenarios.export import _named
from desk.window.scenarios.model_words import MODELS
from desk.window.scenarios.station import ScenariosStation
from tests.window.benches import Bench, a_fund
from tests.window.scenarios.running import run
from tests.window.scenarios.test_paths_part import with_assets

FITTED = (ModelName.VASICEK, ModelName.CIR)


def test_every_model_says_what_it_is_for() -> None:
    assert [choice.value for choice in MODELS] == list(ModelName)
    for choice in MODELS:
        text = choice.explanation
        assert text.startswith("For ")
        if choice.value is ModelName.OUTSIDE:
            assert "need not reprice" in text
            continue
        assert "zero" in text
        own = "makes a curve of its own" in text
        assert own == (choice.value in FITTED)
        assert own != ("reprices the book's curve exactly" in text)


def test_the_volatility_stands_in_the_field_of_its_meaning(station: ScenariosStation, bench: Bench) -> None:
    form = station.run_form
    fields = ("volatility", "root_volatility", "relative_volatility")
    for name, key in (
        (ModelName.HULL_WHITE, "volatility"),
        (ModelName.CIR_SHIFTED, "root_volatility"),
        (ModelName.BLACK_KARASINSKI, "relative_volatility"),
    ):
        form.model.committed.emit(name)
        station.refresh_now()
        assert [one for one in fields if not form.items[one].isHidden()] == [key]
        form.items[key].committed.emit(0.123)
        assert bench.book.rates_model is not None
        assert bench.book.rates_model.volatility == 0.123


def test_inflation_is_drawn_once_its_volatility_is_stated(station: ScenariosStation, bench: Bench) -> None:
    form = station.run_form
    assert form.items["inflation_volatility"].isHidden()
    inflation = Inflation(np.array([1.0]), np.array([0.02]))
    bench.edit_basis(inflation=inflation)
    station.refresh_now()
    assert not form.items["inflation_volatility"].isHidden()
    assert form.items["inflation_mean_reversion"].isHidden()
    form.items["inflation_volatility"].committed.emit(0.01)
    station.refresh_now()
    model = bench.book.rates_model
    assert model is not None
    assert model.inflation_volatility == 0.01
    assert model.inflation_mean_reversion is not None
    assert not form.items["inflation_mean_reversion"].isHidden()
    assert form.items["inflation_risk_price"].isHidden()
    form.measure.committed.emit(Measure.REAL_WORLD)
    station.refresh_now()
    assert not form.items["inflation_risk_price"].isHidden()
    form.items["inflation_volatility"].committed.emit(None)
    station.refresh_now()
    assert bench.book.rates_model is not None
    assert bench.book.rates_model.inflation_volatility is None
    assert form.items["inflation_mean_reversion"].isHidden()


def test_prices_of_risk_are_asked_for_by_factor(station: ScenariosStation, bench: Bench) -> None:
    form = station.run_form
    form.model.committed.emit(ModelName.GAUSSIAN_2)
    form.measure.committed.emit(Measure.REAL_WORLD)
    station.refresh_now()
    assert not form.items["second_risk_price"].isHidden()
    form.items["second_risk_price"].committed.emit(0.2)
    assert bench.book.rates_model is not None
    assert bench.book.rates_model.second_risk_price == 0.2


def test_assets_have_volatilities_and_in_the_real_world_premiums(
    station: ScenariosStation, bench: Bench
) -> None:
    form = station.run_form
    assert form.assets.heading.isHidden()
    bench.open(with_assets(a_fund()))
    station.refresh_now()
    assert not form.assets.heading.isHidden()
    assert not form.assets.fields["volatility", 1].isHidden()
    assert form.assets.fields["premium", 1].isHidden()
    form.measure.committed.emit(Measure.REAL_WORLD)
    station.refresh_now()
    assert not form.assets.fields["premium", 1].isHidden()
    form.assets.fields["premium", 1].committed.emit(0.05)
    form.assets.fields["volatility", 0].committed.emit(0.3)
    form.assets.mend.committed.emit(True)
    station.refresh_now()
    assets, model = bench.book.risky_assets, bench.book.rates_model
    assert assets is not None
    assert model is not None
    assert assets.premium.tolist() == [0.04, 0.05]
    assert assets.volatility.tolist() == [0.3, 0.1]
    assert model.mend_correlation
    assert bench.document.undo_text == "Mending of correlations"
    value = np.array([0.1])
    one = RiskyAssets(("gold",), value, value, value, np.zeros(1), np.eye(1), np.zeros(1))
    bench.document.edit("x", replace(bench.book, risky_assets=one))
    station.refresh_now()
    assert set(form.assets.fields) == {("volatility", 0), ("premium", 0)}


def test_the_keyboard_comes_to_the_assets_where_they_stand(station: ScenariosStation, bench: Bench) -> None:
    """They are made later than what stands below them."""
    bench.open(with_assets(a_fund()))
    station.refresh_now()
    fields = station.run_form.assets.fields
    wanted = [fields["volatility", 0].editor, fields["volatility", 1].editor, station.run_form.paths.editor]
    met, widget = [], station.run_form.run_button.nextInFocusChain()
    while widget is not None and widget is not station.run_form.run_button:
        if widget in wanted:
            met.append(widget)
        widget = widget.nextInFocusChain()
    assert met == wanted


def test_correlations_that_contradict_one_another_are_refused_or_mended(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    book = with_assets(a_fund())
    assert book.risky_assets is not None
    impossible = replace(
        book.risky_assets,
        correlation=np.array([[1.0, -0.9], [-0.9, 1.0]]),
        rates_correlation=np.array([0.9, 0.9]),
    )
    bench.open(replace(book, risky_assets=impossible))
    station.refresh_now()
    qtbot.waitUntil(lambda: station.outlook is not None)
    assert "Mend correlation" in station.run_form.state.text()
    assert not station.run_form.run_button.isEnabled()
    station.run_form.assets.mend.committed.emit(True)
    station.refresh_now()
    qtbot.waitUntil(lambda: station.outlook is not None)
    assert station.run_form.run_button.isEnabled()
    simulation = run(station, bench, qtbot)
    assert simulation.risky is not None
    assert simulation.risky.mended is not None


def test_sampling_shows_what_belongs_to_it(station: ScenariosStation, bench: Bench) -> None:
    form = station.run_form
    assert form.bridge.isHidden()
    assert form.replicates.isHidden()
    form.sampling.committed.emit(Sampling.SOBOL)
    form.bridge.committed.emit(Bridge.BROWNIAN)
    form.replicates.committed.emit(8)
    station.refresh_now()
    assert not form.bridge.isHidden()
    assert not form.replicates.isHidden()
    settings = bench.book.run
    assert (settings.sampling, settings.bridge, settings.replicates) == (Sampling.SOBOL, Bridge.BROWNIAN, 8)
    form.sampling.committed.emit(Sampling.PLAIN)
    form.matching.committed.emit(True)
    station.refresh_now()
    assert bench.book.run.matching
    assert form.bridge.isHidden()
    assert not form.replicates.isHidden()


def test_a_set_from_outside_says_its_size_and_asks_for_nothing_it_has_not(
    station: ScenariosStation, bench: Bench, qtbot: QtBot
) -> None:
    form = station.run_form
    form.model.committed.emit(ModelName.OUTSIDE)
    station.refresh_now()
    assert "no sheet Scenario set" in form.of_set.text()
    qtbot.waitUntil(lambda: station.outlook is not None)
    assert "Scenario set is missing" in form.state.text()
    scenarios = ScenarioSet(np.array([1.0, 2.0, 30.0]), np.array([[0.01, 0.02, 0.03], [0.0, -0.01, 0.04]]))
    bench.document.edit("x", replace(bench.book, scenario_set=scenarios))
    station.refresh_now()
    assert "2 paths at 3 nodes from 1 to 30 years" in form.of_set.text()
    assert "\u22121.00" in form.of_set.text()
    for field in (form.steps, form.seed, form.sampling, form.measure, form.matching):
        assert field.isHidden()
    assert not form.paths.isHidden()


# Export


def test_the_paths_are_exported_in_the_background(
    station: ScenariosStation,
    bench: Bench,
    qtbot: QtBot,
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    assert station.run_form.export_button.isHidden()
    run(station, bench, qtbot)
    assert not station.run_form.export_button.isHidden()
    target = tmp_path / "paths.csv.gz"
    monkeypatch.setattr(
        QFileDialog, "getSaveFileName", lambda *_: (str(target), "Compressed CSV, every step (*.csv.gz)")
    )
    with qtbot.waitSignal(station.message, timeout=20_000) as told:
        station.run_form.export_button.click()
        station.refresh_now()
        assert station.run_form.export_button.text() == "Stop the export"
    assert told.args == ["The paths are in paths.csv.gz."]
    assert target.exists()
    station.refresh_now()
    assert station.run_form.export_button.text() == "Export the paths…"


def test_an_export_that_is_stopped_or_cannot_be_written_says_so(
    station: ScenariosStation, bench: Bench, qtbot: QtBot, tmp_path: Path
) -> None:
    bench.open(replace(a_fund(), run=replace(a_fund().run, paths=20_000)))
    station.refresh_now()
    run(station, bench, qtbot)
    with qtbot.waitSignal(station.message, timeout=20_000) as told:
        station.export.write(bench.book, tmp_path / "paths.xlsx")
        station.ask_export()
    assert told.args == ["The export was stopped; nothing was written."]
    assert list(tmp_path.iterdir()) == []
    with qtbot.waitSignal(station.message, timeout=20_000) as told:
        station.export.write(bench.book, tmp_path / "none" / "paths.xlsx")
    assert told.args is not None
    assert str(told.args[0]).startswith("The paths were not written")
    assert not station.export.is_running


@pytest.mark.parametrize(
    ("name", "kind", "wanted"),
    [
        ("a", "Workbook, by year (*.xlsx)", "a.xlsx"),
        ("a.b", "Workbook, every step (*.xlsx)", "a.b.xlsx"),
        ("a.csv", "Compressed CSV, by year (*.csv.gz)", "a.csv.gz"),
        ("a.gz", "Compressed CSV, every step (*.csv.gz)", "a.csv.gz"),
        ("a.CSV.GZ", "Workbook, by year (*.xlsx)", "a.CSV.GZ"),
        ("a.XLSX", "Compressed CSV, by year (*.csv.gz)", "a.XLSX"),
    ],
)
def test_a_file_gets_the_ending_of_its_kind(name: str, kind: str, wanted: str) -> None:
    assert _named(Path(name), kind).name == wanted
