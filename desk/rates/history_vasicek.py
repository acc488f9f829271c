"""The model of Vasicek estimated from a history of short rates, by the exact law of each step.

Over a step Δ the rate goes to ``e^{-κΔ} r + α B(κ, Δ)`` on average, with the variance ``σ² B(2κ, Δ)``, where
``α = κθ`` and ``B(a, t) = (1 - e^{-at})/a``. For a given κ the best α and σ are a weighted least squares fit,
so that the likelihood is a function of κ alone: its profile. With equal steps and the likelihood conditional
on the first rate this is the regression of each rate on the one before.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.rates.history_diagnostics import residual_tests
from desk.rates.history_fit import FASTEST, HistoryFit, history_fit_record
from desk.rates.history_likelihood import observed_covariance
from desk.rates.history_series import RateHistory, rate_history
from desk.rates.limits import first_integral

__all__ = ["fit_vasicek", "vasicek_log_likelihood", "vasicek_residuals"]

FloatArray = NDArray[np.float64]

_LOG_TWO_PI = math.log(2.0 * math.pi)
_GRID = 121
_SLOWEST_STATIONARY = 1e-8  # 1/year


def fit_vasicek(times: ArrayLike, rates: ArrayLike, *, stationary: bool = False) -> HistoryFit:
    """The model of Vasicek that makes a history most likely.

    Parameters
    ----------
    times : array_like, shape (n,)
        Dates (datetime64) or years, rising; steps of any length.
    rates : array_like, shape (n,)
        Short rates, continuously compounded [1/year].
    stationary : bool
        Take the first rate from the stationary law, instead of as given.

    Raises
    ------
    ValueError
        If the history is too short, out of order or never moves.

    References
    ----------
    Vasicek (1977); Brigo, D. and Mercurio, F. (2006), Interest Rate Models, section 3.2.1 (maximum
    likelihood). The mean reversion is held at 0 or above: where the history would have it negative, it is 0
    and a remark says so.
    """
    history = rate_history(times, rates)
    best = _best_speed(history, stationary)
    (pull,), (variance,), _ = _concentrated(history, np.array([best]), stationary)
    estimate = (best, float(pull), math.sqrt(float(variance)))
    volatility = estimate[2]

    def log_likelihood(point: FloatArray) -> float:
        return vasicek_log_likelihood(
            history,
            mean_reversion=float(point[0]),
            pull=float(point[1]),
            volatility=float(point[2]),
            stationary=stationary,
        )

    highest = log_likelihood(np.array(estimate))
    guess = np.array(
        [
            math.sqrt(2.0 * max(best, 0.01) / history.years),
            volatility / math.sqrt(history.years),
            0.01 * volatility,
        ]
    )
    # Where the mean reversion is held at 0 the likelihood still rises beyond: it has no error of its own.
    free = np.arange(0 if best > 0.0 else 1, 3)
    covariance = np.full((3, 3), np.nan)
    covariance[np.ix_(free, free)] = observed_covariance(
        log_likelihood, np.array(estimate), scale=guess, free=free
    )
    spread = volatility / math.sqrt(2.0 * best) if best > 0.0 else math.inf
    slope = np.array([-0.5 * spread / best, 0.0, spread / volatility]) if best > 0.0 else np.zeros(3)
    return history_fit_record(
        model="vasicek",
        likelihood="stationary" if stationary else "conditional",
        history=history,
        estimate=estimate,
        covariance=covariance,
        log_likelihood=highest,
        profile=lambda speed: float(_concentrated(history, np.array([speed]), stationary)[2][0]),
        slowest=_SLOWEST_STATIONARY if stationary else 0.0,
        tests=residual_tests(
            vasicek_residuals(history, mean_reversion=best, pull=estimate[1], volatility=volatility)
        ),
        deviation=(spread, slope),
        remarks=_edge_remarks(best),
    )


def vasicek_log_likelihood(
    history: RateHistory, *, mean_reversion: float, pull: float, volatility: float, stationary: bool = False
) -> float:
    """Log-likelihood of a history.

    Parameters
    ----------
    history : RateHistory
    mean_reversion : float
        κ [1/year]; above 0 when `stationary`.
    pull : float
        ``κθ`` [1/year²].
    volatility : float
        σ [1/year per root year], above 0.
    stationary : bool
        Include the first rate, from its stationary law.
    """
    if volatility <= 0.0 or (stationary and mean_reversion <= 0.0):
        return -math.inf
    residual, scale = _steps(history, mean_reversion, pull)
    scale = scale * volatility**2
    total = -0.5 * float(np.sum(residual**2 / scale + np.log(scale))) - 0.5 * residual.size * _LOG_TWO_PI
    if stationary:
        first = volatility**2 / (2.0 * mean_reversion)
        gap = float(history.rate[0]) - pull / mean_reversion
        total -= 0.5 * (gap**2 / first + math.log(first) + _LOG_TWO_PI)
    return total


def vasicek_residuals(
    history: RateHistory, *, mean_reversion: float, pull: float, volatility: float
) -> FloatArray:
    """Standardised residuals of the steps, shape (n - 1,): independent standard normal under the model."""
    residual, scale = _steps(history, mean_reversion, pull)
    return np.asarray(residual / (volatility * np.sqrt(scale)))


def _steps(history: RateHistory, speed: float, pull: float) -> tuple[FloatArray, FloatArray]:
    """Residual of each step, and its variance per unit of σ²."""
    step = history.step
    mean = np.exp(-speed * step) * history.before + pull * first_integral(speed, step)
    return history.after - mean, first_integral(2.0 * speed, step)


def _concentrated(
    history: RateHistory, speeds: FloatArray, stationary: bool
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Best pull, best variance σ² and the log-likelihood there, one for each mean reversion, shape (k,)."""
    step = history.step
    pulls, variances, heights = (np.empty(speeds.size) for _ in range(3))
    for index, speed in enumerate(speeds.tolist()):
        residual, scale = _steps(history, speed, 0.0)
        length = first_integral(speed, step)
        top, bottom = float(np.sum(residual * length / scale)), float(np.sum(length**2 / scale))
        logs, count = float(np.sum(np.log(scale))), step.size
        if stationary:
            # The first rate is one more observation: α/κ with the variance σ²/(2κ).
            top += 2.0 * float(history.rate[0])
            bottom += 2.0 / speed
            logs -= math.log(2.0 * speed)
            count += 1
        pull = top / bottom
        squares = float(np.sum((residual - pull * length) ** 2 / scale))
        if stationary:
            squares += 2.0 * speed * (float(history.rate[0]) - pull / speed) ** 2
        pulls[index], variances[index] = pull, squares / count
        heights[index] = -0.5 * (count * (math.log(squares / count) + 1.0 + _LOG_TWO_PI) + logs)
    return pulls, variances, heights


def _best_speed(history: RateHistory, stationary: bool) -> float:
    """The mean reversion of the greatest likelihood."""
    step = history.step
    if not stationary and np.ptp(step) <= 1e-9 * float(step.mean()):
        before, after = history.before - history.before.mean(), history.after - history.after.mean()
        length = float(before @ before)
        slope = float(before @ after) / length if length > 0.0 else 1.0
        if slope >= 1.0:
            return 0.0
        fastest = FASTEST
        return min(-math.log(slope) / float(step.mean()), fastest) if slope > 0.0 else fastest
    from scipy.optimize import minimize_scalar

    grid = np.geomspace(1e-5, FASTEST, _GRID)
    heights = _concentrated(history, grid, stationary)[2]
    if not stationary:
        grid, heights = (
            np.append(0.0, grid),
            np.append(_concentrated(history, np.zeros(1), False)[2], heights),
        )
    top = int(np.argmax(heights))
    low, high = grid[max(top - 1, 0)], grid[min(top + 1, grid.size - 1)]
    found = minimize_scalar(
        lambda speed: -float(_concentrated(history, np.array([speed]), stationary)[2][0]),
        bounds=(low, high),
        method="bounded",
        options={"xatol": 1e-10 * float(high)},
    )
    return float(found.x) if -float(found.fun) > heights[top] else float(grid[top])


def _edge_remarks(speed: float) -> tuple[str, ...]:
    if speed >= FASTEST:
        return (
            f"The mean reversion is at the fastest that is looked for, {FASTEST:g} a year: each rate has "
            "hardly anything to do with the one before, and no model of this kind fits.",
        )
    return ()
