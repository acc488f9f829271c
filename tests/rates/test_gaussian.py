"""Gaussian short-rate models against a general-purpose library, their own laws, and a plain loop."""

from __future__ import annotations

import math

import numpy as np
import pytest
import QuantLib as ql

from desk.rates.gaussian import GaussianRates, RateFactor, gaussian_2, ho_lee, hull_white, vasicek
from tests.rates.flat_curve import flat_curve, humped_curve

SETS = 200


def two_factors(**changes: float) -> GaussianRates:
    settings = {
        "mean_reversion": 0.5,
        "volatility": 0.012,
        "second_mean_reversion": 0.05,
        "second_volatility": 0.009,
        "factor_correlation": -0.7,
        "risk_price": 0.2,
    }
    return gaussian_2(humped_curve(), **(settings | changes))


def all_models() -> list[GaussianRates]:
    return [
        vasicek(
            mean_reversion=0.15, long_run_rate=0.04, volatility=0.012, starting_rate=-0.005, risk_price=0.3
        ),
        ho_lee(humped_curve(), volatility=0.008, risk_price=-0.1),
        hull_white(humped_curve(), mean_reversion=0.07, volatility=0.011, risk_price=0.15),
        two_factors(),
        GaussianRates(
            humped_curve(),
            [RateFactor(0.9, 0.01), RateFactor(0.2, 0.008, 0.1), RateFactor(0.0, 0.004, -0.2)],
            [[1.0, 0.3, -0.2], [0.3, 1.0, 0.1], [-0.2, 0.1, 1.0]],
        ),
    ]


def test_vasicek_against_the_library() -> None:
    rng = np.random.default_rng(1)
    for _ in range(SETS):
        speed, level, start = rng.uniform(0.01, 2.0), rng.uniform(-0.02, 0.1), rng.uniform(-0.02, 0.1)
        volatility = rng.uniform(0.001, 0.04)
        ours = vasicek(mean_reversion=speed, long_run_rate=level, volatility=volatility, starting_rate=start)
        oracle = ql.Vasicek(start, speed, level, volatility, 0.0)
        time, rest, rate = rng.uniform(0.1, 10.0), rng.uniform(0.1, 30.0), rng.normal(0.03, 0.03)
        state = [rate - float(ours.rate_offset(time))]
        assert float(ours.bond_price(time, time + rest, state)) == pytest.approx(
            oracle.discountBond(time, time + rest, rate), rel=1e-10
        )
        strike = float(ours.curve.discount(time + rest) / ours.curve.discount(time)) * rng.uniform(0.9, 1.1)
        for call, kind in ((True, ql.Option.Call), (False, ql.Option.Put)):
            assert ours.bond_option(time, time + rest, strike, call=call) == pytest.approx(
                oracle.discountBondOption(kind, strike, time, time + rest), rel=1e-8, abs=1e-12
            )


def test_hull_white_against_the_library() -> None:
    rng = np.random.default_rng(2)
    today = ql.Date(1, 1, 2026)
    ql.Settings.instance().evaluationDate = today
    for _ in range(SETS):
        flat, speed, volatility = rng.uniform(-0.01, 0.08), rng.uniform(0.001, 1.0), rng.uniform(0.001, 0.03)
        handle = ql.YieldTermStructureHandle(ql.FlatForward(today, flat, ql.Actual365Fixed()))
        oracle = ql.HullWhite(handle, speed, volatility)
        ours = hull_white(flat_curve(flat), mean_reversion=speed, volatility=volatility)
        time, rest, rate = rng.uniform(0.1, 10.0), rng.uniform(0.1, 30.0), rng.normal(flat, 0.02)
        state = [rate - float(ours.rate_offset(time))]
        # The library takes the forward rate at a node from a small difference of its curve.
        assert float(ours.bond_price(time, time + rest, state)) == pytest.approx(
            oracle.discountBond(time, time + rest, rate), rel=1e-7
        )
        strike = math.exp(-flat * rest) * rng.uniform(0.9, 1.1)
        for call, kind in ((True, ql.Option.Call), (False, ql.Option.Put)):
            assert ours.bond_option(time, time + rest, strike, call=call) == pytest.approx(
                oracle.discountBondOption(kind, strike, time, time + rest), rel=1e-8, abs=1e-12
            )


def test_two_factors_against_the_library() -> None:
    rng = np.random.default_rng(3)
    today = ql.Date(1, 1, 2026)
    ql.Settings.instance().evaluationDate = today
    for _ in range(SETS):
        flat = rng.uniform(0.0, 0.08)
        a, sigma, b, eta = (
            rng.uniform(0.05, 1.5),
            rng.uniform(0.002, 0.03),
            rng.uniform(0.01, 0.5),
            rng.uniform(0.002, 0.02),
        )
        rho = rng.uniform(-0.99, 0.99)
        handle = ql.YieldTermStructureHandle(ql.FlatForward(today, flat, ql.Actual365Fixed()))
        oracle = ql.G2(handle, a, sigma, b, eta, rho)
        ours = gaussian_2(
            flat_curve(flat),
            mean_reversion=a,
            volatility=sigma,
            second_mean_reversion=b,
            second_volatility=eta,
            factor_correlation=rho,
        )
        time, rest = rng.uniform(0.1, 10.0), rng.uniform(0.1, 20.0)
        state = rng.normal(0.0, 0.02, 2)
        assert float(ours.bond_price(time, time + rest, state)) == pytest.approx(
            oracle.discountBond(time, time + rest, ql.Array(state.tolist())), rel=1e-9
        )
        strike = math.exp(-flat * rest) * rng.uniform(0.9, 1.1)
        for call, kind in ((True, ql.Option.Call), (False, ql.Option.Put)):
            assert ours.bond_option(time, time + rest, strike, call=call) == pytest.approx(
                oracle.discountBondOption(kind, strike, time, time + rest), rel=1e-8, abs=1e-12
            )


@pytest.mark.parametrize("model", all_models())
def test_bonds_of_today_are_the_curve(model: GaussianRates) -> None:
    times = np.array([0.0, 0.3, 1.0, 7.0, 40.0, 120.0])
    level, exposure = model.bond_terms(0.0, times)
    assert np.exp(level) == pytest.approx(model.curve.discount(times), rel=1e-13)
    assert exposure.shape == (6, model.factor_count)
    assert float(model.rate_offset(0.0)) == pytest.approx(float(model.curve.forward(0.0, 0.0)), abs=1e-15)


@pytest.mark.parametrize("model", all_models())
def test_the_rate_is_the_limit_of_short_bonds(model: GaussianRates) -> None:
    state = np.full(model.factor_count, 0.004)
    near = -math.log(float(model.bond_price(5.0, 5.0 + 1e-6, state))) / 1e-6
    assert near == pytest.approx(float(model.rate_offset(5.0)) + float(state.sum()), abs=1e-8)


@pytest.mark.parametrize("real_world", [False, True])
@pytest.mark.parametrize("model", all_models())
def test_a_year_in_one_step_has_the_law_of_twelve(model: GaussianRates, real_world: bool) -> None:
    """The steps compose: the law of a year is that of twelve months one after another."""
    count = model.factor_count
    shift, covariance = model.step_law(1.0, real_world=real_world)
    month_shift, month_covariance = model.step_law(1.0 / 12.0, real_world=real_world)
    months = np.eye(count + 1)
    for index, factor in enumerate(model.factors):
        a = factor.mean_reversion
        months[index, index] = math.exp(-a / 12.0)
        months[count, index] = (1.0 - math.exp(-a / 12.0)) / a if a else 1.0 / 12.0
    total_shift, total = np.zeros(count + 1), np.zeros((count + 1, count + 1))
    for _ in range(12):
        total_shift = months @ total_shift + month_shift
        total = months @ total @ months.T + month_covariance
    assert total == pytest.approx(covariance, rel=1e-11, abs=1e-20)
    assert total_shift == pytest.approx(shift, rel=1e-12, abs=1e-18)
    assert covariance[count, count] == pytest.approx(float(model.account_variance(1.0)), rel=1e-13)


@pytest.mark.parametrize("real_world", [False, True])
@pytest.mark.parametrize("model", all_models())
@pytest.mark.parametrize("steps_per_year", [1, 12])
def test_drawn_paths_have_the_closed_form_moments(
    model: GaussianRates, steps_per_year: int, real_world: bool
) -> None:
    paths, years = 20_000, 5
    walk = model.walk(1.0 / steps_per_year, paths, np.random.default_rng(7), real_world=real_world)
    for _ in walk.run(years * steps_per_year):
        pass
    mean, variance = model.account_law(years, real_world=real_world)
    account = walk.integral + model.account_offset(years)
    rate = walk.state.sum(axis=0)
    expected = float(model.factor_mean(years, real_world=real_world).sum())
    root = math.sqrt(paths)
    assert abs(account.mean() - mean) / math.sqrt(variance) * root < 4.5
    assert abs(account.var() / variance - 1.0) * math.sqrt(paths / 2.0) < 4.5
    spread = float(model.rate_variance(years))
    assert abs(rate.mean() - expected) / math.sqrt(spread) * root < 4.5
    assert abs(rate.var() / spread - 1.0) * math.sqrt(paths / 2.0) < 4.5
    discounts = np.exp(-account)
    exact = float(model.mean_discount(years, real_world=real_world))
    assert abs(discounts.mean() - exact) / discounts.std() * root < 4.5


@pytest.mark.parametrize("model", [two_factors(), two_factors(factor_correlation=1.0)])
def test_a_plain_loop_with_the_same_normals(model: GaussianRates) -> None:
    """One path at a time, one number at a time, from the covariance by numpy's own Cholesky or roots."""
    size, steps, step = 4, 6, 0.25
    walk = model.walk(step, size, np.random.default_rng(11), real_world=True)
    for _ in walk.run(steps):
        pass
    shift, covariance = model.step_law(step, real_world=True)
    root = np.linalg.cholesky(covariance + np.diag([0.0, 1e-22, 0.0]))
    normals = np.random.default_rng(11).standard_normal((steps, 3, size))
    for path in range(size):
        x, y, total = 0.0, 0.0, 0.0
        for number in range(steps):
            noise = [
                shift[row]
                + sum(root[row, column] * normals[number, column, path] for column in range(row + 1))
                for row in range(3)
            ]
            for value, factor in ((x, model.factors[0]), (y, model.factors[1])):
                a = factor.mean_reversion
                total += (1.0 - math.exp(-a * step)) / a * value
            total += noise[2]
            x = math.exp(-model.factors[0].mean_reversion * step) * x + noise[0]
            y = math.exp(-model.factors[1].mean_reversion * step) * y + noise[1]
        assert walk.state[:, path] == pytest.approx([x, y], abs=2e-9)
        assert walk.integral[path] == pytest.approx(total, abs=2e-9)


def test_factors_that_cancel_leave_the_curve() -> None:
    model = two_factors(
        mean_reversion=0.1, volatility=0.01, second_mean_reversion=0.1, second_volatility=0.01
    )
    still = two_factors(
        mean_reversion=0.1,
        volatility=0.01,
        second_mean_reversion=0.1,
        second_volatility=0.01,
        factor_correlation=-1.0,
        risk_price=0.0,
    )
    assert float(model.account_variance(10.0)) > 0.0
    assert float(still.account_variance(10.0)) == pytest.approx(0.0, abs=1e-18)
    walk = still.walk(1.0, 50, np.random.default_rng(1))
    for _ in walk.run(10):
        pass
    assert np.abs(walk.integral).max() < 1e-12


def test_no_volatility_follows_the_forwards() -> None:
    model = hull_white(humped_curve(), mean_reversion=0.1, volatility=0.0)
    assert model.bond_option(1.0, 5.0, 0.8) == pytest.approx(
        float(model.curve.discount(5.0) - 0.8 * model.curve.discount(1.0)), rel=1e-14
    )
    assert model.bond_option(1.0, 5.0, 0.8, call=False) == 0.0


@pytest.mark.parametrize(
    ("factors", "correlation", "message"),
    [
        ([], None, "at least one factor"),
        ([RateFactor(0.1, 0.01)] * 2, [[1.0]], "2 by 2"),
        ([RateFactor(0.1, 0.01)] * 2, [[1.0, 0.5], [0.4, 1.0]], "symmetric"),
        ([RateFactor(0.1, 0.01)] * 2, [[1.0, 1.5], [1.5, 1.0]], "between -1 and 1"),
        (
            [RateFactor(0.1, 0.01)] * 3,
            [[1.0, 0.9, -0.9], [0.9, 1.0, 0.9], [-0.9, 0.9, 1.0]],
            "negative eigenvalue",
        ),
    ],
)
def test_what_is_no_model_is_refused(
    factors: list[RateFactor], correlation: list[list[float]] | None, message: str
) -> None:
    with pytest.raises(ValueError, match=message):
        GaussianRates(flat_curve(0.02), factors, correlation)


@pytest.mark.parametrize("name", ["mean_reversion", "volatility", "risk_price"])
def test_what_is_no_factor_is_refused(name: str) -> None:
    settings = {"mean_reversion": 0.1, "volatility": 0.01, "risk_price": 0.0}
    with pytest.raises(ValueError, match=name):
        RateFactor(**(settings | {name: math.nan}))


def test_what_is_no_bond_is_refused() -> None:
    model = ho_lee(flat_curve(0.02), volatility=0.01)
    with pytest.raises(ValueError, match="`maturity`"):
        model.bond_terms(2.0, 1.0)
    with pytest.raises(ValueError, match="`expiry`"):
        model.bond_option(2.0, 1.0, 1.0)
    with pytest.raises(ValueError, match="`strike`"):
        model.bond_option(1.0, 2.0, 0.0)
