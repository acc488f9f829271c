"""Flows that follow the price index along the paths."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.stats import lognorm

from desk.book import Indexation, IndexationKind, Measure, ModelName
from desk.rates.black_karasinski import BlackKarasinskiRates
from desk.rates.inflation import log_growth
from desk.scenarios.linked import LinkedFlows, held_growth, index_law
from desk.scenarios.pathwise import PathValues, curve_value
from desk.scenarios.plans import planned_run
from desk.scenarios.simulation import simulate
from desk.scenarios.smooth import JoinedWorth, fit_function
from tests.scenarios.books import ALL_MODELS, NO_FLOWS, assets, book
from tests.scenarios.inflating import INFLATION, drawn, following, inflating
from tests.scenarios.test_simulation import same

LINKED = Indexation(IndexationKind.LINKED)
TIMES = np.concatenate([np.arange(1, 120) / 12.0, np.arange(10, 41) + 0.3])
REAL = 1.5 * np.exp(-TIMES / 25.0)


def _score(sample: np.ndarray, expected: float) -> float:
    return float((sample.mean() - expected) / (sample.std(ddof=1) / math.sqrt(sample.size)))


@pytest.mark.parametrize("lag", [0.0, 0.25, 1.3])
@pytest.mark.parametrize("name", ALL_MODELS)
def test_linked_flows_are_worth_on_average_what_they_are_today(name: ModelName, lag: float) -> None:
    flows = following(TIMES, REAL, replace(LINKED, lag=lag), spread=0.004)
    for steps_per_year in (1, 4):
        found = drawn(inflating(name, paths=10_000, steps_per_year=steps_per_year), flows)
        today = curve_value(found.plan, flows)
        assert abs(_score(found.value, today)) < 4.5
        assert found.values.surface_error < 1e-10
        # They do follow the index: the same amounts without it vary otherwise.
        assert found.value.std() > 0.0
    assert found.values.linked_rows == TIMES.size
    assert found.values.held_rows == 0


@pytest.mark.parametrize("name", [ModelName.HULL_WHITE, ModelName.GAUSSIAN_2, ModelName.CIR])
def test_a_flow_at_a_node_pays_the_index_drawn_there(name: ModelName) -> None:
    due = np.array([1.0, 1.5, 4.25, 10.0])
    found = drawn(inflating(name, paths=50), following(due, [3.0, 5.0, 7.0, 11.0], LINKED, spread=0.01))
    steps = (4 * due).astype(int)
    plain = np.zeros(50)
    for amount, step, time in zip([3.0, 5.0, 7.0, 11.0], steps, due, strict=True):
        weight = found.log_index[step] - found.log_account[step]
        plain += amount * math.exp(-0.01 * time) * np.exp(weight)
    assert found.value == pytest.approx(plain, rel=1e-11)


def test_a_lagged_flow_pays_the_index_of_before() -> None:
    """Observed at a node, paid a quarter later: the index there times a bond from there, scaled so that
    today's value is the basis's."""
    lagged = replace(LINKED, lag=0.25)
    flows = following([5.25], [1.0], lagged)
    found = drawn(inflating(paths=40, correlation=0.0), flows)
    growth = log_growth(np.array([5.25]), curve=INFLATION.curve, recent_rate=INFLATION.recent_rate, lag=0.25)
    index = found.log_index[20] - INFLATION.curve.zero(5.0) * 5.0 + growth
    model = found.plan.model
    level, exposure = model.bond_terms(5.0, 5.25)  # type: ignore[attr-defined]  # of an affine model
    bond = level - float(exposure[0]) * found.factors[20, 0]
    assert found.value == pytest.approx(np.exp(index + bond - found.log_account[20]), rel=1e-11)


def test_what_is_observed_before_the_first_node_is_certain() -> None:
    flows = following([0.2, 0.9], [1.0, 2.0], replace(LINKED, lag=1.0))
    found = drawn(inflating(paths=30), flows)
    assert found.value == pytest.approx(np.full(30, curve_value(found.plan, flows)), rel=1e-13)


@pytest.mark.parametrize("name", [ModelName.HULL_WHITE, ModelName.BLACK_KARASINSKI])
def test_a_floor_on_the_growth(name: ModelName) -> None:
    """At a node it is the greater of the two; later flows are worth by Black's formula the mean of that."""
    floored = replace(LINKED, least=1.25)
    at_node = drawn(inflating(name, paths=20_000, correlation=0.0), following([10.0], [1.0], floored))
    discount = np.exp(-at_node.log_account[40])
    plain = np.maximum(np.exp(at_node.log_index[40]), 1.25) * discount
    assert at_node.value == pytest.approx(plain, rel=1e-9)
    later = drawn(
        inflating(name, paths=20_000, correlation=0.0, horizon_years=2), following([10.0], [1.0], floored)
    )
    error = math.hypot(later.value.std(), plain.std()) / math.sqrt(20_000)
    assert abs(later.value.mean() - plain.mean()) / error < 4.5
    assert later.values.held_rows == 1


def _plain_collar(found: np.ndarray, years: int, floor: float, cap: float, per_year: int) -> np.ndarray:
    """Yearly increases of a written-down index, held and multiplied one by one."""
    growth = np.ones(found.shape[1])
    for year in range(years):
        increase = np.exp(found[(year + 1) * per_year] - found[year * per_year]) - 1.0
        growth *= 1.0 + np.clip(increase, floor, cap)
    return growth


@pytest.mark.parametrize("name", [ModelName.GAUSSIAN_2, ModelName.CIR, ModelName.BLACK_KARASINSKI])
def test_a_collar_holds_each_years_increase(name: ModelName) -> None:
    collar = Indexation(IndexationKind.COLLARED, floor=0.01, cap=0.03)
    found = drawn(inflating(name, paths=300), following([1.0, 6.0, 10.0], [1.0, 2.0, 3.0], collar))
    plain = np.zeros(300)
    for amount, year in ((1.0, 1), (2.0, 6), (3.0, 10)):
        grown = _plain_collar(found.log_index, year, 0.01, 0.03, 4)
        plain += amount * grown * np.exp(-found.log_account[4 * year])
    assert found.value == pytest.approx(plain, rel=1e-9)
    assert found.values.held_rows == 3


@pytest.mark.parametrize("lag", [0.0, 0.25, 1.25])
@pytest.mark.parametrize("name", [ModelName.HULL_WHITE, ModelName.BLACK_KARASINSKI])
def test_years_to_come_are_worth_what_they_turn_out_on_average(name: ModelName, lag: float) -> None:
    """The same flows with the index drawn up to the last, and seen from the second year on."""
    collar = Indexation(IndexationKind.COLLARED, floor=0.01, cap=0.03, lag=lag)
    flows = following(np.arange(1, 49) / 4.0, np.ones(48), collar)
    far, near = (
        drawn(inflating(name, paths=20_000, horizon_years=years, seed=years), flows) for years in (12, 2)
    )
    error = math.hypot(far.value.std(), near.value.std()) / math.sqrt(20_000)
    # Years that depend on one another beyond the state of inflation, and parts of a year: a few parts in 1e4.
    assert abs(far.value.mean() - near.value.mean()) < 4.5 * error + 5e-4 * far.value.mean()
    assert near.values.surface_error < 1e-9


@pytest.mark.parametrize("lag", [0.0, 0.25])
def test_a_collar_without_bounds_is_linked(lag: float) -> None:
    free = Indexation(IndexationKind.COLLARED, lag=lag)
    times = np.arange(1, 41) * 1.0
    one = drawn(inflating(paths=200, correlation=0.0), following(times, np.ones(40), free))
    other = drawn(
        inflating(paths=200, correlation=0.0), following(times, np.ones(40), replace(LINKED, lag=lag))
    )
    assert one.value == pytest.approx(other.value, rel=2e-3)
    assert one.value.mean() == pytest.approx(other.value.mean(), rel=2e-5)


def test_a_collar_of_one_figure_is_a_fixed_rise() -> None:
    collar = Indexation(IndexationKind.COLLARED, floor=0.02, cap=0.02)
    flows = following([4.0, 20.0], [1.0, 1.0], collar)
    found = drawn(inflating(paths=20_000), flows)
    assert curve_value(found.plan, flows) == pytest.approx(
        sum(1.02**year * float(found.plan.model.curve.discount(year)) for year in (4.0, 20.0))
    )
    assert abs(_score(found.value, curve_value(found.plan, flows))) < 4.5


def test_inflation_without_volatility_is_what_is_expected() -> None:
    for indexation in (LINKED, Indexation(IndexationKind.COLLARED), replace(LINKED, least=0.5)):
        flows = following(TIMES, REAL, indexation)
        still = inflating(paths=200, volatility=0.0)
        fixed = replace(flows, real_amount=None, index_class=None, indexations=())
        one, other = simulate(still, NO_FLOWS, flows), simulate(still, NO_FLOWS, fixed)
        assert one.present_value[1].percentile == pytest.approx(other.present_value[1].percentile, rel=1e-8)


def test_the_same_bits_for_any_number_of_threads() -> None:
    flows = following(TIMES, REAL, Indexation(IndexationKind.COLLARED, floor=0.0, cap=0.04, lag=0.25))
    settings = inflating(paths=12_345)
    first = simulate(settings, assets(), flows, threads=1)
    for threads in (2, 3):
        assert same(first, simulate(settings, assets(), flows, threads=threads))


@pytest.mark.parametrize("name", ALL_MODELS)
@pytest.mark.parametrize("measure", Measure)
def test_the_index_has_its_law(name: ModelName, measure: Measure) -> None:
    found = simulate(inflating(name, paths=10_000, measure=measure, seed=8), NO_FLOWS, NO_FLOWS).index
    assert found is not None
    law, sample = found.closed_form, found.index
    assert np.abs((sample.mean - law.mean)[1:] / sample.mean_se[1:]).max() < 4.5
    assert np.abs((sample.sd - law.sd)[1:] / sample.sd_se[1:]).max() < 4.5
    score = (found.mean_discounted - found.expected_discounted)[1:] / found.mean_discounted_se[1:]
    assert np.abs(score).max() < 4.5
    assert found.expected_index == pytest.approx(1.0 / INFLATION.curve.discount(sample.year))
    assert found.matches_today
    assert found.revalued == "No flow follows the index."


def test_a_run_says_which_flows_follow_the_index() -> None:
    collar = Indexation(IndexationKind.COLLARED, floor=0.0)
    result = simulate(inflating(paths=50), NO_FLOWS, following([5.0, 6.0], [1.0, 1.0], collar))
    assert result.index is not None
    assert not result.index.matches_today
    assert "2 flows with a floor or a cap" in result.index.revalued


def test_without_a_factor_linked_flows_stay_as_expected() -> None:
    flows = following(TIMES, REAL, LINKED)
    plain = replace(flows, real_amount=None, index_class=None, indexations=())
    settings = book(ALL_MODELS[ModelName.CIR], paths=100)
    one, other = simulate(settings, NO_FLOWS, flows), simulate(settings, NO_FLOWS, plain)
    assert same(one, other)
    assert one.index is None


def test_a_held_lognormal_number_by_quadrature() -> None:
    law = lognorm(s=0.2, scale=math.exp(math.log(1.05) - 0.02))
    expected = quad(lambda y: min(max(y, 0.95), 1.2) * law.pdf(y), 0.0, 5.0, points=[0.95, 1.2], epsabs=1e-12)
    assert held_growth(np.array([1.05]), 0.04, 0.95, 1.2)[0] == pytest.approx(expected[0], abs=1e-9)
    assert held_growth(np.array([1.05, 3.0]), 0.0, 0.95, 1.2).tolist() == [1.05, 1.2]
    assert held_growth(np.array([1.05]), 0.04, 0.0, np.inf)[0] == pytest.approx(1.05)


def test_a_fitted_function() -> None:
    fit = fit_function(lambda x: np.tanh(20.0 * x), -0.3, 0.5)
    places = np.linspace(-0.3, 0.5, 77)
    assert fit(places) == pytest.approx(np.tanh(20.0 * places), abs=1e-10)
    assert fit.error < 1e-10
    assert fit(np.array([-9.0]))[0] == pytest.approx(math.tanh(-6.0), abs=1e-10)
    assert fit_function(np.ones_like, 0.0, 0.0)(np.zeros(3)) == pytest.approx(np.ones(3))


class _Stop(Exception):
    pass


@pytest.mark.parametrize(
    "indexation",
    [LINKED, replace(LINKED, least=1.1), Indexation(IndexationKind.COLLARED, cap=0.03), Indexation()],
)
def test_fitting_may_be_stopped(indexation: Indexation) -> None:
    """A lognormal model takes seconds over many linked flows: a cancelled run does not."""

    def poll() -> None:
        raise _Stop

    flows = following(np.arange(1, 61) / 12.0, np.ones(60), indexation)
    plan = planned_run(inflating(ModelName.BLACK_KARASINSKI), flows).plan
    with pytest.raises(_Stop):
        PathValues(plan, (flows,), INFLATION, poll=poll)


def test_flows_between_nodes_path_by_path_in_a_model_without_closed_forms() -> None:
    """Under lognormal rates, whose bonds have no closed form, flows of a year are worth at the node before
    what each is by itself: its bond, times what the factor of inflation says of the index to come."""
    due = np.array([5.25, 5.5, 5.75, 5.9, 6.0 - 1e-3])
    real = np.array([3.0, 5.0, 7.0, 11.0, 2.0])
    found = drawn(
        inflating(ModelName.BLACK_KARASINSKI, paths=50, steps_per_year=1), following(due, real, LINKED)
    )
    index, model = index_law(found.plan), found.plan.model
    assert isinstance(model, BlackKarasinskiRates)
    ((_, rows),) = found.values._following
    assert isinstance(rows, LinkedFlows)
    worth = rows._visits[5]
    assert isinstance(worth, JoinedWorth)
    assert worth.tilt != 0.0
    random = np.random.default_rng(6)
    factor, rate = random.uniform(-0.02, 0.02, 40), random.uniform(0.005, 0.08, 40)
    summed = np.zeros(40)
    for time, amount in zip(due.tolist(), real.tolist(), strict=True):
        level, exposure = index.growth_terms(5.0, time, time)
        bond = model.value_flows_at(5.0, np.array([time]), np.ones(1))(rate[None])
        summed += amount * bond * np.exp(float(level) - float(exposure) * factor)
    assert worth(np.array([rate, factor])) == pytest.approx(summed, rel=1e-10)
