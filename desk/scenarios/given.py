"""Rates that are not drawn but given: a set of scenarios from outside.

A set states, path by path, the mean of the short rate over each of its steps. Nothing is assumed beyond it:
the savings account grows by these rates, and within a step by the rate held there, so that flows up to the
last node are discounted exactly as the set has it. Flows after the last node are worth there what the book's
curve says of the time from that node on, ``P(0,T)/P(0,t)``, on every path alike: the set says nothing of
them, and this is an assumption.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import ArrayLike

from desk.book import ScenarioSet
from desk.book.arrays import FloatArray
from desk.rates.correlation import volatility_matrix
from desk.rates.curve import DiscountCurve
from desk.rates.risky import RiskyMarket

__all__ = ["GivenMarketWalk", "GivenRates", "GivenWalk"]

# Rates beyond this are no rates: their exponentials would swamp everything else.
_MOST_RATE = 10.0


class GivenRates:
    """A set of scenarios in the place of a model; see `desk.scenarios.drawn_model.DrawnModel`.

    Parameters
    ----------
    scenarios : ScenarioSet
    curve : DiscountCurve
        Today's, of the book. The set need not reprice it.

    Attributes
    ----------
    nodes : ndarray, shape (n + 1,)
        Those of the set, after time 0 [years].
    paths : int
        How many the set has.

    Raises
    ------
    ValueError
        If the set has no path or no node, or a rate of it is no number or beyond ±1,000 %.
    """

    def __init__(self, scenarios: ScenarioSet, curve: DiscountCurve) -> None:
        rate = scenarios.rate
        if rate.size == 0:
            raise ValueError("the sheet Scenario set holds no paths: one row a path and one column a node")
        if not np.isfinite(rate).all():
            row, column = (int(place[0]) for place in np.nonzero(~np.isfinite(rate)))
            raise ValueError(
                f"the Scenario set has no number in path {row + 1} at {scenarios.node[column]:g} years"
            )
        if np.abs(rate).max() > _MOST_RATE:
            row, column = divmod(int(np.argmax(np.abs(rate))), rate.shape[1])
            raise ValueError(
                f"the Scenario set has a rate of {rate[row, column]:.6g} in path {row + 1} at "
                f"{scenarios.node[column]:g} years: rates are fractions, 0.03 for 3 %"
            )
        self._rate = rate
        self._curve = curve
        self.nodes: FloatArray = np.concatenate([[0.0], scenarios.node])
        self.paths = len(rate)

    @property
    def curve(self) -> DiscountCurve:
        """Today's curve of the book."""
        return self._curve

    @property
    def factor_count(self) -> int:
        """One: the rate of the step just ended."""
        return 1

    @property
    def mean_steps_per_year(self) -> int:
        """Nodes a year on average, at least 1."""
        return max(1, round((self.nodes.size - 1) / float(self.nodes[-1])))

    def rate_offset(self, time: ArrayLike) -> FloatArray:
        """0: the state is the rate."""
        return np.zeros(np.shape(time))

    def account_offset(self, time: ArrayLike) -> FloatArray:
        """0: the integral is that of the rate."""
        return np.zeros(np.shape(time))

    def account_law(
        self, time: ArrayLike, *, real_world: bool = False
    ) -> tuple[FloatArray, FloatArray] | None:
        """None: a set has no law."""
        return None

    def mean_discount(self, time: ArrayLike, *, real_world: bool = False) -> FloatArray:
        """``P(0, t)`` of the book's curve: what the mean of ``1/R_t`` is to be held against."""
        return self._curve.discount(time)

    def state_range(self, time: float, *, real_world: bool = False) -> tuple[FloatArray, FloatArray]:
        """The lowest and the highest rate of the step that ends at a node, shape (1,) each."""
        column = self._rate[:, max(self._step(time) - 1, 0)]
        return np.array([column.min()]), np.array([column.max()])

    def _step(self, time: float) -> int:
        step = int(np.searchsorted(self.nodes, time))
        if step >= self.nodes.size or self.nodes[step] != time:
            raise ValueError(f"{time:g} years is no node of the set")
        return step

    def flow_terms(self, node: FloatArray, time: FloatArray) -> tuple[FloatArray, FloatArray]:
        """What a flow is worth at a node: ``exp(level - exposure · rate)`` of its amount.

        Parameters
        ----------
        node : ndarray, shape (k,)
            The node at which the step ends in which the flow is due, or the last node of the set [years].
        time : ndarray, shape (k,)
            When the flow is due [years].

        Returns
        -------
        level : ndarray, shape (k,)
            0, but for flows after the last node.
        exposure : ndarray, shape (k, 1)
            The flow has grown at the rate of the step from when it was due until the node [years].
        """
        late = time > self.nodes[-1]
        end = np.where(late, time, 0.0)
        start = np.where(late, node, 0.0)
        level = self._curve.zero(start) * start - self._curve.zero(end) * end
        return np.asarray(level), np.where(late, 0.0, time - node)[:, None]

    def walk(
        self, step: float, size: int, rng: np.random.Generator, *, real_world: bool = False
    ) -> GivenWalk:
        """The first paths of the set; steps, generator and measure do not apply."""
        return self.walk_of(slice(0, size))

    def walk_of(self, columns: slice) -> GivenWalk:
        """Some paths of the set, by their numbers from 0."""
        return GivenWalk(self._rate[columns], np.diff(self.nodes))


class GivenWalk:
    """Paths of a set, node by node; see `desk.rates.short_rate.Walk`.

    Attributes
    ----------
    state : ndarray, shape (1, size)
        The rate of the step just ended; before the first, that of the first [1/year].
    integral : ndarray, shape (size,)
        ``ln R_t``.
    """

    def __init__(self, rate: FloatArray, lengths: FloatArray) -> None:
        self._rate, self._lengths = rate, lengths.tolist()
        self._done = 0
        self.state: FloatArray = rate[:, :1].T.copy()
        self.integral = np.zeros(len(rate))

    def run(self, steps: int) -> Iterator[None]:
        """Move forward `steps` nodes, yielding after each."""
        if self._done + steps > len(self._lengths):
            raise ValueError(f"the set has {len(self._lengths)} nodes, {self._done + steps} are wanted")
        for _ in range(steps):
            self.state[0] = self._rate[:, self._done]
            self.integral += self.state[0] * self._lengths[self._done]
            self._done += 1
            yield


class GivenMarketWalk:
    """Given rates with risky assets drawn beside them, independent of them; steps may be of any lengths.

    See `desk.rates.risky_walk.MarketWalk`. The excess of an asset over the savings account is a Brownian
    motion with drift, drawn exactly; every asset has its own generator, as beside a model.

    Parameters
    ----------
    rates : GivenWalk
    market : RiskyMarket
    lengths : ndarray, shape (n,)
        Of the steps [years].
    real_world : bool
        Whether the assets earn their premiums.
    generators : sequence of Generator, one an asset
    """

    def __init__(
        self,
        rates: GivenWalk,
        market: RiskyMarket,
        lengths: FloatArray,
        *,
        real_world: bool,
        generators: Sequence[np.random.Generator],
    ) -> None:
        self._rates, self._lengths = rates, lengths.tolist()
        self._generators = list(generators)
        self._root = volatility_matrix(market.covariance)
        drift = -0.5 * market.volatility**2
        self._drift = (drift + market.premium if real_world else drift)[:, None]
        self._done = 0
        size = rates.integral.size
        self.state, self.integral = rates.state, rates.integral
        self.factors = rates.state
        self.excess = np.zeros((market.asset_count, size))
        self.inflation_integral = np.zeros(size)

    def run(self, steps: int) -> Iterator[None]:
        """Move forward `steps` nodes, yielding after each."""
        normals = np.empty_like(self.excess)
        for _ in self._rates.run(steps):
            length = self._lengths[self._done]
            for row, generator in zip(normals, self._generators, strict=True):
                generator.standard_normal(out=row)
            self.excess += self._root @ normals * math.sqrt(length) + self._drift * length
            self._done += 1
            yield
