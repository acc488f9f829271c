"""Gaussian rates of one or two factors estimated from a panel of zero rates, by maximum likelihood."""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import product

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.rates.history_diagnostics import ResidualTests, residual_tests
from desk.rates.history_likelihood import Maximum, delta_error, maximise
from desk.rates.history_series import history_years, scale_remarks
from desk.rates.kalman_panel import PanelModel, YieldPanel, kalman_filter, panel_log_likelihood, panel_states

__all__ = ["PanelFit", "fit_yield_panel", "yield_panel"]

FloatArray = NDArray[np.float64]

_POOR_ERROR = 1e-3  # 10 basis points: a larger error of measurement is called poor
_LASTING = 0.5  # autocorrelation of residuals from which errors count as lasting
_FINALISTS = 2
_SLOWEST, _FASTEST = 1e-4, 20.0  # 1/year


@dataclass(frozen=True, eq=False)
class PanelFit:
    """Gaussian rates estimated from a panel of zero rates.

    Standard errors come from the observed information; NaN where there is none.

    Attributes
    ----------
    model : str
        ``vasicek`` or ``gaussian-2``.
    mean_reversion, second_mean_reversion : float, float or None
        [1/year]; of two factors the faster comes first.
    volatility, second_volatility : float, float or None
        [1/year per root year].
    factor_correlation : float or None
    long_run_rate : float
        Level the short rate goes back to where bonds are priced [1/year].
    real_world_rate : float
        Level it goes back to in the real world [1/year].
    starting_rate : float
        Short rate at the last date [1/year].
    risk_price, second_risk_price : float, float or None
        λ: in the real world the factor's drift gains σλ [1/root year].
    measurement_error : float
        Standard deviation of what the factors leave unexplained in a quote [1/year].
    errors : dict of str to float
        Standard error of every figure above that was estimated, by its name.
    covariance : ndarray, shape (p, p)
        Of the parameters in the order of `parameters`.
    parameters : tuple of str, length p
    log_likelihood : float
    term : ndarray, shape (m,)
        [years].
    fitted : ndarray, shape (n, m)
        Zero rates of the model at every date [1/year], also where there was no quote.
    residual_bp : ndarray, shape (n, m)
        Fitted less quoted [basis points]; NaN where there was no quote.
    rmse_bp : ndarray, shape (m,)
        Root of their mean square by term [basis points].
    factor : ndarray, shape (n, k)
        The factors at every date given all the quotes [1/year].
    tests : ResidualTests
        Of the forecast errors from each date to the next.
    remarks : tuple of str
        What a user should know before relying on it, each a sentence; the verdict first.
    """

    model: str
    mean_reversion: float
    volatility: float
    long_run_rate: float
    real_world_rate: float
    starting_rate: float
    risk_price: float
    measurement_error: float
    errors: dict[str, float]
    covariance: FloatArray
    parameters: tuple[str, ...]
    log_likelihood: float
    term: FloatArray
    fitted: FloatArray
    residual_bp: FloatArray
    rmse_bp: FloatArray
    factor: FloatArray
    tests: ResidualTests
    remarks: tuple[str, ...]
    second_mean_reversion: float | None = None
    second_volatility: float | None = None
    second_risk_price: float | None = None
    factor_correlation: float | None = None


def yield_panel(times: ArrayLike, terms: ArrayLike, rates: ArrayLike) -> tuple[YieldPanel, tuple[str, ...]]:
    """A panel of zero rates, checked, with remarks on what is unusual about it.

    Parameters
    ----------
    times : array_like, shape (n,)
        Dates (datetime64, Act/365 Fixed) or years; rising strictly, steps of any length.
    terms : array_like, shape (m,)
        [years], above 0, all different.
    rates : array_like, shape (n, m)
        Continuously compounded [1/year]; NaN where there is no quote.

    Raises
    ------
    ValueError
        If the arrays do not go together, there are too few dates, a term has no quote at all, or the rates
        never move.
    """
    years, remarks = history_years(times)
    term, rate = np.array(terms, dtype=np.float64), np.array(rates, dtype=np.float64)
    if term.ndim != 1 or term.size == 0 or rate.shape != (years.size, term.size):
        raise ValueError("`rates` must hold one row a date and one column a term")
    if not (np.isfinite(term).all() and np.all(term > 0.0)) or np.unique(term).size < term.size:
        raise ValueError("`terms` must be above 0 and all different")
    if np.isinf(rate).any():
        row = int(np.flatnonzero(np.isinf(rate).any(axis=1))[0])
        raise ValueError(f"a rate in row {row + 1} of the history is not finite")
    quoted = np.isfinite(rate)
    bare = np.flatnonzero(~quoted.any(axis=0))
    if bare.size:
        raise ValueError(f"there is no rate at all for the term of {term[bare[0]]:g} years: leave it out")
    if all(np.ptp(rate[seen, column]) == 0.0 for column, seen in enumerate(quoted.T)):
        raise ValueError("the rates never move in the history: nothing can be estimated from it")
    remarks = (*remarks, *scale_remarks(rate))
    missing = int(np.count_nonzero(~quoted))
    if missing:
        remarks = (*remarks, f"{missing} of {rate.size} quotes are missing; the filter goes on without them.")
    for values in (term, rate):
        values.flags.writeable = False
    return YieldPanel(years, term, rate), remarks


def fit_yield_panel(times: ArrayLike, terms: ArrayLike, rates: ArrayLike, *, factors: int = 1) -> PanelFit:
    """Gaussian rates of one or two factors that make a panel of zero rates most likely.

    Parameters
    ----------
    times, terms, rates : array_like
        As for `yield_panel`.
    factors : int
        1 or 2.

    Raises
    ------
    ValueError
        As `yield_panel`; or if there are fewer terms than factors and one more.

    Notes
    -----
    The model and its likelihood are those of `desk.rates.kalman_panel`. The risk price λ of a factor is
    constant; the long-run level where bonds are priced comes from the shape of the curves, that of the real
    world from where the rates were over the years, and λ from the difference.
    """
    if factors not in (1, 2):
        raise ValueError("`factors` must be 1 or 2")
    panel, remarks = yield_panel(times, terms, rates)
    if panel.term.size < factors + 1:
        raise ValueError(
            f"{factors} {'factor needs' if factors == 1 else 'factors need'} at least {factors + 1} terms, "
            f"and the history has {panel.term.size}"
        )

    def log_likelihood(point: FloatArray) -> float:
        return panel_log_likelihood(panel, _model(point))

    lower, upper, scale = _bounds(factors, float(panel.time[-1]))
    starts = sorted(_starts(panel, factors), key=log_likelihood, reverse=True)[:_FINALISTS]
    rough = [
        maximise(log_likelihood, start, scale=scale, lower=lower, upper=upper, information=False)
        for start in starts
    ]
    best = max(rough, key=lambda found: found.value)
    found = maximise(log_likelihood, _faster_first(best.point), scale=scale, lower=lower, upper=upper)
    return _record(panel, found, remarks)


def _model(point: FloatArray) -> PanelModel:
    """Parameters from where the search is: level, log error, log speeds, log volatilities, risk prices and,
    of two factors, the inverse hyperbolic tangent of the correlation."""
    count = (point.size - 2) // 3
    values = point.tolist()
    with np.errstate(over="ignore"):
        speeds, volatilities = np.exp(point[2 : 2 + count]), np.exp(point[2 + count : 2 + 2 * count])
    return PanelModel(
        mean_reversion=tuple(speeds.tolist()),
        volatility=tuple(volatilities.tolist()),
        risk_price=tuple(values[2 + 2 * count : 2 + 3 * count]),
        level=values[0],
        error=math.exp(values[1]),
        correlation=math.tanh(values[-1]) if count == 2 else 0.0,
    )


def _bounds(factors: int, years: float) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Bounds of the search, and about how far from a point the log-likelihood changes by one."""
    slow, fast = math.log(_SLOWEST), math.log(_FASTEST)
    low = [-1.0, math.log(1e-7), *[slow] * factors, *[math.log(1e-6)] * factors, *[-20.0] * factors]
    high = [1.0, 0.0, *[fast] * factors, *[0.0] * factors, *[20.0] * factors]
    scale = [1e-3, 0.02, *[0.05] * factors, *[0.05] * factors, *[1.0 / math.sqrt(years)] * factors]
    if factors == 2:
        low, high, scale = [*low, -3.8], [*high, 3.8], [*scale, 0.05]
    return np.array(low), np.array(high), np.array(scale)


def _starts(panel: YieldPanel, factors: int) -> list[FloatArray]:
    """Points to begin at: the speeds from a grid, the rest from the looks of the panel."""
    short, long = int(np.argmin(panel.term)), int(np.argmax(panel.term))
    seen = np.isfinite(panel.rate[:, short])
    moved, step = np.diff(panel.rate[seen, short]), np.diff(panel.time[seen])
    swing = float(np.sqrt(np.mean(moved**2 / step))) if moved.size else 0.0
    swing = min(max(swing, 1e-4), 0.2)
    level = float(np.nanmean(panel.rate[:, long]))
    starts = []
    if factors == 1:
        for speed, error, lift in product((0.03, 0.15, 0.6), (5e-4, 3e-3), (0.0, 0.01)):
            starts.append([level + lift, math.log(error), math.log(speed), math.log(swing), 0.0])
        return [np.array(start) for start in starts]
    for fast, slow, tied, error in product((0.4, 1.2), (0.02, 0.12), (-0.6, 0.0), (2e-4, 1e-3)):
        logs = [math.log(value) for value in (error, fast, slow, swing, 0.7 * swing)]
        starts.append([level + 0.005, *logs, 0.0, 0.0, math.atanh(tied)])
    return [np.array(start) for start in starts]


def _faster_first(point: FloatArray) -> FloatArray:
    """The same point with the faster of two factors named first."""
    count = (point.size - 2) // 3
    if count == 1 or point[2] >= point[3]:
        return point
    order = [0, 1, 3, 2, 5, 4, 7, 6, 8]
    return point[order]


def _record(panel: YieldPanel, found: Maximum, remarks: tuple[str, ...]) -> PanelFit:
    model = _model(found.point)
    count = model.factor_count
    two = count == 2
    # From where the search was to the parameters themselves; the correlation's slope is 1 - tanh².
    slope = np.array(
        [1.0, model.error, *model.mean_reversion, *model.volatility, *[1.0] * count]
        + [1.0 - model.correlation**2] * (count - 1)
    )
    covariance = found.covariance * np.outer(slope, slope)
    names = ["long_run_rate", "measurement_error"]
    for name in ("mean_reversion", "volatility", "risk_price"):
        names += [name, f"second_{name}"][:count]
    names += ["factor_correlation"][: count - 1]
    errors = {
        name: math.sqrt(max(float(value), 0.0)) if math.isfinite(value) else math.nan
        for name, value in zip(names, np.diag(covariance), strict=True)
    }
    # The real-world level is μ + Σ σλ/a.
    turn = np.zeros(len(names))
    turn[0] = 1.0
    speed, volatility, price = (
        np.array(entry) for entry in (model.mean_reversion, model.volatility, model.risk_price)
    )
    turn[2 : 2 + 3 * count] = np.concatenate(
        [-volatility * price / speed**2, price / speed, volatility / speed]
    )
    errors["real_world_rate"] = delta_error(covariance, turn)
    factor = panel_states(panel, model)
    constant, loading = model.loadings(panel.term)
    fitted = constant + (factor - model.mean) @ loading.T
    residual = 1e4 * (fitted - panel.rate)
    tests = residual_tests(kalman_filter(panel, model).standardised)
    seconds = {
        f"second_{name}": getattr(model, name)[1] if two else None
        for name in ("mean_reversion", "volatility", "risk_price")
    }
    return PanelFit(
        model="gaussian-2" if two else "vasicek",
        mean_reversion=model.mean_reversion[0],
        volatility=model.volatility[0],
        long_run_rate=model.level,
        real_world_rate=model.level + float(model.mean.sum()),
        starting_rate=model.level + float(factor[-1].sum()),
        risk_price=model.risk_price[0],
        measurement_error=model.error,
        errors=errors,
        covariance=covariance,
        parameters=tuple(names),
        log_likelihood=found.value,
        term=panel.term,
        fitted=fitted,
        residual_bp=residual,
        rmse_bp=np.sqrt(np.nanmean(residual**2, axis=0)),
        factor=factor,
        tests=tests,
        remarks=(*_remarks(panel, model, found, errors, residual, tests, names), *remarks),
        second_mean_reversion=seconds["second_mean_reversion"],
        second_volatility=seconds["second_volatility"],
        second_risk_price=seconds["second_risk_price"],
        factor_correlation=model.correlation if two else None,
    )


def _remarks(
    panel: YieldPanel,
    model: PanelModel,
    found: Maximum,
    errors: dict[str, float],
    residual: FloatArray,
    tests: ResidualTests,
    names: list[str],
) -> tuple[str, ...]:
    remarks = []
    by_term = np.sqrt(np.nanmean(residual**2, axis=0))
    worst = int(np.argmax(by_term))
    if model.error > _POOR_ERROR:
        many = "one factor leaves" if model.factor_count == 1 else "two factors leave"
        remarks.append(
            f"The fit is poor: {many} {1e4 * model.error:.0f} basis points unexplained (standard "
            f"deviation), the most at {panel.term[worst]:g} years ({by_term[worst]:.0f})."
        )
    lasting = [_memory(column) for column in residual.T]
    if max(lasting) > _LASTING:
        remarks.append(
            f"The errors of fit last (autocorrelation up to {max(lasting):.2f} from date to date), though "
            "the model takes them for independent: the standard errors are too small."
        )
    at_bound = [name.replace("_", " ") for name, edge in zip(names, found.at_bound, strict=True) if edge]
    if at_bound:
        remarks.append(f"At the bound of what is looked for: {', '.join(at_bound)}. The fit is an edge case.")
    elif not np.isfinite(found.covariance).all():
        remarks.append("The quotes do not determine all the parameters: others fit as well.")
    prices = {name: errors[name] for name in ("risk_price", "second_risk_price") if name in errors}
    for (name, error), value in zip(prices.items(), model.risk_price, strict=True):
        if not abs(value) > 1.96 * error:
            remarks.append(
                f"The {name.replace('_', ' ')} of {value:.2f} cannot be told from 0 (standard error "
                f"{error:.2f}): it comes from how far the rates drifted, of which a history holds few years."
            )
    remarks.extend(tests.remarks)
    if not found.converged:
        remarks.append("The search did not come to rest: the parameters are provisional.")
    return tuple(remarks)


def _memory(column: FloatArray) -> float:
    """First autocorrelation of the residuals of one term, over the dates quoted."""
    values = column[np.isfinite(column)]
    values = values - values.mean()
    total = float(values @ values)
    return float(values[1:] @ values[:-1]) / total if total > 0.0 else 0.0
