"""Assets and inflation beside rates: their joint law against quadrature, samples against the law."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from numpy.typing import NDArray

from desk.rates.black_karasinski import BlackKarasinskiRates
from desk.rates.correlation import joined_correlation
from desk.rates.gaussian import GaussianRates, RateFactor, gaussian_2, ho_lee, hull_white
from desk.rates.risky import RiskyMarket, total_return_index
from desk.rates.risky_inflation import InflationFactor
from desk.rates.square_root import SquareRootRates
from tests.rates.flat_curve import flat_curve, humped_curve

PATHS = 40_000

FloatArray = NDArray[np.float64]
Loading = Callable[[FloatArray], FloatArray]


def generator(seed: int = 1) -> np.random.Generator:
    return np.random.Generator(np.random.SFC64(np.random.SeedSequence(seed)))


def inflation(**changes: float) -> InflationFactor:
    stated = {"mean_reversion": 0.3, "volatility": 0.008, "risk_price": 0.05}
    return InflationFactor(flat_curve(0.02), **(stated | changes))


def two_factors() -> GaussianRates:
    return gaussian_2(
        humped_curve(),
        mean_reversion=0.5,
        volatility=0.01,
        second_mean_reversion=0.05,
        second_volatility=0.012,
        factor_correlation=-0.7,
        risk_price=0.1,
    )


def whole_market() -> RiskyMarket:
    rates = two_factors()
    correlation = joined_correlation(rates.correlation, np.eye(1), [0.4])
    assets = np.array([[1.0, 0.5, 0.2], [0.5, 1.0, 0.3], [0.2, 0.3, 1.0]])
    return RiskyMarket(
        rates,
        volatility=[0.2, 0.15, 0.1],
        premium=[0.03, 0.02, 0.01],
        inflation=inflation(),
        correlation=joined_correlation(correlation, assets, [0.1, 0.3, -0.2]),
    )


def markets() -> list[RiskyMarket]:
    return [
        whole_market(),
        RiskyMarket(
            ho_lee(humped_curve(), volatility=0.008),
            volatility=[0.2],
            inflation=inflation(mean_reversion=0.0),
            correlation=[[1.0, 0.5, -0.3], [0.5, 1.0, 0.2], [-0.3, 0.2, 1.0]],
        ),
        RiskyMarket(
            GaussianRates(flat_curve(0.03), [RateFactor(1e-9, 0.01), RateFactor(3.0, 0.02)]),
            volatility=[0.3, 0.0],
        ),
    ]


def integrands(market: RiskyMarket) -> tuple[list[list[Loading]], FloatArray]:
    """For every quantity of a step, its loading on each Brownian motion with s to go, written out plainly."""

    def decayed(speed: float, volatility: float) -> Loading:
        return lambda s: volatility * np.exp(-speed * s)

    def grown(speed: float, volatility: float) -> Loading:
        return lambda s: volatility * (s if speed == 0.0 else -np.expm1(-speed * s) / speed)

    def level(volatility: float) -> Loading:
        return lambda s: np.full_like(s, volatility)

    nothing = level(0.0)
    assert isinstance(market.rates, GaussianRates)
    count = len(market.correlation)
    rows: list[list[Loading]] = []
    total = [nothing] * count
    for place, factor in enumerate(market.rates.factors):
        row = [nothing] * count
        row[place] = decayed(factor.mean_reversion, factor.volatility)
        total[place] = grown(factor.mean_reversion, factor.volatility)
        rows.append(row)
    rows.append(total)
    place = len(market.rates.factors)
    if market.inflation is not None:
        for make in (decayed, grown):
            row = [nothing] * count
            row[place] = make(market.inflation.mean_reversion, market.inflation.volatility)
            rows.append(row)
        place += 1
    for number, volatility in enumerate(market.volatility.tolist()):
        row = [nothing] * count
        row[place + number] = level(volatility)
        rows.append(row)
    return rows, market.correlation


@pytest.mark.parametrize("market", markets())
@pytest.mark.parametrize("step", [1.0 / 12.0, 1.0, 10.0])
def test_covariance_of_a_step_by_quadrature(market: RiskyMarket, step: float) -> None:
    """Itô's isometry, integrated numerically over the loadings themselves."""
    rows, correlation = integrands(market)
    node, weight = np.polynomial.legendre.leggauss(60)
    s, w = 0.5 * step * (node + 1.0), 0.5 * step * weight
    loading = np.array([[one(s) for one in row] for row in rows])
    expected = np.einsum("iks,kl,jls,s->ij", loading, correlation, loading, w)
    _, covariance = market.step_law(step)
    scale = np.sqrt(np.maximum(np.outer(np.diag(expected), np.diag(expected)), 1e-300))
    np.testing.assert_allclose(covariance / scale, expected / scale, rtol=0.0, atol=1e-12)


@pytest.mark.parametrize("real_world", [False, True])
def test_the_walk_has_the_law_of_the_step(real_world: bool) -> None:
    """One step from time 0: every mean and covariance of the sample, in its own standard errors."""
    market = whole_market()
    walk = market.walk(2.0, PATHS, generator(), real_world=real_world)
    next(iter(walk.run(1)))
    drawn = np.vstack(
        [walk.state, walk.integral, walk.factors[2:], walk.inflation_integral, walk.excess],
    )
    shift, covariance = market.step_law(2.0, real_world=real_world)
    deviation = np.sqrt(np.diag(covariance))
    off = (drawn.mean(axis=1) - shift) / (deviation / np.sqrt(PATHS))
    assert np.abs(off).max() < 4.0
    size = np.outer(deviation, deviation)
    error = (np.cov(drawn) - covariance) / size
    # The variance of a sample covariance of normals is (1 + ρ²)/n in units of the variances.
    assert np.abs(error / np.sqrt((1.0 + (covariance / size) ** 2) / PATHS)).max() < 4.0


@pytest.mark.parametrize("market", markets())
@pytest.mark.parametrize("real_world", [False, True])
def test_rates_are_the_same_bits_as_alone(market: RiskyMarket, real_world: bool) -> None:
    beside = market.walk(0.25, 7001, generator(), real_world=real_world)
    alone = market.rates.walk(0.25, 7001, generator(), real_world=real_world)
    for _, _ in zip(beside.run(9), alone.run(9), strict=True):
        assert np.array_equal(beside.state, alone.state)
        assert np.array_equal(beside.integral, alone.integral)


def test_an_asset_put_after_the_others_changes_none() -> None:
    market = whole_market()
    fewer = RiskyMarket(
        market.rates,
        volatility=market.volatility[:2],
        inflation=market.inflation,
        correlation=market.correlation[:-1, :-1],
    )
    many, few = market.walk(1.0, 3000, generator()), fewer.walk(1.0, 3000, generator())
    for _, _ in zip(many.run(5), few.run(5), strict=True):
        np.testing.assert_allclose(many.excess[:2], few.excess, rtol=0.0, atol=1e-13)
        np.testing.assert_allclose(many.factors, few.factors, rtol=0.0, atol=1e-15)


def test_generators_may_be_given() -> None:
    market = whole_market()
    given = market.walk(1.0, 500, generator(), others=[generator(seed) for seed in (2, 3, 4, 5)])
    again = market.walk(1.0, 500, generator(), others=[generator(seed) for seed in (2, 3, 4, 5)])
    spawned = market.walk(1.0, 500, generator())
    for walk in (given, again, spawned):
        assert sum(1 for _ in walk.run(3)) == 3
    assert np.array_equal(given.excess, again.excess)
    assert not np.array_equal(given.excess, spawned.excess)
    with pytest.raises(ValueError, match="must hold 4 generators"):
        market.walk(1.0, 500, generator(), others=[generator()])


@pytest.mark.parametrize("real_world", [False, True])
def test_means_along_the_paths(real_world: bool) -> None:
    """Assets over the account, the log of assets and index, linked bonds seen from a node and from today."""
    market = whole_market()
    rates = market.rates
    assert isinstance(rates, GaussianRates)
    assert market.index is not None
    walk = market.walk(1.0, PATHS, generator(5), real_world=real_world)
    for _ in walk.run(10):
        pass
    account = walk.integral + rates.account_offset(10.0)
    log_index = walk.inflation_integral + market.index.offset(10.0)

    def off(sample: FloatArray, mean: float) -> float:
        return float(abs(sample.mean() - mean) / (sample.std() / np.sqrt(sample.size)))

    law = market.asset_law(10.0, real_world=real_world)
    assert law is not None
    over = market.mean_excess(10.0, real_world=real_world)
    for asset in range(3):
        assert off(np.exp(walk.excess[asset]), float(over[asset])) < 4.0
        log_asset = walk.excess[asset] + account
        assert off(log_asset, float(law[0][asset])) < 4.0
        assert float(log_asset.var()) == pytest.approx(float(law[1][asset]), rel=4.0 * np.sqrt(2.0 / PATHS))
    mean, variance = market.index.law(10.0, real_world=real_world)
    assert off(log_index, float(mean)) < 4.0
    assert float(log_index.var()) == pytest.approx(float(variance), rel=4.0 * np.sqrt(2.0 / PATHS))
    low, high = market.index.state_range(10.0, real_world=real_world)
    assert low < walk.factors[2].min() < walk.factors[2].max() < high
    if not real_world:
        level, exposure = market.linked_terms(10.0, 17.0, observed=16.5)
        ahead = np.exp(log_index - account + level - exposure @ walk.factors)
        today, _ = market.linked_terms(0.0, 17.0, observed=16.5)
        assert off(ahead, float(np.exp(today))) < 4.0


@pytest.mark.parametrize("market", markets()[:2])
def test_linked_bonds_meet_the_curve_of_expected_inflation(market: RiskyMarket) -> None:
    times = np.array([0.0, 0.01, 1.0, 7.5, 30.0, 60.0])
    level, exposure = market.linked_terms(0.0, times)
    np.testing.assert_allclose(
        np.exp(level), market.curve.discount(times) * np.exp(0.02 * times), rtol=1e-13, atol=0.0
    )
    assert exposure.shape == (6, market.rates.factor_count + 1)
    # An index already seen when the bond is bought is that of a plain bond.
    plain, rows = market.linked_terms(5.0, 9.0, observed=5.0)
    assert isinstance(market.rates, GaussianRates)
    expected, own = market.rates.bond_terms(5.0, 9.0)
    np.testing.assert_allclose(plain, expected, rtol=0.0, atol=1e-15)
    np.testing.assert_array_equal(rows, [*own, 0.0])


def test_linked_bonds_are_consistent_in_time() -> None:
    """``E[e^{-∫r} I(t)/I(0) · value at t] = value today``, the mean taken by the normal law over one step."""
    market = whole_market()
    rates, index = market.rates, market.index
    assert isinstance(rates, GaussianRates)
    assert index is not None
    for time, seen, maturity in ((1.0, 4.0, 4.0), (3.0, 10.0, 10.25), (8.0, 8.5, 9.5)):
        level, exposure = market.linked_terms(time, maturity, observed=seen)
        # dimensions: two rate factors, ∫Σx, inflation factor, ∫x, three assets
        weight = np.array([-exposure[0], -exposure[1], -1.0, -exposure[2], 1.0, 0.0, 0.0, 0.0])
        _, covariance = market.step_law(time)
        mean = float(level) - float(rates.account_offset(time)) + float(index.offset(time))
        value = mean + 0.5 * float(weight @ covariance @ weight)
        assert value == pytest.approx(float(market.linked_terms(0.0, maturity, observed=seen)[0]), abs=1e-13)


@pytest.mark.parametrize("market", markets()[:2])
@pytest.mark.parametrize("times", [(0.0, 4.0, 5.0, 5.0), (2.0, 4.0, 5.0, 9.5), (3.0, 3.0, 7.0, 8.0)])
def test_increases_of_the_index_by_quadrature(
    market: RiskyMarket, times: tuple[float, float, float, float]
) -> None:
    """Variance of the increase and its covariance with ``∫r`` until it is paid, over plain loadings."""
    index, rates = market.index, market.rates
    assert index is not None
    assert market.inflation is not None
    assert isinstance(rates, GaussianRates)
    time, start, end, maturity = times
    speed, volatility = market.inflation.mean_reversion, market.inflation.volatility

    def grown(reversion: float, remaining: FloatArray) -> FloatArray:
        left = np.maximum(remaining, 0.0)
        return left if reversion == 0.0 else np.asarray(-np.expm1(-reversion * left) / reversion)

    variance = covariance = 0.0
    node, weight = np.polynomial.legendre.leggauss(60)
    for low, high in ((time, start), (start, end), (end, maturity)):
        u, w = low + 0.5 * (high - low) * (node + 1.0), 0.5 * (high - low) * weight
        own = volatility * (grown(speed, end - u) - grown(speed, start - u))
        variance += float(w @ own**2)
        for place, factor in enumerate(rates.factors):
            other = factor.volatility * grown(factor.mean_reversion, maturity - u)
            covariance += float(market.correlation[place, rates.factor_count] * (w @ (own * other)))
    level, exposure, found = index.increase_law(*times)
    assert float(found) == pytest.approx(variance, rel=1e-12)
    expected = float(index.offset(end) - index.offset(start)) + 0.5 * variance - covariance
    assert float(level) == pytest.approx(expected, abs=1e-14)
    rise = 1e-4
    moved = rise * float(grown(speed, np.array(end - time)) - grown(speed, np.array(start - time)))
    assert -float(exposure) * rise == pytest.approx(moved, rel=1e-12)
    if start == time:
        growth, own_exposure = index.growth_terms(time, maturity, end)
        assert float(level) == pytest.approx(float(growth), abs=1e-15)
        assert float(exposure) == pytest.approx(float(own_exposure), abs=1e-15)
    with pytest.raises(ValueError, match="must rise"):
        index.increase_law(time, end, start, maturity)


def test_the_inflation_of_the_moment_integrates_to_the_index() -> None:
    market = whole_market()
    assert market.index is not None
    node, weight = np.polynomial.legendre.leggauss(40)
    total = 6.0 * float(market.index.rate_offset(6.0 * (node + 1.0)) @ weight)
    assert total == pytest.approx(float(market.index.offset(12.0)), abs=1e-14)


@pytest.mark.parametrize("sign", [-1.0, 1.0])
def test_perfect_correlation(sign: float) -> None:
    """Two assets and the rates on one Brownian motion: nothing new is drawn for the assets."""
    line = np.array([1.0, sign, 1.0])
    market = RiskyMarket(
        ho_lee(flat_curve(0.02), volatility=0.01), volatility=[0.2, 0.1], correlation=np.outer(line, line)
    )
    walk = market.walk(0.5, 2000, generator())
    for _ in walk.run(6):
        pass
    drift = -0.5 * market.volatility**2 * 3.0
    one, two = ((walk.excess - drift[:, None]) / market.volatility[:, None]).tolist()
    np.testing.assert_allclose(one, sign * np.array(two), rtol=0.0, atol=1e-7)
    np.testing.assert_allclose(two, walk.state[0] / 0.01, rtol=0.0, atol=1e-7)


@pytest.mark.parametrize(
    "rates",
    [
        SquareRootRates(mean_reversion=0.2, long_run_rate=0.04, volatility=0.06, starting_rate=0.03),
        BlackKarasinskiRates(humped_curve(), mean_reversion=0.1, volatility=0.2, horizon=6.0),
    ],
)
def test_other_rates_stand_beside_independent_assets(rates: SquareRootRates | BlackKarasinskiRates) -> None:
    market = RiskyMarket(rates, volatility=[0.2, 0.1], inflation=inflation())
    assert market.index is not None
    walk, alone = market.walk(0.25, PATHS, generator()), rates.walk(0.25, PATHS, generator())
    for _, _ in zip(walk.run(20), alone.run(20), strict=True):
        pass
    assert np.array_equal(walk.state, alone.state)
    assert np.array_equal(walk.factors[0], alone.state[0])
    assert np.array_equal(walk.integral, alone.integral)
    linked = np.exp(walk.inflation_integral + market.index.offset(5.0) - walk.integral)
    expected = float(rates.curve.discount(5.0)) * np.exp(0.02 * 5.0)
    assert abs(float(linked.mean()) - expected) < 4.0 * float(linked.std()) / np.sqrt(PATHS)
    over = np.exp(walk.excess)
    assert (np.abs(over.mean(axis=1) - 1.0) < 4.0 * over.std(axis=1) / np.sqrt(PATHS)).all()
    assert market.asset_law(5.0) is None
    with pytest.raises(ValueError, match="Gaussian rates only"):
        market.forward_volatility(5.0)
    with pytest.raises(ValueError, match="must be 0 for this rate model"):
        RiskyMarket(rates, volatility=[0.2], correlation=[[1.0, 0.1], [0.1, 1.0]])


def test_linked_bonds_with_other_rates() -> None:
    rates = SquareRootRates(mean_reversion=0.2, long_run_rate=0.04, volatility=0.06, starting_rate=0.03)
    market = RiskyMarket(rates, inflation=inflation())
    level, exposure = market.linked_terms(0.0, 8.0)
    value = float(level) - float(exposure[0]) * rates.starting_rate
    assert value == pytest.approx(float(np.log(rates.curve.discount(8.0))) + 0.16, abs=1e-14)
    lognormal = BlackKarasinskiRates(flat_curve(0.03), mean_reversion=0.1, volatility=0.2, horizon=2.0)
    with pytest.raises(ValueError, match="no exponential form"):
        RiskyMarket(lognormal, inflation=inflation()).linked_terms(0.0, 1.0)


def test_nothing_beside_the_rates() -> None:
    rates = hull_white(flat_curve(0.03), mean_reversion=0.1, volatility=0.01)
    walk = RiskyMarket(rates).walk(1.0, 10, generator())
    assert sum(1 for _ in walk.run(3)) == 3
    assert walk.excess.shape == (0, 10)
    assert walk.factors.shape == (1, 10)


def test_bad_input() -> None:
    rates = two_factors()
    for settings, message in (
        ({"volatility": [-0.1]}, "`volatility` must be at least 0"),
        ({"volatility": [np.nan]}, "`volatility` must hold one number"),
        ({"volatility": [0.1], "premium": [0.1, 0.2]}, "`premium` must hold one number for each of the 1"),
        ({"volatility": [0.1], "correlation": np.eye(2)}, "must be 3 by 3: 2 rate factor"),
        ({"volatility": [0.1], "correlation": np.eye(3)}, "must repeat the rate model's own"),
        (
            {"volatility": [0.1], "correlation": [[1.0, -0.7, 0.9], [-0.7, 1.0, 0.9], [0.9, 0.9, 1.0]]},
            "negative eigenvalue",
        ),
    ):
        with pytest.raises(ValueError, match=message):
            RiskyMarket(rates, **settings)
    with pytest.raises(ValueError, match="no inflation"):
        RiskyMarket(rates).linked_terms(0.0, 1.0)
    with pytest.raises(ValueError, match="between `time` and `maturity`"):
        whole_market().linked_terms(2.0, 3.0, observed=1.0)
    with pytest.raises(ValueError, match="`mean_reversion` must be"):
        inflation(mean_reversion=-0.1)
    with pytest.raises(ValueError, match="`time` must be above 0"):
        whole_market().forward_volatility(0.0)
    with pytest.raises(ValueError, match="one amount for each step"):
        total_return_index([1.0, 2.0], [0.1, 0.1])
    with pytest.raises(ValueError, match="`price` must be above 0"):
        total_return_index([1.0, 0.0], [0.1])
