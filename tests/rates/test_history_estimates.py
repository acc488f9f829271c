"""Estimates from histories of short rates: recovery, bias, exact laws, verdicts and faults."""

from __future__ import annotations

import math

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy import special, stats

from desk.rates.history_bessel import log_bessel_less_argument
from desk.rates.history_diagnostics import residual_tests
from desk.rates.history_fit import mean_reversion_bias
from desk.rates.history_series import rate_history
from desk.rates.history_square_root import (
    fit_square_root,
    square_root_log_density,
    square_root_residuals,
)
from desk.rates.history_vasicek import fit_vasicek, vasicek_log_likelihood
from desk.rates.limits import first_integral

FloatArray = NDArray[np.float64]


def _vasicek_path(steps: FloatArray, speed: float, level: float, volatility: float, seed: int) -> FloatArray:
    random = np.random.default_rng(seed)
    rate = [level + volatility / math.sqrt(2.0 * speed) * random.standard_normal()]
    for step in steps.tolist():
        mean = level + math.exp(-speed * step) * (rate[-1] - level)
        rate.append(
            mean + volatility * math.sqrt(float(first_integral(2 * speed, step))) * random.standard_normal()
        )
    return np.array(rate)


def _square_root_path(
    steps: FloatArray, speed: float, level: float, volatility: float, seed: int
) -> FloatArray:
    random = np.random.default_rng(seed)
    rate = [level]
    for step in steps.tolist():
        unit = 0.25 * volatility**2 * float(first_integral(speed, step))
        freedom, distance = 4.0 * speed * level / volatility**2, rate[-1] * math.exp(-speed * step) / unit
        rate.append(unit * random.noncentral_chisquare(freedom, distance))
    return np.array(rate)


IRREGULAR = np.asarray(np.random.default_rng(1).choice([1 / 52, 1 / 12, 0.25], 1500), dtype=np.float64)


def test_vasicek_recovered_from_irregular_steps() -> None:
    path = _vasicek_path(IRREGULAR, 0.8, 0.04, 0.015, 2)
    times = np.append(0.0, np.cumsum(IRREGULAR))
    for stationary in (False, True):
        fit = fit_vasicek(times, path, stationary=stationary)
        assert abs(fit.mean_reversion - 0.8) < 3.0 * fit.mean_reversion_error
        assert abs(fit.long_run_rate - 0.04) < 3.0 * fit.long_run_rate_error
        assert abs(fit.volatility - 0.015) < 3.0 * fit.volatility_error
        low, high = fit.mean_reversion_interval
        assert low < fit.mean_reversion < high
        assert fit.starting_rate == path[-1]
        assert fit.tests.ljung_box_p > 0.001
        assert fit.tests.jarque_bera_p > 0.001


def test_square_root_recovered_from_irregular_steps() -> None:
    path = _square_root_path(IRREGULAR, 0.6, 0.04, 0.08, 3)
    fit = fit_square_root(np.append(0.0, np.cumsum(IRREGULAR)), path)
    assert abs(fit.mean_reversion - 0.6) < 3.0 * fit.mean_reversion_error
    assert abs(fit.long_run_rate - 0.04) < 3.0 * fit.long_run_rate_error
    assert abs(fit.volatility - 0.08) < 3.0 * fit.volatility_error
    assert fit.tests.kolmogorov_p > 0.001


def test_equal_steps_by_regression_and_by_search_agree() -> None:
    """Equal steps take a closed form; a step changed in its tenth digit takes the search."""
    path = _vasicek_path(np.full(400, 0.25), 0.4, 0.03, 0.01, 4)
    times = 0.25 * np.arange(401)
    moved = times.copy()
    moved[200:] += 1e-8
    closed, searched = fit_vasicek(times, path), fit_vasicek(moved, path)
    assert searched.mean_reversion == pytest.approx(closed.mean_reversion, rel=1e-6)
    assert searched.log_likelihood == pytest.approx(closed.log_likelihood, abs=1e-5)


def test_likelihood_is_that_of_one_long_normal_vector() -> None:
    """Written differently: all the rates at once are normal with covariance ``σ²/(2κ) e^{-κ|s - t|}``."""
    steps = IRREGULAR[:40]
    history = rate_history(np.append(0.0, np.cumsum(steps)), _vasicek_path(steps, 0.5, 0.03, 0.01, 5))
    ours = vasicek_log_likelihood(history, mean_reversion=0.5, pull=0.015, volatility=0.01, stationary=True)
    covariance = 1e-4 * np.exp(-0.5 * np.abs(history.time[:, None] - history.time))
    theirs = stats.multivariate_normal.logpdf(history.rate, np.full(41, 0.03), covariance)
    assert ours == pytest.approx(float(theirs), rel=1e-10)


def test_bias_formula_against_simulation() -> None:
    """Tang and Chen (2009) from memory: mean error of 4,000 estimates from 20 years of months, κ = 1."""
    random, speed, steps = np.random.default_rng(6), 1.0, 240
    decay = math.exp(-speed / 12.0)
    rate = random.standard_normal(4000) / math.sqrt(1.0 - decay**2)
    rows = [rate]
    for _ in range(steps):
        rows.append(decay * rows[-1] + random.standard_normal(4000))
    before, after = np.array(rows[:-1]), np.array(rows[1:])
    before, after = before - before.mean(axis=0), after - after.mean(axis=0)
    slope = np.sum(before * after, axis=0) / np.sum(before**2, axis=0)
    estimates = -12.0 * np.log(slope)
    error = float(estimates.std()) / math.sqrt(4000.0)
    expected = mean_reversion_bias(speed, step=1.0 / 12.0, steps=steps)
    assert float(estimates.mean()) - speed == pytest.approx(expected, abs=3.0 * error + 0.03)
    assert expected == pytest.approx(4.0 / 20.0, rel=0.15)


@pytest.mark.parametrize("order", [-0.95, -0.3, 0.0, 0.5, 3.0, 39.0, 60.0, 700.0, 1e5])
def test_bessel_against_its_definition(order: float) -> None:
    """scipy's scaled function where it fits a float; elsewhere the power series summed by logarithms."""
    z = np.geomspace(1e-9, 1e6, 60)
    ours = log_bessel_less_argument(order, z)
    direct = special.ive(order, z)
    fits = (direct > 1e-290) & np.isfinite(direct)
    assert ours[fits] == pytest.approx(np.log(direct[fits]), rel=1e-10, abs=1e-10)
    few = z < 200.0
    terms = np.arange(600.0)
    logs = (2.0 * terms + order) * np.log(0.5 * z[few, None]) - special.gammaln(terms + 1.0)
    series = special.logsumexp(logs - special.gammaln(terms + order + 1.0), axis=1) - z[few]
    assert ours[few] == pytest.approx(series, rel=1e-10, abs=1e-10)
    assert np.count_nonzero(fits) + np.count_nonzero(few) > 30


@pytest.mark.parametrize(("pull", "volatility"), [(0.002, 0.05), (1e-5, 0.08), (0.02, 0.005), (0.03, 0.3)])
def test_square_root_density_against_scipy(pull: float, volatility: float) -> None:
    """scipy's noncentral chi-square density, where it has not run out of range."""
    random = np.random.default_rng(7)
    before, after = random.uniform(0.005, 0.09, 300), random.uniform(0.005, 0.09, 300)
    step = random.choice([1 / 252, 1 / 12, 0.25, 5.0], 300)
    ours = square_root_log_density(before, after, step, mean_reversion=0.3, pull=pull, volatility=volatility)
    unit = 0.25 * volatility**2 * first_integral(0.3, step)
    with np.errstate(all="ignore"):
        theirs = stats.ncx2.logpdf(
            after / unit, 4.0 * pull / volatility**2, before * np.exp(-0.3 * step) / unit
        ) - np.log(unit)
    usable = np.isfinite(theirs) & (theirs > -600.0)
    assert np.count_nonzero(usable) > 20
    assert np.isfinite(ours).all()
    assert ours[usable] == pytest.approx(theirs[usable], rel=1e-8, abs=1e-8)


def test_square_root_density_becomes_the_normal_one() -> None:
    """With little volatility the law is normal with the exact mean and variance (central limit)."""
    volatility, rate, step = 1e-5, 0.04, 1.0
    mean = rate * math.exp(-0.3) + 0.012 / 0.3 * -math.expm1(-0.3)
    length = -math.expm1(-0.3) / 0.3
    variance = volatility**2 * (rate * math.exp(-0.3) * length + 0.5 * 0.012 * length**2)
    after = mean + math.sqrt(variance) * np.array([-1.0, 0.0, 1.0])
    ours = square_root_log_density(
        np.full(3, rate), after, np.full(3, step), mean_reversion=0.3, pull=0.012, volatility=volatility
    )
    assert ours == pytest.approx(stats.norm.logpdf(after, mean, math.sqrt(variance)), abs=1e-3)


def test_square_root_residuals_of_daily_rates() -> None:
    """Steps of a day make a noncentrality of many thousands: the residuals are still standard normal."""
    steps = np.full(1500, 1.0 / 252.0)
    history = rate_history(np.append(0.0, np.cumsum(steps)), _square_root_path(steps, 0.5, 0.04, 0.01, 8))
    residual = square_root_residuals(history, mean_reversion=0.5, pull=0.02, volatility=0.01)
    assert stats.kstest(residual, "norm").pvalue > 0.001
    assert float(residual.std()) == pytest.approx(1.0, abs=0.06)


def test_tests_of_residuals_against_scipy_and_definitions() -> None:
    """scipy's Jarque-Bera; Ljung-Box by its definition, summed plainly."""
    values = np.random.default_rng(9).standard_t(4, 500)
    found = residual_tests(values, lags=5)
    theirs = stats.jarque_bera(values)
    assert found.jarque_bera == pytest.approx(float(theirs.statistic))
    assert found.jarque_bera_p == pytest.approx(float(theirs.pvalue))
    assert found.kolmogorov == pytest.approx(float(stats.kstest(values, "norm").statistic))
    mean = sum(values) / 500
    total = sum((value - mean) ** 2 for value in values)
    box = 0.0
    for lag in range(1, 6):
        product = sum((values[i] - mean) * (values[i - lag] - mean) for i in range(lag, 500))
        box += 500 * 502 * (product / total) ** 2 / (500 - lag)
    assert found.ljung_box == pytest.approx(box)
    assert any("not normal" in remark for remark in found.remarks)


def test_profile_falls_by_half_the_chi_square_point_at_its_ends() -> None:
    path = _vasicek_path(np.full(600, 1 / 12), 0.9, 0.04, 0.015, 10)
    fit = fit_vasicek(np.arange(601) / 12.0, path)
    ends = np.interp(fit.mean_reversion_interval, fit.profile_mean_reversion, fit.profile_log_likelihood)
    assert fit.log_likelihood - ends == pytest.approx([1.92, 1.92], abs=0.02)
    assert fit.profile_log_likelihood.max() == pytest.approx(fit.log_likelihood, abs=1e-9)
    assert not any("cannot be told from 0" in remark for remark in fit.remarks)


def test_a_trend_has_no_mean_reversion() -> None:
    times = np.arange(60.0) / 12.0
    rates = 0.01 + 0.0005 * np.exp(0.05 * np.arange(60.0)) + 1e-5 * np.cos(np.arange(60.0) ** 2)
    fit = fit_vasicek(times, rates)
    assert fit.mean_reversion == 0.0
    assert math.isnan(fit.long_run_rate)
    assert "no mean reversion" in fit.remarks[0]
    assert math.isfinite(fit.volatility_error)
    assert fit_square_root(times, rates).mean_reversion < 0.01


def test_rates_without_memory() -> None:
    rates = 0.03 + 0.001 * np.random.default_rng(11).standard_normal(120)
    fit = fit_vasicek(np.arange(120.0), rates)
    assert fit.mean_reversion > 1.0
    assert all(math.isfinite(value) for value in (fit.volatility, fit.long_run_rate, fit.log_likelihood))
    assert not any("cannot be told from 0" in remark for remark in fit.remarks)


@pytest.mark.parametrize(
    "rates",
    [
        0.03 + 0.01 * (-1.0) ** np.arange(60),
        np.append(np.full(59, 0.02), 0.021),
        np.where(np.arange(60) == 30, 5.0, 0.03 + 1e-4 * np.cos(np.arange(60))),
        1e-12 * (2.0 + np.cos(np.arange(60))),
        1e-3 * 1.1 ** np.arange(60),
    ],
    ids=["alternating", "one move", "one outlier", "next to nothing", "growth"],
)
def test_odd_histories_give_finite_figures(rates: FloatArray) -> None:
    for fit in (fit_vasicek(np.arange(60.0), rates), fit_square_root(np.arange(60.0), rates)):
        assert all(
            map(
                math.isfinite,
                (fit.mean_reversion, fit.volatility, fit.log_likelihood, fit.corrected_mean_reversion),
            )
        )
        low, high = fit.mean_reversion_interval
        assert 0.0 <= low <= fit.mean_reversion <= high
        assert np.isfinite(fit.profile_log_likelihood).all()


def test_rates_in_per_cent_are_remarked_on() -> None:
    path = _vasicek_path(np.full(150, 1 / 12), 0.5, 3.0, 1.0, 13)
    assert any("look like per cent" in remark for remark in fit_vasicek(np.arange(151) / 12, path).remarks)


def test_gaps_and_short_histories_are_remarked_on() -> None:
    dates = np.datetime64("2010-01-01") + np.cumsum(
        np.append(np.full(50, 30), np.append(900, np.full(30, 30)))
    )
    fit = fit_vasicek(dates, _vasicek_path(np.full(80, 1 / 12), 0.5, 0.03, 0.01, 12))
    assert any("one gap" in remark and "2014-" in remark for remark in fit.remarks)
    assert any("years only" in remark for remark in fit.remarks)


@pytest.mark.parametrize(
    ("times", "rates", "said"),
    [
        (np.arange(5.0), np.arange(5.0), "too short"),
        (np.zeros(20), np.arange(20.0), "row 2 of the history has the same date as row 1"),
        (np.arange(20.0)[::-1], np.arange(20.0), "comes before"),
        (np.arange(20.0), np.full(20, 0.03), "never moves"),
        (np.arange(20.0), np.append(np.arange(19.0), np.nan), "rate in row 20"),
        (np.full(20, np.datetime64("NaT", "D")), np.arange(20.0), "date in row 1"),
        (np.arange(20.0), np.zeros((20, 2)), "one rate a date"),
        (np.arange(20.0), 1e200 * np.arange(20.0), "beyond any sense"),
    ],
)
def test_faulty_histories(times: FloatArray, rates: FloatArray, said: str) -> None:
    with pytest.raises(ValueError, match=said):
        fit_vasicek(times, rates)


def test_square_root_refuses_rates_that_are_not_positive() -> None:
    rates = np.linspace(-0.01, 0.02, 30)
    with pytest.raises(ValueError, match=r"10 of 30 rates are 0 or negative \(the first is -1 % in row 1\)"):
        fit_square_root(np.arange(30.0), rates)
