"""Sets of scenarios from outside."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from desk.book import Book, ModelName, RatesModel, ScenarioSet, Side
from desk.scenarios.draws import BLOCK_PATHS
from desk.scenarios.fans import percentile_fan
from desk.scenarios.given import GivenRates
from desk.scenarios.models import rate_model
from desk.scenarios.plans import planned_run
from desk.scenarios.simulation import simulate
from tests.scenarios.books import BASIS, NO_FLOWS, assets, book, liabilities, priced
from tests.scenarios.inflating import ASSETS, drawn, following, inflating
from tests.scenarios.test_linked import LINKED
from tests.scenarios.test_simulation import same

UNEVEN = np.array([0.5, 1.0, 1.75, 3.0, 4.2])


def given(node: np.ndarray, rate: np.ndarray, *, paths: int = 1_000, horizon_years: int = 10) -> Book:
    """A book whose rates are given."""
    settings = book(RatesModel(ModelName.OUTSIDE), paths=paths, horizon_years=horizon_years)
    return replace(settings, scenario_set=ScenarioSet(node, rate))


def rates(paths: int, nodes: int, seed: int = 1) -> np.ndarray:
    """Rates of no model in particular."""
    return 0.03 + 0.02 * np.random.default_rng(seed).standard_normal((paths, nodes))


def test_flows_by_a_plain_loop() -> None:
    rate = rates(7, UNEVEN.size)
    due = np.array([0.0, 0.2, 0.5, 0.9, 1.0, 1.5, 1.75, 2.9, 3.3, 4.2, 6.0, 30.0])
    amount = np.linspace(1.0, 3.0, due.size)
    found = drawn(given(UNEVEN, rate, paths=7), priced(Side.ASSETS, due, amount, 0.01))
    curve = BASIS.curve
    for path in range(7):
        value = 0.0
        for time, paid in zip(due, amount, strict=True):
            log_account, before = 0.0, 0.0
            for node, one in zip(UNEVEN, rate[path], strict=True):
                log_account += one * (min(node, time) - before) if time > before else 0.0
                before = node
            later = float(curve.discount(time) / curve.discount(UNEVEN[-1])) if time > UNEVEN[-1] else 1.0
            value += paid * np.exp(-0.01 * time - log_account) * later
        assert found.value[path] == pytest.approx(value, rel=1e-11)


def test_every_node_is_reported_where_whole_years_are_missing() -> None:
    rate = rates(400, UNEVEN.size)
    result = simulate(given(UNEVEN, rate), assets(), liabilities())
    assert result.savings_account.year.tolist() == [0.0, *UNEVEN]
    assert result.short_rate.mean[1:] == pytest.approx(rate.mean(axis=0), rel=1e-12)
    account = np.exp(np.cumsum(rate * np.diff(UNEVEN, prepend=0.0), axis=1))
    assert result.savings_account.mean[1:] == pytest.approx(account.mean(axis=0), rel=1e-12)
    assert result.repricing.mean_discount[1:] == pytest.approx((1.0 / account).mean(axis=0), rel=1e-12)
    assert result.repricing.expected_discount == pytest.approx(BASIS.curve.discount([0.0, *UNEVEN]))
    assert (result.paths, result.horizon_years, result.steps_per_year) == (400, 5, 1)
    assert result.closed_form is None
    assert result.diagnostics is not None
    assert np.isnan(result.diagnostics.rate_mean).all()
    assert np.isfinite(result.diagnostics.autoregression[2:]).all()


def test_whole_years_are_reported_where_they_are_there() -> None:
    node = np.arange(1, 49) / 4.0
    short = given(node, rates(50, 48), horizon_years=10)
    result = simulate(short, assets(), liabilities())
    assert result.savings_account.year.tolist() == list(range(11))
    assert result.steps_per_year == 4
    # The years after the horizon discount flows all the same.
    other = rates(50, 48)
    other[:, 44:] += 0.05
    changed = simulate(given(node, other, horizon_years=10), assets(), liabilities())
    assert same(result.savings_account, changed.savings_account)
    assert changed.present_value[1].mean < result.present_value[1].mean


def test_a_set_without_spread_on_the_curve_is_the_curve() -> None:
    node = np.arange(1, 121) / 4.0
    forward = BASIS.curve.forward(node - 0.25, node)
    settings = given(node, np.tile(forward, (3, 1)), paths=3, horizon_years=30)
    on_nodes = priced(Side.LIABILITIES, np.arange(1, 241) / 4.0, np.ones(240))
    result = simulate(settings, NO_FLOWS, on_nodes)
    assert result.present_value[1].mean == pytest.approx(result.present_value[1].curve, rel=1e-12)
    assert result.present_value[1].sd == pytest.approx(0.0, abs=1e-12)
    assert result.repricing.mean_discount == pytest.approx(result.repricing.curve_discount, rel=1e-12)


def test_paths_drawn_by_a_model_give_its_values_back() -> None:
    """The mean rates of a drawn run, given as a set, have its savings accounts."""
    source = drawn(inflating(paths=300), liabilities())
    rate = np.diff(source.log_account, axis=0).T / 0.25
    result = simulate(given(np.arange(1, 41) / 4.0, rate, paths=300), NO_FLOWS, liabilities())
    assert result.savings_account.mean[-1] == pytest.approx(np.exp(source.log_account[-1]).mean(), rel=1e-12)


def test_many_blocks_and_threads() -> None:
    settings = given(np.arange(1, 5) * 1.0, rates(2 * BLOCK_PATHS + 11, 4), paths=10**6, horizon_years=4)
    settings = replace(settings, risky_assets=ASSETS)
    first = simulate(settings, assets(), liabilities(), threads=1)
    assert first.paths == 2 * BLOCK_PATHS + 11
    for threads in (2, 3):
        assert same(first, simulate(settings, assets(), liabilities(), threads=threads))


def test_risky_assets_stand_beside_a_set() -> None:
    settings = replace(given(UNEVEN, rates(20_000, 5), paths=20_000), risky_assets=ASSETS)
    result = simulate(settings, NO_FLOWS, NO_FLOWS)
    assert result.risky is not None
    for asset, volatility in zip(result.risky.assets, ASSETS.volatility, strict=True):
        score = (asset.mean_excess - 1.0)[1:] / asset.mean_excess_se[1:]
        assert np.abs(score).max() < 4.5
        assert asset.closed_form is None
        spread = asset.mean_excess_se * np.sqrt(20_000)
        assert spread[1:] == pytest.approx(np.sqrt(np.expm1(volatility**2 * UNEVEN)), rel=0.1)
    assert any("drawn independently of rates that are given" in fault.found for fault in result.faults)


def test_inflation_is_not_drawn_beside_a_set() -> None:
    settings = inflating(RatesModel(ModelName.OUTSIDE))
    settings = replace(settings, scenario_set=ScenarioSet(UNEVEN, rates(10, 5)))
    result = simulate(settings, NO_FLOWS, following([5.0], [1.0], LINKED))
    assert result.index is None
    assert any("inflation is not drawn beside a set" in fault.found for fault in result.faults)


def test_what_a_set_does_not_reach_is_said() -> None:
    faults = planned_run(given(UNEVEN, rates(10, 5), paths=11), NO_FLOWS).faults
    assert [fault.sheet for fault in faults] == ["Scenario set", "Scenario set"]
    assert "10 paths, fewer than the 11" in faults[0].found
    assert "ends after 4.2 years, before the horizon of 10" in faults[1].found
    assert planned_run(given(np.array([10.0]), rates(11, 1), paths=11), NO_FLOWS).faults == ()
    (fault,) = planned_run(given(UNEVEN, rates(11, 5), paths=11, horizon_years=4), NO_FLOWS).faults
    assert "no node at the horizon of 4 years; the last one reported is at 3 years" in fault.found
    assert planned_run(given(UNEVEN, rates(11, 5), paths=11, horizon_years=3), NO_FLOWS).faults == ()


def test_a_set_that_does_not_reprice_the_curve_is_said() -> None:
    node = np.arange(1.0, 11.0)
    forward = BASIS.curve.forward(node - 1.0, node) + 0.002 * rates(500, 10)
    fair = forward - forward.mean(axis=0) + BASIS.curve.forward(node - 1.0, node)

    def said(rate: np.ndarray) -> list[str]:
        result = simulate(given(node, rate, paths=500), NO_FLOWS, liabilities())
        return [fault.found for fault in result.faults if "reprice" in fault.found]

    assert said(fair) == []
    (found,) = said(fair + 0.01)
    assert "standard errors apart" in found


def test_one_path_and_one_node() -> None:
    result = simulate(given(np.array([2.0]), np.array([[0.05]]), paths=5), assets(), liabilities())
    assert result.savings_account.year.tolist() == [0.0, 2.0]
    assert result.savings_account.mean[1] == pytest.approx(np.exp(0.1))
    assert np.isnan(result.present_value[2].se)


def test_a_first_node_after_the_horizon() -> None:
    late = given(np.array([20.0, 30.0]), rates(4, 2), horizon_years=5)
    assert simulate(late, assets(), liabilities()).savings_account.year.tolist() == [0.0, 20.0]


@pytest.mark.parametrize(
    ("node", "rate", "message"),
    [
        (np.empty(0), np.empty((0, 0)), "holds no paths"),
        (np.array([1.0]), np.empty((0, 1)), "holds no paths"),
        (np.array([1.0, 2.0]), np.array([[0.01, np.nan]]), "no number in path 1 at 2 years"),
        (np.array([1.0]), np.array([[0.01], [np.inf]]), "no number in path 2 at 1 years"),
        (np.array([1.0]), np.array([[0.01], [-31.0]]), "a rate of -31 in path 2"),
    ],
)
def test_hostile_sets(node: np.ndarray, rate: np.ndarray, message: str) -> None:
    with pytest.raises(ValueError, match=message):
        rate_model(given(node, rate))


def test_a_time_between_nodes_is_refused() -> None:
    model = GivenRates(ScenarioSet(UNEVEN, rates(3, 5)), BASIS.curve)
    with pytest.raises(ValueError, match="no node of the set"):
        model.state_range(0.7)
    with pytest.raises(ValueError, match="nodes of its own"):
        percentile_fan(model, paths=3, steps_per_year=1, steps=4, seed=1, levels=(50.0,))
    walk = model.walk(1.0, 2, np.random.default_rng(1))
    assert walk.state.shape == (1, 2)
    with pytest.raises(ValueError, match="the set has 5 nodes, 6 are wanted"):
        next(walk.run(6))
