"""Square-root models against a general-purpose library and their own laws."""

from __future__ import annotations

import math

import numpy as np
import pytest
import QuantLib as ql

from desk.rates.limits import first_integral
from desk.rates.square_root import SquareRootRates, integral_cumulants
from tests.rates.flat_curve import humped_curve

SETS = 200
MONTH = 1.0 / 12.0


def model(
    *,
    mean_reversion: float = 0.2,
    long_run_rate: float = 0.04,
    volatility: float = 0.08,
    starting_rate: float = 0.03,
    risk_price: float = 0.5,
) -> SquareRootRates:
    return SquareRootRates(
        mean_reversion=mean_reversion,
        long_run_rate=long_run_rate,
        volatility=volatility,
        starting_rate=starting_rate,
        risk_price=risk_price,
    )


def test_bonds_and_options_against_the_library() -> None:
    rng = np.random.default_rng(4)
    for _ in range(SETS):
        speed, level, start = rng.uniform(0.02, 2.0), rng.uniform(0.005, 0.1), rng.uniform(0.001, 0.1)
        # The library wants Feller's condition to hold.
        volatility = rng.uniform(0.1, 0.99) * math.sqrt(2.0 * speed * level)
        ours = SquareRootRates(
            mean_reversion=speed, long_run_rate=level, volatility=volatility, starting_rate=start
        )
        oracle = ql.CoxIngersollRoss(start, level, speed, volatility)
        time, rest, rate = rng.uniform(0.1, 10.0), rng.uniform(0.1, 30.0), rng.uniform(0.0, 0.2)
        assert float(ours.bond_price(time, time + rest, [rate])) == pytest.approx(
            oracle.discountBond(time, time + rest, rate), rel=1e-11
        )
        strike = float(ours.curve.discount(time + rest) / ours.curve.discount(time)) * rng.uniform(0.9, 1.02)
        for call, kind in ((True, ql.Option.Call), (False, ql.Option.Put)):
            # The library's noncentral chi-square law is good to about eight digits.
            assert ours.bond_option(time, time + rest, strike, call=call) == pytest.approx(
                oracle.discountBondOption(kind, strike, time, time + rest), rel=1e-6, abs=1e-8
            )


def test_shifted_to_a_curve_it_is_the_curve() -> None:
    curve = humped_curve()
    shifted = SquareRootRates(
        mean_reversion=0.2, long_run_rate=0.04, volatility=0.08, starting_rate=0.01, curve=curve
    )
    times = np.array([0.0, 0.5, 3.0, 30.0, 100.0])
    level, exposure = shifted.bond_terms(0.0, times)
    assert np.exp(level - exposure[:, 0] * 0.01) == pytest.approx(curve.discount(times), rel=1e-13)
    assert shifted.mean_discount(times) == pytest.approx(curve.discount(times), rel=1e-13)
    near = -math.log(float(shifted.bond_price(5.0, 5.0 + 1e-6, [0.02]))) / 1e-6
    assert near == pytest.approx(float(shifted.rate_offset(5.0)) + 0.02, abs=1e-8)


def test_a_vanishing_volatility_is_no_volatility() -> None:
    still, calm = model(volatility=0.0), model(volatility=1e-9)
    times = np.array([0.1, 1.0, 10.0, 50.0])
    sure = np.exp(-0.04 * times - (0.03 - 0.04) * first_integral(0.2, times))
    assert still.curve.discount(times) == pytest.approx(sure, rel=1e-14)
    assert calm.curve.discount(times) == pytest.approx(sure, rel=1e-14)
    for one in (still, calm):
        walk = one.walk(1.0, 5, np.random.default_rng(1))
        for _ in walk.run(10):
            pass
        assert np.exp(-walk.integral) == pytest.approx(np.full(5, sure[2]), rel=1e-7)
    unmoved = model(mean_reversion=0.0, volatility=0.0)
    assert float(unmoved.curve.discount(10.0)) == pytest.approx(math.exp(-0.3), rel=1e-15)


@pytest.mark.parametrize("real_world", [False, True])
@pytest.mark.parametrize("steps_per_year", [1, 12])
@pytest.mark.parametrize(
    "changes",
    [
        {},
        {"mean_reversion": 0.01, "volatility": 0.1},  # Feller's condition fails: 0 is reached
        {"mean_reversion": 0.5, "long_run_rate": 0.0},  # no degrees of freedom: 0 is kept
        {"risk_price": 4.0},  # reversion away from the mean under the real-world measure
        {"starting_rate": 0.0},
    ],
)
def test_drawn_paths_have_the_closed_form_moments(
    changes: dict[str, float], steps_per_year: int, real_world: bool
) -> None:
    paths, years = 20_000, 4
    one = model(**changes)
    walk = one.walk(1.0 / steps_per_year, paths, np.random.default_rng(5), real_world=real_world)
    for _ in walk.run(years * steps_per_year):
        pass
    x, y = walk.state[0], walk.integral
    mean, total = (
        one.factor_mean(years, real_world=real_world),
        one.integral_mean(years, real_world=real_world),
    )
    for sample, expected in (
        (x, mean),
        (y, total),
        ((x - mean) ** 2, one.factor_variance(years, real_world=real_world)),
        ((y - total) ** 2, one.integral_variance(years, real_world=real_world)),
        (np.exp(-y), one.mean_discount(years, real_world=real_world)),
    ):
        assert abs(sample.mean() - float(expected)) / sample.std() * math.sqrt(paths) < 4.5
    assert x.min() >= 0.0
    assert y.min() >= 0.0
    low, high = one.state_range(years, real_world=real_world)
    assert low[0] == 0.0
    assert x.max() < high[0]


def test_third_moment_of_the_rate() -> None:
    """κ₃ of ``c χ'²(d, λ)`` is ``8c³(d + 3λ)``: Johnson, Kotz and Balakrishnan (1995), Continuous Univariate
    Distributions 2, section 29.4."""
    one, paths, time = model(), 200_000, 2.0
    walk = one.walk(time, paths, np.random.default_rng(8))
    for _ in walk.run(1):
        pass
    scale = 0.25 * 0.08**2 * float(first_integral(0.2, time))
    freedom, distance = 4.0 * 0.2 * 0.04 / 0.08**2, 0.03 * math.exp(-0.2 * time) / scale
    cubes = (walk.state[0] - one.factor_mean(time)) ** 3
    exact = 8.0 * scale**3 * (freedom + 3.0 * distance)
    assert abs(cubes.mean() - exact) / cubes.std() * math.sqrt(paths) < 4.5


@pytest.mark.parametrize("speed", [0.0, 1e-6, 0.1, 2.0, -0.3])
def test_cumulants_of_the_integral_from_its_laplace_transform(speed: float) -> None:
    """Against differences of the transform of Glasserman and Kim (2011), lemma 2.4, in its printed form."""
    volatility, step = 0.1, 0.5

    def log_transform(b: float) -> tuple[float, float]:
        root = math.sqrt(2.0 * volatility**2 * b + speed**2) or 1e-9
        half = 0.5 * root * step
        return root / math.tanh(half) / volatility**2, math.log(math.sinh(half) / half)

    width = 1.0
    ends, counts = integral_cumulants(speed, volatility, step)
    points = [log_transform(index * width) for index in range(7)]
    # Forward differences of order six for the first and second derivative at 0.
    first = np.array([-147.0, 360.0, -450.0, 400.0, -225.0, 72.0, -10.0]) / 60.0
    second = np.array([812.0, -3132.0, 5265.0, -5080.0, 2970.0, -972.0, 137.0]) / 180.0
    for column, (mean, variance) in enumerate((ends, counts)):
        values = np.array([point[column] for point in points])
        assert mean == pytest.approx(float(first @ values), rel=1e-6)
        assert variance == pytest.approx(-float(second @ values), rel=2e-3)


@pytest.mark.parametrize("volatility", [0.05, 0.1, 0.2])
@pytest.mark.parametrize("start", [0.001, 0.02, 0.05, 0.15])
def test_bias_of_the_integral_over_a_month_and_a_year(start: float, volatility: float) -> None:
    """The expectation of ``exp(-∫x)`` given both ends and N is known both exactly and for the gamma number
    drawn in its place; their mean difference over many ends is the bias of a step."""
    one = SquareRootRates(mean_reversion=0.1, long_run_rate=0.05, volatility=volatility, starting_rate=start)
    assert abs(_bias(one, MONTH)) < 1e-12
    assert abs(_bias(one, 1.0)) < 1e-7
    # Forty years of months, against the standard error of a million paths.
    spread = math.sqrt(float(one.integral_variance(40.0))) * float(one.curve.discount(40.0))
    assert 480 * abs(_bias(one, MONTH)) < 1e-3 * spread / math.sqrt(1e6)


def _bias(one: SquareRootRates, step: float) -> float:
    speed, volatility = one.mean_reversion, one.volatility
    (end_mean, end_variance), (count_mean, count_variance) = integral_cumulants(speed, volatility, step)
    rng = np.random.default_rng(6)
    scale = 0.5 * volatility**2 * float(first_integral(speed, step))
    half_freedom = 2.0 * one.pull / volatility**2
    count = rng.poisson(one.starting_rate * math.exp(-speed * step) / scale, 50_000)
    ends = one.starting_rate + scale * rng.standard_gamma(half_freedom + count)
    number = half_freedom + 2.0 * count
    mean = end_mean * ends + count_mean * number
    variance = end_variance * ends + count_variance * number
    drawn = -(mean**2 / variance) * np.log1p(variance / mean)
    root = math.hypot(speed, math.sqrt(2.0) * volatility)
    before, after = 0.5 * speed * step, 0.5 * root * step
    slope = root / math.tanh(after) - speed / math.tanh(before)
    shape = math.log(math.sinh(after) / after) - math.log(math.sinh(before) / before)
    exact = -ends / volatility**2 * slope - number * shape
    return float(np.mean(np.expm1(drawn - exact)))


def test_feller_and_the_measure() -> None:
    assert model().stays_positive
    assert not model(volatility=0.2).stays_positive
    assert model().speed() == 0.2
    assert model().speed(real_world=True) == pytest.approx(0.2 - 0.08 * 0.5)
    assert model().account_law(1.0) is None


@pytest.mark.parametrize("name", ["mean_reversion", "long_run_rate", "volatility", "starting_rate"])
def test_what_is_no_model_is_refused(name: str) -> None:
    with pytest.raises(ValueError, match=name):
        model(**{name: -0.01})
    with pytest.raises(ValueError, match="risk_price"):
        model(risk_price=math.inf)
    with pytest.raises(ValueError, match="`maturity`"):
        model().bond_terms(2.0, 1.0)
