"""How a run was sampled, as an object and as text."""

from __future__ import annotations

import json
from dataclasses import replace
from typing import Any

import pytest

from desk.book import Bridge, ModelName, Sampling
from desk.report import as_json
from desk.report.as_sampling import sampling_object, sampling_text
from desk.scenarios.records import Simulation
from desk.scenarios.simulation import simulate
from tests.scenarios.books import ALL_MODELS, assets, book, liabilities


def run(**settings: Any) -> Simulation:
    plain = book(ALL_MODELS[ModelName.HULL_WHITE], paths=16 * 64)
    return simulate(replace(plain, run=replace(plain.run, **settings)), assets(), liabilities())


@pytest.fixture(scope="module")
def by_sobol() -> Simulation:
    return run(sampling=Sampling.SOBOL, bridge=Bridge.BROWNIAN, matching=True)


def test_a_plain_run() -> None:
    simulation = run()
    found = sampling_object(simulation)
    assert (found["method"], found["bridge"], found["moment_matching"]) == ("plain", None, False)
    assert (found["replicates"], found["gains"]) == (1, [])
    text = sampling_text(simulation, currency="EUR")
    assert "Means beyond the percentiles" in text
    assert "Gain" not in text
    assert "replicates" not in text


def test_figures_are_those_of_the_run(by_sobol: Simulation) -> None:
    found = sampling_object(by_sobol)
    assert (found["method"], found["bridge"], found["moment_matching"]) == ("sobol", "brownian bridge", True)
    assert found["replicates"] == 16
    low = found["tails"]["surplus"][1]
    surplus = by_sobol.present_value[2]
    assert (low["level"], low["tail_mean"]) == (5.0, float(surplus.tail_mean[1]))
    assert low["percentile_low"] <= low["percentile"] <= low["percentile_high"]
    last = found["tails"]["savings_account"][-1]
    assert last["tail_mean_se"] == float(by_sobol.savings_account.tail_mean_se[-1, -1])
    assert [one["figure"] for one in found["gains"]] == [gain.figure for gain in by_sobol.gains]
    whole = found["convergence"][3]["parts"][-1]
    assert whole["paths"] == 1024
    assert whole["value"] == pytest.approx(surplus.mean, rel=1e-12)
    json.loads(as_json.text(found))


def test_the_text_tells_gains_and_where_errors_come_from(by_sobol: Simulation) -> None:
    text = sampling_text(by_sobol, currency="EUR")
    assert "Gain over plain sampling" in text
    assert "16 independent replicates" in text
    assert "1,024" in text
    surplus = next(gain for gain in by_sobol.gains if gain.figure == "mean present value of surplus")
    assert f"{surplus.gain:,.1f}" in text
