"""The figures of a fit with their intervals, and the sentence that judges it."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from desk.book.arrays import FloatArray
from desk.rates.history_fit import FASTEST, HistoryFit
from desk.rates.kalman_fit import PanelFit
from desk.rates.option_calibration import VolatilityFit
from desk.scenarios.calibration_records import Figure

__all__ = ["figures_of", "judged"]

_FAR = 1.959963984540054
_POSITIVE = (
    *("mean_reversion", "volatility", "second_mean_reversion", "second_volatility", "measurement_error"),
    *("half_life", "stationary_deviation"),
)
# What is called poor, in shares of the mean quoted volatility: root mean square, and largest.
_POOR_SHARE, _FAR_SHARE = 0.05, 0.15
_POOR_ERROR = 1e-3  # 1/year: ten basis points of a yield left unexplained
_CLEAR = 1.96  # standard errors from 0

Fit = HistoryFit | VolatilityFit | PanelFit


def figures_of(fit: Fit) -> tuple[Figure, ...]:
    """Parameters of a fit with errors and 95 % intervals, then what is derived from them."""
    if isinstance(fit, HistoryFit):
        return _of_history(fit)
    if isinstance(fit, PanelFit):
        names = [name for name in _PANEL_ORDER if getattr(fit, name) is not None]
        return tuple(
            _figure(name, getattr(fit, name), fit.errors.get(name, math.nan), is_derived=name in _BESIDE)
            for name in names
        )
    return tuple(
        _figure(name, _value(fit, name), float(error))
        for name, error in zip(fit.parameters, fit.errors, strict=True)
    )


_PANEL_ORDER = (
    *("mean_reversion", "volatility", "second_mean_reversion", "second_volatility", "factor_correlation"),
    *("long_run_rate", "starting_rate", "risk_price", "second_risk_price"),
    *("real_world_rate", "measurement_error"),
)
_BESIDE = ("real_world_rate", "measurement_error")


def _of_history(fit: HistoryFit) -> tuple[Figure, ...]:
    low, high = fit.mean_reversion_interval
    found = [
        Figure("mean_reversion", fit.mean_reversion, fit.mean_reversion_error, low, high),
        _figure("long_run_rate", fit.long_run_rate, fit.long_run_rate_error, positive=fit.model == "cir"),
        _figure("volatility", fit.volatility, fit.volatility_error),
        Figure("starting_rate", fit.starting_rate, math.nan, math.nan, math.nan),
    ]
    if math.isfinite(fit.half_life):
        # The interval of the mean reversion, turned over: it is right where that of one error is not.
        longest = math.log(2.0) / low if low > 0.0 else math.inf
        found.append(
            Figure(
                "half_life",
                fit.half_life,
                fit.half_life_error,
                math.log(2.0) / high,
                longest,
                is_derived=True,
            )
        )
    if math.isfinite(fit.stationary_deviation):
        found.append(
            _figure(
                "stationary_deviation",
                fit.stationary_deviation,
                fit.stationary_deviation_error,
                is_derived=True,
            )
        )
    if math.isfinite(fit.bias) and fit.mean_reversion > 0.0:
        found.append(
            Figure(
                "corrected_mean_reversion",
                fit.corrected_mean_reversion,
                math.nan,
                math.nan,
                math.nan,
                is_derived=True,
            )
        )
    return tuple(found)


def _value(fit: Any, name: str) -> float:
    return float(getattr(fit, name))


def _figure(
    name: str, value: float, error: float, *, positive: bool = False, is_derived: bool = False
) -> Figure:
    low, high = value - _FAR * error, value + _FAR * error
    if positive or name in _POSITIVE:
        low = max(low, 0.0) if math.isfinite(low) else low
    if name == "factor_correlation" and math.isfinite(low):
        low, high = max(low, -1.0), min(high, 1.0)
    return Figure(name, value, error, low, high, is_derived=is_derived)


def judged(fit: Fit, *, unit: FloatArray | None = None) -> tuple[bool, str]:
    """Whether a fit is poor, and a sentence that says how good it is.

    Parameters
    ----------
    fit : HistoryFit, VolatilityFit or PanelFit
    unit : ndarray, shape (m,), optional
        For quoted volatilities: what the residual of each is measured by, the mean quote of its kind.
    """
    if isinstance(fit, HistoryFit):
        return _judged_history(fit)
    if isinstance(fit, PanelFit):
        return _judged_panel(fit)
    return _judged_volatilities(fit, np.ones(fit.residual_bp.size) if unit is None else unit)


def _judged_history(fit: HistoryFit) -> tuple[bool, str]:
    reasons = []
    if fit.mean_reversion <= 0.0:
        reasons.append("the history shows no mean reversion at all")
    elif fit.mean_reversion >= 0.99 * FASTEST:
        reasons.append("each rate has hardly anything to do with the one before")
    elif not fit.is_clear_of_zero:
        reasons.append("the mean reversion cannot be told from 0, nor the long-run rate from others")
    if fit.tests.remarks:
        reasons.append("the residuals do not look as the model says")
    if reasons:
        return True, f"The fit is poor: {'; '.join(reasons)}."
    return False, (
        f"The fit is sound: over {fit.steps} steps nothing in the residuals speaks against the model, and "
        "the mean reversion is clear of 0."
    )


def _judged_volatilities(fit: VolatilityFit, unit: FloatArray) -> tuple[bool, str]:
    part = 1e-4 * fit.residual_bp / unit
    if not np.isfinite(part).all():
        return True, "The fit is poor: some prices of the model belong to no volatility at all."
    share, worst = float(np.sqrt(np.mean(part**2))), int(np.argmax(np.abs(part)))
    size = f"{100.0 * share:.1f} % of the mean quote"
    if np.ptp(unit) == 0.0:
        # Normal and lognormal volatilities have no basis points in common.
        size = f"{fit.rmse_bp:.1f} basis points (root mean square), {size}"
    if share > _POOR_SHARE or abs(part[worst]) > _FAR_SHARE:
        return True, (
            f"The fit is poor: the residuals are {size}, the largest {fit.residual_bp[worst]:+.0f} basis "
            f"points for the {fit.instruments[worst]}."
        )
    if not fit.converged:
        return True, f"The fit is provisional: its search did not come to rest; the residuals are {size}."
    if part.size <= len(fit.parameters):
        return True, "The fit says little: there are as many parameters as quotes, so that any would fit."
    return False, f"The fit is close: the residuals are {size}."


def _judged_panel(fit: PanelFit) -> tuple[bool, str]:
    left = f"{1e4 * fit.measurement_error:.1f} basis points (standard deviation)"
    worst = int(np.argmax(fit.rmse_bp))
    where = f"the most at {fit.term[worst]:g} years ({fit.rmse_bp[worst]:.1f})"
    if fit.measurement_error > _POOR_ERROR:
        return True, f"The fit is poor: {left} of the yields are left unexplained, {where}."
    return False, f"The fit is close: {left} of the yields are left unexplained, {where}."
