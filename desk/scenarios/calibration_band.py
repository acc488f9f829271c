"""What a model fitted to a history says of it: from its first rate on, and from each rate to the next."""

from __future__ import annotations

import numpy as np

from desk.book.arrays import FloatArray
from desk.book.model import History
from desk.rates.history_fit import HistoryFit
from desk.rates.limits import first_integral
from desk.scenarios.calibration_records import HistoryBand

__all__ = ["history_band"]

_FAR = 1.959963984540054
_LARGE_NONCENTRALITY = 1e4  # from here on the normal law serves


def history_band(fit: HistoryFit, data: History) -> HistoryBand:
    """Mean and 95 % band from the first rate on, and the forecasts from each rate to the next."""
    time = (data.date - data.date[0]).astype(np.float64) / 365.0
    rate = data.rate
    if fit.mean_reversion > 0.0:
        pull = fit.mean_reversion * fit.long_run_rate
    else:
        # Without mean reversion the best drift of a Gaussian rate is that from its first to its last.
        pull = float(rate[-1] - rate[0]) / fit.years if fit.model == "vasicek" else 0.0
    mean, variance = _moments(fit, pull, float(rate[0]), time)
    forecast, forecast_variance = _moments(fit, pull, rate[:-1], np.diff(time))
    spread = _FAR * np.sqrt(variance)
    low, high = mean - spread, mean + spread
    if fit.model == "cir" and pull > 0.0:
        low, high = _square_root_band(fit, float(rate[0]), time, (low, high))
    return HistoryBand(mean, low, high, forecast, np.sqrt(forecast_variance))


def _moments(
    fit: HistoryFit, pull: float, rate: float | FloatArray, time: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Mean and variance of the rate after a time: Vasicek (1977); Cox, Ingersoll and Ross (1985), eq. 19."""
    speed = fit.mean_reversion
    decay, length = np.exp(-speed * time), first_integral(speed, time)
    mean = rate * decay + pull * length
    if fit.model == "cir":
        variance = fit.volatility**2 * (rate * decay * length + 0.5 * pull * length**2)
    else:
        variance = fit.volatility**2 * first_integral(2.0 * speed, time)
    return np.asarray(mean), np.asarray(variance)


def _square_root_band(
    fit: HistoryFit, first: float, time: FloatArray, normal: tuple[FloatArray, FloatArray]
) -> tuple[FloatArray, FloatArray]:
    """2.5 and 97.5 per cent points of the exact law of the rate; the normal ones where it is next to that."""
    from scipy.stats import ncx2

    unit = 0.25 * fit.volatility**2 * first_integral(fit.mean_reversion, time)
    freedom = 4.0 * fit.mean_reversion * fit.long_run_rate / fit.volatility**2
    with np.errstate(divide="ignore"):
        distance = np.where(unit > 0.0, first * np.exp(-fit.mean_reversion * time) / unit, np.inf)
    exact = distance < _LARGE_NONCENTRALITY
    bounds = []
    for chance, by_moments in zip((0.025, 0.975), normal, strict=True):
        edge = by_moments.copy()
        edge[exact] = unit[exact] * ncx2.ppf(chance, freedom, distance[exact])
        bounds.append(np.maximum(edge, 0.0))
    return bounds[0], bounds[1]
