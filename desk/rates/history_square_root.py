"""The square-root model of Cox, Ingersoll and Ross estimated from a history, by the exact law of each step.

Over a step Δ the rate is ``c`` times a noncentral chi-square number with ``d = 4κθ/σ²`` degrees of freedom
and noncentrality ``x e^{-κΔ}/c``, where ``c = σ² B(κ, Δ)/4`` (Cox, Ingersoll and Ross 1985, equation 18).
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.rates.history_bessel import log_bessel_less_argument
from desk.rates.history_diagnostics import residual_tests
from desk.rates.history_fit import FASTEST, HistoryFit, history_fit_record
from desk.rates.history_likelihood import Maximum, maximise
from desk.rates.history_series import RateHistory, rate_history
from desk.rates.limits import first_integral

__all__ = [
    "fit_square_root",
    "square_root_log_density",
    "square_root_log_likelihood",
    "square_root_residuals",
]

FloatArray = NDArray[np.float64]

_SLOWEST = 1e-6  # 1/year: slower than this is no mean reversion
_SPEEDS = np.geomspace(0.005, 50.0, 60)
_FURTHEST = 8.2  # standard deviations: about as far as a chance next to 1 can be told from 1


def fit_square_root(times: ArrayLike, rates: ArrayLike) -> HistoryFit:
    """The square-root model that makes a history most likely, given its first rate.

    Parameters
    ----------
    times : array_like, shape (n,)
        Dates (datetime64) or years, rising; steps of any length.
    rates : array_like, shape (n,)
        Short rates, continuously compounded [1/year], all above 0.

    Raises
    ------
    ValueError
        If a rate is 0 or below, or the history is too short, out of order or never moves.
    """
    history = rate_history(times, rates)
    low = np.flatnonzero(history.rate <= 0.0)
    if low.size:
        row, rate = int(low[0]), float(history.rate[low[0]])
        raise ValueError(
            f"{low.size} of {history.rate.size} rates are 0 or negative (the first is {100.0 * rate:.4g} % "
            f"in row {row + 1}), and the square-root model holds for rates above 0 alone: use the model of "
            "Vasicek, or add a shift to all the rates"
        )
    start, scale = _start(history)
    bounds = np.log([_SLOWEST, 1e-12, 1e-8]), np.log([FASTEST, 1e6, 1e4])

    def log_likelihood(point: FloatArray) -> float:
        speed, pull, volatility = np.exp(point).tolist()
        return square_root_log_likelihood(history, mean_reversion=speed, pull=pull, volatility=volatility)

    found = maximise(log_likelihood, start, scale=scale, lower=bounds[0], upper=bounds[1])
    estimate = np.exp(found.point)
    speed, pull, volatility = estimate.tolist()
    profile = _Profile(history, found, (bounds[0][1:], bounds[1][1:]))
    spread = volatility * math.sqrt(0.5 * pull) / speed
    slope = spread * np.array([-1.0 / speed, 0.5 / pull, 1.0 / volatility])
    return history_fit_record(
        model="cir",
        likelihood="conditional",
        history=history,
        estimate=(speed, pull, volatility),
        covariance=found.covariance * np.outer(estimate, estimate),
        log_likelihood=found.value,
        profile=profile,
        slowest=_SLOWEST * (1.0 + 1e-6),
        tests=residual_tests(
            square_root_residuals(history, mean_reversion=speed, pull=pull, volatility=volatility)
        ),
        deviation=(spread, slope),
        remarks=_remarks(found, pull, volatility),
    )


def square_root_log_likelihood(
    history: RateHistory, *, mean_reversion: float, pull: float, volatility: float
) -> float:
    """Log-likelihood of a history of positive rates given its first; see `square_root_log_density`."""
    terms = square_root_log_density(
        history.before,
        history.after,
        history.step,
        mean_reversion=mean_reversion,
        pull=pull,
        volatility=volatility,
    )
    return float(np.sum(terms))


def square_root_log_density(
    before: ArrayLike,
    after: ArrayLike,
    step: ArrayLike,
    *,
    mean_reversion: float,
    pull: float,
    volatility: float,
) -> FloatArray:
    """Logarithm of the density of the rate after a step, given the rate before it.

    Parameters
    ----------
    before, after : array_like, shape (n,)
        Above 0 [1/year].
    step : array_like, shape (n,)
        Above 0 [years].
    mean_reversion : float
        κ [1/year], any sign.
    pull : float
        ``κθ`` [1/year²], above 0.
    volatility : float
        σ [1/root year], above 0.

    Returns
    -------
    ndarray, shape (n,)

    Notes
    -----
    With ``y = x'/c``, ``λ = x e^{-κΔ}/c`` and ``q = d/2 - 1`` it is ``-ln 2c - ½(√y - √λ)² + ½q ln(y/λ) +
    ln I_q(√(λy)) - √(λy)``, in which nothing overflows and nothing large cancels.
    """
    first, last = np.asarray(before, dtype=np.float64), np.asarray(after, dtype=np.float64)
    years = np.asarray(step, dtype=np.float64)
    unit = 0.25 * volatility**2 * first_integral(mean_reversion, years)
    order = 2.0 * pull / volatility**2 - 1.0
    carried = np.exp(-mean_reversion * years) * first
    root_last, root_carried = np.sqrt(last), np.sqrt(carried)
    argument = root_last * root_carried / unit
    return np.asarray(
        -np.log(2.0 * unit)
        - 0.5 * (root_last - root_carried) ** 2 / unit
        + 0.5 * order * (np.log(last / first) + mean_reversion * years)
        + log_bessel_less_argument(order, argument)
    )


def square_root_residuals(
    history: RateHistory, *, mean_reversion: float, pull: float, volatility: float
) -> FloatArray:
    """Normal quantile of the exact distribution function at what came, shape (n - 1,).

    Independent standard normal under the model; held within ±8.2.
    """
    from scipy.special import chndtr, ndtri

    step = history.step
    unit = 0.25 * volatility**2 * first_integral(mean_reversion, step)
    distance = np.exp(-mean_reversion * step) * history.before / unit
    freedom = 4.0 * pull / volatility**2
    mean = freedom + distance
    value = history.after / unit
    chance = chndtr(value, freedom, distance)
    # Where the function gives up: Sankaran (1963), Approximations to the non-central chi-square distribution,
    # Biometrika 50, a power of the number that is next to normal.
    lost = ~np.isfinite(chance)
    power = 1.0 - 2.0 / 3.0 * mean * (freedom + 3.0 * distance) / (freedom + 2.0 * distance) ** 2
    share = (freedom + 2.0 * distance) / mean**2
    tilt = (power - 1.0) * (1.0 - 3.0 * power)
    centre = 1.0 + power * share * (power - 1.0 - 0.5 * (2.0 - power) * tilt * share)
    width = power * np.sqrt(2.0 * share) * (1.0 + 0.5 * tilt * share)
    with np.errstate(invalid="ignore", over="ignore"):
        near = ((value / mean) ** power - centre) / width
    quantile = np.where(lost, near, ndtri(np.clip(np.where(lost, 0.5, chance), 1e-300, 1.0)))
    quantile = np.where(np.isfinite(quantile), quantile, np.sign(value - mean) * _FURTHEST)
    return np.clip(quantile, -_FURTHEST, _FURTHEST)


class _Profile:
    """The greatest log-likelihood at a mean reversion; each search begins where the nearest one ended."""

    def __init__(self, history: RateHistory, best: Maximum, bounds: tuple[FloatArray, FloatArray]) -> None:
        self._history = history
        self._bounds = bounds
        self._known = {float(math.exp(best.point[0])): best.point[1:]}
        self._values: dict[float, float] = {}
        error = np.sqrt(np.maximum(np.diag(best.covariance)[1:], 1e-12))
        self._scale = np.where(np.isfinite(error), error, 0.1)

    def __call__(self, speed: float) -> float:
        if speed in self._values:
            return self._values[speed]
        nearest = min(self._known, key=lambda known: abs(known - speed))

        def log_likelihood(point: FloatArray) -> float:
            pull, volatility = np.exp(point).tolist()
            return square_root_log_likelihood(
                self._history, mean_reversion=speed, pull=pull, volatility=volatility
            )

        found = maximise(
            log_likelihood,
            self._known[nearest],
            scale=self._scale,
            lower=self._bounds[0],
            upper=self._bounds[1],
            information=False,
        )
        self._known[speed] = found.point
        self._values[speed] = found.value
        return found.value


def _start(history: RateHistory) -> tuple[FloatArray, FloatArray]:
    """Logarithms of the parameters by least squares weighted with 1/(x B), best of a grid of speeds."""
    step, before, after = history.step, history.before, history.after
    best, chosen = -math.inf, (0.1, 0.1 * float(before.mean()), 0.1)
    for speed in _SPEEDS.tolist():
        length = first_integral(speed, step)
        weight = 1.0 / (before * length)
        rest = after - np.exp(-speed * step) * before
        pull = float(np.sum(weight * rest * length) / np.sum(weight * length**2))
        pull = max(pull, 1e-3 * speed * float(before.mean()))
        variance = float(np.mean(weight * (rest - pull * length) ** 2))
        height = -0.5 * (step.size * math.log(variance) - float(np.sum(np.log(weight))))
        if height > best:
            best, chosen = height, (speed, pull, math.sqrt(variance))
    scale = np.array([math.sqrt(2.0 / (chosen[0] * history.years)), 0.3, 1.0 / math.sqrt(2.0 * step.size)])
    return np.log(chosen), np.minimum(scale, 1.0)


def _remarks(found: Maximum, pull: float, volatility: float) -> tuple[str, ...]:
    remarks = []
    if 2.0 * pull < volatility**2:
        remarks.append(
            "At these values the rate can reach 0 (the condition of Feller, twice mean reversion times "
            "long-run rate at least volatility squared, fails)."
        )
    if not found.converged:
        remarks.append(
            "The search for the greatest likelihood did not come to rest: the estimate is provisional."
        )
    if found.point[0] >= math.log(FASTEST) - 1e-6:
        remarks.append(
            f"The mean reversion is at the fastest that is looked for, {FASTEST:g} a year: each rate has "
            "hardly anything to do with the one before, and no model of this kind fits."
        )
    return tuple(remarks)
