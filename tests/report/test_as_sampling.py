"""How a run was sampled, as an object and as text."""

from __future__ import annotations

import json
from dataclasses import replace
from typing import Any

import pytest

from desk.book import Bridge, ModelName, Sampling
from desk.report import as_json
from desk.report.as_sampling import convergence_objects, gain_objects, sampling_object, sampling_text
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
    assert found["replicates"] == 1
    assert gain_objects(simulation) is None
    text = sampling_text(simulation, currency="EUR")
    assert "Means beyond the percentiles" in text
    assert "Gain" not in text
    assert "replicates" not in text


def test_figures_are_those_of_the_run(by_sobol: Simulation) -> None:
    found = sampling_object(by_sobol)
    assert (found["method"], found["bridge"], found["moment_matching"]) == ("sobol", "brownian bridge", True)
    assert found["replicates"] == 16
    gains, settled = gain_objects(by_sobol), convergence_objects(by_sobol)
    assert gains is not None
    assert settled is not None
    assert [one["figure"] for one in gains] == [gain.figure for gain in by_sobol.gains]
    assert gains[0]["gain"] == by_sobol.gains[0].gain
    surplus = by_sobol.present_value[2]
    whole = settled[3]["parts"][-1]
    assert whole["paths"] == 1024
    assert whole["value"] == pytest.approx(surplus.mean, rel=1e-12)
    json.loads(as_json.text({"gains": gains, "convergence": settled, **found}))


def test_the_text_tells_gains_and_where_errors_come_from(by_sobol: Simulation) -> None:
    text = sampling_text(by_sobol, currency="EUR")
    assert "Gain over plain sampling" in text
    assert "16 independent replicates" in text
    assert "1,024" in text
    surplus = next(gain for gain in by_sobol.gains if gain.figure == "mean present value of surplus")
    assert f"{surplus.gain:,.1f}" in text
