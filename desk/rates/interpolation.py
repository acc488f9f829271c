"""What is drawn between the terms of a curve, as polynomial pieces of ``-ln P(0, t)``."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["Pieces", "cubic_zero", "linear_zero", "locate", "log_linear", "monotone_convex"]

FloatArray = NDArray[np.float64]

_SHORTEST = 1e-12  # of an interval
_MANY_TIMES = 500
_FEW_STARTS = 80


def locate(start: FloatArray, time: FloatArray) -> NDArray[np.intp]:
    """The last of the starts that is at or before each time.

    Parameters
    ----------
    start : ndarray, shape (p,)
        Rising; the first is taken to be before every time.
    time : ndarray, any shape

    Returns
    -------
    ndarray of int, the shape of `time`
        From 0 to p - 1.
    """
    if time.size < _MANY_TIMES or start.size > _FEW_STARTS:
        return np.searchsorted(start[1:], time, side="right")
    # For a few starts, counting those passed is several times faster than halving: it never branches.
    passed = np.zeros(time.shape, dtype=np.uint8)
    for beginning in start[1:]:
        passed += time >= beginning
    return passed.astype(np.intp)


@dataclass(frozen=True, eq=False)
class Pieces:
    """A continuous function made of polynomials; the last piece has no end.

    Attributes
    ----------
    start : ndarray, shape (p,)
        Where each piece begins, rising from 0.
    coefficients : ndarray, shape (degree + 1, p)
        Row k holds the factors of ``(t - start)^k``.
    """

    start: FloatArray
    coefficients: FloatArray

    def _locate(self, time: FloatArray) -> tuple[NDArray[np.intp], FloatArray]:
        """Each time's piece, and the time since its beginning."""
        piece = locate(self.start, time)
        return piece, time - self.start[piece]

    def value(self, time: FloatArray) -> FloatArray:
        """The function, the shape of `time`."""
        piece, since = self._locate(time)
        total = self.coefficients[-1][piece]
        for row in self.coefficients[-2::-1]:
            total = total * since + row[piece]
        return np.asarray(total)

    def slope(self, time: FloatArray) -> FloatArray:
        """The derivative from the right, the shape of `time`."""
        piece, since = self._locate(time)
        degree = len(self.coefficients) - 1
        total = degree * self.coefficients[degree][piece]
        for power in range(degree - 1, 0, -1):
            total = total * since + power * self.coefficients[power][piece]
        return np.asarray(total)

    def mean_slope(self, first: FloatArray, last: FloatArray) -> FloatArray:
        """The mean of the derivative from `first` to `last`; its value where they are equal.

        Within one piece the difference quotient is summed term by term, ``(v^k - u^k)/(v - u)`` being
        ``v^(k-1) + u v^(k-2) + ... + u^(k-1)``, so that close times lose no digits.
        """
        piece, start = self._locate(first)
        piece_last, end = self._locate(last)
        quotient = self.coefficients[1][piece]
        symmetric = np.ones_like(start)
        power = np.ones_like(start)
        for row in self.coefficients[2:]:
            power = power * start
            symmetric = symmetric * end + power
            quotient = quotient + row[piece] * symmetric
        apart = piece != piece_last
        if apart.any():
            gap = np.where(apart, last - first, 1.0)
            quotient = np.where(apart, (self.value(last) - self.value(first)) / gap, quotient)
        return np.asarray(quotient)


def log_linear(terms: FloatArray, rates: FloatArray) -> Pieces:
    """Straight lines in the logarithm of the discount factor: flat forwards between the terms."""
    exponent = rates * terms
    start = np.concatenate(([0.0], terms))
    forward = np.diff(exponent, prepend=0.0) / np.diff(start)
    return Pieces(
        start, np.stack([np.concatenate(([0.0], exponent)), np.concatenate((forward, forward[-1:]))])
    )


def linear_zero(terms: FloatArray, rates: FloatArray) -> Pieces:
    """Straight lines in the zero rate."""
    slope = np.diff(rates) / np.diff(terms)
    return _from_zero_rates(terms, np.stack([rates[:-1], slope]), rates, slope[-1] if slope.size else 0.0)


def cubic_zero(terms: FloatArray, rates: FloatArray) -> Pieces:
    """A cubic spline in the zero rate, with no curvature at the first and the last term."""
    if terms.size < 3:
        return linear_zero(terms, rates)
    from scipy.interpolate import CubicSpline

    spline = CubicSpline(terms, rates, bc_type="natural")
    return _from_zero_rates(terms, spline.c[::-1], rates, float(spline(terms[-1], 1)))


def _from_zero_rates(
    terms: FloatArray, rate_pieces: FloatArray, rates: FloatArray, last_slope: float
) -> Pieces:
    """Pieces of ``z(t) t`` where z is flat up to the first term and a polynomial between the terms.

    Parameters
    ----------
    terms, rates : ndarray, shape (q,)
    rate_pieces : ndarray, shape (d, q - 1)
        Row k holds the factors of ``(t - term)^k`` in z.
    last_slope : float
        ``dz/dt`` at the last term, from the left.
    """
    degree, count = rate_pieces.shape
    coefficients = np.zeros((degree + 1, count + 2))
    coefficients[1, 0] = rates[0]
    # z(t) t = z(t) (term + u), with u the time since the term.
    coefficients[:-1, 1:-1] = rate_pieces * terms[:-1]
    coefficients[1:, 1:-1] += rate_pieces
    coefficients[0, -1] = rates[-1] * terms[-1]
    coefficients[1, -1] = rates[-1] + terms[-1] * last_slope
    return Pieces(np.concatenate(([0.0], terms)), coefficients)


def monotone_convex(terms: FloatArray, rates: FloatArray) -> Pieces:
    """Monotone convex interpolation of the forward rate.

    Notes
    -----
    The forwards at the terms are held positive, as the authors offer, where every discrete forward is
    positive; with a discrete forward at or below 0 that bound has no meaning and none is set.

    References
    ----------
    Hagan, P.S. and West, G., "Interpolation Methods for Curve Construction", Applied Mathematical
    Finance 13(2), 2006, pp. 89-129, section 6; the four regions as restated in Hagan and West, "Methods
    for Constructing a Yield Curve", Wilmott Magazine, May 2008, pp. 70-81.
    """
    start = np.concatenate(([0.0], terms))
    width = np.diff(start)
    exponent = np.concatenate(([0.0], rates * terms))
    discrete = np.diff(exponent) / width
    forward = _node_forwards(width, discrete)
    beginnings: list[float] = []
    columns: list[tuple[float, float, float, float]] = []
    for number, mean in enumerate(discrete):
        value = exponent[number]
        left, right = forward[number] - mean, forward[number + 1] - mean
        for begin, share, (level, tilt, bend) in _regions(left, right):
            # In x = (t - start)/width the excess over the mean is level + tilt x + bend x².
            length = width[number]
            beginnings.append(start[number] + begin * length)
            columns.append((value, mean + level, tilt / (2.0 * length), bend / (3.0 * length**2)))
            value += length * (mean * share + share * (level + share * (tilt / 2.0 + share * bend / 3.0)))
    beginnings.append(start[-1])
    columns.append((exponent[-1], forward[-1], 0.0, 0.0))
    return Pieces(np.array(beginnings), np.array(columns).T)


def _node_forwards(width: FloatArray, discrete: FloatArray) -> FloatArray:
    """Forwards at time 0 and at the terms, shape (q + 1,)."""
    inner = (width[:-1] * discrete[1:] + width[1:] * discrete[:-1]) / (width[:-1] + width[1:])
    if not inner.size:
        return np.array([discrete[0], discrete[0]])
    first = discrete[0] - 0.5 * (inner[0] - discrete[0])
    last = discrete[-1] - 0.5 * (inner[-1] - discrete[-1])
    forward = np.concatenate(([first], inner, [last]))
    if discrete.min() > 0.0:
        lower_neighbour = np.minimum(
            np.concatenate((discrete[:1], discrete)), np.concatenate((discrete, discrete[-1:]))
        )
        forward = np.clip(forward, 0.0, 2.0 * lower_neighbour)
    return forward


def _regions(left: float, right: float) -> list[tuple[float, float, tuple[float, float, float]]]:
    """The excess of the forward over its mean across one interval, x from 0 to 1.

    Parameters
    ----------
    left, right : float
        The excess at both ends: g(0) and g(1) of the paper.

    Returns
    -------
    list of (begin, share, (level, tilt, bend))
        Pieces by where they begin and how long they are in x; in y = x - begin the excess is
        ``level + tilt y + bend y²``.
    """
    if left == 0.0 and right == 0.0:
        return [(0.0, 1.0, (0.0, 0.0, 0.0))]
    if min(left, right) >= 0.0 or max(left, right) <= 0.0:  # region (iv)
        turn = _snapped(right / (left + right))
        low = -left * right / (left + right)
        pieces = [_falling(turn, left, low), (turn, 1.0 - turn, _rising(1.0 - turn, low, right))]
    elif abs(right) > 2.0 * abs(left):  # region (ii)
        turn = _snapped((right + 2.0 * left) / (right - left))
        pieces = [(0.0, turn, (left, 0.0, 0.0)), (turn, 1.0 - turn, _rising(1.0 - turn, left, right))]
    elif abs(right) < 0.5 * abs(left):  # region (iii)
        turn = _snapped(3.0 * right / (right - left))
        pieces = [_falling(turn, left, right), (turn, 1.0 - turn, (right, 0.0, 0.0))]
    else:  # region (i)
        pieces = [(0.0, 1.0, (left, -4.0 * left - 2.0 * right, 3.0 * (left + right)))]
    return [piece for piece in pieces if piece[1] > 0.0]


def _snapped(turn: float) -> float:
    """The turn, moved to an end of the interval where the piece up to it would be too short to divide by."""
    if turn < _SHORTEST:
        return 0.0
    return 1.0 if turn > 1.0 - _SHORTEST else turn


def _falling(length: float, start: float, end: float) -> tuple[float, float, tuple[float, float, float]]:
    """A parabola from `start` that comes to rest at `end` after `length`."""
    if length == 0.0:
        return 0.0, 0.0, (0.0, 0.0, 0.0)
    drop = start - end
    return 0.0, length, (start, -2.0 * drop / length, drop / length**2)


def _rising(length: float, start: float, end: float) -> tuple[float, float, float]:
    """A parabola at rest at `start` that reaches `end` after `length`."""
    return (start, 0.0, (end - start) / length**2) if length > 0.0 else (0.0, 0.0, 0.0)
