"""Measures of sets of flows.

The rows of one side are discounted once; every measure, by line and of the whole, is a sum over them.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from desk.book import PricedFlows
from desk.book.arrays import FloatArray, IntArray
from desk.rates.curve import DiscountCurve
from desk.valuation.records import Measures
from desk.valuation.roots import solve_rates

__all__ = [
    "BASIS_POINT",
    "KEY_TERMS",
    "ValuedRows",
    "key_rate_durations",
    "key_rate_weights",
    "measure",
    "measure_groups",
    "value_flows",
    "value_rows",
]

BASIS_POINT = 1e-4
"""One hundredth of one per cent, continuously compounded [1/year]."""

KEY_TERMS = (0.25, 0.5, 1.0, 2.0, 3.0, 5.0, 7.0, 10.0, 15.0, 20.0, 25.0, 30.0, 40.0, 50.0)
"""Terms of the key rates [years]."""

_NO_VALUE = 1e-12  # a present value below this part of the gross one is what rounding left of nothing


@dataclass(frozen=True, eq=False)
class ValuedRows:
    """Rows with what each is worth, each array shape (n,).

    Attributes
    ----------
    time : ndarray
        [years]
    amount : ndarray
        [currency]
    exponent : ndarray
        ``(z(time) + spread) · time``: minus the logarithm of the discount factor.
    value : ndarray
        Present value [currency].
    """

    time: FloatArray
    amount: FloatArray
    exponent: FloatArray
    value: FloatArray


def value_rows(
    time: ArrayLike, amount: ArrayLike, *, curve: DiscountCurve, spread: ArrayLike = 0.0
) -> ValuedRows:
    """Discount rows.

    Parameters
    ----------
    time : array_like, shape (n,)
        [years], at least 0.
    amount : array_like, shape (n,)
        [currency]
    curve : DiscountCurve
    spread : array_like, scalar or shape (n,)
        Over the continuous zero rates [1/year].

    Returns
    -------
    ValuedRows
    """
    times = np.asarray(time, dtype=np.float64)
    amounts = np.asarray(amount, dtype=np.float64)
    with np.errstate(over="ignore", under="ignore", invalid="ignore"):
        exponent = np.asarray((curve.zero(times) + np.asarray(spread, dtype=np.float64)) * times)
        return ValuedRows(times, amounts, exponent, amounts * np.exp(-exponent))


def value_flows(flows: PricedFlows, curve: DiscountCurve) -> ValuedRows:
    """Discount the rows of one side on a curve, each with its spread."""
    return value_rows(flows.time, flows.amount, curve=curve, spread=flows.spread)


def measure(rows: ValuedRows) -> Measures:
    """Measures of all rows together; see `measure_groups`."""
    return measure_groups(rows, np.zeros(rows.time.size, dtype=np.int64), 1)[0]


def measure_groups(rows: ValuedRows, group: IntArray, count: int) -> tuple[Measures, ...]:
    """Measures of groups of rows.

    Parameters
    ----------
    rows : ValuedRows
    group : ndarray of int, shape (n,)
        Each row's group, from 0 to ``count - 1``.
    count : int

    Returns
    -------
    tuple of Measures, length `count`
        The ratios of a group whose present value is 0 are NaN. So are the equivalent rate and the
        durations at it where no single rate gives the present value (see
        `desk.valuation.roots.solve_rates`); flows today alone have a duration of 0 at any rate.

    References
    ----------
    Macaulay and modified duration: Macaulay, F.R., Some Theoretical Problems Suggested by the Movements
    of Interest Rates, Bond Yields and Stock Prices in the United States since 1856 (1938); Hicks, J.R.,
    Value and Capital (1939). Dispersion: Fong, H.G. and Vasicek, O.A., "A Risk Minimizing Strategy for
    Portfolio Immunization", Journal of Finance 39(5), 1984.
    """
    with np.errstate(over="ignore", under="ignore", invalid="ignore", divide="ignore"):
        return _measure_groups(rows, group, count)


def _measure_groups(rows: ValuedRows, group: IntArray, count: int) -> tuple[Measures, ...]:
    """The sums behind `measure_groups`."""

    def sums(weights: FloatArray) -> FloatArray:
        if count == 1:
            return np.array([weights.sum()])
        return np.bincount(group, weights=weights, minlength=count).astype(np.float64, copy=False)

    time, value = rows.time, rows.value
    timed = time * value
    worth = sums(value)
    first = sums(timed)
    second = sums(time * timed)
    dv01 = -sums(value * np.expm1(-BASIS_POINT * time))
    gross = sums(np.abs(value)) if value.size and value.min() < 0.0 else np.abs(worth)
    present = np.where(np.abs(worth) > _NO_VALUE * gross, worth, np.nan)

    effective = first / present
    away = time - (effective[0] if count == 1 else effective[group])
    dispersion = sums(value * away * away) / present

    later = time > 0.0
    target = worth if later.all() else sums(np.where(later, value, 0.0))
    rate = solve_rates(
        group[later],
        time[later],
        rows.amount[later],
        target=np.where(np.isnan(present), np.nan, target),
        start=sums(value * rows.exponent) / first,
    )
    at_rate = rows.amount * np.exp(-(rate[0] if count == 1 else rate[group]) * time)
    macaulay = sums(time * at_rate) / sums(at_rate)
    modified = macaulay * np.exp(-rate)
    only_today = ~np.isnan(present) & (sums(later.astype(np.float64)) == 0.0)
    macaulay = np.where(only_today, 0.0, macaulay)
    modified = np.where(only_today, 0.0, modified)
    columns = (worth, np.expm1(rate), macaulay, modified, effective, second / present, dispersion, dv01)
    return tuple(Measures(*row) for row in zip(*(column.tolist() for column in columns), strict=True))


def key_rate_weights(time: FloatArray, *, terms: ArrayLike = KEY_TERMS) -> tuple[IntArray, FloatArray]:
    """How a triangular move of each key rate reaches a time.

    Parameters
    ----------
    time : ndarray, shape (n,)
        [years]
    terms : array_like, shape (k,)
        Terms of the key rates [years], rising, at least two.

    Returns
    -------
    lower : ndarray of int, shape (n,)
        The key at or before the time; the first key for times before it.
    share : ndarray, shape (n,)
        What reaches the time of a move of key ``lower + 1``; the rest, ``1 - share``, comes from `lower`.
        The moves are flat before the first and after the last key, so all of them together are one
        parallel move.

    References
    ----------
    Ho, T.S.Y., "Key Rate Durations: Measures of Interest Rate Risks", Journal of Fixed Income 2(2), 1992.
    """
    keys = np.asarray(terms, dtype=np.float64)
    lower = np.clip(np.searchsorted(keys, time, side="right") - 1, 0, keys.size - 2)
    share = np.clip((time - keys[lower]) / np.diff(keys)[lower], 0.0, 1.0)
    return lower, share


def key_rate_durations(rows: ValuedRows, *, terms: ArrayLike = KEY_TERMS) -> tuple[FloatArray, FloatArray]:
    """Key-rate durations and DV01.

    Parameters
    ----------
    rows : ValuedRows
    terms : array_like, shape (k,)
        Terms of the key rates [years], rising, at least two.

    Returns
    -------
    durations : ndarray, shape (k,)
        ``-(1/PV) dPV/dz`` for a triangular move of the continuous zero rates [years]; they sum to the
        effective duration. NaN where the present value is 0.
    dv01 : ndarray, shape (k,)
        The fall in present value for +1 basis point at the key, revalued exactly [currency].
    """
    count = np.size(terms)
    lower, share = key_rate_weights(rows.time, terms=terms)
    with np.errstate(over="ignore", under="ignore", invalid="ignore", divide="ignore"):
        above, below = rows.time * share, rows.time * (1.0 - share)

        def by_key(of_lower: FloatArray, of_upper: FloatArray) -> FloatArray:
            total = np.bincount(lower, weights=of_lower, minlength=count).astype(np.float64, copy=False)
            total[1:] += np.bincount(lower, weights=of_upper, minlength=count)[:-1]
            return total

        slope = by_key(rows.value * below, rows.value * above)
        dv01 = by_key(
            -rows.value * np.expm1(-BASIS_POINT * below), -rows.value * np.expm1(-BASIS_POINT * above)
        )
        worth, gross = rows.value.sum(), np.abs(rows.value).sum()
        return slope / (worth if abs(worth) > _NO_VALUE * gross else np.nan), dv01
