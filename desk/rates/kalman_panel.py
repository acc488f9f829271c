"""A panel of zero rates as a Gaussian state space: its exact log-likelihood, and the Kalman filter itself.

The short rate is ``μ + Σ xᵢ`` with ``dxᵢ = (σᵢλᵢ - aᵢxᵢ) dt + σᵢ dWᵢ`` in the real world and without
``σᵢλᵢ`` where bonds are priced, so that the zero rate to τ is ``μ + [Σ B(aᵢ,τ) xᵢ - ½V(τ)]/τ``. Each zero
rate observed carries an independent normal error of one standard deviation; the factors begin in their
stationary law.

The log-likelihood needs no loop over dates: with the factors at all dates as one vector x,
``p(y) = p(y|x) p(x) / p(x|y)`` for every x, taken at the mean of ``p(x|y)``. The precision of that law is a
band matrix of width 2k - 1, and its Cholesky factor costs next to nothing. It is the number that the Kalman
filter arrives at by prediction errors.

References
----------
Kalman, R.E. (1960), A new approach to linear filtering and prediction problems, J. Basic Engineering 82.
Duan, J.-C. and Simonato, J.-G. (1999), Estimating and testing exponential-affine term structure models by
Kalman filter, Review of Quantitative Finance and Accounting 13. Rue, H. and Held, L. (2005), Gaussian Markov
Random Fields, section 2.4 (band Cholesky).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.rates.limits import first_integral, product_integral

__all__ = [
    "FilteredPanel",
    "PanelModel",
    "YieldPanel",
    "kalman_filter",
    "panel_log_likelihood",
    "panel_states",
]

FloatArray = NDArray[np.float64]

_LOG_TWO_PI = math.log(2.0 * math.pi)


@dataclass(frozen=True, eq=False)
class YieldPanel:
    """Zero rates at several terms and dates.

    Attributes
    ----------
    time : ndarray, shape (n,)
        [years], rising strictly.
    term : ndarray, shape (m,)
        [years], above 0.
    rate : ndarray, shape (n, m)
        Continuously compounded [1/year]; NaN where there is no quote.
    """

    time: FloatArray
    term: FloatArray
    rate: FloatArray

    @property
    def quoted(self) -> NDArray[np.bool_]:
        """Where there is a quote, shape (n, m)."""
        return np.isfinite(self.rate)


@dataclass(frozen=True)
class PanelModel:
    """One or two Gaussian factors and an error of measurement.

    Attributes
    ----------
    mean_reversion, volatility, risk_price : tuple of float, length k
        aᵢ above 0 [1/year], σᵢ above 0 [1/year per root year], λᵢ [1/root year].
    level : float
        μ [1/year].
    error : float
        Standard deviation of the error of measurement, above 0 [1/year].
    correlation : float
        Between two factors, strictly between -1 and 1.
    """

    mean_reversion: tuple[float, ...]
    volatility: tuple[float, ...]
    risk_price: tuple[float, ...]
    level: float
    error: float
    correlation: float = 0.0

    @property
    def factor_count(self) -> int:
        """Number k of factors."""
        return len(self.mean_reversion)

    def pair_weight(self, row: int, column: int) -> float:
        """``ρᵢⱼσᵢσⱼ``."""
        weight = self.volatility[row] * self.volatility[column]
        return weight if row == column else self.correlation * weight

    @property
    def mean(self) -> FloatArray:
        """Long-run means of the factors in the real world, ``σᵢλᵢ/aᵢ``, shape (k,)."""
        drift = np.array(self.volatility) * np.array(self.risk_price)
        return np.asarray(drift / np.array(self.mean_reversion))

    def covariance(self, step: ArrayLike) -> FloatArray:
        """Covariance of what a step adds to the factors, the shape of `step` and (k, k)."""
        years = np.asarray(step, dtype=np.float64)
        result = np.empty((*years.shape, self.factor_count, self.factor_count))
        for row, one in enumerate(self.mean_reversion):
            for column, two in enumerate(self.mean_reversion):
                result[..., row, column] = self.pair_weight(row, column) * first_integral(one + two, years)
        return result

    def stationary(self) -> FloatArray:
        """Covariance of the factors in the long run, shape (k, k)."""
        speeds = np.array(self.mean_reversion)
        weight = [
            [self.pair_weight(row, column) for column in range(speeds.size)] for row in range(speeds.size)
        ]
        return np.asarray(np.array(weight) / (speeds[:, None] + speeds))

    def decay(self, step: ArrayLike) -> FloatArray:
        """What a step leaves of the factors' distance from their means, the shape of `step` and (k,)."""
        years = np.asarray(step, dtype=np.float64)
        return np.asarray(np.exp(-years[..., None] * np.array(self.mean_reversion)))

    def loadings(self, term: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Zero rates as ``constant + loading · (x - mean)``: shapes (m,) and (m, k)."""
        exposure = np.stack([first_integral(speed, term) for speed in self.mean_reversion], axis=-1)
        variance = np.zeros(term.size)
        for row, one in enumerate(self.mean_reversion):
            for column, two in enumerate(self.mean_reversion):
                variance += self.pair_weight(row, column) * product_integral(one, two, term)
        loading = exposure / term[:, None]
        return self.level + loading @ self.mean - 0.5 * variance / term, loading


def panel_log_likelihood(panel: YieldPanel, model: PanelModel) -> float:
    """Log-likelihood of all the quotes of a panel.

    Returns minus infinity where the covariances are not positive definite in floating point.
    """
    return _solved(panel, model)[0]


def panel_states(panel: YieldPanel, model: PanelModel) -> FloatArray:
    """Means of the factors at every date given all quotes, shape (n, k); at the last date the filter's."""
    return _solved(panel, model)[1] + model.mean


def _solved(panel: YieldPanel, model: PanelModel) -> tuple[float, FloatArray]:
    """Log-likelihood, and the means of the factors less their long-run means, shape (n, k)."""
    from scipy.linalg import LinAlgError, cho_solve_banded, cholesky_banded

    constant, loading = model.loadings(panel.term)
    quoted = panel.quoted
    dates, count = panel.time.size, model.factor_count
    gap = np.where(quoted, panel.rate - constant, 0.0)
    inverse = 1.0 / model.error**2
    squares = (loading[:, :, None] * loading[:, None, :]).reshape(panel.term.size, -1)
    # dimensions: date, factor, factor
    precision = (inverse * (quoted @ squares)).reshape(dates, count, count)
    first, first_log = _inverse(model.stationary()[None])
    step = np.diff(panel.time)
    noise, noise_log = _inverse(model.covariance(step))
    decay = model.decay(step)
    beside = -noise * decay[:, None, :]
    precision[0] += first[0]
    precision[1:] += noise
    precision[:-1] -= decay[:, :, None] * beside
    band = np.zeros((2 * count, dates, count))
    for column in range(count):
        for row in range(count):
            if row >= column:
                band[row - column, :, column] = precision[:, row, column]
            band[count + row - column, :-1, column] = beside[:, row, column]
    try:
        root = cholesky_banded(
            band.reshape(2 * count, dates * count), overwrite_ab=True, lower=True, check_finite=False
        )
    except (LinAlgError, ValueError):
        return -math.inf, np.zeros((dates, count))
    pull = inverse * (gap @ loading)
    state = cho_solve_banded((root, True), pull.reshape(-1), check_finite=False).reshape(dates, count)
    left = np.where(quoted, gap - state @ loading.T, 0.0)
    moved = state[1:] - decay * state[:-1]
    distance = (
        inverse * float(np.vdot(left, left))
        + float(state[0] @ first[0] @ state[0])
        + float(np.einsum("ti,tij,tj", moved, noise, moved))
    )
    size = int(np.count_nonzero(quoted))
    logs = (
        size * (_LOG_TWO_PI + 2.0 * math.log(model.error))
        + float(first_log.sum())
        + float(noise_log.sum())
        + 2.0 * float(np.sum(np.log(root[0])))
    )
    return -0.5 * (distance + logs), state


def _inverse(matrix: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Inverses and log-determinants of covariances of one or two numbers, shapes (n, k, k) and (n,)."""
    with np.errstate(divide="ignore", invalid="ignore"):
        if matrix.shape[-1] == 1:
            return 1.0 / matrix, np.log(matrix[:, 0, 0])
        one, two, both = matrix[:, 0, 0], matrix[:, 1, 1], matrix[:, 0, 1]
        size = one * two - both**2
        adjugate = np.empty(matrix.shape)
        adjugate[:, 0, 0], adjugate[:, 1, 1] = two, one
        adjugate[:, 0, 1] = adjugate[:, 1, 0] = -both
        return adjugate / size[:, None, None], np.log(size)


@dataclass(frozen=True, eq=False)
class FilteredPanel:
    """What the Kalman filter knew at each date.

    Attributes
    ----------
    state : ndarray, shape (n, k)
        Mean of the factors given the quotes up to and including the date.
    surprise : ndarray, shape (n, m)
        Quote less its forecast from the date before; NaN where there is no quote [1/year].
    standardised : ndarray, shape (d,)
        Mean surprise of the date over its standard deviation, for the dates with a quote: independent
        standard normal under the model.
    log_likelihood : float
        By prediction errors; equals `panel_log_likelihood`.
    """

    state: FloatArray
    surprise: FloatArray
    standardised: FloatArray
    log_likelihood: float


def kalman_filter(panel: YieldPanel, model: PanelModel) -> FilteredPanel:
    """The filter, date by date: for its forecasts and their errors. `panel_log_likelihood` is much faster."""
    constant, loading = model.loadings(panel.term)
    quoted = panel.quoted
    dates, count = panel.time.size, model.factor_count
    step = np.diff(panel.time)
    noise, decay = model.covariance(step), model.decay(step)
    mean, spread = np.zeros(count), model.stationary()
    state, surprise = np.empty((dates, count)), np.full(panel.rate.shape, np.nan)
    standardised, total = [], 0.0
    for date in range(dates):
        if date:
            mean = decay[date - 1] * mean
            spread = decay[date - 1][:, None] * spread * decay[date - 1] + noise[date - 1]
        seen = quoted[date]
        if seen.any():
            exposure = loading[seen]
            error = panel.rate[date, seen] - constant[seen] - exposure @ mean
            carried = exposure @ spread
            variance = carried @ exposure.T + model.error**2 * np.eye(error.size)
            gain = np.linalg.solve(variance, carried).T
            surprise[date, seen] = error
            standardised.append(float(error.sum()) / math.sqrt(float(variance.sum())))
            total -= 0.5 * (
                error.size * _LOG_TWO_PI
                + float(np.linalg.slogdet(variance)[1])
                + float(error @ np.linalg.solve(variance, error))
            )
            mean = mean + gain @ error
            # Joseph's form keeps the covariance symmetric and positive.
            kept = np.eye(count) - gain @ exposure
            spread = kept @ spread @ kept.T + model.error**2 * gain @ gain.T
        state[date] = mean
    return FilteredPanel(state + model.mean, surprise, np.array(standardised), total)
