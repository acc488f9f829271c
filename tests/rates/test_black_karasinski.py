"""The lognormal model: its fit, its values against plain quadrature and against its own paths, its order."""

from __future__ import annotations

import math
from functools import partial

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.integrate import dblquad

import desk.rates.black_karasinski_grid as grid
from desk.rates.black_karasinski import BlackKarasinskiRates
from desk.rates.black_karasinski_grid import StateFunction
from desk.rates.curve import Curve
from tests.rates.flat_curve import flat_curve, humped_curve

FloatArray = NDArray[np.float64]

PATHS = 40_000
# The rates of the kinked curve jump between its terms.
KINKED = Curve([1.0, 3.0, 7.0, 20.0], [0.01, 0.03, 0.02, 0.035])


def generator(seed: int = 1) -> np.random.Generator:
    return np.random.Generator(np.random.SFC64(np.random.SeedSequence(seed)))


def model(**changes: float) -> BlackKarasinskiRates:
    stated = {"mean_reversion": 0.1, "volatility": 0.25, "horizon": 20.0}
    settings = stated | {name: value for name, value in changes.items() if name != "steps_per_year"}
    return BlackKarasinskiRates(
        humped_curve(), **settings, steps_per_year=int(changes.get("steps_per_year", 12))
    )


def squared(later: StateFunction, rate: FloatArray) -> FloatArray:
    return np.asarray(later(rate) ** 2)


def off(sample: FloatArray, mean: float) -> float:
    """Distance from a mean in standard errors."""
    return float(abs(sample.mean() - mean) / (sample.std() / math.sqrt(sample.size)))


@pytest.mark.parametrize(
    ("speed", "volatility"), [(0.0, 0.15), (0.05, 0.2), (0.1, 0.0), (0.3, 0.8), (5.0, 0.1)]
)
@pytest.mark.parametrize("curve", [humped_curve(), flat_curve(0.05), flat_curve(1e-6), KINKED])
def test_every_node_and_every_time_between_is_repriced(speed: float, volatility: float, curve: Curve) -> None:
    rates = BlackKarasinskiRates(curve, mean_reversion=speed, volatility=volatility, horizon=25.0)
    assert rates.fit_error < 1e-12
    times = np.array([0.0, 0.01, 0.5, 1.0, 3.3333, 17.0, 24.999, 25.0])
    today = np.array([[float(rates.walk(1.0, 1, generator()).state[0, 0])]])
    found = rates.bond_price(0.0, times, today)[:, 0]
    np.testing.assert_allclose(found, curve.discount(times), rtol=1e-12, atol=0.0)


def test_two_steps_by_plain_quadrature() -> None:
    """The bond of two yearly steps as the double integral that defines it, and the bond seen in one year."""
    rates = model(steps_per_year=1, horizon=2.0, volatility=0.5)
    first, second = rates.log_rate_law(1.0)[0], rates.log_rate_law(2.0)[0]
    # Levels of the steps: at the last node that of the last step, at the node before the mean of the two.
    level = [2.0 * float(first) - float(second), float(second)]
    decay, noise = math.exp(-0.1), 0.5 * math.sqrt((1.0 - math.exp(-0.2)) / 0.2)

    def density(z: float) -> float:
        return math.exp(-0.5 * z * z) / math.sqrt(2.0 * math.pi)

    def both(z: float, y: float) -> float:
        one = noise * y
        two = decay * one + noise * z
        total = 0.5 * math.exp(level[0]) * (1.0 + math.exp(one))
        total += 0.5 * math.exp(level[1]) * (math.exp(one) + math.exp(two))
        return math.exp(-total) * density(y) * density(z)

    whole, _ = dblquad(both, -8.0, 8.0, -8.0, 8.0, epsabs=1e-12)
    assert whole == pytest.approx(float(humped_curve().discount(2.0)), rel=1e-10)

    for rate in (0.005, 0.03, 0.2):
        one = math.log(rate) - float(first)
        z = np.linspace(-8.0, 8.0, 4001)
        two = decay * one + noise * z
        later = np.exp(-0.5 * math.exp(level[1]) * (math.exp(one) + np.exp(two)))
        expected = float(np.sum(later * np.exp(-0.5 * z**2)) / np.sum(np.exp(-0.5 * z**2)))
        assert float(rates.bond_price(1.0, 2.0, [[rate]])[0]) == pytest.approx(expected, rel=1e-12)


def test_the_points_are_close_enough(monkeypatch: pytest.MonkeyPatch) -> None:
    """Half the distance of the points changes nothing but rounding."""
    rate = np.array([[0.004, 0.02, 0.08, 0.3]])
    coarse = model().bond_price(8.0, [9.0, 14.017, 20.0], rate)
    monkeypatch.setattr(grid, "_PER_DEVIATION", 2.0 * grid._PER_DEVIATION)
    fine = model().bond_price(8.0, [9.0, 14.017, 20.0], rate)
    np.testing.assert_allclose(coarse, fine, rtol=0.0, atol=1e-12)


def test_values_converge_as_the_square_of_the_step() -> None:
    values = []
    for steps in (4, 8, 16, 32):
        rates = model(steps_per_year=steps)
        later = rates.value_flows_at(5.0, [10.0, 15.0], [1.0, 1.0])
        values.append(rates.payoff_value(5.0, partial(squared, later)))
    change = np.diff(values)
    np.testing.assert_allclose(change[:-1] / change[1:], 4.0, rtol=0.02)
    # One extrapolation of the two coarsest is nearer than the finest by itself.
    limit = values[3] + change[2] / 3.0
    assert abs(values[1] + change[0] / 3.0 - limit) < 0.2 * abs(values[3] - limit)
    # The error that the module states at twelve steps a year.
    assert abs(values[2] - limit) < 2e-6 * limit


@pytest.mark.parametrize("real_world", [False, True])
def test_paths_have_the_stated_laws(real_world: bool) -> None:
    rates = model(risk_price=0.15)
    walk = rates.walk(0.25, PATHS, generator(), real_world=real_world)
    for step, _ in enumerate(walk.run(40), start=1):
        if step % 20 == 0:
            time = 0.25 * step
            discount = np.exp(-walk.integral)
            assert off(discount, float(rates.mean_discount(time, real_world=real_world))) < 4.0
            mean, variance = rates.log_rate_law(time, real_world=real_world)
            log_rate = np.log(walk.state[0])
            assert off(log_rate, float(mean)) < 4.0
            assert float(log_rate.var()) == pytest.approx(float(variance), rel=4.0 * math.sqrt(2.0 / PATHS))
            low, high = rates.state_range(time, real_world=real_world)
            assert low[0] < walk.state.min() < walk.state.max() < high[0]
    assert walk.integral.min() > 0.0


def test_later_flows_along_the_paths_are_worth_what_the_curve_says() -> None:
    rates = model()
    times, amounts = np.arange(6.1, 20.0, 0.37), np.linspace(1.0, -0.3, 38)
    walk = rates.walk(1.0, PATHS, generator(3))
    for _ in walk.run(6):
        pass
    worth = np.exp(-walk.integral) * rates.value_flows_at(6.0, times, amounts)(walk.state)
    expected = float(amounts @ rates.curve.discount(times))
    assert off(worth, expected) < 4.0
    # The same by the state prices, with no sampling: to rounding.
    later = rates.value_flows_at(6.0, times, amounts)
    assert rates.payoff_value(6.0, later) == pytest.approx(expected, rel=1e-11)
    assert later.error < 1e-12


def test_surfaces_of_several_nodes_at_once() -> None:
    rates = model()
    times = np.array([2.0, 2.0, 2.5, 3.03, 4.0, 9.99, 20.0])
    amounts = np.array([1.0, 2.0, -1.0, 4.0, 5.0, 6.0, 7.0])
    nodes = [4.0, 0.0, 2.0, 20.0, 2.0]
    found = rates.value_flows(nodes, times, amounts)
    assert len(found) == len(nodes)
    rate = np.array([[0.01, 0.03, 0.09]])
    for node, one in zip(nodes, found, strict=True):
        later = times >= node
        if node > 0.0:
            expected = amounts[later] @ rates.bond_price(node, times[later], rate)
            np.testing.assert_allclose(one(rate), expected, rtol=1e-11, atol=0.0)
    today = rates.walk(1.0, 1, generator()).state
    assert float(found[1](today)[0]) == pytest.approx(float(amounts @ rates.curve.discount(times)), rel=1e-12)
    # Nothing is due at all.
    assert rates.value_flows([], times, amounts) == []
    assert rates.value_flows_at(5.0, [], [])(rate).tolist() == [0.0, 0.0, 0.0]
    assert rates.value_flows_at(5.0, [1.0], [3.0])(rate).tolist() == [0.0, 0.0, 0.0]


def test_functions_write_where_they_are_told() -> None:
    later = model().value_flows_at(3.0, [8.0], [1.0])
    rate = np.exp(generator().uniform(-6.0, -2.0, (1, 30_001)))
    out = np.empty(30_001)
    assert later(rate, out) is out
    np.testing.assert_array_equal(out[[0, 15_000, 30_000]], later(rate[:, [0, 15_000, 30_000]]))
    assert (np.diff(out[np.argsort(rate[0])]) <= 0.0).all()


def test_without_volatility_rates_are_the_forwards() -> None:
    rates = model(volatility=0.0)
    walk = rates.walk(1.0, 3, generator())
    for _ in walk.run(7):
        pass
    curve = rates.curve
    np.testing.assert_allclose(walk.integral, -math.log(float(curve.discount(7.0))), rtol=1e-12)
    np.testing.assert_allclose(walk.state, float(curve.forward(7.0, 7.0)), rtol=1e-4)
    later = rates.value_flows_at(7.0, [12.0], [1.0])(walk.state)
    np.testing.assert_allclose(later, curve.discount(12.0) / curve.discount(7.0), rtol=1e-12)


def test_paths_in_pieces_and_in_longer_steps_are_the_same_bits() -> None:
    rates = model()
    whole, pieces, monthly = (rates.walk(step, 500, generator()) for step in (0.5, 0.5, 1.0 / 12.0))
    for _ in whole.run(10):
        pass
    for count in (3, 7):
        for _ in pieces.run(count):
            pass
    for _ in monthly.run(60):
        pass
    for other in (pieces, monthly):
        assert np.array_equal(whole.state, other.state)
        assert np.array_equal(whole.integral, other.integral)


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"mean_reversion": -0.1}, "`mean_reversion` must be"),
        ({"volatility": math.nan}, "`volatility` must be"),
        ({"risk_price": math.inf}, "`risk_price` must be"),
        ({"horizon": 0.0}, "`horizon` must be above 0"),
        ({"horizon": math.inf}, "`horizon` must be above 0"),
        ({"horizon": 1e300}, "too much to be worked out"),
        ({"horizon": 1e6}, "too much to be worked out"),
        ({"volatility": 1e6}, "too much to be worked out"),
        ({"risk_price": 1e6}, "too much to be worked out"),
        ({"steps_per_year": 0}, "`steps_per_year` must be at least 1"),
    ],
)
def test_parameters_out_of_range(changes: dict[str, float], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        model(**changes)


@pytest.mark.parametrize(
    ("curve", "place"),
    [
        (flat_curve(0.0), "from 0 to 0.0833333 years the curve's is 0.0000%"),
        (flat_curve(-0.01), "from 0 to"),
        (Curve([1.0, 2.0, 5.0], [0.03, 0.01, 0.03]), "from 1"),
    ],
)
def test_forward_rates_that_are_not_positive_are_named(curve: Curve, place: str) -> None:
    with pytest.raises(ValueError, match="needs forward rates above 0, but " + place):
        BlackKarasinskiRates(curve, mean_reversion=0.1, volatility=0.2, horizon=5.0)


def test_times_out_of_range() -> None:
    rates = model(horizon=5.0)
    with pytest.raises(ValueError, match="no node of the model: nodes are 12 a year up to its horizon of 5"):
        rates.value_flows_at(1.01, [3.0], [1.0])
    with pytest.raises(ValueError, match="no node"):
        rates.bond_price(6.0, 6.0, [[0.03]])
    with pytest.raises(ValueError, match="no node"):
        rates.bond_price(math.nan, 6.0, [[0.03]])
    for late in (5.01, math.nan):
        with pytest.raises(ValueError, match="after the model's horizon of 5 years"):
            rates.value_flows_at(1.0, [3.0, late], [1.0, 1.0])
    with pytest.raises(ValueError, match="`maturity` must not be before"):
        rates.bond_price(2.0, 1.0, [[0.03]])
    with pytest.raises(ValueError, match="rates above 0"):
        rates.bond_price(2.0, 3.0, [[0.0]])
    with pytest.raises(ValueError, match="one amount for each"):
        rates.value_flows_at(1.0, [3.0], [1.0, 2.0])
    with pytest.raises(ValueError, match="after today"):
        rates.payoff_value(0.0, lambda r: r[0])
    for step in (0.05, 0.0, -1.0, math.inf):
        with pytest.raises(ValueError, match="whole number of the model's steps, 12 a year"):
            rates.walk(step, 10, generator())
    with pytest.raises(ValueError, match="beyond the model's horizon"):
        next(iter(rates.walk(1.0, 10, generator()).run(6)))
