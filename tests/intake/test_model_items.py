"""Items of the rates model beside its parameters: inflation, prices of risk, mending, further models."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from desk.book import ModelName, RatesModel, Severity
from desk.intake.records import Reading
from desk.intake.workbook import read_workbook
from tests.intake.books import save, sound_sheets


def read(tmp_path: Path, *items: tuple[str, Any], model: str = "hull-white", assets: Any = None) -> Reading:
    """A sound book whose model has some items more."""
    sheets = sound_sheets()
    rows: list[list[Any]] = [["Item", "Value"], ["Model", model]]
    if model != "outside":
        rows += [["Mean reversion", 0.05], ["Volatility", 0.2 if model == "black-karasinski" else 0.009]]
    sheets["Rates model"] = [*rows, *map(list, items)]
    if assets is not None:
        sheets["Risky assets"] = assets
    return read_workbook(save(sheets, tmp_path / "book.xlsx"))


def model_of(reading: Reading) -> RatesModel:
    assert reading.book is not None
    assert reading.book.rates_model is not None
    return reading.book.rates_model


def told(reading: Reading, severity: Severity) -> list[str]:
    return [fault.found for fault in reading.faults if fault.severity is severity]


def test_all_items_are_read(tmp_path: Path) -> None:
    reading = read(
        tmp_path,
        ("Inflation mean reversion", 0.3),
        ("Inflation factor volatility", 0.011),
        ("Inflation rate correlation", 0.4),
        ("Inflation risk price", -0.2),
        ("Mend correlation", "Yes"),
    )
    assert reading.faults == ()
    model = model_of(reading)
    assert (model.inflation_mean_reversion, model.inflation_volatility) == (0.3, 0.011)
    assert (model.inflation_rate_correlation, model.inflation_risk_price) == (0.4, -0.2)
    assert model.mend_correlation


def test_without_them_nothing_is_changed(tmp_path: Path) -> None:
    model = model_of(read(tmp_path))
    assert model == RatesModel(ModelName.HULL_WHITE, mean_reversion=0.05, volatility=0.009)


@pytest.mark.parametrize("name", ["black-karasinski", "outside"])
def test_further_models(tmp_path: Path, name: str) -> None:
    reading = read(tmp_path, model=name)
    assert reading.faults == ()
    assert model_of(reading).name == name


def test_a_factor_needs_its_mean_reversion(tmp_path: Path) -> None:
    reading = read(tmp_path, ("Inflation factor volatility", 0.01))
    assert told(reading, Severity.GRAVE) == ['the item "Inflation mean reversion" is missing']


def test_what_is_stated_for_nothing_is_said(tmp_path: Path) -> None:
    reading = read(tmp_path, ("Inflation mean reversion", 0.3), ("Second risk price", 0.1))
    assert told(reading, Severity.GRAVE) == []
    assert told(reading, Severity.MILD) == [
        "no Inflation factor volatility is stated: inflation is not drawn",
        "the model hull-white has no second factor",
    ]


@pytest.mark.parametrize(
    ("item", "value"),
    [
        ("Inflation rate correlation", 1.2),
        ("Inflation factor volatility", -0.01),
        ("Inflation factor volatility", 12),
        ("Inflation mean reversion", 1000),
        ("Inflation risk price", 4000),
        ("Second risk price", "high"),
        ("Mend correlation", "perhaps"),
    ],
)
def test_wrong_items(tmp_path: Path, item: str, value: object) -> None:
    beside = () if item == "Inflation mean reversion" else (("Inflation mean reversion", 0.3),)
    faults = read(tmp_path, *beside, (item, value)).faults
    wrong = [fault for fault in faults if fault.severity is Severity.GRAVE]
    assert len(wrong) == 1
    assert wrong[0].sheet == "Rates model"


def test_contradicting_correlations_are_mild_where_they_are_mended(tmp_path: Path) -> None:
    assets = [
        ["Name", "Value", "Premium", "Volatility", "Equity", "Property", "Rates"],
        ["Equity", 500, 0.04, 0.16, 1, 0.9, 0.9],
        ["Property", 300, 0.03, 0.12, 0.9, 1, -0.9],
    ]
    refused = read(tmp_path, assets=assets)
    (fault,) = [fault for fault in refused.faults if fault.severity is Severity.GRAVE]
    assert "contradict each other" in fault.found
    assert "Mend correlation" in fault.mend
    mended = read(tmp_path, ("Mend correlation", "yes"), assets=assets)
    assert told(mended, Severity.GRAVE) == []
    assert mended.book is not None
    assert mended.book.risky_assets is not None
