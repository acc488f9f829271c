"""Zero rates found one after the other, where each instrument tells the one at its end."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from desk.rates.curve import Interpolation
from desk.rates.quoted_flows import QuotedFlows
from desk.rates.sensitivity import local_factors

__all__ = ["in_turn"]

FloatArray = NDArray[np.float64]

_MOST_STEPS = 100
_LARGEST_STEP_DOWN = 50.0  # in the exponent rate · time: e^50 is far from the largest float
_SMALL_STEP = 1e-9  # in the exponent; the error left after the step is about its square
_LARGEST_RATE = 1e6  # [1/year]


def in_turn(
    flows: QuotedFlows, interpolation: Interpolation, start: FloatArray
) -> tuple[FloatArray, int | None]:
    """Zero rates at which every instrument is worth its value.

    Parameters
    ----------
    flows : QuotedFlows
        In the order of their last payments; every amount above 0.
    interpolation : Interpolation
        One in which a zero rate moves nothing before the term before it.
    start : ndarray, shape (m,)
        Where each rate is looked for first [1/year].

    Returns
    -------
    rates : ndarray, shape (m,)
        [1/year]
    row : int or None
        The first instrument that no rate gives its value; those from it on have a rate of 0. It is one whose
        payments up to the instrument before it are worth as much as the whole already.

    Notes
    -----
    What an instrument pays after the one before it is worth ``Σ w e^{-b r}`` with b above 0: the logarithm is
    convex and falls in r, so Newton's method on it reaches the root from any start.
    """
    rates = np.zeros(len(flows))
    places, factors = local_factors(flows.term, flows.time, interpolation)
    ends = np.append(flows.first_row[1:], flows.instrument.size)
    with np.errstate(over="ignore", under="ignore", invalid="ignore", divide="ignore"):
        for row, (begin, end) in enumerate(zip(flows.first_row.tolist(), ends.tolist(), strict=True)):
            place, factor = places[:, begin:end], factors[:, begin:end]
            # The rates from this one on are 0 as yet.
            weight = flows.amount[begin:end] * np.exp(-(factor * rates[place]).sum(axis=0))
            by_rate = np.where(place == row, factor, 0.0).sum(axis=0)
            is_open = by_rate > 0.0
            rest = float(flows.target[row] - weight[~is_open].sum())
            found = None
            if rest > 0.0:
                found = _root(weight[is_open], by_rate[is_open], rest, float(start[row]))
            if found is None:
                return rates, row
            rates[row] = found
    return rates, None


def _root(weight: FloatArray, by_rate: FloatArray, worth: float, start: float) -> float | None:
    """The rate r at which the weights times ``e^{-b r}`` sum to `worth`."""
    longest = float(by_rate.max())
    rate = start
    for _ in range(_MOST_STEPS):
        discounted = weight * np.exp(-by_rate * rate)
        total = float(discounted.sum())
        slope = float(discounted @ by_rate)
        if not (0.0 < total < np.inf and slope > 0.0):
            return None
        step = max(float(np.log(total / worth)) * total / slope, -_LARGEST_STEP_DOWN / longest)
        rate += step
        if not abs(rate) < _LARGEST_RATE:
            return None
        if abs(step) * longest <= _SMALL_STEP:
            return rate
    return None
