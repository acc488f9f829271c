"""How ``-ln P(0, t)`` of a curve moves with its zero rates, for every interpolation.

Between two terms a curve is told by a few numbers of that interval, however many terms there are. The
derivatives are kept in that form: by the numbers of the interval at each time, and of those numbers by the
zero rates.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from desk.rates.curve import Interpolation
from desk.rates.small_products import small_product

__all__ = ["Exponents", "exponents", "local_factors"]

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complexfloating]

_STEP = 1e-20  # of a complex step: it is squared away, so it may be as small as one likes


@dataclass(frozen=True, eq=False)
class Exponents:
    """``-ln P`` of a curve at n times, and how it moves.

    Attributes
    ----------
    value : ndarray, shape (n,)
    place : ndarray of int, shape (k, n)
        The k numbers that tell the curve at each time, as rows of `by_rate`.
    factor : ndarray, shape (k, n)
        Derivatives of `value` by those numbers.
    by_rate : ndarray, shape (p, q)
        Derivatives of all p numbers by the q zero rates.
    """

    value: FloatArray
    place: NDArray[np.intp]
    factor: FloatArray
    by_rate: FloatArray


def exponents(
    terms: FloatArray, times: FloatArray, interpolation: Interpolation
) -> Callable[[FloatArray], Exponents]:
    """The exponent of a curve through given terms, with its derivatives by the zero rates.

    Parameters
    ----------
    terms : ndarray, shape (q,)
        Positive and rising [years].
    times : ndarray, shape (n,)
        At which it is wanted, at most the last term [years].
    interpolation : Interpolation

    Returns
    -------
    callable
        Of the zero rates, shape (q,). What depends on the times alone is worked out once, here.
    """
    if interpolation is Interpolation.MONOTONE_CONVEX:
        return lambda rates: _monotone_convex(terms, rates, times)
    by_rate = np.eye(terms.size)
    if interpolation is Interpolation.LOG_LINEAR:
        place, factor = local_factors(terms, times, interpolation)
    elif interpolation is Interpolation.CUBIC_ZERO and terms.size > 2:
        from scipy.interpolate import CubicSpline

        place, factor = _cubic_zero(terms, times)
        bend = CubicSpline(terms, by_rate, bc_type="natural")(terms, 2)
        by_rate = np.concatenate((by_rate, bend))
    else:
        place, factor = local_factors(terms, times, Interpolation.LINEAR_ZERO)

    def linear(rates: FloatArray) -> Exponents:
        return Exponents(np.sum(factor * (by_rate @ rates)[place], axis=0), place, factor, by_rate)

    return linear


def local_factors(
    terms: FloatArray, times: FloatArray, interpolation: Interpolation
) -> tuple[NDArray[np.intp], FloatArray]:
    """The two zero rates that tell the exponent at each time, where no others do.

    Parameters
    ----------
    terms : ndarray, shape (q,)
        Positive and rising [years].
    times : ndarray, shape (n,)
        At most the last term [years].
    interpolation : Interpolation
        `LOG_LINEAR` or `LINEAR_ZERO`.

    Returns
    -------
    place : ndarray of int, shape (2, n)
        Of the rates on both sides.
    factor : ndarray, shape (2, n)
        Derivatives of the exponent by them; it is the sum of rates times factors.
    """
    if interpolation is Interpolation.LOG_LINEAR:
        return _log_linear(terms, times)
    return _linear_zero(terms, times)


def _between(terms: FloatArray, times: FloatArray) -> tuple[NDArray[np.intp], NDArray[np.intp], FloatArray]:
    """The terms on both sides of each time and the part of the way to the later; the first before both."""
    if terms.size == 1:
        none = np.zeros(times.size, dtype=np.intp)
        return none, none, np.zeros(times.size)
    later = np.clip(np.searchsorted(terms, times), 1, terms.size - 1)
    before = terms[later - 1]
    return later - 1, later, (np.maximum(times, terms[0]) - before) / (terms[later] - before)


def _linear_zero(terms: FloatArray, times: FloatArray) -> tuple[NDArray[np.intp], FloatArray]:
    before, later, part = _between(terms, times)
    return np.stack((before, later)), np.stack(((1.0 - part) * times, part * times))


def _log_linear(terms: FloatArray, times: FloatArray) -> tuple[NDArray[np.intp], FloatArray]:
    before, later, part = _between(terms, times)
    by_before = np.where(times < terms[0], times, (1.0 - part) * terms[before])
    return np.stack((before, later)), np.stack((by_before, part * terms[later]))


def _cubic_zero(terms: FloatArray, times: FloatArray) -> tuple[NDArray[np.intp], FloatArray]:
    """By the zero rates on both sides and then by the second derivatives there."""
    before, later, part = _between(terms, times)
    share = np.stack((1.0 - part, part))
    bend = (terms[later] - terms[before]) ** 2 / 6.0 * (share**3 - share)
    sides = np.stack((before, later))
    return np.concatenate((sides, sides + terms.size)), np.concatenate((share, bend)) * times


def _monotone_convex(terms: FloatArray, rates: FloatArray, times: FloatArray) -> Exponents:
    """As `desk.rates.interpolation.monotone_convex` draws it, all times at once.

    An interval is told by the exponent at its start, its discrete forward and the forwards at its ends.
    """
    count = terms.size
    start = np.concatenate(([0.0], terms[:-1]))
    width = terms - start
    before = np.concatenate(([0.0], (rates * terms)[:-1]))
    # dimensions: interval, rate
    before_by_rate = np.diag(terms[:-1], -1)
    discrete_by_rate = (np.diag(terms) - before_by_rate) / width[:, None]
    discrete = discrete_by_rate @ rates
    node_by_discrete = _node_weights(width)
    node = node_by_discrete @ discrete
    if discrete.min() > 0.0:
        below = np.maximum(np.arange(count + 1) - 1, 0)
        above = np.minimum(np.arange(count + 1), count - 1)
        lower = np.where(discrete[below] <= discrete[above], below, above)
        highest = 2.0 * discrete[lower]
        node_by_discrete[(node < 0.0) | (node > highest)] = 0.0
        high = np.flatnonzero(node > highest)
        node_by_discrete[high, lower[high]] = 2.0
        node = np.clip(node, 0.0, highest)

    here = np.minimum(np.searchsorted(terms, times), count - 1)
    part = (times - start[here]) / width[here]
    left, right = node[here] - discrete[here], node[here + 1] - discrete[here]
    excess, by_left, by_right = _excess_with_slopes(part, left, right)
    by_mean = part - by_left - by_right
    length = width[here]
    return Exponents(
        before[here] + length * (discrete[here] * part + excess),
        np.stack((here, here + count, here + 2 * count, here + 2 * count + 1)),
        np.stack((np.ones(times.size), length * by_mean, length * by_left, length * by_right)),
        np.concatenate((before_by_rate, discrete_by_rate, small_product(node_by_discrete, discrete_by_rate))),
    )


def _node_weights(width: FloatArray) -> FloatArray:
    """Forwards at time 0 and the terms as weights of the discrete forwards, shape (q + 1, q)."""
    count = width.size
    weights = np.zeros((count + 1, count))
    if count == 1:
        weights[:] = 1.0
        return weights
    inner = np.arange(1, count)
    total = width[:-1] + width[1:]
    weights[inner, inner] = width[:-1] / total
    weights[inner, inner - 1] = width[1:] / total
    weights[0] = -0.5 * weights[1]
    weights[0, 0] += 1.5
    weights[count] = -0.5 * weights[count - 1]
    weights[count, count - 1] += 1.5
    return weights


def _excess_with_slopes(
    part: FloatArray, left: FloatArray, right: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """The integral of g from 0 to `part`, and its derivatives by g(0) and g(1).

    The derivatives are by complex step (Squire, W. and Trapp, G., Using Complex Variables to Estimate
    Derivatives of Real Functions, SIAM Review 40(1), 1998): exact to rounding, there being no difference.
    """
    by_left = _excess(part, left + 1j * _STEP, right + 0j)
    by_right = _excess(part, left + 0j, right + 1j * _STEP)
    return (
        np.asarray(by_left.real, dtype=np.float64),
        np.asarray(by_left.imag / _STEP, dtype=np.float64),
        np.asarray(by_right.imag / _STEP, dtype=np.float64),
    )


def _excess(part: FloatArray, left: ComplexArray, right: ComplexArray) -> ComplexArray:
    """The integral of g from 0 to `part`, in the four regions of Hagan and West (2006), section 6."""
    real_left, real_right = left.real, right.real
    same = (np.minimum(real_left, real_right) >= 0.0) | (np.maximum(real_left, real_right) <= 0.0)
    same &= real_left + real_right != 0.0
    second = ~same & (np.abs(real_right) > 2.0 * np.abs(real_left))
    third = ~same & (np.abs(real_right) < 0.5 * np.abs(real_left))
    first = ~(same | second | third)
    total = np.empty(part.shape, dtype=np.complex128)

    x, g0, g1 = part[first], left[first], right[first]
    total[first] = g0 * x * (1.0 - x) ** 2 - g1 * x**2 * (1.0 - x)

    x, g0, g1 = part[second], left[second], right[second]
    turn = (g1 + 2.0 * g0) / (g1 - g0)
    total[second] = g0 * x + (g1 - g0) * _risen(x, turn)

    x, g0, g1 = part[third], left[third], right[third]
    turn = 3.0 * g1 / (g1 - g0)
    total[third] = g1 * x + (g0 - g1) * _fallen(x, turn)

    x, g0, g1 = part[same], left[same], right[same]
    turn, low = g1 / (g0 + g1), -g0 * g1 / (g0 + g1)
    total[same] = low * x + (g0 - low) * _fallen(x, turn) + (g1 - low) * _risen(x, turn)
    return total


def _risen(x: FloatArray, turn: ComplexArray) -> ComplexArray:
    """The integral of ``((x - turn)/(1 - turn))²`` from `turn` on."""
    length = 1.0 - turn
    after = (x > turn.real) & (length.real != 0.0)
    return np.where(after, (x - turn) ** 3 / (3.0 * np.where(after, length, 1.0) ** 2), 0.0)


def _fallen(x: FloatArray, turn: ComplexArray) -> ComplexArray:
    """The integral of ``(1 - x/turn)²`` from 0, up to `turn`."""
    flat = turn.real == 0.0
    safe = np.where(flat, 1.0, turn)
    rest = np.where(x < turn.real, 1.0 - x / safe, 0.0)
    return np.where(flat, turn / 3.0, safe / 3.0 * (1.0 - rest**3))
