"""Panels of yields: the likelihood three ways, recovery, missing quotes, verdicts and faults."""

from __future__ import annotations

import math

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy import stats

from desk.rates.gaussian import gaussian_2, vasicek
from desk.rates.kalman_fit import fit_yield_panel
from desk.rates.kalman_panel import (
    PanelModel,
    YieldPanel,
    kalman_filter,
    panel_log_likelihood,
    panel_states,
)
from tests.rates.flat_curve import flat_curve

FloatArray = NDArray[np.float64]
TERMS = np.array([0.25, 1.0, 2.0, 5.0, 10.0, 20.0])
ONE = PanelModel((0.2,), (0.01,), (0.3,), 0.03, 5e-4)
TWO = PanelModel((0.8, 0.06), (0.012, 0.009), (0.1, 0.2), 0.03, 5e-4, -0.6)


def _panel(model: PanelModel, steps: FloatArray, seed: int, *, missing: float = 0.0) -> YieldPanel:
    """Drawn step by step from the model."""
    random = np.random.default_rng(seed)
    noise, decay = model.covariance(steps), model.decay(steps)
    state = [np.linalg.cholesky(model.stationary()) @ random.standard_normal(model.factor_count)]
    for spread, left in zip(noise, decay, strict=True):
        state.append(
            left * state[-1] + np.linalg.cholesky(spread) @ random.standard_normal(model.factor_count)
        )
    constant, loading = model.loadings(TERMS)
    rate = constant + np.array(state) @ loading.T
    rate += model.error * random.standard_normal(rate.shape)
    rate[random.random(rate.shape) < missing] = np.nan
    return YieldPanel(np.append(0.0, np.cumsum(steps)), TERMS, rate)


def test_loadings_are_the_bonds_of_the_model() -> None:
    """One factor against Vasicek's own curve, two against the bond formula of the two-factor class."""
    constant, loading = ONE.loadings(TERMS)
    rate = vasicek(mean_reversion=0.2, long_run_rate=0.03, volatility=0.01, starting_rate=0.045).curve
    assert constant + loading @ (np.array([0.015]) - ONE.mean) == pytest.approx(rate.zero(TERMS), rel=1e-12)
    constant, loading = TWO.loadings(TERMS)
    two = gaussian_2(
        flat_curve(0.03),
        mean_reversion=0.8,
        volatility=0.012,
        second_mean_reversion=0.06,
        second_volatility=0.009,
        factor_correlation=-0.6,
    )
    variance = two.account_variance(TERMS)
    exposure = two.bond_terms(0.0, TERMS)[1]
    state = np.array([0.01, -0.004])
    expected = 0.03 - 0.5 * variance / TERMS + exposure @ state / TERMS
    assert constant + loading @ (state - TWO.mean) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize("model", [ONE, TWO], ids=["one factor", "two factors"])
def test_likelihood_three_ways(model: PanelModel) -> None:
    """The band matrix, the filter by prediction errors, and all quotes as one normal vector (scipy)."""
    steps = np.asarray(np.random.default_rng(1).choice([1 / 52, 1 / 12, 1.0], 24), dtype=np.float64)
    panel = _panel(model, steps, 2, missing=0.2)
    panel.rate[5] = np.nan
    gap = np.abs(panel.time[:, None] - panel.time)
    constant, loading = model.loadings(TERMS)
    speeds, stationary = np.array(model.mean_reversion), model.stationary()
    # Covariance of the factors at two dates: what an earlier one has left at the later one.
    decay = np.exp(-speeds * gap[..., None])
    later = panel.time[:, None, None, None] >= panel.time[None, :, None, None]
    states = np.where(later, decay[..., :, None], decay[..., None, :]) * stationary
    covariance = np.einsum("mi,stij,nj->smtn", loading, states, loading).reshape(25 * 6, 25 * 6)
    covariance += model.error**2 * np.eye(25 * 6)
    seen = panel.quoted.reshape(-1)
    plain = stats.multivariate_normal.logpdf(
        panel.rate.reshape(-1)[seen], np.tile(constant, 25)[seen], covariance[np.ix_(seen, seen)]
    )
    filtered = kalman_filter(panel, model)
    assert panel_log_likelihood(panel, model) == pytest.approx(float(plain), abs=1e-7)
    assert filtered.log_likelihood == pytest.approx(float(plain), abs=1e-7)
    assert panel_states(panel, model)[-1] == pytest.approx(filtered.state[-1], abs=1e-12)
    assert filtered.standardised.size == 24


@pytest.mark.parametrize("model", [ONE, TWO], ids=["one factor", "two factors"])
def test_recovery(model: PanelModel) -> None:
    """40 years of months with a tenth of the quotes missing: within 3.5 standard errors."""
    panel = _panel(model, np.full(480, 1.0 / 12.0), 3, missing=0.1)
    fit = fit_yield_panel(panel.time, panel.term, panel.rate, factors=model.factor_count)
    truth = {
        "mean_reversion": model.mean_reversion[0],
        "volatility": model.volatility[0],
        "risk_price": model.risk_price[0],
        "long_run_rate": model.level,
        "measurement_error": model.error,
        "real_world_rate": model.level + float(model.mean.sum()),
    }
    if model.factor_count == 2:
        truth |= {
            "second_mean_reversion": model.mean_reversion[1],
            "second_volatility": model.volatility[1],
            "second_risk_price": model.risk_price[1],
            "factor_correlation": model.correlation,
        }
    for name, value in truth.items():
        assert fit.errors[name] > 0.0
        assert abs(getattr(fit, name) - value) < 3.5 * fit.errors[name], name
    assert fit.log_likelihood >= panel_log_likelihood(panel, model)
    assert fit.rmse_bp == pytest.approx(5.0, abs=2.5)
    assert np.isnan(fit.residual_bp).sum() == np.isnan(panel.rate).sum()
    assert np.isfinite(fit.fitted).all()
    assert fit.tests.jarque_bera_p > 1e-3
    assert any("quotes are missing" in remark for remark in fit.remarks)
    assert not any("poor" in remark for remark in fit.remarks)


def test_the_fit_is_where_the_likelihood_is_greatest() -> None:
    """Steps of a tenth of a standard error from the estimate lower the likelihood by about 0.005."""
    panel = _panel(ONE, np.full(240, 1.0 / 12.0), 4)
    fit = fit_yield_panel(panel.time, panel.term, panel.rate)
    base = {
        "mean_reversion": fit.mean_reversion,
        "volatility": fit.volatility,
        "risk_price": fit.risk_price,
        "long_run_rate": fit.long_run_rate,
        "measurement_error": fit.measurement_error,
    }
    for name in base:
        for sign in (-1.0, 1.0):
            moved = base | {name: base[name] + 0.1 * sign * fit.errors[name]}
            model = PanelModel(
                (moved["mean_reversion"],),
                (moved["volatility"],),
                (moved["risk_price"],),
                moved["long_run_rate"],
                moved["measurement_error"],
            )
            assert panel_log_likelihood(panel, model) < fit.log_likelihood - 0.004


def test_one_factor_says_so_where_two_are_needed() -> None:
    panel = _panel(TWO, np.full(240, 1.0 / 12.0), 5)
    fit = fit_yield_panel(panel.time, panel.term, panel.rate)
    assert "one factor leaves" in fit.remarks[0]
    assert any("errors of fit last" in remark for remark in fit.remarks)


def test_short_history_cannot_tell_the_price_of_risk() -> None:
    panel = _panel(ONE, np.full(60, 1.0 / 12.0), 7)
    fit = fit_yield_panel(panel.time, panel.term, panel.rate)
    # The Gaussian information on λ: T from the path, and 2/a from the first value by its stationary law.
    assert fit.errors["risk_price"] == pytest.approx(1.0 / math.sqrt(5.0 + 2.0 / 0.2), rel=0.05)
    assert any("years only" in remark for remark in fit.remarks)


def test_rates_that_fit_exactly_keep_finite_figures() -> None:
    exact = PanelModel((0.2,), (0.01,), (0.3,), 0.03, 1e-12)
    panel = _panel(exact, np.full(100, 1.0 / 12.0), 8)
    fit = fit_yield_panel(panel.time, panel.term, panel.rate)
    assert fit.mean_reversion == pytest.approx(0.2, rel=1e-3)
    assert math.isfinite(fit.log_likelihood)
    assert any("bound" in remark for remark in fit.remarks)


@pytest.mark.parametrize(
    ("change", "said"),
    [
        ({"factors": 3}, "must be 1 or 2"),
        ({"times": np.arange(5.0)}, "too short"),
        ({"times": np.zeros(30)}, "same date"),
        ({"terms": [1.0, -2.0, 5.0]}, "above 0 and all different"),
        ({"terms": [1.0, 1.0, 5.0]}, "above 0 and all different"),
        ({"terms": [1.0, 2.0]}, "one column a term"),
        ({"rates": np.full((30, 3), np.inf)}, "not finite"),
        ({"rates": np.full((30, 3), 0.02)}, "never move"),
        ({"rates": np.tile([0.01, np.nan, 0.02], (30, 1))}, "term of 2 years"),
        (
            {"terms": [1.0, 2.0], "rates": np.random.default_rng(1).random((30, 2)), "factors": 2},
            "at least 3 terms",
        ),
    ],
)
def test_faulty_panels(change: dict[str, object], said: str) -> None:
    given: dict[str, object] = {
        "times": np.arange(30.0) / 12.0,
        "terms": [1.0, 2.0, 5.0],
        "rates": np.random.default_rng(1).random((30, 3)) / 20.0,
    }
    with pytest.raises(ValueError, match=said):
        fit_yield_panel(**(given | change))  # type: ignore[arg-type]  # faulty on purpose
