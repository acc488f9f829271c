"""Prices of quoted caps, floors and swaptions under Gaussian rates of one or two factors.

A caplet is an option on a zero bond. For a swaption the bond prices at expiry are written under the measure
whose numeraire is the bond to expiry, so that today's curve enters only through forward prices ``Fᵢ``:
``P(T,Tᵢ) = Fᵢ exp(-βᵢ·z - ½|βᵢ|²)``, z standard normal. With one factor the swap is worth nothing at one z,
and the price is a sum of normal probabilities (Jamshidian 1989). With two the same is done for each value of
the first and integrated over it by Gauss-Hermite quadrature (Brigo and Mercurio 2006, theorem 4.2.3). The
axes of z are turned so that the second is the one along which the swap moves: then the boundary of exercise
hardly depends on the first, few points suffice, and a correlation of ±1 is nothing special.

References
----------
Jamshidian, F. (1989), An exact bond option formula, J. Finance 44. Brigo, D. and Mercurio, F. (2006),
Interest Rate Models: Theory and Practice, sections 3.3.2 and 4.2.4.
"""

from __future__ import annotations

import math
from functools import cache

import numpy as np
from numpy.typing import NDArray

from desk.rates.gaussian import GaussianRates
from desk.rates.limits import first_integral
from desk.rates.option_instruments import OptionQuotes

__all__ = ["gaussian_option_prices"]

FloatArray = NDArray[np.float64]

_POINTS = 16
_FURTHEST = 60.0  # standard deviations: beyond any chance
_TURNS = 60


def gaussian_option_prices(model: GaussianRates, quotes: OptionQuotes) -> FloatArray:
    """Prices per unit of nominal of the quoted instruments under the model, shape (m,).

    Parameters
    ----------
    model : GaussianRates
        Of one or two factors where there are swaptions; it is taken to be fitted to the curve of the quotes.

    Raises
    ------
    ValueError
        If there are swaptions and more than two factors.
    """
    prices = np.zeros(quotes.count)
    caps = ~quotes.swaption
    if caps.any():
        prices[caps] = _caps(model, quotes, caps)
    if quotes.swaption.any():
        if model.factor_count > 2:
            raise ValueError("swaptions can be priced with at most two factors")
        prices[quotes.swaption] = _swaptions(model, quotes, quotes.swaption)
    return prices


def _covariances(model: GaussianRates, expiry: FloatArray) -> FloatArray:
    """Covariance of the factors at each expiry, the expiries' shape and (n, n)."""
    count = model.factor_count
    result = np.empty((*expiry.shape, count, count))
    for row, one in enumerate(model.factors):
        for column, two in enumerate(model.factors[: row + 1]):
            weight = float(model.correlation[row, column]) * one.volatility * two.volatility
            spread = weight * first_integral(one.mean_reversion + two.mean_reversion, expiry)
            result[..., row, column] = result[..., column, row] = spread
    return result


def _caps(model: GaussianRates, quotes: OptionQuotes, rows: NDArray[np.bool_]) -> FloatArray:
    """Each caplet is ``1 + Kδ`` puts, each floorlet as many calls, on a zero bond at ``1/(1 + Kδ)``."""
    from scipy.special import ndtr

    start, time, accrual = quotes.start[rows], quotes.time[rows], quotes.accrual[rows]
    used = accrual > 0.0
    growth = 1.0 + quotes.strike[rows][:, None] * accrual
    cash, bond = (entry[rows] for entry in quotes.discounts)
    bond = bond * growth
    exposure = np.stack([first_integral(f.mean_reversion, time - start) for f in model.factors], axis=-1)
    variance = np.einsum("...i,...ij,...j", exposure, _covariances(model, start), exposure)
    deviation = np.sqrt(np.maximum(variance, 1e-300))
    sign = np.where(quotes.call[rows], 1.0, -1.0)[:, None]
    # A strike so low that the bond's would be infinite or negative is always paid for.
    ratio = np.where(growth > 0.0, cash / np.where(growth > 0.0, bond, 1.0), np.inf)
    with np.errstate(over="ignore", divide="ignore"):
        ahead = np.log(ratio) / deviation + 0.5 * deviation
    value = sign * (cash * ndtr(sign * ahead) - bond * ndtr(sign * (ahead - deviation)))
    return np.asarray(np.sum(np.where(used, np.maximum(value, 0.0), 0.0), axis=1))


def _swaptions(model: GaussianRates, quotes: OptionQuotes, rows: NDArray[np.bool_]) -> FloatArray:
    from scipy.special import ndtr

    expiry, time, accrual = quotes.expiry[rows], quotes.time[rows], quotes.accrual[rows]
    # The periods of a swaption begin at its expiry.
    base = np.asarray(quotes.curve.discount(expiry))
    payment = quotes.strike[rows][:, None] * accrual
    payment[:, -1] += 1.0
    forward = payment * quotes.discounts[1][rows] / base[:, None]
    loading, beside = _loadings(model, expiry, np.where(accrual > 0.0, time - expiry[:, None], 0.0), forward)
    nodes, weights = _quadrature() if model.factor_count == 2 else (np.zeros(1), np.ones(1))
    # dimensions: swaption, node, payment
    along, across = loading[:, None, :], beside[:, None, :]
    amount = forward[:, None, :] * np.exp(-across * nodes[:, None] - 0.5 * across**2)
    boundary = _boundary(amount * np.exp(-0.5 * along**2), np.broadcast_to(along, amount.shape))
    sign = np.where(quotes.call[rows], 1.0, -1.0)[:, None]
    kept = ndtr(-sign * boundary)
    swapped = np.sum(amount * ndtr(-sign[..., None] * (boundary[..., None] + along)), axis=2)
    value = sign * (kept - swapped)
    return np.asarray(np.maximum(base * (value @ weights), 0.0))


def _loadings(
    model: GaussianRates, expiry: FloatArray, remaining: FloatArray, forward: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Deviation of the log bond prices along the direction of the swap and across it, shape (m, n) each."""
    exposure = np.stack([first_integral(f.mean_reversion, remaining) for f in model.factors], axis=-1)
    covariance = _covariances(model, expiry)
    if model.factor_count == 1:
        return exposure[..., 0] * np.sqrt(covariance[..., 0, 0])[:, None], np.zeros(remaining.shape)
    first = np.sqrt(np.maximum(covariance[:, 0, 0], 1e-300))
    mixed = covariance[:, 1, 0] / first
    second = np.sqrt(np.maximum(covariance[:, 1, 1] - mixed**2, 0.0))
    one = exposure[..., 0] * first[:, None] + exposure[..., 1] * mixed[:, None]
    two = exposure[..., 1] * second[:, None]
    across, along = np.sum(forward * one, axis=1), np.sum(forward * two, axis=1)
    length = np.hypot(across, along)
    length = np.where(length > 0.0, length, 1.0)
    cosine, sine = (across / length)[:, None], (along / length)[:, None]
    return one * cosine + two * sine, two * cosine - one * sine


def _boundary(amount: FloatArray, along: FloatArray) -> FloatArray:
    """The u at which ``Σ amount e^{-along u}`` is 1, over the last axis: Newton's steps on its logarithm."""
    place = np.zeros(amount.shape[:-1])
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        for _ in range(_TURNS):
            worth = amount * np.exp(-np.clip(along * place[..., None], -300.0, 300.0))
            total = np.sum(worth, axis=-1)
            slope = np.sum(worth * along, axis=-1)
            # Without volatility the payments are worth what they are, whatever u is.
            flat = np.where(total > 1.0, 2.0 * _FURTHEST, -2.0 * _FURTHEST)
            moving = (total > 0.0) & (slope > 0.0)
            step = np.where(moving, np.log(np.maximum(total, 1e-300)) * total / slope, flat)
            following = np.clip(place + np.clip(step, -20.0, 20.0), -_FURTHEST, _FURTHEST)
            moved, place = np.abs(following - place), following
            if float(np.max(moved, initial=0.0)) < 1e-13:
                break
    return place


@cache
def _quadrature() -> tuple[FloatArray, FloatArray]:
    """Nodes and weights for the expectation over a standard normal number."""
    nodes, weights = np.polynomial.hermite_e.hermegauss(_POINTS)
    return nodes, weights / math.sqrt(2.0 * math.pi)
