"""A lognormal model worked out: its transition, levels and state prices, and flows valued with them."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from desk.rates.black_karasinski_grid import StateChain
from desk.rates.curve import DiscountCurve
from desk.rates.limits import first_integral

if TYPE_CHECKING:
    from scipy.sparse import csr_array

__all__ = ["ON_GRID", "Lattice", "LogRateLaw", "operators"]

FloatArray = NDArray[np.float64]

ON_GRID = 1e-9
"""Steps by which a time may be off a node and still count as being there."""

_ITERATIONS = 60
# Quadrature over the noise of a part of a step.
_NODE, _WEIGHT = np.polynomial.hermite_e.hermegauss(12)
_WEIGHT = _WEIGHT / _WEIGHT.sum()


@dataclass(frozen=True)
class LogRateLaw:
    """How ``x`` in ``r = exp(α + x)`` moves: ``x → decay·x + shift + noise·z`` over any length of time.

    Attributes
    ----------
    mean_reversion, volatility, risk_price : float
        See `desk.rates.black_karasinski.BlackKarasinskiRates`.
    """

    mean_reversion: float
    volatility: float
    risk_price: float

    def decay(self, length: float) -> float:
        """``e^{-aΔ}``."""
        return math.exp(-self.mean_reversion * length)

    def noise(self, length: float) -> float:
        """Standard deviation of x after a time."""
        return self.volatility * math.sqrt(float(first_integral(2.0 * self.mean_reversion, length)))

    def shift(self, length: float) -> float:
        """Mean of x after a time under the real-world measure."""
        return self.volatility * self.risk_price * float(first_integral(self.mean_reversion, length))


class Lattice:
    """The model on its grid of nodes and points, fitted to a curve.

    Parameters
    ----------
    curve : DiscountCurve
    law : LogRateLaw
    chain : StateChain
        Of one step.
    step : float
        [years]
    count : int
        Number k of steps.

    Attributes
    ----------
    chain : StateChain
    growth : ndarray, shape (points,)
        ``e^x`` at the points.
    mean, back : csr_array
        The mean over a step and its transpose.
    level : ndarray, shape (k,)
        α of every step.
    price : ndarray, shape (k + 1, points)
        State prices at every node.
    fit_error : float
        Largest relative difference between the discount factors found and the curve's.

    Raises
    ------
    ValueError
        If a forward rate of the curve is not above 0.
    """

    def __init__(
        self, curve: DiscountCurve, law: LogRateLaw, chain: StateChain, *, step: float, count: int
    ) -> None:
        self._curve, self._law, self.chain, self._step = curve, law, chain, step
        self.growth = np.exp(chain.point)
        self.mean, self.back = operators(*chain.bands())
        self._level = np.empty(count)
        self._price = np.empty((count + 1, chain.count))
        self.fit_error = self._fit(np.asarray(np.arange(count + 1) * step, dtype=np.float64))

    @property
    def level(self) -> FloatArray:
        """α of every step."""
        return self._level

    @property
    def price(self) -> FloatArray:
        """State prices at every node."""
        return self._price

    def _fit(self, node: FloatArray) -> float:
        """Find α for every step; the largest relative error at the nodes."""
        target = -self._curve.zero(node) * node
        forward = -np.diff(target) / self._step
        # Written so that what is not a number counts as well.
        wrong = np.flatnonzero(~((forward > 0.0) & (forward < np.inf)))
        if wrong.size:
            place = int(wrong[0])
            raise ValueError(
                f"the lognormal model needs forward rates above 0, but from {node[place]:g} to "
                f"{node[place + 1]:g} years the curve's is {forward[place] + 0.0:.4%}"
            )
        self._price[0] = 0.0
        self._price[0, self.chain.start] = 1.0
        half, worst = 0.5 * self._step * self.growth, 0.0
        level = float(forward[0])
        for step in range(forward.size):
            price = self._price[step]
            for _ in range(_ITERATIONS):
                edge = np.exp(-level * half)
                slope = -half * edge
                after, after_slope = self.mean @ edge, self.mean @ slope
                total = float(price @ (edge * after))
                change = float(price @ (slope * after + edge * after_slope)) / total
                gap = math.log(total) - float(target[step + 1])
                move = gap / change
                # ln of a mean of exponentials is convex in the level: only the first step can go too far.
                level = level - move if move < level else 0.5 * level
                if abs(move) <= 1e-15 * level or abs(gap) < 1e-15:
                    break
            else:
                if not abs(gap) < 1e-11:
                    raise ValueError(f"no rate level meets the curve at {node[step + 1]:g} years")
            self._level[step] = math.log(level)
            edge = np.exp(-level * half)
            self._price[step + 1] = edge * (self.back @ (edge * price))
            worst = max(
                worst, abs(math.expm1(math.log(float(self._price[step + 1].sum())) - target[step + 1]))
            )
        return worst

    def edge(self, step: int, growth: FloatArray | None = None) -> FloatArray:
        """d: what either end of a step takes off, at the points or where else ``e^x`` is given."""
        part = 0.5 * self._step * math.exp(float(self._level[step]))
        return np.asarray(np.exp(-part * (self.growth if growth is None else growth)))

    def sweep(
        self, wanted: dict[int, FloatArray], time: FloatArray, amount: FloatArray
    ) -> dict[int, FloatArray]:
        """Values of flows due at or after each node, at the states x wanted there.

        Amounts have shape (k, c), states (m,), values (m, c).
        """
        place = np.asarray(time / self._step)
        if time.size and not (np.isfinite(place).all() and place.max() <= self._level.size + ON_GRID):
            raise ValueError(
                f"a flow is due after the model's horizon of {self._level.size * self._step:g} years: "
                "take a longer one"
            )
        nearest = np.rint(place)
        whole = np.abs(place - nearest) <= ON_GRID * np.maximum(1.0, place)
        step = np.where(whole, nearest, np.floor(place)).astype(np.int64)
        first = min(wanted)
        order = np.argsort(step, kind="stable")
        order = order[step[order] >= first]
        top = max(int(step[order[-1]]) if order.size else first, max(wanted))
        starts = np.searchsorted(step[order], np.arange(first, top + 2), side="left")
        later: FloatArray = np.zeros((self.chain.count, amount.shape[1]))
        found: dict[int, FloatArray] = {}
        for number in range(top, first - 1, -1):
            due = order[starts[number - first] : starts[number - first + 1]]
            paid, between = amount[due[whole[due]]].sum(axis=0), due[~whole[due]]
            # What is due within the step, at the node itself, and after the step.
            fractions = self._fractions(number, time[between])
            edge = self.edge(number)[:, None] if number < self._level.size else np.ones((1, 1))
            ahead = edge * later
            if number in wanted:
                state = wanted[number]
                growth = np.exp(state)
                value = self.chain.rows(state) @ ahead
                if number < self._level.size:
                    value *= self.edge(number, growth)[:, None]
                value += paid
                if between.size:
                    value += self._partial(number, time[between], state, growth) * fractions @ amount[between]
                found[number] = value
            if number > first:
                later = edge * (self.mean @ ahead)
                later += paid
                if between.size:
                    part = self._partial(number, time[between], self.chain.point, self.growth)
                    later += part * fractions @ amount[between]
        return found

    def _partial(self, step: int, time: FloatArray, state: FloatArray, growth: FloatArray) -> FloatArray:
        """Values at a node of 1 paid within the step that begins there, shape (m, k), before scaling."""
        result = np.empty((state.size, time.size))
        for column, one in enumerate(time.tolist()):
            length = one - step * self._step
            after = np.exp(self._law.decay(length) * state[:, None] + self._law.noise(length) * _NODE)
            part = 0.5 * length * math.exp(float(self._level[step]))
            result[:, column] = np.exp(-part * (growth[:, None] + after)) @ _WEIGHT
        return result

    def _fractions(self, step: int, time: FloatArray) -> FloatArray:
        """Numbers near 1 with which `_partial` meets today's curve."""
        if time.size == 0:
            return time
        model = self._price[step] @ self._partial(step, time, self.chain.point, self.growth)
        return np.asarray(self._curve.discount(time) / model)


def operators(weight: FloatArray, column: NDArray[np.intp]) -> tuple[csr_array, csr_array]:
    """A banded matrix and its transpose."""
    from scipy.sparse import csr_array

    count, width = weight.shape
    starts = np.arange(0, count * width + 1, width)
    matrix = csr_array((weight.ravel(), column.ravel(), starts), shape=(count, count))
    # Columns that were cut off at the ends stand there with weight 0.
    matrix.sum_duplicates()
    return matrix, csr_array(matrix.T)
