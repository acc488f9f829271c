"""JSON objects: exactly the keys that scripts rely on, plain finite numbers, nothing rounded."""

from __future__ import annotations

import json
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from desk import tasks
from desk.report import as_json
from tests.report import examples

MEASURES = {
    "present_value", "equivalent_rate", "macaulay_duration", "modified_duration", "effective_duration",
    "convexity", "dispersion", "dv01",
}  # fmt: skip
PERCENTILES = {"p01", "p05", "p25", "p50", "p75", "p95", "p99"}
BY_LEVEL = {"percentile_se", "percentile_low", "percentile_high", "tail_mean", "tail_mean_se"}
SAMPLED = {"mean_se", "sd_se"}
FAULT = {"sheet", "cell", "found", "expected", "mend", "severity"}


def test_standing_has_the_keys_of_the_contract() -> None:
    """Key by key, as the commands promise."""
    found = as_json.standing_object(examples.standing(), examples.reading().faults)
    assert set(found) == {
        "valuation_date", "currency", "assets", "liabilities", "surplus", "funding_ratio", "duration_gap",
        "dv01_gap", "redington", "key_rates", "lines", "periods", "faults", "curve", "liability_basis",
        "inflation", "second_basis",
    }  # fmt: skip
    assert set(found["assets"]) == set(found["liabilities"]) == MEASURES
    assert found["redington"] == {
        condition.name: condition.holds for condition in examples.standing().redington
    }
    assert all(type(holds) is bool for holds in found["redington"].values())
    keys = {"term", "assets", "liabilities", "dv01_assets", "dv01_liabilities"}
    assert all(set(row) == keys for row in found["key_rates"])
    assert len(found["key_rates"]) == 14
    line_keys = {
        "side", "line", "present_value", "effective_duration", "spread", "spread_duration",
        "expected_credit_loss", "inflation_dv01", "indexation", "discounting",
    }  # fmt: skip
    assert all(set(row) == line_keys for row in found["lines"])
    assert [row["side"] for row in found["lines"]] == ["assets"] * 6 + ["liabilities"] * 4
    period_keys = {"year", "assets", "liabilities", "net", "cumulative"}
    assert all(set(row) == period_keys for row in found["periods"])
    assert [row["year"] for row in found["periods"]] == list(range(1, 63))
    assert set(found["faults"][0]) == FAULT
    assert found["faults"][0]["cell"] == "C14"
    assert found["faults"][0]["severity"] == "mild"


def test_standing_figures_are_not_rounded() -> None:
    """Text and back gives the same bits."""
    standing = examples.standing()
    found = json.loads(as_json.text(as_json.standing_object(standing)))
    assert found["surplus"] == standing.surplus
    assert found["liabilities"]["convexity"] == standing.liabilities.convexity
    assert found["key_rates"][7]["dv01_liabilities"] == standing.key_rates.dv01_liabilities[7]
    assert found["periods"][3]["cumulative"] == standing.periods.cumulative[3]
    assert found["valuation_date"] == "2026-03-31"


def test_a_spread_that_differs_within_a_line_is_null() -> None:
    """Lines with betas have no one spread; a solved spread is shown."""
    lines = {row["line"]: row for row in as_json.standing_object(examples.standing())["lines"]}
    assert lines["Pensions"]["spread"] is None
    assert lines["Bond"]["spread"] == pytest.approx(0.008, abs=0.01)


def test_spread_durations_and_credit_losses() -> None:
    """Null where none is: a fund has no spread, and a holding that cannot default loses nothing."""
    first, *others = examples.book().holdings
    book = replace(examples.book(), holdings=(replace(first, default_rate=0.01), *others))
    standing = tasks.value(book)
    lines = {row["line"]: row for row in as_json.standing_object(standing)["lines"]}
    assert lines["Bond"]["spread_duration"] == standing.lines[0].spread_duration
    assert lines["Bond"]["expected_credit_loss"] == standing.lines[0].expected_credit_loss
    assert lines["Bond"]["expected_credit_loss"] > 0.0
    assert lines["@Zero"]["expected_credit_loss"] is None
    assert lines["Fund"]["spread_duration"] is None


def test_what_is_not_finite_is_null() -> None:
    """NaN and infinity never reach the text."""
    odd = replace(examples.standing(), funding_ratio=np.nan, duration_gap=-np.inf)
    found = json.loads(as_json.text(as_json.standing_object(odd)))
    assert found["funding_ratio"] is None
    assert found["duration_gap"] is None
    with pytest.raises(ValueError, match="not JSON compliant"):
        as_json.text({"value": np.nan})


def test_simulation_has_the_keys_of_the_contract() -> None:
    """Key by key, as the commands promise."""
    run = examples.simulation()
    found = as_json.simulation_object(run, examples.reading().faults)
    assert set(found) == {
        "paths", "steps_per_year", "seed", "measure", "model", "savings_account", "short_rate",
        "present_value", "risky_assets", "price_index", "diagnostics", "sampling", "convergence", "gains",
        "faults",
    }  # fmt: skip
    account = {"year", "mean", "sd", "mean_discount", "mean_discount_se", "curve_discount"} | PERCENTILES
    further = {"expected_discount", "closed_form"}
    assert all(set(row) == account | BY_LEVEL | SAMPLED | further for row in found["savings_account"])
    plain = {"year", "mean", "sd"} | PERCENTILES
    assert all(set(row) == plain | BY_LEVEL | SAMPLED for row in found["short_rate"])
    assert set(found["present_value"]) == {"assets", "liabilities", "surplus"}
    assert all(
        set(side) == {"mean", "se", "sd", "curve", "below_zero", "below_zero_se"} | PERCENTILES | BY_LEVEL
        for side in found["present_value"].values()
    )
    assert (found["paths"], found["steps_per_year"], found["seed"]) == (400, 2, 7)
    assert (found["measure"], found["model"]) == ("pricing", "hull-white")
    assert found["savings_account"][12]["p95"] == run.savings_account.percentile[12, 5]
    assert found["present_value"]["surplus"]["curve"] == run.present_value[2].curve
    json.loads(as_json.text(found))


def test_every_number_is_plain() -> None:
    """No numpy type is left in any of the objects."""

    def walk(value: Any) -> None:
        if isinstance(value, dict):
            for entry in value.values():
                walk(entry)
        elif isinstance(value, list):
            for entry in value:
                walk(entry)
        else:
            assert type(value) in (str, bool, int, float, type(None))

    walk(as_json.standing_object(examples.standing()))
    walk(as_json.simulation_object(examples.simulation()))
    walk(as_json.check_object(examples.reading()))


def test_check_names_the_source_and_all_faults() -> None:
    """With and without a book."""
    found = as_json.check_object(examples.reading())
    assert found["book"]["sha256"] == "ab" * 32
    assert found["book"]["digest"] == examples.book().digest
    assert found["usable"] is True
    unusable = as_json.check_object(replace(examples.reading(), book=None))
    assert (unusable["usable"], unusable["book"]["digest"]) == (False, None)
    assert len(unusable["faults"]) == 1


@pytest.mark.parametrize(
    ("level", "name"), [(1.0, "p01"), (50.0, "p50"), (97.5, "p97.5"), (0.5, "p00.5"), (5, "p05")]
)
def test_percentile_names(level: float, name: str) -> None:
    """Two digits before the point."""
    assert as_json.percentile_name(level) == name
