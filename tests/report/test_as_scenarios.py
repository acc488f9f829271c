"""What a run drew beside the rates, and its diagnostics, as an object and as text."""

from __future__ import annotations

import json
from typing import Any

import numpy as np
import pytest

from desk.report import as_json, as_text
from desk.report.as_json import simulation_object
from tests.report.run_books import ODD, WHOLE, simulation_of

KEYS = {
    "paths", "steps_per_year", "seed", "measure", "model", "savings_account", "short_rate", "present_value",
    "risky_assets", "price_index", "diagnostics", "sampling", "convergence", "gains", "faults",
}  # fmt: skip
ERRORS = {
    "mean_se", "sd_se", "percentile_se", "percentile_low", "percentile_high", "tail_mean", "tail_mean_se",
}  # fmt: skip
PERCENTILES = {"p01", "p05", "p25", "p50", "p75", "p95", "p99"}


def told(name: str) -> dict[str, Any]:
    """A run as scripts read it."""
    found: dict[str, Any] = json.loads(as_json.text(simulation_object(simulation_of(name))))
    return found


@pytest.mark.parametrize("name", [*WHOLE, *ODD])
def test_the_keys_are_the_same_for_every_run(name: str) -> None:
    """What a run does not have is null."""
    found, run = told(name), simulation_of(name)
    assert set(found) == KEYS
    assert (found["risky_assets"] is None) == (run.risky is None)
    assert (found["price_index"] is None) == (run.index is None)
    assert (found["gains"] is None) == (run.replicates == 1)
    row = found["savings_account"][-1]
    assert ERRORS | {"year", "mean", "sd", "mean_discount", "curve_discount", "closed_form"} <= set(row)
    assert (row["closed_form"] is None) == (run.closed_form is None)


def test_figures_are_those_of_the_run() -> None:
    """Nothing is rounded."""
    found, run = told("real-world"), simulation_of("real-world")
    account, row = run.savings_account, found["savings_account"][6]
    assert set(row["tail_mean"]) == set(row["percentile_low"]) == PERCENTILES
    assert row["p95"] == account.percentile[6, 5]
    assert row["percentile_se"]["p95"] == account.percentile_se[6, 5]
    assert row["percentile_high"]["p95"] == account.percentile_high[6, 5]
    assert row["tail_mean"]["p05"] == account.tail_mean[6, 1]
    assert row["tail_mean_se"]["p05"] == account.tail_mean_se[6, 1]
    assert run.closed_form is not None
    assert row["closed_form"]["tail_mean"]["p99"] == run.closed_form.tail_mean[6, 6]
    side = found["present_value"]["surplus"]
    assert side["tail_mean"]["p01"] == run.present_value[2].tail_mean[0]
    assert side["percentile_se"]["p50"] == run.present_value[2].percentile_se[3]
    assert side["below_zero"] == run.present_value[2].below_zero
    assert run.risky is not None
    asset = found["risky_assets"]["assets"][1]
    assert (asset["name"], asset["value"]) == ("Property", 300.0)
    last = asset["total_return"][-1]
    assert last["mean_excess"] == run.risky.assets[1].mean_excess[-1]
    assert last["expected_excess"] == pytest.approx(np.exp(0.03 * 8), rel=1e-14)
    assert last["closed_form"]["mean"] == pytest.approx(last["mean"], abs=6.0 * last["mean_se"])
    assert found["risky_assets"]["covariance"] == run.risky.covariance.tolist()
    assert found["risky_assets"]["total"][0]["mean"] == 800.0
    assert run.index is not None
    index = found["price_index"]["index"][-1]
    assert index["p50"] == run.index.index.percentile[-1, 3]
    assert index["expected_index"] == run.index.expected_index[-1]
    assert found["price_index"]["matches_today"] is True
    law = found["diagnostics"]["short_rate_law"][-1]
    assert run.diagnostics is not None
    assert law["sd"] == run.diagnostics.rate_sd[-1]
    assert law["autoregression"] == run.diagnostics.autoregression[-1]
    fit_error = found["diagnostics"]["fit_error"]
    assert fit_error == float(dict(run.provenance.settings)["surface_error"])
    assert 0.0 <= fit_error < 1e-10


def test_checks_tell_what_is_far_off() -> None:
    found, run = told("outside"), simulation_of("outside")
    check = found["diagnostics"]["checks"][0]
    distance = np.abs(run.repricing.mean_discount - run.repricing.expected_discount)[1:]
    distance /= run.repricing.mean_discount_se[1:]
    assert (check["mean"], check["years"]) == ("Mean of 1/R", 8)
    assert check["beyond_3_se"] == int((distance > 3.0).sum()) > 0
    assert check["furthest_se"] == pytest.approx(distance.max(), rel=1e-12)
    assert check["furthest_year"] == 1 + int(distance.argmax())
    assert [row["mean"] for row in found["diagnostics"]["short_rate_law"]][1:] == [None] * 8


def test_what_is_certain_is_no_check() -> None:
    """Rates without noise lie off by rounding alone, which is not told in standard errors."""
    (check,) = told("certain")["diagnostics"]["checks"]
    assert (check["years"], check["beyond_3_se"], check["furthest_se"]) == (0, 0, None)


def test_mended_correlations_are_told() -> None:
    mended = told("mended")["risky_assets"]["mended"]
    assert mended["least_eigenvalue"] < 0.0 < mended["largest_change"]
    assert np.linalg.eigvalsh(mended["correlation"]).min() > -1e-9
    assert told("pricing")["risky_assets"]["mended"] is None


def test_the_text_has_what_was_drawn_beside() -> None:
    run = simulation_of("real-world")
    text = as_text.simulation_text(run, currency="EUR")
    assert "For forecasts" in text
    assert run.risky is not None
    assert as_text.grouped(run.risky.assets[0].total_return.mean[-1], 4) in text
    assert "no part of assets, liabilities and surplus" in text
    assert run.index is not None
    assert as_text.grouped(run.index.index.percentile[-1, 0], 4) in text
    assert "Mean of Property over R" in text
    assert "Slope on a step before" in text
    assert max(len(line) for line in text.split("\n")) <= 110


def test_the_text_of_a_set_from_outside() -> None:
    text = as_text.simulation_text(simulation_of("outside"), currency="EUR")
    assert "own set of scenarios" in text
    assert "need not reprice" in text
    assert "Slope on a step before" not in text


@pytest.mark.parametrize("name", ODD)
def test_odd_runs_have_a_text(name: str) -> None:
    text = as_text.simulation_text(simulation_of(name), currency="EUR")
    assert "Means over the paths that are known beforehand" in text
    assert "nan" not in text
    assert "inf " not in text


@pytest.mark.parametrize("name", WHOLE)
def test_the_error_of_fitted_values_is_told_where_there_is_one(name: str) -> None:
    text = as_text.simulation_text(simulation_of(name), currency="EUR")
    error = told(name)["diagnostics"]["fit_error"]
    assert (f"fitted at the nodes, to {error:.0e} of the value" in text) == (error > 0.0)
