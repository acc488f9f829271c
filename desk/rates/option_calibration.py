"""Short-rate models fitted to today's curve and to quoted volatilities of caps, floors and swaptions.

The curve is repriced whatever the parameters are; they are chosen so that the volatilities at which the
model's prices hold are nearest to those quoted, by least squares.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from desk.rates.gaussian import GaussianRates, gaussian_2, ho_lee, hull_white
from desk.rates.option_instruments import OptionQuotes
from desk.rates.option_models import gaussian_option_prices
from desk.rates.option_square_root import square_root_option_prices
from desk.rates.square_root import SquareRootRates

__all__ = ["FITTED_MODELS", "VolatilityFit", "fit_volatilities"]

FloatArray = NDArray[np.float64]

_POOR_SHARE = 0.05  # of the mean quoted volatility: a root mean square residual above it is called poor
_FAR_SHARE = 0.15
_FEW_TURNS, _MOST_TURNS = 12, 100
_LEAST_SINGULAR = 1e-5
_NUMBERS = {1: "one constant", 2: "two constants", 4: "four constants", 5: "five constants"}


@dataclass(frozen=True, eq=False)
class VolatilityFit:
    """A model fitted to quoted volatilities.

    Attributes
    ----------
    model : str
        ``ho-lee``, ``hull-white``, ``gaussian-2`` or ``cir-shifted``.
    mean_reversion, second_mean_reversion : float or None
        [1/year]; None where the model has none, as below.
    volatility, second_volatility : float or None
        [1/year per root year]; for cir-shifted the coefficient of the root of the factor [1/root year].
    factor_correlation : float or None
    long_run_rate, starting_rate : float or None
        Of the factor of cir-shifted [1/year].
    risk_price : float
        0: prices show the pricing measure only.
    parameters : tuple of str, length p
        Names of the parameters that were fitted.
    errors : ndarray, shape (p,)
        Their standard errors, as if the residuals were independent and equally large; NaN where the quotes
        do not determine a parameter, or it lies at a bound.
    log_likelihood : float
        Of the residuals, as normal numbers of one variance; in the units of the quotes.
    model_price, quoted_price : ndarray, shape (m,)
        Per unit of nominal.
    model_volatility, quoted_volatility : ndarray, shape (m,)
        Of the kind quoted.
    residual_bp : ndarray, shape (m,)
        Model volatility less quoted [basis points of volatility: 0.0001].
    rmse_bp, largest_bp : float
        Root of the mean square, and the largest absolute value.
    instruments : tuple of str, length m
    converged : bool
    remarks : tuple of str
        What a user should know before relying on it, each a sentence; the verdict first.
    """

    model: str
    parameters: tuple[str, ...]
    errors: FloatArray
    log_likelihood: float
    model_price: FloatArray
    quoted_price: FloatArray
    model_volatility: FloatArray
    quoted_volatility: FloatArray
    residual_bp: FloatArray
    rmse_bp: float
    largest_bp: float
    instruments: tuple[str, ...]
    converged: bool
    remarks: tuple[str, ...]
    mean_reversion: float | None = None
    volatility: float | None = None
    second_mean_reversion: float | None = None
    second_volatility: float | None = None
    factor_correlation: float | None = None
    long_run_rate: float | None = None
    starting_rate: float | None = None
    risk_price: float = 0.0


@dataclass(frozen=True)
class _Family:
    """A model to fit: its parameters with bounds, its prices and where to begin."""

    parameters: tuple[str, ...]
    lower: tuple[float, ...]
    upper: tuple[float, ...]
    prices: Callable[[OptionQuotes, FloatArray], FloatArray]
    starts: Callable[[OptionQuotes, float], list[list[float]]]


def _gaussian_prices(
    make: Callable[[OptionQuotes, list[float]], GaussianRates],
) -> Callable[[OptionQuotes, FloatArray], FloatArray]:
    return lambda quotes, point: gaussian_option_prices(make(quotes, point.tolist()), quotes)


def _ho_lee(quotes: OptionQuotes, point: list[float]) -> GaussianRates:
    return ho_lee(quotes.curve, volatility=point[0])


def _hull_white(quotes: OptionQuotes, point: list[float]) -> GaussianRates:
    return hull_white(quotes.curve, mean_reversion=point[0], volatility=point[1])


def _gaussian_2(quotes: OptionQuotes, point: list[float]) -> GaussianRates:
    return gaussian_2(
        quotes.curve,
        mean_reversion=point[0],
        volatility=point[1],
        second_mean_reversion=point[2],
        second_volatility=point[3],
        factor_correlation=point[4],
    )


def _square_root_prices(quotes: OptionQuotes, point: FloatArray) -> FloatArray:
    speed, level, volatility, start = point.tolist()
    model = SquareRootRates(
        mean_reversion=speed,
        long_run_rate=level,
        volatility=volatility,
        starting_rate=start,
        curve=quotes.curve,
    )
    return square_root_option_prices(model, quotes)


def _square_root_starts(quotes: OptionQuotes, level: float) -> list[list[float]]:
    rate = max(float(np.mean(quotes.forward[quotes.weight > 0.0])), 0.01)
    return [[speed, rate, level / math.sqrt(rate), rate] for speed in (0.05, 0.4)]


_FAMILIES = {
    "ho-lee": _Family(
        ("volatility",), (1e-7,), (0.5,), _gaussian_prices(_ho_lee), lambda _, level: [[level]]
    ),
    "hull-white": _Family(
        ("mean_reversion", "volatility"),
        (0.0, 1e-7),
        (5.0, 0.5),
        _gaussian_prices(_hull_white),
        lambda _, level: [[0.02, level], [0.3, 1.5 * level]],
    ),
    "gaussian-2": _Family(
        ("mean_reversion", "volatility", "second_mean_reversion", "second_volatility", "factor_correlation"),
        (0.0, 1e-7, 0.0, 1e-7, -0.999),
        (5.0, 0.5, 5.0, 0.5, 0.999),
        _gaussian_prices(_gaussian_2),
        lambda _, level: [
            [0.6, 1.2 * level, 0.05, level, -0.6],
            [0.25, 1.5 * level, 0.02, 1.2 * level, -0.9],
            [1.5, 1.5 * level, 0.1, level, 0.2],
        ],
    ),
    "cir-shifted": _Family(
        ("mean_reversion", "long_run_rate", "volatility", "starting_rate"),
        (1e-4, 1e-5, 1e-4, 1e-6),
        (5.0, 1.0, 2.0, 1.0),
        _square_root_prices,
        _square_root_starts,
    ),
}

FITTED_MODELS = tuple(_FAMILIES)


def fit_volatilities(quotes: OptionQuotes, *, model: str = "hull-white") -> VolatilityFit:
    """The parameters of a model at which it is nearest to quoted volatilities.

    Parameters
    ----------
    quotes : OptionQuotes
        Made by `desk.rates.option_instruments.option_quotes`, with the curve they belong to.
    model : str
        One of `FITTED_MODELS`.

    Returns
    -------
    VolatilityFit

    Raises
    ------
    ValueError
        If there is no such model, or it has more parameters than there are quotes.

    Notes
    -----
    Residuals count alike; where normal and lognormal quotes are mixed each is divided by the mean of its
    kind. The most promising of a few starts is followed to the end.
    """
    from scipy.optimize import least_squares

    if model not in _FAMILIES:
        raise ValueError(f"`model` must be one of {', '.join(FITTED_MODELS)}, not {model!r}")
    family = _FAMILIES[model]
    size = len(family.parameters)
    if quotes.count < size:
        raise ValueError(
            f"{model} has {size} parameters, more than there are quotes ({quotes.count}): give at least "
            f"{size}, or choose a model of fewer parameters"
        )
    unit = _kind_means(quotes)
    nearby = [quotes.volatility]  # those of the point before, where the search for the next ones begins

    def residual(point: FloatArray) -> FloatArray:
        found = quotes.volatilities(family.prices(quotes, point), guess=nearby[0])
        usable = np.isfinite(found) & (found > 0.0)
        nearby[0] = np.where(usable, found, quotes.volatility)
        return np.asarray((np.where(np.isfinite(found), found, 10.0) - quotes.volatility) / unit)

    lower, upper = np.array(family.lower), np.array(family.upper)

    def search(begin: FloatArray, turns: int) -> tuple[float, FloatArray, bool]:
        found = least_squares(
            residual,
            begin,
            bounds=(lower, upper),
            x_scale="jac",
            ftol=1e-10,
            xtol=1e-10,
            gtol=1e-14,
            max_nfev=turns,
        )
        return float(found.cost), np.asarray(found.x), bool(found.success)

    starts = family.starts(quotes, _normal_level(quotes))
    first = [search(np.clip(start, lower + 1e-9, upper - 1e-9), _FEW_TURNS) for start in starts]
    _, place, converged = min(first, key=lambda found: found[0])
    if not converged:
        _, place, converged = search(place, _MOST_TURNS)
    point = _snapped(place, residual, lower, upper)
    left = residual(point)
    errors, determined = _errors(residual, point, left, lower, upper)
    return _record(model, family, quotes, point, errors, determined, left, unit, converged, (lower, upper))


def _kind_means(quotes: OptionQuotes) -> FloatArray:
    """For each quote the mean quoted volatility of its kind."""
    mean = np.empty(quotes.count)
    for rows in (quotes.normal, ~quotes.normal):
        if rows.any():
            mean[rows] = quotes.volatility[rows].mean()
    return mean


def _normal_level(quotes: OptionQuotes) -> float:
    """About the mean normal volatility of the quotes: where searches begin."""
    rate = np.sum(quotes.weight * quotes.forward, axis=1) / np.sum(quotes.weight, axis=1)
    level = np.where(quotes.normal, quotes.volatility, quotes.volatility * (rate + quotes.shift))
    return min(max(float(level.mean()), 1e-5), 0.1)


def _snapped(
    point: FloatArray, residual: Callable[[FloatArray], FloatArray], lower: FloatArray, upper: FloatArray
) -> FloatArray:
    """The point with what all but lies at a bound put there, where that does no harm.

    The search keeps within its bounds and only ever approaches them.
    """
    best = point.copy()
    cost = float(np.sum(residual(best) ** 2))
    for index in range(point.size):
        for bound in (lower[index], upper[index]):
            if abs(best[index] - bound) < 1e-4 * (upper[index] - lower[index]):
                moved = best.copy()
                moved[index] = bound
                tried = float(np.sum(residual(moved) ** 2))
                if tried <= cost * (1.0 + 1e-9) + 1e-20:
                    best, cost = moved, min(cost, tried)
    return best


def _errors(
    residual: Callable[[FloatArray], FloatArray],
    point: FloatArray,
    left: FloatArray,
    lower: FloatArray,
    upper: FloatArray,
) -> tuple[FloatArray, bool]:
    """Standard errors ``√(s² (J'J)⁻¹)``, and whether the quotes determine all that is not at a bound."""
    errors = np.full(point.size, np.nan)
    free = np.flatnonzero((point > lower) & (point < upper))
    slopes = np.empty((left.size, free.size))
    for column, index in enumerate(free):
        step = np.zeros(point.size)
        room = min(point[index] - lower[index], upper[index] - point[index])
        step[index] = min(1e-4 * max(abs(point[index]), 1e-3), 0.5 * room)
        slopes[:, column] = (residual(point + step) - residual(point - step)) / (2.0 * step[index])
    scaled = slopes * np.maximum(np.abs(point[free]), 1e-3)
    singular = np.linalg.svd(scaled, compute_uv=False)
    if free.size == 0 or singular.size < free.size or singular[-1] <= _LEAST_SINGULAR * singular[0]:
        return errors, free.size == 0
    spare = left.size - free.size
    if spare > 0:
        inverse = np.linalg.inv(scaled.T @ scaled)
        spread = float(left @ left) / spare
        errors[free] = np.sqrt(spread * np.diag(inverse)) * np.maximum(np.abs(point[free]), 1e-3)
    return errors, True


def _record(
    model: str,
    family: _Family,
    quotes: OptionQuotes,
    point: FloatArray,
    errors: FloatArray,
    determined: bool,
    left: FloatArray,
    unit: FloatArray,
    converged: bool,
    bounds: tuple[FloatArray, FloatArray],
) -> VolatilityFit:
    price = family.prices(quotes, point)
    volatility = quotes.volatilities(price)
    residual_bp = 1e4 * (volatility - quotes.volatility)
    squares = float(np.sum((left * unit) ** 2))
    count = quotes.count
    spread = max(squares / count, 1e-40)
    return VolatilityFit(
        model=model,
        parameters=family.parameters,
        errors=errors,
        log_likelihood=-0.5 * count * (math.log(2.0 * math.pi * spread) + 1.0),
        model_price=price,
        quoted_price=quotes.prices(quotes.volatility),
        model_volatility=volatility,
        quoted_volatility=quotes.volatility,
        residual_bp=residual_bp,
        rmse_bp=math.sqrt(float(np.mean(residual_bp**2))),
        largest_bp=float(np.max(np.abs(residual_bp))),
        instruments=quotes.names,
        converged=converged,
        remarks=_remarks(model, family, quotes, point, determined, left, residual_bp, converged, bounds),
        **dict(zip(family.parameters, point.tolist(), strict=True)),
    )


def _remarks(
    model: str,
    family: _Family,
    quotes: OptionQuotes,
    point: FloatArray,
    determined: bool,
    left: FloatArray,
    residual_bp: FloatArray,
    converged: bool,
    bounds: tuple[FloatArray, FloatArray],
) -> tuple[str, ...]:
    remarks = []
    share, worst = math.sqrt(float(np.mean(left**2))), int(np.argmax(np.abs(left)))
    if not math.isfinite(share) or share > _POOR_SHARE or float(np.abs(left[worst])) > _FAR_SHARE:
        remarks.append(
            f"The fit is poor: the residuals are {100.0 * share:.0f} % of the mean quoted volatility (root "
            f"mean square), the largest {residual_bp[worst]:+.0f} basis points for the "
            f"{quotes.names[worst]}. This model, with {_NUMBERS[len(family.parameters)]}, cannot follow "
            "these quotes."
        )
    values = dict(zip(family.parameters, point.tolist(), strict=True))
    if values.get("mean_reversion") == 0.0 or values.get("second_mean_reversion") == 0.0:
        remarks.append(
            "A mean reversion is at its lower bound of 0: the quotes ask for volatilities that do not fall "
            "with the term, and perhaps rise."
        )
    at_bound = [
        name.replace("_", " ")
        for name, value, low, high in zip(family.parameters, point, *bounds, strict=True)
        if (value <= low or value >= high) and not (value == 0.0 and "mean_reversion" in name)
    ]
    if at_bound:
        remarks.append(f"At the bound of what is looked for: {', '.join(at_bound)}. The fit is an edge case.")
    if not determined:
        remarks.append(
            "The quotes do not determine all the parameters: others fit as well. Give quotes of more "
            "expiries and lengths, or choose a model of fewer parameters."
        )
    if quotes.count == len(family.parameters):
        remarks.append("There are as many parameters as quotes: the residuals say nothing about the fit.")
    if (
        model == "cir-shifted"
        and 2.0 * values["mean_reversion"] * values["long_run_rate"] < values["volatility"] ** 2
    ):
        remarks.append("The factor can reach 0 (the condition of Feller fails).")
    if not converged:
        remarks.append("The search did not come to rest: the parameters are provisional.")
    if model in ("gaussian-2", "cir-shifted"):
        remarks.append(
            "Several sets of parameters may fit nearly as well; the search takes the best of a few starts."
        )
    remarks.append("Option prices show no price of risk: it is left at 0.")
    return tuple(remarks)
