"""Estimates from histories of short rates against figures computed by others' programs on open data."""

from __future__ import annotations

import math

import numpy as np
import pytest

from desk.rates.history_square_root import fit_square_root
from desk.rates.history_vasicek import fit_vasicek
from tests.published.open_rates import bill_rates, bill_returns, corporate_yields

BILL_RATES = bill_rates()
QUARTERS = 0.25 * np.arange(BILL_RATES.size)


@pytest.mark.parametrize(
    ("rates", "count", "ends", "expected", "near"),
    [
        (
            0.12 * bill_returns(),
            1109,
            (0.0264, 0.0216),
            (0.9758743, 0.0007898031, 0.2930575, 0.03273704, 0.02329662, 0.02331767, 3983.396),
            (9.76e-7, 7.9e-10, 2.93e-7, 3.27e-8, 2.33e-8, 2.33e-8, 3.98e-3),
        ),
        (
            0.01 * corporate_yields(),
            1200,
            (0.0535, 0.0402),
            (0.9980157, 0.0001030251, 0.02383497, 0.05192077, 0.006072804, 0.006077875, 5909.203),
            (9.98e-7, 1.03e-10, 2.38e-8, 5.19e-8, 6.07e-9, 6.08e-9, 5.91e-3),
        ),
    ],
    ids=["bills by month", "corporate yields by month"],
)
def test_vasicek_on_nine_decades_by_month(
    rates: np.ndarray[tuple[int], np.dtype[np.float64]],
    count: int,
    ends: tuple[float, float],
    expected: tuple[float, ...],
    near: tuple[float, ...],
) -> None:
    """Open data of `arch`, dt 1/12: slope and intercept of the regression of each rate on the one before,
    then κ, θ, σ by maximum likelihood and with the degrees of freedom of the regression, and the
    log-likelihood. Computed by a separate least-squares script, cross-checked with the least squares of
    statsmodels; Brigo and Mercurio (2006), section 3.2.1."""
    assert rates.size == count
    assert (rates[0], rates[-1]) == pytest.approx(ends, abs=1e-12)
    fit = fit_vasicek(np.arange(count) / 12.0, rates)
    slope = math.exp(-fit.mean_reversion / 12.0)
    found = (
        slope,
        fit.long_run_rate * (1.0 - slope),
        fit.mean_reversion,
        fit.long_run_rate,
        fit.volatility,
        fit.volatility * math.sqrt((count - 1.0) / (count - 3.0)),
        fit.log_likelihood,
    )
    for value, wanted, tolerance in zip(found, expected, near, strict=True):
        assert value == pytest.approx(wanted, abs=tolerance)


def test_vasicek_given_the_first_rate() -> None:
    """Quarterly bill rates, dt 0.25. Least squares of each rate on the one before, computed by a separate
    script and cross-checked with the least squares of statsmodels; κ = -ln(slope)/dt,
    θ = intercept/(1 - slope), σ² = s² 2κ/(1 - slope²): Brigo and Mercurio (2006), section 3.2.1."""
    fit = fit_vasicek(QUARTERS, BILL_RATES / 100.0)
    assert fit.steps == 202
    assert fit.mean_reversion == pytest.approx(0.1727371, abs=1.73e-7)
    assert fit.long_run_rate == pytest.approx(0.05021225, abs=5.02e-8)
    assert fit.volatility == pytest.approx(0.01760413, abs=1.76e-8)
    assert fit.log_likelihood == pytest.approx(673.7239, abs=6.74e-4)
    assert math.exp(-0.25 * fit.mean_reversion) == pytest.approx(0.9577349, abs=9.58e-7)


def test_standard_errors_are_those_of_the_regression() -> None:
    """The same regression: with σ by maximum likelihood the error of the slope is σ_residual/√Σ(x - x̄)², and
    the delta method takes it to κ: d κ/d slope = -1/(slope dt). Algebra of ordinary least squares."""
    before, after = BILL_RATES[:-1], BILL_RATES[1:]
    centred = before - before.mean()
    slope = float(centred @ after) / float(centred @ centred)
    left = after - after.mean() - slope * centred
    error = math.sqrt(float(left @ left) / left.size / float(centred @ centred))
    fit = fit_vasicek(QUARTERS, BILL_RATES / 100.0)
    assert fit.mean_reversion_error == pytest.approx(error / (slope * 0.25), rel=1e-5)


def test_vasicek_with_the_first_rate_from_its_stationary_law() -> None:
    """The same rates in per cent, dt 1: exact likelihood of a first-order autoregression; agrees with ARIMA
    (1, 0, 0) of statsmodels."""
    fit = fit_vasicek(np.arange(BILL_RATES.size, dtype=np.float64), BILL_RATES, stationary=True)
    slope = math.exp(-fit.mean_reversion)
    assert fit.long_run_rate == pytest.approx(4.6335, abs=1e-3)
    assert slope == pytest.approx(0.95607, abs=2e-5)
    innovation = fit.volatility**2 * (1.0 - slope**2) / (2.0 * fit.mean_reversion)
    assert innovation == pytest.approx(0.74031, abs=2e-5)
    assert fit.log_likelihood == pytest.approx(-258.75237, abs=1e-5)


def test_square_root_by_its_exact_law() -> None:
    """The same rates: noncentral chi-square likelihood maximised by a simplex search from three starts, by a
    script of its own. The likelihood is flat in κ."""
    fit = fit_square_root(QUARTERS, BILL_RATES / 100.0)
    assert fit.mean_reversion == pytest.approx(0.039718, abs=1.99e-4)
    assert fit.long_run_rate == pytest.approx(0.039847, abs=1.99e-4)
    assert fit.volatility == pytest.approx(0.06666, abs=1.33e-4)
    assert fit.log_likelihood == pytest.approx(715.76, abs=0.01)
    assert "cannot be told from 0" in fit.remarks[0]
    assert fit.mean_reversion_interval[0] == 0.0
