"""Short-rate models against published values and closed forms."""

from __future__ import annotations

import math

import numpy as np
import pytest

from desk.rates.gaussian import GaussianRates, gaussian_2, hull_white, vasicek
from desk.rates.limits import first_integral
from desk.rates.square_root import SquareRootRates
from tests.rates.flat_curve import flat_curve


def test_ten_year_bond_in_two_models() -> None:
    """Hull, J.C., Options, Futures, and Other Derivatives, chapter on short-rate models, problem comparing
    Vasicek and square-root with equal initial volatility; printed answers from memory, recomputed."""
    gaussian = vasicek(mean_reversion=0.1, long_run_rate=0.1, volatility=0.02, starting_rate=0.1)
    square_root = SquareRootRates(
        mean_reversion=0.1, long_run_rate=0.1, volatility=0.02 / math.sqrt(0.1), starting_rate=0.1
    )
    assert float(gaussian.curve.discount(10.0)) == pytest.approx(0.38046, abs=5e-6)
    assert float(square_root.curve.discount(10.0)) == pytest.approx(0.37986, abs=5e-6)


def test_vasicek_options_on_a_zero_bond() -> None:
    """Hull, same chapter, problem with a one-year option on a three-year zero bond at 87; answers from
    memory, recomputed."""
    model = vasicek(mean_reversion=0.1, long_run_rate=0.08, volatility=0.015, starting_rate=0.05)
    assert 100.0 * model.bond_option(1.0, 3.0, 0.87) == pytest.approx(2.59, abs=0.005)
    assert 100.0 * model.bond_option(1.0, 3.0, 0.87, call=False) == pytest.approx(0.14, abs=0.005)


def test_square_root_bond_where_zero_is_reached() -> None:
    """Ødegaard, B.A., Financial Numerical Recipes in C++ (2003-2014), term structure models; printed discount
    factor and yields, inputs from memory, fixed by the exact match."""
    curve = SquareRootRates(mean_reversion=0.01, long_run_rate=0.08, volatility=0.1, starting_rate=0.05).curve
    assert float(curve.discount(1.0)) == pytest.approx(0.951166, abs=5e-7)
    assert float(curve.zero(1.0)) == pytest.approx(0.0500668, abs=5e-8)
    assert float(curve.forward(1.0, 2.0)) == pytest.approx(0.0498756, abs=5e-8)


@pytest.mark.parametrize("speed", [0.0, 1e-12, 1e-300])
def test_vanishing_mean_reversion(speed: float) -> None:
    """Closed form ``exp(-rT + σ²T³/6)`` of Merton (1973), Theory of rational option pricing; the value is
    that of the QuantLib test suite, short-rate models."""
    model = vasicek(mean_reversion=speed, long_run_rate=0.05, volatility=0.01, starting_rate=0.05)
    assert float(model.curve.discount(1.0)) == pytest.approx(0.9512452784565716, abs=1e-12)


@pytest.mark.parametrize(
    ("end", "speed", "forward"), [(5.25, 0.03, 0.0573037), (5.25, 0.0, 0.0568611), (5.001, 0.03, 0.0575736)]
)
def test_convexity_of_futures(end: float, speed: float, forward: float) -> None:
    """Kirikos, G. and Novak, D. (1997), Convexity conundrums, Risk, March; values as carried in the QuantLib
    test suite.

    The futures price is a martingale: ``1 + τF = E[1/P(t, T)]``, which our bond formula and the law of the
    factor give, while the forward is ``P(0,t)/P(0,T)``. Their ratio does not depend on the curve.
    """
    start, futures = 5.0, 0.06
    model = hull_white(flat_curve(0.05), mean_reversion=speed, volatility=0.015)
    level, exposure = model.bond_terms(start, [end])
    variance = float(model.rate_variance(start))
    mean_growth = math.exp(-float(level[0]) + 0.5 * float(exposure[0, 0]) ** 2 * variance)
    forward_growth = float(model.curve.discount(start) / model.curve.discount(end))
    length = end - start
    found = ((1.0 + futures * length) * forward_growth / mean_growth - 1.0) / length
    assert found == pytest.approx(forward, abs=5.1e-8)


@pytest.mark.parametrize(("expiry", "maturity", "price"), [(1.0, 5.0, 0.02817777), (2.0, 4.0, 0.02042677)])
def test_hull_white_options_at_the_forward(expiry: float, maturity: float, price: float) -> None:
    """TF Quant Finance test suite, Hull-White, zero-bond options on a flat 1 % curve."""
    model = hull_white(flat_curve(0.01), mean_reversion=0.03, volatility=0.02)
    strike = math.exp(-0.01 * (maturity - expiry))
    assert model.bond_option(expiry, maturity, strike) == pytest.approx(price, abs=5e-9)


def test_square_root_moments() -> None:
    """Cox, Ingersoll and Ross (1985), Econometrica 53, equation 19; value computed from it."""
    model = SquareRootRates(
        mean_reversion=0.1, long_run_rate=0.1, volatility=0.06324555320336758, starting_rate=0.1
    )
    assert float(model.factor_mean(10.0)) == pytest.approx(0.1, abs=1e-15)
    assert float(model.factor_variance(10.0)) == pytest.approx(0.00172932943, abs=1e-10)


def _calibrated() -> GaussianRates:
    """Parameters printed in Brigo and Mercurio (2006), section 4.2.5: calibration of 13 February 2001."""
    return gaussian_2(
        flat_curve(0.05),
        mean_reversion=0.773511777,
        volatility=0.022284644,
        second_mean_reversion=0.082013014,
        second_volatility=0.010382461,
        factor_correlation=-0.701985206,
    )


def test_two_factor_variance() -> None:
    """Brigo and Mercurio (2006), equation 4.10 with the parameters above; computed in closed form and by
    quadrature."""
    variance = _calibrated().account_variance([1.0, 5.0, 10.0])
    assert variance == pytest.approx([5.022337474e-05, 0.00190456232493, 0.01136561870097], abs=1e-12)


def test_two_factor_option() -> None:
    """The same parameters on a flat 5 % curve; value computed and reproduced with QuantLib's G2."""
    price = _calibrated().bond_option(1.0, 5.0, 0.8187307530779818)
    assert price == pytest.approx(0.0077500501181, abs=1e-12)


def test_the_limit_of_two_factors_is_one() -> None:
    """Equal speeds and full correlation make one factor with the sum of the volatilities: algebra."""
    two = gaussian_2(
        flat_curve(0.05),
        mean_reversion=0.1,
        volatility=0.006,
        second_mean_reversion=0.1,
        second_volatility=0.004,
        factor_correlation=1.0,
    )
    one = hull_white(flat_curve(0.05), mean_reversion=0.1, volatility=0.01)
    times = np.array([0.5, 10.0, 60.0])
    assert two.account_variance(times) == pytest.approx(one.account_variance(times), rel=1e-13)
    assert float(first_integral(0.1, 10.0)) == pytest.approx((1.0 - math.exp(-1.0)) / 0.1, rel=1e-14)


@pytest.mark.parametrize(
    ("intercept", "slope", "level", "half_life", "is_square_root"),
    [(0.0154, -0.1779, 0.0866, 3.9, False), (0.0189, -0.2339, 0.0808, 2.96, True)],
    ids=["vasicek", "square root"],
)
def test_estimates_of_one_month_bills(
    intercept: float, slope: float, level: float, half_life: float, is_square_root: bool
) -> None:
    """Chan, K.C., Karolyi, G.A., Longstaff, F.A. and Sanders, A.B. (1992), An empirical comparison of
    alternative models of the short-term interest rate, Journal of Finance 47(3), table III (estimates from
    memory, not confirmed): the level and the half-life that ``dr = (α + β r) dt`` implies are recomputed, and
    the mean of our models comes to them."""
    speed, start = -slope, 0.02
    long_run = intercept / speed
    assert long_run == pytest.approx(level, abs=5e-5)
    years = math.log(2.0) / speed
    assert years == pytest.approx(half_life, abs=0.005)
    if is_square_root:
        model = SquareRootRates(
            mean_reversion=speed, long_run_rate=long_run, volatility=math.sqrt(0.0073), starting_rate=start
        )
        means = model.factor_mean([years, 200.0])
    else:
        means = vasicek(
            mean_reversion=speed, long_run_rate=long_run, volatility=math.sqrt(0.0004), starting_rate=start
        ).rate_offset([years, 200.0])
    assert means == pytest.approx([0.5 * (start + long_run), long_run], abs=1e-12)
