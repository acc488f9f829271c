"""Risky assets beside the rates, and the short rate against its law."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from desk.book import Book, Measure, ModelName, RatesModel, RiskyAssets
from desk.scenarios.compare import compare_measures, compare_models
from desk.scenarios.diagnostics import expected_autoregression
from desk.scenarios.market import beside_rates
from desk.scenarios.market_records import NOT_COUNTED, Diagnostics, RiskySummary
from desk.scenarios.models import rate_model
from desk.scenarios.plans import check_fits, planned_run, run_bytes
from desk.scenarios.records import Simulation
from desk.scenarios.simulation import simulate
from tests.scenarios.books import ALL_MODELS, NO_FLOWS, assets, book, liabilities
from tests.scenarios.inflating import ASSETS, inflating
from tests.scenarios.test_simulation import same

GAUSSIAN = (ModelName.VASICEK, ModelName.HO_LEE, ModelName.HULL_WHITE, ModelName.GAUSSIAN_2)
CONTRADICTING = replace(
    ASSETS, correlation=np.array([[1.0, 0.9], [0.9, 1.0]]), rates_correlation=np.array([0.9, -0.9])
)


def with_assets(
    name: ModelName,
    beside: RiskyAssets = ASSETS,
    *,
    paths: int = 2_000,
    steps_per_year: int = 4,
    measure: Measure = Measure.PRICING,
    seed: int = 3,
) -> Book:
    settings = book(ALL_MODELS[name], paths=paths, steps_per_year=steps_per_year, measure=measure, seed=seed)
    return replace(settings, risky_assets=beside)


def risky(result: Simulation) -> RiskySummary:
    assert result.risky is not None
    return result.risky


def diagnostics(result: Simulation) -> Diagnostics:
    assert result.diagnostics is not None
    return result.diagnostics


@pytest.mark.parametrize("measure", Measure)
@pytest.mark.parametrize("steps_per_year", [1, 12])
@pytest.mark.parametrize("name", ALL_MODELS)
def test_assets_have_the_law_they_should(name: ModelName, steps_per_year: int, measure: Measure) -> None:
    settings = with_assets(name, paths=10_000, steps_per_year=steps_per_year, measure=measure, seed=5)
    found = risky(simulate(settings, NO_FLOWS, NO_FLOWS))
    year = found.total.year
    for asset, premium in zip(found.assets, ASSETS.premium, strict=True):
        wanted = np.exp(premium * year) if measure is Measure.REAL_WORLD else np.ones(year.size)
        assert asset.expected_excess == pytest.approx(wanted, rel=1e-14)
        score = (asset.mean_excess - asset.expected_excess)[1:] / asset.mean_excess_se[1:]
        assert np.abs(score).max() < 4.5
        assert (asset.closed_form is not None) == (name in GAUSSIAN)
        if asset.closed_form is not None:
            law, sample = asset.closed_form, asset.total_return
            assert np.abs((sample.mean - law.mean)[1:] / sample.mean_se[1:]).max() < 4.5
            assert np.abs((sample.sd - law.sd)[1:] / sample.sd_se[1:]).max() < 4.5
            # Medians stand within their intervals at almost every node.
            inside = (sample.percentile_low[1:, 3] <= law.percentile[1:, 3]) & (
                law.percentile[1:, 3] <= sample.percentile_high[1:, 3]
            )
            assert inside.sum() >= year.size - 4
    total = sum(asset.value * asset.total_return.mean for asset in found.assets)
    assert found.total.mean == pytest.approx(total, rel=1e-12)
    assert found.total.mean[0] == 800.0


def test_what_part_the_assets_have_is_said() -> None:
    """Neither the standing nor the present values along the paths count them."""
    beside = simulate(with_assets(ModelName.HULL_WHITE), assets(), liabilities())
    alone = simulate(book(ALL_MODELS[ModelName.HULL_WHITE]), assets(), liabilities())
    assert risky(beside).counted == NOT_COUNTED
    assert "no part of assets, liabilities and surplus" in NOT_COUNTED
    for field in ("savings_account", "short_rate", "repricing", "present_value", "sample_paths"):
        assert same(getattr(beside, field), getattr(alone, field))


def test_the_covariance_drawn_is_shown() -> None:
    found = risky(simulate(with_assets(ModelName.HO_LEE, paths=50), NO_FLOWS, NO_FLOWS))
    assert found.covariance == pytest.approx(np.array([[0.0256, 0.0096], [0.0096, 0.0144]]))
    assert found.rates_correlation.tolist() == [0.3, -0.2]
    assert found.mended is None


@pytest.mark.parametrize("name", [ModelName.GAUSSIAN_2, ModelName.CIR, ModelName.BLACK_KARASINSKI])
def test_the_same_bits_for_any_number_of_threads(name: ModelName) -> None:
    settings = replace(inflating(name, paths=12_345), risky_assets=ASSETS)
    first = simulate(settings, assets(), liabilities(), threads=1)
    for threads in (2, 4):
        assert same(first, simulate(settings, assets(), liabilities(), threads=threads))


@pytest.mark.parametrize("name", [ModelName.CIR, ModelName.BLACK_KARASINSKI])
def test_rates_without_a_joint_law_are_independent_and_it_is_said(name: ModelName) -> None:
    beside = beside_rates(with_assets(name), rate_model(with_assets(name)))
    assert beside.market is not None
    assert not beside.market.correlation[:1, 1:].any()
    (fault,) = beside.faults
    assert "drawn independently of rates that are not Gaussian" in fault.found
    unlinked = replace(ASSETS, rates_correlation=np.zeros(2))
    assert beside_rates(with_assets(name, unlinked), rate_model(with_assets(name))).faults == ()
    inflated = inflating(name)
    assert "inflation is drawn independently" in beside_rates(inflated, rate_model(inflated)).faults[0].found


def test_correlations_that_contradict_one_another_are_refused() -> None:
    settings = with_assets(ModelName.HULL_WHITE, CONTRADICTING)
    with pytest.raises(ValueError, match=r"negative eigenvalue.*set Mend correlation to yes"):
        simulate(settings, NO_FLOWS, NO_FLOWS)


def test_correlations_are_mended_on_request() -> None:
    model = replace(ALL_MODELS[ModelName.HULL_WHITE], mend_correlation=True)
    settings = replace(book(model, paths=50), risky_assets=CONTRADICTING)
    result = simulate(settings, NO_FLOWS, NO_FLOWS)
    mended = risky(result).mended
    assert mended is not None
    assert mended.least_eigenvalue < 0.0
    assert risky(result).rates_correlation == pytest.approx(mended.matrix[0, 1:])
    assert any("were mended; the largest change" in fault.found for fault in result.faults)


def test_a_singular_correlation_is_drawn() -> None:
    twins = replace(
        ASSETS, correlation=np.ones((2, 2)), rates_correlation=np.ones(2), volatility=np.array([0.1, 0.2])
    )
    found = risky(simulate(with_assets(ModelName.VASICEK, twins), NO_FLOWS, NO_FLOWS))
    for asset in found.assets:
        score = (asset.mean_excess - 1.0)[1:] / asset.mean_excess_se[1:]
        assert np.abs(score).max() < 4.5


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"volatility": np.array([0.1, -0.1])}, "Volatility of Property in the sheet Risky assets"),
        ({"value": np.array([math.nan, 1.0])}, "Value of Equity in the sheet Risky assets"),
        ({"premium": np.array([0.1, math.inf])}, "Premium of Property .* a number, not inf"),
        ({"correlation": np.array([[1.0, math.nan], [math.nan, 1.0]])}, "something that is not a number"),
        ({"correlation": np.array([[1.0, 0.5], [0.1, 1.0]])}, "not symmetric"),
        ({"rates_correlation": np.array([0.1, 2.0])}, "beyond ±1"),
    ],
)
def test_hostile_assets(changes: dict[str, np.ndarray], message: str) -> None:
    hostile = replace(ASSETS, **changes)  # type: ignore[arg-type]  # arrays by name
    with pytest.raises(ValueError, match=message):
        simulate(with_assets(ModelName.HULL_WHITE, hostile), NO_FLOWS, NO_FLOWS)


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"inflation_mean_reversion": None}, "Inflation mean reversion is missing"),
        ({"inflation_mean_reversion": -1.0}, "Inflation mean reversion must be a number of at least 0"),
        ({"inflation_volatility": math.nan}, "Inflation factor volatility must be a number of at least 0"),
        ({"inflation_rate_correlation": 1.5}, "Inflation rate correlation must be between -1 and 1"),
        ({"inflation_risk_price": math.inf}, "Inflation risk price must be a number"),
    ],
)
def test_hostile_inflation(changes: dict[str, float | None], message: str) -> None:
    settings = inflating()
    assert settings.rates_model is not None
    stated = replace(settings.rates_model, **changes)  # type: ignore[arg-type]  # floats by name
    with pytest.raises(ValueError, match=message):
        simulate(replace(settings, rates_model=stated), NO_FLOWS, NO_FLOWS)


def test_a_factor_without_expected_inflation_is_said() -> None:
    settings = inflating()
    without = replace(settings, basis=replace(settings.basis, inflation=None))
    result = simulate(without, NO_FLOWS, NO_FLOWS)
    assert result.index is None
    assert any("the basis expects no inflation" in fault.found for fault in result.faults)


@pytest.mark.parametrize("measure", Measure)
@pytest.mark.parametrize("name", ALL_MODELS)
def test_the_short_rate_has_its_law(name: ModelName, measure: Measure) -> None:
    settings = book(ALL_MODELS[name], paths=20_000, steps_per_year=2, measure=measure, seed=21)
    result = simulate(settings, NO_FLOWS, NO_FLOWS)
    found, rate = diagnostics(result), result.short_rate
    assert np.abs((rate.mean - found.rate_mean)[1:] / rate.mean_se[1:]).max() < 4.5
    assert np.abs((rate.sd - found.rate_sd)[1:] / rate.sd_se[1:]).max() < 4.5
    assert found.rate_sd[0] == 0.0
    assert found.rate_mean[0] == pytest.approx(rate.mean[0], rel=1e-12)
    score = (found.autoregression - found.expected_autoregression)[1:] / found.autoregression_se[1:]
    assert np.abs(score).max() < 4.5
    assert np.isnan(found.autoregression[0])


def test_what_is_left_of_the_rate_after_a_step() -> None:
    for name, speed in ((ModelName.HULL_WHITE, 0.05), (ModelName.HO_LEE, 0.0), (ModelName.CIR, 0.15)):
        model = rate_model(book(ALL_MODELS[name]))
        assert expected_autoregression(model, 3.0, 0.5) == pytest.approx(math.exp(-0.5 * speed), rel=1e-12)
        assert math.isnan(expected_autoregression(model, 0.5, 0.5))
    two = rate_model(book(ALL_MODELS[ModelName.GAUSSIAN_2]))
    assert math.exp(-0.2) < expected_autoregression(two, 30.0, 0.5) < 1.0
    still = rate_model(book(RatesModel(ModelName.HULL_WHITE, mean_reversion=0.1, volatility=0.0)))
    assert math.isnan(expected_autoregression(still, 3.0, 0.5))


def test_slopes_by_one_sum() -> None:
    """Blocks put together are the regression over all paths."""
    settings = book(ALL_MODELS[ModelName.HULL_WHITE], paths=12_000, horizon_years=3, steps_per_year=1)
    plan = planned_run(settings).plan
    rates: dict[int, np.ndarray] = {step: np.empty(plan.paths) for step in (1, 2, 3)}
    for index in range(plan.blocks):
        walk = plan.walk(index)
        columns = plan.columns(index)
        for step, _ in enumerate(walk.run(3), start=1):
            rates[step][columns] = walk.state[0, : columns.stop - columns.start]
    found = diagnostics(simulate(settings, NO_FLOWS, NO_FLOWS))
    assert found.autoregression[2:] == pytest.approx(
        [np.polyfit(rates[step - 1], rates[step], 1)[0] for step in (2, 3)], rel=1e-10
    )


def test_models_side_by_side() -> None:
    settings = book(ALL_MODELS[ModelName.HULL_WHITE], paths=200)
    runs = compare_models(
        settings,
        [
            ModelName.HULL_WHITE,
            ModelName.HO_LEE,
            ModelName.GAUSSIAN_2,
            ModelName.CIR,
            ModelName.OUTSIDE,
            ALL_MODELS[ModelName.BLACK_KARASINSKI],
        ],
        assets(),
        liabilities(),
    )
    assert [run.simulation is not None for run in runs] == [True, True, False, False, False, True]
    assert [run.problem for run in runs[:2]] == ["", ""]
    wanted = "Second mean reversion, Second volatility, Factor correlation missing: the gaussian-2 model"
    assert runs[2].problem.startswith(wanted)
    assert "Volatility is stated for the hull-white model" in runs[3].problem
    assert "Scenario set is missing" in runs[4].problem
    assert same(runs[0].simulation, simulate(settings, assets(), liabilities()))
    assert runs[5].model is ModelName.BLACK_KARASINSKI
    without = compare_models(replace(settings, rates_model=None), [ModelName.HO_LEE], NO_FLOWS, NO_FLOWS)
    assert without[0].problem == "Volatility missing: the ho-lee model needs it"


def test_the_progress_of_a_comparison_rises() -> None:
    told: list[float] = []
    settings = book(ALL_MODELS[ModelName.HULL_WHITE], paths=100)
    models = [ModelName.HULL_WHITE, ModelName.CIR, ModelName.HO_LEE]
    compare_models(settings, models, NO_FLOWS, NO_FLOWS, progress=told.append)
    assert told == sorted(told)
    assert told[-1] == 1.0
    told.clear()
    compare_measures(settings, NO_FLOWS, NO_FLOWS, progress=told.append)
    assert told == sorted(told)


def test_both_measures_from_the_same_numbers() -> None:
    settings = with_assets(ModelName.HULL_WHITE)
    pricing, real_world = compare_measures(settings, assets(), liabilities())
    assert (pricing.measure, real_world.measure) == (Measure.PRICING, Measure.REAL_WORLD)
    ratio = risky(real_world).assets[0].mean_excess[-1] / risky(pricing).assets[0].mean_excess[-1]
    assert ratio == pytest.approx(math.exp(0.4), rel=1e-9)


def test_a_run_that_would_not_fit_says_what_would() -> None:
    plan = planned_run(with_assets(ModelName.HULL_WHITE, paths=1_000_000)).plan
    needed = run_bytes(plan)
    assert 1e8 < needed < 1.5e9
    check_fits(plan, most=needed)
    with pytest.raises(ValueError, match=r"1,000,000 paths with 2 risky assets .* at most 9\d0,000$"):
        check_fits(plan, most=needed - 1)
    huge = with_assets(ModelName.HULL_WHITE, paths=20_000_000)
    with pytest.raises(ValueError, match="set Paths to at most"):
        simulate(huge, NO_FLOWS, NO_FLOWS)
    check_fits(planned_run(book(ALL_MODELS[ModelName.HULL_WHITE], paths=20_000_000)).plan)


def test_assets_that_run_away_are_said() -> None:
    wild = replace(ASSETS, volatility=np.array([60.0, 0.1]))
    result = simulate(with_assets(ModelName.HULL_WHITE, wild, paths=500), NO_FLOWS, NO_FLOWS)
    finite = np.isfinite(risky(result).assets[0].total_return.mean).all()
    assert finite or any("too large" in fault.found for fault in result.faults)
