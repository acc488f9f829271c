"""Yields as the trade quotes them, and the prices and durations that go with them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from desk.book.arrays import FloatArray, IntArray
from desk.valuation.roots import solve_rates
from desk.valuation.sums import group_sums

__all__ = ["StreetYields", "price_at_yield", "street_yields"]


@dataclass(frozen=True, eq=False)
class StreetYields:
    """Yields of groups of payments and what follows from them, each array shape (m,).

    Attributes
    ----------
    street, effective : ndarray
        Compounded `frequency` times a year, and once a year [1/year].
    macaulay, modified : ndarray
        Durations at that yield [years].
    convexity : ndarray
        Second derivative in the street yield over the price [years²].
    """

    street: FloatArray
    effective: FloatArray
    macaulay: FloatArray
    modified: FloatArray
    convexity: FloatArray


def street_yields(
    group: IntArray, periods: FloatArray, amount: FloatArray, *, price: FloatArray, frequency: FloatArray
) -> StreetYields:
    """Yields at which payments give their prices.

    Parameters
    ----------
    group : ndarray of int, shape (n,)
        Each payment's group, from 0 to m - 1.
    periods : ndarray, shape (n,)
        Coupon periods from settlement to each payment, at least 0.
    amount : ndarray, shape (n,)
        [currency]
    price : ndarray, shape (m,)
        With accrued interest [currency].
    frequency : ndarray, shape (m,)
        Coupon periods a year.

    Returns
    -------
    StreetYields
        y with ``Σ amount · (1 + y / frequency)^-periods = price``; NaN where none does it.

    References
    ----------
    The street convention: Fabozzi, F.J., Bond Markets, Analysis and Strategies, chapters on pricing and on
    price volatility. It is kept in the last coupon period too, where some markets take simple interest.
    """
    time = periods / frequency[group]
    rate = solve_rates(group, time, amount, target=price)
    with np.errstate(over="ignore", under="ignore", invalid="ignore", divide="ignore"):
        growth = np.exp(rate / frequency)  # of one coupon period

        def sums(part: slice) -> list[FloatArray]:
            worth = amount[part] * np.exp(-rate[group[part]] * time[part])
            one = 1.0 / frequency[group[part]]
            return [worth, worth * time[part], worth * time[part] * (time[part] + one)]

        worth, first, second = group_sums(group, price.size, sums)
        return StreetYields(
            street=frequency * np.expm1(rate / frequency),
            effective=np.expm1(rate),
            macaulay=first / worth,
            modified=first / worth / growth,
            convexity=second / worth / growth**2,
        )


def price_at_yield(
    group: IntArray, periods: FloatArray, amount: FloatArray, *, street: FloatArray, frequency: FloatArray
) -> FloatArray:
    """Prices with accrued interest at given street yields.

    Parameters
    ----------
    group, periods, amount, frequency
        As for `street_yields`.
    street : ndarray, shape (m,)
        Yields compounded `frequency` times a year [1/year].

    Returns
    -------
    ndarray, shape (m,)
        ``Σ amount · (1 + street / frequency)^-periods`` [currency].
    """
    growth = np.log1p(street / frequency)
    with np.errstate(over="ignore", under="ignore"):
        worth = amount * np.exp(-growth[group] * periods)
    return np.asarray(np.bincount(group, weights=worth, minlength=street.size), dtype=np.float64)
