"""Correlation, risky assets and reinvested dividends against published values."""

from __future__ import annotations

import numpy as np
import pytest

from desk.rates.correlation import nearest_correlation, spectral_correlation, volatility_matrix
from desk.rates.gaussian import hull_white
from desk.rates.risky import RiskyMarket, total_return_index
from tests.rates.flat_curve import flat_curve

TWENTY_YEARS = 20.013698630136986


def test_nearest_correlation_of_three_by_three() -> None:
    """Higham, N.J. (2002), Computing the nearest correlation matrix, IMA Journal of Numerical Analysis 22;
    printed values from memory, the further digits recomputed by alternating projections."""
    mended = nearest_correlation([[1.0, 1.0, 0.0], [1.0, 1.0, 1.0], [0.0, 1.0, 1.0]])
    found = [mended.matrix[0, 1], mended.matrix[0, 2], mended.matrix[1, 2]]
    assert found == pytest.approx([0.7607, 0.1573, 0.7607], abs=5.1e-5)
    assert mended.distance == pytest.approx(0.5278, abs=5.1e-5)
    assert found == pytest.approx([0.760689853402, 0.157298106138, 0.760689853402], abs=1e-11)
    assert mended.distance == pytest.approx(0.527790463582, abs=1e-11)


def test_spectral_truncation_of_an_indefinite_matrix() -> None:
    """Rebonato, R. and Jäckel, P. (1999), The most general methodology to create a valid correlation matrix;
    digits of the QuantLib test suite."""
    mended = spectral_correlation([[1.0, 0.9, 0.7], [0.9, 1.0, 0.3], [0.7, 0.3, 1.0]])
    found = [mended.matrix[0, 1], mended.matrix[0, 2], mended.matrix[1, 2]]
    assert found == pytest.approx([0.894024408508599, 0.696319066114392, 0.300969036104592], abs=1e-12)


@pytest.mark.parametrize(
    ("covariance", "sigma"),
    [
        (
            [[4.0, 12.0, -16.0], [12.0, 37.0, -43.0], [-16.0, -43.0, 98.0]],
            [[2.0, 0.0, 0.0], [6.0, 1.0, 0.0], [-8.0, 5.0, 3.0]],
        ),
        (
            [[25.0, 15.0, -5.0], [15.0, 18.0, 0.0], [-5.0, 0.0, 11.0]],
            [[5.0, 0.0, 0.0], [3.0, 3.0, 0.0], [-1.0, 1.0, 3.0]],
        ),
    ],
)
def test_volatility_matrix(covariance: list[list[float]], sigma: list[list[float]]) -> None:
    """Two standard textbook examples of Cholesky's root, from memory."""
    np.testing.assert_allclose(volatility_matrix(covariance), sigma, rtol=0.0, atol=1e-12)


@pytest.mark.parametrize(
    ("correlation", "volatility"),
    [
        (-0.75, 0.217064577),
        (-0.25, 0.243995801),
        (0.0, 0.25640283),
        (0.25, 0.268236596),
        (0.75, 0.290461343),
    ],
)
def test_equity_with_hull_white_rates(correlation: float, volatility: float) -> None:
    """Implied volatility of a forward in some twenty years; QuantLib test suite, hybrid equity and
    Hull-White."""
    rates = hull_white(flat_curve(0.03), mean_reversion=0.00883, volatility=0.00526)
    market = RiskyMarket(rates, volatility=[0.25], correlation=[[1.0, correlation], [correlation, 1.0]])
    assert float(market.forward_volatility(TWENTY_YEARS)[0]) == pytest.approx(volatility, abs=1e-9)


def test_reinvested_dividends() -> None:
    """Identity: units grow by (price + dividend)/price at each payment."""
    index = total_return_index([100.0, 110.0, 99.0], [2.0, 3.0])
    np.testing.assert_allclose(index, [1.0, 1.12, 1.0385454545454547], rtol=0.0, atol=1e-12)
    # A continuous yield q multiplies the unit count by e^{qT}: many small payments come to the same.
    steps, rate = 200_000, 0.03
    many = total_return_index(np.ones(steps + 1), np.full(steps, rate / steps))
    assert many[-1] == pytest.approx(np.exp(rate), rel=1e-8)
