"""Fitted values of later flows against their direct sum."""

from __future__ import annotations

import numpy as np
import pytest

from desk.book import ModelName
from desk.scenarios.surfaces import Surface, fit_surface, flow_surfaces
from tests.scenarios.books import AFFINE, ALL_MODELS, affine_model, book


def direct(weight: np.ndarray, exposure: np.ndarray, state: np.ndarray) -> np.ndarray:
    return np.array([np.sum(weight * np.exp(-(exposure @ column))) for column in state.T])


def gross(surface: Surface, state: np.ndarray) -> np.ndarray:
    return direct(np.abs(surface.weight), surface.exposure, state)


@pytest.mark.parametrize("name", AFFINE)
@pytest.mark.parametrize("time", [0.25, 5.0, 40.0])
def test_flows_of_every_model(name: ModelName, time: float) -> None:
    model = affine_model(book(ALL_MODELS[name]))
    due = np.arange(1, 721) / 12.0
    amount = np.linspace(1.0, 4.0, 720)
    low, high = model.state_range(time)
    (surface,) = flow_surfaces(model, [time], due, amount, low[None], high[None])
    assert surface.coefficient is not None
    state = np.random.default_rng(1).uniform(low[:, None], high[:, None], (len(low), 300))
    state[:, 0], state[:, 1] = low, high
    level, exposure = model.bond_terms(time, due[due >= time])
    summed = direct(amount[due >= time] * np.exp(level), exposure, state)
    assert surface(state) == pytest.approx(summed, rel=1e-10)
    assert surface.error < 1e-10


def test_flows_of_both_signs_are_relative_to_their_gross_value() -> None:
    rng = np.random.default_rng(2)
    weight, exposure = rng.standard_normal(100), rng.uniform(0.0, 15.0, (100, 1))
    surface = fit_surface(weight, exposure, [-0.2], [0.3])
    state = rng.uniform(-0.2, 0.3, (1, 500))
    assert np.abs((surface(state) - direct(weight, exposure, state)) / gross(surface, state)).max() < 1e-10


@pytest.mark.parametrize("factors", [1, 2, 3])
@pytest.mark.parametrize("count", [0, 1, 3, 4, 400])
def test_any_number_of_flows_and_factors(factors: int, count: int) -> None:
    rng = np.random.default_rng(3)
    weight, exposure = rng.uniform(0.5, 1.0, count), rng.uniform(0.0, 8.0, (count, factors))
    surface = fit_surface(weight, exposure, np.full(factors, -0.1), np.full(factors, 0.1))
    state = rng.uniform(-0.1, 0.1, (factors, 64))
    assert surface(state) == pytest.approx(direct(weight, exposure, state), rel=1e-11)
    if count == 400 and factors < 3:
        assert surface.coefficient is not None
    if count <= 3 or factors == 3:
        assert surface.coefficient is None


def test_states_outside_the_range_are_summed() -> None:
    weight, exposure = np.ones(50), np.linspace(0.0, 10.0, 50)[:, None]
    surface = fit_surface(weight, exposure, [-0.05], [0.05])
    assert surface.coefficient is not None
    state = np.array([[-0.6, 0.01, 0.9, 0.05]])
    assert surface(state) == pytest.approx(direct(weight, exposure, state), rel=1e-11)


@pytest.mark.parametrize("width", [0.0, 1e-15, 50.0, 1e6])
def test_ranges_of_any_width(width: float) -> None:
    weight, exposure = np.ones(50), np.linspace(0.0, 10.0, 50)[:, None]
    surface = fit_surface(weight, exposure, [0.01 - width], [0.01 + width])
    state = np.array([[0.01, 0.01 + 0.3 * min(width, 1.0)]])
    assert surface(state) == pytest.approx(direct(weight, exposure, state), rel=1e-9)


# Between 0.5 and 2 a common exponential begins to be taken out, which lowers the degree.
@pytest.mark.parametrize("halves", [0.1, 0.4, 2.0, 4.0, 8.0])
def test_the_degree_grows_with_the_range_and_the_error_does_not(halves: float) -> None:
    weight, exposure = np.ones(300), np.linspace(0.0, 10.0, 300)[:, None]
    narrow = fit_surface(weight, exposure, [-0.1 * halves], [0.1 * halves])
    wide = fit_surface(weight, exposure, [-0.2 * halves], [0.2 * halves])
    assert narrow.coefficient is not None
    assert wide.coefficient is not None
    assert narrow.coefficient.size < wide.coefficient.size
    assert max(narrow.error, wide.error) < 1e-10


def test_nodes_with_few_flows_or_none() -> None:
    model = affine_model(book(ALL_MODELS[ModelName.HULL_WHITE]))
    state = np.array([[-0.01, 0.0, 0.02]])
    for due in (np.zeros(0), np.array([1.0]), np.arange(1.0, 7.0)):
        surfaces = flow_surfaces(
            model, [0.5, 3.0, 5.0, 9.0], due, np.ones(due.size), np.full((4, 1), -0.1), np.full((4, 1), 0.1)
        )
        for node, surface in zip((0.5, 3.0, 5.0, 9.0), surfaces, strict=True):
            level, exposure = model.bond_terms(node, due[due >= node])
            assert surface(state) == pytest.approx(direct(np.exp(level), exposure, state), rel=1e-11)


def test_the_result_may_be_given() -> None:
    surface = fit_surface(np.ones(50), np.linspace(0.0, 10.0, 50)[:, None], [-0.05], [0.05])
    state, out = np.array([[0.01, 0.02]]), np.empty(2)
    assert surface(state, out) is out
    assert np.array_equal(out, surface(state))


def test_many_states_are_worked_on_in_parts() -> None:
    weight, exposure = np.ones(50), np.linspace(0.0, 10.0, 50)[:, None]
    surface = fit_surface(weight, exposure, [-0.05], [0.05])
    state = np.random.default_rng(4).uniform(-0.05, 0.05, (1, 30_001))
    whole = surface(state)
    assert whole[:7] == pytest.approx(surface(state[:, :7]), rel=1e-14)
    assert whole[-1] == pytest.approx(float(surface(state[:, -1:])[0]), rel=1e-14)
    assert surface(state[:, :0]).shape == (0,)
