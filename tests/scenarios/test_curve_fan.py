"""The yield curve at a horizon: the run's own paths, the model's own bonds."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from desk.book import Bridge, Measure, ModelName, RatesModel, Sampling, ScenarioSet
from desk.rates.gaussian import GaussianRates
from desk.scenarios.curve_fan import CURVE_TERMS, _zero_rates, curve_fan
from desk.scenarios.drawn_paths import drawn_blocks
from desk.scenarios.draws import Block, Crew
from desk.scenarios.models import rate_model
from desk.scenarios.plans import planned_run
from desk.scenarios.simulation import simulate
from tests.scenarios.books import ALL_MODELS, NO_FLOWS, assets, book, liabilities


@pytest.mark.parametrize("name", ALL_MODELS)
def test_the_term_zero_is_the_short_rate_of_the_run_to_the_last_bit(name: ModelName) -> None:
    drawn = book(ALL_MODELS[name], paths=6_000, measure=Measure.REAL_WORLD)
    run = simulate(drawn, assets(), liabilities())
    fan = curve_fan(drawn, assets(), liabilities(), year=4.0)
    assert fan.percentile[0].tolist() == run.short_rate.percentile[4].tolist()
    assert fan.mean[0] == run.short_rate.mean[4]
    assert fan.percentile_low[0].tolist() == run.short_rate.percentile_low[4].tolist()
    again = curve_fan(drawn, assets(), liabilities(), year=4.0, threads=1)
    assert again.percentile.tobytes() == fan.percentile.tobytes()


@pytest.mark.parametrize("sampling", [Sampling.ANTITHETIC, Sampling.SOBOL])
def test_paths_that_depend_on_each_other_have_errors_by_replicates(sampling: Sampling) -> None:
    plain = book(ALL_MODELS[ModelName.HULL_WHITE], paths=4_096)
    reduced = replace(
        plain, run=replace(plain.run, sampling=sampling, bridge=Bridge.COMPONENTS, replicates=8)
    )
    run = simulate(reduced, NO_FLOWS, NO_FLOWS)
    fan = curve_fan(reduced, year=10.0)
    assert fan.percentile[0].tolist() == run.short_rate.percentile[10].tolist()
    assert fan.mean_se[0] == run.short_rate.mean_se[10]
    assert (fan.mean_se < curve_fan(plain, year=10.0).mean_se).all()


def test_zero_rates_have_the_normal_law_of_a_gaussian_model() -> None:
    """Brigo and Mercurio (2006), Interest Rate Models, section 3.3: zero rates are linear in the factor."""
    drawn = book(ALL_MODELS[ModelName.HULL_WHITE], paths=40_000)
    model = rate_model(drawn)
    assert isinstance(model, GaussianRates)
    fan = curve_fan(drawn, year=5.0)
    speed, volatility = 0.05, 0.009
    deviation = volatility * np.sqrt((1.0 - np.exp(-2.0 * speed * 5.0)) / (2.0 * speed))
    term = np.asarray(CURVE_TERMS)
    with np.errstate(invalid="ignore"):
        slope = np.where(term > 0.0, (1.0 - np.exp(-speed * term)) / (speed * np.maximum(term, 1e-9)), 1.0)
    assert fan.term.tolist() == list(CURVE_TERMS)
    np.testing.assert_allclose(fan.sd, slope * deviation, rtol=0.015)
    # The middle of a normal law is its mean, and 5 % of it lie 1.645 deviations below.
    middle, low = fan.levels.index(50.0), fan.levels.index(5.0)
    np.testing.assert_allclose(fan.percentile[:, middle], fan.mean, atol=4.0 * fan.mean_se.max())
    np.testing.assert_allclose(fan.mean - fan.percentile[:, low], 1.6449 * slope * deviation, rtol=0.03)


@pytest.mark.parametrize("name", ALL_MODELS)
def test_bonds_discounted_along_the_paths_are_worth_what_today_says(name: ModelName) -> None:
    """``E[P(t, T)/R_t] = P(0, T)`` under the pricing measure."""
    drawn = book(ALL_MODELS[name], paths=5_000)
    plan = planned_run(drawn, assets(), liabilities()).plan
    step, node, term = 20, 5.0, 7.0
    (paths,) = drawn_blocks(plan, steps=(step,))
    state = np.empty((plan.model.factor_count, plan.paths))
    block = Block(plan, 0)
    with Crew(1, 1.0) as crew:
        block.advance(
            (),
            np.empty((0, 0)),
            np.empty((0, 0)),
            visit=lambda number, now: np.copyto(state, now.state) if number == step else None,
            crew=crew,
            until=step,
        )
    worth = np.exp(-term * _zero_rates(plan, step, state)(term) - paths.log_account[1])
    error = float(worth.std(ddof=1)) / np.sqrt(worth.size)
    assert abs(float(worth.mean()) - float(plan.model.curve.discount(node + term))) < 4.0 * error


def test_the_forward_curve_stands_beside() -> None:
    drawn = book(ALL_MODELS[ModelName.HO_LEE], paths=100)
    curve = drawn.basis.curve
    fan = curve_fan(drawn, year=3.0, terms=(0.0, 1.0, 10.0))
    price = curve.discount([3.0, 4.0, 13.0])
    np.testing.assert_allclose(fan.forward[1:], np.log(price[0] / price[1:]) / [1.0, 10.0], rtol=1e-12)
    np.testing.assert_allclose(fan.today[1:], curve.zero([1.0, 10.0]), rtol=1e-15)
    assert fan.provenance.book_digest == drawn.digest


def test_the_lognormal_model_leaves_out_what_it_does_not_reach() -> None:
    drawn = book(ALL_MODELS[ModelName.BLACK_KARASINSKI], paths=200)
    fan = curve_fan(drawn, year=8.0)
    # Without flows it is worked out up to the horizon of 10 years.
    assert fan.term.max() == 2.0
    assert fan.left_out[0] == 3.0
    assert np.isfinite(fan.percentile).all()
    assert (fan.percentile > 0.0).all()


def test_what_cannot_be_asked_is_refused() -> None:
    drawn = book(ALL_MODELS[ModelName.HO_LEE], paths=100)
    for year in (0.0, 3.1, 11.0, np.nan):
        with pytest.raises(ValueError, match="node of the run"):
            curve_fan(drawn, year=year)
    for terms in ((), (-1.0,), (2.0, 1.0), (1.0, 1.0)):
        with pytest.raises(ValueError, match="`terms`"):
            curve_fan(drawn, year=1.0, terms=terms)
    scenarios = ScenarioSet(np.array([1.0, 2.0]), np.full((3, 2), 0.02))
    outside = replace(drawn, rates_model=RatesModel(ModelName.OUTSIDE), scenario_set=scenarios)
    with pytest.raises(ValueError, match="no yield curve"):
        curve_fan(outside, year=1.0)


def test_it_can_be_stopped_and_tells_how_far_it_is() -> None:
    class Enough(Exception):
        pass

    told: list[float] = []

    def progress(part: float) -> None:
        told.append(part)
        if len(told) == 2:
            raise Enough

    drawn = book(ALL_MODELS[ModelName.CIR], paths=60_000)
    with pytest.raises(Enough):
        curve_fan(drawn, year=10.0, progress=progress)
    told.clear()
    curve_fan(
        replace(drawn, run=replace(drawn.run, paths=50)), year=10.0, progress=lambda part: told.append(part)
    )
    assert told[0] == 0.0
    assert told[-1] == 1.0
    assert told == sorted(told)


def test_one_path_has_a_curve_without_errors() -> None:
    fan = curve_fan(book(ALL_MODELS[ModelName.VASICEK], paths=1), year=2.0)
    assert np.isnan(fan.mean_se).all()
    assert np.isfinite(fan.percentile).all()
