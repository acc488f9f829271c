"""Prices of quoted caps, floors and swaptions under square-root rates, shifted to a curve or not.

A bond at expiry falls as the factor rises, so that a swap is worth nothing at one value of the factor, and a
swaption is a sum of probabilities of the noncentral chi-square law: Jamshidian, F. (1989), An exact bond
option formula, J. Finance 44, with the bond options of Cox, Ingersoll and Ross (1985), equation 32; shifted
as Brigo and Mercurio (2006), Interest Rate Models, section 3.9.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from desk.rates.option_instruments import OptionQuotes
from desk.rates.square_root import SquareRootRates

__all__ = ["square_root_option_prices"]

FloatArray = NDArray[np.float64]

_TURNS = 60


def square_root_option_prices(model: SquareRootRates, quotes: OptionQuotes) -> FloatArray:
    """Prices per unit of nominal of the quoted instruments under the model, shape (m,).

    Parameters
    ----------
    model : SquareRootRates
        Fitted to the curve of the quotes; its volatility above 0.

    Raises
    ------
    ValueError
        If the volatility is 0.
    """
    if model.volatility <= 0.0:
        raise ValueError("`model` must have a volatility above 0")
    prices = np.zeros(quotes.count)
    caps = ~quotes.swaption
    if caps.any():
        start, accrual = quotes.start[caps], quotes.accrual[caps]
        used = accrual > 0.0
        payment = (1.0 + quotes.strike[caps][:, None] * accrual)[used][:, None]
        calls = np.broadcast_to(quotes.call[caps][:, None], start.shape)[used]
        each = np.zeros(start.shape)
        each[used] = _payers(model, start[used], quotes.time[caps][used][:, None], payment, calls)
        prices[caps] = each.sum(axis=1)
    if quotes.swaption.any():
        rows = quotes.swaption
        payment = quotes.strike[rows][:, None] * quotes.accrual[rows]
        payment[:, -1] += 1.0
        time = np.maximum(quotes.time[rows], quotes.expiry[rows][:, None])
        prices[rows] = _payers(model, quotes.expiry[rows], time, payment, quotes.call[rows])
    return prices


def _payers(
    model: SquareRootRates,
    expiry: FloatArray,
    time: FloatArray,
    payment: FloatArray,
    call: NDArray[np.bool_],
) -> FloatArray:
    """Options to give 1 at expiry for the later payments (`call`), or the reverse, shape (m,).

    Parameters
    ----------
    expiry : ndarray, shape (m,)
    time, payment : ndarray, shape (m, n)
        No payment at all where there is none.
    """
    level, exposure = model.bond_terms(expiry[:, None], time)
    exposure = exposure[..., 0]
    amount = payment * np.exp(level)
    limit = _limit(amount, exposure)
    base = np.asarray(model.curve.discount(expiry))
    below = _chance(
        model, limit[:, None], expiry[:, None], np.concatenate([np.zeros((expiry.size, 1)), exposure], axis=1)
    )
    bonds = payment * model.curve.discount(time)
    receiver = np.sum(bonds * below[:, 1:], axis=1) - base * below[:, 0]
    payer = receiver + base - np.sum(bonds, axis=1)
    return np.asarray(np.maximum(np.where(call, payer, receiver), 0.0))


def _limit(amount: FloatArray, exposure: FloatArray) -> FloatArray:
    """The factor at which the payments are worth 1; 0 where they are worth less whatever it is."""
    place = np.zeros(len(amount))
    for _ in range(_TURNS):
        worth = amount * np.exp(-exposure * place[:, None])
        total, slope = np.sum(worth, axis=1), np.sum(worth * exposure, axis=1)
        good = (total > 0.0) & (slope > 0.0)
        step = np.where(good, np.log(np.where(good, total, 1.0)) * total / np.where(good, slope, 1.0), 0.0)
        following = np.maximum(place + np.clip(step, -1.0, 1.0), 0.0)
        done = float(np.max(np.abs(following - place), initial=0.0)) < 1e-15
        place = following
        if done:
            break
    return place


def _chance(
    model: SquareRootRates, limit: FloatArray, expiry: FloatArray, exposure: FloatArray
) -> FloatArray:
    """Chance of ``x(expiry) < limit`` when the bond of that exposure is the numeraire."""
    from scipy.special import chndtr

    variance = model.volatility**2
    root = float(np.hypot(model.mean_reversion, np.sqrt(2.0) * model.volatility))
    growth = 2.0 * root / (variance * np.expm1(root * expiry))
    total = growth + (model.mean_reversion + root) / variance + exposure
    distance = 2.0 * growth**2 * model.starting_rate * np.exp(root * expiry) / total
    chance = chndtr(2.0 * limit * total, 4.0 * model.pull / variance, distance)
    return np.asarray(np.where(limit > 0.0, chance, 0.0))
