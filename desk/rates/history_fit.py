"""What an estimate from a history of short rates comes to: one record for every model, and its verdict."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from desk.rates.history_diagnostics import ResidualTests
from desk.rates.history_likelihood import delta_error, profile_interval
from desk.rates.history_series import RateHistory

__all__ = ["FASTEST", "HistoryFit", "history_fit_record", "mean_reversion_bias"]

FloatArray = NDArray[np.float64]

# Fastest mean reversion looked for [1/year]: beyond it a rate forgets where it was within days.
FASTEST = 200.0
# The 5 % point of the t-ratio of a random walk's slope with a constant, many observations: -2.86. Fuller, W.
# (1976), Introduction to Statistical Time Series, table 8.5.2 (from memory). In terms of the likelihood, half
# its square.
_UNIT_ROOT_RATIO = 2.86
# The stationary likelihood has no value at 0. With an interval that ends this close to 0, in shares of the
# estimate, its shape is that of the conditional one, and the ratio to the standard error serves.
_NEAR_SHARE = 0.2
_PROFILE_POINTS = 25
_PLAIN_LIMIT = 0.5  # 1/year: of the bias, from which it is called large


@dataclass(frozen=True, eq=False)
class HistoryFit:
    """A short-rate model estimated from a history.

    Standard errors come from the observed information, those of derived figures by the delta method; NaN
    where there is none.

    Attributes
    ----------
    model : str
        ``vasicek`` or ``cir``.
    likelihood : str
        ``conditional`` on the first rate, or ``stationary``, with the first from the stationary law.
    mean_reversion, mean_reversion_error : float
        [1/year].
    long_run_rate, long_run_rate_error : float
        [1/year]; NaN where the mean reversion is 0.
    volatility, volatility_error : float
        [1/year per root year]; for cir the coefficient of √r [1/root year].
    starting_rate : float
        The last rate of the history [1/year].
    risk_price : float
        0: a history shows the real world only.
    half_life, half_life_error : float
        ``ln 2 / mean_reversion`` [years].
    stationary_deviation, stationary_deviation_error : float
        Standard deviation of the rate in the long run [1/year].
    covariance : ndarray, shape (3, 3)
        Of mean reversion, long-run rate and volatility.
    log_likelihood : float
    steps : int
        Steps of the history that were used.
    years : float
        Length of the history.
    mean_reversion_interval : tuple of float
        95 % interval from the likelihood profile [1/year].
    profile_mean_reversion, profile_log_likelihood : ndarray, shape (k,)
        The log-likelihood at these speeds, greatest over the other parameters.
    bias : float
        By how much the estimate of mean reversion is expected to be too high [1/year], or NaN; see
        `mean_reversion_bias`.
    corrected_mean_reversion : float
        The estimate less that bias, at least 0 [1/year]; the estimate itself where the bias is unknown.
    tests : ResidualTests
    remarks : tuple of str
        What a user should know before relying on it, each a sentence; the verdict first.
    is_clear_of_zero : bool
        Whether the mean reversion can be told from 0 at 5 %.
    """

    model: str
    likelihood: str
    mean_reversion: float
    mean_reversion_error: float
    long_run_rate: float
    long_run_rate_error: float
    volatility: float
    volatility_error: float
    starting_rate: float
    half_life: float
    half_life_error: float
    stationary_deviation: float
    stationary_deviation_error: float
    covariance: FloatArray
    log_likelihood: float
    steps: int
    years: float
    mean_reversion_interval: tuple[float, float]
    profile_mean_reversion: FloatArray
    profile_log_likelihood: FloatArray
    bias: float
    corrected_mean_reversion: float
    tests: ResidualTests
    remarks: tuple[str, ...]
    risk_price: float = 0.0
    is_clear_of_zero: bool = True


def mean_reversion_bias(mean_reversion: float, *, step: float, steps: int) -> float:
    """Expected error of an estimated mean reversion when the long-run rate is estimated too [1/year].

    ``(5/2 + e^{κΔ} + e^{2κΔ}/2) / (nΔ)``, about 4 over the years covered, however often the rate was noted.
    Tang, C.Y. and Chen, S.X. (2009), Parameter estimation and bias correction for diffusion processes, J.
    Econometrics 149, theorem 3.1.1 (from memory; the tests confirm it by simulation). They find the same
    leading term for the square-root model. Close to a random walk it falls short; see Yu, J. (2012), Bias in
    the estimation of the mean reversion parameter in continuous time models, J. Econometrics 169. Where most
    of the way back is made within one step (κΔ above 1) the formula says nothing, and NaN is given.
    """
    if mean_reversion * step > 1.0:
        return math.nan
    growth = math.exp(mean_reversion * step)
    return (2.5 + growth + 0.5 * growth**2) / (steps * step)


def history_fit_record(
    *,
    model: str,
    likelihood: str,
    history: RateHistory,
    estimate: tuple[float, float, float],
    covariance: FloatArray,
    log_likelihood: float,
    profile: Callable[[float], float],
    slowest: float,
    tests: ResidualTests,
    deviation: tuple[float, FloatArray],
    remarks: tuple[str, ...],
) -> HistoryFit:
    """The record of an estimate: what every model derives from its three parameters alike.

    Parameters
    ----------
    estimate, covariance : tuple of 3 floats, ndarray of shape (3, 3)
        Mean reversion, pull (mean reversion times long-run rate) and volatility.
    profile : callable
        The log-likelihood at a mean reversion, greatest over the other parameters.
    slowest : float
        The least mean reversion that `profile` takes.
    deviation : tuple
        Stationary standard deviation and its slope in the three parameters, shape (3,).
    """
    speed, pull, volatility = estimate
    at_bound = speed <= slowest
    level = math.nan if at_bound else pull / speed
    # From pull to long-run rate.
    turn = np.eye(3)
    if at_bound:
        turn[1] = np.nan
    else:
        turn[1] = [-level / speed, 1.0 / speed, 0.0]
    with np.errstate(invalid="ignore"):
        turned = turn @ covariance @ turn.T if not at_bound else covariance.copy()
    if at_bound:
        turned[1, :] = turned[:, 1] = np.nan
    errors = np.sqrt(np.maximum(np.diag(turned), 0.0))
    speed_error = float(errors[0])
    scale = speed_error if math.isfinite(speed_error) and speed_error > 0.0 else 1.0 / history.years
    interval = profile_interval(
        profile, speed, highest=log_likelihood, scale=scale, lower=slowest, upper=FASTEST
    )
    low = max(slowest, interval[0] - 0.3 * (speed - interval[0]))
    high = min(FASTEST, interval[1] + 0.3 * (interval[1] - speed))
    places = np.unique(np.append(np.linspace(low, high, _PROFILE_POINTS), speed))
    heights = np.array([log_likelihood if place == speed else profile(float(place)) for place in places])
    steps = history.step.size
    bias = mean_reversion_bias(speed, step=history.years / steps, steps=steps)
    if speed >= 0.99 * FASTEST:
        slow = False
    elif likelihood == "stationary":
        slow = speed < _UNIT_ROOT_RATIO * speed_error and interval[0] < _NEAR_SHARE * speed
    else:
        slow = log_likelihood - profile(slowest) < 0.5 * _UNIT_ROOT_RATIO**2
    verdict = _verdict(speed, slow, slowest, interval, bias, history.years, tests)
    return HistoryFit(
        model=model,
        likelihood=likelihood,
        mean_reversion=speed if not at_bound else 0.0,
        mean_reversion_error=speed_error,
        long_run_rate=level,
        long_run_rate_error=float(errors[1]),
        volatility=volatility,
        volatility_error=float(errors[2]),
        starting_rate=float(history.rate[-1]),
        half_life=math.log(2.0) / speed if not at_bound else math.inf,
        half_life_error=math.log(2.0) / speed**2 * speed_error if not at_bound else math.nan,
        stationary_deviation=deviation[0],
        stationary_deviation_error=math.nan if at_bound else delta_error(covariance, deviation[1]),
        covariance=turned,
        log_likelihood=log_likelihood,
        steps=steps,
        years=history.years,
        mean_reversion_interval=(0.0 if interval[0] <= slowest else interval[0], interval[1]),
        profile_mean_reversion=places,
        profile_log_likelihood=heights,
        bias=bias,
        corrected_mean_reversion=max(speed - bias, 0.0) if math.isfinite(bias) else speed,
        tests=tests,
        remarks=(*verdict, *remarks, *history.remarks),
        is_clear_of_zero=not (at_bound or slow),
    )


def _verdict(
    speed: float,
    slow: bool,
    slowest: float,
    interval: tuple[float, float],
    bias: float,
    years: float,
    tests: ResidualTests,
) -> tuple[str, ...]:
    remarks = []
    if speed <= slowest:
        remarks.append(
            "The history shows no mean reversion: the estimate is 0, and there is no long-run rate to go "
            "back to."
        )
    else:
        if slow:
            remarks.append(
                f"The mean reversion of {speed:.3f} a year (95 % interval {max(interval[0], 0.0):.3f} to "
                f"{interval[1]:.3f}) cannot be told from 0: rates that go back to no level at all give as "
                "high an estimate in more than one history of twenty. The long-run rate is no firmer."
            )
        share = bias / speed
        much = "as large as the estimate itself" if share > 0.9 else f"{100.0 * share:.0f} % of the estimate"
        if share > 0.1 or bias > _PLAIN_LIMIT:
            remarks.append(
                f"Estimates of mean reversion from {years:.0f} years come out too high by about {bias:.3f} a "
                f"year, {much}."
            )
    if tests.remarks:
        remarks.append(
            "The fit is poor in part: take the figures as a summary of the history, not as its law."
        )
    remarks.extend(tests.remarks)
    remarks.append(
        "A history shows how the rate moved, not what the market pays for bearing that: the price of "
        "risk is left at 0."
    )
    return tuple(remarks)
