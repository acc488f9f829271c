"""Single paths are those of the run."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from desk.book import Inflation, ModelName, RatesModel, RiskyAssets, Sampling, ScenarioSet
from desk.scenarios.drawn_paths import block_of, drawn_blocks, drawn_path_range
from desk.scenarios.plans import planned_run
from desk.scenarios.simulation import simulate
from tests.scenarios.books import ALL_MODELS, NO_FLOWS, book

FUNDS = RiskyAssets(
    ("shares", "property"),
    np.array([100.0, 50.0]),
    np.array([0.04, 0.02]),
    np.array([0.18, 0.1]),
    np.zeros(2),
    np.array([[1.0, 0.4], [0.4, 1.0]]),
    np.array([-0.2, 0.1]),
)


@pytest.mark.parametrize("name", ALL_MODELS)
def test_they_are_the_paths_of_the_run(name: ModelName) -> None:
    drawn = book(ALL_MODELS[name], paths=5_100)
    run = simulate(drawn, NO_FLOWS, NO_FLOWS)
    plan = planned_run(drawn).plan
    parts = list(drawn_blocks(plan))
    assert [part.first for part in parts] == [0, 5_000]
    assert [part.count for part in parts] == [5_000, 100]
    shown = len(run.sample_paths)
    assert parts[0].account[:, :shown].T.tobytes() == run.sample_paths.tobytes()
    account = np.concatenate([part.account for part in parts], axis=1)
    rate = np.concatenate([part.short_rate for part in parts], axis=1)
    np.testing.assert_allclose(account.mean(axis=1), run.savings_account.mean, rtol=1e-13)
    np.testing.assert_allclose(rate.mean(axis=1), run.short_rate.mean, rtol=1e-12)
    np.testing.assert_array_equal(parts[0].time, run.savings_account.year)


@pytest.mark.parametrize("sampling", list(Sampling))
def test_a_range_is_found_whatever_block_it_is_in(sampling: Sampling) -> None:
    settings = book(ALL_MODELS[ModelName.HULL_WHITE], paths=12_000, horizon_years=2)
    drawn = replace(settings, run=replace(settings.run, sampling=sampling, replicates=3))
    plan = planned_run(drawn).plan
    whole = np.concatenate([part.account for part in drawn_blocks(plan)], axis=1)
    for first, count in ((0, 3), (4_990, 40), (11_999, 10)):
        parts = drawn_path_range(plan, first=first, count=count)
        found = np.concatenate([part.account for part in parts], axis=1)
        assert parts[0].first == first
        assert found.tobytes() == whole[:, first : first + count].tobytes()
    for index in range(plan.blocks):
        columns = plan.columns(index)
        assert {block_of(plan, path) for path in (columns.start, columns.stop - 1)} == {index}


def test_the_mean_rate_makes_the_account() -> None:
    plan = planned_run(book(ALL_MODELS[ModelName.CIR], paths=20)).plan
    (paths,) = drawn_blocks(plan, steps=(1, 2, 5, 40))
    assert paths.time.tolist() == [0.0, 0.25, 0.5, 1.25, 10.0]
    lengths = np.diff(paths.time)[:, None]
    np.testing.assert_allclose(
        np.cumsum(paths.mean_rate * lengths, axis=0), paths.log_account[1:], rtol=1e-12
    )


def test_assets_and_prices_stand_beside_the_rates() -> None:
    """Discounted assets keep their value on average, prices rise as expected."""
    base = book(ALL_MODELS[ModelName.HULL_WHITE], paths=20_000)
    inflation = Inflation(np.array([1.0, 10.0]), np.array([0.02, 0.025]))
    model = replace(
        ALL_MODELS[ModelName.HULL_WHITE],
        inflation_mean_reversion=0.3,
        inflation_volatility=0.008,
        inflation_rate_correlation=0.2,
    )
    drawn = replace(
        base, basis=replace(base.basis, inflation=inflation), rates_model=model, risky_assets=FUNDS
    )
    plan = planned_run(drawn).plan
    parts = list(drawn_blocks(plan, asset_names=FUNDS.names))
    assert parts[0].asset_names == ("shares", "property")
    account = np.concatenate([part.account for part in parts], axis=1)
    grown = np.concatenate([part.assets for part in parts], axis=2) / account
    error = grown[:, -1].std(axis=1, ddof=1) / np.sqrt(plan.paths)
    assert (np.abs(grown[:, -1].mean(axis=1) - 1.0) < 4.0 * error).all()
    assert (grown[:, 0] == 1.0).all()
    index = np.concatenate([part.price_index for part in parts if part.price_index is not None], axis=1)
    assert (index[0] == 1.0).all()
    # Under the pricing measure E[I(T)/R_T] = P(0, T) I(0)/P_I: compared with the curve of expected prices.
    real = index / account
    expected = float(drawn.basis.curve.discount(10.0)) / float(inflation.curve.discount(10.0))
    assert abs(real[-1].mean() - expected) < 4.0 * real[-1].std(ddof=1) / np.sqrt(plan.paths)
    # Beside the rates alone the same rates are drawn.
    bare = next(drawn_blocks(planned_run(base).plan))
    assert bare.short_rate.tobytes() == parts[0].short_rate.tobytes()
    with pytest.raises(ValueError, match="2 names"):
        next(drawn_blocks(plan, asset_names=("shares",)))


def test_a_set_from_outside_comes_back_as_it_was() -> None:
    rng = np.random.default_rng(5)
    scenarios = ScenarioSet(np.array([0.5, 1.0, 2.5, 3.0]), rng.normal(0.02, 0.01, (7, 4)))
    base = book(RatesModel(ModelName.OUTSIDE), paths=100)
    plan = planned_run(replace(base, scenario_set=scenarios)).plan
    (paths,) = drawn_blocks(plan, steps=(1, 2, 3, 4))
    assert paths.count == 7
    np.testing.assert_allclose(paths.mean_rate.T, scenarios.rate, rtol=1e-12)


def test_no_path_beyond_the_run() -> None:
    plan = planned_run(book(ALL_MODELS[ModelName.HO_LEE], paths=10)).plan
    for path in (-1, 10):
        with pytest.raises(ValueError, match="from 0 to 9"):
            block_of(plan, path)
