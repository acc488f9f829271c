"""Lognormal short rates: the model of Black and Karasinski, fitted to a curve.

``r(t) = exp(α(t) + x(t))`` with ``dx = -a x dt + σ dW`` and ``x(0) = 0``, where α is such that today's curve
is repriced. There is no closed form for bonds, so the model is worked out on a grid.

Method ------ Time goes in steps of h, α is constant within each, and over a step the account grows by the
trapezoidal rule, ``ln R`` by ``½ h e^α (e^{x(t)} + e^{x(t+h)})``. That splits into a factor of the state at
either end, so that the value of a claim one step earlier is ``d ⊙ G (d ⊙ V)``: G is the conditional
expectation of the exact normal transition, the same at every step, by the trapezoidal rule in the state,
which is right to rounding there. Its transpose carries state prices forward, from which α is found step by
step by Newton's method so that ``P(0, t)`` is met at every node to rounding: the forward induction of
Jamshidian (1991) and of Hull and White (1994), with the normal transition itself in place of the branches of
a lattice.

Error ----- The paths use the same steps, transition and trapezoidal rule as the fit: under the pricing
measure the mean of ``1/R_t`` is ``P(0,t)`` at every node with no bias at all. Against the model in continuous
time, values of claims are off by a term in h², which a fit with twice the steps shows and Richardson's
extrapolation removes. Measured with 12 steps a year, a = 0.1 and σ = 0.2 to 0.3: 2e-6 of a five-year bond
seen in five years at a given rate, 2e-6 of the price today of an option on it.

References ---------- Black, F. and Karasinski, P. (1991), Bond and option pricing when short rates are
lognormal, Financial Analysts Journal 47. Hull, J. and White, A. (1994), Numerical procedures for implementing
term structure models I, Journal of Derivatives 2. Jamshidian, F. (1991), Forward induction and construction
of yield curve diffusion models, Journal of Fixed Income 1. Named from memory.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike, NDArray

if TYPE_CHECKING:
    from scipy.sparse import csr_array

from desk.rates.black_karasinski_grid import StateChain, StateFunction, fit_points, fitted
from desk.rates.black_karasinski_walk import BlackKarasinskiWalk
from desk.rates.curve import DiscountCurve
from desk.rates.limits import first_integral

__all__ = ["BlackKarasinskiRates"]

FloatArray = NDArray[np.float64]

# Standard deviations from the mean that a path never leaves: the chance is 2e-19 each way.
_REACH = 9.0
# Points, and numbers of the state prices, beyond which a fit takes too long and too much memory.
_MOST_POINTS = 6000
_MOST_NUMBERS = 20_000_000
_ON_GRID = 1e-9
_ITERATIONS = 60
# Standard deviations of a step, and points, over which a payoff with kinks is integrated.
_PAYOFF_REACH, _PAYOFF_POINTS = 8.0, 4001
# Quadrature over the noise of a part of a step.
_NODE, _WEIGHT = np.polynomial.hermite_e.hermegauss(12)
_WEIGHT = _WEIGHT / _WEIGHT.sum()


class BlackKarasinskiRates:
    """The lognormal short-rate model, fitted to a curve.

    It is no affine model and offers no ``bond_terms``: later flows are valued by `value_flows`. The state of
    its walks is the short rate itself, so that nothing is to be added to it or to its integral.

    Parameters
    ----------
    curve : DiscountCurve
        Its forward rates over every step must be above 0.
    mean_reversion : float
        a [1/year], at least 0.
    volatility : float
        σ of ln r [1/root year], at least 0.
    horizon : float
        How far the model is worked out: to the last flow that is to be valued [years].
    steps_per_year : int
        Of the grid. A walk's step must be a whole number of them.
    risk_price : float
        λ: the drift of ln r gains σλ under the real-world measure [1/root year].

    Attributes
    ----------
    fit_error : float
        Largest relative difference between the model's and the curve's discount factors at the nodes.

    Raises
    ------
    ValueError
        If a parameter is out of range, a forward rate is not above 0, or the volatility is too large for the
        horizon to be resolved.
    """

    def __init__(
        self,
        curve: DiscountCurve,
        *,
        mean_reversion: float,
        volatility: float,
        horizon: float,
        steps_per_year: int = 12,
        risk_price: float = 0.0,
    ) -> None:
        for name, value in (("mean_reversion", mean_reversion), ("volatility", volatility)):
            if not (math.isfinite(value) and value >= 0.0):
                raise ValueError(f"`{name}` must be a number of at least 0, not {value}")
        if not math.isfinite(risk_price):
            raise ValueError(f"`risk_price` must be a number, not {risk_price}")
        if not (math.isfinite(horizon) and horizon > 0.0):
            raise ValueError(f"`horizon` must be above 0, not {horizon}")
        if steps_per_year < 1:
            raise ValueError("`steps_per_year` must be at least 1")
        self._curve = curve
        self.mean_reversion, self.volatility, self.risk_price = mean_reversion, volatility, risk_price
        self.steps_per_year = int(steps_per_year)
        self._step = 1.0 / self.steps_per_year
        count = max(1, math.ceil(horizon * self.steps_per_year - _ON_GRID))
        self.horizon = count * self._step
        low, high = self._span(self.horizon)
        decay, noise = self._decay(self._step), self._noise(self._step)
        try:
            most = min(_MOST_POINTS, _MOST_NUMBERS // count)
            self._chain = StateChain(low, high, decay=decay, noise=noise, most=most)
        except ValueError as problem:
            raise ValueError(
                f"{self.horizon:g} years in {self.steps_per_year} steps a year are too much to be worked out "
                f"({problem}): take a shorter horizon, fewer steps, or a larger mean reversion"
            ) from None
        self._growth = np.exp(self._chain.point)
        self._mean, self._back = _operators(*self._chain.bands())
        self._level = np.empty(count)
        self._price = np.empty((count + 1, self._chain.count))
        self.fit_error = self._fit(np.asarray(np.arange(count + 1) * self._step, dtype=np.float64))
        self._actual: FloatArray | None = None

    def _decay(self, step: float) -> float:
        return math.exp(-self.mean_reversion * step)

    def _noise(self, step: float) -> float:
        """Standard deviation of x after a time."""
        return self.volatility * math.sqrt(float(first_integral(2.0 * self.mean_reversion, step)))

    def _shift(self, step: float) -> float:
        """Mean of x after a time under the real-world measure."""
        return self.volatility * self.risk_price * float(first_integral(self.mean_reversion, step))

    def _span(self, time: float) -> tuple[float, float]:
        """Range of x that is at all likely under either measure."""
        reach, shift = _REACH * self._noise(time), self._shift(time)
        return min(0.0, shift) - reach, max(0.0, shift) + reach

    def _fit(self, node: FloatArray) -> float:
        """Find α for every step; the largest relative error at the nodes."""
        target = -self._curve.zero(node) * node
        forward = -np.diff(target) / self._step
        if not (np.isfinite(forward).all() and forward.min() > 0.0):
            place = int(np.argmin(np.where(np.isfinite(forward), forward, -np.inf)))
            raise ValueError(
                f"the lognormal model needs forward rates above 0, but from {node[place]:g} to "
                f"{node[place + 1]:g} years the curve's is {forward[place]:.4%}"
            )
        self._price[0] = 0.0
        self._price[0, self._chain.start] = 1.0
        half, worst = 0.5 * self._step * self._growth, 0.0
        level = float(forward[0])
        for step in range(forward.size):
            price = self._price[step]
            for _ in range(_ITERATIONS):
                edge = np.exp(-level * half)
                slope = -half * edge
                after, after_slope = self._mean @ edge, self._mean @ slope
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
            self._price[step + 1] = edge * (self._back @ (edge * price))
            worst = max(
                worst, abs(math.expm1(math.log(float(self._price[step + 1].sum())) - target[step + 1]))
            )
        return worst

    @property
    def curve(self) -> DiscountCurve:
        """Today's curve."""
        return self._curve

    @property
    def factor_count(self) -> int:
        """One factor."""
        return 1

    def rate_offset(self, time: ArrayLike) -> FloatArray:
        """0: the state is the short rate."""
        return np.zeros(np.shape(time))

    def account_offset(self, time: ArrayLike) -> FloatArray:
        """0: the integral is that of the short rate."""
        return np.zeros(np.shape(time))

    def account_law(
        self, time: ArrayLike, *, real_world: bool = False
    ) -> tuple[FloatArray, FloatArray] | None:
        """None: the savings account of this model is not lognormal."""
        return None

    def log_rate_law(self, time: ArrayLike, *, real_world: bool = False) -> tuple[FloatArray, FloatArray]:
        """Mean and variance of ``ln r(t)``, which is normal, at nodes of the grid."""
        years = np.asarray(time, dtype=np.float64)
        mean = np.array([self._node_level(self._node(one)) for one in years.ravel().tolist()])
        if real_world:
            drift = self.volatility * self.risk_price
            mean = mean + drift * first_integral(self.mean_reversion, years.ravel())
        variance = self.volatility**2 * first_integral(2.0 * self.mean_reversion, years)
        return mean.reshape(years.shape), variance

    def mean_discount(self, time: ArrayLike, *, real_world: bool = False) -> FloatArray:
        """``E[1/R_t]``: ``P(0,t)``, under the real-world measure by the same method, at nodes of the grid."""
        years = np.asarray(time, dtype=np.float64)
        if not real_world or self.risk_price == 0.0:
            return self._curve.discount(years)
        if self._actual is None:
            self._actual = self._actual_discount()
        nodes = [self._node(one) for one in years.ravel().tolist()]
        return self._actual[nodes].reshape(years.shape)

    def _actual_discount(self) -> FloatArray:
        """``E[1/R]`` under the real-world measure at every node."""
        _, back = _operators(*self._chain.bands(shift=self._shift(self._step)))
        price, result = self._price[0], np.ones(self._level.size + 1)
        for number in range(self._level.size):
            edge = self._edge(number)
            price = edge * (back @ (edge * price))
            result[number + 1] = price.sum()
        return result

    def state_range(self, time: float, *, real_world: bool = False) -> tuple[FloatArray, FloatArray]:
        """Lowest and highest short rates that are at all likely at a node, shape (1,) each [1/year]."""
        low, high = self._span(time)
        level = self._node_level(self._node(time))
        return np.array([math.exp(level + low)]), np.array([math.exp(level + high)])

    def _node(self, time: float) -> int:
        """Number of the node at a time."""
        place = time * self.steps_per_year
        node = round(place) if math.isfinite(place) else -1
        if abs(place - node) > _ON_GRID * max(1.0, place) or not 0 <= node <= self._level.size:
            raise ValueError(
                f"{time:g} years is no node of the model: nodes are {self.steps_per_year} a year up to its "
                f"horizon of {self.horizon:g} years"
            )
        return node

    def _node_level(self, node: int) -> float:
        """α at a node, halfway between those of the steps that meet there; today that of the curve."""
        last = self._level.size - 1
        if node == 0:
            today = float(self._curve.forward(0.0, 0.0))
            return math.log(today) if today > 0.0 else float(self._level[0])
        return 0.5 * float(self._level[node - 1] + self._level[min(node, last)])

    def _edge(self, step: int, growth: FloatArray | None = None) -> FloatArray:
        """d: what either end of a step takes off, at the points or where else ``e^x`` is given."""
        part = 0.5 * self._step * math.exp(float(self._level[step]))
        return np.asarray(np.exp(-part * (self._growth if growth is None else growth)))

    def _sweep(
        self, wanted: dict[int, FloatArray], time: FloatArray, amount: FloatArray
    ) -> dict[int, FloatArray]:
        """Values of flows due at or after each node, at the states x wanted there.

        Amounts have shape (k, c), states (m,), values (m, c).
        """
        place = np.asarray(time * self.steps_per_year)
        if time.size and not (np.isfinite(place).all() and place.max() <= self._level.size + _ON_GRID):
            raise ValueError(
                f"a flow is due after the model's horizon of {self.horizon:g} years: take a longer one"
            )
        nearest = np.rint(place)
        whole = np.abs(place - nearest) <= _ON_GRID * np.maximum(1.0, place)
        step = np.where(whole, nearest, np.floor(place)).astype(np.int64)
        first = min(wanted)
        order = np.argsort(step, kind="stable")
        order = order[step[order] >= first]
        top = max(int(step[order[-1]]) if order.size else first, max(wanted))
        starts = np.searchsorted(step[order], np.arange(first, top + 2), side="left")
        later: FloatArray = np.zeros((self._chain.count, amount.shape[1]))
        found: dict[int, FloatArray] = {}
        for number in range(top, first - 1, -1):
            due = order[starts[number - first] : starts[number - first + 1]]
            paid, between = amount[due[whole[due]]].sum(axis=0), due[~whole[due]]
            # What is due within the step, at the node itself, and after the step.
            fractions = self._fractions(number, time[between])
            edge = self._edge(number)[:, None] if number < self._level.size else np.ones((1, 1))
            ahead = edge * later
            if number in wanted:
                state = wanted[number]
                growth = np.exp(state)
                value = self._chain.rows(state) @ ahead
                if number < self._level.size:
                    value *= self._edge(number, growth)[:, None]
                value += paid
                if between.size:
                    value += self._partial(number, time[between], state, growth) * fractions @ amount[between]
                found[number] = value
            if number > first:
                later = edge * (self._mean @ ahead)
                later += paid
                if between.size:
                    part = self._partial(number, time[between], self._chain.point, self._growth)
                    later += part * fractions @ amount[between]
        return found

    def _partial(self, step: int, time: FloatArray, state: FloatArray, growth: FloatArray) -> FloatArray:
        """Values at a node of 1 paid within the step that begins there, shape (m, k), before scaling."""
        result = np.empty((state.size, time.size))
        for column, one in enumerate(time.tolist()):
            length = one - step * self._step
            after = np.exp(self._decay(length) * state[:, None] + self._noise(length) * _NODE)
            part = 0.5 * length * math.exp(float(self._level[step]))
            result[:, column] = np.exp(-part * (growth[:, None] + after)) @ _WEIGHT
        return result

    def _fractions(self, step: int, time: FloatArray) -> FloatArray:
        """Numbers near 1 with which `_partial` meets today's curve."""
        if time.size == 0:
            return time
        model = self._price[step] @ self._partial(step, time, self._chain.point, self._growth)
        return np.asarray(self._curve.discount(time) / model)

    def value_flows(self, nodes: ArrayLike, time: ArrayLike, amount: ArrayLike) -> list[StateFunction]:
        """The value, at each of several nodes, of the flows due at or after it as a function of the state.

        Parameters
        ----------
        nodes : array_like, shape (t,)
            Times of the grid [years].
        time, amount : array_like, shape (k,)
            When each flow is due, at most the horizon [years], and what it pays. Times need not be on the
            grid.

        Returns
        -------
        list of StateFunction, length t
            Functions of the short rate, shape (1, m); seen from time 0 of today's.

        Raises
        ------
        ValueError
            If a node is not of the grid or a flow is due after the horizon.
        """
        numbers = [self._node(one) for one in np.atleast_1d(np.asarray(nodes, np.float64)).tolist()]
        due, paid = np.asarray(time, dtype=np.float64), np.asarray(amount, dtype=np.float64)
        if due.ndim != 1 or paid.shape != due.shape:
            raise ValueError("`amount` must hold one amount for each entry of `time`")
        if not numbers:
            return []
        ranges = {}
        for number in numbers:
            low, high = self._span(number * self._step)
            slack = max(0.0, 1e-6 - 0.5 * (high - low))
            ranges[number] = (low - slack, high + slack)
        wanted = {number: fit_points(*ends) for number, ends in ranges.items()}
        times, place = np.unique(due, return_inverse=True)
        paid_in = np.bincount(place, weights=paid, minlength=times.size).astype(np.float64)
        values = self._sweep(wanted, times, paid_in[:, None])
        made = {
            number: fitted(value[:, 0], *ranges[number], self._node_level(number))
            for number, value in values.items()
        }
        return [made[number] for number in numbers]

    def value_flows_at(self, node: float, time: ArrayLike, amount: ArrayLike) -> StateFunction:
        """`value_flows` at one node."""
        return self.value_flows([node], time, amount)[0]

    def bond_price(self, time: float, maturity: ArrayLike, state: ArrayLike) -> FloatArray:
        """Prices at a node of zero bonds paying 1, given the short rate.

        Parameters
        ----------
        time : float
            A node of the grid [years].
        maturity : array_like, any shape
            From `time` to the horizon [years].
        state : array_like, shape (1, ...)
            The short rate [1/year]; above 0. One beyond what is at all likely at the horizon counts, after
            the first step, as the last that is.

        Returns
        -------
        ndarray, the shape of `maturity` and then that of the states

        Raises
        ------
        ValueError
            If a time is out of range or a rate not above 0.
        """
        node, rate = self._node(time), np.asarray(state, dtype=np.float64)[0]
        end = np.asarray(maturity, dtype=np.float64)
        if end.size and not end.min() >= time - _ON_GRID:
            raise ValueError("`maturity` must not be before `time`")
        if rate.size and not rate.min() > 0.0:
            raise ValueError("`state` must hold rates above 0")
        x = np.log(rate.ravel()) - self._node_level(node)
        values = self._sweep({node: x}, end.ravel(), np.eye(end.size))[node]
        return np.asarray(values.T.reshape(end.shape + rate.shape))

    def payoff_value(self, time: float, payoff: Callable[[FloatArray], FloatArray]) -> float:
        """Price today of a claim that pays a function of the state at a node after today.

        Parameters
        ----------
        time : float
            A node of the grid after time 0 [years].
        payoff : callable
            Takes short rates, shape (1, m), and gives amounts, shape (m,). It may have kinks.
        """
        node = self._node(time)
        if node == 0:
            raise ValueError("`time` must be after today")
        noise = np.linspace(-_PAYOFF_REACH, _PAYOFF_REACH, _PAYOFF_POINTS)
        weight = np.exp(-0.5 * noise**2)
        weight /= weight.sum()
        edge = self._edge(node - 1)
        # A row a point: in parts, so that the memory stays small.
        total, group = 0.0, 64
        scale = 0.5 * self._step * math.exp(float(self._level[node - 1]))
        for start in range(0, self._chain.count, group):
            part = slice(start, start + group)
            state = self._decay(self._step) * self._chain.point[part, None] + self._noise(self._step) * noise
            paid = payoff(np.exp(self._node_level(node) + state).reshape(1, -1)).reshape(state.shape)
            mean = (np.exp(-scale * np.exp(state)) * paid) @ weight
            total += float((self._price[node - 1, part] * edge[part]) @ mean)
        return total

    def walk(
        self, step: float, size: int, rng: np.random.Generator, *, real_world: bool = False
    ) -> BlackKarasinskiWalk:
        """`size` paths from time 0 in steps of `step` years.

        Raises
        ------
        ValueError
            If a step is not a whole number of steps of the grid.
        """
        parts = round(step * self.steps_per_year) if math.isfinite(step) else 0
        if parts < 1 or abs(step * self.steps_per_year - parts) > _ON_GRID * parts:
            raise ValueError(
                f"`step` must be a whole number of the model's steps, {self.steps_per_year} a year"
            )
        return BlackKarasinskiWalk(
            0.5 * self._step * np.exp(self._level),
            np.array([self._node_level(node) for node in range(self._level.size + 1)]),
            decay=self._decay(self._step),
            shift=self._shift(self._step) if real_world else 0.0,
            noise=self._noise(self._step),
            parts=parts,
            size=size,
            rng=rng,
        )


def _operators(weight: FloatArray, column: NDArray[np.intp]) -> tuple[csr_array, csr_array]:
    """A banded matrix and its transpose."""
    from scipy.sparse import csr_array

    count, width = weight.shape
    starts = np.arange(0, count * width + 1, width)
    matrix = csr_array((weight.ravel(), column.ravel(), starts), shape=(count, count))
    # Columns that were cut off at the ends stand there with weight 0.
    matrix.sum_duplicates()
    return matrix, csr_array(matrix.T)
