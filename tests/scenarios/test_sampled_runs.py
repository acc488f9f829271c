"""Whole variance-reduced runs."""

from __future__ import annotations

import math
from dataclasses import replace
from functools import partial
from typing import Any

import numpy as np
import pytest

from desk.book import Book, Bridge, ModelName, Run, Sampling
from desk.rates.gaussian import vasicek
from desk.scenarios.convergence import Headline, Statistic, converging
from desk.scenarios.draws import Block, Crew, Plan
from desk.scenarios.records import Simulation
from desk.scenarios.sampling import replicates_of
from desk.scenarios.simulation import simulate
from tests.scenarios.books import ALL_MODELS, assets, book, liabilities
from tests.scenarios.inflating import ASSETS, inflating
from tests.scenarios.test_simulation import same

WAYS: list[dict[str, Any]] = [
    {"sampling": Sampling.ANTITHETIC},
    {"sampling": Sampling.SOBOL},
    {"sampling": Sampling.SOBOL, "bridge": Bridge.BROWNIAN},
    {"matching": True},
    {"sampling": Sampling.SOBOL, "matching": True},
]


def sampled(name: ModelName, way: dict[str, Any], *, paths: int = 16 * 128, **others: Any) -> Book:
    plain = book(ALL_MODELS[name], paths=paths)
    return replace(plain, run=replace(plain.run, **way, **others))


def run(name: ModelName, way: dict[str, Any], *, threads: int = 2, **others: Any) -> Simulation:
    return simulate(sampled(name, way, **others), assets(), liabilities(), threads=threads)


@pytest.mark.parametrize("way", WAYS)
@pytest.mark.parametrize("name", ALL_MODELS)
def test_figures_agree_with_what_is_known(name: ModelName, way: dict[str, Any]) -> None:
    """Within 6 standard errors, which are those of 16 replicates: Student's law has wide tails."""
    result = run(name, way)
    assert result.replicates == 16
    check = result.repricing
    score = (check.mean_discount - check.expected_discount)[1:] / check.mean_discount_se[1:]
    assert np.abs(score).max() < 6.0
    for side in result.present_value:
        assert abs(side.mean - side.curve) / side.se < 6.0
    law, account = result.closed_form, result.savings_account
    if law is not None:
        for found, error, known in (
            (account.mean, account.mean_se, law.mean),
            (account.sd, account.sd_se, law.sd),
        ):
            assert np.abs((found - known)[1:] / error[1:]).max() < 6.0
        assert np.abs((account.percentile - law.percentile)[1:] / account.percentile_se[1:]).max() < 6.0
        assert np.abs((account.tail_mean - law.tail_mean)[1:] / account.tail_mean_se[1:]).max() < 6.0


def test_plain_tail_means_and_quantiles_agree_with_the_law() -> None:
    result = run(ModelName.HULL_WHITE, {}, paths=20_000)
    law, account = result.closed_form, result.savings_account
    assert law is not None
    assert (result.replicates, result.gains) == (1, ())
    assert np.abs((account.percentile - law.percentile)[1:] / account.percentile_se[1:]).max() < 4.5
    assert np.abs((account.tail_mean - law.tail_mean)[1:] / account.tail_mean_se[1:]).max() < 4.5


@pytest.mark.parametrize("way", WAYS)
def test_the_same_bits_for_any_number_of_threads(way: dict[str, Any]) -> None:
    """Replicates that share blocks, and replicates that are parted among blocks."""
    shared, parted = {"paths": 9_000}, {"paths": 11_000, "replicates": 2, "horizon_years": 2}
    for others in (shared, parted):
        one = run(ModelName.GAUSSIAN_2, way, threads=1, **others)
        for threads in (2, 4):
            assert same(one, run(ModelName.GAUSSIAN_2, way, threads=threads, **others))


def test_another_seed_gives_other_paths() -> None:
    for way in WAYS:
        first, second = (run(ModelName.HULL_WHITE, way, paths=64, seed=seed) for seed in (1, 2))
        assert first.present_value[0].mean != second.present_value[0].mean


def test_gains_over_plain_sampling() -> None:
    """Present values are close to linear in the normals: mirrored pairs and moments matched take nearly all
    of the variance of their means; Sobol points take more."""
    by_way = {}
    for number, way in enumerate(WAYS):
        gains = {gain.figure: gain for gain in run(ModelName.HULL_WHITE, way).gains}
        means = [gains[f"mean present value of {side}"] for side in ("assets", "liabilities", "surplus")]
        assert all(gain.low > 1.0 for gain in means)
        assert all(gain.low <= gain.gain <= gain.high for gain in gains.values())
        assert "chance of a surplus below 0" not in gains
        assert all(gain.gain == pytest.approx((gain.plain_se / gain.se) ** 2) for gain in gains.values())
        by_way[number] = means[-1].gain
    assert by_way[0] > 5.0
    assert by_way[1] > 5.0 * by_way[0]


@pytest.mark.parametrize("way", WAYS)
def test_intervals_hold_the_truth_as_often_as_they_say(way: dict[str, Any]) -> None:
    """The mean of the savings account over 150 small runs: 95 % within binomial bounds."""
    model = vasicek(mean_reversion=0.2, long_run_rate=0.03, volatility=0.03, starting_rate=0.02)
    mean, variance = model.account_law(np.array([8.0]))
    known = float(np.exp(mean + 0.5 * variance)[0])
    runs, held = 150, 0
    for seed in range(runs):
        stated = replace(Run(paths=16 * 256, horizon_years=8, steps_per_year=1, seed=seed), **way)
        plan = Plan(model, stated.paths, 1, 8, seed, False, replicates_of(stated, block_paths=5000))
        account, rate = np.empty((2, 1, stated.paths))
        with Crew(1, 1.0) as crew:
            crew.run([partial(Block(plan, 0).advance, [8], account, rate, crew=crew)])
        headline = Headline("", np.exp(account[0]), Statistic.MEAN, False)
        settled = converging(headline, replicates=16, is_matched=stated.matching)
        held += bool(settled.low[-1] <= known <= settled.high[-1])
    assert abs(held / runs - 0.95) < 3.5 * math.sqrt(0.95 * 0.05 / runs)


def test_paths_that_are_rounded_up_are_told() -> None:
    result = run(ModelName.HULL_WHITE, {"sampling": Sampling.ANTITHETIC}, paths=100)
    assert result.paths == 128
    assert any("128 paths are drawn" in fault.mend for fault in result.faults)
    assert int(result.present_value[0].histogram.counts.sum()) == 128
    settings = dict(result.provenance.settings)
    assert (settings["sampling"], settings["replicates"]) == ("antithetic", "16")


def test_figures_converge_with_the_paths() -> None:
    plain: dict[str, Any] = {}
    for way in (plain, *WAYS):
        result = run(ModelName.HULL_WHITE, way)
        assert [one.figure for one in result.convergence][3] == "mean present value of surplus"
        for settled in result.convergence:
            assert settled.paths[-1] == result.paths
            assert np.all(np.diff(settled.paths) > 0)
        surplus = result.convergence[3]
        assert surplus.value[-1] == pytest.approx(result.present_value[2].mean, rel=1e-12)
        assert surplus.se[-1] == pytest.approx(result.present_value[2].se, rel=1e-9)
        low = result.convergence[4]
        place = result.present_value[2].levels.index(5.0)
        assert low.value[-1] == result.present_value[2].percentile[place]
        assert low.low[-1] == result.present_value[2].percentile_low[place]


@pytest.mark.parametrize("way", WAYS)
@pytest.mark.parametrize(
    "name", [ModelName.HULL_WHITE, ModelName.GAUSSIAN_2, ModelName.BLACK_KARASINSKI, ModelName.CIR]
)
def test_assets_and_inflation_are_sampled_beside_the_rates(name: ModelName, way: dict[str, Any]) -> None:
    """Discounted they are martingales, and the same bits for any number of threads."""
    gaussian = name in (ModelName.HULL_WHITE, ModelName.GAUSSIAN_2)
    own = ASSETS if gaussian else replace(ASSETS, rates_correlation=np.zeros(2))
    stated = inflating(name, assets=own, correlation=0.4 if gaussian else 0.0, horizon_years=5)
    stated = replace(stated, run=replace(stated.run, paths=16 * 128, **way))
    result = simulate(stated, assets(), liabilities(), threads=1)
    assert same(result, simulate(stated, assets(), liabilities(), threads=2))
    assert result.risky is not None
    assert result.index is not None
    index = result.index
    for mean, error, known in (
        *((one.mean_excess, one.mean_excess_se, one.expected_excess) for one in result.risky.assets),
        (index.mean_discounted, index.mean_discounted_se, index.expected_discounted),
    ):
        assert np.abs((mean - known)[1:] / error[1:]).max() < 6.0
    equity = result.risky.assets[0].total_return
    independent = equity.sd[1:] / np.sqrt(result.paths)
    assert np.all(equity.mean_se[1:] < 0.8 * independent)


@pytest.mark.parametrize("way", [{"sampling": Sampling.ANTITHETIC}, {"matching": True}])
def test_errors_of_the_autoregression_are_the_spread_over_many_runs(way: dict[str, Any]) -> None:
    """Mirrored pairs tell the slope twice over: White's error would be too small by a root of two."""
    runs = [run(ModelName.HULL_WHITE, way, paths=16 * 32, horizon_years=2, seed=seed) for seed in range(150)]
    table = np.array(
        [
            (one.autoregression[2], one.autoregression_se[2], one.expected_autoregression[2])
            for one in (simulation.diagnostics for simulation in runs)
            if one is not None
        ]
    )
    slope, told, known = table.T
    assert len(slope) == 150
    assert np.sqrt(np.mean(told**2)) == pytest.approx(np.std(slope), rel=0.2)
    assert abs(np.mean(slope - known)) < 4.0 * np.std(slope) / np.sqrt(150)
