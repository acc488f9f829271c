"""Smith-Wilson curves: repricing, convergence, the search for alpha, and what gives no curve."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray

from desk.rates.curve import Curve
from desk.rates.curve_error import CurveError
from desk.rates.quotes import bond_flows, par_flows, zero_flows
from desk.rates.smith_wilson import SmithWilsonCurve, smith_wilson
from desk.rates.wilson import WilsonProducts, WilsonSums

TERMS = np.arange(1.0, 21.0)
RATES = 0.02 + 0.015 * -np.expm1(-TERMS / 8.0)
BELOW_ZERO = -0.006 + 0.009 * -np.expm1(-TERMS / 12.0)
ULTIMATE = 0.0345

Floats = NDArray[np.float64]


def _curve(rates: Floats, **settings: float) -> SmithWilsonCurve:
    return smith_wilson(par_flows(TERMS, rates), ultimate_forward_rate=ULTIMATE, **settings)


def _plain_discount(curve: SmithWilsonCurve, flows_time: Floats, weights: Floats, time: Floats) -> Floats:
    """The published formulas written out with the Wilson function itself, in extended precision."""
    t = time[:, None].astype(np.longdouble)
    u = flows_time.astype(np.longdouble)
    alpha, omega = np.longdouble(curve.alpha), np.log1p(np.longdouble(curve.ultimate_forward_rate))
    low, high = np.minimum(t, u), np.maximum(t, u)
    bracket = alpha * low - np.exp(-alpha * high) * np.sinh(alpha * low)
    worth = np.exp(-omega * time) * (1.0 + bracket @ weights)
    return np.asarray(worth, dtype=np.float64)


def test_zero_rates_written_out_plainly() -> None:
    """For zero bonds the weights solve ``Σ c_j H(u_i, u_j) = P(u_i) e^{ωu_i} - 1``."""
    curve = smith_wilson(zero_flows(TERMS, RATES), ultimate_forward_rate=ULTIMATE)
    omega = np.log1p(ULTIMATE)
    low, high = np.minimum(TERMS[:, None], TERMS), np.maximum(TERMS[:, None], TERMS)
    bracket = curve.alpha * low - np.exp(-curve.alpha * high) * np.sinh(curve.alpha * low)
    weights = np.linalg.solve(bracket, np.exp((omega - RATES) * TERMS) - 1.0)
    time = np.linspace(0.0, 120.0, 500)
    np.testing.assert_allclose(curve.discount(time), _plain_discount(curve, TERMS, weights, time), rtol=1e-9)
    np.testing.assert_allclose(curve.zero(TERMS), RATES, atol=1e-14)


@pytest.mark.parametrize("rates", [RATES, BELOW_ZERO], ids=["positive", "below zero"])
class TestCurve:
    """What every curve does."""

    def test_gives_back_the_quotes(self, rates: Floats) -> None:
        for per_year in (1, 2, 4):
            flows = par_flows(TERMS, rates, payments_per_year=per_year)
            curve = smith_wilson(flows, ultimate_forward_rate=ULTIMATE)
            np.testing.assert_allclose(flows.values(curve), 1.0, rtol=1e-12)
        bonds = bond_flows(TERMS + 0.3, rates + 0.02, yields=rates)
        curve = smith_wilson(bonds, ultimate_forward_rate=ULTIMATE)
        np.testing.assert_allclose(bonds.values(curve), bonds.target, rtol=1e-12)

    def test_is_a_curve_with_terms(self, rates: Floats) -> None:
        curve = _curve(rates)
        assert isinstance(curve, Curve)
        np.testing.assert_array_equal(curve.terms, TERMS)
        np.testing.assert_allclose(curve.zero_rates, curve.zero(TERMS), rtol=1e-15)
        assert curve.last_term == 20.0
        assert "alpha" in repr(curve)

    def test_starts_at_one(self, rates: Floats) -> None:
        curve = _curve(rates)
        assert curve.discount(0.0) == 1.0
        assert curve.zero(0.0) == curve.instantaneous_forward(0.0)
        np.testing.assert_allclose(curve.zero([1e-10, 1e-6, 1e-4]), curve.zero(0.0), atol=1e-5)

    def test_forward_is_the_slope_of_the_logarithm(self, rates: Floats) -> None:
        curve, step = _curve(rates), 1e-5
        time = np.linspace(0.013, 110.0, 601)
        slope = -(np.log(curve.discount(time + step)) - np.log(curve.discount(time - step))) / (2 * step)
        np.testing.assert_allclose(curve.instantaneous_forward(time), slope, atol=2e-9)

    def test_forwards_chain(self, rates: Floats) -> None:
        curve = _curve(rates)
        start, end = np.random.default_rng(1).uniform(0.0, 100.0, (2, 300))
        growth = np.exp(-curve.forward(start, end) * (end - start))
        np.testing.assert_allclose(curve.discount(start) * growth, curve.discount(end), rtol=1e-12)
        close = curve.forward(start, start + 1e-7)
        np.testing.assert_allclose(close, curve.instantaneous_forward(start), atol=1e-8)

    def test_forward_and_its_slope_are_continuous_at_the_terms(self, rates: Floats) -> None:
        curve = _curve(rates)
        before, after = (curve.instantaneous_forward(TERMS + step) for step in (-1e-7, 1e-7))
        np.testing.assert_allclose(before, after, atol=1e-7)

    def test_alpha_is_the_smallest_that_converges(self, rates: Floats) -> None:
        """Every alpha of a fine grid below it leaves the forward further off than the tolerance."""
        curve = _curve(rates)
        omega = np.log1p(ULTIMATE)
        assert curve.convergence_point == 60.0
        assert abs(float(curve.instantaneous_forward(60.0)) - omega) <= 1e-4
        assert curve.alpha > 0.05
        assert curve.alpha == round(curve.alpha, 6)
        for alpha in (*np.linspace(0.05, curve.alpha - 1e-6, 60), curve.alpha - 1e-6):
            other = _curve(rates, alpha=float(alpha))
            assert abs(float(other.instantaneous_forward(60.0)) - omega) > 1e-4

    def test_any_shape(self, rates: Floats) -> None:
        curve = _curve(rates)
        grid = np.linspace(0.0, 90.0, 24).reshape(2, 3, 4)
        for method in (curve.discount, curve.zero, curve.instantaneous_forward):
            np.testing.assert_allclose(method(grid).ravel(), [method(t) for t in grid.ravel()], rtol=1e-14)
            assert method([]).shape == (0,)
            with pytest.raises(ValueError, match="time"):
                method(-1.0)


def test_the_lowest_alpha_where_it_will_do() -> None:
    """On a curve that is at the ultimate rate already no pull is needed."""
    flat = np.full(TERMS.size, np.log1p(ULTIMATE))
    curve = smith_wilson(zero_flows(TERMS, flat), ultimate_forward_rate=ULTIMATE)
    assert curve.alpha == 0.05
    np.testing.assert_allclose(curve.zero([0.5, 5.5, 80.0]), np.log1p(ULTIMATE), rtol=1e-12)


def test_quotes_beyond_the_last_liquid_point_are_left_out() -> None:
    terms = np.array([1.0, 5.0, 10.0, 20.0, 30.0, 50.0])
    rates = np.array([0.02, 0.025, 0.03, 0.032, 0.9, 0.9])
    cut = smith_wilson(par_flows(terms, rates), ultimate_forward_rate=ULTIMATE, last_liquid_point=20.0)
    short = smith_wilson(par_flows(terms[:4], rates[:4]), ultimate_forward_rate=ULTIMATE)
    time = np.linspace(0.0, 100.0, 50)
    np.testing.assert_array_equal(cut.discount(time), short.discount(time))
    assert cut.last_term == 20.0


@pytest.mark.parametrize(("liquid", "convergence"), [(10.0, 60.0), (20.0, 60.0), (30.0, 70.0)])
def test_the_convergence_point_as_published(liquid: float, convergence: float) -> None:
    """40 years after the last liquid point, but no earlier than 60 years."""
    terms = np.arange(1.0, liquid + 1.0)
    curve = smith_wilson(par_flows(terms, np.full(terms.size, 0.02)), ultimate_forward_rate=ULTIMATE)
    assert curve.convergence_point == convergence


def test_a_tighter_tolerance_pulls_harder() -> None:
    alphas = [_curve(RATES, tolerance=tolerance).alpha for tolerance in (1e-3, 1e-4, 1e-5)]
    assert alphas == sorted(alphas)
    assert alphas[0] < alphas[2]
    assert _curve(RATES, convergence_point=40.0).alpha > _curve(RATES, convergence_point=90.0).alpha


@pytest.mark.parametrize("alpha", [0.01, 0.05, 0.3, 2.0, 20.0])
def test_sums_and_products_against_the_definition(alpha: float) -> None:
    """The kernel written out in extended precision, and summed term by term."""
    times = np.array([0.02, 0.3, 1.0, 7.0, 40.0, 100.0])
    weights = np.array([3.0, -2.0, 5.0, -1.0, 0.4, -0.1])
    time = np.linspace(0.0, 130.0, 400)

    def kernel(first: Floats, second: Floats) -> Floats:
        low = alpha * np.minimum(first, second).astype(np.longdouble)
        high = alpha * np.maximum(first, second).astype(np.longdouble)
        return np.asarray(low - 0.5 * (np.exp(low - high) - np.exp(-low - high)), dtype=np.float64)

    sums = WilsonSums.build(times, weights, alpha)
    expected = kernel(time[:, None], times) @ weights
    np.testing.assert_allclose(sums.value(time), expected, rtol=1e-12, atol=1e-13)
    step = 1e-6
    slope = (sums.value(time[1:] + step) - sums.value(time[1:] - step)) / (2.0 * step)
    np.testing.assert_allclose(sums.slope(time[1:]), slope, atol=2e-5 * alpha)
    assert sums.limit == pytest.approx(float(sums.value(np.array(1e4))), rel=1e-12)

    amounts = np.random.default_rng(6).normal(size=(3, times.size))
    products = amounts @ kernel(times[:, None], times) @ amounts.T
    found = WilsonProducts(times, amounts).at(alpha)
    np.testing.assert_allclose(found, products, rtol=1e-10, atol=1e-13)


class TestFaults:
    """Settings and quotes that give no curve: the error says what would mend it."""

    @pytest.mark.parametrize(
        ("settings", "words"),
        [
            ({"tolerance": 1e-12, "convergence_point": 20.5}, "no alpha brings"),
            ({"convergence_point": 20.0}, "not after the last liquid point"),
            ({"convergence_point": 5.0}, "not after the last liquid point"),
            ({"convergence_point": np.nan}, "not after the last liquid point"),
            ({"last_liquid_point": 0.5}, "no quote is at or before"),
            ({"tolerance": 0.0}, "tolerance is not above 0"),
            ({"tolerance": np.nan}, "tolerance is not above 0"),
            ({"alpha": 0.0}, "alpha is not above 0"),
            ({"alpha": np.inf}, "alpha is not above 0"),
        ],
    )
    def test_settings(self, settings: dict[str, float], words: str) -> None:
        with pytest.raises(CurveError, match=words) as caught:
            _curve(RATES, **settings)
        assert caught.value.mend

    @pytest.mark.parametrize("rate", [-1.0, -2.0, np.nan, np.inf])
    def test_ultimate_rate(self, rate: float) -> None:
        with pytest.raises(CurveError, match="ultimate forward rate"):
            smith_wilson(par_flows(TERMS, RATES), ultimate_forward_rate=rate)

    def test_out_of_order_and_duplicate_terms(self) -> None:
        with pytest.raises(CurveError, match="stands after") as caught:
            smith_wilson(par_flows([1.0, 3.0, 2.0], [0.02] * 3), ultimate_forward_rate=ULTIMATE)
        assert caught.value.rows == (2,)
        with pytest.raises(CurveError, match="two quotes") as caught:
            smith_wilson(par_flows([1.0, 3.0, 3.0], [0.02] * 3), ultimate_forward_rate=ULTIMATE)
        assert caught.value.rows == (1, 2)

    def test_no_positive_discount_factors(self) -> None:
        flows = par_flows([1.0, 2.0, 20.0, 21.0], [0.02, 0.02, 0.02, 0.9])
        with pytest.raises(CurveError, match="would not be above 0") as caught:
            smith_wilson(flows, ultimate_forward_rate=ULTIMATE, alpha=0.1)
        assert caught.value.rows

    @pytest.mark.parametrize("rate", [-0.999, 1e6])
    def test_absurd_ultimate_rates(self, rate: float) -> None:
        flows = par_flows([1.0, 30.0, 900.0], [0.02, 0.02, 0.02])
        with pytest.raises(CurveError):
            smith_wilson(flows, ultimate_forward_rate=rate)

    def test_absurd_quotes_end_in_an_error_or_a_curve(self) -> None:
        random = np.random.default_rng(4)
        curves = 0
        for _ in range(60):
            count = int(random.integers(1, 8))
            terms = np.sort(random.uniform(0.01, 50.0, count))
            flows = par_flows(terms, random.choice([-0.5, 0.0, 0.03, 0.5, 1e6], count))
            try:
                curve = smith_wilson(flows, ultimate_forward_rate=ULTIMATE)
            except CurveError:
                continue
            curves += 1
            assert np.all(curve.discount(np.linspace(0.0, 150.0, 100)) > 0.0)
        assert curves > 0
