"""The rate at which flows are worth a given value, for many groups of flows at once."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from desk.book.arrays import FloatArray, IntArray
from desk.valuation.sums import group_sums

__all__ = ["solve_rates"]

_MOST_STEPS = 100
_LARGEST_STEP_DOWN = 50.0  # in the exponent rate · time: e^50 is far from the largest float
_SMALL_STEP = 1e-8  # in the exponent; the error left after the step is about its square
_SEARCHED = np.linspace(np.log(0.5), np.log(2.0), 57)


def solve_rates(
    group: IntArray,
    time: FloatArray,
    amount: FloatArray,
    *,
    target: FloatArray,
    start: FloatArray | None = None,
) -> FloatArray:
    """Continuous rates r with ``Σ amount · exp(-r · time) = target``, one a group.

    Parameters
    ----------
    group : ndarray of int, shape (n,)
        Each flow's group, from 0 to m - 1.
    time : ndarray, shape (n,)
        [years], at least 0.
    amount : ndarray, shape (n,)
        [currency]
    target : ndarray, shape (m,)
        What each group is to be worth [currency].
    start : ndarray, shape (m,), optional
        Where to begin; 0 by default.

    Returns
    -------
    ndarray, shape (m,)
        [1/year]; NaN where no rate does it, where every rate does, or where the flows have both signs and
        not exactly one rate between -50 % and 100 % a year does it.

    Notes
    -----
    For flows of one sign the logarithm of the sum is convex and falls in r, so Newton's method on it
    reaches the one root from any start: at most one step is too long, to the left, after which the
    iterates rise to the root. That step is bounded, to keep the exponent in range. Flows of both signs
    are searched for changes of sign, and the one interval is narrowed by Newton's method with halving.
    """
    count = target.size
    rates = np.full(count, np.nan)
    later = time > 0.0
    if not later.all():
        today = amount[~later]
        target = target - group_sums(group[~later], count, lambda part: [today[part]])[0]
        group, time, amount = group[later], time[later], amount[later]
    begin = np.zeros(count) if start is None else np.where(np.isfinite(start), start, 0.0)
    positive = _any_in_group(group, amount > 0.0, count)
    negative = _any_in_group(group, amount < 0.0, count)
    one_sign = (positive & ~negative & (target > 0.0)) | (negative & ~positive & (target < 0.0))
    both_signs = positive & negative & np.isfinite(target)
    with np.errstate(over="ignore", under="ignore", invalid="ignore", divide="ignore"):
        if one_sign.any():
            _newton_on_logarithm(rates, one_sign, group, time, amount, target, begin)
        if both_signs.any():
            _search(rates, both_signs, group, time, amount, target)
    return rates


def _any_in_group(group: IntArray, flag: NDArray[np.bool_], count: int) -> NDArray[np.bool_]:
    """Whether a flag is set in each group, shape (m,)."""
    found = np.zeros(count, dtype=np.bool_)
    if flag.all():
        found[group] = True
    elif flag.any():
        found[group[flag]] = True
    return found


def _worth_and_slope(
    rate: FloatArray, group: IntArray, time: FloatArray, amount: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """What each group is worth at its rate, and how fast that falls, each shape (m,)."""

    def columns(part: slice) -> tuple[FloatArray, FloatArray]:
        at_rate = rate[0] if rate.size == 1 else rate[group[part]]
        worth = amount[part] * np.exp(-at_rate * time[part])
        return worth, worth * time[part]

    worth, slope = group_sums(group, rate.size, columns)
    return worth, slope


def _worth_at_searched(group: IntArray, time: FloatArray, amount: FloatArray, count: int) -> FloatArray:
    """What each group is worth at each rate searched, shape (rates, m)."""

    def columns(part: slice) -> list[FloatArray]:
        worth = amount[part] * np.exp(-_SEARCHED[0] * time[part])
        step = np.exp(-(_SEARCHED[1] - _SEARCHED[0]) * time[part])  # the rates lie at even distances
        found = [worth]
        for _ in _SEARCHED[1:]:
            worth = worth * step
            found.append(worth)
        return found

    return group_sums(group, count, columns)


def _newton_on_logarithm(
    rates: FloatArray,
    wanted: NDArray[np.bool_],
    group: IntArray,
    time: FloatArray,
    amount: FloatArray,
    target: FloatArray,
    begin: FloatArray,
) -> None:
    """Write the rates of the wanted groups, whose flows are of one sign."""
    count = target.size
    longest = np.zeros(count)
    if count == 1:
        longest[0] = time.max()
    else:
        np.maximum.at(longest, group, time)
    rate = begin.copy()
    active = wanted.copy()
    rows_for = None
    for _ in range(_MOST_STEPS):
        if rows_for is None or not np.array_equal(rows_for, active):
            if not active.all():
                rows = active[group]
                group, time, amount = group[rows], time[rows], amount[rows]
            rows_for = active.copy()
        total, slope = _worth_and_slope(rate, group, time, amount)
        # d/dr ln Σ = -slope/total
        step = np.log(total / target) * total / slope
        step = np.where(active, np.maximum(step, -_LARGEST_STEP_DOWN / longest), 0.0)
        rate = rate + step
        done = active & (np.abs(step) * longest <= _SMALL_STEP)
        rates[done] = rate[done]
        active = active & ~done & np.isfinite(step)
        if not active.any():
            return


def _search(
    rates: FloatArray,
    wanted: NDArray[np.bool_],
    group: IntArray,
    time: FloatArray,
    amount: FloatArray,
    target: FloatArray,
) -> None:
    """Write the rates of the wanted groups, whose flows have both signs, where there is just one."""
    count = target.size
    rows = wanted[group]
    group, time, amount = group[rows], time[rows], amount[rows]

    # dimensions: rate searched, group
    worth = _worth_at_searched(group, time, amount, count)
    signs = np.where(worth >= target, 1, -1)
    changes = signs[1:] != signs[:-1]
    single = wanted & (changes.sum(axis=0) == 1)
    at = changes.argmax(axis=0)
    low, high = _SEARCHED[at], _SEARCHED[at + 1]
    sign_low = signs[at, np.arange(count)]
    rate = 0.5 * (low + high)
    for _ in range(_MOST_STEPS):
        total, slope = _worth_and_slope(rate, group, time, amount)
        value = total - target
        same = np.where(value >= 0.0, 1, -1) == sign_low
        low, high = np.where(same, rate, low), np.where(same, high, rate)
        ahead = rate + value / slope
        inside = (ahead >= low) & (ahead <= high)
        following = np.where(inside, ahead, 0.5 * (low + high))
        still = single & (np.abs(following - rate) > 1e-15 * (1.0 + np.abs(rate)))
        rate = following
        if not still.any():
            break
    rates[single] = rate[single]
