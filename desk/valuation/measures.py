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
from desk.rates.interpolation import locate
from desk.valuation.records import Measures
from desk.valuation.roots import solve_rates
from desk.valuation.sums import blocks, group_sums

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
    spreads = np.broadcast_to(np.asarray(spread, dtype=np.float64), times.shape)
    exponent, value = np.empty_like(times), np.empty_like(times)
    with np.errstate(over="ignore", under="ignore", invalid="ignore"):
        for part in blocks(times.size):
            exponent[part] = (curve.zero(times[part]) + spreads[part]) * times[part]
            value[part] = amounts[part] * np.exp(-exponent[part])
    return ValuedRows(times, amounts, exponent, value)


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
    time, value = rows.time, rows.value
    some_negative = bool(value.size) and value.min() < 0.0
    some_today = bool(time.size) and time.min() <= 0.0

    def moments(part: slice) -> list[FloatArray]:
        own_time, own = time[part], value[part]
        timed = own_time * own
        fall = -own * np.expm1(-BASIS_POINT * own_time)
        sums = [own, timed, own_time * timed, fall, own * rows.exponent[part]]
        if some_negative:
            sums.append(np.abs(own))
        if some_today:
            later = own_time > 0.0
            sums.extend((np.where(later, own, 0.0), later.astype(np.float64)))
        return sums

    worth, first, second, dv01, exponent, *rest = group_sums(group, count, moments)
    gross = rest.pop(0) if some_negative else np.abs(worth)
    target, later_rows = rest if some_today else (worth, np.ones(count))
    present = np.where(np.abs(worth) > _NO_VALUE * gross, worth, np.nan)
    effective = first / present

    def scattered(part: slice) -> list[FloatArray]:
        centre = effective[0] if count == 1 else effective[group[part]]
        return [value[part] * (time[part] - centre) ** 2]

    dispersion = group_sums(group, count, scattered)[0] / present

    # Flows today are worth the same at any rate; left out, they take no digits from the rest.
    solved = np.flatnonzero(time > 0.0) if some_today else slice(None)
    rate = solve_rates(
        group[solved],
        time[solved],
        rows.amount[solved],
        target=np.where(np.isnan(present), np.nan, target),
        start=exponent / first,
    )

    def at_equivalent_rate(part: slice) -> list[FloatArray]:
        of_row = rate[0] if count == 1 else rate[group[part]]
        own = rows.amount[part] * np.exp(-of_row * time[part])
        return [own, own * time[part]]

    total, timed_total = group_sums(group, count, at_equivalent_rate)
    macaulay = timed_total / total
    modified = macaulay * np.exp(-rate)
    only_today = ~np.isnan(present) & (later_rows == 0.0)
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
    lower = locate(keys[:-1], time)
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
    # dimensions: slope by lower and upper key, fall by lower and upper key; key
    sums = np.zeros((4, np.size(terms)))
    with np.errstate(over="ignore", under="ignore", invalid="ignore", divide="ignore"):
        for part in blocks(rows.time.size):
            time, value = rows.time[part], rows.value[part]
            lower, share = key_rate_weights(time, terms=terms)
            above = time * share
            below = time - above
            sums += [
                np.bincount(lower, weights=weights, minlength=sums.shape[1])
                for weights in (
                    value * below,
                    value * above,
                    -value * np.expm1(-BASIS_POINT * below),
                    -value * np.expm1(-BASIS_POINT * above),
                )
            ]
        worth, gross = rows.value.sum(), np.abs(rows.value).sum()
        slope, dv01 = sums[0::2] + np.roll(sums[1::2], 1, axis=1)
        return slope / (worth if abs(worth) > _NO_VALUE * gross else np.nan), dv01
