"""Fitted models as objects and as text."""

from __future__ import annotations

import json
from dataclasses import replace

import numpy as np
import pytest

from desk.book import Book, ModelName
from desk.book.market import CalibrationSource
from desk.book.model import History
from desk.report import as_json
from desk.report.as_calibration import calibration_object, calibration_text
from desk.report.calibration_wording import figure_wording
from desk.report.wording import CAUTION
from desk.scenarios.calibration import CALIBRATED_MODELS, calibrate
from tests.scenarios.fitted_books import bare_book, with_all

HISTORY, VOLATILITIES, YIELDS = CalibrationSource


@pytest.fixture(scope="module")
def full() -> Book:
    return with_all()


@pytest.mark.parametrize("source", list(CalibrationSource))
def test_objects_are_plain_and_whole(full: Book, source: CalibrationSource) -> None:
    found = calibrate(full, source=source)
    plain = json.loads(as_json.text(calibration_object(found)))
    assert plain["source"] == source.value
    assert plain["model"] == found.name.value
    assert plain["verdict"] == found.verdict
    assert plain["is_poor"] is found.is_poor
    by_name = {figure["name"]: figure for figure in plain["figures"]}
    for figure in found.figures:
        assert by_name[figure.name]["value"] == pytest.approx(figure.value)
    assert found.model is not None
    assert plain["rates_model"]["name"] == found.name.value
    assert plain["rates_model"]["volatility"] == found.model.volatility
    assert plain["obstacle"] == ""
    assert plain["remarks"] == list(found.remarks)


def test_each_source_brings_its_own(full: Book) -> None:
    history = calibration_object(calibrate(full, source=HISTORY))
    assert len(history["steps"]) == history["observations"] == 399
    assert history["profile"]["cut"] == pytest.approx(history["log_likelihood"] - 1.920729, abs=1e-6)
    assert 0.0 <= history["tests"]["ljung_box_p"] <= 1.0
    quotes = calibration_object(calibrate(full, source=VOLATILITIES))
    assert len(quotes["instruments"]) == quotes["observations"] == 10
    first = quotes["instruments"][0]
    assert first["residual_bp"] == pytest.approx(1e4 * (first["model"] - first["quoted"]))
    assert "tests" not in quotes
    yields = calibration_object(calibrate(full, source=YIELDS))
    assert [row["term"] for row in yields["terms"]] == [1.0, 5.0, 10.0]


def test_what_there_is_not_is_none() -> None:
    day = np.datetime64("2021-01-04") + 7 * np.arange(60)
    rising = History(day, 0.01 + 0.001 * np.arange(60) + 1e-5 * np.cos(np.arange(60.0)))
    found = calibrate(replace(bare_book(), history=rising), source=HISTORY)
    plain = json.loads(as_json.text(calibration_object(found)))
    assert plain["rates_model"] is None
    assert plain["obstacle"] == found.obstacle != ""
    by_name = {figure["name"]: figure for figure in plain["figures"]}
    assert by_name["long_run_rate"]["value"] is None
    text = calibration_text(found)
    assert found.obstacle.split()[0] in text
    assert "n/a" in text


@pytest.mark.parametrize("source", list(CalibrationSource))
def test_text_says_the_verdict_first_and_the_caution_last(full: Book, source: CalibrationSource) -> None:
    found = calibrate(full, source=source)
    text = calibration_text(found, title="A fund")
    paragraphs = text.split("\n\n")
    assert paragraphs[0].startswith("A fund: ")
    assert " ".join(paragraphs[1].split()) == found.verdict
    assert " ".join(paragraphs[-1].split()) == CAUTION
    assert max(len(line) for line in text.splitlines()) <= 110
    for figure in found.figures:
        assert figure_wording(figure, found.name).title in text


def test_the_volatility_of_a_square_root_model_has_a_unit_of_its_own(full: Book) -> None:
    gaussian = calibrate(full, source=HISTORY)
    assert figure_wording(gaussian.figure("volatility"), ModelName.VASICEK).is_rate
    for model in (ModelName.CIR, ModelName.CIR_SHIFTED):
        wording = figure_wording(gaussian.figure("volatility"), model)
        assert wording.unit == "on √rate"
        assert not wording.is_rate


def test_every_figure_of_every_model_has_words(full: Book) -> None:
    for source, models in CALIBRATED_MODELS.items():
        for model in models:
            if model is ModelName.CIR_SHIFTED or (source is HISTORY and model is ModelName.CIR):
                continue
            found = calibrate(full, source=source, model=model)
            for figure in found.figures:
                wording = figure_wording(figure, model)
                assert wording.title
                assert wording.meaning.endswith(".")
